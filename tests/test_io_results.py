"""Result files: they read back elsewhere, say where they came from, and appear whole or not at all."""

from __future__ import annotations

import csv
import json
from pathlib import Path

import hourarc
import numpy as np
import pyarrow as pa
import pyarrow.parquet as pq
import pytest
from hourarc.io.plan import read_plan
from hourarc.io.problems import Rejected, WrongInput
from hourarc.io.provenance import command_line, provenance
from hourarc.io.results import blocked_table, windows_table
from hourarc.io.targets import Targets, read_targets
from hourarc.io.whole import WholeFiles
from hourarc.io.writers import beside, check_result, result_format, write_rejected, write_table

START = np.datetime64("2026-03-10T18:00:00.123456789", "ns")


def targets_of(folder: Path) -> Targets:
    path = folder / "targets.csv"
    path.write_text('name,ra,dec\nA,100,1\n"B, the ""second""",110,2\nbad,x,3\nC,120,3\nD,130,4\n')
    return read_targets(path)


def windows_of() -> hourarc.Windows:
    """Four targets: two windows, none (blocked), one, none (a bad row)."""
    minute = np.timedelta64(60_000_000_000, "ns")
    start = START + np.arange(3) * 10 * minute
    codes = {word: code for code, word in enumerate(hourarc.REASON_WORDS)}
    opens = np.array([codes["sun_altitude_max"], codes["altitude_min"], codes["altitude_min"]], np.uint8)
    blocked = np.array([0, codes["altitude_min"], 0, codes["bad_row"]], np.uint8)
    return hourarc.Windows(
        offsets=np.array([0, 2, 2, 3, 3]),
        start=start,
        stop=start + 7 * minute,
        start_reason=opens,
        stop_reason=opens[::-1].copy(),
        best_airmass=np.array([1.25, 1.5, np.nan]),
        best_time=start + minute,
        start_error_s=np.array([1e-3, 2e-3, 3e-3]),
        stop_error_s=np.array([1e-3, 2e-3, np.inf]),
        start_scatter_s=np.array([0.0, 0.0, 40.0]),
        stop_scatter_s=np.zeros(3),
        may_not_happen=np.array([False, False, True]),
        status=np.array([0, 0, 1, 27], np.uint8),
        blocked_by=blocked,
        name=None,
    )


def record_of(folder: Path, limits: str = "") -> dict[str, object]:
    path = folder / "plan.toml"
    path.write_text(
        f"[site]\nname = 'Saltpan Ridge'\nlongitude_deg = 24.5\nlatitude_deg = -20.9\n[limits]\n{limits}\n"
    )
    plan = read_plan(path)
    called = command_line("night", "a plan.toml", "t.csv", "--night", "2026-03-10")
    return provenance(
        plan=plan,
        site=plan.site(),
        limits=plan.limits(),
        targets=targets_of(folder),
        command=called,
        night="2026-03-10",
    )


def written(folder: Path, name: str, table: pa.Table) -> Path:
    with WholeFiles() as files:
        write_table(table, folder / name, record_of(folder), files)
    return folder / name


def test_tables_join_windows_with_their_targets(tmp_path: Path) -> None:
    targets = targets_of(tmp_path)
    table = windows_table(windows_of(), targets)
    assert table["row"].to_pylist() == [1, 1, 4]
    assert table["name"].to_pylist() == ["A", "A", "C"]
    assert table["duration_s"].to_pylist() == [420.0, 420.0, 420.0]
    assert table["start_reason"].to_pylist() == ["sun_altitude_max", "altitude_min", "altitude_min"]
    assert table.schema.field("duration_s").metadata[b"unit"] == b"s"
    blocked = blocked_table(windows_of(), targets)
    assert blocked.to_pylist() == [
        {"row": 2, "name": 'B, the "second"', "blocked_by": "altitude_min", "status": "ok"}
    ]


def test_rows_that_only_the_engine_finds_bad_are_rejected(tmp_path: Path) -> None:
    targets, windows = targets_of(tmp_path), windows_of()
    targets.reject(windows.status >= 16, windows.status_words)
    assert targets.row.tolist() == [1, 2, 4] and targets.rows_read == 5
    assert targets.rejected.line(0) == "row 3, column \"ra\" = 'x': not a number"
    assert targets.rejected.line(1) == "row 5: limit_out_of_range"


def test_parquet(tmp_path: Path) -> None:
    path = written(tmp_path, "windows.parquet", windows_table(windows_of(), targets_of(tmp_path)))
    table = pq.read_table(path)
    assert table.schema.field("start").type == pa.timestamp("ns", "UTC")
    assert table["start"].to_numpy()[0] == START
    metadata = {k.decode(): v.decode() for k, v in table.schema.metadata.items()}
    assert metadata["hourarc.software"] == f"hourarc {hourarc.__version__}"
    assert json.loads(metadata["hourarc.limits"])["sun_separation_min_deg"] == 30.0
    assert json.loads(metadata["hourarc.targets"])["rows_read"] == 5


def test_csv(tmp_path: Path) -> None:
    path = written(tmp_path, "windows.csv", windows_table(windows_of(), targets_of(tmp_path)))
    lines = path.read_text().splitlines()
    comments = [line for line in lines if line.startswith("#")]
    assert any(line.startswith("# hourarc.earth_orientation: ") for line in comments)
    assert "# column duration_s [s]: stop minus start" in comments
    rows = list(csv.DictReader(line for line in lines if not line.startswith("#")))
    assert rows[0]["start"] == "2026-03-10T18:00:00.123456" and rows[0]["duration_s"] == "420"
    assert [row["name"] for row in rows] == ["A", "A", "C"]


def test_names_with_commas_and_quotes(tmp_path: Path) -> None:
    path = written(tmp_path, "blocked.csv", blocked_table(windows_of(), targets_of(tmp_path)))
    (row,) = csv.DictReader(line for line in path.read_text().splitlines() if not line.startswith("#"))
    assert row["name"] == 'B, the "second"'


def test_ecsv_reads_back_with_astropy(tmp_path: Path) -> None:
    table = pytest.importorskip("astropy.table").Table
    path = written(tmp_path, "windows.ecsv", windows_table(windows_of(), targets_of(tmp_path)))
    read = table.read(path, format="ascii.ecsv")
    assert read["duration_s"].unit == "s" and read["row"].tolist() == [1, 1, 4]
    assert read["start"][0] == "2026-03-10T18:00:00.123456"
    assert read["start"].description and read["start"].meta["ucd"]
    assert read.meta["hourarc.site"]["name"] == "Saltpan Ridge"
    assert read.meta["hourarc.night"] == "2026-03-10"
    blocked = table.read(
        written(tmp_path, "b.ecsv", blocked_table(windows_of(), targets_of(tmp_path))), format="ascii.ecsv"
    )
    assert blocked["name"][0] == 'B, the "second"'


def test_the_record_of_origin(tmp_path: Path) -> None:
    record = record_of(tmp_path)
    assert record["command"] == "hourarc night 'a plan.toml' t.csv --night 2026-03-10"
    assert record["targets"]["sha256"] == targets_of(tmp_path).sha256  # type: ignore[index]
    assert record["targets"]["planned"] + record["targets"]["rejected"] == record["targets"]["rows_read"]  # type: ignore[index]
    assert record["site"]["pressure_hpa"] > 0  # type: ignore[index]
    sources = record["earth_orientation"]["sources"]  # type: ignore[index]
    assert len(sources) == 3 and all(len(sha256) == 64 for sha256 in sources.values())
    assert "caution" not in record
    assert record == record_of(tmp_path), "nothing in the record changes from run to run"


@pytest.mark.filterwarnings("ignore::hourarc.errors.SunLimitWarning")
@pytest.mark.parametrize("limit", ["sun_separation_min_deg = 29.9", "sun_separation_min_deg = 'off'"])
def test_a_lowered_sun_limit_stands_in_the_record(tmp_path: Path, limit: str) -> None:
    assert "never the interlock" in str(record_of(tmp_path, limit)["caution"])


def test_rejected_rows_as_csv(tmp_path: Path) -> None:
    rejected = Rejected()
    rejected.add(7, 'B, "x"', "dec", "91", "outside -90 to 90 deg")
    with WholeFiles() as files:
        write_rejected(rejected, tmp_path / "r.csv", {"software": "hourarc"}, files)
    lines = (tmp_path / "r.csv").read_text().splitlines()
    assert lines[0] == "# hourarc.software: hourarc"
    (row,) = csv.DictReader(lines[1:])
    assert row == {
        "row": "7",
        "name": 'B, "x"',
        "column": "dec",
        "value": "91",
        "reason": "outside -90 to 90 deg",
    }


def test_files_appear_whole_or_not_at_all(tmp_path: Path) -> None:
    (tmp_path / "one").write_text("older")
    with pytest.raises(ZeroDivisionError), WholeFiles() as files:
        with files.create(tmp_path / "one") as path:
            path.write_text("newer")
        with files.create(tmp_path / "two") as path:
            path.write_text("half")
            raise ZeroDivisionError
    assert (tmp_path / "one").read_text() == "older"
    assert [path.name for path in tmp_path.iterdir()] == ["one"], "nothing unfinished is left"
    with WholeFiles() as files:
        for name in ("one", "two"):
            with files.create(tmp_path / name) as path:
                path.write_text("newer")
            assert not (tmp_path / "two").exists()
    assert {path.name: path.read_text() for path in tmp_path.iterdir()} == {"one": "newer", "two": "newer"}
    fresh = tmp_path / "fresh"
    fresh.write_text("")
    assert (tmp_path / "one").stat().st_mode == fresh.stat().st_mode


def test_the_main_file_appears_last(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    import os

    order: list[str] = []
    replace = os.replace
    monkeypatch.setattr(os, "replace", lambda a, b: (order.append(Path(b).name), replace(a, b)))
    with WholeFiles() as files:
        for name in ("main", "companion"):
            with files.create(tmp_path / name):
                pass
    assert order == ["companion", "main"]


def test_results_that_cannot_be_written(tmp_path: Path) -> None:
    with pytest.raises(WrongInput, match=r"results are written as \.parquet, \.pq, \.csv, \.ecsv"):
        result_format(tmp_path / "windows.xls")
    with pytest.raises(WrongInput, match="there is no folder"):
        result_format(tmp_path / "nowhere" / "windows.csv")
    given = tmp_path / "targets.csv"
    given.write_text("x")
    with pytest.raises(WrongInput, match="which is an input"):
        check_result(given, [given])
    inside = tmp_path / "w.rejected.csv"
    inside.write_text("x")
    with pytest.raises(WrongInput, match="which is an input"):
        check_result(tmp_path / "w.parquet", [inside])


def test_names_of_companions() -> None:
    assert beside("x/windows.parquet", "blocked") == Path("x/windows.blocked.parquet")
    assert beside("x/windows.parquet", "rejected", ".csv") == Path("x/windows.rejected.csv")
