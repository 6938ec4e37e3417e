"""Orbits of minor bodies: osculating elements as targets, from columns or the Minor Planet Center's lines."""

from __future__ import annotations

import os
from collections.abc import Iterable
from pathlib import Path
from typing import Any, NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

from . import _engine
from ._columns import Floats, columns_of_one_length, read_only, scalar, workers
from .errors import InvalidArgument, WrongType
from .results import FIRST_BAD_STATUS, STATUS_WORDS, words

__all__ = ["Orbits", "RejectedLine"]

_COMMON = {
    "epoch_mjd_tt": "d",
    "eccentricity": "",
    "inclination_deg": "deg",
    "node_deg": "deg",
    "perihelion_argument_deg": "deg",
}
_BY_MEAN_ANOMALY = {"semi_major_axis_au": "AU", "mean_anomaly_deg": "deg"}
_BY_PERIHELION = {"perihelion_au": "AU", "perihelion_mjd_tt": "d"}
_ROW = 13


class RejectedLine(NamedTuple):
    """A line that is no orbit."""

    line: int
    """Its number, from 1."""
    first_column: int
    """The first column at fault, from 1."""
    last_column: int
    """The last one."""
    reason: str
    """What is wrong there."""


class Orbits:
    """Osculating orbits about the Sun: heliocentric, ecliptic and equinox of J2000.0 (obliquity 84381.448″).

    Every argument is a scalar or one dimension, and scalars are spread over the rows. Places follow by
    two-body motion, so that far from the epoch they drift away from the true ones: rows for which that may
    exceed 5″ have the status ``far_from_epoch``; `advance` carries the elements to an epoch nearer by.

    * ``epoch_mjd_tt``: the epoch of osculation, MJD TT.
    * ``eccentricity``: any from 0: ellipse, parabola or hyperbola.
    * ``inclination_deg``, ``node_deg``, ``perihelion_argument_deg``: degrees.
    * ``semi_major_axis_au`` (negative for a hyperbola) and ``mean_anomaly_deg``, or ``perihelion_au`` and
      ``perihelion_mjd_tt``, the distance and the instant (MJD TT) of perihelion; a parabola needs the latter.
    * ``h_mag``: absolute magnitude; None where there is none.
    * ``slope_g``: the slope G of the H,G system; with ``slope_g2`` it is G₁ of the H,G₁,G₂ system.
    * ``name``: a name for each row, or None.

    A row that no orbit has is kept and marked in ``status``; its results are NaN or NaT and the other rows
    are untouched.
    """

    __slots__ = ("_columns", "_handle", "line", "name", "rejected", "status")

    _handle: _engine.Orbits
    _columns: dict[str, Floats] | None
    name: NDArray[np.str_] | None
    """The name of each row, shape (n,), or None."""
    status: NDArray[np.uint8]
    """The status of each row, shape (n,): 0 is good, from 16 on the row has no results."""
    line: NDArray[np.int64] | None
    """The line of the text that each row was read from by `from_mpc`, from 1, shape (n,); None otherwise."""
    rejected: tuple[RejectedLine, ...]
    """The lines that were no orbits; empty unless read by `from_mpc`."""

    def __init__(
        self,
        epoch_mjd_tt: ArrayLike,
        eccentricity: ArrayLike,
        inclination_deg: ArrayLike,
        node_deg: ArrayLike,
        perihelion_argument_deg: ArrayLike,
        *,
        semi_major_axis_au: ArrayLike | None = None,
        mean_anomaly_deg: ArrayLike | None = None,
        perihelion_au: ArrayLike | None = None,
        perihelion_mjd_tt: ArrayLike | None = None,
        h_mag: ArrayLike | None = None,
        slope_g: ArrayLike = 0.15,
        slope_g2: ArrayLike | None = None,
        name: Iterable[str] | None = None,
    ) -> None:
        common = (epoch_mjd_tt, eccentricity, inclination_deg, node_deg, perihelion_argument_deg)
        given: dict[str, tuple[Any, str]] = {
            key: (value, _COMMON[key]) for key, value in zip(_COMMON, common, strict=True)
        }
        pair = {
            "semi_major_axis_au": semi_major_axis_au,
            "mean_anomaly_deg": mean_anomaly_deg,
            "perihelion_au": perihelion_au,
            "perihelion_mjd_tt": perihelion_mjd_tt,
        }
        named = tuple(key for key, value in pair.items() if value is not None)
        if named not in (tuple(_BY_MEAN_ANOMALY), tuple(_BY_PERIHELION)):
            raise InvalidArgument.of(
                "Orbits",
                ", ".join(named) or "no place in the orbit",
                "semi_major_axis_au with mean_anomaly_deg, or perihelion_au with perihelion_mjd_tt",
            )
        units = _BY_MEAN_ANOMALY | _BY_PERIHELION
        given |= {key: (pair[key], units[key]) for key in named}
        given["h_mag"] = (np.nan if h_mag is None else h_mag, "mag")
        given["slope_g"] = (slope_g, "")
        if slope_g2 is not None:
            given["slope_g2"] = (slope_g2, "")
        columns = {k: np.ascontiguousarray(c) for k, c in columns_of_one_length(given, "Orbits").items()}
        made = _engine.Orbits(
            columns["epoch_mjd_tt"],
            columns["eccentricity"],
            columns["inclination_deg"],
            columns["node_deg"],
            columns["perihelion_argument_deg"],
            columns[named[0]],
            columns[named[1]],
            named == tuple(_BY_MEAN_ANOMALY),
            columns["h_mag"],
            columns["slope_g"],
            columns.get("slope_g2"),
        )
        self._take(made, name)

    def _take(
        self,
        handle: _engine.Orbits,
        name: Iterable[str] | None,
        rejected: Iterable[RejectedLine] = (),
        line: NDArray[np.int64] | None = None,
    ) -> None:
        names = None
        if name is not None:
            names = np.array([name] if isinstance(name, str) else list(name), dtype=np.str_)
            if names.shape != (len(handle),):
                allowed = f"one for each of {len(handle)} rows"
                raise InvalidArgument.of("Orbits: name", f"{names.size} names", allowed)
            names = read_only(names)
        object.__setattr__(self, "_handle", handle)
        object.__setattr__(self, "_columns", None)
        object.__setattr__(self, "status", read_only(handle.status))
        object.__setattr__(self, "name", names)
        object.__setattr__(self, "rejected", tuple(rejected))
        object.__setattr__(self, "line", None if line is None else read_only(line))

    @classmethod
    def _of(
        cls,
        handle: _engine.Orbits,
        name: Iterable[str] | None,
        rejected: Iterable[RejectedLine] = (),
        line: NDArray[np.int64] | None = None,
    ) -> Orbits:
        made = cls.__new__(cls)
        made._take(handle, name, rejected, line)
        return made

    @classmethod
    def from_mpc(cls, source: str | os.PathLike[str]) -> Orbits:
        """Orbits from lines in the Minor Planet Center's formats: of minor planets, of comets, or of both.

        * ``source``: a path, or the text itself (a str of more than one line, or of one as long as an
          orbit's).

        A heading that ends with a line of dashes is passed over. Lines that are no orbits (cut short, an
        eccentricity that cannot be, a bad packed date) are not lost: ``rejected`` has their numbers, the
        columns at fault and the reasons. Names are the designations, unpacked.
        """
        if isinstance(source, str) and ("\n" in source or len(source) >= _SHORTEST_LINE):
            text = source
        elif isinstance(source, (str, os.PathLike)):
            text = Path(source).read_text(encoding="utf-8", errors="replace")
        else:
            raise WrongType.of("Orbits.from_mpc", source, "a path, or the text of the lines")
        handle, names, lines, rejected = _engine.Orbits.from_mpc(text)
        return cls._of(handle, names, (RejectedLine(*line) for line in rejected), lines)

    def advance(self, to_mjd_tt: float, *, threads: int | None = None) -> Orbits:
        """The same bodies with the elements of another epoch, MJD TT.

        Integrated under the Sun (with relativity), the Moon and the eight planets of the built-in ephemeris,
        to 1900 or 2100 at most; 0.1″ after 1,000 days for bodies of the main belt against JPL's
        (`rust/core/src/ephemeris/orbits/advance.rs`), where nothing but those bodies acts. A row that has no
        orbit there (it falls into the Sun, or leaves the ephemeris) has a status of 16 or more.
        """
        to = scalar(to_mjd_tt, "Orbits.advance: to_mjd_tt", "d")
        return self._of(self._handle.advance(to, workers(threads)), self.name, (), self.line)

    def drift_au(self, mjd_tt: float) -> Floats:
        """How far two-body motion may have strayed from the true one at an instant (MJD TT), au, shape (n,).

        An estimate from the planets' pull, mostly on the safe side: after 10 days as large as the true drift
        in the median, after 100 days twice.
        """
        return self._handle.drift_au(scalar(mjd_tt, "Orbits.drift_au: mjd_tt", "d"))

    def _column(self, key: str) -> Floats:
        if self._columns is None:
            columns = {name: read_only(values) for name, values in self._handle.elements().items()}
            object.__setattr__(self, "_columns", columns)
        assert self._columns is not None
        return self._columns[key]

    @property
    def epoch_mjd_tt(self) -> Floats:
        """Epoch of osculation, MJD TT, shape (n,). This and all elements are NaN in a bad row."""
        return self._column("epoch_mjd_tt")

    @property
    def eccentricity(self) -> Floats:
        """Eccentricity, shape (n,)."""
        return self._column("eccentricity")

    @property
    def inclination_deg(self) -> Floats:
        """Inclination to the ecliptic of J2000.0, degrees, shape (n,)."""
        return self._column("inclination_deg")

    @property
    def node_deg(self) -> Floats:
        """Longitude of the ascending node, degrees, shape (n,)."""
        return self._column("node_deg")

    @property
    def perihelion_argument_deg(self) -> Floats:
        """Argument of perihelion, degrees, shape (n,)."""
        return self._column("perihelion_argument_deg")

    @property
    def semi_major_axis_au(self) -> Floats:
        """Semi-major axis, au, negative for a hyperbola and infinite for a parabola, shape (n,)."""
        return self._column("semi_major_axis_au")

    @property
    def mean_anomaly_deg(self) -> Floats:
        """Mean anomaly at the epoch, degrees, shape (n,)."""
        return self._column("mean_anomaly_deg")

    @property
    def perihelion_au(self) -> Floats:
        """Perihelion distance, au, shape (n,)."""
        return self._column("perihelion_au")

    @property
    def perihelion_mjd_tt(self) -> Floats:
        """Instant of the perihelion nearest to the epoch, MJD TT, shape (n,)."""
        return self._column("perihelion_mjd_tt")

    @property
    def h_mag(self) -> Floats:
        """Absolute magnitude, of a comet the total one; NaN where unknown, shape (n,)."""
        return self._column("h_mag")

    @property
    def status_words(self) -> NDArray[np.str_]:
        """The status of each row as a word, shape (n,)."""
        return words(self.status, STATUS_WORDS)

    @property
    def bad(self) -> NDArray[np.bool_]:
        """Which rows are no orbits and will have no results, shape (n,)."""
        return self.status >= FIRST_BAD_STATUS

    def __getitem__(self, rows: slice | NDArray[Any] | list[int] | int) -> Orbits:
        """The orbits of some rows: a slice, a mask, row numbers, or one row number."""
        index = np.atleast_1d(np.arange(len(self))[rows])
        numbers = self._handle.rows().reshape(-1, _ROW)[index]
        name, line = (None if column is None else column[index] for column in (self.name, self.line))
        return _orbits_again(numbers, name, (), line)

    def __len__(self) -> int:
        return len(self._handle)

    def __setattr__(self, attribute: str, value: object) -> None:
        raise AttributeError(f"Orbits: {attribute} cannot be set; Orbits do not change")

    def __reduce__(self) -> tuple[Any, ...]:
        return _orbits_again, (self._handle.rows(), self.name, self.rejected, self.line)

    def __repr__(self) -> str:
        bad, refused = int(np.count_nonzero(self.bad)), len(self.rejected)
        said = [f"{len(self):,} row{'' if len(self) == 1 else 's'}"]
        said += [f"{bad} out of range"] if bad else []
        said += [f"{refused} line{'' if refused == 1 else 's'} rejected"] if refused else []
        return f"<Orbits of {', '.join(said)}>"


#: No path is as long as the shortest line that could be meant as an orbit.
_SHORTEST_LINE = 79


def _orbits_again(numbers: Any, name: Any, rejected: Any, line: Any) -> Orbits:
    handle = _engine.Orbits.from_rows(np.ascontiguousarray(numbers).reshape(-1))
    return Orbits._of(handle, name, rejected, line)
