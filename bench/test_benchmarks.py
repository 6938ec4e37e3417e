"""Our own calls under pytest-benchmark, to see a change from one version to the next:

    pytest bench/test_benchmarks.py --benchmark-autosave
    pytest bench/test_benchmarks.py --benchmark-compare

Not collected with the tests. Each body's answer is checked after the clock.
"""

import hourarc as ha
import numpy as np
import pytest

ROWS = 100_000
SITE = ha.Site(24.5127, -20.8714, 1148.0)
RNG = np.random.default_rng(10)
STARS = ha.Catalog(
    RNG.uniform(0.0, 360.0, ROWS),
    np.degrees(np.arcsin(RNG.uniform(-1.0, 1.0, ROWS))),
    epoch_yr=2016.0,
    pm_ra_mas_yr=RNG.normal(0.0, 20.0, ROWS),
    pm_dec_mas_yr=RNG.normal(0.0, 20.0, ROWS),
    parallax_mas=RNG.uniform(0.0, 10.0, ROWS),
)
WHEN = np.datetime64("2026-03-10T20:00:00")
START, STOP = np.datetime64("2026-03-10T10:22"), np.datetime64("2026-03-11T10:22")
PAIRS = WHEN + np.arange(ROWS) * np.timedelta64(315, "s")
COLUMNS = ("altitude_deg", "azimuth_deg")
MOON = ha.Limits(moon_separation_min_deg=30.0)


def placed(shape):
    return {name: np.zeros(shape) for name in COLUMNS} | {"status": np.zeros(shape, np.uint8)}


@pytest.mark.parametrize("columns", [COLUMNS, ha.PLACE_COLUMNS], ids=["altitude-azimuth", "all"])
def test_place_one_instant(benchmark, columns):
    out = {name: np.zeros(ROWS) for name in columns} | {"status": np.zeros(ROWS, np.uint8)}
    made = benchmark(ha.place, SITE, STARS, WHEN, columns=columns, out=out)
    assert np.isfinite(made.altitude_deg).all()


def test_place_many_instants(benchmark):
    times, out = PAIRS[:10], placed((10, ROWS))
    made = benchmark(ha.place, SITE, STARS, times, columns=COLUMNS, out=out)
    assert np.isfinite(made.azimuth_deg).all()


def test_place_pairwise(benchmark):
    made = benchmark(ha.place, SITE, STARS, PAIRS, columns=COLUMNS, pairwise=True, out=placed(ROWS))
    assert np.isfinite(made.altitude_deg).all()


def test_rise_transit_set(benchmark):
    found = benchmark(ha.rise_transit_set, SITE, STARS, START, STOP)
    assert ROWS < len(found.time) < 4 * ROWS


@pytest.mark.parametrize("limits", [ha.Limits(), MOON], ids=["altitude", "moon"])
def test_windows(benchmark, limits):
    found = benchmark(ha.windows, SITE, STARS, START, STOP, limits)
    assert ROWS // 3 < len(found.start) < ROWS


@pytest.mark.parametrize("limits", [ha.Limits(), MOON], ids=["altitude", "moon"])
def test_a_hundred_nights_of_hours(benchmark, limits):
    out = np.zeros((100, ROWS), np.float32)
    made = benchmark(ha.visibility_grid, SITE, STARS, "2026-07-01", 100, limits, out=out)
    assert 2.0 < made.night_hours.mean() / ROWS < 3.0


def test_ten_nights_of_everything(benchmark):
    out = {name: np.zeros((10, ROWS), dtype) for name, dtype in ha.GRID_QUANTITIES.items()}
    made = benchmark(ha.visibility_grid, SITE, STARS, "2026-07-01", 10, MOON, quantities=tuple(out), out=out)
    assert (made.window_count > 0).any()


def test_the_sky_of_ten_years(benchmark):
    """What nights cost when there are hardly any targets."""
    few = ha.Catalog([10.0], [-30.0])
    made = benchmark(ha.visibility_grid, SITE, few, "2026-07-01", 3650)
    assert made.hours.max() > 5.0


def test_the_summary_of_a_season(benchmark):
    grid = ha.visibility_grid(SITE, STARS, "2026-07-01", 100)
    assert len(benchmark(grid.summary).never) > 0


def test_almanac_of_a_year(benchmark):
    assert len(benchmark(ha.almanac, SITE, "2026-07-01", 365)) == 365
