"""Observing windows, against brute force: all limits each 10 s through the night, the edges bisected."""

import hourarc
import numpy as np
import pytest
from bridge import (
    TablePole,
    altitude_pairs,
    catalog,
    nanoseconds,
    random_directions,
    reasons,
    site,
    windows_of,
)
from oracle import clock, windows
from oracle.place import Observer, Sky, Stars
from oracle.roots import grid_times

SHORT_NS = (
    25_000_000_000  # a window (or gap) the sampling may pass over: none such is expected with these seeds
)

NIGHTS = [
    # observer, noon before the night, stars, limits that both sides know
    (
        Observer(-70.4, -24.6, 2635.0),
        "2026-03-08T16:41",
        400,
        {"altitude_min_deg": 30.0, "sun_altitude_max_deg": -18.0, "moon_separation_min_deg": 40.0},
    ),
    (
        Observer(-17.9, 28.8, 2390.0),
        "2025-10-05T13:11",
        400,
        {
            "altitude_min_deg": 20.0,
            "altitude_max_deg": 80.0,
            "sun_altitude_max_deg": -12.0,
            "sun_separation_min_deg": 60.0,
            "moon_separation_min_deg": 25.0,
        },
    ),
    (
        Observer(25.7, 69.9, 400.0),
        "2025-09-20T10:17",
        300,
        {"altitude_min_deg": 25.0, "sun_altitude_max_deg": -6.0, "sun_separation_min_deg": 45.0},
    ),
    (
        Observer(110.5, -66.3, 40.0),
        "2024-04-20T04:38",
        300,
        {"altitude_min_deg": 40.0, "sun_altitude_max_deg": -18.0, "moon_altitude_max_deg": 0.0},
    ),
]


@pytest.fixture(scope="module")
def nights():
    rng, pole, out = np.random.default_rng(7), TablePole(), []
    for observer, noon, count, limits in NIGHTS:
        stars = Stars(*random_directions(rng, count))
        start = int(clock.nanoseconds(noon))
        stop = start + clock.DAY_NS
        both = {"sun_separation_min_deg": 30.0} | limits  # the Sun limit is on by default
        ours = hourarc.windows(
            site(observer), catalog(stars), *clock.datetime([start, stop]), hourarc.Limits(**limits)
        )
        margins = windows.Margins(**both)
        theirs = windows.windows(observer, pole, stars, start, stop, margins, step_s=10.0)
        out.append((observer, stars, margins, ours, theirs))
    return out


def test_windows_against_brute_force(figures, nights):
    worst, edges = {}, 0
    for observer, stars, _, ours, theirs in nights:
        for target in range(len(stars)):
            mine = windows_of(ours, target)
            want = [w for w in theirs if w.target == target]
            where = f"{observer}, star {target}: {mine}, brute force {want}"
            assert len(mine) == len(want), where
            for (start, stop, opens, closes), other in zip(mine, want, strict=True):
                assert (opens, closes) == (other.start_reason, other.stop_reason), where
                for reason, late in ((opens, start - other.start_ns), (closes, stop - other.stop_ns)):
                    worst[reason] = max(worst.get(reason, 0.0), abs(late) * 1e-6)
                    edges += 1
    print(edges, "edges;", {reason: f"{late:.4f} ms" for reason, late in worst.items()})
    assert {"altitude_min", "altitude_max", "sun_altitude_max", "moon_separation_min"} <= set(worst)
    assert {"sun_separation_min", "moon_altitude_max"} & set(worst)
    figures.hold("window_edges", max(worst.values()), edges)


# The order in which limits are applied: a star without a window is blocked by the first that leaves nothing.
ORDER = ("sun_altitude_max", "moon_altitude_max", "altitude_min", "altitude_max")
ORDER += ("sun_separation_min", "moon_separation_min")


def test_what_blocks_a_star_without_a_window(nights):
    pole, named = TablePole(), []
    for number, (observer, stars, margins, ours, _) in enumerate(nights):
        start = int(clock.nanoseconds(NIGHTS[number][1]))
        sky = Sky(observer, grid_times(start, start + clock.DAY_NS, 300.0), pole)
        values = margins.evaluate(sky, sky.stars(stars), slice(None))
        blocked = reasons(ours.blocked_by)
        for target in np.nonzero(ours.counts > 0)[0]:
            assert blocked[target] == "none"
        for target in np.nonzero(ours.counts == 0)[0]:
            left, possible = np.inf, []
            for name in (name for name in ORDER if name in values):
                left = np.minimum(left, values[name][:, target])
                # Sampled each five minutes: within a degree of nothing it may be this limit or a later one.
                if left.max() < 0.0:
                    possible.append(name)
                    if left.max() < -1.0 or len(possible) > 1:
                        break
            assert blocked[target] in possible, (observer, target, blocked[target], possible)
            named.append(blocked[target])
    print({name: named.count(name) for name in set(named)})
    assert len(named) > 400
    assert {"altitude_min", "sun_separation_min"} <= set(named)


def test_best_airmass_is_at_the_highest_altitude(nights):
    pole, count = TablePole(), 0

    for observer, stars, _, ours, _ in nights:
        for target in range(0, len(stars), 10):
            rows = slice(int(ours.offsets[target]), int(ours.offsets[target + 1]))
            star = stars.take([target])
            for start, stop, best, airmass in zip(
                nanoseconds(ours.start[rows]),
                nanoseconds(ours.stop[rows]),
                nanoseconds(ours.best_time[rows]),
                ours.best_airmass[rows],
                strict=True,
            ):
                assert start <= best <= stop
                times = np.append(np.linspace(0, stop - start, 200).astype(np.int64) + start, best)
                altitude = np.degrees(Sky(observer, times, pole).stars(star).altitude[:, 0])
                assert altitude[-1] >= altitude.max() - 1e-3
                # Every published formula is within 1 % of the secant above 15°.
                assert airmass == pytest.approx(1.0 / np.sin(np.radians(altitude[-1])), rel=0.01)
                count += 1
    assert count > 15


@pytest.mark.parametrize(
    ("limits", "reason"),
    [
        ({"altitude_min_deg": 15.0}, "altitude_min"),
        ({"altitude_min_deg": None, "airmass_max": 2.5}, "airmass_max"),
    ],
)
def test_windows_through_the_air(limits, reason):
    # Limits are on observed altitudes: brute force on the topocentric altitude that refracts into the limit.
    observer, pole = Observer(-17.9, 28.8, 2390.0), TablePole()
    here = hourarc.Site(observer.longitude_deg, observer.latitude_deg, observer.height_m)
    topocentric, observed, airmass = altitude_pairs(here)
    if reason == "airmass_max":
        threshold = np.interp(-2.5, -airmass, topocentric)
    else:
        threshold = np.interp(15.0, observed, topocentric)
    stars = Stars(*random_directions(np.random.default_rng(3), 150))
    start = int(clock.nanoseconds("2026-11-01T13:11"))
    stop = start + clock.DAY_NS
    ours = hourarc.windows(here, catalog(stars), *clock.datetime([start, stop]), hourarc.Limits(**limits))
    margins = windows.Margins(
        altitude_min_deg=threshold, sun_altitude_max_deg=-18.0, sun_separation_min_deg=30.0
    )
    theirs = windows.windows(observer, pole, stars, start, stop, margins, step_s=60.0)
    assert len(theirs) == len(ours.start) > 60
    named = {"altitude_min": reason}
    for window in theirs:
        edges = [w for w in windows_of(ours, window.target) if abs(w[0] - window.start_ns) < 20e6]
        assert len(edges) == 1, window
        assert abs(edges[0][1] - window.stop_ns) < 20e6
        assert edges[0][2] == named.get(window.start_reason, window.start_reason)
        assert edges[0][3] == named.get(window.stop_reason, window.stop_reason)


def test_windows_of_moon_and_planets():
    # Bodies move through their own limits: three days, the Moon and Venus near the Sun among them.
    observer, pole = Observer(-17.9, 28.8, 2390.0), TablePole()
    bodies = ["moon", "venus", "mars", "jupiter", "saturn"]
    start = int(clock.nanoseconds("2026-09-14T13:11"))
    stop = start + 3 * clock.DAY_NS
    limits = {"altitude_min_deg": 10.0, "sun_altitude_max_deg": -4.0, "sun_separation_min_deg": 45.0}
    ours = hourarc.windows(
        site(observer), hourarc.Bodies(bodies), *clock.datetime([start, stop]), hourarc.Limits(**limits)
    )
    theirs = windows.windows(observer, pole, bodies, start, stop, windows.Margins(**limits), step_s=60.0)
    mine = [(i, *window) for i in range(len(bodies)) for window in windows_of(ours, i)]
    assert len(mine) == len(theirs) >= 6
    for (target, begin, end, opens, closes), other in zip(mine, theirs, strict=True):
        assert (target, opens, closes) == (other.target, other.start_reason, other.stop_reason)
        assert abs(begin - other.start_ns) < 20e6 and abs(end - other.stop_ns) < 20e6
    print([(bodies[w[0]], w[3], w[4]) for w in mine])
