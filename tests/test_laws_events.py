"""Laws that rises, transits and sets obey."""

from itertools import pairwise

import hourarc
import numpy as np
import pytest
from bridge import events_of, nanoseconds, random_directions
from oracle import clock

START, STOP = np.datetime64("2026-03-10T16:00:00", "ns"), np.datetime64("2026-03-12T16:00:00", "ns")
RISE, TRANSIT, SET = 0, 1, 2


@pytest.fixture(scope="module", params=[None, 0.0], ids=["air", "no air"])
def site(request):
    return hourarc.Site(-17.9, 28.8, 2390.0, pressure_hpa=request.param)


@pytest.fixture(scope="module")
def stars():
    rng = np.random.default_rng(12)
    return hourarc.Catalog(
        *random_directions(rng, 400), pm_ra_mas_yr=rng.normal(0, 50, 400), parallax_mas=5.0
    )


@pytest.mark.parametrize("altitude", [0.0, 30.0])
def test_altitude_at_a_crossing_is_the_threshold(site, stars, altitude):
    # Laws: to 1e-9 rad, with the stated sign of change.
    found = hourarc.rise_transit_set(site, stars, START, STOP, altitude_deg=altitude)
    crossing = found.kind != TRANSIT
    assert crossing.sum() > 500
    rows, time = stars[found.target[crossing]], found.time[crossing]
    columns = ("altitude_deg", "azimuth_deg")
    here = hourarc.place(site, rows, time, pairwise=True, columns=columns)
    assert np.radians(np.abs(here.altitude_deg - altitude)).max() < 1e-9
    assert np.abs(found.altitude_deg[crossing] - here.altitude_deg).max() < 1e-7
    assert np.abs(found.azimuth_deg[crossing] - here.azimuth_deg).max() < 1e-7
    tick = np.timedelta64(20, "ms")
    before = hourarc.place(site, rows, time - tick, pairwise=True, columns=columns).altitude_deg
    after = hourarc.place(site, rows, time + tick, pairwise=True, columns=columns).altitude_deg
    rising = found.kind[crossing] == RISE
    assert np.all((after > before) == rising)


def test_altitude_at_a_transit_is_that_of_the_meridian(stars):
    # 90° − |φ − δ| at upper transit; and the hour angle is zero.
    bare = hourarc.Site(-17.9, 28.8, 2390.0, pressure_hpa=0.0)
    found = hourarc.rise_transit_set(bare, stars, START, STOP)
    transit = found.kind == TRANSIT
    assert transit.sum() >= 2 * 400
    rows = stars[found.target[transit]]
    here = hourarc.place(bare, rows, found.time[transit], pairwise=True)
    assert np.abs(here.hour_angle_deg * np.cos(np.radians(here.declination_deg))).max() * 3600 < 1e-3
    # The terrestrial pole is off the pole of date by polar motion, 0.5″ at most.
    meridian = 90.0 - np.abs(28.8 - here.declination_deg)
    assert np.abs(here.altitude_deg - meridian).max() * 3600 < 1.0


def test_rise_and_set_alternate_around_transits(site, stars):
    found = hourarc.rise_transit_set(site, stars, START, STOP, altitude_deg=20.0)
    following = {"rise": "transit", "transit": "set", "set": "rise"}
    seen = 0
    for target in range(len(stars)):
        kinds = [kind for kind, _ in events_of(found, target)]
        if found.status_words[target] == "crosses":
            for one, other in pairwise(kinds):
                assert other == following[one], (target, kinds)
                seen += 1
        else:
            assert set(kinds) <= {"transit"}, (target, kinds)
        times = [time for _, time in events_of(found, target)]
        assert times == sorted(times)
    assert seen > 1_000


def test_no_other_crossing_by_brute_force_each_second(site, stars):
    some = stars[:12]
    start, stop = START, START + np.timedelta64(1, "D")
    when = np.arange(start, stop, np.timedelta64(1, "s"))
    altitude = hourarc.place(site, some, when, columns="altitude_deg").altitude_deg
    found = hourarc.rise_transit_set(site, some, start, stop, altitude_deg=25.0)
    count = 0
    for target in range(len(some)):
        times = when[1:][np.diff(altitude[:, target] > 25.0)]
        mine = [time for kind, time in events_of(found, target) if kind != "transit"]
        assert len(mine) == len(times)
        assert np.all(np.abs(nanoseconds(times) - np.array(mine, dtype=np.int64)) <= 1_000_000_000)
        count += len(mine)
    assert count > 8


def test_spans_join_without_loss(site, stars):
    # events(a, c) = events(a, b) ∪ events(b, c); a track over another span interpolates a little otherwise.
    middle = START + np.timedelta64(19 * 3600 + 1234, "s")
    whole = hourarc.rise_transit_set(site, stars, START, STOP, altitude_deg=10.0)
    parts = [
        hourarc.rise_transit_set(site, stars, *span, altitude_deg=10.0)
        for span in ((START, middle), (middle, STOP))
    ]
    for target in range(len(stars)):
        joined = events_of(parts[0], target) + events_of(parts[1], target)
        one = events_of(whole, target)
        assert [kind for kind, _ in joined] == [kind for kind, _ in one], target
        for (_, a), (_, b) in zip(joined, one, strict=True):
            assert abs(a - b) <= 2_000, (target, a, b)


def test_a_fixed_star_returns_after_a_sidereal_day(site):
    star = hourarc.Catalog([120.0, 10.0, 250.0], [20.0, -15.0, 0.0])
    found = hourarc.rise_transit_set(site, star, START, STOP, altitude_deg=15.0)
    count = 0
    for target in range(3):
        for kind in ("rise", "transit", "set"):
            times = [time for k, time in events_of(found, target) if k == kind]
            for gap in np.diff(times):
                assert gap * 1e-9 == pytest.approx(86_164.09, abs=0.1)
                count += 1
    assert count >= 6


def test_batch_order_and_threads_give_the_same_bits(site, stars):
    keys = ("kind", "time", "azimuth_deg", "altitude_deg", "computed_error_s", "horizon_scatter_s")
    whole = hourarc.rise_transit_set(site, stars, START, STOP, threads=1)
    for threads in (2, 5, None):
        other = hourarc.rise_transit_set(site, stars, START, STOP, threads=threads)
        for key in (*keys, "offsets", "status"):
            assert getattr(whole, key).tobytes() == getattr(other, key).tobytes(), (key, threads)
    order = np.random.default_rng(8).permutation(len(stars))
    shuffled = hourarc.rise_transit_set(site, stars[order], START, STOP)
    for position, target in enumerate(order[:100]):
        one, other = whole.rows(int(target)), shuffled.rows(position)
        alone = hourarc.rise_transit_set(site, stars[int(target)], START, STOP)
        for key in keys:
            bits = getattr(whole, key)[one].tobytes()
            assert bits == getattr(shuffled, key)[other].tobytes(), key
            assert bits == getattr(alone, key).tobytes(), key


def test_a_nan_touches_only_its_own_row(site, stars):
    ra = np.array(stars.ra_deg)
    ra[[5, 200]] = np.nan
    keywords = {"pm_ra_mas_yr": np.array(stars.pm_ra_mas_yr), "parallax_mas": np.array(stars.parallax_mas)}
    broken = hourarc.rise_transit_set(site, hourarc.Catalog(ra, stars.dec_deg, **keywords), START, STOP)
    whole = hourarc.rise_transit_set(site, stars, START, STOP)
    assert len(broken) == len(stars)
    for target in range(len(stars)):
        if target in (5, 200):
            assert broken.of(target) == []
            assert broken.status_words[target] == "bad_row"
            assert broken.row_status_words[target] == "not_finite"
        else:
            assert events_of(broken, target) == events_of(whole, target)


def test_horizon_scatter_is_the_published_one():
    # Sampson et al. (2003): σ_t = 240 s/deg · σ_h / (cos φ |sin A|); 42 s at the equator for σ_h of 0.175°;
    # transits and crossings above 15° carry none.
    site = hourarc.Site(0.0, 0.0)
    star = hourarc.Catalog(50.0, 0.0)
    low = hourarc.rise_transit_set(site, star, START, STOP, altitude_deg=0.0)
    crossing = low.kind != TRANSIT
    assert np.all((low.horizon_scatter_s[crossing] > 35.0) & (low.horizon_scatter_s[crossing] < 50.0))
    assert np.all(low.horizon_scatter_s[~crossing] == 0.0)
    high = hourarc.rise_transit_set(site, star, START, STOP, altitude_deg=20.0)
    assert np.all(high.horizon_scatter_s == 0.0)


def test_instants_are_within_the_span(site, stars):
    found = hourarc.rise_transit_set(site, stars, START, STOP)
    assert np.all((found.time >= START) & (found.time < STOP))
    assert int(clock.nanoseconds(START)) == int(nanoseconds(START))
