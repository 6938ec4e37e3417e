"""The attitude of the Earth: IAU 2006 precession, IAU 2000A nutation, Earth rotation, orientation tables.

Instants here are two-part Modified Julian Dates of a stated scale: a day and a fraction, in any split.
The split keeps the microarcsecond: the Earth turns 15 µas in a microsecond, and one double holds a
present-day MJD to a microsecond only. Scalars give floats (or one matrix), arrays give arrays.
"""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import ArrayLike

from . import _engine
from ._columns import Floats, broadcast_flat
from .errors import WrongType
from .orientation import Orientation, OrientationValues, Provenance

__all__ = [
    "Orientation",
    "OrientationValues",
    "Provenance",
    "bias_precession_nutation",
    "precession_nutation",
    "rotation_angle",
    "sidereal_time",
]


def rotation_angle(ut1_mjd: ArrayLike, ut1_fraction: ArrayLike = 0.0) -> Any:
    """Earth rotation angle, radians in [0, 2π): IERS Conventions (2010) equation 5.15.

    `ut1_mjd` + `ut1_fraction`: UT1 as Modified Julian Date. Returns their broadcast shape. Within 1 µas of
    pyerfa, 1900–2100 (`tests/test_accuracy_earth.py`).
    """
    given = {"ut1_mjd": (ut1_mjd, "d"), "ut1_fraction": (ut1_fraction, "d")}
    shape, rows = broadcast_flat(given, "earth.rotation_angle")
    return _shaped(_engine.rotation_angle(*rows), shape)


def sidereal_time(
    ut1_mjd: ArrayLike,
    tt_mjd: ArrayLike,
    *,
    ut1_fraction: ArrayLike = 0.0,
    tt_fraction: ArrayLike = 0.0,
    apparent: bool = True,
) -> Any:
    """Greenwich sidereal time, radians in [0, 2π), IAU 2006/2000A; mean where `apparent` is False.

    Needs UT1 (for the rotation) and TT (for precession and nutation) as Modified Julian Dates: taking
    one for the other costs 100 µas. Returns the broadcast shape. Within 1 µas of pyerfa, 1900–2100
    (`tests/test_accuracy_earth.py`).
    """
    if not isinstance(apparent, (bool, np.bool_)):
        raise WrongType.of("earth.sidereal_time: apparent", apparent, "True or False")
    given = {
        "ut1_mjd": (ut1_mjd, "d"),
        "ut1_fraction": (ut1_fraction, "d"),
        "tt_mjd": (tt_mjd, "d"),
        "tt_fraction": (tt_fraction, "d"),
    }
    shape, (ut1, ut1_rest, tt, tt_rest) = broadcast_flat(given, "earth.sidereal_time")
    return _shaped(_engine.sidereal_time(ut1, ut1_rest, tt, tt_rest, bool(apparent)), shape)


def precession_nutation(tt_mjd: ArrayLike, tt_fraction: ArrayLike = 0.0) -> Floats:
    """The matrix from GCRS to CIRS, CIO based, IAU 2006/2000A without dX and dY, shape (..., 3, 3).

    `tt_mjd` + `tt_fraction`: TT as Modified Julian Date. Within 1 µas of pyerfa, 1900–2100
    (`tests/test_accuracy_earth.py`).
    """
    given = {"tt_mjd": (tt_mjd, "d"), "tt_fraction": (tt_fraction, "d")}
    shape, rows = broadcast_flat(given, "earth.precession_nutation")
    return _engine.precession_nutation(*rows).reshape((*shape, 3, 3))


def bias_precession_nutation(tt_mjd: ArrayLike, tt_fraction: ArrayLike = 0.0) -> Floats:
    """The matrix from GCRS to the true equator and equinox of date, IAU 2006/2000A, shape (..., 3, 3).

    `tt_mjd` + `tt_fraction`: TT as Modified Julian Date. Within 1 µas of pyerfa, 1900–2100
    (`tests/test_accuracy_earth.py`).
    """
    given = {"tt_mjd": (tt_mjd, "d"), "tt_fraction": (tt_fraction, "d")}
    shape, rows = broadcast_flat(given, "earth.bias_precession_nutation")
    return _engine.bias_precession_nutation(*rows).reshape((*shape, 3, 3))


def _shaped(row: Floats, shape: tuple[int, ...]) -> Any:
    return row.reshape(shape) if shape else float(row[0])
