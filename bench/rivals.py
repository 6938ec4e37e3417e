"""What people use today for the same questions, each used as well as it can be.

Whatever a rival can share between its rows (the frame of an instant, the place of the Moon, the dark hours of
a night, mean places of date) is made beforehand and not timed: the comparison is of the work a row.
"""

from __future__ import annotations

import erfa
import numpy as np

TURN = 2.0 * np.pi
#: Sidereal radians a second of UT1 (IERS Conventions (2010), eq. 5.14, the rate of ERA).
SIDEREAL_RATE = TURN * 1.00273781191135448 / 86_400.0
#: Stars that the closed form works on at once, so that its arrays stay in the cache.
BLOCK = 8_192


class Pyerfa:
    """Astrometric to observed places by pyerfa: `apco13` once, `atciq` and `atioq` in one array call each."""

    def __init__(self, site, stars, when, pole):
        day, time = np.modf(when.astype("datetime64[ns]").astype(np.int64) / 86_400e9)[::-1]
        self.astrom, _ = erfa.apco13(
            2440587.5 + day,
            time,
            pole["dut1_s"],
            *np.radians([site.longitude_deg, site.latitude_deg]),
            site.height_m,
            *(np.radians(pole[key] / 3600.0) for key in ("xp_arcsec", "yp_arcsec")),
            0.0,
            0.0,
            0.0,
            0.55,
        )
        ra, dec = np.radians(stars["ra_deg"]), np.radians(stars["dec_deg"])
        milliarcsecond = np.radians(1.0 / 3.6e6)
        # pyerfa's motion in right ascension is that of the angle, without the cosine of the declination.
        motion = stars["pm_ra_mas_yr"] * milliarcsecond / np.cos(dec)
        self.arguments = (
            ra,
            dec,
            motion,
            stars["pm_dec_mas_yr"] * milliarcsecond,
            stars["parallax_mas"] / 1e3,
            np.zeros_like(ra),
        )

    def run(self, rows=slice(None)):
        """Azimuth and zenith distance, radians."""
        right_ascension, declination = erfa.atciq(*(each[rows] for each in self.arguments), self.astrom)
        return erfa.atioq(right_ascension, declination, self.astrom)[:2]


def precessed(stars, when):
    """Mean right ascension and declination of date, radians (IAU 2006)."""
    julian = 2440587.5 + when.astype("datetime64[s]").astype(np.int64) / 86_400.0
    unit = erfa.s2c(np.radians(stars["ra_deg"]), np.radians(stars["dec_deg"]))
    ra, dec = erfa.c2s(unit @ erfa.pmat06(julian, 0.0).T)
    return np.mod(ra, TURN), dec


def local_sidereal(site, when):
    """Local mean sidereal time, radians; UT1 is taken as UTC."""
    julian = 2440587.5 + when.astype("datetime64[ns]").astype(np.int64) / 86_400e9
    return np.mod(erfa.gmst06(julian, 0.0, julian, 69.2 / 86_400.0) + np.radians(site.longitude_deg), TURN)


def semi_arc(site, dec, altitude_deg):
    """Half the day arc above an altitude, radians: cos H0 = (sin h − sin φ sin δ) / (cos φ cos δ)."""
    latitude = np.radians(site.latitude_deg)
    cosine = np.sin(np.radians(altitude_deg)) - np.sin(latitude) * np.sin(dec)
    cosine /= np.cos(latitude) * np.cos(dec)
    np.clip(cosine, -1.0, 1.0, out=cosine)
    return np.arccos(cosine, out=cosine)


class ClosedFormEvents:
    """The textbook: transit from the right ascension, rise and set half a day arc before and after."""

    def __init__(self, site, stars, start, altitude_deg):
        self.site, self.altitude_deg = site, altitude_deg
        self.ra, self.dec = precessed(stars, start)
        self.sidereal = local_sidereal(site, start)

    def run(self, rows=slice(None)):
        """Seconds from the start to the first rise, transit and set; NaN where the star does not cross."""
        half = semi_arc(self.site, self.dec[rows], self.altitude_deg)
        half[(half == 0.0) | (half == np.pi)] = np.nan
        arcs = self.ra[rows] - self.sidereal
        rise, transit, sets = np.mod(arcs - half, TURN), np.mod(arcs, TURN), np.mod(arcs + half, TURN)
        return rise / SIDEREAL_RATE, transit / SIDEREAL_RATE, sets / SIDEREAL_RATE


class ClosedFormHours:
    """The textbook: the part of a star's arc above the altitude that falls into the dark of a night."""

    def __init__(self, site, stars, dark_start, dark_stop, altitude_deg):
        self.ra, self.dec = precessed(stars, dark_start[len(dark_start) // 2])
        self.site, self.altitude_deg = site, altitude_deg
        half = (dark_stop - dark_start) / np.timedelta64(1, "s") / 2.0
        self.half_night = half * SIDEREAL_RATE
        self.middle = local_sidereal(site, dark_start) + self.half_night

    def run(self, out):
        """Hours of the first stars, (nights, stars): the formulae as they are written, for all stars at once,
        night after night."""
        ra, dec = (values[: out.shape[1]] for values in (self.ra, self.dec))
        for night, (middle, dark) in enumerate(zip(self.middle, self.half_night, strict=True)):
            half = semi_arc(self.site, dec, self.altitude_deg)
            apart = np.abs(np.remainder(ra - middle + np.pi, TURN) - np.pi)
            # What both arcs share on this side and, where both are long, on the other side of the sky.
            here = np.clip(half + dark - apart, 0.0, 2.0 * np.minimum(half, dark))
            there = np.maximum(half + dark + apart - TURN, 0.0)
            out[night] = (here + there) / (3600.0 * SIDEREAL_RATE)
        return out

    def run_tuned(self, out):
        """The same by a programmer who knows the machine: arcs once for all nights, stars in blocks that stay
        in the cache, no array made in the loop."""
        stars = out.shape[1]
        a, b = np.empty(BLOCK), np.empty(BLOCK)
        for first in range(0, stars, BLOCK):
            rows = slice(first, min(first + BLOCK, stars))
            x, y = a[: rows.stop - first], b[: rows.stop - first]
            half, ra = semi_arc(self.site, self.dec[rows], self.altitude_deg), self.ra[rows]
            for night, (middle, dark) in enumerate(zip(self.middle, self.half_night, strict=True)):
                np.subtract(ra, middle, out=x)
                np.multiply(x, 1.0 / TURN, out=y)
                np.rint(y, out=y)
                np.multiply(y, TURN, out=y)
                np.subtract(x, y, out=x)
                np.abs(x, out=x)
                np.subtract(half, x, out=y)
                np.add(y, dark, out=y)
                np.add(half, x, out=x)
                np.add(x, dark - TURN, out=x)
                np.clip(y, 0.0, 2.0 * dark, out=y)
                np.minimum(y, 2.0 * half, out=y)
                np.maximum(x, 0.0, out=x)
                np.add(x, y, out=x)
                np.multiply(x, 1.0 / (3600.0 * SIDEREAL_RATE), out=out[night, rows], casting="same_kind")
        return out


def _astropy():
    from astropy.utils import iers

    iers.conf.auto_download = False


def astropy_site(site):
    """The site as astropy has it."""
    from astropy import units as u
    from astropy.coordinates import EarthLocation

    return EarthLocation.from_geodetic(
        site.longitude_deg * u.deg, site.latitude_deg * u.deg, site.height_m * u.m
    )


class AstropyPairs:
    """Astropy's AltAz, each row at its own instant, in one call for all rows."""

    def __init__(self, site, stars, when):
        _astropy()
        self.location, self.stars, self.when = astropy_site(site), stars, when

    def run(self, rows):
        """Altitude and azimuth, degrees."""
        from astropy import units as u
        from astropy.coordinates import AltAz, SkyCoord
        from astropy.time import Time

        frame = AltAz(obstime=Time(self.when[rows], scale="utc"), location=self.location)
        places = SkyCoord(self.stars["ra_deg"][rows] * u.deg, self.stars["dec_deg"][rows] * u.deg)
        made = places.transform_to(frame)
        return made.alt.deg, made.az.deg


class AstropySampled:
    """Astropy's AltAz of a star each 60 s of the night, and the limits on what comes out."""

    STEP_S = 60

    def __init__(self, site, stars, sunset, sunrise, limits):
        from astropy.coordinates import AltAz, get_body
        from astropy.time import Time

        _astropy()
        self.stars, self.limits = stars, limits
        instants = Time(np.arange(sunset, sunrise, np.timedelta64(self.STEP_S, "s")), scale="utc")
        self.frame = AltAz(obstime=instants, location=astropy_site(site))
        sun, self.moon = (
            get_body(name, instants, self.frame.location).transform_to(self.frame) for name in ("sun", "moon")
        )
        self.dark = sun.alt.deg <= limits["sun_altitude_max_deg"]

    def run(self, rows):
        """Hours of each star, a star at a time."""
        return np.array([self.run_together(slice(row, row + 1))[0] for row in range(rows.start, rows.stop)])

    def run_together(self, rows):
        """The same, all stars in one call."""
        from astropy import units as u
        from astropy.coordinates import SkyCoord, angular_separation

        ra, dec = (self.stars[key][rows, None] * u.deg for key in ("ra_deg", "dec_deg"))
        made = SkyCoord(ra, dec).transform_to(self.frame)
        good = self.dark & (made.alt.deg >= self.limits["altitude_min_deg"])
        apart = angular_separation(made.az, made.alt, self.moon.az, self.moon.alt)
        good &= apart.to_value(u.deg) >= self.limits["moon_separation_min_deg"]
        return good.sum(axis=1) * self.STEP_S / 3600.0
