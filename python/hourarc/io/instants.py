"""From the cells of a column to instants of UTC: ISO texts, timestamps, and day counts.

The forms of text are those that the verbs take (`hourarc.times`): 2026-03-10T03:00:00.5, a space for the T,
and Z or an offset from UTC after it. What has no offset is UTC.
"""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np

from ..errors import InvalidArgument
from ..times import to_nanoseconds
from .cells import is_text, numbers, trimmed
from .problems import WrongInput

if TYPE_CHECKING:
    import pyarrow as pa

#: The units of a column of instants, and what each says.
TIME_UNITS = {"iso": "ISO 8601 text", "mjd": "Modified Julian Date, UTC", "jd": "Julian Date, UTC"}

_MJD_OF_1970, _JD_OF_MJD_0 = 40_587.0, 2_400_000.5
_DAY_NS = 86_400_000_000_000
#: Day counts beyond these do not fit datetime64[ns] (years 1678 to 2261); they are MJD.
_FIRST_DAY, _LAST_DAY = -66_065.0, 147_237.0
_PLAIN = r"^\d{4}-\d{2}-\d{2}[T ]\d{2}:\d{2}(:\d{2}(\.\d{1,9})?)?$"
FORM = "an instant such as 2026-03-10T03:00:00"


def instants(
    raw: pa.Array, unit: str, column: str, missing: tuple[str, ...], path: Path
) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Instants as datetime64[ns] (NaT where there is none), which cells are empty, which are no instant.

    A day count in one double holds an instant to a microsecond.
    """
    import pyarrow as pa
    import pyarrow.compute as pc

    if pa.types.is_dictionary(raw.type):
        raw = pc.cast(raw, raw.type.value_type)
    if pa.types.is_timestamp(raw.type):
        if unit not in ("", "iso"):
            raise WrongInput(
                f'{path}, column "{column}": it holds timestamps, and the unit {unit} is for numbers'
            )
        return _timestamps(raw)
    if unit in ("mjd", "jd"):
        return _day_counts(*numbers(raw, column, missing, path), unit)
    if not is_text(raw.type):
        raise WrongInput(
            f'{path}, column "{column}": it holds {raw.type}; ISO 8601 text or timestamps are needed, or '
            f'[columns] time = {{ column = "{column}", unit = "mjd" }} (or "jd")'
        )
    return _texts(trimmed(raw, missing))


def _timestamps(raw: pa.Array) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    import pyarrow as pa
    import pyarrow.compute as pc

    null = np.asarray(pc.is_null(raw))
    # Coarser units can hold years that nanoseconds cannot: those cells are no instants here.
    counts = np.asarray(pc.fill_null(pc.cast(raw, pa.int64()), 0))
    times = counts.view(f"datetime64[{raw.type.unit}]")
    year = times.astype("datetime64[Y]").astype(np.int64) + 1970
    outside = (year < 1678) | (year > 2261)
    result = np.where(outside | null, np.datetime64("NaT"), times).astype("datetime64[ns]")
    return result, null, outside & ~null


def _day_counts(
    days: np.ndarray, null: np.ndarray, text: np.ndarray, unit: str
) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    days = days - _JD_OF_MJD_0 if unit == "jd" else days
    with np.errstate(invalid="ignore"):
        wrong = (text | ~((days >= _FIRST_DAY) & (days < _LAST_DAY))) & ~null
    day = np.floor(np.where(wrong | null, 0.0, days))
    within = np.rint((np.where(wrong | null, 0.0, days) - day) * _DAY_NS).astype(np.int64)
    nanoseconds = (day - _MJD_OF_1970).astype(np.int64) * _DAY_NS + within
    result = np.where(wrong | null, np.datetime64("NaT", "ns"), nanoseconds.view("datetime64[ns]"))
    return result, null, wrong


def _texts(raw: pa.Array) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    import pyarrow as pa
    import pyarrow.compute as pc

    null = np.asarray(pc.is_null(raw))
    plain = pc.fill_null(pc.match_substring_regex(raw, _PLAIN), False)
    result = np.full(len(raw), np.datetime64("NaT", "ns"))
    try:
        some = pc.cast(pc.if_else(plain, raw, None), pa.timestamp("s" if len(raw) == 0 else "ns"))
        result = np.array(some).astype("datetime64[ns]")
        slow = ~np.asarray(plain) & ~null
    except pa.ArrowInvalid:  # some date does not exist, or lies outside: find out which
        slow = ~null
    wrong = np.zeros(len(raw), dtype=bool)
    for i in np.flatnonzero(slow):
        try:
            result[i] = to_nanoseconds(raw[int(i)].as_py(), "time")[0].view("datetime64[ns]")[0]
        except InvalidArgument:
            wrong[i] = True
    return result, null, wrong
