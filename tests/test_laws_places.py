"""Laws that places obey whatever the star, the site and the instant."""

import hourarc
import numpy as np
import pytest
from bridge import random_directions

COLUMNS = (*hourarc.PLACE_COLUMNS,)
WHEN = np.datetime64("2026-03-10T22:00:00") + np.arange(0, 50) * np.timedelta64(37, "m")


@pytest.fixture(scope="module")
def stars():
    rng = np.random.default_rng(11)
    motion = rng.normal(0.0, 300.0, (2, 500))
    return hourarc.Catalog(
        *random_directions(rng, 500),
        epoch_yr=1991.25,
        pm_ra_mas_yr=motion[0],
        pm_dec_mas_yr=motion[1],
        parallax_mas=rng.uniform(0, 200, 500),
        radial_velocity_km_s=rng.normal(0, 50, 500),
    )


@pytest.fixture(scope="module")
def site():
    return hourarc.Site(-70.4, -24.6, 2635.0)


@pytest.fixture(scope="module")
def bare():
    """A site without air, on an Earth whose terrestrial pole is the pole of date."""
    return hourarc.Site(-70.4, -24.6, 2635.0, pressure_hpa=0.0), hourarc.earth.Orientation.constant(
        0.0, 0.0, 0.0
    )


def same_bits(one, other):
    """NaN equals NaN, and nothing else is forgiven."""
    return np.array_equal(
        np.ascontiguousarray(one).view(np.uint64), np.ascontiguousarray(other).view(np.uint64)
    )


def test_spherical_triangle_zenith_pole_star(bare, stars):
    site, orientation = bare
    p = hourarc.place(site, stars, WHEN, orientation=orientation)
    latitude = np.radians(site.latitude_deg)
    h, a, hour, dec = np.radians([p.altitude_deg, p.azimuth_deg, p.hour_angle_deg, p.declination_deg])
    q = np.radians(p.parallactic_angle_deg)
    # Cosine rule, sine rule, and the third relation, which fixes the quadrant.
    cosine = np.sin(latitude) * np.sin(dec) + np.cos(latitude) * np.cos(dec) * np.cos(hour)
    assert np.abs(np.sin(h) - cosine).max() < 1e-9
    assert np.abs(np.sin(a) * np.cos(h) + np.sin(hour) * np.cos(dec)).max() < 1e-9
    third = np.sin(dec) * np.cos(latitude) - np.cos(dec) * np.sin(latitude) * np.cos(hour)
    assert np.abs(np.cos(a) * np.cos(h) - third).max() < 1e-9
    # The parallactic angle by the sine rule: positive in the west.
    assert np.abs(np.sin(q) * np.cos(h) - np.cos(latitude) * np.sin(hour)).max() < 1e-8
    assert np.all((p.azimuth_deg >= 0.0) & (p.azimuth_deg < 360.0))
    assert np.all((p.hour_angle_deg >= -180.0) & (p.hour_angle_deg <= 180.0))
    assert np.all(np.abs(p.altitude_deg) <= 90.0)


def test_celestial_pole_stands_as_high_as_the_latitude():
    # Within the aberration (20.5″), the precession since J2000 (9′) and refraction (none).
    north, south = hourarc.Catalog(0.0, 90.0), hourarc.Catalog(0.0, -90.0)
    for latitude in (90.0, 60.0, 10.0, 0.0, -33.0, -90.0):
        site = hourarc.Site(12.0, latitude, 0.0, pressure_hpa=0.0)
        up = hourarc.place(site, north, "2000-01-01T12:00").altitude_deg[0]
        down = hourarc.place(site, south, "2000-01-01T12:00").altitude_deg[0]
        assert up == pytest.approx(latitude, abs=40 / 3600)
        assert down == pytest.approx(-latitude, abs=40 / 3600)


def test_same_star_stands_elsewhere_from_elsewhere(stars):
    sites = [hourarc.Site(0.0, latitude, pressure_hpa=0.0) for latitude in (20.0, 21.0)]
    one, other = (hourarc.place(here, stars, WHEN[0]).altitude_deg for here in sites)
    assert np.median(np.abs(one - other)) > 0.3
    assert np.abs(one - other).max() < 1.0 + 1e-3  # a degree at most, and diurnal aberration and parallax


def test_stars_turn_once_in_a_sidereal_day(bare, stars):
    # 86164.0905 s: back to a few tenths of an arcsecond of aberration, precession and parallax.
    site, orientation = bare
    later = WHEN[:1] + np.timedelta64(86_164_090_500_000, "ns")
    one = hourarc.place(site, stars, WHEN[:1], orientation=orientation)
    other = hourarc.place(site, stars, later, orientation=orientation)
    assert np.abs(one.altitude_deg - other.altitude_deg).max() * 3600 < 1.0


def test_scalar_and_batch_give_the_same_bits(site, stars):
    batch = hourarc.place(site, stars, WHEN, columns=COLUMNS)
    for i in (0, 17, 499):
        for j in (0, 31):
            one = hourarc.place(site, stars[i], WHEN[j], columns=COLUMNS)
            for name in COLUMNS:
                assert same_bits(one[name], batch[name][j, i : i + 1]), (name, i, j)


def test_any_order_of_stars_gives_the_same_bits(site, stars):
    order = np.random.default_rng(5).permutation(len(stars))
    one = hourarc.place(site, stars, WHEN[:5], columns=COLUMNS)
    other = hourarc.place(site, stars[order], WHEN[:5], columns=COLUMNS)
    for name in COLUMNS:
        assert same_bits(one[name][:, order], other[name]), name


def test_any_order_of_times_gives_the_same_bits(site, stars):
    order = np.random.default_rng(6).permutation(len(WHEN))
    one = hourarc.place(site, stars, WHEN, columns=COLUMNS)
    other = hourarc.place(site, stars, WHEN[order], columns=COLUMNS)
    for name in COLUMNS:
        assert same_bits(one[name][order], other[name]), name


def test_any_number_of_threads_gives_the_same_bits(site, stars):
    one = hourarc.place(site, stars, WHEN, columns=COLUMNS, threads=1)
    for threads in (2, 3, 7, None):
        other = hourarc.place(site, stars, WHEN, columns=COLUMNS, threads=threads)
        for name in COLUMNS:
            assert same_bits(one[name], other[name]), (name, threads)


def test_pairwise_is_the_diagonal(site, stars):
    some = stars[: len(WHEN)]
    full = hourarc.place(site, some, WHEN, columns=COLUMNS)
    pairs = hourarc.place(site, some, WHEN, columns=COLUMNS, pairwise=True)
    for name in COLUMNS:
        # The two may take different roads through the levels of state: below 1 µas apart.
        gap = np.abs(np.diagonal(full[name]) - pairs[name])
        gap = np.minimum(gap, np.abs(360.0 - gap))
        scale = np.cos(np.radians(pairs.altitude_deg)) * np.cos(np.radians(pairs.declination_deg))
        known = np.isfinite(pairs[name])
        assert np.array_equal(known, np.isfinite(np.diagonal(full[name])))
        # What is said of bodies only is known of no star.
        if name != "airmass" and known.any():
            assert (gap * scale)[known].max() * 3600e6 < 2.0, name


def test_a_nan_touches_only_its_own_row(site, stars):
    ra, dec = np.array(stars.ra_deg), np.array(stars.dec_deg)
    keywords = {
        name: np.array(getattr(stars, name))
        for name in ("epoch_yr", "pm_ra_mas_yr", "pm_dec_mas_yr", "parallax_mas", "radial_velocity_km_s")
    }
    ra[3], dec[40], keywords["pm_ra_mas_yr"][77], dec[123] = np.nan, 91.0, np.inf, np.nan
    bad = [3, 40, 77, 123]
    broken = hourarc.place(site, hourarc.Catalog(ra, dec, **keywords), WHEN[:4], columns=COLUMNS)
    whole = hourarc.place(site, stars, WHEN[:4], columns=COLUMNS)
    good = np.setdiff1d(np.arange(len(stars)), bad)
    for name in COLUMNS:
        assert same_bits(broken[name][:, good], whole[name][:, good]), name
        assert np.all(np.isnan(broken[name][:, bad])), name
    assert np.all(broken.status[:, bad] >= 16)
    assert np.all(broken.status[:, good] < 16)


def test_a_nat_touches_only_its_own_time(site, stars):
    when = WHEN[:4].astype("datetime64[ns]")
    when[2] = np.datetime64("NaT")
    broken = hourarc.place(site, stars, when)
    whole = hourarc.place(site, stars, WHEN[:4])
    for name in broken.columns:
        assert np.all(np.isnan(broken[name][2])), name
        assert same_bits(broken[name][[0, 1, 3]], whole[name][[0, 1, 3]]), name
    assert set(broken.status_words[2]) == {"not_a_time"}


def test_right_ascension_has_no_seam(bare):
    site, orientation = bare
    near = [359.9999, -0.0001, 0.0, 360.0, 0.0001]
    p = hourarc.place(site, hourarc.Catalog(near, np.full(5, 20.0)), WHEN[:10], orientation=orientation)
    assert np.allclose(p.altitude_deg[:, 0], p.altitude_deg[:, 1], rtol=0, atol=1e-11)
    assert np.allclose(p.altitude_deg[:, 2], p.altitude_deg[:, 3], rtol=0, atol=1e-11)
    assert np.abs(np.diff(p.altitude_deg[:, [0, 2, 4]], axis=1)).max() < 1.001e-4


def test_longitude_has_no_seam(stars):
    sites = [hourarc.Site(longitude, 40.0, 100.0, pressure_hpa=0.0) for longitude in (-180.0, 180.0)]
    one, other = (hourarc.place(s, stars, WHEN[:10]) for s in sites)
    assert np.abs(one.altitude_deg - other.altitude_deg).max() < 1e-11
    turn = np.abs(one.azimuth_deg - other.azimuth_deg)
    assert (np.minimum(turn, 360.0 - turn) * np.cos(np.radians(one.altitude_deg))).max() < 1e-11


def test_parallax_of_zero_knows_no_radial_velocity(site):
    places = [
        hourarc.place(
            site,
            hourarc.Catalog(
                88.0, 7.0, parallax_mas=parallax, radial_velocity_km_s=velocity, pm_ra_mas_yr=500.0
            ),
            "2026-03-10T23:00",
        ).altitude_deg[0]
        for parallax, velocity in ((0.0, 0.0), (0.0, 500.0), (1e-9, 500.0))
    ]
    assert places[0] == places[1]
    assert places[2] == pytest.approx(places[0], abs=1e-11)
