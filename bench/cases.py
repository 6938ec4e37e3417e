"""The cases of the comparison: our call, the rival's, how far apart their answers may be, gate and aim.

A case first compares the answers, and fails when they are further apart than the rival is accurate; only then
are both timed, ours on all rows, the rival on as many as it can do in some seconds.
"""

from __future__ import annotations

import os
import subprocess
import sys
from dataclasses import dataclass

import hourarc as ha
import numpy as np
from clock import best
from rivals import AstropyPairs, AstropySampled, ClosedFormEvents, ClosedFormHours, Pyerfa

FIRST_NIGHT = "2026-01-01"
NIGHTS = 365
POLE = {"dut1_s": 0.05, "xp_arcsec": 0.1, "yp_arcsec": 0.3}
LIMITS = {"altitude_min_deg": 30.0, "sun_altitude_max_deg": -18.0, "moon_separation_min_deg": 30.0}


@dataclass
class Measured:
    """One row of the table."""

    case: str
    against: str
    rows: int
    #: Rows that the rival did; its seconds are those of them, not scaled.
    rival_rows: int
    rival_s: float
    #: Seconds of ours by instruction set, all rows.
    ours_s: dict[str, float]
    gate: float
    aim: float
    #: How far apart the answers were.
    agreement: str
    #: The rival used better than it usually is: how, its rows, its seconds.
    better: tuple[str, int, float] | None = None
    #: "ratio", or "s" where gate and aim are seconds and there is no rival.
    kind: str = "ratio"

    def value(self, isa):
        """What gate and aim are about: times faster than the rival a row, or seconds."""
        if self.kind == "s":
            return self.ours_s[isa]
        return (self.rival_s / self.rival_rows) / (self.ours_s[isa] / self.rows)

    def value_beside_the_better(self, isa):
        """Times faster than the rival used better."""
        _, rows, seconds = self.better
        return (seconds / rows) / (self.ours_s[isa] / self.rows)

    def verdict(self, isa):
        """met, below aim, or missed."""
        value = self.value(isa)
        reached = (lambda bound: value <= bound) if self.kind == "s" else (lambda bound: value >= bound)
        return "met" if reached(self.aim) else "below aim" if reached(self.gate) else "MISSED"


class Bench:
    """The sky of all cases: one site, random stars, and how to run."""

    def __init__(self, rows, isas, threads, runs):
        self.rows, self.isas, self.threads, self.runs = rows, isas, threads, runs
        self.site = ha.Site(24.5127, -20.8714, 1148.0, pressure_hpa=0.0)
        rng = np.random.default_rng(10)
        self.stars = {
            "ra_deg": rng.uniform(0.0, 360.0, rows),
            "dec_deg": np.degrees(np.arcsin(rng.uniform(-1.0, 1.0, rows))),
            "pm_ra_mas_yr": rng.normal(0.0, 20.0, rows),
            "pm_dec_mas_yr": rng.normal(0.0, 20.0, rows),
            "parallax_mas": rng.uniform(0.0, 10.0, rows),
        }
        self.catalog = ha.Catalog(epoch_yr=2000.0, **self.stars)
        self.rng = rng

    def ours(self, run):
        """Seconds of the best run by instruction set."""
        times = {}
        for isa in self.isas:
            os.environ["HOURARC_ISA"] = isa
            times[isa] = best(run, self.runs)
        del os.environ["HOURARC_ISA"]
        return times

    def rival(self, run, rows, scaled):
        """Rows and seconds of the rival's best run: of all rows, or of `scaled` where all would take long."""
        rows = min(rows, scaled) if scaled else rows
        return rows, best(lambda: run(rows), self.runs)

    def night(self):
        """Local mean noons around the night in the middle of the year."""
        almanac = ha.almanac(self.site, "2026-07-01")
        return almanac.start[0], almanac.stop[0]


def place_one_instant(bench):
    """Altitude and azimuth of all rows at one instant."""
    when = np.datetime64("2026-03-10T20:00:00.000000000")
    orientation = ha.Orientation.constant(**POLE)
    columns = ("altitude_deg", "azimuth_deg")
    out = {name: np.zeros(bench.rows) for name in columns} | {"status": np.zeros(bench.rows, np.uint8)}

    def ours():
        return ha.place(
            bench.site,
            bench.catalog,
            when,
            columns=columns,
            out=out,
            orientation=orientation,
            threads=bench.threads,
        )

    rival = Pyerfa(bench.site, bench.stars, when, POLE)
    places = ours()
    azimuth, zenith = rival.run()
    altitude = np.radians(places.altitude_deg)
    turned = np.remainder(np.radians(places.azimuth_deg) - azimuth + np.pi, 2 * np.pi) - np.pi
    apart = np.hypot(altitude - (np.pi / 2 - zenith), np.cos(altitude) * turned)
    # Near the Sun's limb the two bend light differently by design.
    sun = ha.place(bench.site, bench.catalog, when, columns=("sun_separation_deg",), orientation=orientation)
    worst = np.degrees(apart[sun.sun_separation_deg > 5.0].max()) * 3.6e9
    assert worst < 10.0, f"{worst} µas from pyerfa"
    rival_rows, rival_s = bench.rival(lambda rows: rival.run(slice(0, rows)), bench.rows, None)
    return Measured(
        "`place`, one instant, proper motion and parallax, altitude and azimuth",
        "pyerfa `atciq` and `atioq`, one array call",
        bench.rows,
        rival_rows,
        rival_s,
        bench.ours(ours),
        20.0,
        60.0,
        f"{worst:.1f} µas",
    )


def place_pairwise(bench):
    """Altitude and azimuth of each row at an instant of its own, within a year."""
    seconds = bench.rng.uniform(0.0, 365.0 * 86_400.0, bench.rows)
    when = np.datetime64("2025-03-01", "ns") + (seconds * 1e9).astype("timedelta64[ns]")
    plain = ha.Catalog(bench.stars["ra_deg"], bench.stars["dec_deg"])
    columns = ("altitude_deg", "azimuth_deg")
    out = {name: np.zeros(bench.rows) for name in columns} | {"status": np.zeros(bench.rows, np.uint8)}

    def ours():
        return ha.place(
            bench.site, plain, when, columns=columns, pairwise=True, out=out, threads=bench.threads
        )

    rival, some = AstropyPairs(bench.site, bench.stars, when), min(bench.rows, 2_000)
    places, (altitude, _) = ours(), rival.run(slice(0, some))
    worst = np.abs(places.altitude_deg[:some] - altitude).max() * 3.6e6
    assert worst < 5.0, f"{worst} mas from astropy, which has no celestial pole offsets"
    rival_rows, rival_s = bench.rival(lambda rows: rival.run(slice(0, rows)), bench.rows, 20_000)
    return Measured(
        "`place` pairwise, each row at an instant of its own",
        "astropy `AltAz`, one call with an array of instants",
        bench.rows,
        rival_rows,
        rival_s,
        bench.ours(ours),
        300.0,
        1000.0,
        f"{worst:.2f} mas",
    )


def events(bench):
    """Rise, transit and set of all rows in one night."""
    start, stop = bench.night()

    def ours():
        return ha.rise_transit_set(
            bench.site, bench.catalog, start, stop, altitude_deg=30.0, threads=bench.threads
        )

    rival = ClosedFormEvents(bench.site, bench.stars, start, 30.0)
    found, textbook = ours(), rival.run()
    seconds = (found.time - start) / np.timedelta64(1, "s")
    target = found.target
    # Where the declination is moderate and the altitude changes fast, mean places are good to seconds.
    dec = np.abs(bench.stars["dec_deg"][target])
    clear = (dec < 70.0) & ((found.kind == 1) | (np.abs(np.abs(found.azimuth_deg - 180.0) - 90.0) < 60.0))
    apart = np.zeros(len(seconds))
    for kind in range(3):
        here = found.kind == kind
        apart[here] = seconds[here] - textbook[kind][target[here]]
    day = 2.0 * np.pi / 7.292115e-5
    apart = np.abs(np.remainder(apart + day / 2, day) - day / 2)[clear]
    worst = np.nanmax(apart)
    assert np.isfinite(apart).mean() > 0.999 and worst < 30.0, f"{worst} s from the closed form"
    rival_rows, rival_s = bench.rival(lambda rows: rival.run(slice(0, rows)), bench.rows, None)
    return Measured(
        "`rise_transit_set`, one night, exact",
        "numpy, the textbook's closed form on mean places of date",
        bench.rows,
        rival_rows,
        rival_s,
        bench.ours(ours),
        1.0,
        2.5,
        f"{np.median(apart):.1f} s median, {worst:.0f} s",
    )


def year(bench, moon):
    """Hours of all rows on 365 nights."""
    limits = ha.Limits(altitude_min_deg=30.0, sun_altitude_max_deg=-18.0)
    hours = np.zeros((NIGHTS, bench.rows), np.float32)

    def ours(limits=limits):
        return ha.visibility_grid(
            bench.site, bench.catalog, FIRST_NIGHT, NIGHTS, limits, out=hours, threads=bench.threads
        )

    almanac = ha.almanac(bench.site, FIRST_NIGHT, NIGHTS)
    dark = almanac.dusk_astronomical, almanac.dawn_astronomical
    rival = ClosedFormHours(bench.site, bench.stars, *dark, 30.0)
    some = min(bench.rows, 20_000)
    theirs = np.zeros((NIGHTS, some), np.float32)
    ours()
    apart = np.abs(hours[:, :some] - rival.run(theirs)) * 3600.0
    assert np.abs(theirs - rival.run_tuned(theirs.copy())).max() * 3600.0 < 0.1
    median, most = np.median(apart), np.quantile(apart, 0.99)
    assert median < 10.0 and most < 60.0, f"median {median} s, 99% {most} s from the closed form"
    rival_rows = min(bench.rows, 100_000)
    theirs = np.zeros((NIGHTS, rival_rows), np.float32)
    rival_s = best(lambda: rival.run(theirs), bench.runs)
    tuned_s = best(lambda: rival.run_tuned(theirs), bench.runs)
    if not moon:
        measured = bench.ours(ours)
    else:
        limits = limits.replace(moon_separation_min_deg=30.0)
        ours(limits)
        measured = bench.ours(lambda: ours(limits))
    return Measured(
        f"`visibility_grid`, {NIGHTS} nights, hours, altitude and twilight"
        + (", Moon separation" if moon else ""),
        "numpy, the same closed form night by night" + (", without the Moon" if moon else ""),
        bench.rows * NIGHTS,
        rival_rows * NIGHTS,
        rival_s,
        measured,
        3.0 if moon else 8.0,
        6.0 if moon else 15.0,
        f"{median:.1f} s median, {most:.0f} s of 99%",
        ("arcs once, in blocks and in place", rival_rows * NIGHTS, tuned_s),
    )


def exact_windows(bench):
    """Windows of all rows in one night under limits on altitude, Sun and Moon."""
    start, stop = bench.night()
    limits = ha.Limits(**LIMITS)
    plain = ha.Catalog(bench.stars["ra_deg"], bench.stars["dec_deg"])

    def ours():
        return ha.windows(bench.site, plain, start, stop, limits, threads=bench.threads)

    almanac = ha.almanac(bench.site, "2026-07-01")
    rival = AstropySampled(bench.site, bench.stars, almanac.sunset[0], almanac.sunrise[0], LIMITS)
    some = min(bench.rows, 400)
    hours, counts = ours().hours[:some], ours().counts[:some]
    # An edge between two samples: half a minute in the mean, a minute at most, at each end of a window.
    apart = np.abs(hours - rival.run_together(slice(0, some))) * 3600.0
    assert (apart <= 62.0 * np.maximum(counts, 1) + 1.0).all(), f"{apart.max()} s from astropy each 60 s"
    rival_rows, rival_s = bench.rival(lambda rows: rival.run(slice(0, rows)), bench.rows, 20)
    together_s = best(lambda: rival.run_together(slice(0, some)), bench.runs)
    return Measured(
        "`windows`, one night, altitude, Sun and Moon",
        "astropy `AltAz` each 60 s of the night, star by star",
        bench.rows,
        rival_rows,
        rival_s,
        bench.ours(ours),
        2000.0,
        10_000.0,
        f"{apart.max():.0f} s",
        ("all stars in one call", some, together_s),
    )


def watch(bench):
    """The state of all rows at one instant of a night whose windows are known."""
    watched = ha.Watch(bench.site, bench.catalog, "2026-07-01", ha.Limits(**LIMITS), threads=bench.threads)
    when = watched.start + np.timedelta64(12 * 3600 + 1234, "s")
    out = watched.at(when, threads=bench.threads)
    windows = watched.windows
    up = np.zeros(bench.rows, bool)
    up[windows.target[(windows.start <= when) & (when < windows.stop)]] = True
    assert np.array_equal(out.up, up) and up.any()
    ours = bench.ours(lambda: watched.at(when, out=out, threads=bench.threads))
    # The gate is for a million rows.
    scaled = {isa: seconds * 1e6 / bench.rows for isa, seconds in ours.items()}
    about = (1, 1, 0.0, scaled, 0.015, 0.005)
    return Measured("`Watch.at`, a million rows", "its windows", *about, "0", kind="s")


def imports(bench):
    """What an import costs beside numpy's, and the command's help."""

    def process(code):
        run = [sys.executable, "-c", code]
        return best(lambda: subprocess.run(run, check=True, capture_output=True), max(5, bench.runs))

    beside = process("import hourarc") - process("import numpy")
    shown = process("import sys; sys.argv = ['hourarc', '--help']; from hourarc.cli import main; main()")
    about = (1, 1, 0.0)
    return [
        Measured(
            "`import hourarc`",
            "beside `import numpy`",
            *about,
            dict.fromkeys(bench.isas, beside),
            0.05,
            0.05,
            "",
            kind="s",
        ),
        Measured("`hourarc --help`", "", *about, dict.fromkeys(bench.isas, shown), 0.3, 0.3, "", kind="s"),
    ]


CASES = {
    "place": place_one_instant,
    "pairwise": place_pairwise,
    "events": events,
    "year": lambda bench: year(bench, moon=False),
    "year-moon": lambda bench: year(bench, moon=True),
    "windows": exact_windows,
    "watch": watch,
    "imports": imports,
}
"""Every case by the word that `compare.py --only` takes."""


def flatness(bench, most_targets):
    """Nanoseconds a target-night: from few targets to many, and from one night to ten years."""
    limits = ha.Limits(altitude_min_deg=30.0, sun_altitude_max_deg=-18.0)
    rows = []
    sizes = [(n, 100) for n in (10_000, 100_000, 1_000_000, 10_000_000) if n <= most_targets]
    sizes += [(100_000, nights) for nights in (1, 10, 365, 3650)]
    for targets, nights in sizes:
        rng = np.random.default_rng(11)
        catalog = ha.Catalog(
            rng.uniform(0.0, 360.0, targets), np.degrees(np.arcsin(rng.uniform(-1.0, 1.0, targets)))
        )
        out = np.zeros((nights, targets), np.float32)

        def run(catalog=catalog, nights=nights, out=out):
            return ha.visibility_grid(
                bench.site, catalog, FIRST_NIGHT, nights, limits, out=out, threads=bench.threads
            )

        run()
        seconds = bench.ours(run)
        rows.append(
            {
                "targets": targets,
                "nights": nights,
                "ns": {isa: each * 1e9 / (targets * nights) for isa, each in seconds.items()},
            }
        )
    return rows
