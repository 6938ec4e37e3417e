"""Earth orientation as a value: where it comes from, how far it reaches, what is refused."""

import hashlib
from pathlib import Path

import astropy_iers_data
import hourarc as ha
import numpy as np
import pytest
from hourarc.errors import InvalidArgument, OutsideOrientation, TableError, UnknownName, WrongType

SITE, STAR = ha.Site(-70.4, -24.6, 2635.0), ha.Catalog(83.8, -5.4)


def sha256(path):
    return hashlib.sha256(Path(path).read_bytes()).hexdigest()


def test_packaged_tables_and_their_provenance():
    orientation = ha.earth.Orientation.packaged()
    provenance = orientation.provenance
    assert provenance.origin == f"astropy-iers-data {astropy_iers_data.__version__}"
    hashes = [source.sha256 for source in provenance.sources]
    files = (
        astropy_iers_data.IERS_B_FILE,
        astropy_iers_data.IERS_A_FILE,
        astropy_iers_data.IERS_LEAP_SECOND_FILE,
    )
    assert hashes == [sha256(path) for path in files]
    assert provenance.first == np.datetime64("1962-01-01")  # the first line of C04
    assert provenance.first < provenance.last_measured < provenance.last
    record = provenance.to_dict()
    assert record["last"] == str(provenance.last) and len(record["sources"]) == 3
    assert "policy 'extrapolate'" in repr(orientation)
    assert ha.Orientation is ha.earth.Orientation


def test_values_at_instants_have_their_shape():
    orientation = ha.earth.Orientation.packaged()
    one = orientation.at("2020-06-01")
    assert one.xp_arcsec.shape == () and one.quality_words == "measured"
    # finals2000A and C04 for 2020-06-01 (MJD 59001), as astropy's own reader gives C04.
    iers = pytest.importorskip("astropy.utils.iers")
    table = iers.IERS_B.open(astropy_iers_data.IERS_B_FILE)
    row = table[int(59_001 - table["MJD"][0].value)]
    assert float(one.ut1_minus_utc_s) == pytest.approx(row["UT1_UTC"].to_value("s"), abs=1e-9)
    assert float(one.xp_arcsec) == pytest.approx(row["PM_x"].to_value("arcsec"), abs=1e-9)
    assert float(one.dx_mas) == pytest.approx(row["dX_2000A"].to_value("mas"), abs=1e-6)
    many = orientation.at([["2020-06-01", "2024-01-01"], ["2200-01-01", "NaT"]])
    assert many.ut1_error_s.shape == (2, 2)
    assert many.xp_arcsec[0, 0] == one.xp_arcsec
    assert many.quality_words[1, 0] == "extrapolated"
    assert many.status[0].tolist() == [0, 0]
    assert many.status_words.tolist()[1] == ["orientation_extrapolated", "not_a_time"]
    assert np.isnan(many.ut1_minus_utc_s[1, 1])
    table = many.to_table()
    assert table["xp_arcsec"].unit == "arcsec" and len(table) == 4


def test_past_the_table_it_goes_on_or_refuses():
    assert ha.place(SITE, STAR, "2035-01-01").status_words.tolist() == ["orientation_extrapolated"]
    strict = ha.earth.Orientation.packaged(policy="strict")
    last = strict.provenance.last
    ha.place(SITE, STAR, last, orientation=strict)
    beyond = str(last + np.timedelta64(1, "D"))
    calls = {
        "when": lambda: ha.place(SITE, STAR, beyond, orientation=strict),
        "start, stop": lambda: ha.windows(SITE, STAR, last, beyond, orientation=strict),
        "almanac: nights": lambda: ha.almanac(SITE, beyond, 1, orientation=strict),
    }
    for what, call in calls.items():
        with pytest.raises(OutsideOrientation) as caught:
            call()
        text = str(caught.value)
        assert text.startswith(f"{what}: given {beyond}") and "allowed 1962-01-01 to" in text
        assert "policy 'strict'" in text and "astropy-iers-data" in text
    with pytest.raises(OutsideOrientation):
        ha.rise_transit_set(SITE, STAR, "1961-06-01", "1961-06-02", orientation=strict)
    assert ha.place(SITE, STAR, np.datetime64("NaT"), orientation=strict).status_words.tolist() == [
        "not_a_time"
    ]


def test_constant_values():
    orientation = ha.earth.Orientation.constant(0.25, 0.1, 0.2, 0.3, -0.4)
    row = orientation.at(["1975-01-01", "2030-01-01"])
    assert np.allclose(row.ut1_minus_utc_s, 0.25, atol=1e-14)
    assert np.allclose(row.yp_arcsec, 0.2, atol=1e-15) and np.allclose(row.dy_mas, -0.4, atol=1e-15)
    assert orientation.provenance.last is None and orientation.provenance.origin == "constant"
    with pytest.raises(WrongType, match="Orientation.constant: dut1_s: given 'x'"):
        ha.earth.Orientation.constant("x", 0, 0)
    with pytest.raises(InvalidArgument, match="Orientation.constant: xp_arcsec: given nan"):
        ha.earth.Orientation.constant(0, np.nan, 0)


def test_tables_from_a_file_are_told_apart(tmp_path):
    finals = ha.earth.Orientation.from_file(astropy_iers_data.IERS_A_FILE)
    c04 = ha.earth.Orientation.from_file(astropy_iers_data.IERS_B_FILE)
    assert finals.provenance.first == np.datetime64("1973-01-02")
    assert c04.provenance.first == np.datetime64("1962-01-01")
    assert c04.provenance.last == c04.provenance.last_measured
    assert c04.provenance.sources[0].name == "C04 eopc04.1962-now"
    same = ha.earth.Orientation.from_file(
        astropy_iers_data.IERS_A_FILE, leap_seconds=astropy_iers_data.IERS_LEAP_SECOND_FILE
    )
    assert same.provenance.to_dict() == finals.provenance.to_dict()


def test_files_that_are_no_tables(tmp_path):
    Orientation = ha.earth.Orientation
    with pytest.raises(TableError, match="absent.txt: cannot be read"):
        Orientation.from_file(tmp_path / "absent.txt")
    empty = tmp_path / "empty.txt"
    empty.write_text("# only a comment\n")
    with pytest.raises(InvalidArgument, match="a file without a line of data"):
        Orientation.from_file(empty)
    words = tmp_path / "words.txt"
    words.write_text("this is no table\n")
    with pytest.raises(TableError, match=r"words\.txt, line 1"):
        Orientation.from_file(words)
    binary = tmp_path / "binary.txt"
    binary.write_bytes(b"\xff\xfe\x00")
    with pytest.raises(TableError, match="byte 0 is not ASCII"):
        Orientation.from_file(binary)
    lines = Path(astropy_iers_data.IERS_B_FILE).read_text().splitlines()
    torn = tmp_path / "torn.txt"
    torn.write_text("\n".join([*lines[:20], lines[20][:40]]))
    with pytest.raises(TableError, match=r"torn\.txt, line 21"):
        Orientation.from_file(torn)
    with pytest.raises(TableError, match=r"words\.txt, line 1"):
        Orientation.from_file(astropy_iers_data.IERS_B_FILE, leap_seconds=words)


def test_what_is_no_orientation():
    with pytest.raises(UnknownName, match="Orientation: policy: given 'strickt', .*nearest is 'strict'"):
        ha.earth.Orientation.packaged(policy="strickt")
    with pytest.raises(WrongType, match="orientation: given 'packaged'"):
        ha.place(SITE, STAR, "2026-03-10", orientation="packaged")
    with pytest.raises(TypeError, match="is made by Orientation.packaged"):
        ha.earth.Orientation()
    with pytest.raises(AttributeError, match="an Orientation does not change"):
        ha.earth.Orientation.packaged().policy = "strict"


def test_earth_functions_keep_shapes_and_bits():
    day, fraction = np.array([[54_195.0, 60_000.0], [41_317.0, 73_000.0]]), 0.25
    angles = ha.earth.rotation_angle(day, fraction)
    assert angles.shape == (2, 2)
    assert isinstance(ha.earth.rotation_angle(54_195.0, 0.25), float)
    for index in np.ndindex(2, 2):
        assert ha.earth.rotation_angle(day[index], fraction) == angles[index]
        alone = ha.earth.precession_nutation(day[index], fraction)
        assert alone.shape == (3, 3)
        assert np.array_equal(alone, ha.earth.precession_nutation(day, fraction)[index])
    assert ha.earth.bias_precession_nutation(day).shape == (2, 2, 3, 3)
    assert ha.earth.sidereal_time(day, day[0]).shape == (2, 2)
    mean = ha.earth.sidereal_time(54_195.0, 54_195.0, apparent=False)
    apparent = ha.earth.sidereal_time(54_195.0, 54_195.0)
    assert 0.0 < abs(mean - apparent) < np.radians(20.0 / 3600.0)
    assert np.isnan(ha.earth.rotation_angle(np.nan))
    assert ha.earth.rotation_angle([]).shape == (0,)
    with pytest.raises(
        InvalidArgument, match=r"earth.rotation_angle: shapes: given ut1_mjd \(2,\), ut1_fraction \(3,\)"
    ):
        ha.earth.rotation_angle([1, 2], [1, 2, 3])
    with pytest.raises(WrongType, match="earth.sidereal_time: apparent: given 'yes'"):
        ha.earth.sidereal_time(1.0, 1.0, apparent="yes")


def test_great_circles_keep_shapes():
    lon = np.array([[0.0], [90.0]])
    assert ha.separation(lon, 0.0, 0.0, [0.0, 45.0]).shape == (2, 2)
    assert isinstance(ha.separation(0.0, 0.0, 0.0, 90.0), float)
    assert ha.position_angle(0.0, 0.0, [10.0, -10.0], 0.0).tolist() == pytest.approx([90.0, 270.0])
    assert np.isnan(ha.separation(np.nan, 0.0, 0.0, 0.0))
    with pytest.raises(InvalidArgument, match="separation: shapes"):
        ha.separation([1, 2, 3], [1, 2], 0, 0)
