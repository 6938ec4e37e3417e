"""The exact place of a star or body at each instant, by pyerfa's own star-independent contexts.

`Sky` is the sky over one observer at an array of instants. Nothing is interpolated: the Earth, X, Y and s are
computed at every instant (some 100 µs each).
"""

from dataclasses import dataclass

import erfa
import numpy as np

from . import clock, solar_system


@dataclass(frozen=True)
class Observer:
    """A point of the Earth: geodetic longitude (east) and latitude on WGS 84 in degrees, height in metres."""

    longitude_deg: object
    latitude_deg: object
    height_m: object = 0.0

    @property
    def radians(self):
        """Longitude and latitude in radians, height in metres."""
        return np.radians(self.longitude_deg), np.radians(self.latitude_deg), self.height_m


@dataclass(frozen=True)
class Stars:
    """Catalogue places in the units catalogues print: degrees, mas/yr (RA with cos δ), mas, km/s, years."""

    ra_deg: np.ndarray
    dec_deg: np.ndarray
    epoch_yr: object = 2000.0
    pm_ra_mas_yr: object = 0.0
    pm_dec_mas_yr: object = 0.0
    parallax_mas: object = 0.0
    radial_velocity_km_s: object = 0.0

    def __len__(self):
        return len(self.ra_deg)

    def take(self, index):
        """The rows of an index, columns filled out."""
        columns = np.broadcast_arrays(*(np.asarray(c, dtype=float) for c in vars(self).values()))
        return Stars(*(c[index] for c in columns))

    def keywords(self):
        """Keywords of `hourarc.Catalog` beyond the two coordinates."""
        shape = np.shape(self.ra_deg)
        names = ("epoch_yr", "pm_ra_mas_yr", "pm_dec_mas_yr", "parallax_mas", "radial_velocity_km_s")
        return {name: np.array(np.broadcast_to(getattr(self, name), shape), dtype=float) for name in names}


@dataclass(frozen=True)
class Local:
    """Local directions, radians: altitude, azimuth (N through E), hour angle and declination.

    `hour_angle` (−π, π] is about the terrestrial pole; `declination` is of the topocentric CIRS place.
    """

    altitude: np.ndarray
    azimuth: np.ndarray
    hour_angle: np.ndarray
    right_ascension: np.ndarray
    declination: np.ndarray

    @property
    def vector(self):
        """Unit vectors (north, east, up)."""
        c = np.cos(self.altitude)
        return np.stack([c * np.cos(self.azimuth), c * np.sin(self.azimuth), np.sin(self.altitude)], axis=-1)


class Orientation:
    """The target- and site-free part: X, Y and s with the offsets added, ERA, TT, TDB at each instant."""

    def __init__(self, utc_ns, pole):
        self.utc_ns = np.asarray(utc_ns, dtype=np.int64)
        self.pole = pole.at(self.utc_ns)
        self.tt = clock.tt(self.utc_ns)
        self.tdb = clock.tdb(self.utc_ns)
        x, y, self.s = erfa.xys06a(*self.tt)
        self.x, self.y = x + self.pole.dx, y + self.pole.dy
        self.s_prime = erfa.sp00(*self.tt)
        self.era = erfa.era00(*clock.ut1(self.utc_ns, self.pole.ut1_minus_utc_s))

    def earth(self, feed):
        """Barycentric position and velocity of the Earth and its heliocentric position (au, au/day).

        `series`: pyerfa's own; `de440`: the kernel.
        """
        if feed == "series":
            heliocentric, barycentric = erfa.epv00(*self.tdb)
            return np.asarray(barycentric), np.asarray(heliocentric["p"])
        p, v = solar_system.state("earth", self.tdb)
        barycentric = np.zeros(p.shape[:-1], dtype=erfa.dt_pv)
        barycentric["p"], barycentric["v"] = p, v
        return barycentric, p - solar_system.position("sun", self.tdb)

    def celestial_to_terrestrial(self):
        """GCRS to ITRS, (..., 3, 3)."""
        celestial = erfa.c2ixys(self.x, self.y, self.s)
        polar = erfa.pom00(self.pole.xp, self.pole.yp, self.s_prime)
        return erfa.c2tcio(celestial, self.era, polar)


class Sky:
    """The sky over one observer (or one observer an instant) at each of `utc_ns`.

    `refraction`: the constants A and B of ERFA's refraction formula, radians; zero, so that directions are
    topocentric, but where a published example is reproduced.
    """

    def __init__(self, observer, utc_ns, pole, *, feed="de440", orientation=None, refraction=(0.0, 0.0)):
        self.observer = observer
        self.orientation = o = orientation or Orientation(utc_ns, pole)
        self.utc_ns = o.utc_ns
        barycentric, heliocentric = o.earth(feed)
        longitude, latitude, height = observer.radians
        attitude = (o.x, o.y, o.s, o.era)
        place = (longitude, latitude, height, o.pole.xp, o.pole.yp, o.s_prime)
        self.context = erfa.apco(*o.tdb, barycentric, heliocentric, *attitude, *place, *refraction)
        self.barycentric, self.heliocentric = barycentric, heliocentric

    def _context(self, pairwise):
        return self.context if pairwise else self.context[..., np.newaxis]

    def stars(self, stars, *, pairwise=False):
        """(instants, stars), or one star an instant."""
        context = self._context(pairwise)
        epoch = np.asarray(stars.epoch_yr, dtype=float)
        if epoch.ndim == 0:
            context = context.copy()
            context["pmt"] -= epoch - 2000.0
        elif np.all(epoch == epoch.flat[0]):
            context = context.copy()
            context["pmt"] -= epoch.flat[0] - 2000.0
        else:
            context = np.array(np.broadcast_to(context, np.broadcast_shapes(context.shape, epoch.shape)))
            context["pmt"] -= epoch - 2000.0
        ra, dec = np.radians(stars.ra_deg), np.radians(stars.dec_deg)
        milliarcsecond = np.pi / 648_000_000.0
        rate_ra = np.multiply(stars.pm_ra_mas_yr, milliarcsecond) / np.cos(dec)
        rate_dec = np.multiply(stars.pm_dec_mas_yr, milliarcsecond)
        parallax = np.multiply(stars.parallax_mas, 1e-3)
        velocity = stars.radial_velocity_km_s
        return self._local(erfa.atciq(ra, dec, rate_ra, rate_dec, parallax, velocity, context), context)

    def body(self, name):
        """One body at each instant: light time, the Sun's deflection (not of the Sun itself), aberration."""
        c, o = self.context, self.orientation
        there, delay = solar_system.light_time(name, o.tdb, c["eb"])
        line = there - c["eb"]
        direction = line / np.linalg.norm(line, axis=-1, keepdims=True)
        if name != "sun":
            sun = solar_system.position("sun", (o.tdb[0], o.tdb[1] - delay))
            from_sun = there - sun
            from_sun /= np.linalg.norm(from_sun, axis=-1, keepdims=True)
            limit = 1e-6 / np.maximum(c["em"] ** 2, 1.0)
            direction = erfa.ld(1.0, direction, from_sun, c["eh"], c["em"], limit)
        apparent = erfa.ab(direction, c["v"], c["em"], c["bm1"])
        intermediate = np.einsum("...ij,...j->...i", c["bpn"], apparent)
        return self._local(erfa.c2s(intermediate), c)

    def bodies(self, names):
        """(instants, bodies)."""
        parts = [self.body(name) for name in names]
        return Local(*(np.stack([getattr(p, f) for p in parts], axis=-1) for f in Local.__dataclass_fields__))

    def geocentric(self, name):
        """A body as the centre of the Earth sees it, against the observer's zenith and north; and its
        geometric distance from the centre of the Earth (au)."""
        o = self.orientation
        centre, velocity = self.barycentric["p"], self.barycentric["v"]
        there, _ = solar_system.light_time(name, o.tdb, centre)
        line = there - centre
        direction = line / np.linalg.norm(line, axis=-1, keepdims=True)
        v = velocity / solar_system.LIGHT_DAY_AU
        lorentz = np.sqrt(1.0 - np.sum(v * v, axis=-1))
        sun_distance = np.linalg.norm(self.heliocentric, axis=-1)
        apparent = erfa.ab(direction, v, sun_distance, lorentz)
        intermediate = np.einsum("...ij,...j->...i", erfa.c2ixys(o.x, o.y, o.s), apparent)
        distance = np.linalg.norm(solar_system.position(name, o.tdb) - centre, axis=-1)
        return self._local(erfa.c2s(intermediate), self.context), distance

    @staticmethod
    def _local(cirs, context):
        right_ascension, declination = cirs
        # apco folds the diurnal aberration into the observer's velocity: nothing is left for atioq to add.
        azimuth, zenith_distance, hour_angle, _, _ = erfa.atioq(right_ascension, declination, context)
        return Local(np.pi / 2 - zenith_distance, azimuth, hour_angle, right_ascension, declination)


def local_grid(sky, targets):
    """(instants, targets) of `Stars` or of a list of body names."""
    return sky.bodies(targets) if isinstance(targets, list) else sky.stars(targets)


def local_pairs(sky, targets, column):
    """Target `column[i]` at instant i."""
    if not isinstance(targets, list):
        return sky.stars(targets.take(column), pairwise=True)
    every, row = sky.bodies(targets), np.arange(len(column))
    return Local(*(getattr(every, f)[row, column] for f in Local.__dataclass_fields__))


def separation(one, other):
    """Angle between two sets of unit vectors, exact from 0 to π."""
    return erfa.sepp(one, other)
