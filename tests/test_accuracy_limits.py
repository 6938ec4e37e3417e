"""Each limit by itself, and all together, against brute force: margins each 20 s through the night, the edges
bisected."""

import hourarc as ha
import numpy as np
import pytest
from bridge import TablePole, catalog, random_directions, random_observer, site, windows_of
from oracle import clock, limits, windows
from oracle.place import Observer, Sky, Stars

STEP_S = 20.0
#: Windows and gaps that the sampling may pass over.
SHORT_NS = 45_000_000_000
PARANAL = Observer(-70.4, -24.6, 2635.0)  # a latitude at which stars pass near the zenith
NIGHT = "2026-03-05T16:41"  # two days after full Moon

SKYLINE = np.array([[20.0, 25.0], [60.0, 42.0], [110.0, 31.0], [200.0, 28.0], [340.0, 45.0]])
STEPPED = np.array([[0.0, 22.0], [90.0, 22.0], [90.0, 50.0], [180.0, 50.0], [180.0, 25.0], [359.0, 25.0]])


def piecewise(points):
    """Straight lines between points, closed through north; at a step the second point holds."""
    azimuth = np.concatenate([points[-1:, 0] - 360.0, points[:, 0], points[:1, 0] + 360.0])
    altitude = np.concatenate([points[-1:, 1], points[:, 1], points[:1, 1]])

    def at(where):
        after = np.searchsorted(azimuth, where, side="right")
        before = after - 1
        share = (where - azimuth[before]) / (azimuth[after] - azimuth[before])
        return altitude[before] + share * (altitude[after] - altitude[before])

    return at


#: The case, what both sides are told, what only ours or only the oracle is told, and how near
#: edges must be, in ms.
CASES = {
    "skyline": ({}, {"skyline": SKYLINE}, {"skyline": piecewise(SKYLINE)}, 1.0),
    "skyline in steps": ({}, {"skyline": STEPPED}, {"skyline": piecewise(STEPPED)}, 1.0),
    "hour angle": ({"hour_angle_min_h": -2.5, "hour_angle_max_h": 1.25}, {}, {}, 1.0),
    "azimuth sectors": ({"azimuth_sectors_deg": [[320.0, 35.0], [80.0, 170.0], [200.0, 260.0]]}, {}, {}, 1.0),
    "azimuth rate": ({"azimuth_rate_max_deg_s": 0.012}, {}, {}, 5.0),
    "declination": ({"declination_min_deg": -40.0, "declination_max_deg": -10.0}, {}, {}, 1.0),
    "Moon, fixed": ({"moon_separation_min_deg": 70.0}, {}, {}, 20.0),
    "Moon, fixed, while up": ({"moon_separation_min_deg": 70.0, "moon_relaxed_below_deg": 5.0}, {}, {}, 20.0),
    "Moon, Lorentzian": (
        {"moon_avoidance_separation_deg": 90.0, "moon_avoidance_width_d": 6.0},
        {},
        {},
        20.0,
    ),
    "Moon, by its light": (
        {"moon_avoidance_dark_deg": 20.0, "moon_avoidance_bright_deg": 85.0, "moon_relaxed_below_deg": -0.5},
        {},
        {},
        20.0,
    ),
    "sky brightness": ({"sky_brightness_min_mag_arcsec2": 19.4}, {}, {}, 1.0),
    "intervals": (
        {
            "allowed_intervals": [
                ["2026-03-06T01:00", "2026-03-06T02:00:00.25"],
                ["2026-03-06T02:10", "2026-03-06T05:00"],
                ["2026-03-06T04:00", "2026-03-06T07:00"],
            ]
        },
        {},
        {},
        1.0,
    ),
    "phase of a short period": (
        {"phase_epoch_jd": 2455197.5123, "phase_period_d": 0.1003, "phase_half_width_d": 0.02},
        {},
        {},
        1.0,
    ),
    "phase of a long period": (
        {
            "phase_epoch_jd": 2460005.0454,
            "phase_period_d": 3.52474859,
            "phase_half_width_d": 0.9,
            "phase_scale": "hjd_utc",
        },
        {},
        {},
        1.0,
    ),
}
REASON = {
    "skyline": "skyline",
    "skyline in steps": "skyline",
    "hour angle": "hour_angle",
    "azimuth sectors": "azimuth_sectors",
    "azimuth rate": "azimuth_rate",
    "declination": "declination",
    "Moon, fixed": "moon_separation_min",
    "Moon, fixed, while up": "moon_separation_min",
    "Moon, Lorentzian": "moon_avoidance",
    "Moon, by its light": "moon_avoidance",
    "sky brightness": "sky_brightness",
    "intervals": "allowed_intervals",
    "phase of a short period": "phase",
    "phase of a long period": "phase",
}
BASIC = {"altitude_min_deg": 20.0, "sun_altitude_max_deg": -12.0, "sun_separation_min_deg": 30.0}


def compare(observer, noon, stars, both, only_ours, only_theirs):
    """The largest difference of edges by reason, ms, and how many edges of each."""
    skyline = only_ours.get("skyline")
    start = int(clock.nanoseconds(noon))
    stop = start + clock.DAY_NS
    ours = ha.windows(
        site(observer, skyline=skyline),
        catalog(stars),
        *clock.datetime([start, stop]),
        ha.Limits(**BASIC, **both),
    )
    margins = limits.All(**BASIC, **both, **only_theirs, stars=stars)
    theirs = windows.windows(observer, TablePole(), stars, start, stop, margins, step_s=STEP_S)
    worst, edges = {}, {}
    for target in range(len(stars)):
        # What the sampling may not see is left out on both sides, and joined where it is a gap.
        mine = joined(windows_of(ours, target))
        want = joined(
            [(w.start_ns, w.stop_ns, w.start_reason, w.stop_reason) for w in theirs if w.target == target]
        )
        where = f"{observer}, star {target}: ours {mine}, brute force {want}"
        assert len(mine) == len(want), where
        for one, other in zip(mine, want, strict=True):
            assert one[2:] == other[2:], where
            for edge in (0, 1):
                late = abs(one[edge] - other[edge]) * 1e-6
                worst[one[2 + edge]] = max(worst.get(one[2 + edge], 0.0), late)
                edges[one[2 + edge]] = edges.get(one[2 + edge], 0) + 1
    return worst, edges


def joined(found):
    """Without gaps and windows too short for the sampling."""
    out = []
    for window in found:
        if out and window[0] - out[-1][1] < SHORT_NS:
            out[-1] = (out[-1][0], window[1], out[-1][2], window[3])
        else:
            out.append(window)
    return [window for window in out if window[1] - window[0] > SHORT_NS]


@pytest.mark.parametrize("case", CASES)
def test_a_limit_by_itself(case):
    both, only_ours, only_theirs, near_ms = CASES[case]
    rng = np.random.default_rng(sorted(CASES).index(case))
    stars = Stars(*random_directions(rng, 150))
    if case.startswith("Moon"):
        # The Moon moves by some degrees in a night: only those on a ring about it are near an edge.
        stars = Stars(*random_directions(rng, 4000))
        sky = Sky(PARANAL, [clock.nanoseconds("2026-03-06T04:30")], TablePole())
        margins = limits.All(**both).evaluate(sky, sky.stars(stars), slice(None))
        stars = stars.take(np.argsort(np.abs(margins[REASON[case]][0]))[:150])
    worst, edges = compare(PARANAL, NIGHT, stars, both, only_ours, only_theirs)
    print(case, edges, {reason: f"{late:.3f} ms" for reason, late in worst.items()})
    # The declination of a star hardly changes: that it blocks the right ones is all there is to see.
    assert edges.get(REASON[case], 0) >= 10 or case == "declination"
    assert worst.get(REASON[case], 0.0) <= near_ms


def random_limits(rng, night):
    """Three of the limits, at random, as both sides, ours and the oracle take them."""
    both, only_ours, only_theirs = {}, {}, {}
    kinds = ("skyline", "hours", "sectors", "rate", "declination", "Moon", "sky", "intervals", "phase")
    chosen = rng.choice(kinds, 3, replace=False)
    if "skyline" in chosen:
        azimuth = np.sort(rng.uniform(0.0, 360.0, 7))
        points = np.stack([azimuth, rng.uniform(15.0, 50.0, 7)], axis=-1)
        only_ours["skyline"], only_theirs["skyline"] = points, piecewise(points)
    if "hours" in chosen:
        east = rng.uniform(-6.0, 1.0)
        both |= {"hour_angle_min_h": east, "hour_angle_max_h": east + rng.uniform(1.0, 8.0)}
    if "sectors" in chosen:
        first = rng.uniform(0.0, 360.0)
        both["azimuth_sectors_deg"] = [[first, (first + rng.uniform(60.0, 300.0)) % 360.0]]
    if "rate" in chosen:
        both["azimuth_rate_max_deg_s"] = rng.uniform(0.005, 0.02)
    if "declination" in chosen:
        both |= {"declination_min_deg": rng.uniform(-90, 0), "declination_max_deg": rng.uniform(0, 90)}
    if "Moon" in chosen:
        kind = rng.integers(3)
        if kind == 0:
            both["moon_separation_min_deg"] = rng.uniform(20.0, 90.0)
        elif kind == 1:
            both["moon_avoidance_separation_deg"] = rng.uniform(40.0, 120.0)
            both["moon_avoidance_width_d"] = rng.uniform(3.0, 14.0)
        else:
            dark, bright = np.sort(rng.uniform(5.0, 100.0, 2))
            both |= {"moon_avoidance_dark_deg": dark, "moon_avoidance_bright_deg": bright}
        if rng.random() < 0.4:
            both["moon_relaxed_below_deg"] = rng.uniform(-6.0, 6.0)
    if "sky" in chosen:
        both["sky_brightness_min_mag_arcsec2"] = rng.uniform(18.0, 21.3)
    if "intervals" in chosen:
        minutes = np.sort(rng.integers(0, 700, 6)).reshape(3, 2) * 2
        minutes[:, 1] += 1
        both["allowed_intervals"] = (np.datetime64(night, "m") + minutes).tolist()
    if "phase" in chosen:
        period = rng.uniform(0.05, 2.0)
        both |= {"phase_epoch_jd": rng.uniform(2.44e6, 2.46e6), "phase_period_d": period}
        both["phase_half_width_d"] = period * rng.uniform(0.1, 0.45)
        both["phase_scale"] = str(rng.choice(["bjd_tdb", "hjd_utc"]))
    return both, only_ours, only_theirs


def test_many_limits_together_at_random_sites():
    rng = np.random.default_rng(20261201)
    worst, edges = {}, {}
    for number in range(24):
        # The poles and both sides of the date line among them.
        observer = (
            (Observer(0.0, 90.0, 100.0), Observer(179.99, -90.0, 2800.0))[number] if number < 2 else None
        )
        observer = observer or random_observer(rng)
        night = np.datetime64("2024-01-15T12:00") + np.timedelta64(int(rng.integers(0, 700)), "D")
        stars = Stars(*random_directions(rng, 25))
        late, count = compare(observer, night, stars, *random_limits(rng, night))
        for reason, value in late.items():
            worst[reason] = max(worst.get(reason, 0.0), value)
            edges[reason] = edges.get(reason, 0) + count[reason]
    print(edges, {reason: f"{late:.3f} ms" for reason, late in worst.items()})
    assert set(edges) >= set(REASON.values()) - {"declination", "moon_separation_min", "moon_avoidance"}
    assert {"moon_separation_min", "moon_avoidance"} & set(edges)
    # The formula of the azimuth's rate is of uniform rotation: diurnal aberration is 1e-6 of it.
    assert worst.pop("azimuth_rate") <= 100.0
    assert max(worst.values()) <= 20.0


def test_the_declination_of_bodies_that_move():
    # The Moon goes through both limits within the days; a planet stays between them.
    bodies, start = ["moon", "jupiter"], int(clock.nanoseconds("2026-03-08T16:41"))
    stop = start + 28 * clock.DAY_NS
    both = {"declination_min_deg": -25.0, "declination_max_deg": 10.0}
    basic = {"altitude_min_deg": -5.0, "sun_altitude_max_deg": 90.0, "sun_separation_min_deg": 30.0}
    ours = ha.windows(
        site(PARANAL), ha.Bodies(bodies), *clock.datetime([start, stop]), ha.Limits(**basic, **both)
    )
    margins = limits.All(**basic, **both)
    theirs = windows.windows(PARANAL, TablePole(), bodies, start, stop, margins, step_s=300.0)
    mine = [(i, *window) for i in range(2) for window in windows_of(ours, i)]
    assert len(mine) == len(theirs) >= 6
    # The Moon's declination changes by some 0.2″ a second: what 1 mas is, is stated.
    near_ns = 1e9 * np.stack([ours.start_error_s, ours.stop_error_s], axis=-1) + 1e6
    assert near_ns.max() < 1e8
    for (target, begin, end, opens, closes), other, near in zip(mine, theirs, near_ns, strict=True):
        assert (target, opens, closes) == (other.target, other.start_reason, other.stop_reason)
        assert abs(begin - other.start_ns) < near[0] and abs(end - other.stop_ns) < near[1]
    assert "declination" in {window[3] for window in mine} | {window[4] for window in mine}


def test_sky_brightness_of_places():
    rng = np.random.default_rng(91)
    stars = Stars(*random_directions(rng, 300))
    times = clock.nanoseconds(NIGHT) + rng.integers(0, 29 * clock.DAY_NS, 40)
    about = {"sky_extinction_mag": 0.12, "dark_sky_mag_arcsec2": 21.9}
    here = ha.Site(*PARANAL.__dict__.values(), pressure_hpa=0.0, **about)
    ours = ha.place(here, catalog(stars), clock.datetime(times), columns="sky_brightness_mag_arcsec2")
    theirs = limits.brightness(PARANAL, TablePole(), stars, times, **about)
    up = np.isfinite(theirs)
    assert (np.isfinite(ours.sky_brightness_mag_arcsec2) == up).all() and up.sum() > 4000
    difference = np.abs(ours.sky_brightness_mag_arcsec2 - theirs)[up]
    print(f"{up.sum()} places, worst {difference.max():.1e} mag, darkest {theirs[up].max():.2f}")
    assert difference.max() < 1e-7
    # Row by row it is the same, and a window ends where the column says so.
    pairs = ha.place(
        here,
        catalog(stars.take(np.arange(40))),
        clock.datetime(times),
        pairwise=True,
        columns="sky_brightness_mag_arcsec2",
    )
    diagonal = ours.sky_brightness_mag_arcsec2[np.arange(40), np.arange(40)]
    assert np.array_equal(pairs.sky_brightness_mag_arcsec2, diagonal, equal_nan=True)
    dark = ha.Limits(sky_brightness_min_mag_arcsec2=20.0)
    found = ha.windows(here, catalog(stars), *clock.datetime([times[0], times[0] + clock.DAY_NS]), dark)
    rows = np.flatnonzero(found.stop_reason_words == "sky_brightness")
    assert len(rows) > 3
    for row in rows:
        star = catalog(stars)[int(found.target[row])]
        # Where the Moon rises the formula has a step, and nothing but its sides to compare with.
        around = found.stop[row] + np.array([-10_000_000, 10_000_000], dtype="timedelta64[ns]")
        before, after = ha.place(
            here, star, around, columns="sky_brightness_mag_arcsec2"
        ).sky_brightness_mag_arcsec2
        assert before[0] > 20.0 > after[0]
