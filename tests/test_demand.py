"""Supply and demand by sidereal time, against astropy's sidereal time each half minute of the windows."""

import sys

import hourarc as ha
import numpy as np
import pytest
from hourarc.errors import InvalidArgument, WrongType

SITE = ha.Site(-70.4, -24.6, 2635.0)
rng = np.random.default_rng(5)
STARS = ha.Catalog(rng.uniform(0, 360, 12), rng.uniform(-80, 60, 12))
ASKED = rng.uniform(0.0, 5.0, 12)
LIMITS = ha.Limits(airmass_max=1.6, moon_separation_min_deg=40.0, sun_altitude_max_deg=-15.0)


def sampled(windows, bins, step_s=30):
    """Hours of windows by target and bin of local mean sidereal time as astropy computes it."""
    time = pytest.importorskip("astropy.time")
    iers = pytest.importorskip("astropy.utils.iers")
    hours = np.zeros((len(windows), bins))
    with iers.conf.set_temp("auto_download", False):
        for target in range(len(windows)):
            for window in windows.of(target):
                count = max(1, round((window.stop - window.start) / np.timedelta64(step_s, "s")))
                share = (window.stop - window.start) / count
                middles = window.start + (np.arange(count) + 0.5) * (
                    share / np.timedelta64(1, "ns")
                ) * np.timedelta64(1, "ns")
                lst = time.Time(middles, scale="utc").sidereal_time("mean", longitude=-70.4).hour
                hours[target] += np.bincount((lst * bins / 24.0).astype(int) % bins, minlength=bins) * (
                    share / np.timedelta64(3600_000_000_000, "ns")
                )
    return hours


def test_supply_and_demand_against_sampling():
    made = ha.demand(SITE, STARS, "2026-03-01", 20, LIMITS, ASKED, bin_h=2.0)
    nights = ha.almanac(SITE, "2026-03-01", 20)
    span = (nights.start[0], nights.stop[-1])
    found = ha.windows(SITE, STARS, *span, LIMITS)
    hours = sampled(found, 12)
    assert made.available_hours == pytest.approx(found.hours, rel=1e-9)
    own = hours.sum(axis=1, keepdims=True)
    shares = np.divide(hours, own, out=np.zeros_like(hours), where=own > 0.0)
    np.testing.assert_allclose(made.demand_hours, ASKED @ shares, atol=0.02)
    # The sky alone: a star that no other limit touches, at the height of the pole of a far southern site.
    with pytest.warns(ha.errors.SunLimitWarning):
        dark = ha.Limits(altitude_min_deg=-5.0, sun_altitude_max_deg=-15.0, sun_separation_min_deg=0.0)
    south = ha.Catalog(0.0, -89.9)
    np.testing.assert_allclose(
        made.supply_hours, sampled(ha.windows(SITE, south, *span, dark), 12)[0], atol=20 * 30 / 3600
    )
    grid = ha.visibility_grid(SITE, STARS, "2026-03-01", 20, LIMITS)
    assert made.supply_hours.sum() == pytest.approx(grid.dark_hours.sum(), abs=20 / 3600)
    assert (made.lst_start_h[1:] == made.lst_stop_h[:-1]).all() and made.lst_stop_h[-1] == 24.0
    some = made.supply_hours > 0.0
    assert made.ratio[some] == pytest.approx(made.demand_hours[some] / made.supply_hours[some])
    assert not made.ratio[~some].any() and (~some).any()


def test_what_is_asked_is_either_placed_or_said():
    stars = ha.Catalog([150.0, 150.0, np.nan, 330.0], [-20.0, 80.0, 0.0, -20.0])
    made = ha.demand(SITE, stars, "2026-03-01", 10, None, [1.0, 2.0, 4.0, 8.0])
    # One is up, one never, one is a bad row, and one is behind the Sun.
    assert made.status_words.tolist()[2] != "ok" and np.isnan(made.available_hours[2])
    assert made.available_hours[[1, 3]].tolist() == [0.0, 0.0]
    assert made.demand_hours.sum() == pytest.approx(1.0) and made.unplaced_hours == pytest.approx(14.0)
    assert made.short.tolist() == [False, True, False, True]
    # Its hours lie about its own right ascension, 10 h.
    mean = np.average(made.lst_start_h + 0.5, weights=made.demand_hours)
    assert mean == pytest.approx(10.0, abs=1.5)


def test_supply_follows_every_limit_on_the_sky():
    plain = ha.demand(SITE, STARS[0], "2026-03-01", 30)
    for given in (
        {"moon_altitude_max_deg": 0.0},
        {"moon_illumination_max": 0.3},
        {"allowed_intervals": [["2026-03-05T00:00", "2026-03-07T05:00"]]},
        {"sun_altitude_max_deg": -25.0},
    ):
        less = ha.demand(SITE, STARS[0], "2026-03-01", 30, ha.Limits(**given))
        assert 0.0 < less.supply_hours.sum() < 0.95 * plain.supply_hours.sum(), given
    # Of limits that differ the loosest says what there is; limits on the target say nothing.
    column = ha.Limits(sun_altitude_max_deg=np.linspace(-30.0, -18.0, 12), airmass_max=1.1)
    same = ha.demand(SITE, STARS, "2026-03-01", 30, column)
    assert same.supply_hours.tolist() == plain.supply_hours.tolist()


def test_a_day_without_a_night_and_spans_longer_than_a_turn():
    north = ha.Site(20.0, 80.0)
    none = ha.demand(north, ha.Catalog(0.0, 60.0), "2026-06-10", 5)
    assert not none.supply_hours.any() and not none.ratio.any()
    limits = ha.Limits(sun_altitude_max_deg=90.0)
    always = ha.demand(north, ha.Catalog(0.0, 90.0), "2026-06-10", 5, limits, 24.0)
    # Five days of 24 h in 24 bins, and no one of them favoured by more than four minutes.
    assert always.supply_hours.sum() == pytest.approx(120.0, abs=1e-6)
    assert np.ptp(always.supply_hours) < 5 * 4 / 60 + 1e-6
    assert always.demand_hours.sum() == pytest.approx(24.0)


def test_blocks_of_targets_make_no_difference(monkeypatch):
    whole = ha.demand(
        SITE, STARS, "2026-03-01", 8, LIMITS.replace(altitude_min_deg=np.linspace(20, 50, 12)), ASKED
    )
    monkeypatch.setattr(sys.modules["hourarc.demand"], "_BLOCK", 40)
    parts = ha.demand(
        SITE, STARS, "2026-03-01", 8, LIMITS.replace(altitude_min_deg=np.linspace(20, 50, 12)), ASKED
    )
    assert parts.available_hours.tolist() == whole.available_hours.tolist()
    assert parts.demand_hours == pytest.approx(whole.demand_hours, abs=1e-12)


def test_wrong_calls():
    for keywords, said in (
        ({"bin_h": 5.0}, "demand: bin_h: given 5, allowed a width that divides 24 h"),
        ({"bin_h": 0.0}, "demand: bin_h: given 0"),
        ({"requested_hours": [1.0, 2.0]}, "requested_hours: given 2 values, .* each of 12 targets"),
        ({"requested_hours": -1.0}, "requested_hours: given -1 in row 0, allowed hours from 0 on"),
        ({"requested_hours": np.nan}, "requested_hours: given nan in row 0"),
    ):
        with pytest.raises(InvalidArgument, match=said):
            ha.demand(SITE, STARS, "2026-03-01", 2, **keywords)
    with pytest.raises(WrongType, match="demand: limits"):
        ha.demand(SITE, STARS, "2026-03-01", 2, {"airmass_max": 2})
    with pytest.raises(InvalidArgument, match="almanac: nights: given 0"):
        ha.demand(SITE, STARS, "2026-03-01", 0)


def test_its_table():
    pytest.importorskip("pyarrow")
    made = ha.demand(SITE, STARS, "2026-03-01", 3)
    table = made.to_arrow()
    assert table.num_rows == 24
    assert table.column_names == ["lst_start_h", "lst_stop_h", "supply_hours", "demand_hours", "ratio"]
    assert repr(made).startswith("<Demand of ")
