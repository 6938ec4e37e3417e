"""Where is it: places of targets at instants."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from typing import Any

import numpy as np
from numpy.typing import NDArray

from . import _engine
from ._columns import Floats, workers, writable
from .errors import InvalidArgument, MissingColumn, UnknownName, WrongType
from .orbits import Orbits
from .orientation import Orientation, as_orientation
from .results import STATUS_WORDS, Coded, ColumnResult, words
from .site import Site, as_site
from .targets import Bodies, Catalog, as_targets
from .times import from_nanoseconds, to_nanoseconds

__all__ = ["PLACE_COLUMNS", "Places", "place"]

DEFAULT_COLUMNS = (
    "altitude_deg",
    "azimuth_deg",
    "hour_angle_deg",
    "declination_deg",
    "airmass",
    "parallactic_angle_deg",
)
LOOKS_COLUMNS = (
    "distance_au",
    "heliocentric_distance_au",
    "phase_angle_deg",
    "elongation_deg",
    "magnitude_v",
    "rate_arcsec_min",
    "motion_position_angle_deg",
    "illuminated_fraction",
    "angular_diameter_arcsec",
    "bright_limb_position_angle_deg",
    "moon_age_d",
)
"""The columns of `place` that say how bodies of the solar system look; NaN for a `Catalog`."""

PLACE_COLUMNS = (
    *DEFAULT_COLUMNS,
    "moon_separation_deg",
    "sun_separation_deg",
    "sky_brightness_mag_arcsec2",
    *LOOKS_COLUMNS,
    "azimuth_rate_arcsec_s",
    "parallactic_angle_rate_arcsec_s",
)
"""Every column that `place` can compute; the first six are computed when nothing is said."""


class Places(ColumnResult):
    """Places of targets. Columns have shape (times, targets); (targets,) for a scalar time; (n,) pairwise.

    Only the columns that were asked for are there; another one raises `MissingColumn`.
    """

    __slots__ = ("_columns", "name", "pairwise", "status", "time")

    altitude_deg: Floats
    """Observed altitude, degrees."""
    azimuth_deg: Floats
    """Azimuth, degrees from north through east, 0 to 360."""
    hour_angle_deg: Floats
    """Topocentric hour angle, degrees, -180 to 180, west positive."""
    declination_deg: Floats
    """Topocentric declination of date (CIRS), degrees."""
    airmass: Floats
    """Airmass; NaN below the horizon."""
    parallactic_angle_deg: Floats
    """Parallactic angle, degrees, -180 to 180, positive in the west."""
    moon_separation_deg: Floats
    """Angle to the centre of the Moon, degrees."""
    sun_separation_deg: Floats
    """Angle to the centre of the Sun, degrees."""
    sky_brightness_mag_arcsec2: Floats
    """Brightness of the sky in V with the Moon in it, magnitudes a square arcsecond; NaN below the horizon.
    After Krisciunas & Schaefer 1991 (PASP 103, 1033), good to 0.1 to 0.25 mag; twilight is not in it."""
    distance_au: Floats
    """Distance travelled by the light that arrives now, au."""
    heliocentric_distance_au: Floats
    """Distance from the Sun, au; 0 for the Sun."""
    phase_angle_deg: Floats
    """Angle at the body between the Sun and the observer, degrees."""
    elongation_deg: Floats
    """Angle at the observer between the Sun and the body, degrees; topocentric, without aberration."""
    magnitude_v: Floats
    """Apparent V magnitude; NaN where it is unknown."""
    rate_arcsec_min: Floats
    """Motion among the stars as the site sees it, arcseconds a minute."""
    motion_position_angle_deg: Floats
    """Its direction, degrees from the north of the ICRS through east, 0 to 360."""
    illuminated_fraction: Floats
    """Illuminated fraction of the disc, 0 to 1."""
    angular_diameter_arcsec: Floats
    """Angular diameter of the equator, arcseconds; NaN for minor bodies."""
    bright_limb_position_angle_deg: Floats
    """Position angle of the bright limb's middle, degrees from the north of date through east."""
    moon_age_d: Floats
    """Days since the last new Moon; NaN for all but the Moon."""
    azimuth_rate_arcsec_s: Floats
    """Rate of the azimuth of a direction fixed among the stars, arcseconds a second, without the air."""
    parallactic_angle_rate_arcsec_s: Floats
    """The same of the parallactic angle: the rotation of an altazimuth telescope's field."""
    time: NDArray[np.datetime64]
    """The instants, UTC, datetime64[ns], in the shape they were given."""
    status: NDArray[np.uint8]
    """Status of each place, in the shape of the columns; from 16 on there is none."""
    name: NDArray[np.str_] | None
    """The names of the targets, or None."""
    pairwise: bool
    """Whether row i is target i at time i."""
    _columns: Mapping[str, Floats]

    def __init__(
        self,
        columns: Mapping[str, Floats],
        status: NDArray[np.uint8],
        time: NDArray[np.datetime64],
        name: NDArray[np.str_] | None,
        pairwise: bool,
    ) -> None:
        given = {"_columns": columns, "status": status, "time": time, "name": name, "pairwise": pairwise}
        for key, value in given.items():
            object.__setattr__(self, key, value)

    def __getattr__(self, attribute: str) -> Any:
        if attribute in PLACE_COLUMNS:
            if attribute in self._columns:
                return self._columns[attribute]
            raise MissingColumn(
                f"Places: {attribute} was not computed; name it in place(columns=...). "
                f"Computed: {', '.join(self.columns)}"
            )
        raise AttributeError(f"Places has no attribute {attribute!r}")

    def __getitem__(self, column: str) -> Floats:
        """A column by its name."""
        if column not in PLACE_COLUMNS:
            raise UnknownName.among("Places: column", column, PLACE_COLUMNS)
        values: Floats = getattr(self, column)
        return values

    @property
    def columns(self) -> tuple[str, ...]:
        """The names of the columns that were computed."""
        return tuple(self._columns)

    @property
    def shape(self) -> tuple[int, ...]:
        """The shape of every column."""
        return self.status.shape

    @property
    def status_words(self) -> NDArray[np.str_]:
        """The status of each place as a word."""
        return words(self.status, STATUS_WORDS)

    def __reduce__(self) -> tuple[Any, ...]:
        return Places, (dict(self._columns), self.status, self.time, self.name, self.pairwise)

    def __setattr__(self, attribute: str, value: object) -> None:
        raise AttributeError(f"Places: {attribute} cannot be set; a result does not change")

    def _table(self) -> dict[str, Any]:
        rows = self.status.size
        if self.pairwise:
            target = np.arange(rows, dtype=np.int64)
            time = self.time.reshape(-1)
        else:
            times = max(self.time.size, 1)
            target = np.tile(np.arange(rows // times, dtype=np.int64), times)
            time = np.repeat(self.time.reshape(-1), rows // times)
        columns: dict[str, Any] = {"time": time, "target": target}
        if self.name is not None:
            columns["name"] = self.name[target % max(len(self.name), 1)]
        columns |= {key: value.reshape(-1) for key, value in self._columns.items()}
        columns["status"] = Coded(self.status.reshape(-1), STATUS_WORDS)
        return columns

    def _heading(self) -> str:
        shape = " x ".join(f"{size:,}" for size in self.shape)
        kind = "pairwise" if self.pairwise else ("targets" if len(self.shape) == 1 else "times x targets")
        return f"Places {shape} ({kind}): {', '.join(self.columns)}"


def place(
    site: Site,
    targets: Catalog | Bodies | Orbits,
    when: Any,
    *,
    columns: Iterable[str] | str | None = None,
    pairwise: bool = False,
    out: Places | Mapping[str, NDArray[Any]] | None = None,
    orientation: Orientation | None = None,
    threads: int | None = None,
) -> Places:
    """Where each target stands at each instant: shape (times, targets), or (targets,) for a scalar `when`.

    * ``when``: UTC: datetime64, ISO strings, datetimes or an astropy Time; a scalar, or one dimension.
    * ``columns``: which to compute, of `PLACE_COLUMNS`; None is the first six of them.
    * ``pairwise``: row i is target i at instant i, of which there are equally many.
    * ``out``: a former `Places`, or writable float64 arrays by column name (and ``status``, uint8), of
      the result's shape and C-contiguous: they are filled and no others are made.
    * ``orientation``: the Earth's orientation; None is `Orientation.packaged()`.
    * ``threads``: None for all cores. The answer is the same, bit for bit, for any number.

    Altitude and azimuth are observed: through the air of the site, unless its pressure is 0. Hour angle
    and declination are topocentric, of the CIRS of date, without the air.

    Topocentric places of stars are within 2 µas of pyerfa fed with the Earth of DE440
    (`tests/test_accuracy_place.py`), those of Sun and Moon within 1 mas and of the planets within 5 mas of
    DE440 (`tests/test_accuracy_bodies.py`). Refraction is within 0.1″ of the published ray trace down to an
    altitude of 10° and within 0.1′ at the horizon (`tests/test_accuracy_refraction.py`); the real air
    scatters far more there.

    Places of `Orbits` are of two-body motion with light time, deflection and aberration, within 1e-5″ of the
    chain itself; how far that motion strays from the true one is said there, and by the status
    ``far_from_epoch``. The last columns of `PLACE_COLUMNS` say how bodies look: all angles of the triangle
    of Sun, body and site, the motion with the site's own; magnitudes by H and G, and of Sun, Moon and
    planets by published formulae (0.01 to 0.1 mag).

    A target or an instant that cannot be computed (NaN, NaT, before 1960, outside 1900 to 2100) has NaN and a
    ``status`` of 16 or more; the others are untouched. A wrong call raises `HourarcError`.
    """
    here, rows = as_site(site), as_targets(targets)
    nanoseconds, time_shape = to_nanoseconds(when, "when")
    if len(time_shape) > 1:
        raise InvalidArgument.of(
            "place: when", f"an array of shape {time_shape}", "a scalar or one dimension"
        )
    wanted = _wanted(columns)
    earth = as_orientation(orientation)
    earth.check(nanoseconds, "when")
    shape = _shape(time_shape, len(rows), pairwise)
    arrays, status = _outputs(out, wanted, shape)
    flat = {key: array.reshape(-1) for key, array in arrays.items()}
    _engine.place(
        here._handle,
        rows._handle,
        earth._handle,
        nanoseconds,
        flat,
        status.reshape(-1),
        bool(pairwise),
        workers(threads),
    )
    return Places(
        arrays, status, from_nanoseconds(nanoseconds).reshape(time_shape), rows.name, bool(pairwise)
    )


def _wanted(columns: Iterable[str] | str | None) -> tuple[str, ...]:
    if columns is None:
        return DEFAULT_COLUMNS
    named = (columns,) if isinstance(columns, str) else tuple(columns)
    for name in named:
        if name not in PLACE_COLUMNS:
            raise UnknownName.among("place: columns", name, PLACE_COLUMNS)
    if len(set(named)) != len(named):
        raise InvalidArgument.of("place: columns", ", ".join(named), "each column once")
    if not named:
        raise InvalidArgument.of("place: columns", "none", "at least one, or None for the usual six")
    return named


def _shape(times: tuple[int, ...], targets: int, pairwise: bool) -> tuple[int, ...]:
    if not pairwise:
        return (*times, targets)
    if times != (targets,):
        given = f"{targets} targets at {times[0]} times" if times else f"{targets} targets at one time"
        raise InvalidArgument.of("place: pairwise", given, "one time for each target")
    return (targets,)


def _outputs(
    out: Places | Mapping[str, NDArray[Any]] | None, wanted: tuple[str, ...], shape: tuple[int, ...]
) -> tuple[dict[str, Floats], NDArray[np.uint8]]:
    """The arrays to fill: those of `out`, checked, or new ones."""
    if out is None:
        return {key: np.empty(shape) for key in wanted}, np.empty(shape, dtype=np.uint8)
    if isinstance(out, Places):
        given: dict[str, NDArray[Any]] = {**out._columns, "status": out.status}
    elif isinstance(out, Mapping):
        given = dict(out)
    else:
        raise WrongType.of("place: out", out, "a Places, or arrays by column name")
    for key in given:
        if key != "status" and key not in wanted:
            if key not in PLACE_COLUMNS:
                raise UnknownName.among("place: out", key, [*PLACE_COLUMNS, "status"])
            raise InvalidArgument.of(
                "place: out", f"{key}, which is not computed", f"columns {', '.join(wanted)}"
            )
    arrays = {key: writable(given.get(key), f"place: out[{key!r}]", shape, np.float64) for key in wanted}
    if "status" not in given:
        return arrays, np.empty(shape, dtype=np.uint8)
    return arrays, writable(given["status"], "place: out['status']", shape, np.uint8)
