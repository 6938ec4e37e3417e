"""Nights and windows that a planner must decide: each with the outcome it must give.

Dates and times were found by brute force on pyerfa and DE440 (`oracle.events`).
"""

import hourarc
import numpy as np
import pytest
from bridge import nanoseconds, windows_of
from oracle import clock

DAY = np.timedelta64(1, "D")
NORTH_CAPE = hourarc.Site(25.7, 69.9, 400.0)
LONDON = hourarc.Site(-0.1, 51.5, 20.0)


def night_of(site, evening):
    """Noon to noon of one night."""
    row = hourarc.almanac(site, evening, 1)
    return row.start[0], row.stop[0]


def test_a_summer_night_that_never_gets_dark():
    # At 51.5° the Sun stays above −18° around midsummer: |φ| > 48.6° does it.
    row = hourarc.almanac(LONDON, "2026-06-20", 1)
    assert np.isnat(row.dusk_astronomical[0]) and np.isnat(row.dawn_astronomical[0])
    assert row.dark_hours[0] == 0.0 and row.dark_hours_moonless[0] == 0.0
    assert row.sunset[0] < row.dusk_civil[0] < row.dusk_nautical[0] < row.dawn_nautical[0] < row.dawn_civil[0]
    found = hourarc.windows(
        LONDON, hourarc.Catalog([250.0, 300.0], [60.0, 40.0]), *night_of(LONDON, "2026-06-20")
    )
    assert list(found.counts) == [0, 0]
    assert list(found.blocked_by_words) == ["sun_altitude_max"] * 2


@pytest.mark.parametrize(
    ("evening", "sunset", "sunrise"),
    # 69.9° N, 2026. The last sunset is on May 16 at 22:08:53, the first again on July 26 at 22:20:17 UTC.
    [
        ("2026-05-15", "2026-05-15T21:36:48", "2026-05-15T22:49:22"),
        ("2026-05-16", "2026-05-16T22:08:53", "2026-05-16T22:17:22"),
        ("2026-05-17", None, None),
        ("2026-06-20", None, None),
        ("2026-07-25", None, None),
        ("2026-07-26", "2026-07-26T22:20:17", "2026-07-26T22:28:07"),
        # The last day: the Sun rises on November 25 at 09:34:48 and sets at 10:32:43.
        ("2026-11-24", "2026-11-24T10:47:50", "2026-11-25T09:34:48"),
        ("2026-11-25", "2026-11-25T10:32:43", None),
        ("2026-12-10", None, None),
    ],
)
def test_midnight_sun_and_polar_night(evening, sunset, sunrise):
    row = hourarc.almanac(NORTH_CAPE, evening, 1)
    for mine, want in ((row.sunset[0], sunset), (row.sunrise[0], sunrise)):
        if want is None:
            assert np.isnat(mine), (evening, mine)
        else:
            # The altitude of the midnight Sun changes slowly, by 0.1″/s here; the brute force was done with a
            # fixed UT1−UTC of 0.05 s, and is printed to the second.
            assert abs(int(nanoseconds(mine)) - int(clock.nanoseconds(want))) < 2e9, (evening, mine)


def test_polar_night_has_long_dark_hours():
    row = hourarc.almanac(NORTH_CAPE, "2026-12-10", 1)
    assert np.isnat(row.sunset[0]) and np.isnat(row.sunrise[0])
    assert 10.0 < row.dark_hours[0] < 16.0
    assert row.dusk_civil[0] < row.dusk_nautical[0] < row.dusk_astronomical[0] < row.dawn_astronomical[0]


def test_midnight_sun_has_no_dusk_at_all():
    row = hourarc.almanac(NORTH_CAPE, "2026-06-20", 1)
    for name in ("sunset", "dusk_civil", "dusk_nautical", "dusk_astronomical", "dawn_civil", "sunrise"):
        assert np.isnat(getattr(row, name)[0]), name
    assert row.dark_hours[0] == 0.0


def test_a_window_across_utc_midnight_is_one_window():
    site = hourarc.Site(0.0, 30.0)
    found = hourarc.windows(site, hourarc.Catalog(170.0, 20.0), *night_of(site, "2026-03-10"))
    assert found.counts[0] == 1
    assert found.start[0].astype("datetime64[D]") + 1 == found.stop[0].astype("datetime64[D]")
    assert found.start[0] < found.best_time[0] < found.stop[0]


def test_a_star_up_all_night_is_opened_and_closed_by_the_sun():
    site = hourarc.Site(0.0, 60.0)
    start, stop = night_of(site, "2026-12-10")
    found = hourarc.windows(site, hourarc.Catalog(0.0, 89.0), start, stop)
    ((opens, closes, why, why_not),) = windows_of(found, 0)
    row = hourarc.almanac(site, "2026-12-10", 1)
    assert (why, why_not) == ("sun_altitude_max", "sun_altitude_max")
    assert abs(opens - int(nanoseconds(row.dusk_astronomical[0]))) < 20e6
    assert abs(closes - int(nanoseconds(row.dawn_astronomical[0]))) < 20e6
    assert row.dark_hours[0] == pytest.approx((closes - opens) / 3600e9, abs=1e-4)


def test_without_a_sun_limit_the_span_is_the_edge():
    site = hourarc.Site(0.0, 60.0)
    start, stop = night_of(site, "2026-12-10")
    limits = hourarc.Limits(sun_altitude_max_deg=None)
    found = hourarc.windows(site, hourarc.Catalog(0.0, 89.0), start, stop, limits)
    assert windows_of(found, 0) == [(*nanoseconds([start, stop]).tolist(), "span", "span")]


def test_a_window_per_side_of_a_ceiling():
    # Over the zenith limit the window splits in two, and the ceiling closes the one and opens the other.
    site = hourarc.Site(0.0, 30.0)
    limits = hourarc.Limits(altitude_min_deg=20.0, altitude_max_deg=80.0)
    found = hourarc.windows(site, hourarc.Catalog(165.0, 30.0), *night_of(site, "2026-03-05"), limits)
    first, second = windows_of(found, 0)
    assert first[3] == second[2] == "altitude_max"
    assert first[1] < second[0]


def test_a_star_behind_the_sun_is_blocked_by_it():
    # By day (no limit on the Sun's altitude) a star 10° from the Sun is kept off by the Sun, by default.
    site = hourarc.Site(0.0, 0.0)
    sun_ra = 351.0  # on 2026-03-11
    limits = hourarc.Limits(sun_altitude_max_deg=90.0)
    found = hourarc.windows(
        site, hourarc.Catalog([sun_ra, sun_ra - 60.0], [6.0, 0.0]), *night_of(site, "2026-03-10"), limits
    )
    assert found.counts[0] == 0 and found.blocked_by_words[0] == "sun_separation_min"
    assert found.counts[1] > 0


@pytest.mark.parametrize(
    ("limits", "reason"),
    [
        ({"altitude_min_deg": 80.0}, "altitude_min"),
        ({"airmass_max": 1.01}, "airmass_max"),
        ({"moon_illumination_max": 0.01}, "moon_illumination_max"),
        ({"window_min_s": 80_000.0}, "window_min"),
        ({"sun_altitude_max_deg": -80.0}, "sun_altitude_max"),
        ({"moon_separation_min_deg": 180.0}, "moon_separation_min"),
    ],
)
def test_each_limit_alone_can_leave_nothing_and_is_named(limits, reason):
    # A star that culminates at 60° at midnight; the Moon is half lit on 2026-03-10.
    site = hourarc.Site(0.0, 50.0)
    star = hourarc.Catalog(169.0, 20.0)
    span = night_of(site, "2026-03-10")
    assert hourarc.windows(site, star, *span).counts[0] == 1
    found = hourarc.windows(site, star, *span, hourarc.Limits(**limits))
    assert found.counts[0] == 0
    assert found.blocked_by_words[0] == reason


def test_a_month_of_nights_has_a_row_each():
    found = hourarc.almanac(hourarc.Site(-70.4, -24.6, 2635.0), "2026-03-01", 30)
    assert list(found.night) == list(np.datetime64("2026-03-01") + np.arange(30))
    assert np.array_equal(found.start[1:], found.stop[:-1])
    assert np.all(found.stop - found.start == DAY)
    # A lunar day is 50 minutes longer than a solar one: once a month a night-to-noon has no moonrise.
    assert np.isnat(found.moonrise).sum() in (0, 1, 2) and np.isnat(found.moonset).sum() in (0, 1, 2)
    assert np.isnat(found.moonrise).sum() + np.isnat(found.moonset).sum() >= 1
    assert np.all((found.moon_illuminated_fraction >= 0.0) & (found.moon_illuminated_fraction <= 1.0))
    # Full Moon of 2026-03-03 11:38 UTC, new Moon of 2026-03-19 01:23 UTC (US Naval Observatory [M]).
    assert found.moon_illuminated_fraction[2] > 0.99 or found.moon_illuminated_fraction[1] > 0.99
    assert found.moon_illuminated_fraction[17] < 0.02
    assert found.moon_age_d[20] == pytest.approx(3.1, abs=0.3)
