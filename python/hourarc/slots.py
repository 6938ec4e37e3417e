"""What schedulers take: start times that fit into windows, and the windows after a visit."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from . import _engine
from ._columns import scalar
from .errors import InvalidArgument, WrongType
from .results import ColumnResult, Ragged
from .times import from_nanoseconds, instant, to_nanoseconds
from .windows import Windows

__all__ = ["Revisits", "Slots", "after_gap", "slots"]

#: The longest step, exposure or gap: a thousand years, within what an int64 of nanoseconds counts.
_SECONDS_MAX = 3.0e9
_NANOSECONDS_PER_SECOND = 1e9


@dataclass(frozen=True, slots=True, repr=False, eq=False)
class Slots(Ragged, ColumnResult):
    """Start times by target, in compressed sparse rows, in order of time within each target.

    Rows `offsets[i]` to `offsets[i + 1]` are those of target i, which is the form that integer programming
    takes.
    """

    offsets: NDArray[np.int64]
    """Where each target's rows begin, shape (targets + 1,)."""
    start: NDArray[np.datetime64]
    """When an exposure may begin, UTC, datetime64[ns], shape (slots,)."""
    window: NDArray[np.int64]
    """The window it fits into, as the row of the `Windows`, shape (slots,)."""
    step_s: float
    """From one possible start to the next, seconds."""
    duration_s: float
    """How long the exposure lasts, seconds."""
    name: NDArray[np.str_] | None
    """The names of the targets, or None."""

    @property
    def slot(self) -> NDArray[np.int64]:
        """The number of each start on the common raster, shape (slots,): equal ones begin together, and two
        exposures in one telescope must be ``duration_s / step_s`` apart."""
        step = round(self.step_s * _NANOSECONDS_PER_SECOND)
        first = self.start.min() if len(self.start) else np.datetime64(0, "ns")
        return np.asarray((self.start - first).astype(np.int64) // step)

    def _table(self) -> dict[str, Any]:
        target = self.target
        named = {} if self.name is None else {"name": self.name[target]}
        return {"target": target, **named, "start": self.start, "window": self.window}

    def _heading(self) -> str:
        having = int(np.count_nonzero(self.counts))
        return f"Slots: {len(self.start):,}, of {having:,} of {len(self):,} targets"


def slots(windows: Windows, step_s: float, duration_s: float, *, origin: Any = None) -> Slots:
    """Every start time on a raster at which an exposure fits into a window: start <= t, t + duration <= stop.

    * ``step_s``: the raster's step, seconds, above 0. One raster serves all targets, so that their slots can
      be compared; see `Slots.slot`.
    * ``duration_s``: how long the exposure lasts, seconds, above 0. Over a leap second it is a second longer.
    * ``origin``: an instant of the raster, UTC; None is 1970-01-01.

    At most 2^31 slots. Exact: instants are whole nanoseconds (`tests/test_slots.py`).
    """
    if not isinstance(windows, Windows):
        raise WrongType.of("slots: windows", windows, "the Windows that hourarc.windows returns")
    step, duration = _seconds(step_s, "slots: step_s"), _seconds(duration_s, "slots: duration_s")
    zero = 0 if origin is None else instant(origin, "slots: origin")
    by_window, start = _engine.slots(
        windows.start.view(np.int64), windows.stop.view(np.int64), zero, step, duration
    )
    window = np.repeat(np.arange(len(windows.start), dtype=np.int64), np.diff(by_window))
    return Slots(
        by_window[windows.offsets],
        from_nanoseconds(start),
        window,
        step / _NANOSECONDS_PER_SECOND,
        duration / _NANOSECONDS_PER_SECOND,
        windows.name,
    )


@dataclass(frozen=True, slots=True, repr=False, eq=False)
class Revisits(Ragged, ColumnResult):
    """What is left of windows for a next visit, in order of time within each target."""

    offsets: NDArray[np.int64]
    """Where each target's rows begin, shape (targets + 1,)."""
    start: NDArray[np.datetime64]
    """From when on the next visit may be, UTC, datetime64[ns], shape (rows,)."""
    stop: NDArray[np.datetime64]
    """Until when."""
    by_gap: NDArray[np.bool_]
    """Whether the gap, and not the window's own limit, sets the start."""
    name: NDArray[np.str_] | None
    """The names of the targets, or None."""

    def _table(self) -> dict[str, Any]:
        target = self.target
        named = {} if self.name is None else {"name": self.name[target]}
        return {"target": target, **named, "start": self.start, "stop": self.stop, "by_gap": self.by_gap}

    def _heading(self) -> str:
        having = int(np.count_nonzero(self.counts))
        return f"Revisits: {len(self.start):,} windows, of {having:,} of {len(self):,} targets"


def after_gap(windows: Windows, last_visit: Any, gap_s: float) -> Revisits:
    """The windows of each target from at least a gap after its last visit on: for a cadence.

    * ``last_visit``: UTC, one instant for all targets or one for each; NaT for a target not yet visited,
      which keeps all its windows.
    * ``gap_s``: the shortest time between visits, seconds, 0 or more.
    """
    if not isinstance(windows, Windows):
        raise WrongType.of("after_gap: windows", windows, "the Windows that hourarc.windows returns")
    visits, shape = to_nanoseconds(last_visit, "after_gap: last_visit")
    if shape not in ((), (len(windows),)):
        raise InvalidArgument.of(
            "after_gap: last_visit",
            f"an array of shape {shape}",
            f"one instant, or one for each of {len(windows)}",
        )
    offsets, start, stop, by_gap = _engine.windows_after_gap(
        windows.offsets,
        windows.start.view(np.int64),
        windows.stop.view(np.int64),
        np.ascontiguousarray(np.broadcast_to(visits, (len(windows),))),
        _seconds(gap_s, "after_gap: gap_s", zero=True),
    )
    return Revisits(offsets, from_nanoseconds(start), from_nanoseconds(stop), by_gap, windows.name)


def _seconds(given: Any, what: str, *, zero: bool = False) -> int:
    """Seconds as whole nanoseconds."""
    seconds = scalar(given, what, "s")
    nanoseconds = round(seconds * _NANOSECONDS_PER_SECOND)
    if nanoseconds < (0 if zero else 1) or seconds > _SECONDS_MAX:
        allowed = "0 to 3e9 s" if zero else "above 0, to 3e9 s"
        raise InvalidArgument.of(what, f"{seconds:g} s", allowed)
    return nanoseconds
