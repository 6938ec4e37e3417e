"""UTC nanoseconds to two-part TAI, TT, TDB and UT1, and back.

An instant is an int64: nanoseconds since 1970-01-01 counting 86,400 s a day, as `datetime64[ns]` counts.
A two-part date is (whole Modified Julian Day + 2400000.5, fraction), each part exact to 1e-11 s.
"""

import warnings

import erfa
import numpy as np

DAY_NS = 86_400_000_000_000
MJD_ZERO = 2_400_000.5
UNIX_MJD = 40_587


def nanoseconds(when):
    """`datetime64`, ISO text, or arrays of them, as int64 nanoseconds."""
    return np.asarray(when, dtype="datetime64[ns]").astype(np.int64)


def datetime(utc_ns):
    """Nanoseconds as `datetime64[ns]`."""
    return np.asarray(utc_ns, dtype=np.int64).astype("datetime64[ns]")


def split(utc_ns):
    """The UTC day as a Julian Date at 0h, and the seconds since then as they are labelled."""
    utc_ns = np.asarray(utc_ns, dtype=np.int64)
    day = utc_ns // DAY_NS
    second = (utc_ns - day * DAY_NS).astype(float) * 1e-9
    return MJD_ZERO + (UNIX_MJD + day).astype(float), second


def tai_minus_utc_s(utc_ns):
    """TAI−UTC from ERFA's own table of leap seconds and 1960–1972 rates."""
    day, second = split(utc_ns)
    year, month, date, _ = erfa.jd2cal(day, 0.0)
    with warnings.catch_warnings():
        # "dubious year" only says that the leap seconds of the future are unknown.
        warnings.simplefilter("ignore", erfa.ErfaWarning)
        return erfa.dat(year, month, date, second / 86_400.0)


def tai(utc_ns):
    """Two-part TAI."""
    day, second = split(utc_ns)
    return day, (second + tai_minus_utc_s(utc_ns)) / 86_400.0


def tt(utc_ns):
    """Two-part TT."""
    day, second = split(utc_ns)
    return day, (second + (tai_minus_utc_s(utc_ns) + 32.184)) / 86_400.0


def tdb(utc_ns):
    """Two-part TDB at the geocentre: Fairhead & Bretagnon (1990) as ERFA evaluates it."""
    day, fraction = tt(utc_ns)
    return day, fraction + erfa.dtdb(day, fraction, 0.0, 0.0, 0.0, 0.0) / 86_400.0


def ut1(utc_ns, ut1_minus_utc_s):
    """Two-part UT1."""
    day, second = split(utc_ns)
    return day, (second + ut1_minus_utc_s) / 86_400.0


def utc_from_tt(year, month, day_of_month, seconds=0.0):
    """Nanoseconds of UTC of a civil TT date from 1972 on, and not inside a leap second."""
    label = nanoseconds(f"{year:04d}-{month:02d}-{day_of_month:02d}") + round(seconds * 1e9)
    guess = label - round((tai_minus_utc_s(label) + 32.184) * 1e9)
    return int(label - np.round((tai_minus_utc_s(guess) + 32.184) * 1e9))
