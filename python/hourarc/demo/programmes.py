"""The invented programmes of Saltpan Ridge as one target list, the same bytes on every machine.

* BRINE: a survey of 4,000 fields, spread evenly (golden-angle spiral) from declination -80 to +30 degrees;
* RIM: 1,600 invented stars of the neighbourhood, with proper motion, parallax and radial velocity;
* LANTERN: 400 fields of standards along the celestial equator.
"""

from __future__ import annotations

import math
import random

_GOLDEN_ANGLE_DEG = 180.0 * (3.0 - math.sqrt(5.0))
_HEADER = "name,programme,ra,dec,epoch,pmra,pmdec,parallax,rv,moon_min_deg"


def target_list() -> str:
    """The list as CSV text; degrees, Julian years, mas/yr, mas, km/s."""
    return "\n".join((_HEADER, *_brine(4000), *_rim(1600), *_lantern(400), ""))


def _brine(count: int) -> list[str]:
    low, high = (math.sin(math.radians(dec)) for dec in (-80.0, 30.0))
    rows = []
    for i in range(count):
        dec = math.degrees(math.asin(low + (high - low) * (i + 0.5) / count))
        ra = (i * _GOLDEN_ANGLE_DEG) % 360.0
        rows.append(f"BRINE-{i + 1:04d},brine,{ra:.5f},{dec:.5f},2000.0,0,0,0,0,40")
    return rows


def _rim(count: int) -> list[str]:
    # random.Random(seed).random() gives the same numbers in every version of Python; other methods need not.
    uniform = random.Random(20260310).random
    rows = []
    for i in range(count):
        ra, dec = 360.0 * uniform(), math.degrees(math.asin(-0.99 + 1.75 * uniform()))
        # Invented neighbours: 10 to 100 mas away, moving across at 10 to 70 km/s (4.74 km/s is 1 au/yr).
        parallax = 10.0 / (1.0 - 0.9 * uniform())
        motion, direction = (10.0 + 60.0 * uniform()) / 4.74 * parallax, math.tau * uniform()
        rv = -60.0 + 120.0 * uniform()
        east, north = motion * math.sin(direction), motion * math.cos(direction)
        rows.append(
            f"RIM-{i + 1:04d},rim,{ra:.8f},{dec:.8f},2016.0,{east:.3f},{north:.3f},{parallax:.4f},{rv:.2f},10"
        )
    return rows


def _lantern(count: int) -> list[str]:
    uniform = random.Random(1148).random
    rows = []
    for i in range(count):
        ra = 360.0 * (i + uniform()) / count
        dec = -1.5 + 3.0 * uniform()
        rows.append(f"LANTERN-{i + 1:03d},lantern,{ra:.5f},{dec:.5f},2000.0,0,0,0,0,20")
    return rows
