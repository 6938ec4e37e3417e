"""Margins of the limits beyond altitude and distance, each straight from its formula on exact places.

A margin is positive where observing is allowed; its unit is its own. Units of what is given are those of
`hourarc.Limits`. Nothing here is shared with the package.
"""

from dataclasses import dataclass

import erfa
import numpy as np

from . import clock, solar_system
from .place import Sky, local_grid, local_pairs, separation
from .windows import Margins

SIDEREAL_DEG_PER_S = 15.041067178 / 3600.0  # Explanatory Supplement, 3rd ed., table of constants
SYNODIC_MONTH_D = 29.530588853  # Meeus, chapter 49
LIGHT_TIME_AU_S = 499.004783836  # IAU 2009 system of constants


def wrapped(angle_deg):
    """Into −180 to 180."""
    return (np.asarray(angle_deg) + 180.0) % 360.0 - 180.0


@dataclass(frozen=True)
class All(Margins):
    """`Margins`, and the others. Columns are not known here: one value for all targets."""

    skyline: object = None
    declination_min_deg: object = None
    declination_max_deg: object = None
    hour_angle_min_h: object = None
    hour_angle_max_h: object = None
    azimuth_sectors_deg: object = None
    azimuth_rate_max_deg_s: object = None
    moon_illumination_max: object = None
    moon_avoidance_separation_deg: object = None
    moon_avoidance_width_d: object = None
    moon_avoidance_dark_deg: object = None
    moon_avoidance_bright_deg: object = None
    moon_relaxed_below_deg: object = None
    sky_brightness_min_mag_arcsec2: object = None
    allowed_intervals: object = None
    phase_epoch_jd: object = None
    phase_period_d: object = None
    phase_half_width_d: object = None
    phase_scale: str = "bjd_tdb"
    # What belongs to no limit: the targets (for light times), and the site's sky.
    stars: object = None
    sky_extinction_mag: float = 0.172
    dark_sky_mag_arcsec2: float = 21.587

    def evaluate(self, sky, local, columns):
        """{name: margin} of the shape of `local.altitude`."""
        out = super().evaluate(sky, local, columns)
        expand = (lambda x: x) if local.altitude.ndim == 1 else (lambda x: x[:, np.newaxis])
        altitude, azimuth = np.degrees(local.altitude), np.degrees(local.azimuth) % 360.0
        more = {}
        if self.skyline is not None:
            more["skyline"] = altitude - self.skyline(azimuth)
        # About the pole of the mount, the terrestrial one.
        latitude = np.radians(sky.observer.latitude_deg)
        pole = np.array([np.cos(latitude), 0.0, np.sin(latitude)])
        declination = np.degrees(np.arcsin(local.vector @ pole))
        low, high = self.declination_min_deg, self.declination_max_deg
        if low is not None or high is not None:
            inside = np.minimum(declination - (-91.0 if low is None else low), 91.0 - declination)
            more["declination"] = inside if high is None else np.minimum(inside, high - declination)
        if self.hour_angle_min_h is not None:
            hours = np.degrees(local.hour_angle) / 15.0
            more["hour_angle"] = np.minimum(hours - self.hour_angle_min_h, self.hour_angle_max_h - hours)
        if self.azimuth_sectors_deg is not None:
            each = []
            for start, stop in self.azimuth_sectors_deg:
                half = 0.5 * ((stop - start) % 360.0)
                each.append(half - np.abs(wrapped(azimuth - start - half)))
            more["azimuth_sectors"] = np.max(each, axis=0)
        if self.azimuth_rate_max_deg_s is not None:
            # About the pole of rotation, not that of the ellipsoid: half an arcsecond is 30 ms.
            longitude, latitude, _ = sky.observer.radians
            x, y = expand(sky.orientation.pole.xp), expand(sky.orientation.pole.yp)
            turned = local.azimuth - (x * np.sin(longitude) + y * np.cos(longitude)) / np.cos(latitude)
            latitude = latitude + x * np.cos(longitude) - y * np.sin(longitude)
            turn = np.sin(latitude) - np.cos(latitude) * np.cos(turned) * np.tan(local.altitude)
            more["azimuth_rate"] = self.azimuth_rate_max_deg_s - np.abs(SIDEREAL_DEG_PER_S * turn)
        if self.moon_illumination_max is not None:
            more["moon_illumination_max"] = self.moon_illumination_max - expand(illuminated(sky)[0])
        if self.moon_avoidance_width_d is not None or self.moon_avoidance_dark_deg is not None:
            more["moon_avoidance"] = moon_distance(sky, local, expand) - expand(self._moon_asks(sky))
        if self.sky_brightness_min_mag_arcsec2 is not None:
            brightness = self.sky_brightness(sky, local, expand)
            more["sky_brightness"] = brightness - self.sky_brightness_min_mag_arcsec2
        if self.allowed_intervals is not None:
            start, stop = clock.nanoseconds(self.allowed_intervals).T
            since = (sky.utc_ns[:, np.newaxis] - start) * 1e-9
            until = (stop - sky.utc_ns[:, np.newaxis]) * 1e-9
            more["allowed_intervals"] = expand(np.max(np.minimum(since, until), axis=-1))
        if self.phase_epoch_jd is not None:
            more["phase"] = self._phase(sky, local, columns)
        out |= {name: np.broadcast_to(value, altitude.shape) for name, value in more.items()}
        if self.moon_relaxed_below_deg is not None:
            down = self.moon_relaxed_below_deg - expand(np.degrees(sky.body("moon").altitude))
            for name in {"moon_separation_min", "moon_avoidance"} & set(out):
                out[name] = np.maximum(out[name], down)
        return out

    def _moon_asks(self, sky):
        """The distance that the Moon's phase asks for, degrees."""
        if self.moon_avoidance_dark_deg is not None:
            span = self.moon_avoidance_bright_deg - self.moon_avoidance_dark_deg
            return self.moon_avoidance_dark_deg + span * illuminated(sky)[0]
        from_full_d = wrapped(elongation(sky) - 180.0) / 360.0 * SYNODIC_MONTH_D
        return self.moon_avoidance_separation_deg / (1.0 + (from_full_d / self.moon_avoidance_width_d) ** 2)

    def sky_brightness(self, sky, local, expand):
        """Krisciunas & Schaefer 1991, PASP 103, 1033 [M], V magnitudes a square arcsecond; −99 below
        ground."""
        k = self.sky_extinction_mag

        def airmass(altitude):
            return 1.0 / np.sqrt(1.0 - 0.96 * np.cos(altitude) ** 2)

        moon = sky.body("moon")
        distance = np.maximum(moon_distance(sky, local, expand), 0.26)
        phase = np.degrees(np.arccos(2.0 * illuminated(sky)[0] - 1.0))
        illuminance = 10.0 ** (-0.4 * (3.84 + 0.026 * phase + 4e-9 * phase**4))
        rayleigh = 10.0**5.36 * (1.06 + np.cos(np.radians(distance)) ** 2)
        mie = np.where(distance < 10.0, 6.2e7 / distance**2, 10.0 ** (6.15 - distance / 40.0))
        x = airmass(local.altitude)
        through = 10.0 ** (-0.4 * k * airmass(moon.altitude)) * illuminance * (moon.altitude >= 0.0)
        moonlight = (rayleigh + mie) * expand(through) * (1.0 - 10.0 ** (-0.4 * k * x))
        dark = (
            34.08 * np.exp(20.7233 - 0.92104 * self.dark_sky_mag_arcsec2) * 10.0 ** (-0.4 * k * (x - 1)) * x
        )
        return np.where(local.altitude < 0.0, -99.0, (20.7233 - np.log((dark + moonlight) / 34.08)) / 0.92104)

    def _phase(self, sky, local, columns):
        """Half width less the distance from the nearest T0 + nP, days."""
        pairwise = local.altitude.ndim == 1
        stars = self.stars.take(np.arange(len(self.stars)) if isinstance(columns, slice) else columns)
        motion = np.array(
            [stars.pm_ra_mas_yr, stars.pm_dec_mas_yr]
        )  # the light time of a moving star changes by less than 1 ms: it is left out
        assert not motion.any()
        direction = erfa.s2c(np.radians(stars.ra_deg), np.radians(stars.dec_deg))
        place = sky.context["eb"]  # the observer, barycentric, au
        if self.phase_scale == "hjd_utc":
            place = place - solar_system.position("sun", sky.orientation.tdb)
            day, second = clock.split(sky.utc_ns)
            fraction = second / 86_400.0
        else:
            day, fraction = sky.orientation.tdb
        form = "tk,tk->t" if pairwise else "tk,nk->tn"
        light_d = np.einsum(form, place, direction) * LIGHT_TIME_AU_S / 86_400.0
        if not pairwise:
            day, fraction = day[:, np.newaxis], fraction[:, np.newaxis]
        since = (day - self.phase_epoch_jd) + fraction + light_d
        cycles = since / self.phase_period_d
        return self.phase_half_width_d - np.abs(cycles - np.round(cycles)) * self.phase_period_d


def moon_distance(sky, local, expand):
    """Degrees from the Moon's centre, both topocentric."""
    moon = sky.body("moon").vector
    return np.degrees(separation(local.vector, moon if local.altitude.ndim == 1 else moon[:, np.newaxis, :]))


def illuminated(sky):
    """Illuminated fraction of the Moon from the centre of the Earth, geometric; (fraction,)."""
    tdb = sky.orientation.tdb
    earth, sun, moon = (solar_system.position(body, tdb) for body in ("earth", "sun", "moon"))
    return (0.5 * (1.0 + np.cos(separation(sun - moon, earth - moon))),)


def elongation(sky):
    """Moon less Sun in geocentric longitude, degrees: geometric, with the aberration of the Sun (20.5″)."""
    o = sky.orientation
    earth = solar_system.position("earth", o.tdb)
    longitude = []
    for body in ("moon", "sun"):
        line = solar_system.position(body, o.tdb) - earth
        ecliptic = np.einsum("...ij,...j->...i", erfa.ecm06(*o.tt), line)
        longitude.append(np.degrees(np.arctan2(ecliptic[..., 1], ecliptic[..., 0])))
    return longitude[0] - longitude[1] + 20.5 / 3600.0


def brightness(observer, pole, stars, utc_ns, **about):
    """Sky brightness at the places of stars, (instants, stars); NaN below the horizon."""
    sky = Sky(observer, utc_ns, pole)
    local = local_grid(sky, stars)
    out = All(**about).sky_brightness(sky, local, lambda x: x[:, np.newaxis])
    return np.where(out == -99.0, np.nan, out)


__all__ = ["All", "brightness", "local_pairs"]
