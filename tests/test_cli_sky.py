"""`hourarc sky` and `hourarc annotate`: the places they write are those of `place`, and no row is lost."""

from __future__ import annotations

import csv
import json
from pathlib import Path

import hourarc
import numpy as np
import pyarrow as pa
import pyarrow.parquet as pq
import pytest
from hourarc.cli._run import run

PLAN = '[site]\nname = "Saltpan Ridge"\nlongitude_deg = 24.5\nlatitude_deg = -20.9\nheight_m = 1148\n'
SITE = hourarc.Site(24.5, -20.9, 1148.0, name="Saltpan Ridge")


@pytest.fixture
def plan(tmp_path: Path) -> Path:
    path = tmp_path / "plan.toml"
    path.write_text(PLAN)
    return path


def said(capsys: pytest.CaptureFixture[str], code: int, *arguments: object) -> str:
    """Runs a command that ends with `code`, and returns what it prints on both streams."""
    capsys.readouterr()
    assert run([str(a) for a in arguments]) == code
    printed = capsys.readouterr()
    return printed.out + printed.err


def csv_rows(path: Path) -> list[dict[str, str]]:
    return list(csv.DictReader(line for line in path.read_text().splitlines() if not line.startswith("#")))


# ---- sky ---------------------------------------------------------------------------------------------------


def test_sky_writes_every_column_of_place(plan: Path, capsys: pytest.CaptureFixture[str]) -> None:
    rng = np.random.default_rng(5)
    ra, dec = rng.uniform(0, 360, 300), rng.uniform(-90, 90, 300)
    targets, output = plan.parent / "targets.parquet", plan.parent / "sky.parquet"
    pq.write_table(pa.table({"ra": ra, "dec": dec, "id": [f"T{i}" for i in range(300)]}), targets)
    printed = said(capsys, 0, "sky", plan, targets, "--at", "2026-03-10T03:00", "-o", output)
    found = pq.read_table(output)
    places = hourarc.place(SITE, hourarc.Catalog(ra, dec), "2026-03-10T03:00", columns=hourarc.PLACE_COLUMNS)
    for name in hourarc.PLACE_COLUMNS:
        assert np.array_equal(found[name].to_numpy(), places[name], equal_nan=True), name
    assert found["name"].to_pylist() == [f"T{i}" for i in range(300)]
    assert found["row"].to_pylist() == list(range(1, 301))
    assert set(found["time"].to_numpy()) == {np.datetime64("2026-03-10T03:00", "ns")}
    assert found.schema.metadata[b"hourarc.instant"] == b"2026-03-10T03:00:00.000000000 UTC"
    assert found.schema.field("altitude_deg").metadata[b"unit"] == b"deg"
    assert "2026-03-10 03:00:00 UTC" in printed and "300 rows read = 300 placed + 0 rejected" in printed
    up = int((places.altitude_deg > 0.0).sum())
    assert f"{up} targets above the horizon" in printed
    highest = int(np.argmax(places.altitude_deg))
    assert f"T{highest} " in printed.partition("Highest:")[2].splitlines()[2]
    # Astronomical dusk at -18: at this instant the Sun stands just below.
    assert "Sun   altitude -18." in printed and ", night" in printed


def test_sky_takes_an_offset_from_utc(plan: Path) -> None:
    written = []
    for name, at in (
        ("a", "2026-03-10T03:00"),
        ("b", "2026-03-10T05:00+02:00"),
        ("c", "2026-03-10 03:00:00Z"),
    ):
        output = plan.parent / f"{name}.csv"
        assert run(["sky", str(plan), "--bodies", "moon,mars", "--at", at, "-q", "-o", str(output)]) == 0
        written.append(csv_rows(output))
    assert written[0] == written[1] == written[2]


def test_bodies_by_name(plan: Path, capsys: pytest.CaptureFixture[str]) -> None:
    output = plan.parent / "sky.csv"
    call = ("sky", plan, "--at", "2026-03-10T03:00", "-o", output)
    printed = said(capsys, 0, *call, "--bodies", "sun, Moon jupiter")
    assert "3 rows read = 3 placed + 0 rejected" in printed
    rows = csv_rows(output)
    assert [row["name"] for row in rows] == ["sun", "moon", "jupiter"]
    places = hourarc.place(SITE, hourarc.Bodies(["sun", "moon", "jupiter"]), "2026-03-10T03:00")
    assert [float(row["azimuth_deg"]) for row in rows] == pytest.approx(places.azimuth_deg, abs=1e-9)
    assert '"bodies": ["sun", "moon", "jupiter"]' in output.read_text()
    assert "given 'marz', which is unknown; the nearest is 'mars'" in said(
        capsys, 2, *call, "--bodies", "marz"
    )
    assert "mars is given twice" in said(capsys, 2, *call, "--bodies", "mars,moon,mars")
    assert "no name is given" in said(capsys, 2, *call, "--bodies", ",")
    assert "Missing argument 'TARGETS'" in said(capsys, 2, *call)
    assert "both TARGETS" in said(capsys, 2, "sky", plan, output, *call[2:], "--bodies", "moon")


def test_bodies_have_windows(plan: Path, capsys: pytest.CaptureFixture[str]) -> None:
    output = plan.parent / "windows.parquet"
    call = ("night", plan, "--night", "2026-03-10", "--bodies", "moon,mars,jupiter", "-o", output)
    assert "3 rows read = 3 planned + 0 rejected" in said(capsys, 0, *call)
    found, blocked = pq.read_table(output), pq.read_table(plan.parent / "windows.blocked.parquet")
    almanac = hourarc.almanac(SITE, "2026-03-10")
    names = ["moon", "mars", "jupiter"]
    expected = hourarc.windows(SITE, hourarc.Bodies(names), almanac.start[0], almanac.stop[0])
    assert found["name"].to_pylist() == [names[i] for i in expected.target] != []
    assert np.array_equal(found["start"].to_numpy(), expected.start)
    assert found["name"].to_pylist() + blocked["name"].to_pylist() == [*found["name"].to_pylist(), "mars"]
    plan.write_text(PLAN + '[limits]\nmoon_separation_min_deg = { column = "far" }\n')
    assert (
        "line 7, [limits]: moon_separation_min_deg is taken from a column, and --bodies has no columns"
        in said(capsys, 2, *call)
    )


@pytest.mark.parametrize(
    ("at", "message"),
    [
        (
            "2026-02-30T01:00",
            "given '2026-02-30T01:00', which is no date of the calendar, allowed UTC such as",
        ),
        ("soon", "given 'soon', allowed UTC such as 2026-03-10T03:00"),
        ("1959-12-31T23:59", "given 1959-12-31T23:59, allowed 1960-01-01 to 2100-12-31"),
        ("2101-01-01T00:00", "given 2101-01-01T00:00, allowed 1960-01-01 to 2100-12-31"),
        ("2016-12-31T23:59:60", "allowed seconds 00 to 59: datetime64 cannot hold a leap second"),
        ("", "given '', allowed UTC such as"),
    ],
)
def test_instants_that_cannot_be(
    plan: Path, at: str, message: str, capsys: pytest.CaptureFixture[str]
) -> None:
    assert message in said(capsys, 2, "sky", plan, "--bodies", "moon", "--at", at)


# ---- annotate ----------------------------------------------------------------------------------------------


def exposures(count: int) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    rng = np.random.default_rng(9)
    seconds = rng.integers(0, 20 * 31_557_600, count) * np.timedelta64(1, "s")
    time = np.datetime64("2005-01-01T00:00:00", "ns") + seconds + rng.integers(0, 10**9, count)
    return rng.uniform(0, 360, count), rng.uniform(-90, 90, count), time.astype("datetime64[ns]")


def test_annotate_is_place_pairwise(plan: Path, capsys: pytest.CaptureFixture[str]) -> None:
    ra, dec, time = exposures(500)
    source, output = plan.parent / "exposures.parquet", plan.parent / "out.parquet"
    pq.write_table(pa.table({"exposure": np.arange(500), "utc": time, "ra": ra, "dec": dec}), source)
    printed = said(capsys, 0, "annotate", plan, source, "-o", output)
    found = pq.read_table(output)
    places = hourarc.place(SITE, hourarc.Catalog(ra, dec), time, columns=hourarc.PLACE_COLUMNS, pairwise=True)
    for name in hourarc.PLACE_COLUMNS:
        assert np.array_equal(found[name].to_numpy(), places[name], equal_nan=True), name
    assert np.array_equal(found["time"].to_numpy(), time)
    assert "500 rows read = 500 annotated + 0 rejected" in printed
    first, last = (str(t.astype("datetime64[s]")).replace("T", " ") for t in (time.min(), time.max()))
    assert f"From {first} to {last} UTC" in printed
    below = int((places.altitude_deg < 0.0).sum())
    assert f"{below} exposures were below the horizon: are site, time and place right?" in printed


def test_every_form_of_an_instant_is_the_same_instant(plan: Path) -> None:
    ra, dec, time = exposures(200)
    time = time.astype("datetime64[ms]").astype("datetime64[ns]")
    mjd = (time - np.datetime64("1858-11-17")) / np.timedelta64(1, "D")
    texts = [str(t) for t in time.astype("datetime64[ms]")]
    forms: dict[str, tuple[pa.Array, str, float]] = {
        "iso": (pa.array(texts), "", 0.0),
        "zulu": (pa.array([t + "Z" for t in texts]), 'time = { column = "zulu", unit = "iso" }', 0.0),
        "stamp": (pa.array(time, pa.timestamp("ms", "UTC")), 'time = "stamp"', 0.0),
        "naive": (pa.array(time), 'time = "naive"', 0.0),
        # A double of this size holds 0.6 µs as MJD and 40 µs as JD.
        "mjd": (pa.array(mjd), "", 1e3),
        "julian": (pa.array(mjd + 2400000.5), 'time = { column = "julian", unit = "jd" }', 5e4),
    }
    for name, (values, columns, error_ns) in forms.items():
        column = "date-obs" if name == "iso" else name
        source, output = plan.parent / f"{name}.parquet", plan.parent / f"{name}.out.parquet"
        pq.write_table(pa.table({"ra": ra, "dec": dec, column: values}), source)
        plan.write_text(PLAN + (f"[columns]\n{columns}\n" if columns else ""))
        assert run(["annotate", str(plan), str(source), "-q", "-o", str(output)]) == 0
        late = pq.read_table(output)["time"].to_numpy() - time
        assert np.abs(late.astype(np.int64)).max() <= error_ns, name


@pytest.mark.parametrize("suffix", ["ecsv", "fits"])
def test_instants_of_a_stated_scale_become_utc(plan: Path, suffix: str) -> None:
    from astropy.table import Table
    from astropy.time import Time

    ra, dec, time = exposures(20)
    source, output = plan.parent / f"exposures.{suffix}", plan.parent / "out.parquet"
    Table({"ra": ra, "dec": dec, "time": Time(time, scale="utc").tt}).write(source)
    assert run(["annotate", str(plan), str(source), "-q", "-o", str(output)]) == 0
    late = pq.read_table(output)["time"].to_numpy() - time
    # Astropy writes an ECSV to the millisecond.
    assert np.abs(late.astype(np.int64)).max() <= (1_000_000 if suffix == "ecsv" else 1)


def test_bad_rows_are_listed_and_the_others_annotated(plan: Path, capsys: pytest.CaptureFixture[str]) -> None:
    source, output = plan.parent / "exposures.csv", plan.parent / "out.csv"
    cells = [
        "a,150,-20,2026-03-10T22:00:00.25",
        "b,150,-20,2026-02-30T22:00:00",
        "c,150,-20,",
        "d,150,95,2026-03-10T22:00:00",
        "e,150,-20,1955-03-10T22:00:00",
        "f,150,-20,2155-03-10T22:00:00",
        "g,150,-20,2026-03-10T23:00:00.25+01:00",
        "h,150,-20,1600-03-10T23:00:00",
        "i,150",
        "j,150,-20,noon",
    ]
    source.write_text("\n".join(["id,ra,dec,time", *cells]) + "\n")
    printed = said(capsys, 3, "annotate", plan, source, "-o", output)
    assert "10 rows read = 2 annotated + 8 rejected" in printed and "8 of 10 rows" in printed
    good = csv_rows(output)
    assert [row["name"] for row in good] == ["a", "g"]
    assert good[0]["altitude_deg"] == good[1]["altitude_deg"] != ""
    assert [(row["row"], row["reason"]) for row in csv_rows(plan.parent / "out.rejected.csv")] == [
        ("2", "not an instant such as 2026-03-10T03:00:00"),
        ("3", "empty"),
        ("4", "outside -90 to 90 deg"),
        ("5", "before 1960, when UTC begins"),
        ("6", "outside 1900 to 2100, which the ephemeris covers"),
        ("8", "not an instant such as 2026-03-10T03:00:00"),
        ("9", "2 values where there are 4 columns"),
        ("10", "not an instant such as 2026-03-10T03:00:00"),
    ]
    line = next(t for t in output.read_text().splitlines() if t.startswith("# hourarc.targets: "))
    record = json.loads(line.partition(": ")[2])
    assert (record["rows_read"], record["annotated"], record["rejected"]) == (10, 2, 8)


def test_day_counts_that_are_none(plan: Path, capsys: pytest.CaptureFixture[str]) -> None:
    source, output = plan.parent / "exposures.csv", plan.parent / "out.csv"
    source.write_text("ra,dec,mjd\n150,-20,61109.5\n150,-20,x\n150,-20,nan\n150,-20,1e9\n150,-20,\n")
    said(capsys, 3, "annotate", plan, source, "-o", output)
    assert [row["time"] for row in csv_rows(output)] == ["2026-03-10T12:00:00.000000"]
    reasons = [row["reason"] for row in csv_rows(plan.parent / "out.rejected.csv")]
    assert reasons == ["not a day count", "not a day count", "not a day count", "empty"]


def test_columns_of_instants_that_cannot_be(plan: Path, capsys: pytest.CaptureFixture[str]) -> None:
    source = plan.parent / "exposures.csv"
    call = ("annotate", plan, source, "-o", plan.parent / "out.csv")
    source.write_text("ra,dec,taken\n1,2,3\n")
    message = said(capsys, 2, *call)
    assert "no column for time" in message and '[columns] time = "taken"' in message
    source.write_text("ra,dec,time,mjd\n1,2,3,4\n")
    assert 'the columns "time", "mjd" could all be time' in said(capsys, 2, *call)
    source.write_text("ra,dec,time,time\n1,2,3,4\n")
    assert 'the column "time" stands twice, as columns 3 and 4' in said(capsys, 2, *call)
    plan.write_text(PLAN + '[columns]\ntime = { column = "time", unit = "unix" }\n')
    assert 'line 7, [columns]: time cannot be in "unix"; known: iso, mjd, jd' in said(capsys, 2, *call)
    plan.write_text(PLAN + "[columns]\ntime = { value = 3 }\n")
    assert "time needs a column; one instant for all rows is `hourarc sky --at`" in said(capsys, 2, *call)
    plan.write_text(PLAN)
    source = plan.parent / "exposures.parquet"
    pq.write_table(pa.table({"ra": [1.0], "dec": [2.0], "time": [61109.5]}), source)
    message = said(capsys, 2, "annotate", plan, source, "-o", plan.parent / "out.csv")
    assert 'column "time": it holds double; ISO 8601 text or timestamps are needed' in message
    assert "-o" in said(capsys, 2, "annotate", plan, source)
