"""One target in one night: the limits as lines of a timeline, then in figures, then the windows."""

from __future__ import annotations

import re
import textwrap
from typing import TYPE_CHECKING, Any

import numpy as np

from ._text import NEVER, aligned, called, hours, minute

if TYPE_CHECKING:
    from ..explain import Explanation

#: Marks of a timeline at most, and the minutes that one may stand for.
MARKS, STEPS_MIN = 64, (5, 10, 15, 20, 30)
#: What a limit leaves; where it alone holds, but not those above it; where it does not hold.
LEFT, ALONE, CLOSED = "━", "─", "·"
#: Where all hold.
OPEN = "█"
#: The Sun up, in twilight, and the night; the Moon up.
DAY, TWILIGHT, NIGHT, MOON = "▒", "░", " ", "○"
#: The width of the words beside a timeline, and how many intervals are written out.
WORDS, SHOWN = 38, 2

_NS_PER_MIN = 60_000_000_000


def explain_report(explanation: Explanation) -> str:
    """The explanation as a page of text."""
    night = explanation.night
    start, stop = (str(minute(t)).replace("T", " ") for t in (night.start[0], night.stop[0]))
    lines = [
        f"{explanation.name}, night of {night.night[0]}, at {called(explanation.site)}",
        f"{start} to {stop}, local mean noon to noon. All times are UTC.",
        "",
    ]
    if not explanation.limits:
        status = explanation.status.replace("_", " ")
        return "\n".join([*lines, f"There is nothing to explain: the target cannot be placed, {status}."])
    return "\n".join(
        [*lines, *_timeline(explanation), "", *_verdict(explanation), "", *_figures(explanation)]
    )


class _Axis:
    """The marks of a timeline: whole steps of UTC from `first`, each judged at its middle."""

    def __init__(self, explanation: Explanation) -> None:
        night = explanation.night
        ends = [night.sunset[0], night.sunrise[0]]
        for window in explanation.windows:
            ends += [window.start, window.stop]
        whole = [night.start[0], night.stop[0]]
        known = [t for t in ends if not np.isnat(t)]
        # Without a sunset or sunrise the whole night is shown.
        first, last = (
            whole if np.isnat(night.sunset[0]) or np.isnat(night.sunrise[0]) else (min(known), max(known))
        )
        hour = np.timedelta64(60, "m")
        from_ = first.astype("datetime64[h]").astype("datetime64[ns]")
        to = (last + hour - np.timedelta64(1, "ns")).astype("datetime64[h]").astype("datetime64[ns]")
        minutes = int((to - from_) / np.timedelta64(1, "m"))
        self.step_min = next((step for step in STEPS_MIN if minutes <= step * MARKS), STEPS_MIN[-1])
        self.edges = from_ + np.arange(minutes // self.step_min + 1) * np.timedelta64(self.step_min, "m")
        self.middles = self.edges[:-1] + np.timedelta64(self.step_min * _NS_PER_MIN // 2, "ns")

    def within(self, intervals: np.ndarray) -> np.ndarray:
        """The marks that intervals cover; one that covers no middle still has the mark in which it begins."""
        inside = np.zeros(len(self.middles), dtype=bool)
        for start, stop in intervals:
            first, last = np.searchsorted(self.middles, [start, stop])
            inside[first:last] = True
            if first == last and start < self.edges[-1] and stop > self.edges[0]:
                inside[max(0, int(np.searchsorted(self.edges, start, side="right")) - 1)] = True
        return inside

    def clocks(self) -> tuple[str, str]:
        """The hours above the timeline, and a tick at each."""
        per_hour = 60 // self.step_min
        count = len(self.middles) // per_hour
        step = max(1, -(-3 // per_hour))
        numbers, ticks = [" "] * (len(self.middles) + 2), [" "] * (len(self.middles) + 1)
        for i in range(0, count + 1, step):
            hour = str(self.edges[i * per_hour])[11:13]
            numbers[i * per_hour : i * per_hour + 2] = hour
            ticks[i * per_hour] = "╷"
        return "".join(numbers).rstrip(), "".join(ticks).rstrip()


def _timeline(explanation: Explanation) -> list[str]:
    axis = _Axis(explanation)
    above, ticks = axis.clocks()
    sun, moon, altitude = _sky(explanation, axis)
    blank = " " * (WORDS + 6)
    lines = [f"{blank}{above}", f"{blank}{ticks}"]
    lines += _row("", "Sun", sun, "")
    lines += _row("", "Moon", moon, "")
    lines += _row("", "altitude, tens of degrees", altitude, "")
    lines.append("")
    for number, limit in enumerate(explanation.limits, start=1):
        alone, left = axis.within(limit.alone), axis.within(limit.left)
        marks = np.where(left, LEFT, np.where(alone, ALONE, CLOSED))
        lines += _row(f"{number}", limit.sentence, "".join(marks), "")
    open_ = axis.within(np.array([[w.start, w.stop] for w in explanation.windows]).reshape(-1, 2))
    lines.append("")
    lines += _row("", "all together", "".join(np.where(open_, OPEN, CLOSED)), "")
    key = (
        f"A mark is {axis.step_min} min. {LEFT} it holds, with all above it; {ALONE} it holds, but one above "
        f"does not; {CLOSED} it does not hold."
    )
    return [*lines, "", key, f"Sun: {DAY} up, {TWILIGHT} twilight to -18°. Moon: {MOON} up."]


def _row(number: str, words: str, marks: str, after: str) -> list[str]:
    """A line of the timeline; words that are too long go on below."""
    # A number stays with its unit.
    joined = re.sub(r"(\d) (d|h|min|s|%|mag/″²)(?=\W|$)", "\\1\u00a0\\2", words)
    first, *more = textwrap.wrap(joined, WORDS) or [""]
    lines = [f"{number:>3}  {first:<{WORDS}} {marks}{after}".rstrip()]
    return lines + [f"{'':>3}    {line}" for line in more]


def _sky(explanation: Explanation, axis: _Axis) -> tuple[str, str, str]:
    """Sun, Moon and the target's altitude along the timeline."""
    from ..place import place
    from ..targets import Bodies

    about: dict[str, Any] = {"columns": "altitude_deg", "orientation": explanation.orientation}
    lights = place(explanation.site, Bodies(["sun", "moon"]), axis.middles, **about).altitude_deg
    target = place(explanation.site, explanation.target, axis.middles, **about).altitude_deg[:, 0]
    sun = np.where(lights[:, 0] > -0.83, DAY, np.where(lights[:, 0] > -18.0, TWILIGHT, NIGHT))
    moon = np.where(lights[:, 1] > 0.0, MOON, " ")
    tens = "".join(" " if not a >= 0.0 else f"{int(a // 10)}" for a in target)
    return "".join(sun), "".join(moon), tens


def _verdict(explanation: Explanation) -> list[str]:
    if not explanation.windows:
        number, limit = next(
            (i, limit)
            for i, limit in enumerate(explanation.limits, start=1)
            if limit.reason == explanation.blocked_by
        )
        before = explanation.limits[number - 2].left if number > 1 else None
        if limit.reason == "window_min" and before is not None:
            longest = float(((before[:, 1] - before[:, 0]) / np.timedelta64(3600, "s")).max())
            short = f"is too short, {hours(longest)} at the longest"
            return [f"No window: what is left after limit {number - 1} {short}."]
        lines = [f"No window: nothing is left after limit {number}, {limit.sentence}."]
        if not len(limit.alone):
            lines.append("It does not hold at any time of this night.")
        elif before is not None and len(before):
            held, left = _spell(limit.alone, explanation), _spell(before, explanation)
            lines.append(f"It holds {held}; those above it leave {left}.")
        return lines
    by_reason = {limit.reason: str(i) for i, limit in enumerate(explanation.limits, start=1)}

    def because(reason: str) -> str:
        number = by_reason.get(reason)
        return f"{number} {reason}" if number else reason

    rows = [["from", "until", "length", "opened by", "closed by", "best airmass", "at", "sure to"]]
    for window in explanation.windows:
        errors = (
            window.start_error_s + window.start_scatter_s,
            window.stop_error_s + window.stop_scatter_s,
        )
        airmass = f"{window.best_airmass:.3f}" if np.isfinite(window.best_airmass) else NEVER
        rows.append(
            [
                _clock(window.start, 1),
                _clock(window.stop, 1),
                hours(float((window.stop - window.start) / np.timedelta64(3600, "s"))),
                because(window.start_reason),
                because(window.stop_reason),
                airmass,
                _clock(window.best_time),
                "may not happen" if window.may_not_happen else _seconds(max(errors)),
            ]
        )
    count = len(explanation.windows)
    head = "One window" if count == 1 else f"{count} windows"
    right = [False, False, True, False, False, True, False, True]
    lines = [f"{head}, {hours(explanation.hours)} in all:", *aligned(rows, right)]
    if any(w.start_scatter_s + w.stop_scatter_s > 0.0 for w in explanation.windows):
        lines.append(
            "So near the horizon refraction changes from day to day; its scatter is in what is sure."
        )
    return lines


def _figures(explanation: Explanation) -> list[str]:
    rows = [["", "", "it holds", "", "leaves", ""]]
    for number, limit in enumerate(explanation.limits, start=1):
        rows.append(
            [
                str(number),
                limit.reason,
                hours(limit.hours_alone),
                _spell(limit.alone, explanation),
                hours(limit.hours_left),
                _spell(limit.left, explanation) if len(limit.left) else "nothing",
            ]
        )
    return ["Limit by limit, each with what it and those above it leave:", *aligned(rows, _RIGHT)]


_RIGHT = [True, False, True, False, True, False]


def _spell(intervals: np.ndarray, explanation: Explanation) -> str:
    """Intervals as "18:02–02:51, 03:10–04:00", some of them where there are many."""
    if not len(intervals):
        return "never"
    if intervals[0, 0] <= explanation.night.start[0] and intervals[0, 1] >= explanation.night.stop[0]:
        return "the whole night"
    texts = [f"{_clock(start)}–{_clock(stop)}" for start, stop in intervals[:SHOWN]]
    more = len(intervals) - len(texts)
    return ", ".join(texts) + (f" and {more} more" if more else "")


def _clock(time: Any, seconds: int = 0) -> str:
    """The clock of an instant, to the minute, or to the second: within one night it says the day as well."""
    if np.isnat(time):
        return NEVER
    if not seconds:
        return str(minute(time))[11:16]
    rounded = (np.datetime64(time, "ns") + np.timedelta64(500, "ms")).astype("datetime64[s]")
    return str(rounded)[11:19]


def _seconds(value: float) -> str:
    """An error as "3 ms" or "42 s"."""
    if not np.isfinite(value):
        return NEVER
    return f"{max(1.0, np.ceil(1e3 * value)):.0f} ms" if value < 1.0 else f"{np.ceil(value):.0f} s"
