"""Earth orientation as plain numbers, and the values an independent reader finds in the same tables."""

from dataclasses import dataclass
from functools import cache

import numpy as np

ARCSECOND = np.pi / 648_000.0
MILLIARCSECOND = ARCSECOND * 1e-3


@dataclass(frozen=True)
class Pole:
    """UT1−UTC in seconds; the terrestrial pole (xp, yp) and the celestial offsets (dX, dY) in radians.

    Each is a number, or an array with one value an instant.
    """

    ut1_minus_utc_s: object = 0.0
    xp: object = 0.0
    yp: object = 0.0
    dx: object = 0.0
    dy: object = 0.0

    @classmethod
    def from_units(cls, dut1_s, xp_arcsec, yp_arcsec, dx_mas=0.0, dy_mas=0.0):
        """From the units the tables are printed in."""
        return cls(
            dut1_s,
            np.multiply(xp_arcsec, ARCSECOND),
            np.multiply(yp_arcsec, ARCSECOND),
            np.multiply(dx_mas, MILLIARCSECOND),
            np.multiply(dy_mas, MILLIARCSECOND),
        )

    def at(self, utc_ns):
        """The same for every instant: so that a constant pole and a table are asked in one way."""
        return self


@cache
def _astropy_table(which):
    import astropy_iers_data as data
    from astropy.utils import iers

    if which == "finals2000A":
        return iers.IERS_A.open(data.IERS_A_FILE)
    return iers.IERS_B.open(data.IERS_B_FILE)


def table(which):
    """`finals2000A` (its Bulletin A columns) or `c04` as astropy reads it: a dict of columns.

    mjd, dut1_s (UT1−UTC), xp_arcsec, yp_arcsec, dx_mas, dy_mas; NaN where nothing is printed.
    """
    rows = _astropy_table(which)
    mjd = np.array(rows["MJD"].value, dtype=float)
    out = {"mjd": mjd}
    if which == "finals2000A":
        names = {"dut1_s": "UT1_UTC_A", "xp_arcsec": "PM_x_A", "yp_arcsec": "PM_y_A"}
        names |= {"dx_mas": "dX_2000A_A", "dy_mas": "dY_2000A_A"}
        units = {
            "dut1_s": "s",
            "xp_arcsec": "arcsec",
            "yp_arcsec": "arcsec",
            "dx_mas": "mas",
            "dy_mas": "mas",
        }
    else:
        names = {"dut1_s": "UT1_UTC", "xp_arcsec": "PM_x", "yp_arcsec": "PM_y", "dx_mas": "dX_2000A"}
        names |= {"dy_mas": "dY_2000A"}
        units = {
            "dut1_s": "s",
            "xp_arcsec": "arcsec",
            "yp_arcsec": "arcsec",
            "dx_mas": "mas",
            "dy_mas": "mas",
        }
    for key, name in names.items():
        column = rows[name]
        values = column.to_value(units[key]) if hasattr(column, "to_value") else column
        out[key] = np.ma.filled(np.ma.asarray(values, dtype=float), np.nan)
    return out
