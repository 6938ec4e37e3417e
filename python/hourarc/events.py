"""When does it cross: rises, transits and sets."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from . import _engine
from ._columns import Floats, scalar, workers
from .errors import InvalidArgument
from .orbits import Orbits
from .orientation import Orientation, as_orientation
from .results import STATUS_WORDS, Coded, ColumnResult, Ragged, words
from .site import Site, as_site
from .targets import Bodies, Catalog, as_targets
from .times import from_nanoseconds, span

__all__ = ["KIND_WORDS", "PASSAGE_WORDS", "Event", "Events", "rise_transit_set"]

KIND_WORDS = ("rise", "transit", "set")
"""The word for each code of `Events.kind`."""

PASSAGE_WORDS: tuple[str, ...] = tuple(_engine.event_status_words())
"""The word for each code of `Events.status`: what a target does over the span."""


@dataclass(frozen=True, slots=True)
class Event:
    """One rise, transit or set."""

    kind: str
    time: np.datetime64
    azimuth_deg: float
    altitude_deg: float
    computed_error_s: float
    horizon_scatter_s: float
    may_not_happen: bool


@dataclass(frozen=True, slots=True, repr=False, eq=False)
class Events(Ragged, ColumnResult):
    """Rises, transits and sets of many targets, in order of time within each.

    Rows `offsets[i]` to `offsets[i + 1]` are those of target i; `of(i)` gives them one by one.
    """

    offsets: NDArray[np.int64]
    """Where each target's rows begin, shape (targets + 1,)."""
    kind: NDArray[np.uint8]
    """0 rise, 1 transit, 2 set, shape (events,)."""
    time: NDArray[np.datetime64]
    """The instant, UTC, datetime64[ns]."""
    azimuth_deg: Floats
    """Azimuth then, degrees from north through east."""
    altitude_deg: Floats
    """Observed altitude then, degrees."""
    computed_error_s: Floats
    """Error of the computed instant, seconds: interpolation, root, and UT1."""
    horizon_scatter_s: Floats
    """Scatter of the instant by the refraction of the day, 1 sigma, seconds; infinite where the event may
    not happen at all."""
    may_not_happen: NDArray[np.bool_]
    """Whether the target's culmination is so near the threshold that it may not pass it at all."""
    status: NDArray[np.uint8]
    """What the target does over the span, shape (targets,); `status_words` says it."""
    row_status: NDArray[np.uint8]
    """What is to be said of each target's row, shape (targets,): why it is bad, or that the Earth orientation
    is extrapolated; `row_status_words` says it."""
    name: NDArray[np.str_] | None
    """The names of the targets, or None."""

    @property
    def kind_words(self) -> NDArray[np.str_]:
        """The kind of each event as a word, shape (events,)."""
        return words(self.kind, KIND_WORDS)

    @property
    def status_words(self) -> NDArray[np.str_]:
        """The status of each target as a word: crosses, always_above, always_below, bad_row."""
        return words(self.status, PASSAGE_WORDS)

    @property
    def row_status_words(self) -> NDArray[np.str_]:
        """What is to be said of each target's row, as a word."""
        return words(self.row_status, STATUS_WORDS)

    def of(self, target: int) -> list[Event]:
        """The events of one target, by its row number."""
        return self._events(self.rows(target))

    def __iter__(self) -> Iterator[list[Event]]:
        """The events of each target in turn."""
        return map(self._events, self._each())

    def _events(self, rows: slice) -> list[Event]:
        kinds = [KIND_WORDS[kind] for kind in self.kind[rows]]
        numbers: tuple[NDArray[Any], ...] = (self.azimuth_deg, self.altitude_deg)
        numbers += (self.computed_error_s, self.horizon_scatter_s, self.may_not_happen)
        return [
            Event(*fields)
            for fields in zip(kinds, self.time[rows], *(n[rows].tolist() for n in numbers), strict=True)
        ]

    def _table(self) -> dict[str, Any]:
        target = self.target
        named = {} if self.name is None else {"name": self.name[target]}
        return {
            "target": target,
            **named,
            "kind": Coded(self.kind, KIND_WORDS),
            "time": self.time,
            "azimuth_deg": self.azimuth_deg,
            "altitude_deg": self.altitude_deg,
            "computed_error_s": self.computed_error_s,
            "horizon_scatter_s": self.horizon_scatter_s,
            "may_not_happen": self.may_not_happen,
        }

    def _heading(self) -> str:
        return f"Events: {len(self.time):,} of {len(self):,} targets"


def rise_transit_set(
    site: Site,
    targets: Catalog | Bodies | Orbits,
    start: Any,
    stop: Any,
    *,
    altitude_deg: float = 0.0,
    orientation: Orientation | None = None,
    threads: int | None = None,
) -> Events:
    """Every rise, transit and set of each target within the half-open span [start, stop).

    * ``start``, ``stop``: UTC, in any form that `place` takes.
    * ``altitude_deg``: the observed altitude of the centre at which a target rises and sets, -90 to 90. At a
      site with pressure 0 that is the topocentric altitude.
    * ``orientation``: the Earth's orientation; None is `Orientation.packaged()`.
    * ``threads``: None for all cores. The answer is the same, bit for bit, for any number.

    A transit is an upper culmination on the meridian. Instants of stars are within 1 ms of brute force on
    pyerfa where the altitude changes faster than 3″/s, those of Sun and Moon within 20 ms, and
    ``computed_error_s`` covers the error everywhere (`tests/test_accuracy_events.py`). What the air of the
    day adds is in ``horizon_scatter_s``.

    A target that cannot be computed has no events and the ``status`` bad_row. A wrong call raises
    `HourarcError`.
    """
    here, rows = as_site(site), as_targets(targets)
    first, last = span(start, stop)
    threshold = scalar(altitude_deg, "rise_transit_set: altitude_deg", "deg")
    if not -90.0 <= threshold <= 90.0:
        raise InvalidArgument.of("rise_transit_set: altitude_deg", f"{threshold:g}", "-90 to 90 degrees")
    earth = as_orientation(orientation)
    earth.check(np.array([first, last]), "start, stop")
    made = _engine.rise_transit_set(
        here._handle, rows._handle, earth._handle, first, last, threshold, workers(threads)
    )
    return Events(**{**made, "time": from_nanoseconds(made["time"])}, name=rows.name)
