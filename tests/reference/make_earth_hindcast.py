"""Regenerates earth_ut1_hindcast.csv: UT1−TAI before and after eight dates at which a table is cut short.

From IERS EOP 20 C04 as the PyPI package astropy-iers-data carries it (columns: year, month, day, hour, MJD,
x, y, UT1−UTC, ...), with leap seconds from pyerfa. Rows: MJD of the cut, days after it (negative: before),
UT1−TAI in seconds.
"""

from pathlib import Path

import erfa
import numpy as np
from astropy_iers_data import IERS_B_FILE

CUTS = np.linspace(42_000, 57_000, 8).astype(int)
BEFORE = range(-110, 1)
AFTER = (1, 3, 10, 30, 90, 365, 1000, 3650)

ut1_minus_tai = {}
for line in Path(IERS_B_FILE).read_text(encoding="ascii").splitlines():
    if line.startswith("#"):
        continue
    fields = line.split()
    year, month, day = map(int, fields[:3])
    ut1_minus_tai[int(float(fields[4]))] = float(fields[7]) - erfa.dat(year, month, day, 0.0)

lines = [
    "# python tests/reference/make_earth_hindcast.py (IERS EOP 20 C04)",
    "cut_mjd,days_after,ut1_minus_tai_s",
]
for cut in CUTS:
    for days in (*BEFORE, *AFTER):
        lines.append(f"{cut},{days},{ut1_minus_tai[cut + days]:.7f}")
Path(__file__).with_name("earth_ut1_hindcast.csv").write_text("\n".join(lines) + "\n", encoding="ascii")
