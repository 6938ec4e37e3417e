"""Write earth_attitude.csv, earth_tdb.csv and earth_tai_utc.csv: Earth attitude and time scales by pyerfa.

Run from this folder: ``python make_earth.py``. Fixed seeds; pyerfa 2.0.1.5 (ERFA 2.0.1) wrote what is
committed.
"""

import csv
from pathlib import Path

import erfa
import numpy as np

HERE = Path(__file__).parent
MJD_ZERO = 2400000.5
FIRST, LAST = 15020.0, 88069.0  # 1900-01-01 and 2100-01-01
ROWS = 400


def epochs(rows, seed):
    """TT and UT1 as whole MJD and fraction; UT1-TT spread over what the two centuries may see."""
    rng = np.random.default_rng(seed)
    day = np.floor(rng.uniform(FIRST, LAST, rows))
    # A fraction of few binary digits, so that either side reads the very same instant.
    fraction = rng.integers(0, 2**40, rows) / 2**40
    ut1 = np.round((fraction - rng.uniform(-3, 200, rows) / 86400) * 2**40) / 2**40
    return day, fraction, ut1


def attitude(day, fraction, ut1):
    """Every column of earth_attitude.csv, in order."""
    tt, ut = (MJD_ZERO + day, fraction), (MJD_ZERO + day, ut1)
    psi, eps = erfa.nut06a(*tt)
    gamma_bar, phi_bar, psi_bar, obliquity = erfa.pfw06(*tt)
    x, y, s = erfa.xys06a(*tt)
    columns = {
        "tt_day": day,
        "tt_fraction": fraction,
        "ut1_fraction": ut1,
        "rotation_angle": erfa.era00(*ut),
        "mean_sidereal_time": erfa.gmst06(*ut, *tt),
        "apparent_sidereal_time": erfa.gst06a(*ut, *tt),
        "equation_of_the_origins": erfa.eo06a(*tt),
        "nutation_longitude": psi,
        "nutation_obliquity": eps,
        "gamma_bar": gamma_bar,
        "phi_bar": phi_bar,
        "psi_bar": psi_bar,
        "mean_obliquity": obliquity,
        "x": x,
        "y": y,
        "s": s,
        "s_prime": erfa.sp00(*tt),
    }
    equinox, origin = erfa.pnm06a(*tt), erfa.c2i06a(*tt)
    for name, matrix in (("equinox", equinox), ("origin", origin)):
        for i in range(3):
            for j in range(3):
                columns[f"{name}_{i + 1}{j + 1}"] = matrix[:, i, j]
    return columns


def write(name, columns):
    with (HERE / name).open("w", newline="") as file:
        writer = csv.writer(file, lineterminator="\n")
        writer.writerow(columns)
        writer.writerows(zip(*([repr(float(v)) for v in c] for c in columns.values()), strict=True))


def main():
    write("earth_attitude.csv", attitude(*epochs(ROWS, seed=20060101)))

    day, fraction, _ = epochs(ROWS, seed=19900101)
    # At the geocentre: no diurnal part.
    tdb = erfa.dtdb(MJD_ZERO + day, fraction, 0.0, 0.0, 0.0, 0.0)
    write("earth_tdb.csv", {"tt_day": day, "tt_fraction": fraction, "tdb_minus_tt_s": tdb})

    rng = np.random.default_rng(19600101)
    day = np.concatenate([np.arange(36934, 41318, 31), np.floor(rng.uniform(41317, 62000, 200))])
    fraction = rng.integers(0, 2**20, day.size) / 2**20
    year, month, of_month, _ = erfa.jd2cal(MJD_ZERO, day.astype(float))
    tai_utc = erfa.dat(year, month, of_month, fraction)
    write("earth_tai_utc.csv", {"utc_day": day, "utc_fraction": fraction, "tai_minus_utc_s": tai_utc})


if __name__ == "__main__":
    main()
