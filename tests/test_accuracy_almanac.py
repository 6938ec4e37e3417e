"""Sunset to sunrise, moonrise and moonset, dark hours, age and light of the Moon, against brute force."""

import erfa
import hourarc
import numpy as np
import pytest
from bridge import TablePole, nanoseconds, site
from oracle import clock, events, roots, solar_system
from oracle.place import Observer, Sky

NIGHTS = 16
PLACES = [
    (Observer(-70.4, -24.6, 2635.0), "2026-03-01"),
    (Observer(-0.1, 51.5, 20.0), "2025-06-10"),  # no astronomical night, then none nautical missing
    (Observer(25.7, 69.9, 400.0), "2025-01-10"),  # the polar night ends
    (Observer(25.7, 69.9, 400.0), "2026-05-10"),  # the midnight Sun begins
    (Observer(179.99, -17.0, 5.0), "2003-10-10"),
    (Observer(-140.0, 0.0, 0.0), "2024-08-20"),
    (Observer(77.0, -66.0, 0.0), "1999-12-15"),
]
SUN = {
    "sunset": (-50 / 60, -1),
    "dusk_civil": (-6, -1),
    "dusk_nautical": (-12, -1),
    "dusk_astronomical": (-18, -1),
}
SUN |= {
    "dawn_astronomical": (-18, 1),
    "dawn_nautical": (-12, 1),
    "dawn_civil": (-6, 1),
    "sunrise": (-50 / 60, 1),
}


def night_bounds(observer, first, number):
    """Local mean solar noon to noon, as UTC nanoseconds (UT1 and UTC are within a second)."""
    noon = int(clock.nanoseconds(first)) + number * clock.DAY_NS + clock.DAY_NS // 2
    noon -= round(observer.longitude_deg / 360.0 * clock.DAY_NS)
    return noon, noon + clock.DAY_NS


@pytest.fixture(scope="module")
def almanacs():
    return [hourarc.almanac(site(observer), first, NIGHTS) for observer, first in PLACES]


def first_within(times, start, stop):
    inside = times[(times >= start) & (times < stop)]
    return int(inside[0]) if len(inside) else None


def test_events_of_the_almanac(figures, almanacs):
    pole, worst, count, absent = TablePole(), {}, 0, 0
    for (observer, first), ours in zip(PLACES, almanacs, strict=True):
        begin, _ = night_bounds(observer, first, 0)
        _, end = night_bounds(observer, first, NIGHTS - 1)
        found = {}
        for altitude in sorted({altitude for altitude, _ in SUN.values()}):
            time, direction = events.sun_crossings(observer, pole, altitude, begin, end, step_s=600.0)
            for sign in (-1, 1):
                found[altitude, sign] = time[direction == sign]
        time, direction = events.moon_crossings(observer, pole, begin, end, step_s=600.0)
        found["moon", 1], found["moon", -1] = time[direction == 1], time[direction == -1]
        columns = SUN | {"moonrise": ("moon", 1), "moonset": ("moon", -1)}
        for number in range(NIGHTS):
            start, stop = night_bounds(observer, first, number)
            for name, key in columns.items():
                want, mine = first_within(found[key], start, stop), getattr(ours, name)[number]
                where = f"{observer} {first} + {number}: {name}"
                if want is None:
                    assert np.isnat(mine), f"{where} is {mine}, brute force has none"
                    absent += 1
                    continue
                assert not np.isnat(mine), f"{where} is missing, brute force has {clock.datetime(want)}"
                late = abs(int(nanoseconds(mine)) - want) * 1e-6
                worst[name] = max(worst.get(name, 0.0), late)
                count += 1
    print({name: f"{late:.4f} ms" for name, late in worst.items()}, count, "absent", absent)
    assert absent > 50
    figures.hold("almanac_events", max(worst.values()), count)


def test_dark_hours(almanacs):
    pole = TablePole()
    for (observer, first), ours in zip(PLACES[:4], almanacs[:4], strict=True):
        for number in range(0, NIGHTS, 5):
            start, stop = night_bounds(observer, first, number)
            times = roots.grid_times(start, stop, 60.0)
            dark = Sky(observer, times, pole).body("sun").altitude < np.radians(-18.0)
            hours = dark[:-1].sum() / 60.0
            assert abs(ours.dark_hours[number] - hours) < 2.1 / 60.0, (observer, first, number)
            assert 0.0 <= ours.dark_hours_moonless[number] <= ours.dark_hours[number] + 1e-12
            local, distance = Sky(observer, times, pole).geocentric("moon")
            km = distance * events.ASTRONOMICAL_UNIT_KM
            dip = np.arcsin(events.MOON_RADIUS_KM / km) - np.arcsin(events.EARTH_EQUATORIAL_RADIUS_KM / km)
            down = local.altitude + np.radians(34.0 / 60.0) + dip < 0.0
            moonless = (dark & down)[:-1].sum() / 60.0
            assert abs(ours.dark_hours_moonless[number] - moonless) < 3.1 / 60.0, (observer, first, number)


def test_night_is_from_local_mean_noon_to_noon(almanacs):
    for (observer, first), ours in zip(PLACES, almanacs, strict=True):
        for number in range(NIGHTS):
            start, stop = night_bounds(observer, first, number)
            assert abs(int(nanoseconds(ours.start[number])) - start) < 1.0e9
            assert abs(int(nanoseconds(ours.stop[number])) - stop) < 1.0e9


def geocentric_ecliptic(body, utc):
    """Apparent geocentric longitude and latitude of date (rad), and where it is from the Earth (au)."""
    tdb = clock.tdb(utc)
    earth, velocity = solar_system.state("earth", tdb)
    there, _ = solar_system.light_time(body, tdb, earth)
    direction = there - earth
    direction /= np.linalg.norm(direction, axis=-1, keepdims=True)
    v = velocity / solar_system.LIGHT_DAY_AU
    apparent = erfa.ab(direction, v, np.ones(len(v)), np.sqrt(1.0 - np.sum(v * v, axis=-1)))
    tt = clock.tt(utc)
    vector = np.einsum("nij,nj->ni", erfa.pnm06a(*tt), apparent)
    obliquity = erfa.obl06(*tt) + erfa.nut06a(*tt)[1]
    c, s = np.cos(obliquity), np.sin(obliquity)
    x, y, z = vector.T
    return np.arctan2(c * y + s * z, x), np.arcsin(c * z - s * y), solar_system.position(body, tdb) - earth


def test_age_and_light_of_the_moon(almanacs):
    worst_age, worst_light, count = 0.0, 0.0, 0
    for (observer, first), ours in zip(PLACES, almanacs, strict=True):
        midnight = np.array([sum(night_bounds(observer, first, n)) // 2 for n in range(NIGHTS)])
        begin = int(midnight[0]) - 31 * clock.DAY_NS
        times = roots.grid_times(begin, int(midnight[-1]), 3600.0)

        def elongation(utc, column=None):
            return np.sin(geocentric_ecliptic("moon", utc)[0] - geocentric_ecliptic("sun", utc)[0])

        new, _, direction = roots.sign_changes(
            None, elongation, times, values=elongation(times)[:, np.newaxis]
        )
        new = new[direction > 0]
        for number, when in enumerate(midnight):
            age = (when - new[new <= when][-1]) / clock.DAY_NS
            off = abs(ours.moon_age_d[number] - age)
            worst_age = max(worst_age, min(off, abs(off - 29.53)) if age < 0.01 or age > 29.2 else off)
            count += 1
        _, _, moon = geocentric_ecliptic("moon", midnight)
        _, _, sun = geocentric_ecliptic("sun", midnight)
        phase = erfa.sepp(moon, moon - sun)
        worst_light = max(worst_light, np.abs(ours.moon_illuminated_fraction - (1 + np.cos(phase)) / 2).max())
    print(f"age {worst_age * 86400:.1f} s, illuminated fraction {worst_light:.1e}, {count} nights")
    assert count == NIGHTS * len(PLACES)
    # One part in ten thousand of a day and of the disc: ten times what is ever printed.
    assert worst_age < 1e-3
    assert worst_light < 1e-4
