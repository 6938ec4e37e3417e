"""How much of each target will I get: targets by nights, for a season or a year."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping
from typing import Any

import numpy as np
from numpy.typing import NDArray

from . import _engine
from ._columns import Floats, scalar, workers, writable
from .errors import InvalidArgument, MissingColumn, UnknownName, WrongType
from .limits import Limits
from .orbits import Orbits
from .orientation import Orientation, as_orientation
from .results import STATUS_WORDS, ColumnResult, words
from .season_summary import SeasonSummary, SeasonTally
from .site import Site, as_site
from .targets import Bodies, Catalog, as_targets
from .times import day_number, from_mjd, from_nanoseconds

__all__ = ["GRID_QUANTITIES", "NIGHTS_MAX", "Grid", "visibility_grid"]

GRID_QUANTITIES: Mapping[str, np.dtype[Any]] = {
    word: np.dtype(np.float64 if is_instant else np.float32) for word, is_instant in _engine.grid_quantities()
}
"""Every quantity of a target's night, with the type of its numbers."""

NIGHTS_MAX = 75_000
"""Nights in one call: two centuries, all that the ephemeris holds."""

_UNIX_EPOCH_MJD = 40_587  # 1970-01-01, exact


class Grid(ColumnResult):
    """What targets offer on nights. Quantities have shape (nights, targets), in C order: a night's targets
    stand together, which is what a scheduler reads.

    Only the quantities that were asked for are there; another one raises `MissingColumn`. A target that is
    a bad row has NaN on every night.
    """

    __slots__ = ("_quantities", "dark_hours", "name", "night", "night_start", "night_status", "status")

    hours: NDArray[np.float32]
    """Hours in which every limit holds; the sum of the exact windows to 1 s."""
    window_count: NDArray[np.float32]
    """Number of windows, a whole number."""
    start: Floats
    """Beginning of the longest window, MJD UTC; NaN without a window."""
    stop: Floats
    """End of the longest window, MJD UTC; NaN without a window."""
    best_airmass: NDArray[np.float32]
    """The least airmass within the windows; NaN without a window."""
    transit: Floats
    """Upper culmination nearest to the middle of the night, MJD UTC, observable or not."""
    moon_separation_min: NDArray[np.float32]
    """The least angle to the Moon's centre within the windows, degrees; NaN without a window."""
    night: NDArray[np.datetime64]
    """Date of each night's evening, datetime64[D], shape (nights,)."""
    night_start: NDArray[np.datetime64]
    """Local mean noon at which each night begins, UTC, shape (nights,)."""
    night_status: NDArray[np.uint8]
    """What is to be said of each night, shape (nights,)."""
    dark_hours: Floats
    """Hours of each night in which the limits on the sky alone hold, shape (nights,)."""
    status: NDArray[np.uint8]
    """Status of each target, shape (targets,); from 16 on it is a bad row."""
    name: NDArray[np.str_] | None
    """The names of the targets, or None."""
    _quantities: Mapping[str, NDArray[Any]]

    def __init__(
        self,
        quantities: Mapping[str, NDArray[Any]],
        *,
        night: NDArray[np.datetime64],
        night_start: NDArray[np.datetime64],
        night_status: NDArray[np.uint8],
        dark_hours: Floats,
        status: NDArray[np.uint8],
        name: NDArray[np.str_] | None,
    ) -> None:
        given = {
            "_quantities": dict(quantities),
            "night": night,
            "night_start": night_start,
            "night_status": night_status,
            "dark_hours": dark_hours,
            "status": status,
            "name": name,
        }
        for key, value in given.items():
            object.__setattr__(self, key, value)

    def __getattr__(self, attribute: str) -> Any:
        if attribute in GRID_QUANTITIES:
            if attribute in self._quantities:
                return self._quantities[attribute]
            raise MissingColumn(
                f"Grid: {attribute} was not computed; name it in visibility_grid(quantities=...). "
                f"Computed: {', '.join(self.quantities)}"
            )
        raise AttributeError(f"Grid has no attribute {attribute!r}")

    def __getitem__(self, quantity: str) -> NDArray[Any]:
        """A quantity by its name, shape (nights, targets)."""
        if quantity not in GRID_QUANTITIES:
            raise UnknownName.among("Grid: quantity", quantity, GRID_QUANTITIES)
        values: NDArray[Any] = getattr(self, quantity)
        return values

    @property
    def quantities(self) -> tuple[str, ...]:
        """The names of the quantities that were computed."""
        return tuple(self._quantities)

    @property
    def shape(self) -> tuple[int, int]:
        """Nights and targets: the shape of every quantity."""
        return len(self.night), len(self.status)

    @property
    def status_words(self) -> NDArray[np.str_]:
        """The status of each target as a word, shape (targets,)."""
        return words(self.status, STATUS_WORDS)

    @property
    def night_status_words(self) -> NDArray[np.str_]:
        """What is to be said of each night, as a word, shape (nights,)."""
        return words(self.night_status, STATUS_WORDS)

    def summary(self, *, useful_hours: float = 0.0) -> SeasonSummary:
        """The season of each target: first and last useful night, how many, their hours; who has none.

        ``useful_hours``: a night is useful to a target that has more hours than that. Needs ``hours``.
        """
        tally = SeasonTally(len(self.status), useful_hours)
        tally.add(self.night, self.hours)
        return tally.summary(self.status, self.name)

    def hours_left(self, night: Any) -> Floats:
        """The hours that each target has from the night of that date to the end, shape (targets,).

        Needs ``hours``. A date before the first night counts them all, one after the last none.
        """
        date = np.datetime64(day_number(night, "Grid: hours_left: night") - _UNIX_EPOCH_MJD, "D")
        left: Floats = self.hours[np.searchsorted(self.night, date) :].sum(axis=0, dtype=np.float64)
        return left

    def nights_left(self, night: Any, *, useful_hours: float = 0.0) -> NDArray[np.int64]:
        """How many useful nights each target has from the night of that date to the end, shape (targets,).

        ``useful_hours``: a night is useful to a target that has more hours than that. Needs ``hours``. A bad
        row has none.
        """
        date = np.datetime64(day_number(night, "Grid: nights_left: night") - _UNIX_EPOCH_MJD, "D")
        least = scalar(useful_hours, "Grid: nights_left: useful_hours", "h")
        left = self.hours[np.searchsorted(self.night, date) :] > least
        return np.asarray(np.count_nonzero(left, axis=0), dtype=np.int64)

    @property
    def night_hours(self) -> Floats:
        """The hours of all targets together on each night, shape (nights,); bad rows count nothing."""
        total: Floats = np.nansum(self.hours, axis=1, dtype=np.float64)
        return total

    def __len__(self) -> int:
        """The number of nights."""
        return len(self.night)

    def __reduce__(self) -> tuple[Any, ...]:
        return _grid_again, (dict(self._quantities), {key: getattr(self, key) for key in _ABOUT})

    def __setattr__(self, attribute: str, value: object) -> None:
        raise AttributeError(f"Grid: {attribute} cannot be set; a result does not change")

    def _table(self) -> dict[str, Any]:
        nights, targets = self.shape
        target = np.tile(np.arange(targets, dtype=np.int64), nights)
        columns: dict[str, Any] = {"night": np.repeat(self.night, targets), "target": target}
        if self.name is not None:
            columns["name"] = self.name[target]
        for key, values in self._quantities.items():
            flat = values.reshape(-1)
            columns[key] = from_mjd(flat) if GRID_QUANTITIES[key] == np.float64 else flat
        return columns

    def _heading(self) -> str:
        nights, targets = self.shape
        reach = f", {self.night[0]} to {self.night[-1]}" if nights else ""
        return f"Grid of {nights:,} nights x {targets:,} targets: {', '.join(self.quantities)}{reach}"


_ABOUT = ("night", "night_start", "night_status", "dark_hours", "status", "name")


def _grid_again(quantities: dict[str, NDArray[Any]], about: dict[str, Any]) -> Grid:
    return Grid(quantities, **about)


def visibility_grid(
    site: Site,
    targets: Catalog | Bodies | Orbits,
    first_night: Any,
    nights: int,
    limits: Limits | None = None,
    *,
    quantities: Iterable[str] | str = ("hours",),
    out: Grid | Mapping[str, NDArray[Any]] | NDArray[Any] | None = None,
    threads: int | None = None,
    orientation: Orientation | None = None,
    progress: Callable[[int, int], object] | None = None,
) -> Grid:
    """What each target offers on each night.

    * ``first_night``: date of the first evening, as an ISO date, a datetime.date or datetime64[D].
    * ``nights``: how many, 1 to 75,000. A night is local mean solar noon to noon.
    * ``limits``: what must hold; None is ``Limits()``.
    * ``quantities``: which to compute, of `GRID_QUANTITIES`.
    * ``out``: a former `Grid`, or writable arrays by quantity (memory maps as well), or one array for one
      quantity, each C-contiguous, of shape (nights, targets) and of the type in `GRID_QUANTITIES`. They
      are filled in place and no others are made.
    * ``threads``: None for all cores. The answer is the same, bit for bit, for any number.
    * ``progress``: called now and then with the nights that are done and the nights in all. What it
      raises ends the work.

    Hours agree with the sum of the exact windows to 1 s (``tests/test_accuracy_grid.py``).
    """
    here, rows = as_site(site), as_targets(targets)
    first = day_number(first_night, "visibility_grid: first_night")
    count = _night_count(nights)
    allowed = Limits() if limits is None else limits
    if not isinstance(allowed, Limits):
        raise WrongType.of(
            "visibility_grid: limits", limits, "a Limits, such as Limits(altitude_min_deg=40), or None"
        )
    if progress is not None and not callable(progress):
        raise WrongType.of("visibility_grid: progress", progress, "a function of two numbers, or None")
    wanted = _wanted(quantities)
    earth = as_orientation(orientation)
    days = np.arange(first - _UNIX_EPOCH_MJD, first - _UNIX_EPOCH_MJD + count).astype("datetime64[D]")
    earth.check(days[[0, -1]].astype("datetime64[ns]").view(np.int64), "visibility_grid: nights")
    arrays = _outputs(out, wanted, (count, len(rows)))
    made = _engine.visibility_grid(
        here._handle,
        rows._handle,
        earth._handle,
        first,
        count,
        allowed.for_engine(len(rows), has_skyline=here.skyline is not None),
        {key: array.reshape(-1) for key, array in arrays.items()},
        None if progress is None else lambda done: progress(done, count),
        workers(threads),
    )
    made["night_start"] = from_nanoseconds(made["night_start"])
    return Grid(arrays, night=days, name=rows.name, **made)


def _night_count(nights: Any) -> int:
    allowed = f"a whole number from 1 to {NIGHTS_MAX:,}"
    if isinstance(nights, bool) or not isinstance(nights, (int, np.integer)):
        raise WrongType.of("visibility_grid: nights", nights, allowed)
    if not 1 <= nights <= NIGHTS_MAX:
        raise InvalidArgument.of("visibility_grid: nights", nights, allowed)
    return int(nights)


def _wanted(quantities: Iterable[str] | str) -> tuple[str, ...]:
    named = (quantities,) if isinstance(quantities, str) else tuple(quantities)
    for name in named:
        if name not in GRID_QUANTITIES:
            raise UnknownName.among("visibility_grid: quantities", name, GRID_QUANTITIES)
    if len(set(named)) != len(named):
        raise InvalidArgument.of("visibility_grid: quantities", ", ".join(named), "each quantity once")
    if not named:
        raise InvalidArgument.of("visibility_grid: quantities", "none", "at least one")
    return named


def _outputs(out: Any, wanted: tuple[str, ...], shape: tuple[int, int]) -> dict[str, NDArray[Any]]:
    """The arrays to fill: those of `out`, checked, or new ones."""
    if out is None:
        return {key: np.empty(shape, dtype=GRID_QUANTITIES[key]) for key in wanted}
    if isinstance(out, Grid):
        given: dict[str, Any] = dict(out._quantities)
    elif isinstance(out, Mapping):
        given = dict(out)
    elif isinstance(out, np.ndarray):
        if len(wanted) != 1:
            raise InvalidArgument.of(
                "visibility_grid: out",
                f"one array for {len(wanted)} quantities",
                f"arrays by name: {', '.join(wanted)}",
            )
        given = {wanted[0]: out}
    else:
        raise WrongType.of("visibility_grid: out", out, "an array, arrays by quantity, or a Grid")
    for key in given:
        if key not in wanted:
            if key not in GRID_QUANTITIES:
                raise UnknownName.among("visibility_grid: out", key, GRID_QUANTITIES)
            raise InvalidArgument.of(
                "visibility_grid: out", f"{key}, which is not computed", f"quantities {', '.join(wanted)}"
            )
    arrays = {
        key: writable(given.get(key), f"visibility_grid: out[{key!r}]", shape, GRID_QUANTITIES[key])
        for key in wanted
    }
    filled: list[str] = []
    for key, array in arrays.items():
        for other in filled:
            if np.may_share_memory(array, arrays[other]):  # exact, since both are contiguous
                raise InvalidArgument.of(
                    "visibility_grid: out",
                    f"one memory for {other} and {key}",
                    "memory of its own for each",
                )
        filled.append(key)
    return arrays
