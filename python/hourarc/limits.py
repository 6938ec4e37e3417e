"""Limits: what the telescope and the programme allow.

Each limit is declared once, in `LIMITS`: its key, unit, range, default and meaning. Checking, messages,
help, `repr` and what the engine is handed all follow from the declaration.
"""

from __future__ import annotations

import inspect
import warnings
from collections.abc import Iterator, Mapping
from types import MappingProxyType
from typing import Any

import numpy as np

from ._columns import Floats, column, numbers
from ._limit_keys import LIMITS, Limit
from .errors import InvalidArgument, SunLimitWarning, UnknownName, WrongType, nearest
from .times import to_nanoseconds

__all__ = ["LIMITS", "SUN_CAUTION", "Limit", "Limits"]

SUN_CAUTION = (
    "Pointing at or near the Sun can blind a person and destroy an instrument. The Sun limit here is for "
    "planning and is never the interlock: the observatory's own safety rules stand above it."
)
"""What is said wherever the Sun limit is lowered."""

Pairs = tuple[tuple[float, float], ...]
Intervals = tuple[tuple[np.datetime64, np.datetime64], ...]
Value = float | str | bool | Floats | Pairs | Intervals | None
"""The value of a limit: a number or a column of them, a word, a switch, pairs, intervals; None is off."""


class Limits:
    """What the telescope and the programme allow; all limits hold at once.

    Keywords only, each of `LIMITS`, which also gives the unit, convention and source of each: a number, a
    column with one value per target, or None (off); a few are words, True or False, or lists of pairs.

    * the target's place: ``altitude_min_deg altitude_max_deg airmass_max (airmass_model) skyline
      declination_min_deg declination_max_deg hour_angle_min_h hour_angle_max_h azimuth_sectors_deg
      azimuth_rate_max_deg_s cable_range_deg``
    * Sun and Moon: ``sun_altitude_max_deg sun_separation_min_deg moon_altitude_max_deg moon_illumination_max
      moon_separation_min_deg``; the angle to the Moon by its age (``moon_avoidance_separation_deg`` and
      ``moon_avoidance_width_d``, a Lorentzian) or by its light (``moon_avoidance_dark_deg`` and
      ``moon_avoidance_bright_deg``, linear); ``moon_relaxed_below_deg``; ``sky_brightness_min_mag_arcsec2``
    * time: ``allowed_intervals``; ``phase_epoch_jd phase_period_d phase_half_width_d (phase_scale)``;
      ``window_min_s``

    ``Limits()`` is an observed altitude of 30 degrees at least, the Sun at -18 degrees at most and 30
    degrees away at least. Limits on the target's altitude are observed altitudes; those on the altitude
    of Sun and Moon are topocentric ones of the centre, without refraction, as twilights are defined.
    ``sun_altitude_max_deg`` also takes the words civil, nautical and astronomical.

    An ``airmass_max`` alone takes the place of the altitude's default; both hold when both are given.
    ``altitude_min_deg=None`` needs one: something must keep the target above the ground.

    A value of a per-target column that is NaN, out of range or in contradiction with another limit makes
    that target a bad row; the others are untouched.
    """

    __slots__ = ("_values",)

    _values: Mapping[str, Value]

    def __init__(self, **limits: Any) -> None:
        for key in limits:
            if key not in LIMITS:
                raise UnknownName.among("Limits: keyword", key, LIMITS)
        values = {key: _value(limit, limits.get(key, limit.default)) for key, limit in LIMITS.items()}
        if values["airmass_max"] is not None and "altitude_min_deg" not in limits:
            values["altitude_min_deg"] = None
        _check_together(values)
        object.__setattr__(self, "_values", MappingProxyType(values))
        _warn_of_the_sun(values["sun_separation_min_deg"])

    def __getitem__(self, key: str) -> Value:
        """The value of a limit by its key; None when it is off."""
        if key not in LIMITS:
            raise UnknownName.among("Limits: key", key, LIMITS)
        return self._values[key]

    def __iter__(self) -> Iterator[str]:
        """The keys of the limits in force."""
        return (key for key in self._values if key in self)

    def __contains__(self, key: object) -> bool:
        """Whether the limit is in force."""
        if not isinstance(key, str) or self._values.get(key) is None or self._values[key] is False:
            return False
        # A clock without a phase says nothing.
        return key != "phase_scale" or self._values["phase_epoch_jd"] is not None

    def replace(self, **limits: Any) -> Limits:
        """The same limits with some of them changed."""
        return Limits(**{**self._values, **limits})

    def to_dict(self) -> dict[str, Any]:
        """The limits in force by key, in plain Python values, as a file's provenance records them."""
        return {key: _plain(self._values[key]) for key in self}

    def for_engine(self, targets: int, *, has_skyline: bool = False) -> dict[str, Any]:
        """The limits in force as the engine takes them: words, numbers, pairs, or columns of `targets`
        values.

        Per-target values that are out of range become NaN, which the engine reports as a bad row, as it does
        those that contradict another limit. The skyline is a limit where the site has one.
        """
        made: dict[str, Any] = {}
        for key in self:
            value, limit = self._values[key], LIMITS[key]
            if isinstance(value, np.ndarray):
                if len(value) != targets:
                    raise InvalidArgument.of(
                        f"Limits: {key}",
                        f"{len(value)} values",
                        f"one value, or one for each of {targets} targets",
                    )
                made[key] = np.where((value >= limit.low) & (value <= limit.high), value, np.nan)
            elif limit.kind == "intervals":
                nanoseconds = np.array(value, dtype="datetime64[ns]").astype(np.int64)
                made[key] = [tuple(pair) for pair in nanoseconds.tolist()]
            else:
                made[key] = value
        if not has_skyline:
            made.pop("skyline", None)
        return made

    def at(self, row: int) -> Limits:
        """The limits of one target: each column replaced by its value for that row."""
        own = {k: float(v[row]) for k, v in self._values.items() if isinstance(v, np.ndarray)}
        with warnings.catch_warnings():
            warnings.simplefilter("ignore", SunLimitWarning)  # said when the columns came in
            return self.replace(**own)

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
            elif isinstance(value, float):
                shown.append(f"{key}={value:.15g}" if LIMITS[key].unit == "d" else f"{key}={value:g}")
            elif key in self or (value is not LIMITS[key].default and key != "phase_scale"):
                shown.append(f"{key}={_plain(value)!r}")
        return f"Limits({', '.join(shown)})"


Limits.__signature__ = inspect.Signature(  # type: ignore[attr-defined]  # what help() and editors show
    [
        inspect.Parameter(k, inspect.Parameter.KEYWORD_ONLY, default=limit.default)
        for k, limit in LIMITS.items()
    ]
)


def _value(limit: Limit, given: Any) -> Value:
    """One limit's value, checked: a float, a word, a switch, pairs, a read-only column, or None."""
    what = f"Limits: {limit.key}"
    if given is None:
        if limit.kind in ("word", "switch"):
            raise InvalidArgument.of(what, None, limit.allowed())
        return None
    if limit.kind == "switch":
        if not isinstance(given, (bool, np.bool_)):
            raise WrongType.of(what, given, limit.allowed())
        return bool(given)
    if limit.kind == "intervals":
        return _intervals(limit, given, what)
    if limit.kind in ("pairs", "pair"):
        return _pairs(limit, given, what)
    if isinstance(given, str):
        return _word(limit, given, what)
    if limit.kind == "word":
        raise WrongType.of(what, given, limit.allowed())
    single = np.ndim(given) == 0
    if not single and not limit.by_target:
        raise WrongType.of(what, given, limit.allowed())
    values = column(given, what, limit.unit)
    if single:
        number = float(values[0])
        if not limit.low <= number <= limit.high:
            raise InvalidArgument.of(what, f"{number:.12g}", limit.allowed())
        return number
    kept = values.copy()
    kept.flags.writeable = False
    return kept


def _word(limit: Limit, given: str, what: str) -> Value:
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


def _pairs(limit: Limit, given: Any, what: str) -> Value:
    """Pairs of numbers in range; one pair is one of them."""
    if isinstance(given, str):
        raise WrongType.of(what, given, limit.allowed())
    array = numbers(given, what, limit.unit)
    if array.shape == (2,):
        array = array[np.newaxis]
    if array.ndim != 2 or array.shape[1] != 2 or not len(array) or (limit.kind == "pair" and len(array) > 1):
        raise InvalidArgument.of(what, f"an array of shape {array.shape}", limit.allowed())
    for low, high in array.tolist():
        inside = limit.low <= low <= limit.high and limit.low <= high <= limit.high
        if not inside or low == high or (limit.kind == "pair" and low > high):
            raise InvalidArgument.of(what, f"[{low:g}, {high:g}]", limit.allowed())
    return tuple((low, high) for low, high in array.tolist())


def _intervals(limit: Limit, given: Any, what: str) -> Value:
    """Pairs of instants, each with its start before its stop; an astropy Time of shape (n, 2) passes too."""
    if isinstance(given, (str, float, int)):
        raise WrongType.of(what, given, limit.allowed())
    if isinstance(given, (list, tuple)):
        if not all(isinstance(pair, (list, tuple, np.ndarray)) and len(pair) == 2 for pair in given):
            raise InvalidArgument.of(what, repr(given)[:80], limit.allowed())
        ends = [int(to_nanoseconds(end, what)[0][0]) for pair in given for end in pair]
        nanoseconds = np.array(ends, dtype=np.int64)
        shape: tuple[int, ...] = (len(given), 2)
    else:
        nanoseconds, shape = to_nanoseconds(given, what)
    if len(shape) != 2 or shape[1] != 2 or not shape[0]:
        raise InvalidArgument.of(what, f"an array of shape {shape}", limit.allowed())
    made = nanoseconds.view("datetime64[ns]").reshape(shape)
    for start, stop in made:
        if not start < stop:  # NaT included
            raise InvalidArgument.of(what, f"{start} to {stop}", limit.allowed())
    return tuple((start, stop) for start, stop in made)


def _check_together(values: Mapping[str, Value]) -> None:
    """Refuses scalars that contradict one another; columns are judged row by row, later."""
    for key, limit in LIMITS.items():
        low, high = values[key], values.get(limit.at_most)
        if isinstance(low, float) and isinstance(high, float) and low > high:
            raise InvalidArgument.of(
                f"Limits: {key} and {limit.at_most}",
                f"{key}={low:g} above {limit.at_most}={high:g}",
                f"{key} at most {limit.at_most}",
            )
        if values[key] is None:
            continue
        missing = [other for other in limit.together if values[other] is None]
        if missing:
            raise InvalidArgument.of(
                f"Limits: {key}",
                f"without {' and '.join(missing)}",
                f"{', '.join(limit.together)} together",
            )
        rival = next((other for other in limit.apart if values[other] is not None), None)
        if rival is not None:
            raise InvalidArgument.of(
                f"Limits: {key} and {rival}",
                "both",
                f"either {' with '.join(limit.together)} or {' with '.join(limit.apart)}",
            )
    period, half = values["phase_period_d"], values["phase_half_width_d"]
    if isinstance(period, float) and isinstance(half, float) and 2.0 * half >= period:
        raise InvalidArgument.of(
            "Limits: phase_half_width_d", f"{half:g}", f"below half of phase_period_d, {0.5 * period:g} d"
        )
    relaxed = ("moon_separation_min_deg", "moon_avoidance_separation_deg", "moon_avoidance_dark_deg")
    if values["moon_relaxed_below_deg"] is not None and all(values[key] is None for key in relaxed):
        raise InvalidArgument.of(
            "Limits: moon_relaxed_below_deg",
            "without an angle to the Moon that it could relax",
            f"with one of {', '.join(relaxed)}",
        )
    if values["altitude_min_deg"] is None and values["airmass_max"] is None:
        raise InvalidArgument.of(
            "Limits: altitude_min_deg",
            "None, without airmass_max",
            "None only with an airmass_max; 0 is the horizon",
        )


def _warn_of_the_sun(separation: Value) -> None:
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


def _plain(value: Value) -> Any:
    """A value as JSON and TOML can write it."""
    if isinstance(value, np.ndarray):
        return value.tolist()
    if isinstance(value, tuple):
        return [[end if isinstance(end, float) else str(end) for end in pair] for pair in value]
    return value


def _limits_again(values: dict[str, Any]) -> Limits:
    return Limits(**values)
