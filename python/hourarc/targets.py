"""Targets: rows of a catalogue, or bodies of the solar system. Every verb takes these and `Orbits`."""

from __future__ import annotations

import os
from collections.abc import Iterable
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from . import _engine, interop
from ._columns import Floats, columns_of_one_length, read_only
from .errors import InvalidArgument, UnknownName, WrongType
from .orbits import Orbits
from .results import FIRST_BAD_STATUS, STATUS_WORDS, words

if TYPE_CHECKING:
    from astropy.coordinates import SkyCoord

__all__ = ["Bodies", "Catalog", "as_targets"]

_UNITS = {
    "ra_deg": "deg",
    "dec_deg": "deg",
    "epoch_yr": "yr",
    "pm_ra_mas_yr": "mas / yr",
    "pm_dec_mas_yr": "mas / yr",
    "parallax_mas": "mas",
    "radial_velocity_km_s": "km / s",
}


class Catalog:
    """Rows of ICRS catalogue places, each at its own epoch.

    Every argument is a scalar or one dimension, and scalars are spread over the rows.

    * ``ra_deg``, ``dec_deg``: ICRS place at the epoch, degrees. RA from -360 to 360.
    * ``epoch_yr``: Julian year (TCB, taken as TDB), 1700 to 2300.
    * ``pm_ra_mas_yr``, ``pm_dec_mas_yr``: proper motion, mas a year; the first includes cos(dec).
    * ``parallax_mas``: parallax, mas; 0 for a direction without one. Negative ones act as 0.
    * ``radial_velocity_km_s``: radial velocity, km/s, positive away.
    * ``name``: a name for each row, or None.

    A row out of range (NaN, abs(dec) > 90, absurd motion) is kept and marked in ``status``; its results
    are NaN or NaT and the other rows are untouched. Columns are read-only copies.
    """

    __slots__ = ("_handle", "_values", "name", "status")

    _handle: _engine.Catalog
    _values: dict[str, Floats]
    name: NDArray[np.str_] | None
    """The name of each row, shape (n,), or None."""
    status: NDArray[np.uint8]
    """The status of each row, shape (n,): 0 is good, from 16 on the row has no results."""

    def __init__(
        self,
        ra_deg: ArrayLike,
        dec_deg: ArrayLike,
        *,
        epoch_yr: ArrayLike = 2000.0,
        pm_ra_mas_yr: ArrayLike = 0.0,
        pm_dec_mas_yr: ArrayLike = 0.0,
        parallax_mas: ArrayLike = 0.0,
        radial_velocity_km_s: ArrayLike = 0.0,
        name: Iterable[str] | None = None,
    ) -> None:
        given = {
            "ra_deg": ra_deg,
            "dec_deg": dec_deg,
            "epoch_yr": epoch_yr,
            "pm_ra_mas_yr": pm_ra_mas_yr,
            "pm_dec_mas_yr": pm_dec_mas_yr,
            "parallax_mas": parallax_mas,
            "radial_velocity_km_s": radial_velocity_km_s,
        }
        columns = columns_of_one_length({key: (given[key], _UNITS[key]) for key in given}, "Catalog")
        made = _engine.Catalog(*(np.ascontiguousarray(columns[key]) for key in given))
        # A spread scalar stays one number in memory; a column is copied, so that nothing can change it.
        kept = {key: read_only(c if c.strides == (0,) else c.copy()) for key, c in columns.items()}
        object.__setattr__(self, "_handle", made)
        object.__setattr__(self, "_values", kept)
        object.__setattr__(self, "status", read_only(made.status))
        object.__setattr__(self, "name", _names(name, len(made)))

    @classmethod
    def from_skycoord(cls, coordinates: SkyCoord, *, name: Iterable[str] | None = None) -> Catalog:
        """A catalogue from an astropy SkyCoord, in any frame that astropy can take to ICRS.

        Proper motion, distance (as parallax), radial velocity and ``obstime`` (as epoch; 2000.0 without
        one) are carried over.
        """
        return cls(**interop.catalog_columns(coordinates), name=name)

    ra_deg: Floats = property(lambda self: self._values["ra_deg"])  # type: ignore[assignment]
    """Right ascension at the epoch, ICRS, degrees, shape (n,)."""
    dec_deg: Floats = property(lambda self: self._values["dec_deg"])  # type: ignore[assignment]
    """Declination at the epoch, ICRS, degrees, shape (n,)."""
    epoch_yr: Floats = property(lambda self: self._values["epoch_yr"])  # type: ignore[assignment]
    """Epoch of the place, Julian year, shape (n,)."""
    pm_ra_mas_yr: Floats = property(lambda self: self._values["pm_ra_mas_yr"])  # type: ignore[assignment]
    """Proper motion in right ascension with cos(dec), mas a year, shape (n,)."""
    pm_dec_mas_yr: Floats = property(lambda self: self._values["pm_dec_mas_yr"])  # type: ignore[assignment]
    """Proper motion in declination, mas a year, shape (n,)."""
    parallax_mas: Floats = property(lambda self: self._values["parallax_mas"])  # type: ignore[assignment]
    """Parallax, mas, shape (n,)."""
    radial_velocity_km_s: Floats = property(  # type: ignore[assignment]
        lambda self: self._values["radial_velocity_km_s"]
    )
    """Radial velocity, km/s, positive away, shape (n,)."""

    @property
    def status_words(self) -> NDArray[np.str_]:
        """The status of each row as a word, shape (n,)."""
        return words(self.status, STATUS_WORDS)

    @property
    def bad(self) -> NDArray[np.bool_]:
        """Which rows are out of range and will have no results, shape (n,)."""
        return self.status >= FIRST_BAD_STATUS

    def __getitem__(self, rows: slice | NDArray[Any] | list[int] | int) -> Catalog:
        """The catalogue of some rows: a slice, a mask, row numbers, or one row number."""
        index = np.atleast_1d(np.arange(len(self))[rows])
        values = {key: value[index] for key, value in self._values.items()}
        return Catalog(**values, name=None if self.name is None else self.name[index])

    def __len__(self) -> int:
        return len(self._handle)

    def __setattr__(self, attribute: str, value: object) -> None:
        raise AttributeError(f"Catalog: {attribute} cannot be set; a Catalog does not change")

    def __reduce__(self) -> tuple[Any, ...]:
        return _catalog_again, (dict(self._values), self.name)

    def __repr__(self) -> str:
        bad = int(np.count_nonzero(self.bad))
        return f"<Catalog of {_many(len(self), 'row')}{f', {bad} out of range' if bad else ''}>"


class Bodies:
    """The Sun, the Moon and the planets, by lower-case name.

    * ``names``: of `earth`, `jupiter`, ... the words that the message of `UnknownName` lists.
    * ``ephemeris``: None is the built-in compact ephemeris (1900 to 2100), within 1 mas of DE440 for Sun and
      Moon and 5 mas for the planets (`tests/test_accuracy_bodies.py`). Or the path of an SPK file such as
      ``de440.bsp``, with segments of types 2 or 3: it is mapped into memory, and must not change while it is
      in use. What a verb needs of Earth, Sun and Moon is then taken from it too, within the 1e-13 of
      jplephem's reading of it (`tests/test_accuracy_kernel.py`).

    Places are of the centre, with light time. A planet for which a kernel has only the barycentre of its
    system is placed there. Raises `UnknownName` for a name that is not known, `TableError` for a file that
    is no kernel, is damaged, or has no segments of a body, and OSError for one that cannot be opened.

    >>> Bodies(["sun", "moon", "mars"])
    """

    __slots__ = ("_handle", "_path", "name")

    _handle: _engine.Bodies
    _path: str | None
    name: NDArray[np.str_]
    """The name of each body, shape (n,)."""

    def __init__(self, names: Iterable[str] | str, ephemeris: str | os.PathLike[str] | None = None) -> None:
        wanted = [names] if isinstance(names, str) else list(names)
        known = _engine.body_words()
        for word in wanted:
            if not isinstance(word, str):
                raise WrongType.of("Bodies: name", word, ", ".join(known))
            if word not in known:
                raise UnknownName.among("Bodies: name", word, known)
        if ephemeris is not None and not isinstance(ephemeris, (str, os.PathLike)):
            raise WrongType.of("Bodies: ephemeris", ephemeris, "None, or the path of an SPK file")
        path = None if ephemeris is None else os.fspath(ephemeris)
        object.__setattr__(self, "_handle", _engine.Bodies(wanted, path))
        object.__setattr__(self, "_path", path)
        object.__setattr__(self, "name", read_only(np.array(wanted, dtype=np.str_)))

    def states(self, mjd_tdb: ArrayLike, fraction: ArrayLike = 0.0) -> tuple[Floats, Floats]:
        """Barycentric positions (au) and velocities (au a day), ICRS, each of shape (times, bodies, 3).

        * ``mjd_tdb``, ``fraction``: instants as MJD of TDB and what is to be added to it, days.

        Geometric: no light time, no aberration. NaN outside the ephemeris. From a kernel within 1e-13 of the
        values jplephem computes (`tests/test_accuracy_kernel.py`).
        """
        given = {"mjd_tdb": (mjd_tdb, "d"), "fraction": (fraction, "d")}
        columns = columns_of_one_length(given, "Bodies.states")
        day, rest = (np.ascontiguousarray(column) for column in columns.values())
        numbers = self._handle.states(day, rest).reshape(len(day), len(self), 2, 3)
        return numbers[:, :, 0], numbers[:, :, 1]

    @property
    def ephemeris(self) -> str:
        """What the positions come from, in words."""
        return self._handle.ephemeris

    def __len__(self) -> int:
        return len(self.name)

    def __setattr__(self, attribute: str, value: object) -> None:
        raise AttributeError(f"Bodies: {attribute} cannot be set; Bodies do not change")

    def __reduce__(self) -> tuple[Any, ...]:
        return Bodies, (list(map(str, self.name)), self._path)

    def __repr__(self) -> str:
        return f"<Bodies {', '.join(self.name)}>"


def as_targets(targets: Any) -> Catalog | Bodies | Orbits:
    """`targets` as every verb takes them: a Catalog, Bodies, Orbits, or a SkyCoord (made into a Catalog)."""
    if isinstance(targets, (Catalog, Bodies, Orbits)):
        return targets
    if interop.is_sky_coord(targets):
        return Catalog.from_skycoord(targets)
    allowed = "a Catalog, Bodies, Orbits or an astropy SkyCoord"
    if isinstance(targets, str):
        allowed += f"; a body by its name is Bodies([{targets!r}])"
    raise WrongType.of("targets", targets, allowed)


def _names(name: Iterable[str] | None, length: int) -> NDArray[np.str_] | None:
    if name is None:
        return None
    names = np.array([name] if isinstance(name, str) else list(name), dtype=np.str_)
    if names.shape != (length,):
        raise InvalidArgument.of("Catalog: name", f"{names.size} names", f"one for each of {length} rows")
    return read_only(names)


def _catalog_again(values: dict[str, Any], name: Any) -> Catalog:
    return Catalog(**values, name=name)


def _many(count: int, noun: str) -> str:
    return f"{count:,} {noun}" if count == 1 else f"{count:,} {noun}s"
