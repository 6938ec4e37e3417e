"""A season's demand: supply and demand by local sidereal time as bars, and who asks for more than there
is."""

from __future__ import annotations

import datetime
import math
from typing import Any

import numpy as np

from ._text import aligned, called, count, rows_line

#: Marks of the longest bar, and examples that are shown.
BAR, EXAMPLES = 40, 5
#: What is asked for and there; there, but not asked for; asked for, but not there.
USED, FREE, MISSING = "█", "░", "▓"


def demand_report(
    site: Any, first: datetime.date, nights: int, made: Any, names: np.ndarray, targets: Any
) -> str:
    """Supply and demand as a page of text. `names`: those of the rows that `made` is of."""
    last = first + datetime.timedelta(days=nights - 1)
    span = f"{count(nights, 'night')}, {first} to {last}" if nights > 1 else f"the night of {first}"
    supply, demand = made.supply_hours, made.demand_hours
    total = f"{demand.sum():,.1f} h of demand, {supply.sum():,.1f} h of supply"
    lines = [
        called(site),
        f"Demand by local mean sidereal time, {span}",
        "",
        rows_line(targets, "counted"),
        f"{total}: {_percent(demand.sum(), supply.sum())} of what the sky has",
        "",
        *_bars(made),
        "",
        f"{USED} asked for, {FREE} to spare, {MISSING} asked for beyond what there is. One mark is "
        f"{_scale(made):.3g} h.",
    ]
    return "\n".join([*lines, *_short(made, names)])


def _bars(made: Any) -> list[str]:
    rows = [["sidereal time", "supply", "demand", "ratio", ""]]
    scale = _scale(made)
    for start, stop, supply, demand in zip(
        made.lst_start_h, made.lst_stop_h, made.supply_hours, made.demand_hours, strict=True
    ):
        there, asked = (round(hours / scale) for hours in (supply, demand))
        bar = USED * min(there, asked) + FREE * (there - asked) + MISSING * (asked - there)
        rows.append(
            [
                f"{_sexagesimal(start)}–{_sexagesimal(stop)}",
                f"{supply:,.1f} h",
                f"{demand:,.1f} h",
                _percent(demand, supply),
                bar,
            ]
        )
    return aligned(rows, [False, True, True, True, False])


def _scale(made: Any) -> float:
    """Hours a mark: 1, 2 or 5, times a power of ten."""
    least = float(max(made.supply_hours.max(), made.demand_hours.max())) / BAR
    if least <= 0.0:
        return 1.0
    power = 10.0 ** math.floor(math.log10(least))
    return next((step * power for step in (1.0, 2.0, 5.0) if step * power >= least), 10.0 * power)


def _percent(demand: float, supply: float) -> str:
    if demand == 0.0:
        return "0 %"
    return f"{100.0 * demand / supply:,.0f} %" if supply > 0.0 else "no supply"


def _sexagesimal(hours: float) -> str:
    minutes = round(hours * 60.0)
    return f"{minutes // 60:02d}:{minutes % 60:02d}"


def _short(made: Any, names: np.ndarray) -> list[str]:
    """The targets that ask for more than they have, those that lack most first."""
    rows = np.flatnonzero(made.short)
    if not len(rows):
        return []
    lack = made.requested_hours[rows] - made.available_hours[rows]
    order = rows[np.argsort(-lack, kind="stable")]
    have = "target asks" if len(rows) == 1 else "targets ask"
    lines = [
        "",
        f"{len(rows):,} {have} for more hours than they have under the limits, {lack.sum():,.1f} h in all:",
    ]
    table = [["name", "asks for", "has"]]
    for i in order[:EXAMPLES]:
        table.append([str(names[i]), f"{made.requested_hours[i]:.2f} h", f"{made.available_hours[i]:.2f} h"])
    if len(rows) > EXAMPLES:
        table.append([f"and {len(rows) - EXAMPLES:,} more", "", ""])
    return [*lines, *aligned(table, [False, True, True], indent="    ")]
