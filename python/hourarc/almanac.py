"""The nights of a site: Sun and Moon, twilights, dark hours."""

from __future__ import annotations

from dataclasses import dataclass, fields
from typing import Any

import numpy as np
from numpy.typing import NDArray

from . import _engine
from ._columns import Floats
from .errors import InvalidArgument, WrongType
from .orientation import Orientation, as_orientation
from .results import STATUS_WORDS, Coded, ColumnResult, words
from .site import Site, as_site
from .times import day_number, from_nanoseconds

__all__ = ["Almanac", "almanac"]

Times = NDArray[np.datetime64]
_UNIX_EPOCH_MJD = 40_587  # 1970-01-01, exact


@dataclass(frozen=True, slots=True, repr=False, eq=False)
class Almanac(ColumnResult):
    """One row a night; every column has shape (nights,). Instants are UTC, NaT where there is none.

    A night is local mean solar noon to noon, labelled by the date of its evening.
    """

    night: Times
    """Date of the evening, datetime64[D]."""
    start: Times
    """Local mean noon before."""
    stop: Times
    """Local mean noon after."""
    sunset: Times
    """The Sun's centre at zenith distance 90°50′."""
    dusk_civil: Times
    """Evening, the Sun's centre at -6°, no refraction."""
    dusk_nautical: Times
    """Evening, at -12°."""
    dusk_astronomical: Times
    """Evening, at -18°."""
    dawn_astronomical: Times
    """Morning, at -18°."""
    dawn_nautical: Times
    """Morning, at -12°."""
    dawn_civil: Times
    """Morning, at -6°."""
    sunrise: Times
    """The Sun's centre at zenith distance 90°50′."""
    moonrise: Times
    """First of the night."""
    moonset: Times
    """First of the night."""
    moon_age_d: Floats
    """Days since the new Moon, at local mean midnight."""
    moon_illuminated_fraction: Floats
    """Illuminated fraction of the disc, 0 to 1, at local mean midnight."""
    dark_hours: Floats
    """Hours with the Sun below -18°."""
    dark_hours_moonless: Floats
    """The same, with the Moon below the horizon."""
    status: NDArray[np.uint8]
    """Status of each night."""

    def __len__(self) -> int:
        """The number of nights."""
        return len(self.night)

    @property
    def status_words(self) -> NDArray[np.str_]:
        """The status of each night as a word."""
        return words(self.status, STATUS_WORDS)

    def _table(self) -> dict[str, Any]:
        columns: dict[str, Any] = {each.name: getattr(self, each.name) for each in fields(self)}
        columns["status"] = Coded(self.status, STATUS_WORDS)
        return columns

    def _heading(self) -> str:
        if len(self) == 1:
            return f"Almanac of the night {self.night[0]}"
        return f"Almanac of {len(self):,} nights, {self.night[0]} to {self.night[-1]}"


def almanac(
    site: Site, first_night: Any, nights: int = 1, *, orientation: Orientation | None = None
) -> Almanac:
    """Sunset to sunrise, twilights, Moon and dark hours, one row a night.

    * ``first_night``: date of the first evening, as an ISO date, a datetime.date or datetime64[D].
    * ``nights``: how many, 1 to 100,000.
    * ``orientation``: the Earth's orientation; None is `Orientation.packaged()`.

    Sunset and sunrise, moonrise and moonset are those of the almanacs (34′ of refraction at sea level and the
    limb), twilights those of the Sun's centre without refraction. Instants are within 20 ms of brute force on
    DE440 with the same definitions (`tests/test_accuracy_almanac.py`).

    Nights before 1960, when UTC begins, or past 2100, where the ephemeris ends, raise `HourarcError`.
    """
    here = as_site(site)
    first = day_number(first_night, "almanac: first_night")
    if isinstance(nights, bool) or not isinstance(nights, (int, np.integer)):
        raise WrongType.of("almanac: nights", nights, "a whole number from 1 to 100,000")
    if not 1 <= nights <= 100_000:
        raise InvalidArgument.of("almanac: nights", nights, "1 to 100,000")
    earth = as_orientation(orientation)
    made = _engine.almanac(here._handle, earth._handle, first, int(nights))
    columns: dict[str, Any] = {
        key: from_nanoseconds(array) if array.dtype == np.int64 else array for key, array in made.items()
    }
    days = np.arange(first - _UNIX_EPOCH_MJD, first - _UNIX_EPOCH_MJD + int(nights))
    result = Almanac(night=days.astype("datetime64[D]"), **columns)
    earth.check(np.array([made["start"][0], made["stop"][-1]]), "almanac: nights")
    return result
