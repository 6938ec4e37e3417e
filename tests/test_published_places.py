"""Published places: the worked example of SOFA, and those of Meeus for Sun, Moon and Venus."""

import erfa
import hourarc
import numpy as np
import pytest
from bridge import TablePole, nanoseconds, site, vectors
from oracle import clock
from oracle.place import Observer, separation

SOFA_SITE = Observer(-(5 + 41 / 60 + 54.2 / 3600), -(15 + 57 / 60 + 42.8 / 3600), 625.0)
SOFA_UTC = "2013-04-02T23:15:43.55"
DUT1 = 0.1550675
ARCSECONDS = 648_000 / np.pi


def sofa_star():
    """IAU SOFA, "Astrometry Tools", section 6."""
    ra = 15.0 * (14 + 34 / 60 + 16.81183 / 3600)
    dec = -(12 + 31 / 60 + 10.3965 / 3600)
    return hourarc.Catalog(ra, dec, pm_ra_mas_yr=-354.45, pm_dec_mas_yr=595.35, parallax_mas=164.99)


@pytest.fixture(scope="module")
def orientation():
    # The observed place is published without dX, dY.
    return hourarc.earth.Orientation.constant(DUT1, 50.995e-3, 376.723e-3)


def test_sofa_example_topocentric(orientation):
    # Published about the terrestrial pole, without the star's diurnal parallax (at most 7 µas).
    utc = clock.nanoseconds(SOFA_UTC)
    era = erfa.era00(*clock.ut1(utc, DUT1))
    ra = np.radians(15.0 * (14 + 34 / 60 + 20.2570287 / 3600))
    dec = -np.radians(12 + 34 / 60 + 36.141207 / 3600)
    longitude, latitude, _ = SOFA_SITE.radians
    s_prime = erfa.sp00(*clock.tt(utc))
    azimuth, altitude = erfa.hd2ae(era + longitude + s_prime - ra, dec, latitude)
    ours = hourarc.place(site(SOFA_SITE), sofa_star(), SOFA_UTC, orientation=orientation)
    c = np.cos(altitude)
    published = np.array([c * np.cos(azimuth), c * np.sin(azimuth), np.sin(altitude)])
    assert separation(vectors(ours)[0], published) * ARCSECONDS < 10e-6


def test_sofa_example_observed(orientation):
    # The published refraction is a formula (A tan z + B tan³z): ours is a ray trace through the same air.
    here = site(SOFA_SITE, pressure_hpa=952.0, temperature_c=18.5, relative_humidity=0.83, wavelength_um=0.55)
    ours = hourarc.place(here, sofa_star(), SOFA_UTC, orientation=orientation)
    assert abs(ours.azimuth_deg[0] - 91.39161345) < 1e-8
    assert abs(90.0 - ours.altitude_deg[0] - 42.75004127) * 3600 < 0.1
    assert abs(ours.hour_angle_deg[0] + 44.05037452) * 3600 < 90.0  # ours is topocentric: not refracted


def apparent_equatorial(body, utc_ns, turns=3):
    """Geocentric apparent right ascension and declination of date (rad), and the site that saw it so.

    The place is taken where the body stands over the site along the line from the Earth's centre: there the
    topocentric and the geocentric directions are one. The diurnal aberration (0.32″ at most) is undone.
    """
    earth = hourarc.earth
    pole = TablePole().at(utc_ns)
    tt, ut1 = clock.tt(utc_ns), clock.ut1(utc_ns, pole.ut1_minus_utc_s)
    when, flattening = clock.datetime(utc_ns), 1 / 298.257223563
    orientation = hourarc.earth.Orientation.constant(float(pole.ut1_minus_utc_s), 0.0, 0.0)
    longitude, latitude = 0.0, 0.0
    for _ in range(turns):
        here = hourarc.Site(np.degrees(longitude), np.degrees(latitude), 0.0, pressure_hpa=0.0)
        columns = ("hour_angle_deg", "declination_deg")
        row = hourarc.place(here, hourarc.Bodies([body]), when, columns=columns, orientation=orientation)
        hour_angle, dec = np.radians(row.hour_angle_deg[0]), np.radians(row.declination_deg[0])
        longitude = np.angle(np.exp(1j * (longitude - hour_angle)))
        latitude = np.arctan(np.tan(dec) / (1 - flattening) ** 2)
    gast = earth.sidereal_time(ut1[0] - 2400000.5, tt[0] - 2400000.5, ut1_fraction=ut1[1], tt_fraction=tt[1])
    # A body overhead is shifted east by the site's own velocity, Ω a cos φ′ / c.
    aberration = 7.292115e-5 * 6378137.0 / 299792458.0
    return np.mod(gast + longitude - hour_angle - aberration, 2 * np.pi), dec


@pytest.mark.parametrize(
    ("example", "body", "date", "ra", "dec", "tolerance_arcsec"),
    # Meeus, Astronomical Algorithms, 2nd ed. [M], at 0h TD; tolerances are those of his series.
    [
        ("25.b", "sun", (1992, 10, 13), (13, 13, 30.749), (-7, 47, 1.74), 0.05),
        ("33.a", "venus", (1992, 12, 20), (21, 4, 41.454), (-18, 53, 16.84), 0.05),
    ],
)
def test_apparent_places_of_meeus(example, body, date, ra, dec, tolerance_arcsec):
    ours = apparent_equatorial(body, clock.utc_from_tt(*date))
    degrees, minutes, seconds = dec
    published = (
        np.radians(15.0 * (ra[0] + ra[1] / 60 + ra[2] / 3600)),
        -np.radians(abs(degrees) + minutes / 60 + seconds / 3600),
    )
    off = separation(erfa.s2c(*ours), erfa.s2c(*published)) * ARCSECONDS
    print(example, f"{off:.3f}″")
    # 0.05″, and half a unit of the last printed place in each coordinate (0.0005 s and 0.005″).
    assert off < tolerance_arcsec + 0.01


def test_moon_of_meeus():
    # Meeus 47.a, 1992-04-12 0h TD [M]: α 134.688470°, δ 13.768368°; the series errs by 2″ (DE440).
    ours = apparent_equatorial("moon", clock.utc_from_tt(1992, 4, 12), turns=6)
    published = np.radians(134.688470), np.radians(13.768368)
    assert separation(erfa.s2c(*ours), erfa.s2c(*published)) * ARCSECONDS < 3.0


def test_illuminated_fraction_of_meeus():
    # Meeus 48.a, 1992-04-12 0h TD: 0.6786 [M], which is local mean midnight at Greenwich but for a minute.
    found = hourarc.almanac(hourarc.Site(0.0, 51.0), "1992-04-11", 1)
    assert abs(found.moon_illuminated_fraction[0] - 0.6786) < 2e-4


@pytest.mark.parametrize(
    ("longitude_deg", "printed"),
    # US Naval Observatory, seasons of 2023 (UT).
    [
        (0, "2023-03-20T21:24"),
        (90, "2023-06-21T14:58"),
        (180, "2023-09-23T06:50"),
        (270, "2023-12-22T03:27"),
    ],
)
def test_seasons_of_2023(longitude_deg, printed):
    # The Sun's apparent longitude at the printed minute, turned into time at its mean rate of 0.98565° a day.
    utc = nanoseconds(np.datetime64(printed, "ns"))
    ra, dec = apparent_equatorial("sun", int(utc))
    tt = clock.tt(utc)
    obliquity = erfa.obl06(*tt) + erfa.nut06a(*tt)[1]
    y = np.cos(obliquity) * np.sin(ra) * np.cos(dec) + np.sin(obliquity) * np.sin(dec)
    longitude = np.arctan2(y, np.cos(ra) * np.cos(dec))
    late = np.degrees(np.angle(np.exp(1j * (longitude - np.radians(longitude_deg))))) / 0.98565 * 86_400
    print(f"{printed}: {late:+.1f} s")
    # Half a minute of rounding, and the Sun's true rate, which differs from the mean one by 2 % at most.
    assert abs(late) < 31.0


def test_separation_of_arcturus_and_spica():
    # Meeus 17.a [M]: 32.7930°.
    assert abs(float(hourarc.separation(213.9154, 19.1825, 201.2983, -11.1614)) - 32.7930) < 1e-4


@pytest.mark.parametrize("angle_deg", [0.0, 1e-9, 1e-5, 1.0, 90.0, 179.0, 180.0 - 1e-9, 180.0])
def test_separation_is_exact_from_0_to_180(angle_deg):
    # By construction: a meridian's arc.
    start = 0.25
    end = start + angle_deg
    lon, lat = (77.0, end) if end <= 90.0 else (257.0, 180.0 - end)
    assert abs(float(hourarc.separation(77.0, start, lon, lat)) - angle_deg) < 1e-12 + 4e-14


def test_position_angle():
    # By construction: north is 0°, east 90°.
    assert float(hourarc.position_angle(10.0, 0.0, 10.0, 5.0)) == pytest.approx(0.0, abs=1e-12)
    assert float(hourarc.position_angle(10.0, 0.0, 15.0, 0.0)) == pytest.approx(90.0, abs=1e-12)
    assert float(hourarc.position_angle(10.0, 0.0, 10.0, -5.0)) == pytest.approx(180.0, abs=1e-12)
    rng = np.random.default_rng(17)
    lon1, lon2 = rng.uniform(0, 360, (2, 1000))
    lat1, lat2 = np.degrees(np.arcsin(rng.uniform(-1, 1, (2, 1000))))
    theirs = np.degrees(erfa.pas(*np.radians([lon1, lat1, lon2, lat2])))
    ours = hourarc.position_angle(lon1, lat1, lon2, lat2)
    assert np.abs((ours - theirs + 180.0) % 360.0 - 180.0).max() < 1e-10
