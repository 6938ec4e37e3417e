"""A season: who is never observable, what the nights offer, when the seasons begin and end."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import numpy as np

from ._text import aligned, called, count, rows_line

if TYPE_CHECKING:
    import pyarrow as pa

#: Names of targets without a night that are shown.
EXAMPLES = 5
#: Nights in a row without use, from which a target's season counts as cut in two by the span.
_LONG_GAP = 30


def year_report(site: Any, summary: Any, season: pa.Table, dark_hours: np.ndarray, targets: Any) -> str:
    """The season as a page of text. `season`: the table of its result file, a row a target."""
    night = summary.night
    lines = [
        called(site),
        f"{count(len(night), 'night')}, evenings of {night[0]} to {night[-1]}, each local mean noon to noon",
        "",
        rows_line(targets),
        *_observable(summary, season),
        "",
        *_months(summary, dark_hours),
    ]
    return "\n".join(lines)


def _observable(summary: Any, season: pa.Table) -> list[str]:
    never = summary.never
    useful = summary.useful_nights
    lines = [f"{count(int(np.count_nonzero(useful)), 'target')} observable on some night"]
    if len(never):
        named = ", ".join(season["name"][int(i)].as_py() or "?" for i in never[:EXAMPLES])
        more = ", …" if len(never) > EXAMPLES else ""
        lines.append(f"{count(len(never), 'target')} never observable: {named}{more}")
    some = useful > 0
    if some.any():
        hours, nights = summary.hours[some], useful[some]
        lines.append(
            f"The median observable target has {np.median(hours):,.0f} h on {np.median(nights):,.0f} nights; "
            f"all together {hours.sum():,.0f} h"
        )
    cut = int(np.count_nonzero(summary.longest_gap >= _LONG_GAP))
    if cut:
        have = "has" if cut == 1 else "have"
        lines.append(
            f"{count(cut, 'target')} {have} {_LONG_GAP} nights and more without use between the first and "
            "the last useful one: the span cuts their season in two"
        )
    return lines


def _months(summary: Any, dark_hours: np.ndarray) -> list[str]:
    """Hours per night, month by month."""
    month = summary.night.astype("datetime64[M]")
    rows = [["month", "nights", "dark h", "targets with hours", "hours a night"]]
    for each in np.unique(month):
        here = month == each
        rows.append(
            [
                str(each),
                str(int(here.sum())),
                f"{dark_hours[here].mean():.2f}",
                f"{summary.useful_targets[here].mean():,.0f}",
                f"{summary.night_hours[here].mean():,.0f}",
            ]
        )
    head = "A night in the mean of each month; dark: the limits on the sky alone hold:"
    return [head, *aligned(rows, [False, True, True, True, True])]
