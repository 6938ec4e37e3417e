"""Laws that observing windows obey: they are sets of instants, and limits intersect them."""

import hourarc
import numpy as np
import pytest
from bridge import random_directions, windows_of

START, STOP = np.datetime64("2026-03-10T17:00:00", "ns"), np.datetime64("2026-03-11T17:00:00", "ns")
SLACK_NS = 2_000  # two tracks, or two orders of the same limits, may differ in the last microsecond
BASE = {"altitude_min_deg": 30.0, "sun_altitude_max_deg": -15.0, "moon_separation_min_deg": 40.0}


@pytest.fixture(scope="module")
def site():
    return hourarc.Site(-70.4, -24.6, 2635.0)


@pytest.fixture(scope="module")
def stars():
    return hourarc.Catalog(*random_directions(np.random.default_rng(13), 600))


@pytest.fixture(scope="module")
def night(site, stars):
    found = hourarc.windows(site, stars, START, STOP, hourarc.Limits(**BASE))
    assert len(found.start) > 200
    return found


def intervals(found, target):
    return [(start, stop) for start, stop, _, _ in windows_of(found, target)]


def intersect(one, other):
    """Of two lists of half-open intervals."""
    pieces = [(max(a, c), min(b, d)) for a, b in one for c, d in other]
    return sorted((a, b) for a, b in pieces if b > a)


def same(one, other, slack=SLACK_NS):
    one = [w for w in one if w[1] - w[0] > slack]
    other = [w for w in other if w[1] - w[0] > slack]
    return len(one) == len(other) and all(
        abs(a - c) <= slack and abs(b - d) <= slack for (a, b), (c, d) in zip(one, other, strict=True)
    )


def duration(found):
    return ((found.stop - found.start) / np.timedelta64(1, "s")).sum()


def test_windows_are_ordered_disjoint_and_within_the_span(night):
    assert np.all(night.start < night.stop)
    assert np.all((night.start >= START) & (night.stop <= STOP))
    for target in range(len(night)):
        times = [t for window in intervals(night, target) for t in window]
        assert times == sorted(set(times)), target


def test_limits_together_are_the_intersection_of_each_alone(site, stars, night):
    off = {"altitude_min_deg": -5.0, "sun_altitude_max_deg": 90.0, "moon_separation_min_deg": None}
    alone = [
        hourarc.windows(site, stars, START, STOP, hourarc.Limits(**off | {key: value}))
        for key, value in BASE.items()
    ]
    for target in range(len(stars)):
        both = intervals(alone[0], target)
        for other in alone[1:]:
            both = intersect(both, intervals(other, target))
        assert same(both, intervals(night, target)), target


def test_below_and_above_make_the_whole(site, stars):
    # altitude_max and altitude_min at one altitude: a set and its complement, durations conserved.
    free = {"sun_altitude_max_deg": 90.0}
    floor = hourarc.windows(site, stars, START, STOP, hourarc.Limits(altitude_min_deg=-5.0, **free))
    above = hourarc.windows(site, stars, START, STOP, hourarc.Limits(altitude_min_deg=35.0, **free))
    below = hourarc.windows(
        site, stars, START, STOP, hourarc.Limits(altitude_min_deg=-5.0, altitude_max_deg=35.0, **free)
    )
    assert duration(above) + duration(below) == pytest.approx(duration(floor), abs=1e-3)
    for target in range(0, len(stars), 7):
        assert intersect(intervals(above, target), intervals(below, target)) == [] or same(
            intersect(intervals(above, target), intervals(below, target)), []
        )


def test_same_limits_again_give_the_same_windows(site, stars, night):
    again = hourarc.windows(site, stars, START, STOP, hourarc.Limits(**BASE))
    for key in ("offsets", "start", "stop", "start_reason", "stop_reason", "best_airmass", "best_time"):
        assert getattr(again, key).tobytes() == getattr(night, key).tobytes(), key


def test_a_tighter_limit_never_adds(site, stars, night):
    for change in (
        {"altitude_min_deg": 45.0},
        {"sun_altitude_max_deg": -18.0},
        {"moon_separation_min_deg": 70.0},
    ):
        tight = hourarc.windows(site, stars, START, STOP, hourarc.Limits(**BASE | change))
        for target in range(len(stars)):
            narrow = intervals(tight, target)
            assert same(intersect(narrow, intervals(night, target)), narrow), (change, target)


def test_spans_join(site, stars, night):
    middle = np.datetime64("2026-03-11T03:21:09", "ns")
    parts = [
        hourarc.windows(site, stars, *span, hourarc.Limits(**BASE))
        for span in ((START, middle), (middle, STOP))
    ]
    cut = int(middle.astype(np.int64))
    for target in range(len(stars)):
        pieces = intervals(parts[0], target) + intervals(parts[1], target)
        joined = []
        for start, stop in pieces:
            if joined and joined[-1][1] == start == cut:
                joined[-1] = (joined[-1][0], stop)
            else:
                joined.append((start, stop))
        assert same(joined, intervals(night, target)), target
    # The cut itself is an edge of the span, and says so.
    at_cut = parts[0].stop == middle
    assert at_cut.sum() > 50
    assert set(parts[0].stop_reason_words[at_cut]) == {"span"}


def test_shortest_useful_window(site, stars, night):
    least = 3 * 3600.0
    long = hourarc.windows(site, stars, START, STOP, hourarc.Limits(**BASE, window_min_s=least))
    length = (night.stop - night.start) / np.timedelta64(1, "s")
    assert np.array_equal(long.start, night.start[length >= least])
    assert np.array_equal(long.stop, night.stop[length >= least])
    emptied = (night.counts > 0) & (long.counts == 0)
    assert emptied.sum() > 10
    assert set(long.blocked_by_words[emptied]) == {"window_min"}


def test_blocked_exactly_where_there_is_no_window(night):
    empty = night.counts == 0
    assert 50 < empty.sum() < len(night) - 50
    assert np.all((night.blocked_by_words == "none") == ~empty)


def test_order_and_threads_give_the_same_bits(site, stars, night):
    keys = ("start", "stop", "start_reason", "stop_reason", "best_airmass", "best_time")
    limits = hourarc.Limits(**BASE)
    for threads in (1, 2, 5):
        other = hourarc.windows(site, stars, START, STOP, limits, threads=threads)
        for key in (*keys, "offsets", "status", "blocked_by"):
            assert getattr(night, key).tobytes() == getattr(other, key).tobytes(), (key, threads)
    order = np.random.default_rng(9).permutation(len(stars))
    shuffled = hourarc.windows(site, stars[order], START, STOP, limits)
    for position, target in enumerate(order[:150]):
        alone = hourarc.windows(site, stars[int(target)], START, STOP, limits)
        for key in keys:
            bits = getattr(night, key)[night.rows(int(target))].tobytes()
            assert bits == getattr(shuffled, key)[shuffled.rows(position)].tobytes(), key
            assert bits == getattr(alone, key).tobytes(), key


def test_limits_may_be_a_column(site, stars):
    least = np.random.default_rng(10).uniform(10.0, 70.0, len(stars))
    column = hourarc.windows(site, stars, START, STOP, hourarc.Limits(**BASE | {"altitude_min_deg": least}))
    for target in range(0, len(stars), 60):
        limits = hourarc.Limits(**BASE | {"altitude_min_deg": least[target]})
        alone = hourarc.windows(site, stars[target], START, STOP, limits)
        assert windows_of(alone, 0) == windows_of(column, target)


def test_a_bad_row_has_no_windows_and_says_so(site):
    stars = hourarc.Catalog([10.0, np.nan, 200.0], [-20.0, 0.0, 100.0])
    found = hourarc.windows(site, stars, START, STOP, hourarc.Limits(sun_altitude_max_deg=90.0))
    assert len(found) == 3
    assert found.counts[1] == found.counts[2] == 0
    assert found.counts[0] > 0 or found.blocked_by_words[0] != "bad_row"
    assert list(found.blocked_by_words[1:]) == ["bad_row", "bad_row"]
    assert list(found.status_words[1:]) == ["not_finite", "declination_out_of_range"]
