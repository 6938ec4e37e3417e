"""One instant: Sun and Moon, how much of the list is up, what stands highest."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import numpy as np

from ._text import aligned, called, count, extrapolated, rows_line

if TYPE_CHECKING:
    import pyarrow as pa

#: How many examples are shown.
EXAMPLES = 5

#: The airmasses at which the list is counted.
_AIRMASSES = (1.2, 1.5, 2.0, 3.0)


def sky_report(site: Any, at: np.datetime64, lights: Any, places: pa.Table, targets: Any, earth: Any) -> str:
    """The instant as a page of text.

    `lights`: the places of Sun and Moon; `places`: the result's table; `earth`: the Earth's orientation.
    """
    lines = [called(site), f"{str(at.astype('datetime64[s]')).replace('T', ' ')} UTC", ""]
    for i, name in enumerate(("Sun", "Moon")):
        altitude, azimuth = float(lights.altitude_deg[i]), float(lights.azimuth_deg[i])
        lines.append(f"  {name:<5} altitude {altitude:+.1f}°, azimuth {azimuth:.1f}°{_light(name, altitude)}")
    if earth.quality_words == "extrapolated":
        lines.append(extrapolated(earth.ut1_error_s))
    altitude, airmass = places["altitude_deg"].to_numpy(), places["airmass"].to_numpy()
    up = int((altitude > 0.0).sum())
    lines += ["", rows_line(targets, "placed"), f"{count(up, 'target')} above the horizon"]
    lines += [f"    {int((airmass <= limit).sum()):,} at airmass {limit:g} or less" for limit in _AIRMASSES]
    return "\n".join([*lines, *_highest(places, altitude)])


def _light(name: str, altitude: float) -> str:
    if name == "Moon":
        return "" if altitude > 0.0 else ", down"
    for limit, word in ((0.0, "day"), (-6.0, "civil twilight"), (-12.0, "nautical twilight")):
        if altitude > limit:
            return f", {word}"
    return ", astronomical twilight" if altitude > -18.0 else ", night"


def _highest(places: pa.Table, altitude: np.ndarray) -> list[str]:
    order = np.argsort(-altitude, kind="stable")[:EXAMPLES]
    order = order[altitude[order] > 0.0]
    if not len(order):
        return []
    rows = [["name", "altitude", "azimuth", "airmass", "hour angle", "to the Moon", "to the Sun"]]
    for i in order.tolist():
        one = {name: places[name][i].as_py() for name in places.column_names}
        rows.append(
            [
                one["name"],
                f"{one['altitude_deg']:.1f}°",
                f"{one['azimuth_deg']:.1f}°",
                f"{one['airmass']:.3f}",
                f"{one['hour_angle_deg'] / 15.0:+.2f} h",
                f"{one['moon_separation_deg']:.1f}°",
                f"{one['sun_separation_deg']:.1f}°",
            ]
        )
    magnitude = places["magnitude_v"].to_numpy()[order]
    if np.isfinite(magnitude).any():
        shown = [f"{value:.1f}" if np.isfinite(value) else "" for value in magnitude]
        rows = [[*row, cell] for row, cell in zip(rows, ["V", *shown], strict=True)]
    return ["", "Highest:", *aligned(rows, [False] + [True] * (len(rows[0]) - 1), indent="    ")]
