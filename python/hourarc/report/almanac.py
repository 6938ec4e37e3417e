"""The almanac as a table: a line a night."""

from __future__ import annotations

from typing import Any

import numpy as np

from ._text import NEVER, aligned, called, clock

_TIMES = (
    ("sunset", "sunset"),
    ("dusk_civil", "-6°"),
    ("dusk_nautical", "-12°"),
    ("dusk_astronomical", "-18°"),
    ("dawn_astronomical", "-18°"),
    ("dawn_nautical", "-12°"),
    ("dawn_civil", "-6°"),
    ("sunrise", "sunrise"),
    ("moonrise", "moonrise"),
    ("moonset", "moonset"),
)


def almanac_report(site: Any, almanac: Any) -> str:
    """Sun and Moon of each night, instants in UTC to the nearest minute."""
    nights = np.asarray(almanac.night).astype("datetime64[D]")
    header = ["evening", *(f"{label} " for _, label in _TIMES), "age d", "lit %", "dark h", "moonless h"]
    rows = [header]
    for i, night in enumerate(nights):
        row = [str(night), *(clock(getattr(almanac, name)[i], night) for name, _ in _TIMES)]
        row.append(_number(almanac.moon_age_d[i], 1))
        row.append(_number(100.0 * almanac.moon_illuminated_fraction[i], 0))
        row.append(_number(almanac.dark_hours[i], 2))
        row.append(_number(almanac.dark_hours_moonless[i], 2))
        rows.append(row)
    lines = [
        called(site),
        "All times are UTC, to the nearest minute; + is the day after the evening's date, - the day before.",
        "-6°, -12°, -18°: the Sun's centre passes this altitude, first at dusk, then at dawn. "
        f"{NEVER}: does not happen that night.",
        "Moon's age and lit part: at local mean midnight. Dark: Sun below -18°; moonless: and no Moon up.",
        "",
        *aligned(rows, [False] + [True] * (len(header) - 1), indent=""),
    ]
    notes = _notes(almanac, nights)
    return "\n".join(lines + notes)


def _notes(almanac: Any, nights: np.ndarray) -> list[str]:
    """A line for each status other than "ok", with how many nights have it."""
    words = np.asarray(almanac.status_words)
    lines = []
    for word in dict.fromkeys(words.tolist()):
        if word != "ok":
            which = np.flatnonzero(words == word)
            lines.append(f"{word}: {len(which):,} of {len(nights):,} nights, from {nights[which[0]]}")
    return ["", *lines] if lines else []


def _number(value: float, places: int) -> str:
    return f"{value:.{places}f}" if np.isfinite(value) else NEVER
