"""Catalogues and bodies: columns, broadcasting, bad rows, SkyCoord."""

import pickle

import hourarc as ha
import numpy as np
import pytest
from hourarc.errors import InvalidArgument, UnknownName, WrongType

WHEN = "2026-03-10T04:05:06"
SITE = ha.Site(-70.4, -24.6, 2635.0)


def test_scalars_are_spread_over_the_rows():
    stars = ha.Catalog([10.0, 20.0, 30.0], -5, epoch_yr=1991.25, parallax_mas=[1, 2, 3])
    assert len(stars) == 3
    for column in (
        stars.ra_deg,
        stars.dec_deg,
        stars.epoch_yr,
        stars.pm_ra_mas_yr,
        stars.radial_velocity_km_s,
    ):
        assert column.shape == (3,) and column.dtype == np.float64
    assert stars.parallax_mas.tolist() == [1.0, 2.0, 3.0]
    assert len(ha.Catalog(10.0, 20.0)) == 1
    assert len(ha.Catalog([], [])) == 0
    assert repr(stars) == "<Catalog of 3 rows>"


def test_columns_of_different_lengths_are_named():
    with pytest.raises(
        InvalidArgument, match=r"Catalog: columns of different lengths: .*ra_deg 3, dec_deg 2"
    ):
        ha.Catalog([1, 2, 3], [1, 2])
    with pytest.raises(InvalidArgument, match=r"Catalog: ra_deg: given an array of shape \(2, 2\)"):
        ha.Catalog([[1, 2], [3, 4]], 0)
    with pytest.raises(InvalidArgument, match="Catalog: name: given 2 names"):
        ha.Catalog([1, 2, 3], 0, name=["a", "b"])


@pytest.mark.parametrize(
    "value", ["12 30 00", ["1.5", "2.5"], np.array(["1.5"], object), b"1", [1 + 2j], True, [[1], [2, 3]]]
)
def test_what_is_no_number_is_refused(value):
    with pytest.raises(WrongType, match=r"Catalog: ra_deg: given .*allowed a number or an array of numbers"):
        ha.Catalog(value, 0.0)


def test_any_number_type_and_layout_gives_the_same_bits():
    base = np.arange(12, dtype=np.float64)
    expected = ha.place(SITE, ha.Catalog(base, 0.0), WHEN).altitude_deg
    several = (
        base.astype(np.int16),
        base.astype(">f8"),
        base.astype(np.float32),
        np.repeat(base, 2)[::2],
        base.tolist(),
        np.array(base.tolist(), object),
        np.ma.MaskedArray(base),
    )
    for given in several:
        assert np.array_equal(ha.place(SITE, ha.Catalog(given, 0.0), WHEN).altitude_deg, expected)


def test_a_catalogue_does_not_change():
    ra = np.array([10.0, 20.0])
    stars = ha.Catalog(ra, 0.0)
    before = ha.place(SITE, stars, WHEN).altitude_deg
    ra[:] = 99.0
    assert stars.ra_deg.tolist() == [10.0, 20.0]
    assert np.array_equal(ha.place(SITE, stars, WHEN).altitude_deg, before)
    with pytest.raises(ValueError):
        stars.ra_deg[0] = 1.0
    with pytest.raises(AttributeError, match="a Catalog does not change"):
        stars.ra_deg = ra


def test_rows_can_be_chosen():
    stars = ha.Catalog([10.0, 20.0, 30.0], 0.0, name=["a", "b", "c"])
    assert stars[1:].name.tolist() == ["b", "c"]
    assert stars[np.array([True, False, True])].ra_deg.tolist() == [10.0, 30.0]
    assert stars[[2, 0]].name.tolist() == ["c", "a"]
    assert stars[-1].ra_deg.tolist() == [30.0]
    again = pickle.loads(pickle.dumps(stars))
    assert again.ra_deg.tolist() == stars.ra_deg.tolist() and again.name.tolist() == ["a", "b", "c"]


BAD_ROWS = {
    "not_finite": {"ra_deg": np.nan},
    "right_ascension_out_of_range": {"ra_deg": 360.001},
    "declination_out_of_range": {"dec_deg": 90.001},
    "proper_motion_out_of_range": {"pm_ra_mas_yr": 100_001.0},
    "parallax_out_of_range": {"parallax_mas": 2_001.0},
    "radial_velocity_out_of_range": {"radial_velocity_km_s": 30_001.0},
    "epoch_out_of_range": {"epoch_yr": 1699.0},
}


@pytest.mark.parametrize("word", BAD_ROWS)
def test_a_bad_row_touches_only_itself(word):
    good = {"ra_deg": 50.0, "dec_deg": -20.0, "epoch_yr": 2000.0, "pm_ra_mas_yr": 1.0, "parallax_mas": 1.0}
    good["radial_velocity_km_s"] = 10.0
    columns = {key: [value, (good | BAD_ROWS[word])[key], value] for key, value in good.items()}
    stars = ha.Catalog(columns.pop("ra_deg"), columns.pop("dec_deg"), **columns)
    assert stars.status_words.tolist() == ["ok", word, "ok"]
    assert stars.bad.tolist() == [False, True, False]
    assert "1 out of range" in repr(stars)
    alone = ha.place(SITE, stars[:1], WHEN)
    places = ha.place(SITE, stars, WHEN)
    for column in places.columns:
        values = places[column]
        assert np.isnan(values[1])
        assert values[0].tobytes() == values[2].tobytes() == alone[column][0].tobytes()
    assert places.status_words.tolist() == ["ok", word, "ok"]


def test_masked_entries_are_bad_rows():
    ra = np.ma.MaskedArray([10.0, 20.0], mask=[False, True])
    assert ha.Catalog(ra, 0.0).status_words.tolist() == ["ok", "not_finite"]


def test_bodies():
    bodies = ha.Bodies(["sun", "moon", "mars"])
    assert len(bodies) == 3 and repr(bodies) == "<Bodies sun, moon, mars>"
    assert ha.Bodies("moon").name.tolist() == ["moon"]
    assert pickle.loads(pickle.dumps(bodies)).name.tolist() == ["sun", "moon", "mars"]
    with pytest.raises(
        UnknownName, match="Bodies: name: given 'mooon', which is unknown; the nearest is 'moon'"
    ):
        ha.Bodies(["sun", "mooon"])
    with pytest.raises(WrongType, match="Bodies: name: given 3"):
        ha.Bodies([3])


def test_targets_of_another_kind():
    with pytest.raises(
        WrongType, match=r"targets: given 'moon' \(str\), allowed a Catalog, .*Bodies\(\['moon'\]\)"
    ):
        ha.place(SITE, "moon", WHEN)
    with pytest.raises(WrongType, match="targets: given None"):
        ha.place(SITE, None, WHEN)


def test_units_are_converted_and_never_dropped():
    u = pytest.importorskip("astropy.units")
    stars = ha.Catalog(
        [1.0, 2.0] * u.hourangle, np.radians([10.0, 20.0]) * u.rad, parallax_mas=0.1 * u.arcsec
    )
    assert np.allclose(stars.ra_deg, [15.0, 30.0], atol=1e-13)
    assert np.allclose(stars.dec_deg, [10.0, 20.0], atol=1e-13)
    assert np.allclose(stars.parallax_mas, 100.0, atol=1e-12)
    with pytest.raises(
        InvalidArgument, match="Catalog: dec_deg: given a value in m, allowed a unit that converts"
    ):
        ha.Catalog(1.0, 2.0 * u.m)


def test_skycoord_carries_everything():
    coordinates = pytest.importorskip("astropy.coordinates")
    from astropy import units as u
    from astropy.time import Time

    barnard = coordinates.SkyCoord(
        ra=269.452 * u.deg,
        dec=4.6934 * u.deg,
        pm_ra_cosdec=-801.551 * u.mas / u.yr,
        pm_dec=10362.394 * u.mas / u.yr,
        distance=coordinates.Distance(parallax=546.976 * u.mas),
        radial_velocity=-110.51 * u.km / u.s,
        obstime=Time("J2016", scale="tcb"),
        frame="icrs",
    )
    star = ha.Catalog.from_skycoord(barnard, name=["Barnard's star"])
    expected = {
        "ra_deg": 269.452,
        "dec_deg": 4.6934,
        "pm_ra_mas_yr": -801.551,
        "pm_dec_mas_yr": 10362.394,
        "parallax_mas": 546.976,
        "radial_velocity_km_s": -110.51,
        "epoch_yr": 2016.0,
    }
    for key, value in expected.items():
        assert getattr(star, key)[0] == pytest.approx(value, rel=1e-9), key
    taken = ha.place(SITE, barnard, WHEN)
    assert taken.altitude_deg.tolist() == ha.place(SITE, star, WHEN).altitude_deg.tolist()


def test_skycoord_of_directions_only_and_in_other_frames():
    coordinates = pytest.importorskip("astropy.coordinates")
    from astropy import units as u

    plain = ha.Catalog.from_skycoord(coordinates.SkyCoord([10.0, 20.0] * u.deg, [1.0, 2.0] * u.deg))
    assert len(plain) == 2
    for column in (plain.pm_ra_mas_yr, plain.parallax_mas, plain.radial_velocity_km_s):
        assert np.all(column == 0.0)
    assert np.all(plain.epoch_yr == 2000.0)
    # The galactic centre of the IAU 1958 system in ICRS, as Reid & Brunthaler 2004 (ApJ 616, 872) give it.
    centre = ha.Catalog.from_skycoord(coordinates.SkyCoord(0.0 * u.deg, 0.0 * u.deg, frame="galactic"))
    assert centre.ra_deg[0] == pytest.approx(266.404_996, abs=1e-5)
    assert centre.dec_deg[0] == pytest.approx(-28.936_17, abs=1e-5)
    moving = coordinates.SkyCoord(
        ra=[10.0] * u.deg, dec=[0.0] * u.deg, pm_ra_cosdec=[5.0] * u.mas / u.yr, pm_dec=[6.0] * u.mas / u.yr
    )
    galactic = ha.Catalog.from_skycoord(moving.galactic)
    assert galactic.pm_ra_mas_yr[0] == pytest.approx(5.0, abs=1e-6)
    assert galactic.pm_dec_mas_yr[0] == pytest.approx(6.0, abs=1e-6)
    with pytest.raises(WrongType, match="an astropy SkyCoord"):
        ha.Catalog.from_skycoord([1, 2])
