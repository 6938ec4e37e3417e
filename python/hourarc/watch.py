"""What is up now: the windows of a night, worked out once and asked every few seconds."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from typing import Any

import numpy as np
from numpy.typing import NDArray

from . import _engine
from ._columns import Floats, workers, writable
from .almanac import almanac
from .errors import InvalidArgument, MissingColumn, UnknownName, WrongType
from .limits import Limits
from .orbits import Orbits
from .orientation import Orientation, as_orientation
from .place import PLACE_COLUMNS
from .results import STATUS_WORDS, Coded, ColumnResult, words
from .site import Site, as_site
from .targets import Bodies, Catalog, as_targets
from .times import day_number, from_nanoseconds, instant
from .windows import REASON_WORDS, Windows, windows

__all__ = ["WATCH_COLUMNS", "Moment", "Watch"]

DEFAULT_COLUMNS = ("seconds_left", "seconds_to_next", "altitude_deg", "airmass", "hour_angle_deg")
WATCH_COLUMNS = ("seconds_left", "seconds_to_next", *PLACE_COLUMNS)
"""Every column that `Watch.at` can compute, beside `up`, `stop_reason` and `status`, which it always does."""

_ALWAYS = {"up": np.bool_, "stop_reason": np.uint8, "status": np.uint8}


class Moment(ColumnResult):
    """The state of every target at one instant of a night; every column has shape (targets,).

    Beside what is listed here it has the columns of `Places`, by the same names and to the bit. Only the
    columns that were asked for are there; another one raises `MissingColumn`.
    """

    __slots__ = ("_columns", "name", "status", "stop_reason", "time", "up")

    up: NDArray[np.bool_]
    """Whether all limits hold: whether a window is open."""
    stop_reason: NDArray[np.uint8]
    """The limit that closes the window that is open, as a code of `REASON_WORDS`; 0 where none is."""
    status: NDArray[np.uint8]
    """Status of each target; from 16 on it is a bad row, which is never up."""
    seconds_left: Floats
    """Seconds until the window that is open closes; NaN where none is."""
    seconds_to_next: Floats
    """Seconds until the next window of the night opens, whether one is open or not; NaN where none will."""
    time: np.datetime64
    """The instant, UTC, datetime64[ns]."""
    name: NDArray[np.str_] | None
    """The names of the targets, or None."""
    _columns: Mapping[str, Floats]

    def __init__(
        self,
        columns: Mapping[str, Floats],
        always: Mapping[str, NDArray[Any]],
        time: np.datetime64,
        name: NDArray[np.str_] | None,
    ) -> None:
        for key, value in {"_columns": columns, **always, "time": time, "name": name}.items():
            object.__setattr__(self, key, value)

    def __getattr__(self, attribute: str) -> Any:
        if attribute in WATCH_COLUMNS:
            if attribute in self._columns:
                return self._columns[attribute]
            raise MissingColumn(
                f"Moment: {attribute} was not computed; name it in Watch.at(columns=...). "
                f"Computed: {', '.join(self.columns)}"
            )
        raise AttributeError(f"Moment has no attribute {attribute!r}")

    def __getitem__(self, column: str) -> NDArray[Any]:
        """A column by its name."""
        if column not in _ALWAYS and column not in WATCH_COLUMNS:
            raise UnknownName.among("Moment: column", column, [*_ALWAYS, *WATCH_COLUMNS])
        values: NDArray[Any] = getattr(self, column)
        return values

    @property
    def columns(self) -> tuple[str, ...]:
        """The names of the columns that were computed, beside `up`, `stop_reason` and `status`."""
        return tuple(self._columns)

    @property
    def stop_reason_words(self) -> NDArray[np.str_]:
        """What closes the window that is open, as a word; "none" where none is."""
        return words(self.stop_reason, REASON_WORDS)

    @property
    def status_words(self) -> NDArray[np.str_]:
        """The status of each target as a word."""
        return words(self.status, STATUS_WORDS)

    def __len__(self) -> int:
        """The number of targets."""
        return len(self.up)

    def __reduce__(self) -> tuple[Any, ...]:
        return Moment, (dict(self._columns), self._always(), self.time, self.name)

    def __setattr__(self, attribute: str, value: object) -> None:
        raise AttributeError(f"Moment: {attribute} cannot be set; a result does not change")

    def _always(self) -> dict[str, NDArray[Any]]:
        return {key: getattr(self, key) for key in _ALWAYS}

    def _table(self) -> dict[str, Any]:
        named = {} if self.name is None else {"name": self.name}
        return {
            "target": np.arange(len(self), dtype=np.int64),
            **named,
            "up": self.up,
            "stop_reason": Coded(self.stop_reason, REASON_WORDS),
            **self._columns,
            "status": Coded(self.status, STATUS_WORDS),
        }

    def _heading(self) -> str:
        return f"Moment {self.time}: {int(np.count_nonzero(self.up)):,} of {len(self):,} targets up"


class Watch:
    """The windows of a night, ready to be asked what is up.

    Making one costs what `windows` costs; `at` then looks up the windows and computes the places of one
    instant, some milliseconds for a million targets. Nothing in it changes, so any number of threads may
    ask at once (each with an ``out`` of its own, if any).

    * ``night``: the date of its evening, as an ISO date, a datetime.date or datetime64[D]; it runs from local
      mean solar noon to noon.
    * ``limits``: what must hold; None is ``Limits()``.
    * ``orientation``: the Earth's orientation; None is `Orientation.packaged()`.
    * ``threads``: None for all cores.
    """

    __slots__ = ("_handle", "limits", "orientation", "site", "start", "stop", "targets", "windows")

    site: Site
    targets: Catalog | Bodies | Orbits
    limits: Limits
    orientation: Orientation
    start: np.datetime64
    """Local mean noon before the night, UTC: the first instant that may be asked."""
    stop: np.datetime64
    """Local mean noon after it: the first instant that may not."""
    windows: Windows
    """The windows of the night."""
    _handle: _engine.Watch

    def __init__(
        self,
        site: Site,
        targets: Catalog | Bodies | Orbits,
        night: Any,
        limits: Limits | None = None,
        *,
        orientation: Orientation | None = None,
        threads: int | None = None,
    ) -> None:
        here, rows, earth = as_site(site), as_targets(targets), as_orientation(orientation)
        day_number(night, "Watch: night")
        allowed_now = Limits() if limits is None else limits
        if not isinstance(allowed_now, Limits):
            raise WrongType.of(
                "Watch: limits", limits, "a Limits, such as Limits(altitude_min_deg=40), or None"
            )
        row = almanac(here, night, 1, orientation=earth)
        start, stop = row.start[0], row.stop[0]
        found = windows(here, rows, start, stop, allowed_now, orientation=earth, threads=threads)
        engine = _engine.Watch(
            here._handle,
            rows._handle,
            earth._handle,
            int(start.astype(np.int64)),
            int(stop.astype(np.int64)),
            found.offsets,
            found.start.view(np.int64),
            found.stop.view(np.int64),
            found.stop_reason,
            found.status,
            workers(threads),
        )
        made = {
            "site": here,
            "targets": rows,
            "limits": allowed_now,
            "orientation": earth,
            "start": start,
            "stop": stop,
            "windows": found,
            "_handle": engine,
        }
        for key, value in made.items():
            object.__setattr__(self, key, value)

    def at(
        self,
        when: Any,
        *,
        columns: Iterable[str] | str | None = None,
        out: Moment | Mapping[str, NDArray[Any]] | None = None,
        threads: int | None = None,
    ) -> Moment:
        """The state of every target at an instant of the night, the same bits as `windows` and `place` give.

        * ``when``: one instant, UTC, from `start` to before `stop`; of other nights a watch knows nothing,
          so it raises `InvalidArgument`.
        * ``columns``: which to compute, of `WATCH_COLUMNS`; None is ``seconds_left``, ``seconds_to_next``,
          ``altitude_deg``, ``airmass`` and ``hour_angle_deg``.
        * ``out``: a former `Moment`, or writable C-contiguous arrays of shape (targets,) by name: float64 for
          each of the columns, and, if wanted, bool for ``up``, uint8 for ``stop_reason`` and ``status``. They
          are filled and no others are made, which saves more time than the computation takes.
        * ``threads``: None for all cores. The answer is the same, bit for bit, for any number.

        A window is half-open: a target is up at its start, and no longer at its stop.
        """
        nanoseconds = instant(when, "Watch.at: when")
        wanted = _wanted(columns)
        arrays, always = _outputs(out, wanted, (len(self.targets),))
        self._handle.at(
            self.site._handle,
            self.targets._handle,
            self.orientation._handle,
            nanoseconds,
            always["up"],
            always["stop_reason"],
            always["status"],
            arrays,
            workers(threads),
        )
        time: np.datetime64 = from_nanoseconds(np.array([nanoseconds]))[0]
        return Moment(arrays, always, time, self.targets.name)

    def __len__(self) -> int:
        """The number of targets."""
        return len(self.targets)

    def __setattr__(self, attribute: str, value: object) -> None:
        raise AttributeError(f"Watch: {attribute} cannot be set; make another one")

    def __repr__(self) -> str:
        return f"<Watch of {len(self):,} targets, {self.start} to {self.stop}>"


def _wanted(columns: Iterable[str] | str | None) -> tuple[str, ...]:
    if columns is None:
        return DEFAULT_COLUMNS
    named = (columns,) if isinstance(columns, str) else tuple(columns)
    for name in named:
        if name not in WATCH_COLUMNS:
            raise UnknownName.among("Watch.at: columns", name, WATCH_COLUMNS)
    if len(set(named)) != len(named):
        raise InvalidArgument.of("Watch.at: columns", ", ".join(named), "each column once")
    return named


def _outputs(
    out: Moment | Mapping[str, NDArray[Any]] | None, wanted: tuple[str, ...], shape: tuple[int]
) -> tuple[dict[str, Floats], dict[str, NDArray[Any]]]:
    """The arrays to fill: those of `out`, checked, or new ones."""
    if out is None:
        return {key: np.empty(shape) for key in wanted}, {
            key: np.empty(shape, dtype=kind) for key, kind in _ALWAYS.items()
        }
    if isinstance(out, Moment):
        given: dict[str, NDArray[Any]] = {**out._columns, **out._always()}
    elif isinstance(out, Mapping):
        given = dict(out)
    else:
        raise WrongType.of("Watch.at: out", out, "a Moment, or arrays by column name")
    for key in given:
        if key not in _ALWAYS and key not in wanted:
            if key not in WATCH_COLUMNS:
                raise UnknownName.among("Watch.at: out", key, [*_ALWAYS, *WATCH_COLUMNS])
            raise InvalidArgument.of(
                "Watch.at: out", f"{key}, which is not computed", f"columns {', '.join(wanted)}"
            )
    arrays = {key: writable(given.get(key), f"Watch.at: out[{key!r}]", shape, np.float64) for key in wanted}
    always = {
        key: writable(given[key], f"Watch.at: out[{key!r}]", shape, kind)
        if key in given
        else np.empty(shape, dtype=kind)
        for key, kind in _ALWAYS.items()
    }
    return arrays, always
