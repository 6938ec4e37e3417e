"""One planned night: its Sun and Moon, who has windows, what blocks the others, the best placed."""

from __future__ import annotations

import datetime
from typing import TYPE_CHECKING, Any

import numpy as np

from ._text import NEVER, aligned, called, count, date_and_clock, extrapolated, hours, rows_line

if TYPE_CHECKING:
    import pyarrow as pa

#: How many examples are shown.
EXAMPLES = 5


def night_report(
    site: Any,
    night: datetime.date,
    almanac: Any,
    windows: pa.Table,
    blocked: pa.Table,
    targets: Any,
    earth: Any,
) -> str:
    """The night as a page of text.

    `almanac` has this one night; the tables are those of the result files; `earth` is the Earth's orientation
    at the end of the night.
    """
    lines = [
        called(site),
        f"Night of {night}, local mean noon to noon: {date_and_clock(almanac.start[0])} "
        f"to {date_and_clock(almanac.stop[0])}. All times are UTC.",
        "",
        *_sky(almanac),
        *([extrapolated(earth.ut1_error_s)] if earth.quality_words == "extrapolated" else []),
        "",
        rows_line(targets),
        *_with_windows(windows),
        *_without_windows(blocked),
        *_best_placed(windows),
    ]
    return "\n".join(lines)


def _sky(almanac: Any) -> list[str]:
    at = {
        name: date_and_clock(getattr(almanac, name)[0])
        for name in (
            "sunset",
            "dusk_civil",
            "dusk_nautical",
            "dusk_astronomical",
            "dawn_astronomical",
            "dawn_nautical",
            "dawn_civil",
            "sunrise",
            "moonrise",
            "moonset",
        )
    }
    rows = [
        ["", "sunset", "-6°", "-12°", "-18°"],
        ["Sun, evening", at["sunset"], at["dusk_civil"], at["dusk_nautical"], at["dusk_astronomical"]],
        ["", "-18°", "-12°", "-6°", "sunrise"],
        ["Sun, morning", at["dawn_astronomical"], at["dawn_nautical"], at["dawn_civil"], at["sunrise"]],
    ]
    age, lit = float(almanac.moon_age_d[0]), 100.0 * float(almanac.moon_illuminated_fraction[0])
    rises = "does not rise" if at["moonrise"] == NEVER else f"rises {at['moonrise']}"
    sets = "does not set" if at["moonset"] == NEVER else f"sets {at['moonset']}"
    moon = f"  Moon          {rises}, {sets}"
    moon += f"; {age:.1f} days old, {lit:.0f} % lit at midnight" if np.isfinite(age) else ""
    dark = f"  Dark          {hours(float(almanac.dark_hours[0]))} with the Sun below -18°, "
    dark += f"{hours(float(almanac.dark_hours_moonless[0]))} of them without the Moon"
    return [*aligned(rows, [False] * 5), moon, dark]


def _with_windows(windows: pa.Table) -> list[str]:
    if not windows.num_rows:
        return ["No target has a window"]
    target, duration = _target(windows), windows["duration_s"].to_numpy() / 3600.0
    starts = np.flatnonzero(np.diff(target, prepend=target[0] - 1))
    per_target = np.add.reduceat(duration, starts)
    have = "target has" if len(starts) == 1 else "targets have"
    median, longest, total = np.median(per_target), per_target.max(), per_target.sum()
    return [
        f"{len(starts):,} {have} {count(windows.num_rows, 'window')}: {median:.2f} h for the median target, "
        f"{longest:.2f} h for the longest, {total:,.0f} h in all"
    ]


def _without_windows(blocked: pa.Table) -> list[str]:
    if not blocked.num_rows:
        return []
    counted = blocked["blocked_by"].value_counts().to_pylist()
    counted.sort(key=lambda entry: (-entry["counts"], entry["values"]))
    head = f"{count(blocked.num_rows, 'target')} without a window, by what blocks them:"
    return [
        head,
        *aligned([[f"{c['counts']:,}", c["values"]] for c in counted], [True, False], indent="    "),
    ]


def _best_placed(windows: pa.Table) -> list[str]:
    """The targets that climb highest, the longer window first among equals."""
    if not windows.num_rows:
        return []
    airmass = np.round(windows["best_airmass"].to_numpy(), 3)
    order = np.lexsort((-windows["duration_s"].to_numpy(), np.where(np.isfinite(airmass), airmass, np.inf)))
    # One line a target, in the order of the list of windows.
    _, first = np.unique(_target(windows)[order], return_index=True)
    rows = [["name", "airmass", "at", "from", "until", "hours", "opens", "closes"]]
    for i in order[np.sort(first)][:EXAMPLES]:
        one = {
            name: windows[name][int(i)].as_py()
            for name in ("name", "best_airmass", "duration_s", "start_reason", "stop_reason")
        }
        at = {name: _clock(windows, name, int(i)) for name in ("best_time", "start", "stop")}
        rows.append(
            [
                one["name"],
                f"{one['best_airmass']:.3f}"
                if one["best_airmass"] is not None and np.isfinite(one["best_airmass"])
                else NEVER,
                at["best_time"],
                at["start"],
                at["stop"],
                f"{one['duration_s'] / 3600.0:.2f}",
                one["start_reason"],
                one["stop_reason"],
            ]
        )
    right = [False, True, False, False, False, True, False, False]
    return ["", "Best placed:", *aligned(rows, right, indent="    ")]


def _target(windows: pa.Table) -> np.ndarray:
    """A number for the target of each window: rows of several lists may have the same."""
    row: np.ndarray = windows["row"].to_numpy()
    if "source" not in windows.column_names:
        return row
    _, source = np.unique(windows["source"].to_numpy(), return_inverse=True)
    _, number = np.unique(np.stack([source, row]), axis=1, return_inverse=True)
    return number.reshape(-1)


def _clock(windows: pa.Table, name: str, index: int) -> str:
    value = windows[name][index]
    return date_and_clock(np.datetime64(value.value, "ns")) if value.is_valid else NEVER
