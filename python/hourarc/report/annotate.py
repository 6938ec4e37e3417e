"""An annotated archive: its span, how high it was pointed, how near to Moon and Sun, what looks wrong."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import numpy as np

from ._text import aligned, called, count, rows_line

if TYPE_CHECKING:
    import pyarrow as pa

_COLUMNS = (
    ("altitude_deg", "altitude", "°", 1),
    ("airmass", "airmass", "", 3),
    ("moon_separation_deg", "angle to the Moon", "°", 1),
    ("sun_separation_deg", "angle to the Sun", "°", 1),
)


def annotate_report(site: Any, places: pa.Table, exposures: Any) -> str:
    """The archive as a page of text; `places` is the result's table."""
    time = np.sort(np.asarray(exposures.time).astype("datetime64[s]"))
    lines = [called(site), "", rows_line(exposures, "annotated")]
    if not len(time):
        return "\n".join(lines)
    span = [str(instant).replace("T", " ") for instant in (time[0], time[-1])]
    lines += [f"From {span[0]} to {span[1]} UTC", ""]
    rows = [["", "least", "median", "greatest"]]
    for key, label, unit, places_after in _COLUMNS:
        values = places[key].to_numpy()
        values = values[np.isfinite(values)]
        cells = (np.min(values), np.median(values), np.max(values)) if len(values) else ()
        rows.append([label, *(f"{v:.{places_after}f}{unit}" for v in cells)] + ["--"] * (3 - len(cells)))
    lines += aligned(rows, [False, True, True, True])
    below = int((places["altitude_deg"].to_numpy() < 0.0).sum())
    if below:
        were = "was" if below == 1 else "were"
        lines += ["", f"{count(below, 'exposure')} {were} below the horizon: are site, time and place right?"]
    return "\n".join(lines)
