"""The small forms that all reports share: instants to the minute, places, aligned columns."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np

#: What stands where an event does not happen.
NEVER = "--"


def minute(time: Any) -> np.datetime64:
    """The instant rounded to the nearest minute, as almanacs print it."""
    shifted: np.datetime64 = (np.datetime64(time, "ns") + np.timedelta64(30, "s")).astype("datetime64[m]")
    return shifted


def date_and_clock(time: Any) -> str:
    """An instant as "03-10 18:02", UTC."""
    return NEVER if np.isnat(time) else str(minute(time))[5:].replace("T", " ")


def clock(time: Any, evening: Any) -> str:
    """An instant as "18:02 " on the evening's date, "04:38+" on the next day, "23:59-" on the day before."""
    if np.isnat(time):
        return NEVER + " "
    rounded = minute(time)
    days = (rounded.astype("datetime64[D]") - np.datetime64(evening, "D")).astype(int)
    return str(rounded)[11:] + {-1: "-", 0: " ", 1: "+"}.get(int(days), "!")


def place(site: Any) -> str:
    """The site's place as "24.5127 deg E, 20.8714 deg S, 1148 m"."""
    longitude = (site.longitude_deg + 180.0) % 360.0 - 180.0
    east = f"{abs(longitude):.4f}° {'E' if longitude >= 0 else 'W'}"
    north = f"{abs(site.latitude_deg):.4f}° {'N' if site.latitude_deg >= 0 else 'S'}"
    return f"{east}, {north}, {site.height_m:.0f} m"


def called(site: Any) -> str:
    """The site by its name, if it has one, and its place."""
    return f"{site.name} ({place(site)})" if site.name else f"Site at {place(site)}"


def hours(value: float) -> str:
    """A span in hours as "3 h 07 min"."""
    if not np.isfinite(value):
        return NEVER
    minutes = round(value * 60.0)
    return f"{minutes // 60} h {minutes % 60:02d} min"


def aligned(
    rows: Sequence[Sequence[str]], right: Sequence[bool], indent: str = "  ", gap: str = "  "
) -> list[str]:
    """Rows of cells as lines, each column as wide as its widest cell."""
    widths = [max(len(row[i]) for row in rows) for i in range(len(right))]
    lines = []
    for row in rows:
        cells = [c.rjust(w) if r else c.ljust(w) for c, w, r in zip(row, widths, right, strict=True)]
        lines.append((indent + gap.join(cells)).rstrip())
    return lines


def count(number: int, noun: str) -> str:
    """ "1 row", "6,000 rows"."""
    return f"{number:,} {noun}" if number == 1 else f"{number:,} {noun}s"


def extrapolated(error_s: float) -> str:
    """That the Earth's rotation is not known for the night or the instant, and what it may cost."""
    return (
        "The rotation of the Earth is extrapolated past its table: UT1, and with it what the stars do, may "
        f"be off by {error_s:.{0 if error_s >= 10.0 else 1}f} s"
    )


def rows_line(targets: Any, done: str = "planned") -> str:
    """What became of the rows: none is lost."""
    return (
        f"{count(targets.rows_read, 'row')} read = {len(targets):,} {done} "
        f"+ {len(targets.rejected):,} rejected"
    )
