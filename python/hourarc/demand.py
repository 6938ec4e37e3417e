"""What is asked of a season against what it has: requested hours and dark hours by local sidereal time."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from . import _engine, earth
from ._columns import Floats, column, scalar, workers
from .almanac import almanac
from .errors import InvalidArgument, WrongType
from .limits import Limits
from .orientation import Orientation, as_orientation
from .results import FIRST_BAD_STATUS, STATUS_WORDS, ColumnResult, words
from .site import Site, as_site
from .targets import Bodies, Catalog, as_targets

__all__ = ["Demand", "demand"]

#: The limits on the sky alone: without a target they say how much there is to give.
SKY_LIMITS = ("sun_altitude_max_deg", "moon_altitude_max_deg", "moon_illumination_max", "allowed_intervals")

#: Target-nights a call: some tens of MB of windows.
_BLOCK = 500_000
_NANOSECONDS_PER_DAY = 86_400_000_000_000
_UNIX_EPOCH_MJD = 40_587.0  # 1970-01-01, exact
_SIDEREAL_PER_SOLAR = 1.00273781191135448  # of the mean Sun, IERS Conventions (2010), equation 5.15


@dataclass(frozen=True, slots=True, repr=False, eq=False)
class Demand(ColumnResult):
    """Supply and demand of a season by local mean sidereal time; one row a bin, columns of shape (bins,).

    Each target's requested hours are spread over the bins as its own observable hours are. Where the ratio is
    above 1, more is asked for than the sky has; with targets that can do with other sidereal times a
    scheduler may still find room, with such as cannot it will not.
    """

    lst_start_h: Floats
    """Local mean sidereal time at which the bin begins, hours."""
    lst_stop_h: Floats
    """And at which it ends."""
    supply_hours: Floats
    """Hours of the season in this bin in which the limits on the sky alone hold."""
    demand_hours: Floats
    """Hours that are requested in it."""
    requested_hours: Floats
    """The hours that each target asks for, shape (targets,)."""
    available_hours: Floats
    """The hours of the season in which all limits hold for each target, shape (targets,); NaN for a bad
    row."""
    status: NDArray[np.uint8]
    """Status of each target, shape (targets,); from 16 on it is a bad row."""
    name: NDArray[np.str_] | None
    """The names of the targets, or None."""

    @property
    def ratio(self) -> Floats:
        """Demand by supply in each bin; infinite where something is asked of none, 0 where nothing is."""
        with np.errstate(divide="ignore", invalid="ignore"):
            ratio = self.demand_hours / self.supply_hours
        return np.where(self.demand_hours == 0.0, 0.0, ratio)

    @property
    def short(self) -> NDArray[np.bool_]:
        """Which targets ask for more hours than they have, shape (targets,); bad rows are not among them."""
        return np.asarray(self.requested_hours > self.available_hours)

    @property
    def unplaced_hours(self) -> float:
        """Requested hours that are in no bin, since their targets are never observable, or bad rows."""
        return float(self.requested_hours.sum() - self.demand_hours.sum())

    @property
    def status_words(self) -> NDArray[np.str_]:
        """The status of each target as a word, shape (targets,)."""
        return words(self.status, STATUS_WORDS)

    def _table(self) -> dict[str, Any]:
        keys = ("lst_start_h", "lst_stop_h", "supply_hours", "demand_hours", "ratio")
        return {key: getattr(self, key) for key in keys}

    def _heading(self) -> str:
        asked, given = self.demand_hours.sum(), self.supply_hours.sum()
        return f"Demand of {asked:,.1f} h against {given:,.1f} h in {len(self.supply_hours)} bins"


def demand(
    site: Site,
    targets: Catalog | Bodies,
    first_night: Any,
    nights: int,
    limits: Limits | None = None,
    requested_hours: ArrayLike = 1.0,
    *,
    bin_h: float = 1.0,
    orientation: Orientation | None = None,
    threads: int | None = None,
) -> Demand:
    """Requested hours against available dark hours, by local mean sidereal time.

    * ``first_night``, ``nights``: as of `almanac`; whole nights, local mean noon to noon.
    * ``limits``: what must hold; None is ``Limits()``. Those on the sky alone (Sun and Moon altitude, Moon
      illumination, allowed intervals) make the supply; of one that differs from target to target, the
      loosest.
    * ``requested_hours``: what each target asks for, one value or one for each, 0 or more.
    * ``bin_h``: the width of a bin, hours of sidereal time; it divides 24.

    Sidereal time is the mean one with UTC for UT1, right to 2 s. Every window is exact; hours are of UTC.
    """
    here, rows = as_site(site), as_targets(targets)
    allowed = Limits() if limits is None else limits
    if not isinstance(allowed, Limits):
        raise WrongType.of("demand: limits", limits, "a Limits, such as Limits(altitude_min_deg=40), or None")
    asked = _requested(requested_hours, len(rows))
    bins = _bins(bin_h)
    attitude = as_orientation(orientation)
    season = almanac(here, first_night, nights, orientation=attitude)
    start, stop = (int(t.astype(np.int64)) for t in (season.start[0], season.stop[-1]))
    if min(start, stop) < 0 and (np.isnat(season.start[0]) or np.isnat(season.stop[-1])):
        raise InvalidArgument.of("demand: first_night, nights", f"{season}", "nights from 1960 to 2100")
    who, team = (here._handle, attitude._handle), workers(threads)

    def windows_of(handle: Any, given: dict[str, Any]) -> dict[str, NDArray[Any]]:
        return _engine.windows(who[0], handle, who[1], start, stop, given, None, team)

    sky = _loosest(allowed.for_engine(len(rows)))
    dark = windows_of(Catalog(0.0, 0.0)._handle, sky)
    edges: Floats = np.arange(bins + 1, dtype=np.float64) * (24.0 / bins)
    supply = _by_bin(dark["start"], dark["stop"], np.zeros(len(dark["start"]), np.int64), 1, here, bins)[0]
    total, available = np.zeros(bins), np.empty(len(rows))
    status = np.empty(len(rows), dtype=np.uint8)
    has_skyline = here.skyline is not None
    # Bodies are few, and have no parts.
    size = max(1, len(rows) if isinstance(rows, Bodies) else _BLOCK // len(season))
    for first in range(0, len(rows), size):
        part = rows if isinstance(rows, Bodies) else rows[first : first + size]
        given = {
            key: value[first : first + size] if isinstance(value, np.ndarray) else value
            for key, value in allowed.for_engine(len(rows), has_skyline=has_skyline).items()
        }
        made = windows_of(part._handle, given)
        target = np.repeat(np.arange(len(part)), np.diff(made["offsets"]))
        hours = _by_bin(made["start"], made["stop"], target, len(part), here, bins)
        own = hours.sum(axis=1)
        bad = made["status"] >= FIRST_BAD_STATUS
        weight = np.divide(asked[first : first + size], own, out=np.zeros(len(part)), where=own > 0.0)
        total += weight @ hours
        available[first : first + size] = np.where(bad, np.nan, own)
        status[first : first + size] = made["status"]
    return Demand(edges[:-1], edges[1:], supply, total, asked, available, status, rows.name)


def _by_bin(
    start: NDArray[np.int64],
    stop: NDArray[np.int64],
    target: NDArray[Any],
    targets: int,
    site: Site,
    bins: int,
) -> Floats:
    """The hours of intervals by target and bin of local mean sidereal time, shape (targets, bins)."""
    days = start // _NANOSECONDS_PER_DAY
    rest = (start - days * _NANOSECONDS_PER_DAY) / _NANOSECONDS_PER_DAY
    mjd = days + _UNIX_EPOCH_MJD
    greenwich = earth.sidereal_time(mjd, mjd, ut1_fraction=rest, tt_fraction=rest, apparent=False)
    width_h = 24.0 / bins
    begin_h = (np.degrees(greenwich) + site.longitude_deg) / 15.0 % 24.0
    length_h = (stop - start) / 3.6e12 * _SIDEREAL_PER_SOLAR
    # Whole turns fill every bin alike; of what is left, each piece up to the next edge goes into its bin.
    turns = np.floor(length_h / 24.0)
    hours = np.zeros((targets, bins))
    hours += np.bincount(target, weights=turns * width_h, minlength=targets)[:, np.newaxis]
    end_h = begin_h + (length_h - 24.0 * turns)
    number = np.floor(begin_h / width_h)
    for _ in range(bins + 1):
        piece = np.minimum(end_h, (number + 1.0) * width_h) - np.maximum(begin_h, number * width_h)
        inside = piece > 0.0
        if not inside.any():
            break
        cell = target[inside] * bins + number[inside].astype(np.int64) % bins
        hours += np.bincount(cell, weights=piece[inside], minlength=targets * bins).reshape(targets, bins)
        number += 1.0
    return hours / _SIDEREAL_PER_SOLAR


def _loosest(given: dict[str, Any]) -> dict[str, Any]:
    """The limits on the sky alone; of a column the loosest value, which for each of them is the largest."""
    found = {}
    for key in SKY_LIMITS:
        value = given.get(key)
        if isinstance(value, np.ndarray):
            value = None if np.isnan(value).all() else float(np.nanmax(value))
        if value is not None:
            found[key] = value
    return found


def _requested(given: ArrayLike, targets: int) -> Floats:
    what = "demand: requested_hours"
    values = column(given, what, "h")
    if np.ndim(given) and len(values) != targets:
        raise InvalidArgument.of(
            what, f"{len(values)} values", f"one value, or one for each of {targets} targets"
        )
    wrong = ~((values >= 0.0) & np.isfinite(values))
    if wrong.any():
        row = int(np.argmax(wrong))
        raise InvalidArgument.of(what, f"{values[row]:g} in row {row}", "hours from 0 on")
    return np.array(np.broadcast_to(values, (targets,)))


def _bins(given: float) -> int:
    width = scalar(given, "demand: bin_h", "h")
    count = round(24.0 / width) if 0.0 < width <= 24.0 else 0
    if not 1 <= count <= 1440 or abs(count * width - 24.0) > 1e-9:
        raise InvalidArgument.of(
            "demand: bin_h", f"{width:g}", "a width that divides 24 h, such as 0.5, 1 or 2"
        )
    return count
