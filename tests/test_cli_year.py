"""`hourarc year`: the store as xarray opens it, the season beside it, and what is left when things fail."""

from __future__ import annotations

import json
import subprocess
import sys
from pathlib import Path
from typing import Any

import hourarc
import numpy as np
import pyarrow.parquet as pq
import pytest
from hourarc.cli._run import run

pytest.importorskip("zarr")
xarray = pytest.importorskip("xarray")

PLAN = """
[site]
name = "Saltpan Ridge"
longitude_deg = 24.5
latitude_deg = -20.9
height_m = 1148

[limits]
altitude_min_deg = 30
moon_separation_min_deg = 30
"""
TARGETS = "name,ra,dec\n" + "".join(f"T{i:02d},{i * 15},{-80 + i * 7}\n" for i in range(24))
SITE = hourarc.Site(24.5, -20.9, 1148.0, name="Saltpan Ridge")
LIMITS = hourarc.Limits(altitude_min_deg=30.0, moon_separation_min_deg=30.0)
STARS = hourarc.Catalog([i * 15.0 for i in range(24)], [-80.0 + i * 7.0 for i in range(24)])
ALL = ",".join(hourarc.GRID_QUANTITIES)


@pytest.fixture
def files(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    monkeypatch.chdir(tmp_path)
    (tmp_path / "plan.toml").write_text(PLAN)
    (tmp_path / "targets.csv").write_text(TARGETS)
    return tmp_path


def year(*options: object, nights: int = 40, output: str = "year.zarr", targets: str = "targets.csv") -> int:
    words = ["year", "plan.toml", targets, "--from", "2026-07-01", "--nights", nights, "-o", output]
    return run([*map(str, words), *map(str, options)])


def listing(folder: Path) -> set[str]:
    return {path.name for path in folder.iterdir()}


@pytest.mark.filterwarnings("error")
def test_xarray_opens_it_as_nights_by_targets(files: Path) -> None:
    assert year("--quantities", ALL) == 0
    grid = hourarc.visibility_grid(
        SITE, STARS, "2026-07-01", 40, LIMITS, quantities=tuple(hourarc.GRID_QUANTITIES)
    )
    with xarray.open_zarr("year.zarr") as season:
        assert dict(season.sizes) == {"night": 40, "target": 24}
        assert set(season.coords) == {"night", "target", "row", "name"}
        assert season.name.values.tolist() == [f"T{i:02d}" for i in range(24)]
        assert season.row.values.tolist() == list(range(1, 25))
        assert np.array_equal(season.night.values, grid.night.astype("datetime64[ns]"))
        assert np.array_equal(season.night_start.values, grid.night_start)
        assert np.array_equal(season.dark_hours.values, grid.dark_hours)
        assert season.night_status.attrs["flag_meanings"].startswith("ok ")
        for name, dtype in hourarc.GRID_QUANTITIES.items():
            values = season[name].values
            assert season[name].dims == ("night", "target") and season[name].attrs["long_name"]
            if dtype == np.float64:
                mjd = (values - np.datetime64("1858-11-17")) / np.timedelta64(1, "D")
                assert np.array_equal(np.isnat(values), np.isnan(grid[name]))
                assert np.nanmax(np.abs(mjd - grid[name])) * 86_400.0 < 2e-6
            else:
                assert values.dtype == np.float32 and np.array_equal(values, grid[name], equal_nan=True)
        assert season.hours.attrs["units"] == "h"
        assert season.moon_separation_min.attrs["units"] == "deg"
        one = season.sel(night="2026-07-11")
        assert np.array_equal(one.hours.values, grid.hours[10])


def test_the_store_says_where_it_came_from(files: Path) -> None:
    assert year("--quantities", "hours,start") == 0
    with xarray.open_zarr("year.zarr") as season:
        about = season.attrs
    assert about["hourarc.software"] == f"hourarc {hourarc.__version__}"
    assert about["hourarc.span"] == "40 nights from 2026-07-01"
    assert json.loads(about["hourarc.site"])["latitude_deg"] == -20.9
    assert json.loads(about["hourarc.limits"])["moon_separation_min_deg"] == 30.0
    for key in ("plan", "targets"):
        assert len(json.loads(about[f"hourarc.{key}"])["sha256"]) == 64
    assert json.loads(about["hourarc.targets"])["planned"] == 24
    sources = json.loads(about["hourarc.earth_orientation"])["sources"]
    assert sources and all(len(sha256) == 64 for sha256 in sources.values())
    table = pq.read_table("year.season.parquet")
    assert table.schema.metadata[b"hourarc.span"] == b"40 nights from 2026-07-01"
    # The command that is recorded is the one that makes it again.
    assert about["hourarc.command"].startswith("hourarc year plan.toml targets.csv --from 2026-07-01")


def test_the_season_of_each_target_stands_beside_it(files: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert year(nights=365) == 0
    printed = capsys.readouterr()
    summary = hourarc.visibility_grid(SITE, STARS, "2026-07-01", 365, LIMITS).summary()
    table = pq.read_table("year.season.parquet")
    assert table["name"].to_pylist() == [f"T{i:02d}" for i in range(24)]
    assert table["row"].to_pylist() == list(range(1, 25))
    for name in ("first_night", "last_night", "useful_nights", "longest_gap"):
        assert table[name].to_pylist() == getattr(summary, name).tolist()
    assert table["hours"].to_numpy() == pytest.approx(summary.hours, abs=1e-3)
    assert "24 rows read = 24 planned + 0 rejected" in printed.out
    assert f"{len(summary.never)} targets never observable: " in printed.out
    assert "2027-06      30" in printed.out and printed.err == ""
    assert printed.out.endswith("Written: year.zarr, year.season.parquet\n")
    assert listing(files) == {"plan.toml", "targets.csv", "year.zarr", "year.season.parquet"}


def test_blocks_of_nights_and_threads_give_the_same_season(
    files: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    assert year("-q", "--threads", 1) == 0
    monkeypatch.setattr("hourarc.cli._plan_year.BUFFER", 24 * 4 * 16)
    assert year("-q", "--threads", 2, output="blocks.zarr") == 0
    monkeypatch.setattr("hourarc.cli._plan_year.BUFFER", 24 * 4 * 7)
    assert year("-q", output="sevens.zarr") == 0
    with xarray.open_zarr("year.zarr") as one, xarray.open_zarr("blocks.zarr") as other:
        assert np.array_equal(one.hours.values, other.hours.values)
        with xarray.open_zarr("sevens.zarr") as sevens:
            assert sevens.hours.encoding["chunks"] == (7, 24)
            assert np.abs(one.hours.values - sevens.hours.values).max() * 3600.0 < 0.1
    assert pq.read_table("year.season.parquet").equals(pq.read_table("blocks.season.parquet"))


def test_rejected_rows_are_listed_and_the_others_planned(files: Path) -> None:
    plan = PLAN.replace("altitude_min_deg = 30", 'altitude_min_deg = { column = "low" }')
    (files / "plan.toml").write_text(plan)
    rows = [f"T{i},{i * 15},-40,30" for i in range(5)] + ["U1,10,95,30", "U2,10,-40,99", "T5,10,-40,80"]
    (files / "targets.csv").write_text("name,ra,dec,low\n" + "\n".join(rows) + "\n")
    assert year("-q", nights=3) == 3
    with xarray.open_zarr("year.zarr") as season:
        assert season.row.values.tolist() == [1, 2, 3, 4, 5, 8]
        assert not np.isnan(season.hours.values).any()
        assert (season.hours.values[:, 5] < season.hours.values[:, 0]).all()
    assert Path("year.rejected.csv").read_text().count("\nU") == 0
    assert [line.split(",")[0] for line in Path("year.rejected.csv").read_text().splitlines()[-2:]] == [
        "6",
        "7",
    ]


def test_bodies_by_name(files: Path) -> None:
    words = ["year", "plan.toml", "--bodies", "mars,jupiter", "--from", "2026-07-01", "--nights", "5"]
    assert run([*words, "-o", "planets.zarr", "-q"]) == 0
    with xarray.open_zarr("planets.zarr") as season:
        assert season.name.values.tolist() == ["mars", "jupiter"]


WRONG = [
    (("--quantities", "hours,seeing"), {}, 2, "given 'seeing', which is unknown"),
    (("--quantities", "hours,hours"), {}, 2, "hours is given twice"),
    ((), {"nights": 0}, 2, "0 is not in the range"),
    ((), {"nights": 40_000}, 2, "the last night would be 2136-01-05, allowed to 2100-12-31"),
    ((), {"output": "year.nc"}, 2, "written as a .zarr store; the suffix is '.nc'"),
    ((), {"output": "nowhere/year.zarr"}, 2, "there is no folder 'nowhere'"),
    ((), {"output": "mine.zarr"}, 2, "exists and is no Zarr store; it is not replaced"),
    ((), {"targets": "missing.csv"}, 2, "missing.csv"),
]


@pytest.mark.parametrize(("options", "keywords", "code", "said"), WRONG)
def test_wrong_calls_write_nothing(
    files: Path,
    capsys: pytest.CaptureFixture[str],
    options: tuple[str, ...],
    keywords: dict[str, object],
    code: int,
    said: str,
) -> None:
    (files / "mine.zarr").mkdir()
    (files / "mine.zarr" / "letter.txt").write_text("do not lose")
    before = listing(files)
    assert year(*options, **keywords) == code  # type: ignore[arg-type]
    assert said in capsys.readouterr().err
    assert listing(files) == before and (files / "mine.zarr" / "letter.txt").exists()


def test_an_older_store_is_replaced_as_a_whole(files: Path) -> None:
    assert year("-q", "--quantities", "hours,start") == 0
    assert year("-q", nights=3) == 0
    with xarray.open_zarr("year.zarr") as season:
        assert dict(season.sizes) == {"night": 3, "target": 24} and "start" not in season
    assert listing(files) == {"plan.toml", "targets.csv", "year.zarr", "year.season.parquet"}


def test_nothing_is_left_of_a_season_that_fails(files: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    assert year("-q", nights=3) == 0
    before = {path: path.stat().st_mtime_ns for path in files.rglob("*")}
    monkeypatch.setattr("hourarc.cli._plan_year.BUFFER", 24 * 4 * 16)
    real = hourarc.visibility_grid
    for error in (OSError("the disk is full"), KeyboardInterrupt()):
        calls = []

        def failing(*arguments: Any, calls=calls, error=error, **keywords: Any) -> object:  # type: ignore[no-untyped-def]
            calls.append(arguments)
            if len(calls) == 3:
                raise error
            return real(*arguments, **keywords)

        monkeypatch.setattr(hourarc, "visibility_grid", failing)
        assert year("-q") == 1
        assert len(calls) == 3
        assert {path: path.stat().st_mtime_ns for path in files.rglob("*")} == before


def test_a_missing_zarr_is_named(files: Path, capsys: pytest.CaptureFixture[str]) -> None:
    with pytest.MonkeyPatch.context() as patch:
        patch.setitem(sys.modules, "zarr", None)
        assert year() == 1
    assert "zarr is not installed; pip install 'hourarc[zarr]'" in capsys.readouterr().err


@pytest.mark.skipif(not Path("/proc/self/status").exists(), reason="asks Linux for the peak")
def test_memory_stays_at_the_buffer_and_the_targets(files: Path) -> None:
    """Reading 200,000 targets and writing 240 MB of hours: half of those are in memory at once, at most."""
    rng = np.random.default_rng(4)
    rows = np.column_stack([rng.uniform(0, 360, 200_000), rng.uniform(-90, 90, 200_000)])
    np.savetxt("many.csv", rows, fmt="%.5f", delimiter=",", header="ra,dec", comments="")
    code = """
        import sys
        from hourarc.cli._run import run
        words = ["year", "plan.toml", sys.argv[1], "--from", "2026-07-01", "--nights", sys.argv[2]]
        assert run([*words, "-o", "many.zarr", "-q"]) == 0
        (line,) = (line for line in open("/proc/self/status") if line.startswith("VmHWM:"))
        print(int(line.split()[1]) * 1024 / 1e6)
    """
    script = "\n".join(line[8:] for line in code.splitlines())
    peak = {}
    for name, nights in (("targets.csv", 1), ("many.csv", 300)):
        done = subprocess.run(
            [sys.executable, "-c", script, name, str(nights)],
            capture_output=True,
            text=True,
            timeout=300,
        )
        assert done.returncode == 0, done.stderr
        peak[name] = float(done.stdout)
    print(f"peak {peak['many.csv']:.0f} MB, of which {peak['targets.csv']:.0f} MB before any target")
    assert peak["many.csv"] - peak["targets.csv"] < 350.0
