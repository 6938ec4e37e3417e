"""When may I observe it: the windows in which all limits hold, and what opens and closes each."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from . import _engine
from ._columns import Floats, column, workers
from .errors import InvalidArgument, WrongType
from .limits import Limits
from .orbits import Orbits
from .orientation import Orientation, as_orientation
from .results import STATUS_WORDS, Coded, ColumnResult, Ragged, arrow_table, words
from .site import Site, as_site
from .targets import Bodies, Catalog, as_targets
from .times import from_nanoseconds, span

if TYPE_CHECKING:
    import pyarrow

__all__ = ["REASON_WORDS", "Window", "Windows", "windows"]

REASON_WORDS: tuple[str, ...] = tuple(_engine.reason_words())
"""The word for each code of `start_reason`, `stop_reason` and `blocked_by`."""


@dataclass(frozen=True, slots=True)
class Window:
    """One half-open interval [start, stop) in which all limits hold."""

    start: np.datetime64
    stop: np.datetime64
    start_reason: str
    stop_reason: str
    best_airmass: float
    best_time: np.datetime64
    start_error_s: float
    stop_error_s: float
    start_scatter_s: float
    stop_scatter_s: float
    may_not_happen: bool

    @property
    def duration_s(self) -> float:
        """Stop minus start, seconds."""
        return float((self.stop - self.start) / np.timedelta64(1, "s"))


@dataclass(frozen=True, slots=True, repr=False, eq=False)
class Windows(Ragged, ColumnResult):
    """The windows of many targets, in order of time within each.

    Rows `offsets[i]` to `offsets[i + 1]` are those of target i; `of(i)` gives them one by one. A target
    without a window says in `blocked_by` which limit leaves it none.
    """

    offsets: NDArray[np.int64]
    """Where each target's rows begin, shape (targets + 1,)."""
    start: NDArray[np.datetime64]
    """First instant of the window, UTC, datetime64[ns], shape (windows,)."""
    stop: NDArray[np.datetime64]
    """First instant after it."""
    start_reason: NDArray[np.uint8]
    """The limit that opens it, as a code of `REASON_WORDS`."""
    stop_reason: NDArray[np.uint8]
    """The limit that closes it, as a code of `REASON_WORDS`."""
    best_airmass: Floats
    """The least airmass within."""
    best_time: NDArray[np.datetime64]
    """When the airmass is least, UTC."""
    start_error_s: Floats
    """Error of the computed start, seconds: interpolation, root, UT1, ephemeris, and the catalogue place's if
    given."""
    stop_error_s: Floats
    """The same for the stop."""
    start_scatter_s: Floats
    """Scatter of the start by the refraction of the day, 1 sigma, seconds; 0 above 15 degrees, and where no
    altitude of the target sets the edge."""
    stop_scatter_s: Floats
    """The same for the stop."""
    may_not_happen: NDArray[np.bool_]
    """Whether an edge is a grazing: the margin is below the error, and the window may be longer or may not
    be."""
    status: NDArray[np.uint8]
    """Status of each target, shape (targets,); from 16 on it is a bad row."""
    blocked_by: NDArray[np.uint8]
    """The limit that leaves a target no window, as a code of `REASON_WORDS`; 0 where it has one."""
    name: NDArray[np.str_] | None
    """The names of the targets, or None."""

    @property
    def start_reason_words(self) -> NDArray[np.str_]:
        """The limit that opens each window, shape (windows,)."""
        return words(self.start_reason, REASON_WORDS)

    @property
    def stop_reason_words(self) -> NDArray[np.str_]:
        """The limit that closes each window, shape (windows,)."""
        return words(self.stop_reason, REASON_WORDS)

    @property
    def blocked_by_words(self) -> NDArray[np.str_]:
        """The limit that leaves each target no window, shape (targets,)."""
        return words(self.blocked_by, REASON_WORDS)

    @property
    def status_words(self) -> NDArray[np.str_]:
        """The status of each target, shape (targets,)."""
        return words(self.status, STATUS_WORDS)

    @property
    def hours(self) -> Floats:
        """The length of each target's windows together, hours, shape (targets,)."""
        return np.bincount(self.target, weights=self.duration_s, minlength=len(self)) / 3600.0

    @property
    def duration_s(self) -> Floats:
        """The length of each window, seconds, shape (windows,)."""
        return np.asarray((self.stop - self.start) / np.timedelta64(1, "s"))

    @property
    def blocked_counts(self) -> dict[str, int]:
        """How many targets each limit leaves without a window, by its word."""
        codes, counts = np.unique(self.blocked_by, return_counts=True)
        return {
            REASON_WORDS[code]: count
            for code, count in zip(codes.tolist(), counts.tolist(), strict=True)
            if code
        }

    def of(self, target: int) -> list[Window]:
        """The windows of one target, by its row number."""
        return self._windows(self.rows(target))

    def __iter__(self) -> Iterator[list[Window]]:
        """The windows of each target in turn."""
        return map(self._windows, self._each())

    def _windows(self, rows: slice) -> list[Window]:
        opened = [REASON_WORDS[code] for code in self.start_reason[rows]]
        closed = [REASON_WORDS[code] for code in self.stop_reason[rows]]
        airmass = self.best_airmass[rows].tolist()
        sure = (self.start_error_s, self.stop_error_s, self.start_scatter_s, self.stop_scatter_s)
        columns = (
            *(self.start[rows], self.stop[rows], opened, closed, airmass, self.best_time[rows]),
            *(column[rows].tolist() for column in (*sure, self.may_not_happen)),
        )
        return [Window(*fields) for fields in zip(*columns, strict=True)]

    def targets_to_arrow(self) -> pyarrow.Table:
        """One row a target: status, what blocks it, how many windows and hours it has."""
        index = np.arange(len(self), dtype=np.int64)
        named = {} if self.name is None else {"name": self.name}
        return arrow_table(
            {
                "target": index,
                **named,
                "status": Coded(self.status, STATUS_WORDS),
                "blocked_by": Coded(self.blocked_by, REASON_WORDS),
                "window_count": self.counts,
                "hours": self.hours,
            }
        )

    def _table(self) -> dict[str, Any]:
        target = self.target
        named = {} if self.name is None else {"name": self.name[target]}
        return {
            "target": target,
            **named,
            "start": self.start,
            "stop": self.stop,
            "start_reason": Coded(self.start_reason, REASON_WORDS),
            "stop_reason": Coded(self.stop_reason, REASON_WORDS),
            "best_airmass": self.best_airmass,
            "best_time": self.best_time,
            "start_error_s": self.start_error_s,
            "stop_error_s": self.stop_error_s,
            "start_scatter_s": self.start_scatter_s,
            "stop_scatter_s": self.stop_scatter_s,
            "may_not_happen": self.may_not_happen,
        }

    def _heading(self) -> str:
        having = int(np.count_nonzero(self.counts))
        return f"Windows: {len(self.start):,}, of {having:,} of {len(self):,} targets"


def windows(
    site: Site,
    targets: Catalog | Bodies | Orbits,
    start: Any,
    stop: Any,
    limits: Limits | None = None,
    *,
    position_error_mas: ArrayLike | None = None,
    orientation: Orientation | None = None,
    threads: int | None = None,
) -> Windows:
    """The windows of each target within the half-open span [start, stop): exact, with their reasons.

    * ``start``, ``stop``: UTC, in any form that `place` takes. A night is that of `almanac`: its ``start``
      and ``stop``.
    * ``limits``: what must hold, for all targets or a value for each; None is ``Limits()``.
    * ``position_error_mas``: how far each catalogue place may be off, for all targets or a value for each; it
      goes into the errors of the edges.
    * ``orientation``: the Earth's orientation; None is `Orientation.packaged()`.
    * ``threads``: None for all cores. The answer is the same, bit for bit, for any number.

    Edges are within 1 ms of brute force on pyerfa where the target's own altitude makes them, and within
    20 ms where Sun or Moon do (`tests/test_accuracy_windows.py`); past the table of Earth orientation the
    error of UT1 is added, and the status says ``orientation_extrapolated``.

    A target that cannot be computed has no window, ``blocked_by`` bad_row and a ``status`` of 16 or more. A
    wrong call (a stop before the start, a column of another length) raises `HourarcError`.
    """
    here, rows = as_site(site), as_targets(targets)
    first, last = span(start, stop)
    allowed = Limits() if limits is None else limits
    if not isinstance(allowed, Limits):
        raise WrongType.of(
            "windows: limits", limits, "a Limits, such as Limits(altitude_min_deg=40), or None"
        )
    error = None if position_error_mas is None else _position_error(position_error_mas, len(rows))
    earth = as_orientation(orientation)
    earth.check(np.array([first, last]), "start, stop")
    made = _engine.windows(
        here._handle,
        rows._handle,
        earth._handle,
        first,
        last,
        allowed.for_engine(len(rows), has_skyline=here.skyline is not None),
        error,
        workers(threads),
    )
    times = {key: from_nanoseconds(made[key]) for key in ("start", "stop", "best_time")}
    return Windows(**{**made, **times}, name=rows.name)


def _position_error(given: ArrayLike, targets: int) -> float | Floats:
    """The error of the catalogue places as the engine takes it: a number, or a column."""
    what, allowed = "windows: position_error_mas", "0 to 3.6e6 mas"
    values = column(given, what, "mas")
    if np.ndim(given) and len(values) != targets:
        raise InvalidArgument.of(
            what, f"{len(values)} values", f"one value, or one for each of {targets} targets"
        )
    # A row whose error is not known has none stated: its edges' errors become NaN, and nothing else.
    if np.any((values < 0.0) | (values > 3.6e6)):
        raise InvalidArgument.of(what, f"{values[(values < 0.0) | (values > 3.6e6)][0]:g}", allowed)
    if np.ndim(given):
        return values
    if np.isnan(values[0]):
        raise InvalidArgument.of(what, "nan", allowed)
    return float(values[0])
