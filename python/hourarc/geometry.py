"""The great circle between two directions, exact from 0 to 180 degrees."""

from __future__ import annotations

from typing import Any

from numpy.typing import ArrayLike

from . import _engine
from ._columns import Floats, broadcast_flat

__all__ = ["position_angle", "separation"]


def separation(lon1_deg: ArrayLike, lat1_deg: ArrayLike, lon2_deg: ArrayLike, lat2_deg: ArrayLike) -> Any:
    """The angle between two directions on any sphere, degrees, 0 to 180; arguments in degrees.

    Scalars give a float, arrays the broadcast shape. Within 1e-12 degrees, at every angle, however small
    or near 180 (`tests/test_published_places.py`).
    """
    shape, rows = _rows("separation", lon1_deg, lat1_deg, lon2_deg, lat2_deg)
    return _shaped(_engine.separation(*rows), shape)


def position_angle(lon1_deg: ArrayLike, lat1_deg: ArrayLike, lon2_deg: ArrayLike, lat2_deg: ArrayLike) -> Any:
    """The position angle of the second direction seen from the first, degrees, 0 to 360.

    From the direction of increasing latitude through increasing longitude (north through east on the
    sky). Scalars give a float, arrays the broadcast shape.
    """
    shape, rows = _rows("position_angle", lon1_deg, lat1_deg, lon2_deg, lat2_deg)
    return _shaped(_engine.position_angle(*rows), shape)


def _rows(
    where: str, lon1: ArrayLike, lat1: ArrayLike, lon2: ArrayLike, lat2: ArrayLike
) -> tuple[tuple[int, ...], list[Floats]]:
    given = {"lon1_deg": lon1, "lat1_deg": lat1, "lon2_deg": lon2, "lat2_deg": lat2}
    return broadcast_flat({key: (value, "deg") for key, value in given.items()}, where)


def _shaped(row: Floats, shape: tuple[int, ...]) -> Any:
    return row.reshape(shape) if shape else float(row[0])
