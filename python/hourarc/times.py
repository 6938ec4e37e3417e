"""Instants as callers write them, as the engine takes them: int64 nanoseconds of UTC since 1970.

Naive times are UTC. A time with an offset from UTC (an aware `datetime`, an ISO string that ends in
`Z` or `+01:00`) is converted. `datetime64` cannot hold 23:59:60: a string that names it is refused,
an astropy `Time` inside a leap second becomes the following midnight, with a `LeapSecondWarning`.
"""

from __future__ import annotations

import contextlib
import datetime as _datetime
import re
import sys
from typing import Any

import numpy as np
from numpy.typing import NDArray

from .errors import InvalidArgument, WrongType

__all__ = ["day_number", "from_nanoseconds", "instant", "to_nanoseconds"]

Nanoseconds = NDArray[np.int64]

FORMS = (
    "UTC as numpy datetime64, an ISO string such as '2026-03-10T04:05:06' (Z or an offset may follow), "
    "a datetime, or an astropy Time"
)
FIRST = np.datetime64("1678-01-01", "ns")
"""The first instant that is accepted: datetime64[ns] ends within 1677."""
LAST = np.datetime64("2262-01-01", "ns")
"""The end, exclusive: datetime64[ns] ends in April 2262."""

# A comparison across units would cast to the finer one, and overflow in silence.
_FIRST_SECOND = FIRST.astype("datetime64[s]")
_LAST_SECOND = LAST.astype("datetime64[s]")
_NANOSECONDS_PER_SECOND = 1_000_000_000
_UNIX_EPOCH_MJD = 40_587  # 1970-01-01, exact
_NOT_A_TIME = np.iinfo(np.int64).min
_ISO = re.compile(
    r"(?P<date>\d{4}-\d{2}-\d{2})"
    r"(?:[T ](?P<clock>\d{2}:\d{2}(?::(?P<second>\d{2})(?:\.(?P<fraction>\d+))?)?)"
    r"\s*(?P<zone>[Zz]|[+-]\d{2}(?::?\d{2})?)?)?\Z",
    re.ASCII,
)


def to_nanoseconds(value: Any, what: str) -> tuple[Nanoseconds, tuple[int, ...]]:
    """`value` as a contiguous row of int64 nanoseconds of UTC, and the shape it came in.

    NaT is passed on (a wrong row, not a wrong call). Units finer than the nanosecond are rounded
    down. Years outside 1678–2261 raise `InvalidArgument`.
    """
    if _is_astropy_time(value):
        from . import interop

        return _checked(interop.time_to_nanoseconds(value).view("datetime64[ns]"), what)
    if isinstance(value, str):
        return _checked(np.asarray(_from_text(value, what)), what)
    if isinstance(value, (_datetime.datetime, _datetime.date)):
        return _checked(np.asarray(_from_datetime(value, what)), what)
    if isinstance(value, np.ma.MaskedArray):
        return to_nanoseconds(np.where(np.ma.getmaskarray(value), np.datetime64("NaT"), value.data), what)
    if value is None:  # an argument left out, not a missing row
        raise WrongType.of(what, value, FORMS)
    try:
        array = np.asarray(value)
    except (TypeError, ValueError) as error:
        raise WrongType.of(what, value, FORMS) from error
    if array.dtype.kind == "U":
        return _checked(_from_texts(array, what), what)
    if array.dtype == object:
        flat = [_from_object(each, what) for each in array.reshape(-1)]
        return _checked(np.array(flat, dtype="datetime64[ns]").reshape(array.shape), what)
    if array.dtype.kind != "M":
        raise WrongType.of(what, value, FORMS)
    return _checked(array, what)


def instant(value: Any, what: str) -> int:
    """`value` as the nanoseconds of one instant; NaT is refused."""
    nanoseconds, shape = to_nanoseconds(value, what)
    if nanoseconds.size != 1:
        raise InvalidArgument.of(what, f"an array of shape {shape}", "one instant")
    if nanoseconds[0] == _NOT_A_TIME:
        raise InvalidArgument.of(what, "NaT", "an instant")
    return int(nanoseconds[0])


def from_nanoseconds(nanoseconds: Nanoseconds) -> NDArray[np.datetime64]:
    """The same memory as `datetime64[ns]`."""
    return nanoseconds.view("datetime64[ns]")


def from_mjd(mjd: NDArray[np.float64]) -> NDArray[np.datetime64]:
    """Modified Julian Dates UTC as `datetime64[ns]`, to the microsecond that one double holds; NaN is NaT."""
    missing = np.isnan(mjd)
    since_1970 = np.where(missing, 0.0, mjd - _UNIX_EPOCH_MJD)
    times = np.rint(since_1970 * 86_400e6).astype(np.int64).astype("datetime64[us]").astype("datetime64[ns]")
    times[missing] = np.datetime64("NaT")
    return times


def span(start: Any, stop: Any) -> tuple[int, int]:
    """The two ends of a half-open span [start, stop) as nanoseconds; it must not be empty."""
    first, last = instant(start, "start"), instant(stop, "stop")
    if last <= first:
        shown = f"{np.datetime64(first, 'ns')} to {np.datetime64(last, 'ns')}"
        raise InvalidArgument.of("start, stop", shown, "a stop later than the start")
    return first, last


def day_number(value: Any, what: str) -> int:
    """The Modified Julian Day number of a calendar date, given as a date, an ISO date or datetime64[D].

    A time of day is refused, since a night is labelled by the date of its evening and nothing else.
    """
    allowed = "a date such as '2026-03-10', a datetime.date or datetime64[D]"
    if isinstance(value, _datetime.datetime):
        raise WrongType.of(what, value, allowed)
    if isinstance(value, np.datetime64) and np.datetime_data(value.dtype)[0] not in ("D", "M", "Y", "W"):
        midnight = value.astype("datetime64[D]")
        if np.isnat(value) or midnight != value:
            raise InvalidArgument.of(what, value, allowed + ", without a time of day")
    if isinstance(value, str) and not re.fullmatch(r"\d{4}-\d{2}-\d{2}", value.strip()):
        raise InvalidArgument.of(what, repr(value), allowed)
    if not isinstance(value, (str, _datetime.date, np.datetime64)):
        raise WrongType.of(what, value, allowed)
    return instant(value, what) // (86_400 * _NANOSECONDS_PER_SECOND) + _UNIX_EPOCH_MJD


def _is_astropy_time(value: Any) -> bool:
    """Whether `value` is an astropy Time; without astropy loaded, nothing is."""
    if "astropy" not in sys.modules:
        return False
    from . import interop

    return interop.is_time(value)


def _checked(times: NDArray[np.datetime64], what: str) -> tuple[Nanoseconds, tuple[int, ...]]:
    """Any unit to nanoseconds, with the overflow that numpy passes over in silence caught first."""
    unit = np.datetime_data(times.dtype)[0]
    # Units coarser than the nanosecond can hold instants that it cannot; finer ones cannot hold the bounds.
    if unit not in ("ns", "ps", "fs", "as", "generic"):
        _refuse(times, (times < FIRST.astype(times.dtype)) | (times > LAST.astype(times.dtype)), what)
    nanoseconds = times.astype("datetime64[ns]")
    _refuse(nanoseconds, (nanoseconds < FIRST) | (nanoseconds >= LAST), what)
    return np.ascontiguousarray(nanoseconds.reshape(-1)).view(np.int64), times.shape


def _refuse(times: NDArray[np.datetime64], outside: Any, what: str) -> None:
    """Raises for the first instant that is `outside`; NaT never is."""
    if np.any(outside):
        row = int(np.argmax(np.reshape(outside, -1)))
        given = f"{np.reshape(times, -1)[row]} in row {row}" if times.size > 1 else f"{times}"
        raise InvalidArgument.of(what, given, "years 1678 to 2261")


def _from_text(text: str, what: str) -> np.datetime64:
    """One ISO string; the date must exist."""
    stripped = text.strip()
    if stripped in ("", "NaT"):
        return np.datetime64("NaT", "ns")
    match = _ISO.match(stripped)
    if match is None:
        raise InvalidArgument.of(what, repr(text), FORMS)
    if match["second"] == "60":
        raise InvalidArgument.of(
            what, repr(text), "seconds 00 to 59: datetime64 cannot hold a leap second, name the next midnight"
        )
    clock = match["clock"]
    naive = match["date"] if clock is None else f"{match['date']}T{clock}"
    try:
        whole = np.datetime64(naive.partition(".")[0], "s")
    except ValueError as error:
        raise InvalidArgument.of(what, f"{text!r}, which is no date of the calendar", FORMS) from error
    if not _FIRST_SECOND <= whole < _LAST_SECOND:
        raise InvalidArgument.of(what, repr(text), "years 1678 to 2261")
    utc = whole + np.timedelta64(int(f"{match['fraction'] or '0':0<9.9}"), "ns")
    zone = match["zone"]
    if zone is None or zone in "Zz":
        return utc
    digits = zone[1:].replace(":", "")
    hours, minutes = int(digits[:2]), int(digits[2:] or 0)
    if hours > 23 or minutes > 59:
        raise InvalidArgument.of(what, repr(text), "offsets from -23:59 to +23:59")
    offset = np.timedelta64(60 * hours + minutes, "m")
    return utc - offset if zone[0] == "+" else utc + offset


def _from_texts(texts: NDArray[np.str_], what: str) -> NDArray[np.datetime64]:
    """Many ISO strings. Plain ones of one form go through numpy at once, the rest one by one."""
    flat = np.ascontiguousarray(texts).reshape(-1)
    width = flat.dtype.itemsize // 4
    if flat.size > 16 and 19 <= width <= 29:
        letters = flat.view(np.uint32).reshape(flat.size, width)
        digit = (letters >= ord("0")) & (letters <= ord("9"))
        pattern = "dddd-dd-ddTdd:dd:dd.ddddddddd"[:width]
        plain = digit | (letters != 0)
        for place, sign in enumerate(pattern):
            here = letters[:, place]
            plain[:, place] = digit[:, place] if sign == "d" else (here == ord(sign))
            if sign == "T":
                plain[:, place] |= here == ord(" ")
        if bool(plain.all()):
            # A ValueError is some row's date that does not exist: the slow path below names it.
            with contextlib.suppress(ValueError):  # InvalidArgument is one as well: it comes again below
                whole = flat.astype("U19").astype("datetime64[s]")
                _refuse(whole, (whole < _FIRST_SECOND) | (whole >= _LAST_SECOND), what)
                return flat.astype("datetime64[ns]").reshape(texts.shape)
    made = np.array([_from_text(str(text), what) for text in flat], dtype="datetime64[ns]")
    return made.reshape(texts.shape)


def _from_datetime(value: _datetime.date, what: str) -> np.datetime64:
    """A `datetime` (aware ones are converted to UTC), or a `date`, which is its 0h UTC."""
    exact = getattr(value, "to_datetime64", None)  # a pandas Timestamp: nanoseconds, already UTC
    if exact is not None:
        made: np.datetime64 = exact()
        return made
    if isinstance(value, _datetime.datetime) and value.tzinfo is not None:
        try:
            value = value.astimezone(_datetime.UTC).replace(tzinfo=None)
        except OverflowError as error:
            raise InvalidArgument.of(what, value, "years 1678 to 2261") from error
    return np.datetime64(value)


def _from_object(value: Any, what: str) -> np.datetime64:
    """One element of an object array, checked on its own so that the message names it."""
    if value is None:
        return np.datetime64("NaT", "ns")
    known = isinstance(value, (str, _datetime.date, np.datetime64)) or _is_astropy_time(value)
    if not known and np.asarray(value).dtype == object:  # would come back here for ever
        raise WrongType.of(what, value, FORMS)
    nanoseconds, shape = to_nanoseconds(value, what)
    if shape != ():
        raise WrongType.of(what, value, FORMS)
    return np.datetime64(int(nanoseconds[0]), "ns")
