"""The declarations of the limits: each key once, with its unit, range, default and meaning.

Checking, messages, help, the plan file and what the engine is handed all follow from them.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from types import MappingProxyType
from typing import Literal

import numpy as np

from . import _engine

__all__ = ["LIMITS", "Limit"]

Kind = Literal["number", "word", "switch", "pairs", "pair", "intervals"]


@dataclass(frozen=True, slots=True)
class Limit:
    """The declaration of one limit."""

    key: str
    """The keyword, which ends in its unit."""
    meaning: str
    """What holds while the limit is kept."""
    unit: str = ""
    """Unit of the value, as astropy spells it; empty for a pure number or a word."""
    low: float = -np.inf
    high: float = np.inf
    """The range of allowed values, both ends included."""
    default: float | str | bool | None = None
    """The value when nothing is said; None is off."""
    words: Mapping[str, float] = field(default_factory=dict)
    """Words that stand for a value."""
    choices: tuple[str, ...] = ()
    """The allowed words, for a limit that is a choice and not a number."""
    at_most: str = ""
    """The key of the limit that this one must not exceed."""
    kind: Kind = "number"
    """What the value is: a number (or a column of them, one a target), a word, true or false, pairs of
    numbers, one pair, or intervals of UTC."""
    together: tuple[str, ...] = ()
    """The keys that must be given with this one."""
    apart: tuple[str, ...] = ()
    """The keys that must not be given with this one."""
    reason: str = ""
    """The word by which results name it, of `REASON_WORDS`; empty for what only qualifies other limits."""
    note: str = ""
    """Convention and source, where the meaning alone does not say them."""

    @property
    def by_target(self) -> bool:
        """Whether it may be a column with one value per target."""
        return self.kind == "number" and self.key != "moon_relaxed_below_deg"

    def allowed(self) -> str:
        """What may be given, in words."""
        unit = f" {self.unit}" if self.unit else ""
        off = "" if self.kind in ("word", "switch") else ", or None (off)"
        if self.kind == "word":
            return ", ".join(self.choices)
        if self.kind == "switch":
            return "True or False"
        if self.kind == "intervals":
            return f"pairs of UTC instants, each a start before its stop{off}"
        if self.kind == "pairs":
            return f"pairs [from, to] of different numbers from {self.low:g} to {self.high:g}{unit}{off}"
        if self.kind == "pair":
            return f"a pair [low, high] from {self.low:g} to {self.high:g}{unit}, low below high{off}"
        named = "".join(f", or {word!r} ({value:g})" for word, value in self.words.items())
        return f"{self.low:.9g} to {self.high:.9g}{unit}{off}{named}"


_LORENTZIAN = ("moon_avoidance_separation_deg", "moon_avoidance_width_d")
_BY_LIGHT = ("moon_avoidance_dark_deg", "moon_avoidance_bright_deg")
_PHASE = ("phase_epoch_jd", "phase_period_d", "phase_half_width_d")

_ALL = (
    Limit(
        "altitude_min_deg",
        "observed altitude of the target is at least this",
        unit="deg",
        low=-5.0,
        high=90.0,
        default=30.0,
        at_most="altitude_max_deg",
        reason="altitude_min",
    ),
    Limit(
        "altitude_max_deg",
        "observed altitude of the target is at most this",
        unit="deg",
        low=-5.0,
        high=90.0,
        reason="altitude_max",
    ),
    Limit("airmass_max", "airmass of the target is at most this", low=1.0, high=40.0, reason="airmass_max"),
    Limit(
        "airmass_model",
        "formula by which altitude becomes airmass",
        default="kasten_young_1989",
        choices=tuple(_engine.airmass_model_words()),
        kind="word",
    ),
    Limit(
        "skyline",
        "the target stands at or above the skyline of the site, if the site has one",
        default=True,
        kind="switch",
        reason="skyline",
        note="The observed altitude is compared; between the skyline's points run straight lines, through "
        "north too, and two points at one azimuth are a step.",
    ),
    Limit(
        "declination_min_deg",
        "declination of the target is at least this",
        unit="deg",
        low=-90.0,
        high=90.0,
        at_most="declination_max_deg",
        reason="declination",
        note="Topocentric, of date, about the terrestrial pole, as a mount's axis sees it: polar motion "
        "sets it up to 0.6 arcsec off the declination of `place`.",
    ),
    Limit(
        "declination_max_deg",
        "declination of the target is at most this",
        unit="deg",
        low=-90.0,
        high=90.0,
        reason="declination",
    ),
    Limit(
        "hour_angle_min_h",
        "hour angle of the target is at least this, east negative",
        unit="hourangle",
        low=-12.0,
        high=12.0,
        at_most="hour_angle_max_h",
        reason="hour_angle",
        note="Topocentric; for an equatorial mount.",
    ),
    Limit(
        "hour_angle_max_h",
        "hour angle of the target is at most this, west positive",
        unit="hourangle",
        low=-12.0,
        high=12.0,
        reason="hour_angle",
    ),
    Limit(
        "azimuth_sectors_deg",
        "azimuth of the target is in one of the sectors",
        unit="deg",
        low=0.0,
        high=360.0,
        kind="pairs",
        reason="azimuth_sectors",
        note="[[from, to], ...], each from its first azimuth through east to its second, so that [300, 60] "
        "runs through north; azimuths from north through east.",
    ),
    Limit(
        "azimuth_rate_max_deg_s",
        "the mount turns in azimuth at this rate at most",
        unit="deg / s",
        low=1e-4,
        high=50.0,
        reason="azimuth_rate",
        note="The keyhole of an altazimuth mount at the zenith: dA/dt = w (sin lat - cos lat cos A tan alt), "
        "w = 15.04 arcsec/s; its radius is w cos(lat) / v_max.",
    ),
    Limit(
        "cable_range_deg",
        "azimuth, counted on beyond a turn, stays within the range of the cables",
        unit="deg",
        low=-1440.0,
        high=1440.0,
        kind="pair",
        reason="cable_range",
        note="[low, high], north 0, through east. A window ends where the branch that lasts longest from its "
        "beginning runs out.",
    ),
    Limit(
        "sun_altitude_max_deg",
        "topocentric altitude of the Sun's centre is at most this",
        unit="deg",
        low=-90.0,
        high=90.0,
        default=-18.0,
        words={"civil": -6.0, "nautical": -12.0, "astronomical": -18.0},
        reason="sun_altitude_max",
    ),
    Limit(
        "sun_separation_min_deg",
        "angle from the target to the Sun's centre is at least this",
        unit="deg",
        low=0.0,
        high=180.0,
        default=30.0,
        reason="sun_separation_min",
    ),
    Limit(
        "moon_separation_min_deg",
        "angle from the target to the Moon's centre is at least this",
        unit="deg",
        low=0.0,
        high=180.0,
        reason="moon_separation_min",
    ),
    Limit(
        "moon_avoidance_separation_deg",
        "angle to the Moon is at least D / (1 + ((age - full) / W)^2), with this D at full Moon",
        unit="deg",
        low=0.0,
        high=180.0,
        together=_LORENTZIAN,
        apart=_BY_LIGHT,
        reason="moon_avoidance",
        note="A Lorentzian in the Moon's age, of which full Moon is half of 29.53 d; the age is counted in "
        "the Moon's elongation in longitude (common practice, no source).",
    ),
    Limit(
        "moon_avoidance_width_d",
        "W of the Lorentzian: so many days from full Moon the angle asked for is half of D",
        unit="d",
        low=0.1,
        high=15.0,
        together=_LORENTZIAN,
        reason="moon_avoidance",
    ),
    Limit(
        "moon_avoidance_dark_deg",
        "angle to the Moon is at least this at new Moon, and rises with its illuminated fraction",
        unit="deg",
        low=0.0,
        high=180.0,
        together=_BY_LIGHT,
        apart=_LORENTZIAN,
        reason="moon_avoidance",
        note="dark + (bright - dark) k, linear in the illuminated fraction k.",
    ),
    Limit(
        "moon_avoidance_bright_deg",
        "angle to the Moon is at least this at full Moon",
        unit="deg",
        low=0.0,
        high=180.0,
        together=_BY_LIGHT,
        reason="moon_avoidance",
    ),
    Limit(
        "moon_relaxed_below_deg",
        "angles to the Moon ask for nothing while its centre stands below this",
        unit="deg",
        low=-90.0,
        high=90.0,
        note="Topocentric altitude of the Moon's centre, no refraction; 0 is the horizon.",
    ),
    Limit(
        "moon_altitude_max_deg",
        "topocentric altitude of the Moon's centre is at most this",
        unit="deg",
        low=-90.0,
        high=90.0,
        reason="moon_altitude_max",
    ),
    Limit(
        "moon_illumination_max",
        "illuminated fraction of the Moon is at most this",
        low=0.0,
        high=1.0,
        reason="moon_illumination_max",
    ),
    Limit(
        "sky_brightness_min_mag_arcsec2",
        "the sky at the target is at least so dark, V magnitudes a square arcsecond",
        unit="mag / arcsec2",
        low=0.0,
        high=30.0,
        reason="sky_brightness",
        note="Moonlight after Krisciunas & Schaefer 1991, PASP 103, 1033, good to 0.1 to 0.25 mag; twilight "
        "is not in it. Extinction and dark sky are the site's.",
    ),
    Limit(
        "allowed_intervals",
        "the instant is in one of the intervals of UTC, [start, stop)",
        kind="intervals",
        reason="allowed_intervals",
    ),
    Limit(
        "phase_epoch_jd",
        "the instant is within the half width of T0 + n P, with this T0",
        unit="d",
        low=2_300_001.0,
        high=2_600_000.0,
        together=_PHASE,
        reason="phase",
        note="Julian Date on the clock of phase_scale; the light time to the target's direction is applied.",
    ),
    Limit(
        "phase_period_d",
        "P, days of the same clock",
        unit="d",
        low=1e-4,
        high=1e6,
        together=_PHASE,
        reason="phase",
    ),
    Limit(
        "phase_half_width_d",
        "half the width of each phase window, days, below half the period",
        unit="d",
        low=0.0,
        high=5e5,
        together=_PHASE,
        reason="phase",
    ),
    Limit(
        "phase_scale",
        "clock of the phase: bjd_tdb (barycentre, TDB) or hjd_utc (Sun's centre, UTC)",
        default="bjd_tdb",
        choices=tuple(_engine.phase_scale_words()),
        kind="word",
    ),
    Limit(
        "window_min_s",
        "a window lasts at least this",
        unit="s",
        low=0.0,
        high=86_400.0,
        reason="window_min",
    ),
)

LIMITS: Mapping[str, Limit] = MappingProxyType({limit.key: limit for limit in _ALL})
"""Every limit by its key."""
