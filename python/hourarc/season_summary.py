"""A season in a row a target: when it begins and ends for each, what it adds up to, who has none."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from ._columns import Floats, scalar
from .errors import InvalidArgument
from .results import FIRST_BAD_STATUS, STATUS_WORDS, Coded, ColumnResult, arrow_table, words

if TYPE_CHECKING:
    import pyarrow

__all__ = ["SeasonSummary", "SeasonTally"]

Dates = NDArray[np.datetime64]
Counts = NDArray[np.int32]

#: Numbers that a step of the tally touches at once: they stay in the cache.
_BLOCK = 16_384


@dataclass(frozen=True, slots=True, repr=False, eq=False)
class SeasonSummary(ColumnResult):
    """The season of each target, columns of shape (targets,), and the use of each night, shape (nights,).

    Where `longest_gap` is long, the span cuts the season of the target in two: it ends after the first
    night of the span and begins again before the last.
    """

    first_night: Dates
    """Date of the first useful night, datetime64[D]; NaT for a target that has none."""
    last_night: Dates
    """Date of the last useful night; NaT for a target that has none."""
    useful_nights: Counts
    """How many nights are useful."""
    longest_gap: Counts
    """The most nights in a row, between the first and the last, that are not useful."""
    hours: Floats
    """Hours on all nights together; NaN for a bad row."""
    status: NDArray[np.uint8]
    """Status of each target; from 16 on it is a bad row."""
    name: NDArray[np.str_] | None
    """The names of the targets, or None."""
    night: Dates
    """Date of each night, datetime64[D], shape (nights,)."""
    night_hours: Floats
    """Hours of all targets together on each night, shape (nights,)."""
    useful_targets: NDArray[np.int64]
    """To how many targets each night is useful, shape (nights,)."""

    def __len__(self) -> int:
        """The number of targets."""
        return len(self.status)

    @property
    def never(self) -> NDArray[np.int64]:
        """Row numbers of the good targets that are never observable: that have no useful night."""
        return np.flatnonzero((self.useful_nights == 0) & (self.status < FIRST_BAD_STATUS))

    @property
    def status_words(self) -> NDArray[np.str_]:
        """The status of each target as a word."""
        return words(self.status, STATUS_WORDS)

    def nights_to_arrow(self) -> pyarrow.Table:
        """One row a night: hours of all targets together, and to how many it is useful."""
        names = ("night", "night_hours", "useful_targets")
        return arrow_table({name: getattr(self, name) for name in names})

    def _table(self) -> dict[str, Any]:
        named = {} if self.name is None else {"name": self.name}
        names = ("first_night", "last_night", "useful_nights", "longest_gap", "hours")
        return {
            "target": np.arange(len(self), dtype=np.int64),
            **named,
            **{name: getattr(self, name) for name in names},
            "status": Coded(self.status, STATUS_WORDS),
        }

    def _heading(self) -> str:
        observable = int(np.count_nonzero(self.useful_nights))
        return f"Season of {len(self.night):,} nights: {observable:,} of {len(self):,} targets observable"


class SeasonTally:
    """Adds up a season night by night, for grids that are never in memory as a whole."""

    def __init__(self, targets: int, useful_hours: float = 0.0) -> None:
        least = scalar(useful_hours, "summary: useful_hours", "h")
        if not 0.0 <= least < 24.0:
            raise InvalidArgument.of("summary: useful_hours", f"{least:g}", "0 to below 24 hours")
        self._least = np.float32(least)
        self._first = np.full(targets, -1, dtype=np.int32)
        self._last = np.full(targets, -1, dtype=np.int32)
        self._useful = np.zeros(targets, dtype=np.int32)
        self._gap = np.zeros(targets, dtype=np.int32)
        self._hours = np.zeros(targets)
        self._night: list[Dates] = []
        self._night_hours: list[Floats] = []
        self._night_useful: list[NDArray[np.int64]] = []
        self._nights = 0

    def add(self, night: Dates, hours: NDArray[np.float32]) -> None:
        """The next nights: their dates, shape (nights,), and their hours, shape (nights, targets)."""
        night_hours, night_useful = np.zeros(len(night)), np.zeros(len(night), dtype=np.int64)
        for start in range(0, hours.shape[1], _BLOCK):
            part = slice(start, start + _BLOCK)
            block = hours[:, part]
            useful = block > self._least
            night_useful += np.count_nonzero(useful, axis=1)
            night_hours += np.nansum(block, axis=1, dtype=np.float64)
            self._hours[part] += block.sum(axis=0, dtype=np.float64)
            self._useful[part] += np.count_nonzero(useful, axis=0).astype(np.int32)
            first, last, gap = self._first[part], self._last[part], self._gap[part]
            for index, row in enumerate(useful, self._nights):
                # The nights between this useful one and the one before, if there was one.
                between = np.where(row & (last >= 0), index - last - 1, 0)
                np.maximum(gap, between, out=gap)
                first[row & (first < 0)] = index
                last[row] = index
        self._night.append(night)
        self._night_hours.append(night_hours)
        self._night_useful.append(night_useful)
        self._nights += len(night)

    def summary(self, status: NDArray[np.uint8], name: NDArray[np.str_] | None) -> SeasonSummary:
        """The season so far."""
        night = np.concatenate(self._night)
        # A date more, for targets without a useful night: index -1.
        dates = np.append(night, np.datetime64("NaT", "D"))
        return SeasonSummary(
            first_night=dates[self._first],
            last_night=dates[self._last],
            useful_nights=self._useful,
            longest_gap=self._gap,
            hours=self._hours,
            status=status,
            name=name,
            night=night,
            night_hours=np.concatenate(self._night_hours),
            useful_targets=np.concatenate(self._night_useful),
        )
