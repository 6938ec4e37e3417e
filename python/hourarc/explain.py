"""Why a target may be observed when it may: each limit alone, and what it leaves of the night."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from . import _engine
from ._limit_words import sentence
from .almanac import Almanac, almanac
from .errors import InvalidArgument, WrongType
from .limits import Limits
from .orientation import Orientation, as_orientation
from .results import ColumnResult
from .site import Site, as_site
from .targets import as_targets
from .windows import REASON_WORDS, Window, windows

__all__ = ["Explanation", "LimitExplained", "explain"]

Intervals = NDArray[np.datetime64]


@dataclass(frozen=True, slots=True, eq=False)
class LimitExplained:
    """One limit over the night. Intervals are rows of start and stop, UTC, half-open, shape (n, 2)."""

    reason: str
    """The word for it, of `REASON_WORDS`."""
    sentence: str
    """What it asks for, in words, such as "altitude at least 30°"."""
    alone: Intervals
    """Where it alone holds."""
    left: Intervals
    """What it and all limits above it leave."""

    @property
    def hours_alone(self) -> float:
        """How long it alone holds, hours."""
        return _hours(self.alone)

    @property
    def hours_left(self) -> float:
        """How long it and all limits above it hold, hours."""
        return _hours(self.left)


@dataclass(frozen=True, slots=True, repr=False, eq=False)
class Explanation(ColumnResult):
    """When each limit holds for one target in one night, and how they intersect. ``print`` it.

    The limits stand in the order in which they are applied: those of the sky, which are one for all targets,
    first. A shortest useful window holds always by itself; cables bind only what is followed.
    """

    site: Site
    target: Any
    """The target: a Catalog, Bodies or Orbits of one row."""
    name: str
    """Its name, or where it stands."""
    night: Almanac
    """The night with its Sun and Moon: an `Almanac` of one row."""
    limits: tuple[LimitExplained, ...]
    """The limits, in order; none for a target that has no place."""
    windows: tuple[Window, ...]
    """What all of them leave: the windows."""
    blocked_by: str
    """The word for the limit after which nothing is left; "none" where there is a window."""
    status: str
    """The word for what is to be said of the target."""
    orientation: Orientation

    @property
    def hours(self) -> float:
        """The windows together, hours."""
        return float(sum((w.stop - w.start) / np.timedelta64(3600, "s") for w in self.windows))

    def __str__(self) -> str:
        from .report.explain import explain_report

        return explain_report(self)

    def _table(self) -> dict[str, Any]:
        """A row an interval: the limit, alone (true) or with those above it (false), start, stop."""
        rows = [
            (limit.reason, alone, start, stop)
            for limit in self.limits
            for alone, intervals in ((True, limit.alone), (False, limit.left))
            for start, stop in intervals
        ]
        reason, alone, start, stop = zip(*rows, strict=True) if rows else ((), (), (), ())
        return {
            "limit": np.array(reason, dtype=np.str_),
            "alone": np.array(alone, dtype=np.bool_),
            "start": np.array(start, dtype="datetime64[ns]"),
            "stop": np.array(stop, dtype="datetime64[ns]"),
        }

    def _heading(self) -> str:
        found = (
            f"{self.hours:.2f} h in {len(self.windows)}" if self.windows else f"blocked by {self.blocked_by}"
        )
        return f"Explanation of {self.name} on {self.night.night[0]}: {len(self.limits)} limits, {found}"


def explain(
    site: Site,
    target: Any,
    night: Any,
    limits: Limits | None = None,
    *,
    orientation: Orientation | None = None,
) -> Explanation:
    """Why one target may be observed when it may, or why not at all.

    * ``target``: one target: a Catalog, Bodies or Orbits of one row, such as ``stars[3]``.
    * ``night``: date of the evening, as an ISO date, a datetime.date or datetime64[D].
    * ``limits``: what must hold; None is ``Limits()``. Of columns, one target takes ``limits.at(row)``.

    Edges are those of `windows`, to the same error. ``print(explain(...))`` shows the night as a timeline.
    """
    here, rows = as_site(site), as_targets(target)
    if len(rows) != 1:
        raise InvalidArgument.of("explain: target", f"{len(rows)} targets", "one, such as stars[3]")
    allowed = Limits() if limits is None else limits
    if not isinstance(allowed, Limits):
        raise WrongType.of(
            "explain: limits", limits, "a Limits, such as Limits(altitude_min_deg=40), or None"
        )
    earth = as_orientation(orientation)
    sky = almanac(here, night, 1, orientation=earth)
    start, stop = sky.start[0], sky.stop[0]
    if np.isnat(start):
        raise InvalidArgument.of(
            "explain: night", f"{sky.night[0]} ({sky.status_words[0]})", "a night that has an almanac"
        )
    found = windows(here, rows, start, stop, allowed, orientation=earth)
    made = _engine.explain(
        here._handle,
        rows._handle,
        0,
        earth._handle,
        int(start.astype(np.int64)),
        int(stop.astype(np.int64)),
        allowed.for_engine(1, has_skyline=here.skyline is not None),
    )
    single = allowed.at(0)
    explained = tuple(
        LimitExplained(
            REASON_WORDS[code], sentence(REASON_WORDS[code], single), _intervals(alone), _intervals(left)
        )
        for code, alone, left in made
    )
    return Explanation(
        site=here,
        target=rows,
        name=_called(rows),
        night=sky,
        limits=explained,
        windows=tuple(found.of(0)),
        blocked_by=_blocking(explained, str(found.blocked_by_words[0])),
        status=str(found.status_words[0]),
        orientation=earth,
    )


def _intervals(nanoseconds: NDArray[np.int64]) -> Intervals:
    return nanoseconds.view("datetime64[ns]").reshape(-1, 2)


def _blocking(limits: tuple[LimitExplained, ...], found: str) -> str:
    """The first limit after which nothing is left; `windows` passes over one that a later one contains."""
    if found in ("none", "bad_row"):
        return found
    return next((limit.reason for limit in limits if not len(limit.left)), found)


def _hours(intervals: Intervals) -> float:
    return float(((intervals[:, 1] - intervals[:, 0]) / np.timedelta64(3600, "s")).sum())


def _called(target: Any) -> str:
    """The target by its name, or by its place."""
    if target.name is not None and str(target.name[0]):
        return str(target.name[0])
    if hasattr(target, "ra_deg"):
        return f"RA {float(target.ra_deg[0]):.4f}°, Dec {float(target.dec_deg[0]):+.4f}°"
    return "the target"
