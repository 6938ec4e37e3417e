"""Brute-force windows: every limit evaluated each few seconds, the edges closed by bisection.

A limit is a margin, a function of the targets' local directions that is positive where observing is allowed.
"""

from dataclasses import dataclass

import numpy as np

from . import roots
from .place import Sky, local_grid, local_pairs, separation


@dataclass(frozen=True)
class Margins:
    """The limits in force; angles in degrees, altitudes topocentric. None: no such limit."""

    altitude_min_deg: object = None
    altitude_max_deg: object = None
    sun_altitude_max_deg: object = None
    sun_separation_min_deg: object = None
    moon_separation_min_deg: object = None
    moon_altitude_max_deg: object = None

    def evaluate(self, sky, local, columns):
        """{name: margin in degrees} of the shape of `local.altitude`; `columns` picks per-target limits."""

        def limit(value):
            return value if np.ndim(value) == 0 else np.asarray(value)[columns]

        out = {}
        pairwise = local.altitude.ndim == 1
        expand = (lambda x: x) if pairwise else (lambda x: x[:, np.newaxis])
        altitude = np.degrees(local.altitude)
        if self.altitude_min_deg is not None:
            out["altitude_min"] = altitude - limit(self.altitude_min_deg)
        if self.altitude_max_deg is not None:
            out["altitude_max"] = limit(self.altitude_max_deg) - altitude
        for body in ("sun", "moon"):
            top = getattr(self, f"{body}_altitude_max_deg")
            least = getattr(self, f"{body}_separation_min_deg")
            if top is None and least is None:
                continue
            there = sky.body(body)
            if top is not None:
                out[f"{body}_altitude_max"] = limit(top) - expand(np.degrees(there.altitude))
            if least is not None:
                vector = there.vector if pairwise else there.vector[:, np.newaxis, :]
                out[f"{body}_separation_min"] = np.degrees(separation(local.vector, vector)) - limit(least)
        return {name: np.broadcast_to(value, local.altitude.shape) for name, value in out.items()}


@dataclass(frozen=True)
class Window:
    """One window, with the limit at either edge (`span` where the span itself is the edge)."""

    target: int
    start_ns: int
    stop_ns: int
    start_reason: str
    stop_reason: str


def windows(observer, pole, targets, start_ns, stop_ns, margins, *, step_s=10.0, feed="de440"):
    """All windows of `Stars` or body names of at least one sample, by target and start; edges to 64 ns."""
    times = roots.grid_times(start_ns, stop_ns, step_s)
    sky = Sky(observer, times, pole, feed=feed)
    values = margins.evaluate(sky, local_grid(sky, targets), slice(None))
    names = list(values)
    stack = np.stack([values[name] for name in names])
    least = stack.min(axis=0)

    def pairs(t, column):
        return _at(observer, pole, targets, margins, names, t, column, feed).min(axis=0)

    root, column, direction = roots.sign_changes(None, pairs, times, values=least)
    # The limit at an edge is the one that fails just outside it.
    outside = root - direction * 1_000_000
    fails = (
        _at(observer, pole, targets, margins, names, outside, column, feed) if len(root) else np.empty((1, 0))
    )
    reason = np.array(names, dtype=object)[np.argmin(fails, axis=0)] if len(root) else []
    found = []
    for target in range(len(targets)):
        mine = np.nonzero(column == target)[0]
        begin = (int(start_ns), "span") if least[0, target] > 0.0 else None
        for i in mine:
            if direction[i] > 0:
                begin = (int(root[i]), reason[i])
            elif begin is not None:
                found.append(Window(target, begin[0], int(root[i]), begin[1], reason[i]))
                begin = None
        if begin is not None:
            found.append(Window(target, begin[0], int(stop_ns), begin[1], "span"))
    return found


def _at(observer, pole, targets, margins, names, times, column, feed):
    sky = Sky(observer, times, pole, feed=feed)
    values = margins.evaluate(sky, local_pairs(sky, targets, column), column)
    return np.stack([values[name] for name in names])
