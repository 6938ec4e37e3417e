"""Explanations: each limit alone and together, against the windows, and what is printed of them."""

import hourarc as ha
import numpy as np
import pytest
from hourarc.errors import InvalidArgument, WrongType

SKYLINE = [[0.0, 3.0], [70.0, 5.5], [110.0, 34.0], [180.0, 2.0], [250.0, 38.0], [300.0, 6.0]]
SITE = ha.Site(24.5127, -20.8714, 1148.0, name="Saltpan Ridge", skyline=SKYLINE)
STARS = ha.Catalog([160.0, 130.0, 200.0, np.nan], [-30.0, -75.0, -10.0, 0.0], name=["A", "B", "C", "D"])
EVERY = ha.Limits(
    altitude_min_deg=[25.0, 20.0, 30.0, 30.0],
    airmass_max=2.5,
    altitude_max_deg=88.0,
    declination_min_deg=-80.0,
    hour_angle_min_h=-4.0,
    hour_angle_max_h=4.5,
    azimuth_sectors_deg=[[300, 280]],
    azimuth_rate_max_deg_s=1.0,
    cable_range_deg=[-270, 270],
    moon_separation_min_deg=30.0,
    moon_avoidance_separation_deg=45.0,
    moon_avoidance_width_d=5.0,
    moon_relaxed_below_deg=-1.0,
    moon_altitude_max_deg=80.0,
    moon_illumination_max=0.99,
    sky_brightness_min_mag_arcsec2=17.5,
    allowed_intervals=[["2026-03-10T19:00", "2026-03-11T01:30"], ["2026-03-11T02:00", "2026-03-11T09:00"]],
    phase_epoch_jd=2455197.51,
    phase_period_d=0.1003,
    phase_half_width_d=0.04,
    window_min_s=1200,
)


def instants(intervals):
    return np.asarray(intervals).reshape(-1, 2)


def test_the_limits_intersect_to_the_windows():
    found = ha.windows(SITE, STARS, *span(), EVERY)
    assert found.counts[:3].max() > 1
    for row in range(3):
        made = ha.explain(SITE, STARS[row], "2026-03-10", EVERY.at(row))
        assert [limit.reason for limit in made.limits] == [
            *("sun_altitude_max", "moon_altitude_max", "moon_illumination_max", "allowed_intervals"),
            *("altitude_min", "airmass_max", "altitude_max", "declination", "hour_angle", "azimuth_sectors"),
            *("azimuth_rate", "skyline", "sun_separation_min", "moon_separation_min", "moon_avoidance"),
            *("phase", "sky_brightness", "cable_range", "window_min"),
        ]
        assert made.windows == tuple(found.of(row)) and made.name == "ABC"[row]
        last = made.limits[-1]
        windows = instants([[w.start, w.stop] for w in made.windows])
        assert last.left.tolist() == windows.tolist()
        assert made.hours == pytest.approx(found.hours[row]) == pytest.approx(last.hours_left)
        # What is left is the intersection: judged each minute, away from edges.
        times = made.night.start[0] + np.arange(5, 86_000, 60) * np.timedelta64(1, "s")
        still = np.ones(len(times), dtype=bool)
        for limit in made.limits[:-2]:
            still &= within(times, limit.alone)
            assert (within(times, limit.left) == still).mean() > 0.999, limit.reason
            assert limit.hours_left <= limit.hours_alone + 1e-6


def span():
    night = ha.almanac(SITE, "2026-03-10", 1)
    return night.start[0], night.stop[0]


def within(times, intervals):
    return ((times[:, np.newaxis] >= intervals[:, 0]) & (times[:, np.newaxis] < intervals[:, 1])).any(axis=1)


def test_what_is_printed():
    text = str(ha.explain(SITE, STARS[0], "2026-03-10", EVERY.at(0)))
    lines = text.splitlines()
    assert lines[0] == "A, night of 2026-03-10, at Saltpan Ridge (24.5127° E, 20.8714° S, 1148 m)"
    assert "2026-03-10 10:22 to 2026-03-11 10:22, local mean noon to noon. All times are UTC." in lines
    for words in (
        "Sun at or below -18°",
        "Moon lit to 99\u00a0% at most",
        "in an allowed interval",
        "altitude at least 25°",
        "airmass at most 2.5",
        "altitude at most 88°",
        "declination at least -80°",
        "hour angle -4\u00a0h to +4.5\u00a0h",
        "azimuth 300°–280°",
        "azimuth turns by at most 1°/s",
        "above the skyline",
        "from the Sun at least 30°",
        "from the Moon at least 30° while the",
        "cables -270° to 270°",
        "for at least 20\u00a0min",
        "all together",
        "local mean noon to noon",
    ):
        assert words in text, words
    # The timeline: every row has as many marks; where all hold is where the last limit leaves something.
    rows = [line[44:] for line in lines if line[44:] and set(line[44:]) <= set("━─·█")]
    assert len(rows) == 20 and len({len(row) for row in rows}) == 1
    assert [mark == "█" for mark in rows[-1]] == [mark == "━" for mark in rows[-2]]
    hours = next(line for line in lines if line.split()[:2] == ["16", "17"])
    assert hours.index("18") == 44 + 4 * 2
    assert max(map(len, lines)) <= 132


def test_the_timeline_says_when():
    limits = ha.Limits(
        altitude_min_deg=0.0, skyline=False, allowed_intervals=[["2026-03-10T20:00", "2026-03-10T22:00"]]
    )
    made = ha.explain(SITE, STARS[0], "2026-03-10", limits)
    lines = str(made).splitlines()
    hours = next(line for line in lines if line.split()[:2] == ["16", "17"])
    row = next(line for line in lines if line.strip().startswith("all together"))
    marks = [i for i, mark in enumerate(row) if mark == "█"]
    assert (marks[0], marks[-1] + 1) == (hours.index("20"), hours.index("22"))
    assert "One window, 2 h 00 min in all:" in lines
    row = next(line for line in lines if line.strip().startswith("20:00:00"))
    assert (
        row.split()[:5] == ["20:00:00", "22:00:00", "2", "h", "00"] and row.count("2 allowed_intervals") == 2
    )


def test_why_there_is_none():
    def said(target, night="2026-03-10", **limits):
        made = ha.explain(SITE, target, night, ha.Limits(**limits))
        assert not made.windows
        return made, str(made)

    made, text = said(STARS[0], altitude_min_deg=89.5)
    assert made.blocked_by == "altitude_min"
    assert "No window: nothing is left after limit 2, altitude at least 89.5°." in text
    assert "It does not hold at any time of this night." in text
    # Both keep it out; the first of them is named.
    made, text = said(ha.Catalog(160.0, 60.0), altitude_min_deg=25.0, airmass_max=1.1)
    assert made.blocked_by == "altitude_min" and "after limit 2, altitude at least 25°." in text
    assert "RA 160.0000°, Dec +60.0000°, night of" in text
    made, text = said(STARS[0], window_min_s=80_000.0)
    assert made.blocked_by == "window_min" and "is too short," in text
    made, text = said(STARS[3])
    assert made.blocked_by == "bad_row" and not made.limits
    assert "the target cannot be placed" in text
    made, text = said(STARS[0], "2026-08-05")
    assert "It holds 10:22–" in text and "those above it leave 17:21–03:35." in text


def test_bodies_and_nights_without_a_sunset():
    north = ha.Site(15.0, 78.0, 0.0)
    limits = ha.Limits(sun_altitude_max_deg=90.0, altitude_min_deg=0.0)
    made = ha.explain(north, ha.Bodies(["moon"]), "2026-06-21", limits)
    text = str(made)
    assert made.name == "moon" and "the whole night" in text and "A mark is 30 min" in text
    assert "its scatter is in what is sure" in text


def test_wrong_calls():
    with pytest.raises(
        InvalidArgument, match=r"explain: target: given 4 targets, allowed one, such as stars\[3\]"
    ):
        ha.explain(SITE, STARS, "2026-03-10")
    with pytest.raises(WrongType, match="explain: limits"):
        ha.explain(SITE, STARS[0], "2026-03-10", {"altitude_min_deg": 3})
    with pytest.raises(InvalidArgument, match="almanac: first_night: given"):
        ha.explain(SITE, STARS[0], "yesterday")
    with pytest.raises(
        InvalidArgument, match="given 4 values, allowed one value, or one for each of 1 targets"
    ):
        ha.explain(SITE, STARS[0], "2026-03-10", EVERY)


def test_its_table():
    pytest.importorskip("pyarrow")
    made = ha.explain(SITE, STARS[0], "2026-03-10")
    table = made.to_arrow()
    assert table.column_names == ["limit", "alone", "start", "stop"] and table.num_rows >= 8
    assert repr(made).startswith("<Explanation of A on 2026-03-10: 4 limits, ")
    assert ha.explain(SITE, STARS[3], "2026-03-10").to_arrow().num_rows == 0
