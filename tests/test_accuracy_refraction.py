"""Refraction and airmass, against published tables."""

import hourarc
import numpy as np
import pytest
from bridge import altitude_pairs

# Hohenkerk & Sinclair, ray trace at 1005 hPa, 7 °C, relative humidity 0.8, 0.574 µm, latitude 50°, sea level,
# 6.5 K/km: observed zenith distance (deg), refraction (″). In the notes of ERFA's refco.
RAY_TRACE = {
    10: 10.27,
    20: 21.19,
    40: 48.82,
    45: 58.16,
    50: 69.28,
    60: 100.51,
    65: 124.23,
    70: 158.63,
    74: 200.35,
}
RAY_TRACE |= {80: 319.13}


def refraction_arcsec(site, zenith_distance_deg):
    """Refraction at an observed zenith distance: what our places of many stars say, interpolated."""
    topocentric, observed, _ = altitude_pairs(site)
    return np.interp(90.0 - zenith_distance_deg, observed, observed - topocentric) * 3600.0


def test_refraction_against_the_ray_trace(figures):
    site = hourarc.Site(
        0.0, 50.0, 0.0, pressure_hpa=1005.0, temperature_c=7.0, relative_humidity=0.8, wavelength_um=0.574
    )
    z = np.array(list(RAY_TRACE))
    off = np.abs(refraction_arcsec(site, z) - np.array(list(RAY_TRACE.values())))
    print(dict(zip(z.tolist(), off.round(4).tolist(), strict=True)))
    figures.hold("refraction", off.max(), len(z))


def test_refraction_at_the_horizon(figures):
    # Pulkovo tables (1985): 15 °C, 1013.25 hPa, 0.590 µm, dry: 1977.97″.
    site = hourarc.Site(
        0.0, 45.0, 0.0, pressure_hpa=1013.25, temperature_c=15.0, relative_humidity=0.0, wavelength_um=0.590
    )
    figures.hold("refraction_horizon", abs(refraction_arcsec(site, 90.0) - 1977.97) / 60.0, 1)


@pytest.mark.parametrize(
    ("published", "apparent_deg", "arcmin"),
    # Bennett (1982), good to 0.07′ at 1010 hPa and 10 °C; and to 0.015′ of his own reference [M].
    [("Bennett", 0.0, 34.478), ("Bennett", 1.0, 24.329), ("Bennett", 5.0, 9.883), ("Bennett", 10.0, 5.392)],
)
def test_refraction_against_bennett(published, apparent_deg, arcmin):
    # His atmosphere is not ours (another lapse rate, no humidity): a minute at the horizon, little above.
    site = hourarc.Site(0.0, 45.0, 0.0, pressure_hpa=1010.0, temperature_c=10.0, relative_humidity=0.0)
    ours = refraction_arcsec(site, 90.0 - apparent_deg) / 60.0
    assert abs(ours - arcmin) < (1.0 if apparent_deg < 0.5 else 0.5 if apparent_deg < 3 else 0.1), published


@pytest.mark.parametrize("height_m", [-400.0, 0.0, 2635.0, 5000.0])
def test_refraction_is_monotone_and_smooth(height_m):
    # Laws: observed altitude grows with topocentric altitude without a jump, down to below the horizon.
    topocentric, observed, _ = altitude_pairs(hourarc.Site(10.0, 30.0, height_m), lowest_deg=-1.5)
    known = np.isfinite(observed)
    assert known.sum() > 15_000
    topocentric, observed = topocentric[known], observed[known]
    assert np.all(np.diff(observed) > 0.0)
    assert np.all(observed >= topocentric - 1e-12)
    bending = observed - topocentric
    step = np.diff(topocentric)
    assert np.all(
        np.abs(np.diff(bending)) <= 0.5 * step + 1e-10
    )  # bending changes by less than half the altitude


def test_no_pressure_no_refraction():
    topocentric, observed, _ = altitude_pairs(hourarc.Site(10.0, 30.0, 0.0, pressure_hpa=0.0), lowest_deg=-91)
    assert np.array_equal(topocentric, observed)


def test_refraction_grows_with_pressure_and_falls_with_heat():
    def at_45(**air):
        return refraction_arcsec(hourarc.Site(0.0, 30.0, 0.0, **air), 45.0)

    # Proportional to density: Bennett's scale P/1010 · 283/(273 + T) [M], to a part in two hundred at 45°.
    full = at_45(pressure_hpa=1000.0, temperature_c=10.0, relative_humidity=0.0)
    half = at_45(pressure_hpa=500.0, temperature_c=10.0, relative_humidity=0.0)
    hot = at_45(pressure_hpa=1000.0, temperature_c=30.0, relative_humidity=0.0)
    assert half / full == pytest.approx(0.5, rel=5e-3)
    assert hot / full == pytest.approx(283.15 / 303.15, rel=5e-3)


@pytest.mark.parametrize(
    ("model", "zenith_distance", "published", "apparent"),
    # apparent altitude for Kasten & Young (1989) and Pickering (2002), true for Young (1994).
    [
        ("kasten_young_1989", (60, 75, 85, 90), (1.9943, 3.8129, 10.3058, 37.9196), True),
        ("young_1994", (60, 75, 85, 90), (1.9917, 3.7964, 10.0587, 31.7349), False),
        ("pickering_2002", (60, 75, 85, 90), (1.9932, 3.8082, 10.3337, 38.7494), True),
    ],
)
def test_airmass_models_end_a_window_where_they_say(model, zenith_distance, published, apparent):
    # A window limited by airmass_max closes where the altitude is the published one, in the model's sense.
    site = hourarc.Site(0.0, 0.0, 0.0)
    topocentric, observed, _ = altitude_pairs(site)
    star = hourarc.Catalog([280.0], [0.0])  # opposite the Sun of the day
    for z, airmass in zip(zenith_distance, published, strict=True):
        limits = hourarc.Limits(
            altitude_min_deg=-5.0, airmass_max=airmass, airmass_model=model, sun_altitude_max_deg=90.0
        )
        found = hourarc.windows(site, star, "2026-07-04T00:00", "2026-07-05T00:00", limits)
        edge = found.stop[0] if found.start[0] == np.datetime64("2026-07-04T00:00") else found.start[0]
        altitude = hourarc.place(site, star, edge).altitude_deg[0]
        if not apparent:
            altitude = np.interp(altitude, observed, topocentric)
        # Printed to 5e-5 of airmass; at the horizon that is 5e-6 deg, at 60° 1.4e-3 deg.
        slope = np.tan(np.radians(z)) / np.cos(np.radians(z)) * np.pi / 180 if z < 89 else 6.0
        assert abs(altitude - (90.0 - z)) < 1e-4 / slope + 1e-6, (model, z, altitude)
