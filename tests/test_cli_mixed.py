"""Lists of every kind together: tables, files of orbits and bodies, in `hourarc sky`, `night` and `year`."""

from __future__ import annotations

import csv
import json
from pathlib import Path

import hourarc
import numpy as np
import pyarrow.parquet as pq
import pytest
from hourarc.cli._run import run
from test_interface_orbits import CERES, COMET

PLAN = """
[site]
name = "Saltpan Ridge"
longitude_deg = 24.5
latitude_deg = -20.9
height_m = 1148
[limits]
altitude_min_deg = 20
"""
SITE = hourarc.Site(24.5, -20.9, 1148.0, name="Saltpan Ridge")
AT = "2023-09-15T20:00"


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    (tmp_path / "plan.toml").write_text(PLAN)
    (tmp_path / "stars.csv").write_text("name,ra,dec\nA,300,-20\nB,310,95\nC,320,-30\n")
    lines = ["A heading", "-" * 160, CERES, CERES[:75], COMET, CERES.replace("K239D", "K2#9D")]
    (tmp_path / "orbits.txt").write_text("\n".join(lines) + "\n")
    return tmp_path


def said(capsys: pytest.CaptureFixture[str], code: int, *arguments: object) -> str:
    capsys.readouterr()
    assert run([str(a) for a in arguments]) == code
    printed = capsys.readouterr()
    return printed.out + printed.err


def csv_rows(path: Path) -> list[dict[str, str]]:
    return list(csv.DictReader(line for line in path.read_text().splitlines() if not line.startswith("#")))


def test_orbits_alone(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    output = folder / "sky.parquet"
    printed = said(capsys, 3, "sky", folder / "plan.toml", folder / "orbits.txt", "--at", AT, "-o", output)
    assert "4 rows read = 2 placed + 2 rejected" in printed
    assert 'row 4, column "76-103"' in printed and "ends at column" in printed
    assert "1 orbit is so far from the epoch" in printed
    found = pq.read_table(output)
    # A row is a line of the file.
    assert found["row"].to_pylist() == [3, 5] and found["name"].to_pylist() == ["1", "C/1995 O1"]
    assert "source" not in found.column_names
    assert found["status"].to_pylist() == ["ok", "far_from_epoch"]
    orbits = hourarc.Orbits.from_mpc(folder / "orbits.txt")
    places = hourarc.place(SITE, orbits, AT, columns=hourarc.PLACE_COLUMNS)
    for name in hourarc.PLACE_COLUMNS:
        assert np.array_equal(found[name].to_numpy(), places[name], equal_nan=True), name
    rejected = csv_rows(folder / "sky.rejected.csv")
    assert [(row["row"], row["column"]) for row in rejected] == [("4", "76-103"), ("6", "21-25")]
    assert rejected[1]["value"] == "K2#9D"


def test_everything_together(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    plan = folder / "plan.toml"
    plan.write_text(PLAN + '[targets]\nbodies = ["moon", "saturn"]\n')
    stars, orbits, output = folder / "stars.csv", folder / "orbits.txt", folder / "sky.csv"
    printed = said(capsys, 3, "sky", plan, stars, orbits, "--at", AT, "-o", output)
    assert "9 rows read = 6 placed + 3 rejected" in printed
    rows = csv_rows(output)
    assert [row["name"] for row in rows] == ["A", "C", "1", "C/1995 O1", "moon", "saturn"]
    assert [row["source"] for row in rows] == [str(stars)] * 2 + [str(orbits)] * 2 + ["--bodies"] * 2
    assert rows[0]["distance_au"] in ("", "nan") and float(rows[5]["distance_au"]) > 8.0
    rejected = csv_rows(folder / "sky.rejected.csv")
    assert [(Path(row["source"]).name, row["row"]) for row in rejected] == [
        ("stars.csv", "2"),
        ("orbits.txt", "4"),
        ("orbits.txt", "6"),
    ]
    assert '"bodies": ["moon", "saturn"]' in output.read_text()
    assert "stars.csv is given twice" in said(capsys, 2, "sky", plan, stars, stars, "--at", AT)


def test_a_night_of_everything(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    plan, output = folder / "plan.toml", folder / "windows.parquet"
    plan.write_text(PLAN + '[targets]\nbodies = ["saturn"]\n')
    files = (folder / "stars.csv", folder / "orbits.txt")
    printed = said(capsys, 3, "night", plan, *files, "--night", "2023-09-15", "-o", output)
    assert "8 rows read = 5 planned + 3 rejected" in printed
    found = pq.read_table(output)
    night = hourarc.almanac(SITE, "2023-09-15", 1)
    limits = hourarc.Limits(altitude_min_deg=20.0)
    kinds = {
        str(files[0]): hourarc.Catalog([300.0, 320.0], [-20.0, -30.0]),
        str(files[1]): hourarc.Orbits.from_mpc(files[1]),
        "--bodies": hourarc.Bodies(["saturn"]),
    }
    total = 0
    for source, targets in kinds.items():
        windows = hourarc.windows(SITE, targets, night.start[0], night.stop[0], limits)
        mine = found.filter([each == source for each in found["source"].to_pylist()])
        np.testing.assert_array_equal(mine["start"].to_numpy(), windows.start)
        total += len(windows.start)
    assert total == found.num_rows >= 3
    blocked = pq.read_table(folder / "windows.blocked.parquet")
    named = set(found["name"].to_pylist()) | set(blocked["name"].to_pylist())
    assert named == {"A", "C", "1", "C/1995 O1", "saturn"}
    with_windows = len(set(zip(found["source"].to_pylist(), found["row"].to_pylist(), strict=True)))
    have = "target has" if with_windows == 1 else "targets have"
    assert f"{with_windows} {have}" in printed


def test_a_year_of_orbits(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    call = ("year", folder / "plan.toml", folder / "orbits.txt", "--from", "2023-09-10", "--nights", "3")
    printed = said(capsys, 3, *call, "-o", folder / "year.zarr")
    assert "4 rows read = 2 planned + 2 rejected" in printed
    assert json.loads((folder / "year.zarr" / "zarr.json").read_text())


@pytest.mark.parametrize(
    ("section", "words"),
    [
        ('kind = "orbits"', "one of table, mpc_orbits"),
        ('bodies = ["marz"]', "the nearest is 'mars'"),
        ('bodies = "mars"', "a list of names is needed"),
        ("bodies = [3]", "bodies"),
    ],
)
def test_a_wrong_section_names_its_line(
    folder: Path, capsys: pytest.CaptureFixture[str], section: str, words: str
) -> None:
    plan = folder / "plan.toml"
    plan.write_text(PLAN + f"[targets]\n{section}\n")
    printed = said(capsys, 2, "sky", plan, folder / "stars.csv", "--at", AT)
    assert words in printed and "line 10" in printed


def test_the_kind_may_be_said(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    plan, odd = folder / "plan.toml", folder / "orbits.csv"
    odd.write_bytes((folder / "orbits.txt").read_bytes())
    assert "no column for" in said(capsys, 2, "sky", plan, odd, "--at", AT)
    plan.write_text(PLAN + '[targets]\nkind = "mpc_orbits"\n')
    assert "2 placed" in said(capsys, 3, "sky", plan, odd, "--at", AT)
    printed = said(capsys, 2, "sky", plan, folder / "stars.csv", "--at", AT)
    assert "none of the 4 lines is an orbit" in printed


def test_a_kernel_for_bodies(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    plan, kernel = folder / "plan.toml", folder / "excerpt.bsp"
    kernel.write_bytes((Path(__file__).parent / "data" / "de440-excerpt.bsp").read_bytes())
    plan.write_text(PLAN + '[targets]\nephemeris = "excerpt.bsp"\n')
    call = ("sky", plan, "--bodies", "mars,moon", "-o", folder / "sky.csv", "--at")
    printed = said(capsys, 0, *call, "2025-11-10T09:00")
    # The report has magnitudes where bodies are among the highest.
    assert " V\n" in printed
    assert "excerpt.bsp" in (folder / "sky.csv").read_text()
    bodies = hourarc.Bodies(["mars", "moon"], ephemeris=kernel)
    places = hourarc.place(SITE, bodies, "2025-11-10T09:00")
    found = [float(row["altitude_deg"]) for row in csv_rows(folder / "sky.csv")]
    assert found == pytest.approx(places.altitude_deg, abs=1e-9)
    # Outside its span no body has a place.
    assert "outside the span of" in said(capsys, 3, *call, "2024-11-10T09:00")
    plan.write_text(PLAN + '[targets]\nephemeris = "none.bsp"\n')
    assert "none.bsp" in said(capsys, 1, *call, "2025-11-10T09:00")
    plan.write_text(PLAN + "[targets]\nephemeris = 440\n")
    assert "a path is needed" in said(capsys, 2, *call, "2025-11-10T09:00")


def test_what_orbits_do_not_have(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    plan, orbits = folder / "plan.toml", folder / "orbits.txt"
    exposures = ("annotate", plan, orbits, "-o", folder / "out.csv")
    assert "the file holds orbits" in said(capsys, 2, *exposures)
    plan.write_text(PLAN.replace("= 20", '= { column = "low" }'))
    printed = said(capsys, 2, "night", plan, orbits, "--night", "2023-09-15")
    assert "orbit lines have no columns" in printed
