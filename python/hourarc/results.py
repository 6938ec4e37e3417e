"""What every result has in common: frozen, with plain numpy columns, and ready for tables.

Each column that any result can have is declared once here, with its unit and its IVOA UCD, which
`to_arrow()` (field metadata) and `to_table()` (astropy QTable) carry over.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any, NamedTuple

import numpy as np
from numpy.typing import NDArray

from . import _engine
from .errors import InvalidArgument, MissingPackage, WrongType

if TYPE_CHECKING:
    import pyarrow
    from astropy.table import QTable

__all__ = ["COLUMNS", "STATUS_WORDS", "Column", "ColumnResult"]


class Column(NamedTuple):
    """The meaning of a column: unit (empty for a pure number), UCD (IVOA UCD1+ 1.5), one line of text."""

    unit: str
    ucd: str
    meaning: str


COLUMNS: Mapping[str, Column] = {
    # keys
    "time": Column("", "time.epoch", "instant, UTC"),
    "target": Column("", "meta.record", "row number of the target, from 0"),
    "name": Column("", "meta.id;meta.main", "name of the target"),
    "night": Column("", "time.epoch", "date of the evening"),
    "status": Column("", "meta.code.status", "what is to be said of the row"),
    # places
    "altitude_deg": Column("deg", "pos.az.alt", "observed altitude"),
    "azimuth_deg": Column("deg", "pos.az.azi", "azimuth, from north through east"),
    "hour_angle_deg": Column("deg", "pos.eq.ha", "topocentric hour angle, west positive"),
    "declination_deg": Column("deg", "pos.eq.dec", "topocentric declination of date (CIRS)"),
    "airmass": Column("", "obs.airMass", "airmass"),
    "parallactic_angle_deg": Column(
        "deg", "pos.posAng", "parallactic angle, of the zenith from the north through east"
    ),
    "moon_separation_deg": Column("deg", "pos.angDistance", "angle to the centre of the Moon"),
    "sun_separation_deg": Column("deg", "pos.angDistance", "angle to the centre of the Sun"),
    "azimuth_rate_arcsec_s": Column(
        "arcsec / s", "arith.rate;pos.az.azi", "rate of the azimuth of a direction fixed among the stars"
    ),
    "parallactic_angle_rate_arcsec_s": Column(
        "arcsec / s", "arith.rate;pos.posAng", "rate of the parallactic angle of such a direction"
    ),
    "sky_brightness_mag_arcsec2": Column(
        "mag / arcsec2", "phot.mag.sb;em.opt.V", "brightness of the sky with the Moon in it, V"
    ),
    "distance_au": Column("AU", "pos.distance", "distance travelled by the light that arrives now"),
    "heliocentric_distance_au": Column("AU", "pos.distance;pos.heliocentric", "distance from the Sun"),
    "phase_angle_deg": Column("deg", "pos.phaseAng", "angle at the body between the Sun and the observer"),
    "elongation_deg": Column("deg", "pos.angDistance", "angle at the observer between the Sun and the body"),
    "magnitude_v": Column("mag", "phot.mag;em.opt.V", "apparent magnitude V"),
    "rate_arcsec_min": Column("arcsec / min", "pos.pm", "motion among the stars as the site sees it"),
    "motion_position_angle_deg": Column(
        "deg", "pos.posAng;pos.pm", "direction of the motion, north through east"
    ),
    "illuminated_fraction": Column("", "phys.area;arith.ratio", "illuminated fraction of the disc"),
    "angular_diameter_arcsec": Column("arcsec", "phys.angSize", "angular diameter of the equator"),
    "bright_limb_position_angle_deg": Column(
        "deg",
        "pos.posAng",
        "middle of the bright limb, north through east",
    ),
    # events
    "kind": Column("", "meta.code", "rise, transit or set"),
    "computed_error_s": Column("s", "stat.error;time.epoch", "error of the computed instant"),
    "horizon_scatter_s": Column(
        "s", "stat.stdev;time.epoch", "scatter by the refraction of the day, 1 sigma"
    ),
    "may_not_happen": Column("", "meta.code.qual", "margin below the error: may not happen at all"),
    # windows
    "start": Column("", "time.start", "first instant, UTC"),
    "stop": Column("", "time.end", "first instant after it, UTC"),
    "start_reason": Column("", "meta.code", "limit that opens the window"),
    "stop_reason": Column("", "meta.code", "limit that closes the window"),
    "start_error_s": Column("s", "stat.error;time.start", "error of the computed start"),
    "stop_error_s": Column("s", "stat.error;time.end", "error of the computed stop"),
    "start_scatter_s": Column(
        "s", "stat.stdev;time.start", "scatter of the start by the refraction of the day, 1 sigma"
    ),
    "stop_scatter_s": Column(
        "s", "stat.stdev;time.end", "scatter of the stop by the refraction of the day, 1 sigma"
    ),
    "best_airmass": Column("", "obs.airMass;stat.min", "least airmass within the window"),
    "best_time": Column("", "time.epoch", "instant of the least airmass, UTC"),
    "blocked_by": Column("", "meta.code", "limit that leaves nothing"),
    "window_count": Column("", "meta.number", "number of windows"),
    "hours": Column("h", "time.duration", "sum of the windows"),
    # watch
    "up": Column("", "meta.code", "whether all limits hold"),
    "seconds_left": Column("s", "time.duration", "until the window that is open closes"),
    "seconds_to_next": Column("s", "time.duration", "until the next window opens"),
    # season
    "transit": Column("", "time.epoch", "upper culmination nearest to the middle of the night, UTC"),
    "moon_separation_min": Column(
        "deg", "pos.angDistance;stat.min", "least angle to the centre of the Moon within the windows"
    ),
    "first_night": Column("", "time.epoch;stat.min", "first useful night"),
    "last_night": Column("", "time.epoch;stat.max", "last useful night"),
    "useful_nights": Column("", "meta.number", "number of useful nights"),
    "longest_gap": Column("", "meta.number", "most nights in a row between them that are not useful"),
    "night_hours": Column("h", "time.duration", "hours of all targets together"),
    "useful_targets": Column("", "meta.number", "number of targets to which the night is useful"),
    # supply and demand
    "lst_start_h": Column("h", "time.start", "local mean sidereal time at which the bin begins"),
    "lst_stop_h": Column("h", "time.end", "local mean sidereal time at which the bin ends"),
    "supply_hours": Column("h", "time.duration", "hours in which the limits on the sky alone hold"),
    "demand_hours": Column("h", "time.duration", "requested hours"),
    "requested_hours": Column("h", "time.duration", "hours that the target asks for"),
    "available_hours": Column("h", "time.duration", "hours in which all limits hold for the target"),
    "ratio": Column("", "meta.number;arith.ratio", "demand by supply"),
    # slots and gaps
    "window": Column("", "meta.record", "row of the window, from 0"),
    "by_gap": Column("", "meta.code", "whether the gap after the last visit sets the start"),
    # explanations
    "limit": Column("", "meta.code", "the limit"),
    "alone": Column("", "meta.code", "true: where it alone holds; false: where all above it hold too"),
    # almanac
    "sunset": Column("", "time.epoch", "sunset, UTC"),
    "dusk_civil": Column("", "time.epoch", "Sun at -6 degrees, evening, UTC"),
    "dusk_nautical": Column("", "time.epoch", "Sun at -12 degrees, evening, UTC"),
    "dusk_astronomical": Column("", "time.epoch", "Sun at -18 degrees, evening, UTC"),
    "dawn_astronomical": Column("", "time.epoch", "Sun at -18 degrees, morning, UTC"),
    "dawn_nautical": Column("", "time.epoch", "Sun at -12 degrees, morning, UTC"),
    "dawn_civil": Column("", "time.epoch", "Sun at -6 degrees, morning, UTC"),
    "sunrise": Column("", "time.epoch", "sunrise, UTC"),
    "moonrise": Column("", "time.epoch", "first moonrise of the night, UTC"),
    "moonset": Column("", "time.epoch", "first moonset of the night, UTC"),
    "moon_age_d": Column("d", "time.age", "days since the last new Moon"),
    "moon_illuminated_fraction": Column(
        "", "phys.area;arith.ratio", "illuminated fraction, at local mean midnight"
    ),
    "dark_hours": Column("h", "time.duration", "hours with the Sun below -18 degrees"),
    "dark_hours_moonless": Column("h", "time.duration", "the same, with the Moon below the horizon"),
    # Earth orientation
    "ut1_minus_utc_s": Column("s", "time.scale", "UT1 - UTC"),
    "xp_arcsec": Column("arcsec", "pos.angDistance;pos.eop", "coordinate x of the pole"),
    "yp_arcsec": Column("arcsec", "pos.angDistance;pos.eop", "coordinate y of the pole"),
    "dx_mas": Column("mas", "pos.nutation", "celestial pole offset dX"),
    "dy_mas": Column("mas", "pos.nutation", "celestial pole offset dY"),
    "ut1_error_s": Column("s", "stat.error;time.scale", "error of UT1 - UTC"),
    "quality": Column("", "meta.code.qual", "measured, predicted or extrapolated"),
}
"""Every column of every result, by name."""

STATUS_WORDS: Mapping[int, str] = _engine.status_words()
"""The word for each status code. Codes from 16 on mark rows without outputs."""

FIRST_BAD_STATUS: int = _engine.first_bad_status
"""Status codes from here on mark rows whose outputs are NaN or NaT."""


def words(codes: NDArray[np.uint8], names: Mapping[int, str] | Sequence[str]) -> NDArray[np.str_]:
    """Each code as its word."""
    keyed = names if isinstance(names, Mapping) else dict(enumerate(names))
    table = np.array([keyed.get(code, f"code {code}") for code in range(256)])
    result: NDArray[np.str_] = table[codes]
    return result


class Coded(NamedTuple):
    """A column of codes, with the word for each."""

    codes: NDArray[np.uint8]
    names: Mapping[int, str] | Sequence[str]


@dataclass(frozen=True, slots=True, repr=False, eq=False)
class ColumnResult:
    """The base of the results: what tables and `repr` need, from `_table()` of each."""

    def _table(self) -> dict[str, Any]:
        """The columns of the table, all of one length, by name: arrays, or `Coded`."""
        raise NotImplementedError

    def _heading(self) -> str:
        """What the repr says first."""
        raise NotImplementedError

    def to_arrow(self) -> pyarrow.Table:
        """The result as a pyarrow Table: times as timestamp[ns, UTC], codes as dictionaries of words."""
        return arrow_table(self._table())

    def to_table(self) -> QTable:
        """The result as an astropy QTable: units, UCDs in each column's `meta`, times as `Time`."""
        from . import interop

        return interop.table(self._table())

    def __repr__(self) -> str:
        return f"<{self._heading()}>"


def arrow_table(columns: Mapping[str, Any]) -> pyarrow.Table:
    """Columns (arrays, or `Coded`) as a pyarrow Table, with unit, UCD and meaning in the field metadata."""
    pa = require("pyarrow", "to_arrow()", "hourarc[cli]")
    arrays: list[Any] = []
    fields: list[Any] = []
    for name, values in columns.items():
        if isinstance(values, Coded):
            keyed = values.names if isinstance(values.names, Mapping) else dict(enumerate(values.names))
            # The dictionary is dense, so codes are renumbered to their place in it.
            order = sorted(keyed)
            place = np.zeros(256, dtype=np.uint8)
            place[order] = np.arange(len(order))
            array = pa.DictionaryArray.from_arrays(
                pa.array(place[values.codes], type=pa.uint8()), pa.array([keyed[code] for code in order])
            )
        elif values.dtype.kind == "M" and np.datetime_data(values.dtype)[0] == "D":
            array = pa.array(values, type=pa.date32())
        elif values.dtype.kind == "M":
            array = pa.array(values, type=pa.timestamp("ns", tz="UTC"))
        else:
            array = pa.array(values)
        known = COLUMNS.get(name)
        metadata = {}
        if known is not None:
            metadata = {k: v for k, v in known._asdict().items() if v}
        arrays.append(array)
        fields.append(pa.field(name, array.type, metadata=metadata or None))
    return pa.Table.from_arrays(arrays, schema=pa.schema(fields))


def require(module: str, what: str, extra: str) -> Any:
    """The optional `module`, imported now, or `MissingPackage` that says what to install."""
    import importlib

    try:
        return importlib.import_module(module)
    except ImportError as error:
        raise MissingPackage(f"{what}: {module} is not installed; pip install '{extra}'") from error


class Ragged:
    """Rows of a CSR result by target: `offsets[i]` to `offsets[i+1]` are the rows of target i."""

    __slots__ = ()
    offsets: NDArray[np.int64]

    def __len__(self) -> int:
        """The number of targets."""
        return len(self.offsets) - 1

    def rows(self, target: int) -> slice:
        """The rows of one target, by its row number (negative ones count from the end)."""
        if isinstance(target, bool) or not isinstance(target, (int, np.integer)):
            raise WrongType.of("target", target, "a row number")
        count = len(self)
        if not -count <= target < count:
            raise InvalidArgument.of("target", target, f"row numbers from {-count} to {count - 1}")
        index = int(target) % count
        return slice(int(self.offsets[index]), int(self.offsets[index + 1]))

    def _each(self) -> Iterator[slice]:
        return (slice(int(a), int(b)) for a, b in zip(self.offsets[:-1], self.offsets[1:], strict=True))

    @property
    def counts(self) -> NDArray[np.int64]:
        """How many rows each target has, shape (targets,)."""
        return np.diff(self.offsets)

    @property
    def target(self) -> NDArray[np.int64]:
        """The target of each row, as its row number, shape (rows,)."""
        return np.repeat(np.arange(len(self), dtype=np.int64), self.counts)
