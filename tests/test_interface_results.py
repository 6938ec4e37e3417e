"""Results as tables: units, UCDs, words, missing values."""

import warnings

import hourarc as ha
import numpy as np
import pytest
from hourarc.results import COLUMNS

SITE = ha.Site(-70.4, -24.6, 2635.0)
SPAN = ("2026-03-10T16:41:36", "2026-03-11T16:41:36")
TARGETS = ha.Catalog([130.0, 40.0, np.nan], [-20.0, 85.0, 0.0], name=["up", "never", "bad"])


def results():
    when = np.array(["2026-03-10T04:00", "2026-03-10T05:00"], "M8[m]")
    return {
        "places": ha.place(SITE, TARGETS, when, columns=ha.PLACE_COLUMNS),
        "pairs": ha.place(SITE, TARGETS[:2], when, pairwise=True),
        "events": ha.rise_transit_set(SITE, TARGETS, *SPAN),
        "windows": ha.windows(SITE, TARGETS, *SPAN),
        "almanac": ha.almanac(ha.Site(18.96, 69.65), "2026-11-20", 5),
        "orientation": ha.earth.Orientation.packaged().at(when),
    }


def test_every_ucd_is_one():
    ucd = pytest.importorskip("astropy.io.votable.ucd")
    for name, column in COLUMNS.items():
        assert ucd.check_ucd(column.ucd, check_controlled_vocabulary=True), (name, column.ucd)
        assert column.meaning


def test_every_unit_is_one():
    u = pytest.importorskip("astropy.units")
    for name, column in COLUMNS.items():
        u.Unit(column.unit)
        assert column.unit == "" or name.endswith(
            (
                *(
                    "_deg",
                    "_s",
                    "_d",
                    "_arcsec",
                    "_mag_arcsec2",
                    "_mas",
                    "_au",
                    "_h",
                    "_arcsec_min",
                    "hours",
                    "hours_moonless",
                ),
                *("moon_separation_min", "magnitude_v", "seconds_left", "seconds_to_next"),
            )
        )


@pytest.mark.parametrize("kind", results())
def test_arrow_tables(kind):
    pa = pytest.importorskip("pyarrow")
    result = results()[kind]
    table = result.to_arrow()
    for field in table.schema:
        assert field.name in COLUMNS
        metadata = {key.decode(): value.decode() for key, value in field.metadata.items()}
        assert metadata["ucd"] == COLUMNS[field.name].ucd
        assert metadata.get("unit", "") == COLUMNS[field.name].unit
        if pa.types.is_timestamp(field.type):
            assert field.type == pa.timestamp("ns", tz="UTC")
    if "name" in table.column_names:
        target = table["target"].to_numpy()
        assert table["name"].to_pylist() == TARGETS.name[target].tolist()


def test_arrow_values_are_the_columns():
    pytest.importorskip("pyarrow")
    made = results()
    places, windows, almanac = made["places"], made["windows"], made["almanac"]
    table = places.to_arrow()
    assert table.num_rows == 6
    assert table["target"].to_pylist() == [0, 1, 2, 0, 1, 2]
    assert np.array_equal(table["altitude_deg"].to_numpy(), places.altitude_deg.reshape(-1), equal_nan=True)
    assert np.array_equal(table["time"].to_numpy(), np.repeat(places.time, 3))
    assert table["status"].to_pylist()[2] == "not_finite"
    table = windows.to_arrow()
    assert table["start_reason"].to_pylist() == windows.start_reason_words.tolist()
    assert np.array_equal(table["start"].to_numpy(), windows.start)
    targets = windows.targets_to_arrow()
    assert targets["blocked_by"].to_pylist() == windows.blocked_by_words.tolist()
    assert targets["window_count"].to_pylist() == [1, 0, 0]
    table = almanac.to_arrow()
    assert [str(day) for day in table["night"].to_pylist()] == almanac.night.astype(str).tolist()
    # The Sun sets at that latitude until the polar night of late November: nulls from then on.
    assert table["sunset"].null_count == int(np.isnat(almanac.sunset).sum())


@pytest.mark.parametrize("kind", results())
def test_astropy_tables(kind):
    pytest.importorskip("astropy")
    from astropy.time import Time

    table = results()[kind].to_table()
    for name in table.colnames:
        column = table[name]
        assert column.info.meta["ucd"] == COLUMNS[name].ucd
        assert column.info.description == COLUMNS[name].meaning
        unit = "" if column.info.unit is None else column.info.unit.to_string()
        assert unit == COLUMNS[name].unit
        if isinstance(column, Time):
            assert column.scale == "utc"


def test_astropy_times_are_the_same_instants():
    pytest.importorskip("astropy")
    windows = results()["windows"]
    table = windows.to_table()
    assert np.array_equal(table["start"].datetime64.astype("M8[ns]"), windows.start)
    almanac = results()["almanac"]
    masked = almanac.to_table()["sunset"]
    assert np.array_equal(np.broadcast_to(masked.mask, 5), np.isnat(almanac.sunset))


def test_astropy_times_are_those_astropy_makes():
    Time = pytest.importorskip("astropy.time").Time
    from erfa import ErfaWarning
    from hourarc import interop

    rng = np.random.default_rng(6)
    instants = rng.integers(-315 * 10**15, 2500 * 10**15, 3000).view("M8[ns]")
    edges = [
        "2016-12-31T23:59:59.999999999",
        "2016-12-31",
        "2017-01-01",
        "1961-08-01T00:00:00.1",
        "1969-12-31T23:59",
    ]
    instants = np.concatenate([instants, np.array(edges, "M8[ns]")])
    made = interop._utc(instants)
    with warnings.catch_warnings():
        warnings.simplefilter("ignore", ErfaWarning)
        expected = Time(instants, format="datetime64", scale="utc")
        assert np.array_equal(made.value, expected.value)
    assert np.array_equal(made.jd1, expected.jd1) and np.array_equal(made.jd2, expected.jd2)
    assert made.format == "datetime64"


def test_a_missing_package_is_named(monkeypatch):
    import sys

    for name, call in (("pyarrow", "to_arrow"), ("astropy", "to_table")):
        with monkeypatch.context() as patch:
            patch.setitem(sys.modules, name, None)
            with pytest.raises(
                ha.errors.MissingPackage, match=f"{name} is not installed; pip install 'hourarc"
            ):
                getattr(results()["events"], call)()
