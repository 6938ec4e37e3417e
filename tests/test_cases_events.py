"""Cases every solver of rises, transits and sets must decide: each with the outcome it must give.

Where an outcome hangs on the sky of the day, brute force on pyerfa and DE440 found it (`oracle.events`).
"""

from itertools import pairwise

import hourarc
import numpy as np
import pytest
from bridge import TablePole, events_of, kinds_of, nanoseconds, site
from oracle import clock, events
from oracle.place import Observer, Sky, Stars

DAY = np.timedelta64(1, "D")
DATE = np.datetime64("2026-03-10T00:00:00", "ns")


def rise_transit_set(observer, ra_deg, dec_deg, start=DATE, stop=None, altitude_deg=0.0):
    """Events of stars without motion at a site without air."""
    stars = hourarc.Catalog(np.atleast_1d(ra_deg), np.atleast_1d(dec_deg))
    stop = start + DAY if stop is None else stop
    return hourarc.rise_transit_set(site(observer), stars, start, stop, altitude_deg=altitude_deg)


def right_ascension_on_the_meridian(longitude_deg, when):
    """Right ascension (deg) that transits at an instant, to a fraction of a degree (precession)."""
    return np.degrees(hourarc.earth.rotation_angle(*mjd(when))) + longitude_deg


def mjd(when):
    ns = int(nanoseconds(when))
    return clock.UNIX_MJD + ns // clock.DAY_NS, ns % clock.DAY_NS / clock.DAY_NS


# --- the poles ----------------------------------------------------------------------------------------------


@pytest.mark.parametrize("latitude", [90.0, -90.0])
def test_at_a_pole_stars_neither_rise_nor_set(latitude):
    found = rise_transit_set(Observer(0.0, latitude), [40.0, 40.0], [30.0, -30.0])
    above, below = (0, 1) if latitude > 0 else (1, 0)
    assert found.status_words[above] == "always_above"
    assert found.status_words[below] == "always_below"
    assert set(kinds_of(found, 0)) | set(kinds_of(found, 1)) <= {"transit"}
    altitude = hourarc.place(
        site(Observer(0.0, latitude)), hourarc.Catalog(40.0, 30.0), DATE + np.arange(24) * DAY / 24
    ).altitude_deg
    # Altitude is declination: constant within precession since 2000 (9′) and the terrestrial pole (0.5″).
    assert np.ptp(altitude) * 3600 < 2.0
    assert np.abs(np.abs(altitude) - 30.0).max() < 0.2


@pytest.mark.parametrize("latitude", [89.99, -89.99])
def test_beside_a_pole_only_a_star_of_the_horizon_rises(latitude):
    # At 89.99° altitude swings by ±0.01°: of three stars around the equator of date only one crosses 0.
    observer = Observer(0.0, latitude)
    dec0 = catalogue_declination_of_equator(70.0)
    found = rise_transit_set(observer, [70.0] * 3, dec0 + np.array([-0.02, 0.0, 0.02]))
    north = latitude > 0
    words = ["always_below", "crosses", "always_above"]
    assert list(found.status_words) == (words if north else words[::-1])
    assert sorted(set(kinds_of(found, 1))) == ["rise", "set", "transit"]


def catalogue_declination_of_equator(ra_deg):
    """Catalogue declination whose place of date has declination 0 at DATE, to 1e-6 deg."""
    dec = 0.0
    sky = Sky(Observer(0.0, 0.0), clock.nanoseconds([DATE]), TablePole())
    for _ in range(4):
        dec -= np.degrees(sky.stars(Stars(np.array([ra_deg]), np.array([dec]))).declination[0, 0])
    return dec


# --- grazing, circumpolar, never up -------------------------------------------------------------------------


@pytest.fixture(scope="module")
def culmination():
    """A star and the altitude (deg) of its upper culmination, by brute force."""
    observer, star = Observer(-70.4, -24.6, 2635.0), Stars(np.array([150.0]), np.array([35.0]))
    times = clock.nanoseconds(DATE) + np.arange(0, 86_400, 10) * 1_000_000_000
    altitude = np.degrees(Sky(observer, times, TablePole()).stars(star).altitude[:, 0])
    i = int(np.argmax(altitude))
    left, middle, right = altitude[i - 1 : i + 2]
    step = (
        0.5 * (left - right) / (left - 2.0 * middle + right)
    )  # vertex of the parabola through three samples
    return observer, star, middle - 0.25 * (left - right) * step, times[i] + int(step * 10e9)


@pytest.mark.parametrize("arcsec", [60.0, 30.0, 1.0, 0.1])
def test_a_star_that_grazes_from_above_crosses_twice(culmination, arcsec):
    observer, star, top, when = culmination
    found = rise_transit_set(
        observer, star.ra_deg, star.dec_deg, DATE, DATE + DAY, altitude_deg=top - arcsec / 3600
    )
    assert kinds_of(found) == ["rise", "transit", "set"]
    assert found.status_words[0] == "crosses"
    (_, rise), (_, transit), (_, fall) = events_of(found, 0)
    assert abs(transit - when) < 1e9
    # A parabola: altitude falls from the top by t² · (15″/s)² cos φ cos δ / (2 cos h).
    phi, dec, h = np.radians([observer.latitude_deg, star.dec_deg[0], top])
    bend = (15.041 / 206265) ** 2 * np.cos(phi) * np.cos(dec) / np.cos(h) * 206265 / 2
    assert (fall - rise) / 2e9 == pytest.approx(np.sqrt(arcsec / bend), rel=0.05)
    # So near to the top a tenth of a milliarcsecond is a second: the stated error must grow with it.
    fast = rise_transit_set(observer, star.ra_deg, star.dec_deg, DATE, DATE + DAY, altitude_deg=10.0)
    assert found.computed_error_s[0] > fast.computed_error_s[0]


@pytest.mark.parametrize("arcsec", [60.0, 1.0, 0.1])
def test_a_star_that_grazes_from_below_does_not_cross(culmination, arcsec):
    observer, star, top, _ = culmination
    found = rise_transit_set(
        observer, star.ra_deg, star.dec_deg, DATE, DATE + DAY, altitude_deg=top + arcsec / 3600
    )
    assert set(kinds_of(found)) <= {"transit"}
    assert found.status_words[0] == "always_below"


def test_circumpolar_and_never_up():
    found = rise_transit_set(Observer(10.0, 60.0), [200.0, 200.0, 200.0], [80.0, -80.0, 0.0])
    assert list(found.status_words) == ["always_above", "always_below", "crosses"]
    assert kinds_of(found, 0) == ["transit"]
    assert set(kinds_of(found, 1)) <= {"transit"}
    assert sorted(kinds_of(found, 2)) == ["rise", "set", "transit"]


@pytest.mark.parametrize(("altitude", "word"), [(30.0, "always_above"), (60.0, "always_below")])
def test_a_star_at_the_celestial_pole_stands_still(altitude, word):
    # The pole of date, in the catalogue: its aberration alone is left, 20″ of an altitude of 45°.
    pole = np.linalg.inv(hourarc.earth.precession_nutation(mjd(DATE)[0]))[:, 2]
    ra, dec = np.degrees(np.arctan2(pole[1], pole[0])), np.degrees(np.arcsin(pole[2]))
    observer = Observer(33.0, 45.0)
    found = rise_transit_set(observer, ra, dec, altitude_deg=altitude)
    assert found.status_words[0] == word
    assert set(kinds_of(found)) <= {"transit"}
    places = hourarc.place(site(observer), hourarc.Catalog(ra, dec), DATE + np.arange(24) * DAY / 24)
    assert np.abs(places.altitude_deg - 45.0).max() * 3600 < 30.0
    assert np.all(np.isfinite(places.hour_angle_deg)) and np.all(np.isfinite(places.parallactic_angle_deg))


# --- one UTC day, twice -------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("first", "hour_angle_deg", "kinds"),
    # A sidereal day is four minutes short of a UTC day: what happens in its first two minutes comes again.
    [
        ("transit", 0.0, ["transit", "set", "rise", "transit"]),
        ("rise", -90.0, ["rise", "transit", "set", "rise"]),
        ("set", 90.0, ["set", "rise", "transit", "set"]),
    ],
)
def test_twice_in_one_utc_day(first, hour_angle_deg, kinds):
    # A star of the equator of date at a site of the equator rises and sets at hour angles of ±90°.
    when = DATE + np.timedelta64(2, "m")
    ra = right_ascension_on_the_meridian(0.0, when) - hour_angle_deg
    found = rise_transit_set(Observer(0.0, 0.0), ra % 360.0, 0.0)
    assert kinds_of(found) == kinds
    times = [time for kind, time in events_of(found, 0) if kind == first]
    assert (times[1] - times[0]) * 1e-9 == pytest.approx(86_164.09, abs=0.1)


# --- the Moon -----------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("date", "kinds"),
    # At 45° N on the meridian of Greenwich, April 2026, by brute force on DE440.
    [
        ("2026-04-02", ["set", "rise"]),  # no transit
        ("2026-04-07", ["transit", "set"]),  # no moonrise
        ("2026-04-21", ["rise", "transit"]),  # no moonset
    ],
)
def test_a_day_without_moonrise_moonset_or_transit(date, kinds):
    start = np.datetime64(date, "ns")
    found = hourarc.rise_transit_set(site(Observer(0.0, 45.0)), hourarc.Bodies(["moon"]), start, start + DAY)
    assert kinds_of(found) == kinds


@pytest.mark.parametrize(
    ("latitude", "letters"),
    # Lunar month from 2026-04-01 at longitude 20° E, by brute force on DE440. At 89° the Moon rises once and
    # sets once; at 85° it dips below and comes back while its declination carries it over.
    [
        (89.0, "T" * 13 + "R" + "T" * 13 + "S" + "T"),
        (85.0, "STTTTTTTTTTTTTRTSRTTTTTTTTTTTSRTST"),
        (80.0, "SRTSTTTTTTTTTTTRTSRTSRTSRTTTTTTTTTSRTSRTSRTS"),
        (75.0, "SRTSRTSTTTTTTTTTRTSRTSRTSRTSRTTTTTTTTTSRTSRTSRT"),
    ],
)
def test_the_moon_of_high_latitudes(latitude, letters):
    start = np.datetime64("2026-04-01", "ns")
    found = hourarc.rise_transit_set(
        site(Observer(20.0, latitude)), hourarc.Bodies(["moon"]), start, start + 28 * DAY
    )
    assert "".join(kind[0].upper() for kind in kinds_of(found)) == letters


# --- the zenith ---------------------------------------------------------------------------------------------


def test_transit_through_the_zenith():
    observer = Observer(0.0, 30.0)
    star = through_the_zenith(observer, 200.0)
    found = rise_transit_set(observer, star.ra_deg, star.dec_deg, altitude_deg=20.0)
    assert sorted(kinds_of(found)) == ["rise", "set", "transit"]
    transit = np.datetime64(next(t for kind, t in events_of(found, 0) if kind == "transit"), "ns")
    second = np.timedelta64(1, "s")
    around = hourarc.place(
        site(observer), hourarc.Catalog(star.ra_deg, star.dec_deg), transit + np.array([-60, 0, 60]) * second
    )
    assert around.altitude_deg[1, 0] > 90.0 - 2.0 / 3600
    assert np.all(np.isfinite(around.azimuth_deg))
    # East before, west after: azimuth jumps by 180°, hour angle passes smoothly through zero.
    assert around.azimuth_deg[0, 0] == pytest.approx(90.0, abs=0.2)
    assert around.azimuth_deg[2, 0] == pytest.approx(270.0, abs=0.2)
    assert np.diff(around.hour_angle_deg[:, 0]) == pytest.approx([0.2507, 0.2507], abs=1e-3)


def through_the_zenith(observer, ra_deg, offset_deg=0.0):
    """A star that culminates at the zenith of DATE, or `offset_deg` north of it."""
    dec = observer.latitude_deg + offset_deg
    sky = Sky(observer, clock.nanoseconds([DATE]), TablePole())
    for _ in range(4):
        here = sky.stars(Stars(np.array([ra_deg]), np.array([dec]))).declination[0, 0]
        dec += observer.latitude_deg + offset_deg - np.degrees(here)
    return Stars(np.array([ra_deg]), np.array([dec]))


@pytest.mark.parametrize(("offset_deg", "azimuth"), [(0.05, 0.0), (-0.05, 180.0)])
def test_declination_slightly_above_the_latitude_transits_in_the_north(offset_deg, azimuth):
    observer = Observer(0.0, 30.0)
    star = through_the_zenith(observer, 100.0, offset_deg)
    found = rise_transit_set(observer, star.ra_deg, star.dec_deg, altitude_deg=20.0)
    transit = found.kind == events.TRANSIT
    turn = (found.azimuth_deg[transit] - azimuth + 180.0) % 360.0 - 180.0
    assert np.abs(turn).max() < 1e-3
    assert found.altitude_deg[transit] == pytest.approx(90.0 - 0.05, abs=1e-3)


# --- sites, seams and edges ---------------------------------------------------------------------------------


def test_sites_below_the_sea_and_at_5000_m():
    low, high = (hourarc.Site(35.5, 31.5, height) for height in (-430.0, 5000.0))
    star = hourarc.Catalog(120.0, 10.0)
    rises = []
    for here in (low, high):
        found = hourarc.rise_transit_set(here, star, DATE, DATE + DAY)
        assert sorted(kinds_of(found)) == ["rise", "set", "transit"]
        rises.append(min(t for kind, t in events_of(found, 0) if kind == "rise"))
    # Denser air bends more: at the Dead Sea the star rises earlier, by some 0.25° of horizontal refraction.
    assert low.pressure_hpa > 1050.0 > 600.0 > high.pressure_hpa
    later = (rises[1] - rises[0]) * 1e-9
    assert 30.0 < later < 120.0


def test_hour_angle_wraps_at_lower_culmination():
    star = hourarc.Catalog(120.0, 70.0)
    when = DATE + np.arange(0, 86_400, 60) * np.timedelta64(1, "s")
    hour_angle = hourarc.place(hourarc.Site(0.0, 50.0), star, when).hour_angle_deg[:, 0]
    steps = np.diff(hour_angle)
    assert (steps < -300.0).sum() == 1
    assert np.abs(steps[steps > -300.0] - 0.250684).max() < 1e-4
    found = rise_transit_set(Observer(0.0, 50.0), 120.0, 70.0)
    assert kinds_of(found) == ["transit"]


def test_longitude_minus_180_is_plus_180():
    one, other = (
        rise_transit_set(Observer(lon, -17.0), [10.0, 250.0], [-5.0, 40.0]) for lon in (-180.0, 180.0)
    )
    assert np.array_equal(one.kind, other.kind)
    assert np.abs(nanoseconds(one.time) - nanoseconds(other.time)).max() <= 100


def test_right_ascension_across_its_seam():
    found = rise_transit_set(Observer(0.0, 40.0), [359.9999, -0.0001, 0.0, 360.0], [10.0] * 4)
    times = [[t for _, t in events_of(found, i)] for i in range(4)]
    assert np.abs(np.subtract(times[0], times[1])).max() <= 100
    assert np.abs(np.subtract(times[2], times[3])).max() <= 100
    # 0.0001° of right ascension is 24 ms of time.
    assert np.abs(np.subtract(times[2], times[0]) * 1e-6 - 23.93).max() < 0.5


@pytest.mark.parametrize("kind", ["rise", "transit", "set"])
def test_an_event_on_the_edge_of_a_span_is_neither_lost_nor_doubled(kind):
    observer = Observer(-70.4, -24.6, 2635.0)
    whole = rise_transit_set(observer, 120.0, 5.0, DATE, DATE + 2 * DAY)
    times = [t for k, t in events_of(whole, 0) if k == kind]
    event = np.datetime64(times[0], "ns")
    for shift_ns in range(-3, 4):
        cut = event + np.timedelta64(shift_ns, "ns")
        parts = [
            rise_transit_set(observer, 120.0, 5.0, *span) for span in ((DATE, cut), (cut, DATE + 2 * DAY))
        ]
        assert kinds_of(parts[0]) + kinds_of(parts[1]) == kinds_of(whole), shift_ns
        assert np.all(parts[0].time < cut) and np.all(parts[1].time >= cut)


def test_a_span_across_a_leap_second_keeps_sidereal_time():
    # 2016-12-31 had 86,401 s: labels of UTC step back by one second against the stars.
    start = np.datetime64("2016-12-30T00:00:00", "ns")
    found = rise_transit_set(Observer(0.0, 40.0), 120.0, 10.0, start, start + 4 * DAY)
    times = [t for kind, t in events_of(found, 0) if kind == "transit"]
    gaps = np.diff(times) * 1e-9
    assert len(gaps) == 3
    across = [t < int(clock.nanoseconds("2017-01-01")) for t in times]
    leap = [a and not b for a, b in pairwise(across)]
    assert sum(leap) == 1
    for gap, stepped in zip(gaps, leap, strict=True):
        assert gap == pytest.approx(86_164.09 - (1.0 if stepped else 0.0), abs=0.1)


def test_past_the_orientation_table_the_error_says_so():
    # No less than IERS Bulletin A, 0.00025·d^0.75 s after d days, and as much as hindcasts on C04 ask for:
    # 0.0004 (d + √d) + 2.6e-7 d² (tests/reference/earth_ut1_hindcast.csv); d is past 2900 in 2036.
    star, here = hourarc.Catalog(120.0, 10.0), site(Observer(0.0, 40.0))
    start = np.datetime64("2036-01-10T00:00:00", "ns")
    found = hourarc.rise_transit_set(here, star, start, start + DAY)
    assert sorted(kinds_of(found)) == ["rise", "set", "transit"]
    orientation = hourarc.Orientation.packaged()
    last = np.datetime64(orientation.provenance.to_dict()["last"])
    d = float((start - last) / DAY)
    assert d > 2900.0
    grown = float(orientation.at(start).ut1_error_s) - float(orientation.at(last).ut1_error_s)
    assert grown == pytest.approx(0.0004 * (d + d**0.5) + 2.6e-7 * d * d, rel=1e-9)
    assert grown > 0.00025 * d**0.75
    # What else there is to err by, the pole above all, is little beside it.
    assert np.all((found.computed_error_s > grown) & (found.computed_error_s < 1.05 * grown))
    assert found.row_status_words[0] == "orientation_extrapolated"
    now = hourarc.rise_transit_set(here, star, DATE, DATE + DAY)
    assert np.all(now.computed_error_s < 0.001)
    assert now.row_status_words[0] == "ok"


@pytest.mark.parametrize(
    ("date", "word"), [("1959-12-30", "before_utc"), ("2120-01-01", "outside_ephemeris")]
)
def test_outside_the_years_covered_a_row_says_why(date, word):
    here, start = site(Observer(0.0, 40.0)), np.datetime64(date, "ns")
    places = hourarc.place(here, hourarc.Bodies(["mars"]), start)
    assert places.status_words[0] == word
    assert np.isnan(places.altitude_deg[0])
