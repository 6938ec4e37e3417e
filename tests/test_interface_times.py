"""Instants as callers write them: every form gives the same nanoseconds, every trap its message."""

import datetime
import sys

import hourarc as ha
import numpy as np
import pytest
from hourarc.errors import InvalidArgument, LeapSecondWarning, WrongType
from hourarc.times import day_number, instant, span, to_nanoseconds

# 2026-03-10T04:05:06.789 UTC. Days since 1970-01-01 by the calendar of the standard library.
DAYS = (datetime.date(2026, 3, 10) - datetime.date(1970, 1, 1)).days
EXPECTED = ((DAYS * 24 + 4) * 60 + 5) * 60_000_000_000 + 6_789_000_000
NOT_A_TIME = np.iinfo(np.int64).min


def zone(hours):
    return datetime.timezone(datetime.timedelta(hours=hours))


@pytest.mark.parametrize(
    "value",
    [
        np.datetime64("2026-03-10T04:05:06.789"),
        np.datetime64("2026-03-10T04:05:06.789", "ns"),
        np.datetime64("2026-03-10T04:05:06.789", "us"),
        "2026-03-10T04:05:06.789",
        "2026-03-10 04:05:06.789",
        " 2026-03-10T04:05:06.789000000Z ",
        "2026-03-10T04:05:06.789z",
        "2026-03-10T06:05:06.789+02:00",
        "2026-03-09T22:35:06.789-05:30",
        "2026-03-10T06:05:06.789+02",
        "2026-03-10T06:05:06.789+0200",
        datetime.datetime(2026, 3, 10, 4, 5, 6, 789_000),
        datetime.datetime(2026, 3, 10, 4, 5, 6, 789_000, tzinfo=datetime.UTC),
        datetime.datetime(2026, 3, 10, 9, 5, 6, 789_000, tzinfo=zone(5)),
    ],
)
def test_every_form_gives_the_same_nanoseconds(value):
    for given, shape in ((value, ()), ([value], (1,)), ([value, value], (2,)), ([[value]], (1, 1))):
        nanoseconds, found = to_nanoseconds(given, "when")
        assert found == shape
        assert nanoseconds.dtype == np.int64 and nanoseconds.ndim == 1 and nanoseconds.flags.c_contiguous
        assert np.all(nanoseconds == EXPECTED)


def test_every_unit_of_datetime64():
    for unit in ("Y", "M", "W", "D", "h", "m", "s", "ms", "us", "ns", "ps", "fs", "as"):
        value = np.datetime64(0, unit)
        assert instant(value, "when") == 0, unit
    assert instant(np.datetime64(3, "ps"), "when") == 0
    assert instant(np.datetime64(-3, "ps"), "when") == -1  # rounded down
    assert instant(np.datetime64(7, "25s"), "when") == 175_000_000_000


def test_strided_and_big_endian_arrays_are_made_contiguous():
    times = np.datetime64("2026-03-10", "s") + np.arange(10)
    for given in (times[::3], times[::-1], times.astype(">M8[s]")):
        nanoseconds, _ = to_nanoseconds(given, "when")
        assert np.array_equal(nanoseconds, np.asarray(given).astype("M8[ns]").astype(np.int64))


def test_many_strings_agree_with_one_by_one():
    times = np.datetime64("2026-03-10T00:00:00.000", "ms") + np.arange(1000) * 86_399_999
    for width in (19, 21, 23):
        texts = np.array([str(t)[:width] for t in times])
        fast, _ = to_nanoseconds(texts, "when")
        slow = [instant(str(text), "when") for text in texts]
        assert fast.tolist() == slow
    mixed = [*texts.tolist(), "2026-03-10T06:05:06.789+02:00", "2026-03-10", "NaT"]
    nanoseconds, _ = to_nanoseconds(mixed, "when")
    assert nanoseconds[-3:].tolist() == [EXPECTED, DAYS * 86_400_000_000_000, NOT_A_TIME]


def test_nat_is_a_wrong_row_and_not_a_wrong_call():
    for given in (np.datetime64("NaT"), "NaT", [None], np.array(["NaT", "2026-01-01"], "M8[D]")):
        assert to_nanoseconds(given, "when")[0][0] == NOT_A_TIME
    masked = np.ma.MaskedArray(np.array(["2026-01-01", "2026-01-02"], "M8[s]"), mask=[True, False])
    assert to_nanoseconds(masked, "when")[0].tolist()[0] == NOT_A_TIME
    with pytest.raises(InvalidArgument, match="start: given NaT"):
        span(np.datetime64("NaT"), "2026-01-01")


@pytest.mark.parametrize(
    "value",
    [
        "1677-12-31T23:59:59",
        "2262-01-01",
        "1500-06-01",
        "9999-12-31T00:00:00",
        np.datetime64("1600", "Y"),
        np.datetime64("2262", "Y"),
        np.datetime64(2**60, "s"),
        np.datetime64(-(2**62), "us"),
        np.datetime64("1677-10-01", "ns"),
        datetime.datetime(1066, 10, 14),
        datetime.date(3000, 1, 1),
        datetime.datetime(1, 1, 1, tzinfo=zone(12)),
        ["2026-01-01T00:00:00"] * 20 + ["1500-01-01T00:00:00"],
    ],
)
def test_years_that_nanoseconds_cannot_hold_are_refused(value):
    with pytest.raises(InvalidArgument, match=r"when: given .*allowed .*1678 to 2261"):
        to_nanoseconds(value, "when")


def test_the_bounds_themselves_are_taken():
    assert np.datetime64(instant("1678-01-01", "when"), "ns") == np.datetime64("1678-01-01")
    last = instant("2261-12-31T23:59:59.999999999", "when")
    assert np.datetime64(last, "ns") == np.datetime64("2261-12-31T23:59:59.999999999")


def test_a_row_out_of_range_is_named():
    with pytest.raises(InvalidArgument, match="1500-01-01 in row 2"):
        to_nanoseconds(np.array(["2026-01-01", "NaT", "1500-01-01"], "M8[D]"), "when")


@pytest.mark.parametrize(
    "value, message",
    [
        ("2026-02-30", "no date of the calendar"),
        ("2026-13-01T00:00:00", "no date of the calendar"),
        ("2026-03-10T25:00:00", "no date of the calendar"),
        ("now", "given 'now'"),
        ("today", "given 'today'"),
        ("2026-03", "given '2026-03'"),
        ("10.03.2026", "given '10.03.2026'"),
        ("2026-03-10Z", "given '2026-03-10Z'"),
        ("2026-03-10T00:00:00+24:00", "offsets from -23:59"),
        ("2016-12-31T23:59:60", "cannot hold a leap second"),
        ("2016-12-31T23:59:60.5Z", "cannot hold a leap second"),
        (["2026-03-10T00:00:00"] * 20 + ["2026-02-30T00:00:00"], "given '2026-02-30T00:00:00'"),
    ],
)
def test_strings_that_are_no_instants(value, message):
    with pytest.raises(InvalidArgument, match="when: ") as caught:
        to_nanoseconds(value, "when")
    assert message in str(caught.value)


@pytest.mark.parametrize("value", [61_109.5, 5, [1.0, 2.0], b"2026-03-10", object(), None, {"a": 1}, True])
def test_what_is_no_time_at_all(value):
    with pytest.raises(WrongType, match="when: given .* allowed UTC as numpy datetime64"):
        to_nanoseconds(value, "when")


def test_a_span_must_have_length():
    with pytest.raises(InvalidArgument, match="a stop later than the start"):
        span("2026-03-10", "2026-03-10")
    with pytest.raises(InvalidArgument, match="one instant"):
        span(["2026-03-10", "2026-03-11"], "2026-03-12")


def test_nights_are_dates_without_a_time_of_day():
    # MJD 61109 is 2026-03-10 (MJD 60000 is 2023-02-25, a published anchor).
    assert day_number("2023-02-25", "night") == 60_000
    for value in (
        "2026-03-10",
        datetime.date(2026, 3, 10),
        np.datetime64("2026-03-10"),
        np.str_("2026-03-10"),
    ):
        assert day_number(value, "night") == 61_109
    assert day_number(np.datetime64("2026-03-10", "ns"), "night") == 61_109
    for value in (np.datetime64("2026-03-10T01:00"), "2026-03-10T01:00", "2026-02-30", "soon"):
        with pytest.raises(InvalidArgument, match="night: given"):
            day_number(value, "night")
    for value in (datetime.datetime(2026, 3, 10), 61_109, None):
        with pytest.raises(WrongType, match="night: given"):
            day_number(value, "night")


def test_astropy_times_of_every_scale():
    time = pytest.importorskip("astropy.time")
    utc = time.Time("2026-03-10T04:05:06.789", scale="utc", precision=9)
    for scale in ("utc", "tai", "tt", "tdb"):
        # TDB is rounded by its two doubles and its series; the others are exact.
        assert abs(instant(getattr(utc, scale), "when") - EXPECTED) <= 1, scale
    several = time.Time([["2026-03-10T04:05:06.789"], ["1999-12-31T23:59:59"]])
    nanoseconds, shape = to_nanoseconds(several, "when")
    assert shape == (2, 1)
    assert nanoseconds.tolist() == [EXPECTED, 946_684_799_000_000_000]
    masked = time.Time(["2026-03-10", "2026-03-11"])
    masked[1] = np.ma.masked
    assert to_nanoseconds(masked, "when")[0].tolist()[1] == NOT_A_TIME
    assert to_nanoseconds([utc, "2026-03-10T04:05:06.789"], "when")[0].tolist() == [EXPECTED, EXPECTED]
    # Before 1972 the label is the label, whatever the rate was.
    assert instant(time.Time("1965-06-01T12:00:00"), "when") == np.datetime64("1965-06-01T12", "ns").astype(
        int
    )


def test_astropy_leap_second_becomes_the_following_midnight():
    time = pytest.importorskip("astropy.time")
    midnight = int(np.datetime64("2017-01-01", "ns").astype(np.int64))
    with pytest.warns(LeapSecondWarning, match="following midnight"):
        assert instant(time.Time("2016-12-31T23:59:60.5"), "when") == midnight
    before = time.Time("2016-12-31T23:59:59.75")
    assert instant(before, "when") == midnight - 250_000_000
    assert instant(time.Time("2017-01-01T00:00:00"), "when") == midnight


def test_astropy_times_that_cannot_be_utc():
    time = pytest.importorskip("astropy.time")
    with pytest.raises(InvalidArgument, match="local"):
        to_nanoseconds(time.Time("2026-03-10", scale="local"), "when")
    with pytest.raises(InvalidArgument, match="1678 to 2261"):
        to_nanoseconds(time.Time("3000-01-01"), "when")


def test_arrow_and_pandas_timestamps():
    pa = pytest.importorskip("pyarrow")
    stamps = pa.array([EXPECTED, None], pa.timestamp("ns", tz="America/Santiago"))
    assert to_nanoseconds(stamps, "when")[0].tolist() == [EXPECTED, NOT_A_TIME]
    if "pandas" in sys.modules:
        import pandas as pd

        assert instant(pd.Timestamp(EXPECTED, tz="Asia/Tokyo"), "when") == EXPECTED


def test_the_verbs_take_them_all():
    time = pytest.importorskip("astropy.time")
    site, star = ha.Site(-70.4, -24.6, 2635.0), ha.Catalog(83.8, -5.4)
    text = "2026-03-10T04:05:06.789"
    bits = {
        ha.place(site, star, when).altitude_deg.tobytes()
        for when in (
            text,
            text + "Z",
            np.datetime64(text),
            datetime.datetime.fromisoformat(text),
            time.Time(text),
        )
    }
    assert len(bits) == 1
