"""Earth orientation: UT1, the pole and the celestial pole offsets, as a value with its provenance.

Nothing is downloaded. The packaged tables are those of the `astropy-iers-data` package, which are
files; they are read with our own parsers, and astropy itself is not imported.
"""

from __future__ import annotations

import functools
import os
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from . import _engine
from ._columns import Floats, scalar
from .errors import InvalidArgument, OutsideOrientation, TableError, UnknownName, WrongType
from .results import STATUS_WORDS, Coded, ColumnResult, words
from .times import from_nanoseconds, to_nanoseconds

__all__ = ["Orientation", "OrientationValues", "Provenance", "Source", "as_orientation"]

POLICIES = ("extrapolate", "strict")
QUALITY_WORDS = ("measured", "predicted", "extrapolated")
_UNIX_EPOCH_MJD = 40_587  # 1970-01-01, exact


@dataclass(frozen=True, slots=True)
class Source:
    """A file that a table was read from."""

    name: str
    """What it is: "finals2000A", "C04" or "leap seconds", and its file name."""
    sha256: str
    """SHA-256 of its bytes, in hexadecimal."""


@dataclass(frozen=True, slots=True)
class Provenance:
    """Where the values come from and how far they reach; dates are of 0h UTC."""

    origin: str
    """The package with its version, the path, or "constant"."""
    sources: tuple[Source, ...]
    first: np.datetime64 | None
    """The first day of the table."""
    last_measured: np.datetime64 | None
    """The last day that was measured; from there on values are predicted."""
    last: np.datetime64 | None
    """The last day of the table; from there on values are extrapolated and their error grows."""
    leap_seconds_expire: np.datetime64 | None
    """The day until which no further leap second is known to be announced."""

    def to_dict(self) -> dict[str, Any]:
        """Plain Python values, as a file's provenance records them."""
        dates = {key: getattr(self, key) for key in ("first", "last_measured", "last", "leap_seconds_expire")}
        return {
            "origin": self.origin,
            "sources": {source.name: source.sha256 for source in self.sources},
            **{key: None if value is None else str(value) for key, value in dates.items()},
        }


@dataclass(frozen=True, slots=True, repr=False, eq=False)
class OrientationValues(ColumnResult):
    """Earth orientation at some instants; every column has the shape of the instants."""

    time: NDArray[np.datetime64]
    """Instants, UTC, datetime64[ns]."""
    ut1_minus_utc_s: Floats
    """UT1 - UTC, seconds. Interpolated as UT1 - TAI, so that leap seconds do not disturb it."""
    xp_arcsec: Floats
    """Coordinate x of the pole, arcseconds."""
    yp_arcsec: Floats
    """Coordinate y of the pole, arcseconds."""
    dx_mas: Floats
    """Celestial pole offset dX on IAU 2006/2000A, mas."""
    dy_mas: Floats
    """Celestial pole offset dY on IAU 2006/2000A, mas."""
    ut1_error_s: Floats
    """Error of UT1 as the table states it, and growing past its end, seconds."""
    quality: NDArray[np.uint8]
    """0 measured, 1 predicted, 2 extrapolated."""
    status: NDArray[np.uint8]
    """Status of each instant."""

    @property
    def quality_words(self) -> NDArray[np.str_]:
        """The quality as a word."""
        return words(self.quality, QUALITY_WORDS)

    @property
    def status_words(self) -> NDArray[np.str_]:
        """The status of each instant as a word."""
        return words(self.status, STATUS_WORDS)

    def _table(self) -> dict[str, Any]:
        columns: dict[str, Any] = {
            key: getattr(self, key).reshape(-1) for key in self.__dataclass_fields__ if key != "time"
        }
        columns["quality"] = Coded(columns["quality"], QUALITY_WORDS)
        columns["status"] = Coded(columns["status"], STATUS_WORDS)
        return {"time": self.time.reshape(-1), **columns}

    def _heading(self) -> str:
        return f"OrientationValues at {self.time.size:,} instants"


class Orientation:
    """UT1, the pole and the celestial pole offsets against time, with the leap seconds.

    Made by `packaged`, `from_file` or `constant`. Past its table's end the default policy "extrapolate"
    goes on, with a growing error and a status that says so; "strict" raises `OutsideOrientation`.
    """

    __slots__ = ("_handle", "policy", "provenance")

    _handle: _engine.Orientation
    policy: str
    """What happens outside the table: "extrapolate" or "strict"."""
    provenance: Provenance
    """Where the values come from, and how far they reach."""

    def __init__(self, *_: object, **__: object) -> None:
        raise TypeError("Orientation is made by Orientation.packaged(), .from_file() or .constant()")

    @classmethod
    def _of(cls, engine: _engine.Orientation, provenance: Provenance, policy: str) -> Orientation:
        if policy not in POLICIES:
            raise UnknownName.among("Orientation: policy", policy, POLICIES)
        made = object.__new__(cls)
        for key, value in (("_handle", engine), ("provenance", provenance), ("policy", policy)):
            object.__setattr__(made, key, value)
        return made

    @classmethod
    def packaged(cls, *, policy: str = "extrapolate") -> Orientation:
        """The tables of the installed `astropy-iers-data`: C04 where it reaches, then finals2000A.

        Read once a process: the files are part of an installed package and do not change.
        """
        engine, provenance = _packaged()
        return cls._of(engine, provenance, policy)

    @classmethod
    def from_file(
        cls,
        path: str | os.PathLike[str],
        *,
        leap_seconds: str | os.PathLike[str] | None = None,
        policy: str = "extrapolate",
    ) -> Orientation:
        """A table of IERS in the finals2000A or the C04 layout, told apart by what is in it.

        ``leap_seconds``: a file in the layout of IERS Leap_Second.dat; None takes the packaged one.
        """
        text, source = _read(path)
        if leap_seconds is None:
            leap_text, leap_source = _read(_iers_data().IERS_LEAP_SECOND_FILE)
        else:
            leap_text, leap_source = _read(leap_seconds)
        c04 = _is_c04(text)
        engine = _engine.Orientation.tables(
            (leap_text, leap_source.name),
            (text, str(path)) if c04 else None,
            None if c04 else (text, str(path)),
        )
        sources = (Source(f"{'C04' if c04 else 'finals2000A'} {source.name}", source.sha256), leap_source)
        return cls._of(engine, _provenance(engine, str(path), sources), policy)

    @classmethod
    def constant(
        cls,
        dut1_s: float,
        xp_arcsec: float,
        yp_arcsec: float,
        dx_mas: float = 0.0,
        dy_mas: float = 0.0,
        *,
        policy: str = "extrapolate",
    ) -> Orientation:
        """One set of values for all time: UT1 - UTC, the pole, and the celestial pole offsets.

        Leap seconds are those of the packaged file.
        """
        leap_text, leap_source = _read(_iers_data().IERS_LEAP_SECOND_FILE)
        numbers = {
            "dut1_s": scalar(dut1_s, "Orientation.constant: dut1_s", "s"),
            "xp_arcsec": scalar(xp_arcsec, "Orientation.constant: xp_arcsec", "arcsec"),
            "yp_arcsec": scalar(yp_arcsec, "Orientation.constant: yp_arcsec", "arcsec"),
            "dx_mas": scalar(dx_mas, "Orientation.constant: dx_mas", "mas"),
            "dy_mas": scalar(dy_mas, "Orientation.constant: dy_mas", "mas"),
        }
        engine = _engine.Orientation.constant((leap_text, leap_source.name), *numbers.values())
        return cls._of(engine, _provenance(engine, "constant", (leap_source,)), policy)

    def at(self, when: Any) -> OrientationValues:
        """The values at some instants (UTC, any shape); a scalar gives arrays of shape ()."""
        nanoseconds, shape = to_nanoseconds(when, "when")
        self.check(nanoseconds, "when")
        columns = self._handle.at(nanoseconds)
        return OrientationValues(
            time=from_nanoseconds(nanoseconds).reshape(shape),
            **{key: column.reshape(shape) for key, column in columns.items()},
        )

    def check(self, nanoseconds: NDArray[np.int64], what: str) -> None:
        """Raises `OutsideOrientation` where the policy is "strict" and an instant is outside the table."""
        first, last = self.provenance.first, self.provenance.last
        if self.policy != "strict" or first is None or last is None:
            return
        times = from_nanoseconds(np.asarray(nanoseconds, dtype=np.int64).reshape(-1))
        outside = (times < first) | (times > last)
        if np.any(outside):
            raise OutsideOrientation(
                f"{what}: given {times[int(np.argmax(outside))]}, allowed {first} to {last}, the reach "
                f"of the Earth orientation table ({self.provenance.origin}) with policy 'strict'"
            )

    def __setattr__(self, attribute: str, value: object) -> None:
        raise AttributeError(f"Orientation: {attribute} cannot be set; an Orientation does not change")

    def __repr__(self) -> str:
        reach = "" if self.provenance.last is None else f", measured to {self.provenance.last_measured}"
        reach += "" if self.provenance.last is None else f", predicted to {self.provenance.last}"
        return f"<Orientation {self.provenance.origin}{reach}, policy {self.policy!r}>"


def as_orientation(orientation: Any) -> Orientation:
    """`orientation` as every verb takes it; None is the packaged tables."""
    if orientation is None:
        return Orientation.packaged()
    if isinstance(orientation, Orientation):
        return orientation
    raise WrongType.of("orientation", orientation, "an earth.Orientation, or None (the packaged tables)")


@functools.cache
def _packaged() -> tuple[_engine.Orientation, Provenance]:
    data = _iers_data()
    leap_text, leap_source = _read(data.IERS_LEAP_SECOND_FILE)
    c04_text, c04_source = _read(data.IERS_B_FILE)
    finals_text, finals_source = _read(data.IERS_A_FILE)
    engine = _engine.Orientation.tables(
        (leap_text, leap_source.name), (c04_text, c04_source.name), (finals_text, finals_source.name)
    )
    sources = (
        Source(f"C04 {c04_source.name}", c04_source.sha256),
        Source(f"finals2000A {finals_source.name}", finals_source.sha256),
        leap_source,
    )
    return engine, _provenance(engine, f"astropy-iers-data {data.__version__}", sources)


def _iers_data() -> Any:
    import astropy_iers_data  # file names only; does not import astropy

    return astropy_iers_data


def _read(path: str | os.PathLike[str]) -> tuple[str, Source]:
    import hashlib  # only when a table is read: keeps the import light

    try:
        with open(path, "rb") as file:
            raw = file.read()
    except OSError as error:
        raise TableError(f"{path}: cannot be read: {error.strerror or error}") from error
    try:
        text = raw.decode("ascii")
    except UnicodeDecodeError as error:
        raise TableError(f"{path}: not a text table: byte {error.start} is not ASCII") from error
    return text, Source(os.path.basename(path), hashlib.sha256(raw).hexdigest())


def _is_c04(text: str) -> bool:
    """Whether a table is C04: its days begin with a four-digit year; those of finals2000A with two digits."""
    for line in text.splitlines():
        if line.strip() and not line.startswith("#"):
            return line[:4].strip().isdigit() and len(line[:4].strip()) == 4
    raise InvalidArgument.of("Orientation.from_file", "a file without a line of data", "finals2000A or C04")


def _provenance(engine: _engine.Orientation, origin: str, sources: tuple[Source, ...]) -> Provenance:
    reach = engine.provenance()
    return Provenance(
        origin=origin,
        sources=sources,
        first=_date(reach["first_mjd"]),
        last_measured=_date(reach["last_measured_mjd"]),
        last=_date(reach["last_mjd"]),
        leap_seconds_expire=_date(reach["leap_second_expiry_mjd"]),
    )


def _date(mjd: int | None) -> np.datetime64 | None:
    return None if mjd is None else np.datetime64(mjd - _UNIX_EPOCH_MJD, "D")
