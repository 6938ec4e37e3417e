"""What limits ask for, in a duty astronomer's words."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

from .limits import Limits

__all__ = ["sentence"]


def sentence(reason: str, limits: Limits) -> str:
    """What the limit behind a reason asks of one target, such as "altitude at least 30°"."""
    return _SENTENCES[reason](limits)


def _angle(value: Any, sign: str = "") -> str:
    return f"{float(value):{sign}.6g}°"


def _range(low: Any, high: Any, name: str, show: Any) -> str:
    if high is None:
        return f"{name} at least {show(low)}"
    if low is None:
        return f"{name} at most {show(high)}"
    return f"{name} {show(low)} to {show(high)}"


def _declination(limits: Limits) -> str:
    low, high = limits["declination_min_deg"], limits["declination_max_deg"]
    return _range(low, high, "declination", lambda value: _angle(value, "+"))


def _hour_angle(limits: Limits) -> str:
    low, high = limits["hour_angle_min_h"], limits["hour_angle_max_h"]
    return _range(low, high, "hour angle", lambda value: f"{float(value):+.4g} h")


def _sectors(limits: Limits) -> str:
    sectors = limits["azimuth_sectors_deg"]
    assert isinstance(sectors, tuple)
    return "azimuth " + " or ".join(f"{start:g}°–{stop:g}°" for start, stop in sectors)


def _moon(limits: Limits, asked: str) -> str:
    relaxed = limits["moon_relaxed_below_deg"]
    return asked if relaxed is None else f"{asked} while the Moon is above {_angle(relaxed)}"


def _avoidance(limits: Limits) -> str:
    full, width = limits["moon_avoidance_separation_deg"], limits["moon_avoidance_width_d"]
    if full is not None:
        return _moon(limits, f"from the Moon {_angle(full)} at full, half of it {width:g} d off")
    dark, bright = limits["moon_avoidance_dark_deg"], limits["moon_avoidance_bright_deg"]
    return _moon(limits, f"from the Moon {_angle(dark)} when dark to {_angle(bright)} when full")


def _intervals(limits: Limits) -> str:
    intervals = limits["allowed_intervals"]
    assert isinstance(intervals, tuple)
    return "in an allowed interval" if len(intervals) > 1 else "in the allowed interval"


def _cables(limits: Limits) -> str:
    cables = limits["cable_range_deg"]
    assert isinstance(cables, tuple)
    (low, high), *_ = cables
    return f"cables {low:g}° to {high:g}°"


def _phase(limits: Limits) -> str:
    half, period = limits["phase_half_width_d"], limits["phase_period_d"]
    return f"phase within {half:.6g} d of T0, each {period:.8g} d"


def _shortest(limits: Limits) -> str:
    seconds = limits["window_min_s"]
    assert isinstance(seconds, float)
    return f"for at least {seconds / 60.0:g} min" if seconds >= 60.0 else f"for at least {seconds:g} s"


_SENTENCES: dict[str, Callable[[Any], str]] = {
    "sun_altitude_max": lambda it: f"Sun at or below {_angle(it['sun_altitude_max_deg'])}",
    "moon_altitude_max": lambda it: f"Moon at or below {_angle(it['moon_altitude_max_deg'])}",
    "moon_illumination_max": lambda it: f"Moon lit to {100.0 * it['moon_illumination_max']:.3g} % at most",
    "allowed_intervals": _intervals,
    "altitude_min": lambda it: f"altitude at least {_angle(it['altitude_min_deg'])}",
    "airmass_max": lambda it: f"airmass at most {it['airmass_max']:g}",
    "altitude_max": lambda it: f"altitude at most {_angle(it['altitude_max_deg'])}",
    "declination": _declination,
    "hour_angle": _hour_angle,
    "azimuth_sectors": _sectors,
    "azimuth_rate": lambda it: f"azimuth turns by at most {it['azimuth_rate_max_deg_s']:g}°/s",
    "skyline": lambda _: "above the skyline",
    "sun_separation_min": lambda it: f"from the Sun at least {_angle(it['sun_separation_min_deg'])}",
    "moon_separation_min": lambda it: _moon(
        it, f"from the Moon at least {_angle(it['moon_separation_min_deg'])}"
    ),
    "moon_avoidance": _avoidance,
    "phase": _phase,
    "sky_brightness": lambda it: f"sky at {it['sky_brightness_min_mag_arcsec2']:g} mag/″² or darker",
    "cable_range": _cables,
    "window_min": _shortest,
}
