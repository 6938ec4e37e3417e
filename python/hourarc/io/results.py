"""Results as the tables that go to files: the columns of the result objects, joined with the targets' names.

The columns are those of `hourarc.results.COLUMNS`, by the same names and with the same units, UCDs and
meanings; a file only adds what joins it to its source (`row`, `name`) and what a reader would otherwise
work out (`duration_s`).
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import numpy as np

from ..results import COLUMNS, FIRST_BAD_STATUS, Column

if TYPE_CHECKING:
    import pyarrow as pa

    from .targets import Targets

_ADDED = {
    "row": Column("", "meta.record", "row of the target in its source file, from 1"),
    "duration_s": Column("s", "time.duration;obs", "stop minus start"),
}

#: Decimals in text files: far below the error of the number, so nothing is lost. Others are written in full.
DECIMALS = {
    "duration_s": 6,
    "best_airmass": 6,
    "moon_age_d": 6,
    "moon_illuminated_fraction": 6,
    "dark_hours": 6,
    "dark_hours_moonless": 6,
    # A microarcsecond is 3e-10 degrees.
    "altitude_deg": 10,
    "azimuth_deg": 10,
    "hour_angle_deg": 10,
    "declination_deg": 10,
    "parallactic_angle_deg": 10,
    "moon_separation_deg": 10,
    "sun_separation_deg": 10,
    "airmass": 6,
    "sky_brightness_mag_arcsec2": 6,
    "start_error_s": 6,
    "stop_error_s": 6,
    "start_scatter_s": 3,
    "stop_scatter_s": 3,
    "phase_angle_deg": 10,
    "elongation_deg": 10,
    "motion_position_angle_deg": 6,
    "bright_limb_position_angle_deg": 6,
    "magnitude_v": 3,
    "rate_arcsec_min": 6,
    "illuminated_fraction": 6,
    "angular_diameter_arcsec": 4,
    "distance_au": 12,
    "heliocentric_distance_au": 12,
}


def windows_table(windows: Any, targets: Targets, first: int = 0) -> pa.Table:
    """A row a window, by target and time. `first`: the place among `targets` of the result's first target."""
    import pyarrow as pa

    table = windows.to_arrow()
    owner = first + np.asarray(windows.target)
    duration = (np.asarray(windows.stop) - np.asarray(windows.start)) / np.timedelta64(1, "s")
    columns = {
        "row": pa.array(targets.row[owner]),
        "name": targets.name.take(pa.array(owner)),
        "start": table["start"],
        "stop": table["stop"],
        "duration_s": pa.array(duration, pa.float64()),
        "start_reason": table["start_reason"],
        "stop_reason": table["stop_reason"],
        "best_time": table["best_time"],
        "best_airmass": table["best_airmass"],
        **{
            name: table[name]
            for name in (
                "start_error_s",
                "stop_error_s",
                "start_scatter_s",
                "stop_scatter_s",
                "may_not_happen",
            )
        },
    }
    return _table(columns)


def requests_table(demand: Any, targets: Targets) -> pa.Table:
    """A row a target: what it asks for, and what it has."""
    import pyarrow as pa

    return _table(
        {
            "row": pa.array(targets.row),
            "name": targets.name,
            "requested_hours": pa.array(demand.requested_hours),
            "available_hours": pa.array(demand.available_hours),
        }
    )


def explanation_table(explanation: Any, targets: Targets, index: int) -> pa.Table:
    """A row an interval in which a limit holds, alone or with those above it."""
    import pyarrow as pa

    table = explanation.to_arrow()
    count = table.num_rows
    return _table(
        {
            "row": pa.array(np.full(count, targets.row[index])),
            "name": pa.array([targets.name[index].as_py()] * count, pa.string()),
            **{name: table[name] for name in ("limit", "alone", "start", "stop")},
        }
    )


def blocked_table(windows: Any, targets: Targets, first: int = 0) -> pa.Table:
    """A row a target without a window, with what blocks it. Bad rows are rejected, not blocked."""
    import pyarrow as pa

    without = np.flatnonzero((windows.counts == 0) & (windows.status < FIRST_BAD_STATUS))
    owner = pa.array(first + without)
    table = windows.targets_to_arrow().take(pa.array(without))
    return _table(
        {
            "row": pa.array(targets.row).take(owner),
            "name": targets.name.take(owner),
            "blocked_by": table["blocked_by"],
            "status": table["status"],
        }
    )


def season_table(summary: Any, targets: Targets) -> pa.Table:
    """A row a target: its first and last useful night, how many, their hours. No target is a bad row."""
    import pyarrow as pa

    table = summary.to_arrow()
    names = ("first_night", "last_night", "useful_nights", "longest_gap", "hours", "status")
    return _table(
        {"row": pa.array(targets.row), "name": targets.name} | {name: table[name] for name in names}
    )


def places_table(places: Any, targets: Targets) -> pa.Table:
    """A row a target with its place, every column of `place`. Rows without a place go to `targets.rejected`.

    `places` has one place a target: of one instant, or pairwise.
    """
    import pyarrow as pa

    bad = places.status >= FIRST_BAD_STATUS
    table = places.to_arrow().filter(pa.array(~bad))
    targets.reject(bad, places.status_words)
    names = ("time", *places.columns, "status")
    return _table(
        {"row": pa.array(targets.row), "name": targets.name} | {name: table[name] for name in names}
    )


def _table(columns: dict[str, Any]) -> pa.Table:
    import pyarrow as pa

    fields = []
    for name, values in columns.items():
        about = (_ADDED.get(name) or COLUMNS[name])._asdict()
        fields.append(
            pa.field(name, values.type, metadata={key: text for key, text in about.items() if text})
        )
    return pa.table(list(columns.values()), schema=pa.schema(fields))
