"""Brute-force rises, transits and sets on the exact oracle place, and the events of the almanac."""

from dataclasses import dataclass

import numpy as np

from . import roots
from .place import Sky, local_grid, local_pairs

RISE, TRANSIT, SET = 0, 1, 2
EARTH_EQUATORIAL_RADIUS_KM = 6378.137  # WGS 84
# The Moon's limb in the almanacs: 0.2725076 equatorial radii of the Earth (IAU 1982; Urban & Seidelmann 2013,
# table 11.1). The mean radius of the body, 1737.4 km, is 0.37″ less: up to 0.4 s of moonrise at 70°.
MOON_RADIUS_KM = 0.2725076 * EARTH_EQUATORIAL_RADIUS_KM
ASTRONOMICAL_UNIT_KM = 149_597_870.7


@dataclass(frozen=True)
class Found:
    """Events sorted by target and time."""

    target: np.ndarray
    kind: np.ndarray
    time_ns: np.ndarray


class _Field:
    """Local directions of many targets, on a grid of times or at (time, target) pairs."""

    def __init__(self, observer, pole, targets, feed):
        self.observer, self.pole, self.targets, self.feed = observer, pole, targets, feed

    def grid(self, times):
        return local_grid(Sky(self.observer, times, self.pole, feed=self.feed), self.targets)

    def pairs(self, times, column):
        return local_pairs(Sky(self.observer, times, self.pole, feed=self.feed), self.targets, column)


def rise_transit_set(observer, pole, targets, start_ns, stop_ns, altitude_deg, *, feed="de440", step_s=60.0):
    """Every rise, upper transit and set of `targets` (`Stars`, or a list of body names) in [start, stop).

    Altitude is topocentric, of the centre; one threshold, or one a target. A transit is where the hour angle
    about the terrestrial pole passes from negative to positive through zero.
    """
    field = _Field(observer, pole, targets, feed)
    times = roots.grid_times(start_ns, stop_ns, step_s)
    local = field.grid(times)
    threshold = np.broadcast_to(np.radians(altitude_deg), (len(targets),))

    def altitude(t, c):
        return field.pairs(t, c).altitude - threshold[c]

    def hour_angle(t, c):
        return np.sin(field.pairs(t, c).hour_angle)

    crossing = roots.sign_changes(None, altitude, times, values=local.altitude - threshold)
    meridian = roots.sign_changes(None, hour_angle, times, values=np.sin(local.hour_angle))
    upper = meridian[2] > 0
    time = np.concatenate([crossing[0], meridian[0][upper]])
    target = np.concatenate([crossing[1], meridian[1][upper]])
    kind = np.concatenate([np.where(crossing[2] > 0, RISE, SET), np.full(upper.sum(), TRANSIT)])
    inside = (time >= start_ns) & (time < stop_ns)
    order = np.lexsort((time[inside], target[inside]))
    return Found(target[inside][order], kind[inside][order], time[inside][order])


def altitude_rate(observer, pole, targets, found, *, feed="de440"):
    """Rate of altitude at events, arcseconds a second, from the places 0.5 s before and after."""
    field = _Field(observer, pole, targets, feed)
    half = 500_000_000
    if len(found.time_ns) == 0:
        return np.empty(0)
    after = field.pairs(found.time_ns + half, found.target).altitude
    before = field.pairs(found.time_ns - half, found.target).altitude
    return np.degrees(after - before) * 3600.0


def _scalar_roots(value, start_ns, stop_ns, step_s):
    times = roots.grid_times(start_ns, stop_ns, step_s)
    return roots.sign_changes(None, lambda t, c: value(t), times, values=value(times)[:, np.newaxis])


def sun_crossings(observer, pole, altitude_deg, start_ns, stop_ns, *, step_s=120.0):
    """Times and directions at which the true topocentric altitude of the Sun's centre passes a value."""
    threshold = np.radians(altitude_deg)

    def value(times):
        return Sky(observer, times, pole).body("sun").altitude - threshold

    time, _, direction = _scalar_roots(value, start_ns, stop_ns, step_s)
    return time, direction


def moon_crossings(observer, pole, start_ns, stop_ns, *, step_s=120.0):
    """Moonrise and moonset of the almanacs: zenith distance of the centre, geocentric, 90°34′ + SD − HP."""

    def value(times):
        local, distance = Sky(observer, times, pole).geocentric("moon")
        km = distance * ASTRONOMICAL_UNIT_KM
        semidiameter = np.arcsin(MOON_RADIUS_KM / km)
        parallax = np.arcsin(EARTH_EQUATORIAL_RADIUS_KM / km)
        return local.altitude + np.radians(34.0 / 60.0) + semidiameter - parallax

    time, _, direction = _scalar_roots(value, start_ns, stop_ns, step_s)
    return time, direction
