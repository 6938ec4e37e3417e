"""The hours of a season, against the sum of the exact windows; and what threads and processors may change."""

import itertools
import os

import hourarc as ha
import numpy as np
import pytest
from bridge import random_directions
from hourarc import _engine

NIGHTS = 8

# Site, first night, limits: temperate and polar, dark and bright, few limits and many.
CASES = [
    ((-70.4, -24.6, 2635.0), "2026-03-05", {}),
    ((24.5, -20.9, 1148.0), "2026-06-20", {"moon_separation_min_deg": 40.0}),
    ((-17.9, 28.8, 2390.0), "2025-10-01", {"airmass_max": 1.5, "window_min_s": 1800.0}),
    ((0.0, 51.5, 20.0), "2025-06-15", {"sun_altitude_max_deg": -12.0}),
    ((25.7, 69.9, 400.0), "2025-12-18", {"altitude_min_deg": 20.0, "moon_separation_min_deg": 15.0}),
    ((25.7, 69.9, 400.0), "2025-05-10", {"sun_altitude_max_deg": -6.0}),
    ((15.5, 78.2, 500.0), "2025-12-20", {"altitude_min_deg": 40.0}),
    ((110.5, -66.3, 40.0), "2024-04-16", {"altitude_max_deg": 75.0, "altitude_min_deg": 25.0}),
    ((0.0, -90.0, 2800.0), "2025-04-20", {"moon_separation_min_deg": 30.0, "sun_altitude_max_deg": -12.0}),
    ((123.4, -75.1, 3233.0), "2025-08-10", {"moon_altitude_max_deg": 0.0}),
    ((-155.5, 19.8, 4200.0), "2016-12-28", {"moon_illumination_max": 0.5, "altitude_min_deg": 35.0}),
    ((149.1, -31.3, 1165.0), "1975-09-01", {"sun_altitude_max_deg": 10.0, "sun_separation_min_deg": 45.0}),
    ((80.0, 0.0, 0.0), "2090-03-18", {"altitude_min_deg": 60.0, "moon_separation_min_deg": 60.0}),
]
STARS = 1_000


def stars(rng, latitude_deg, lowest_deg):
    """Stars over the sky with motion; a third of them culminate within a degree of the altitude limit, above
    or below the pole, down to a thousandth of one."""
    ra, dec = random_directions(rng, STARS)
    third = STARS // 3
    zenith = 90.0 - lowest_deg + rng.choice([-1, 1], third) * 10.0 ** rng.uniform(-3.0, 0.0, third)
    grazing = latitude_deg + rng.choice([-1, 1], third) * zenith
    dec[:third] = np.where(np.abs(grazing) > 90.0, np.copysign(180.0, grazing) - grazing, grazing)
    return ha.Catalog(
        ra,
        np.clip(dec, -90.0, 90.0),
        epoch_yr=2016.0,
        pm_ra_mas_yr=rng.uniform(-1000.0, 1000.0, STARS),
        pm_dec_mas_yr=rng.uniform(-1000.0, 1000.0, STARS),
        parallax_mas=rng.uniform(0.0, 300.0, STARS),
    )


def exact_hours(site, targets, grid, limits):
    """Hours of the exact windows of each night, (nights, targets)."""
    noons = np.append(grid.night_start, grid.night_start[-1] + np.timedelta64(24, "h"))
    return np.stack(
        [ha.windows(site, targets, start, stop, limits).hours for start, stop in itertools.pairwise(noons)]
    )


def test_hours_are_the_sum_of_the_exact_windows(figures):
    rng = np.random.default_rng(365)
    worst, cases, some, kinds = 0.0, 0, 0, {"polar night": 0, "no dark": 0, "always above": 0}
    for place, first, keywords in CASES:
        site, limits = ha.Site(*place), ha.Limits(**keywords)
        lowest = limits["altitude_min_deg"]
        if lowest is None:
            lowest = np.degrees(np.arcsin(1.0 / limits["airmass_max"]))
        targets = stars(rng, place[1], lowest)
        grid = ha.visibility_grid(site, targets, first, NIGHTS, limits)
        exact = exact_hours(site, targets, grid, limits)
        worst = max(worst, float(np.abs(grid.hours - exact).max()) * 3600.0)
        cases += exact.size
        some += int(np.count_nonzero(exact))
        kinds["polar night"] += int(np.count_nonzero(grid.dark_hours > 20.0))
        kinds["no dark"] += int(np.count_nonzero(grid.dark_hours == 0.0))
        full = grid.dark_hours[:, None] > 0.0
        kinds["always above"] += int(np.count_nonzero(full & (exact >= grid.dark_hours[:, None] - 1e-6)))
        assert not np.isnan(grid.hours).any()
    assert some > cases // 5 and all(kinds.values()), (some, kinds)
    figures.hold("grid_hours", worst, cases)


def test_hours_of_bodies_are_the_sum_of_the_exact_windows():
    site, limits = ha.Site(-70.4, -24.6, 2635.0), ha.Limits(altitude_min_deg=20.0)
    bodies = ha.Bodies(["moon", "jupiter", "saturn", "venus", "neptune", "uranus"])
    grid = ha.visibility_grid(site, bodies, "2026-03-05", 60, limits)
    exact = exact_hours(site, bodies, grid, limits)
    assert np.count_nonzero(exact) > 60
    assert np.abs(grid.hours - exact).max() * 3600.0 < 1.0


# Ordinary nights; one with a leap second in it; the years when UTC ran at a rate of its own.
@pytest.mark.parametrize("first", ["2026-03-05", "2016-12-30", "1965-02-27"])
def test_the_other_quantities_are_those_of_the_windows(first):
    rng = np.random.default_rng(7)
    site, limits = ha.Site(24.5, -20.9, 1148.0), ha.Limits(moon_separation_min_deg=30.0)
    targets = stars(rng, -20.9, 30.0)
    grid = ha.visibility_grid(site, targets, first, 3, limits, quantities=ha.GRID_QUANTITIES)
    worst = 0.0
    for night in range(3):
        start = grid.night_start[night]
        found = ha.windows(site, targets, start, start + np.timedelta64(24, "h"), limits)
        # A window of less than a second at a grazing star may be in one and not in the other.
        clear = np.abs(found.hours) > 0.02
        assert np.array_equal(grid.window_count[night][clear], found.counts[clear])
        assert clear.sum() > STARS // 3
        for row in np.flatnonzero(clear):
            longest = max(found.of(row), key=lambda window: window.stop - window.start)
            for name, instant in (("start", longest.start), ("stop", longest.stop)):
                mjd = (instant - np.datetime64("1858-11-17")) / np.timedelta64(1, "D")
                worst = max(worst, abs(grid[name][night, row] - mjd) * 86_400.0)
            best = min(window.best_airmass for window in found.of(row))
            assert grid.best_airmass[night, row] == pytest.approx(best, abs=2e-4)
    print(f"{first}: edges within {worst * 1e3:.1f} ms")
    assert worst < 0.5
    # Transits: those of the events, the one nearest to the middle of the night.
    crossings = ha.rise_transit_set(site, targets, grid.night_start[0], grid.night_start[-1])
    middle = grid.night_start[0] + np.timedelta64(12, "h")
    for row in range(0, STARS, 50):
        times = [event.time for event in crossings.of(row) if event.kind == "transit"]
        nearest = min(times, key=lambda time: abs(time - middle))
        mjd = (nearest - np.datetime64("1858-11-17")) / np.timedelta64(1, "D")
        if abs(nearest - middle) < np.timedelta64(11, "h"):
            assert abs(grid.transit[0, row] - mjd) * 86_400.0 < 1.0


def year(threads=None):
    rng = np.random.default_rng(8)
    site, limits = ha.Site(24.5, -20.9, 1148.0), ha.Limits(moon_separation_min_deg=30.0)
    targets = stars(rng, -20.9, 30.0)
    quantities = ("hours", "start", "best_airmass")
    return ha.visibility_grid(
        site, targets, "2026-07-01", 150, limits, quantities=quantities, threads=threads
    )


def bits(grid):
    return [grid[name].tobytes() for name in grid.quantities]


def test_any_number_of_threads_gives_the_same_bits():
    one = bits(year(threads=1))
    assert all(bits(year(threads=threads)) == one for threads in (2, 3, 7, None))


def test_instruction_sets_differ_by_the_last_bit(monkeypatch):
    """Fused multiply-adds round once where others round twice: 1e-14 degrees of a place, and of hours at most
    the last bit of single precision. A pinned set gives its own bits again."""
    made = {}
    for word in _engine.instruction_sets():
        monkeypatch.setenv("HOURARC_ISA", word)
        assert ha.instruction_set() == word
        targets = stars(np.random.default_rng(9), -20.9, 30.0)
        place = ha.place(ha.Site(24.5, -20.9, 1148.0), targets, "2026-07-01")
        made[word] = (year(), place.altitude_deg)
        assert bits(year()) == bits(made[word][0])
    monkeypatch.delenv("HOURARC_ISA")
    assert ha.instruction_set() == _engine.instruction_sets()[-1]
    base, altitude = made.pop("baseline")
    for word, (grid, other) in made.items():
        cells = np.abs(grid.hours.view(np.int32) - base.hours.view(np.int32))
        instants = np.nanmax(np.abs(grid.start - base.start)) * 86_400.0
        degrees = np.nanmax(np.abs(other - altitude))
        print(
            f"{word} against baseline: {np.count_nonzero(cells)} of {cells.size} hours by {cells.max()} bit, "
            f"starts by {instants * 1e6:.1f} us, altitudes by {degrees:.1e} deg"
        )
        assert cells.max() <= 1 and instants < 2e-6
        assert 0.0 < degrees < 1e-12, "the variable did not reach the loops"


def test_every_verb_runs_with_the_instruction_set_of_the_environment(monkeypatch):
    site, targets = ha.Site(24.5, -20.9), ha.Catalog([10.0], [20.0])
    monkeypatch.setenv("HOURARC_ISA", "avx9000")
    verbs = [
        lambda: ha.place(site, targets, "2026-03-05"),
        lambda: ha.windows(site, targets, "2026-03-05", "2026-03-06"),
        lambda: ha.rise_transit_set(site, targets, "2026-03-05", "2026-03-06"),
        lambda: ha.visibility_grid(site, targets, "2026-03-05", 1),
        ha.instruction_set,
    ]
    for verb in verbs:
        with pytest.raises(ha.errors.UnknownName, match="HOURARC_ISA.*avx9000.*baseline"):
            verb()
    monkeypatch.setitem(os.environ, "HOURARC_ISA", "")
    for verb in verbs:
        verb()
