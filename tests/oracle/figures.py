"""The accuracy gates in one place, and the measured figures the README's table is made of.

A test measures, and calls `figures.hold(key, worst, cases)`: the figure is kept, then held against its gate.
Figures of a run go to `target/accuracy.json`; `render_accuracy.py` makes the table of the README from it.
"""

import json
from dataclasses import dataclass
from pathlib import Path

MEASURED = Path(__file__).parents[2] / "target" / "accuracy.json"


@dataclass(frozen=True)
class Gate:
    """A promise: the quantity, what it is measured against, and the largest error allowed."""

    quantity: str
    against: str
    limit: float
    unit: str
    cases_min: int


# In the order of the README's table.
GATES = {
    "earth_attitude": Gate(
        "Earth rotation angle, mean and apparent sidereal time, both celestial matrices, 1900–2100",
        "pyerfa (IAU 2006/2000A)",
        1.0,
        "µas",
        50_000,
    ),
    "earth_example": Gate(
        "celestial matrices of 2007-04-05, each element",
        "IAU SOFA, *Tools for Earth Attitude*, worked example",
        1e-14,
        "",
        2,
    ),
    "orientation": Gate(
        "UT1, pole and celestial offsets read from the packaged tables, as an angle on the sky",
        "astropy.utils.iers at the tables' own dates",
        0.1,
        "µas",
        10_000,
    ),
    "place_series": Gate(
        "topocentric place of stars with proper motion, parallax and radial velocity, Sun beyond 5°",
        "pyerfa `apco`, `atciq`, `atioq`, its own Earth series",
        5.0,
        "µas",
        100_000,
    ),
    "place_de440": Gate(
        "the same",
        "pyerfa fed with the Earth of DE440",
        2.0,
        "µas",
        100_000,
    ),
    "bodies_sun_moon": Gate(
        "topocentric direction of Sun and Moon, 1960–2099",
        "DE440 read with jplephem, light time and aberration by pyerfa",
        1.0,
        "mas",
        4_000,
    ),
    "bodies_planets": Gate("the same, Mercury to Neptune", "the same", 5.0, "mas", 14_000),
    "kernel_states": Gate(
        "states of ten bodies from a kernel, 1585–2351, relative to their length",
        "jplephem reading the same DE440",
        1e-13,
        "",
        200_000,
    ),
    "kernel_astropy": Gate(
        "topocentric places of Moon and planets from a kernel, beyond 3° from the Sun",
        "astropy with the same DE440",
        5.0,
        "mas",
        100,
    ),
    "star_events": Gate(
        "rise, transit and set of stars, where the altitude changes faster than 3″/s",
        "brute-force root on pyerfa",
        1.0,
        "ms",
        1_000,
    ),
    "star_events_stated": Gate(
        "the same everywhere, as a fraction of the error stated with each event",
        "brute-force root on pyerfa",
        1.0,
        "",
        1_000,
    ),
    "body_events": Gate(
        "rise, transit and set of the Moon and planets",
        "brute-force root on pyerfa and DE440",
        20.0,
        "ms",
        200,
    ),
    "almanac_events": Gate(
        "sunset, twilights, sunrise, moonrise, moonset",
        "brute-force root on pyerfa and DE440, same definition",
        20.0,
        "ms",
        500,
    ),
    "published_times": Gate(
        "sunrise and sunset",
        "published almanac times, printed to the minute",
        30.0,
        "s",
        5,
    ),
    "window_edges": Gate(
        "edges of observing windows of stars",
        "brute force on pyerfa and DE440, all limits each 10 s, edges bisected",
        20.0,
        "ms",
        500,
    ),
    "grid_hours": Gate(
        "hours of a target's night in a grid, stars grazing and circumpolar, polar day and night among them",
        "the sum of the exact windows of that night",
        1.0,
        "s",
        100_000,
    ),
    "refraction": Gate(
        "refraction to zenith distance 80°",
        "ray trace of Hohenkerk & Sinclair (1985)",
        0.1,
        "″",
        10,
    ),
    "refraction_horizon": Gate(
        "refraction at the horizon",
        "Pulkovo refraction tables (1985)",
        0.1,
        "′",
        1,
    ),
}


class Figures:
    """The figures of one run of the tests."""

    def __init__(self):
        self.rows = {}

    def hold(self, key, worst, cases):
        """Keep the worst case of `cases`, then fail where it is beyond the gate or where too little ran."""
        gate, worst, cases = GATES[key], float(worst), int(cases)
        self.rows[key] = {"worst": worst, "cases": cases}
        assert cases >= gate.cases_min, f"{key}: only {cases} cases, {gate.cases_min} wanted"
        assert worst <= gate.limit, f"{key}: worst of {cases} is {worst:.4g} {gate.unit}, gate {gate.limit:g}"

    def save(self):
        """Write the figures; rows of an earlier run stay where this run did not measure them."""
        rows = (json.loads(MEASURED.read_text()) if MEASURED.exists() else {}) | self.rows
        MEASURED.parent.mkdir(exist_ok=True)
        scratch = MEASURED.with_suffix(".part")
        scratch.write_text(json.dumps({key: rows[key] for key in GATES if key in rows}, indent=1) + "\n")
        scratch.replace(MEASURED)
