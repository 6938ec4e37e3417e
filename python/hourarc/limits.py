"""Limits: what the telescope and the programme allow.

Each limit is declared once, in `LIMITS`: its key, unit, range, default and meaning. Checking, messages,
help, `repr` and what the engine is handed all follow from the declaration.
"""

from __future__ import annotations

import inspect
import warnings
from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field
from types import MappingProxyType
from typing import Any

import numpy as np
from numpy.typing import ArrayLike

from . import _engine
from ._columns import Floats, column
from .errors import InvalidArgument, SunLimitWarning, UnknownName, WrongType, nearest

__all__ = ["LIMITS", "SUN_CAUTION", "Limit", "Limits"]

SUN_CAUTION = (
    "Pointing at or near the Sun can blind a person and destroy an instrument. The Sun limit here is for "
    "planning and is never the interlock: the observatory's own safety rules stand above it."
)
"""What is said wherever the Sun limit is lowered."""


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
    default: float | str | None = None
    """The value when nothing is said; None is off."""
    words: Mapping[str, float] = field(default_factory=dict)
    """Words that stand for a value."""
    choices: tuple[str, ...] = ()
    """The allowed words, for a limit that is a choice and not a number."""
    at_most: str = ""
    """The key of the limit that this one must not exceed."""

    def allowed(self) -> str:
        """What may be given, in words."""
        if self.choices:
            return ", ".join(self.choices)
        named = "".join(f", or {word!r} ({value:g})" for word, value in self.words.items())
        return f"{self.low:g} to {self.high:g}{f' {self.unit}' if self.unit else ''}, or None (off){named}"


LIMITS: Mapping[str, Limit] = MappingProxyType(
    {
        limit.key: limit
        for limit in (
            Limit(
                "altitude_min_deg",
                "observed altitude of the target is at least this",
                unit="deg",
                low=-5.0,
                high=90.0,
                default=30.0,
                at_most="altitude_max_deg",
            ),
            Limit(
                "altitude_max_deg",
                "observed altitude of the target is at most this",
                unit="deg",
                low=-5.0,
                high=90.0,
            ),
            Limit("airmass_max", "airmass of the target is at most this", low=1.0, high=40.0),
            Limit(
                "airmass_model",
                "formula by which altitude becomes airmass",
                default="kasten_young_1989",
                choices=tuple(_engine.airmass_model_words()),
            ),
            Limit(
                "sun_altitude_max_deg",
                "topocentric altitude of the Sun's centre is at most this",
                unit="deg",
                low=-90.0,
                high=90.0,
                default=-18.0,
                words={"civil": -6.0, "nautical": -12.0, "astronomical": -18.0},
            ),
            Limit(
                "sun_separation_min_deg",
                "angle from the target to the Sun's centre is at least this",
                unit="deg",
                low=0.0,
                high=180.0,
                default=30.0,
            ),
            Limit(
                "moon_separation_min_deg",
                "angle from the target to the Moon's centre is at least this",
                unit="deg",
                low=0.0,
                high=180.0,
            ),
            Limit(
                "moon_altitude_max_deg",
                "topocentric altitude of the Moon's centre is at most this",
                unit="deg",
                low=-90.0,
                high=90.0,
            ),
            Limit(
                "moon_illumination_max", "illuminated fraction of the Moon is at most this", low=0.0, high=1.0
            ),
            Limit(
                "hour_angle_min_h",
                "hour angle of the target is at least this, east negative",
                unit="hourangle",
                low=-12.0,
                high=12.0,
                at_most="hour_angle_max_h",
            ),
            Limit(
                "hour_angle_max_h",
                "hour angle of the target is at most this, west positive",
                unit="hourangle",
                low=-12.0,
                high=12.0,
            ),
            Limit("window_min_s", "a window lasts at least this", unit="s", low=0.0, high=86_400.0),
        )
    }
)
"""Every limit by its key."""


class Limits:
    """What the telescope and the programme allow; all limits hold at once.

    Keywords only, each of `LIMITS`: a number, a column with one value per target, or None (off).
    ``Limits()`` is an observed altitude of 30 degrees at least, the Sun at -18 degrees at most and 30
    degrees away at least. Limits on the target's altitude are observed altitudes; those on the altitude
    of Sun and Moon are topocentric ones of the centre, without refraction, as twilights are defined.
    ``sun_altitude_max_deg`` also takes the words civil, nautical and astronomical.

    ``altitude_min_deg=None`` needs an ``airmass_max``: something must keep the target above the ground.
    Both hold when both are given, and the altitude's default counts as given.

    A value of a per-target column that is NaN, out of range or in contradiction with another limit makes
    that target a bad row; the others are untouched.
    """

    __slots__ = ("_values",)

    _values: Mapping[str, float | str | Floats | None]

    def __init__(self, **limits: float | str | ArrayLike | None) -> None:
        for key in limits:
            if key not in LIMITS:
                raise UnknownName.among("Limits: keyword", key, LIMITS)
        values = {key: _value(limit, limits.get(key, limit.default)) for key, limit in LIMITS.items()}
        _check_together(values)
        object.__setattr__(self, "_values", MappingProxyType(values))
        _warn_of_the_sun(values["sun_separation_min_deg"])

    def __getitem__(self, key: str) -> float | str | Floats | None:
        """The value of a limit by its key; None when it is off."""
        if key not in LIMITS:
            raise UnknownName.among("Limits: key", key, LIMITS)
        return self._values[key]

    def __iter__(self) -> Iterator[str]:
        """The keys of the limits in force."""
        return (key for key, value in self._values.items() if value is not None)

    def __contains__(self, key: object) -> bool:
        """Whether the limit is in force."""
        return isinstance(key, str) and self._values.get(key) is not None

    def replace(self, **limits: float | str | ArrayLike | None) -> Limits:
        """The same limits with some of them changed."""
        return Limits(**{**self._values, **limits})

    def to_dict(self) -> dict[str, float | str | list[float]]:
        """The limits in force by key, in plain Python values, as a file's provenance records them."""
        return {
            key: value.tolist() if isinstance(value, np.ndarray) else value
            for key, value in self._values.items()
            if value is not None
        }

    def for_engine(self, targets: int) -> dict[str, float | Floats | str]:
        """The limits in force as the engine takes them: words, numbers, or columns of `targets` values.

        Per-target values that are out of range or contradict another limit become NaN, which the engine
        reports as a bad row.
        """
        made: dict[str, float | Floats | str] = {}
        for key, value in self._values.items():
            if isinstance(value, np.ndarray):
                if len(value) != targets:
                    raise InvalidArgument.of(
                        f"Limits: {key}",
                        f"{len(value)} values",
                        f"one value, or one for each of {targets} targets",
                    )
                limit = LIMITS[key]
                made[key] = np.where((value >= limit.low) & (value <= limit.high), value, np.nan)
            elif value is not None:
                made[key] = value
        for key, limit in LIMITS.items():
            low, high = made.get(key), made.get(limit.at_most)
            if low is None or high is None or isinstance(low, str) or isinstance(high, str):
                continue
            if isinstance(low, np.ndarray) or isinstance(high, np.ndarray):
                made[key] = np.where(np.greater(low, high), np.nan, low)
        return made

    def __setattr__(self, attribute: str, value: object) -> None:
        raise AttributeError(f"Limits: {attribute} cannot be set; use .replace({attribute}=...)")

    def __eq__(self, other: object) -> bool:
        if not isinstance(other, Limits):
            return NotImplemented
        return self.to_dict() == other.to_dict()

    __hash__ = None  # type: ignore[assignment]  # columns are not hashable

    def __reduce__(self) -> tuple[Any, ...]:
        return _limits_again, (dict(self._values),)

    def __repr__(self) -> str:
        shown = []
        for key, value in self._values.items():
            if isinstance(value, np.ndarray):
                shown.append(f"{key}=<{len(value)} values>")
            elif isinstance(value, str):
                shown.append(f"{key}={value!r}")
            elif value is not None or LIMITS[key].default is not None:
                shown.append(f"{key}={value if value is None else format(value, 'g')}")
        return f"Limits({', '.join(shown)})"


Limits.__signature__ = inspect.Signature(  # type: ignore[attr-defined]  # what help() and editors show
    [
        inspect.Parameter(k, inspect.Parameter.KEYWORD_ONLY, default=limit.default)
        for k, limit in LIMITS.items()
    ]
)


def _value(limit: Limit, given: Any) -> float | str | Floats | None:
    """One limit's value, checked: a float, a word of `choices`, a read-only column, or None."""
    what = f"Limits: {limit.key}"
    if given is None:
        if limit.choices:
            raise InvalidArgument.of(what, None, limit.allowed())
        return None
    if isinstance(given, str):
        if given in limit.words:
            return limit.words[given]
        if given in limit.choices:
            return given
        if limit.choices:
            raise UnknownName.among(what, given, limit.choices)
        if limit.words:
            guess = nearest(given, limit.words)
            hint = f"; the nearest is {guess!r}" if guess is not None else ""
            raise UnknownName(f"{what}: given {given!r}, which is unknown{hint}; allowed {limit.allowed()}")
        raise WrongType.of(what, given, limit.allowed())
    if limit.choices:
        raise WrongType.of(what, given, limit.allowed())
    single = np.ndim(given) == 0
    values = column(given, what, limit.unit)
    if single:
        number = float(values[0])
        if not limit.low <= number <= limit.high:
            raise InvalidArgument.of(what, f"{number:g}", limit.allowed())
        return number
    kept = values.copy()
    kept.flags.writeable = False
    return kept


def _check_together(values: Mapping[str, float | str | Floats | None]) -> None:
    """Refuses scalars that contradict one another; columns are judged row by row, later."""
    for key, limit in LIMITS.items():
        low, high = values[key], values.get(limit.at_most)
        if isinstance(low, float) and isinstance(high, float) and low > high:
            raise InvalidArgument.of(
                f"Limits: {key} and {limit.at_most}",
                f"{key}={low:g} above {limit.at_most}={high:g}",
                f"{key} at most {limit.at_most}",
            )
    if values["altitude_min_deg"] is None and values["airmass_max"] is None:
        raise InvalidArgument.of(
            "Limits: altitude_min_deg",
            "None, without airmass_max",
            "None only with an airmass_max; 0 is the horizon",
        )


def _warn_of_the_sun(separation: float | str | Floats | None) -> None:
    usual = LIMITS["sun_separation_min_deg"].default
    assert isinstance(usual, float)
    lowest = (
        0.0 if separation is None else float(np.nanmin(np.asarray(separation, dtype=float), initial=180.0))
    )
    if lowest < usual:
        given = "off" if separation is None else f"{lowest:g} degrees"
        warnings.warn(
            f"sun_separation_min_deg is {given}, below the default of {usual:g}. {SUN_CAUTION}",
            SunLimitWarning,
            stacklevel=3,
        )


def _limits_again(values: dict[str, Any]) -> Limits:
    return Limits(**values)
