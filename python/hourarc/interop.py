"""To and from astropy: the only place that imports it, and only inside functions.

Nothing here runs unless a caller passes an astropy object or asks for one.
"""

from __future__ import annotations

import sys
import warnings
from collections.abc import Mapping
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from .errors import InvalidArgument, LeapSecondWarning, MissingPackage, WrongType
from .results import COLUMNS, Coded, words

if TYPE_CHECKING:
    from astropy.coordinates import EarthLocation
    from astropy.table import QTable

__all__ = [
    "catalog_columns",
    "is_earth_location",
    "is_sky_coord",
    "is_time",
    "location_degrees",
    "quantity_value",
    "table",
    "time_to_nanoseconds",
]


def _is_a(value: Any, module: str, name: str) -> bool:
    """Whether `value` is of an astropy class, without importing astropy: if it is, someone has done so."""
    loaded = sys.modules.get(module)
    kind = getattr(loaded, name, None) if loaded is not None else None
    return isinstance(kind, type) and isinstance(value, kind)


def is_time(value: Any) -> bool:
    """Whether `value` is an astropy Time."""
    return _is_a(value, "astropy.time", "Time")


def is_sky_coord(value: Any) -> bool:
    """Whether `value` is an astropy SkyCoord."""
    return _is_a(value, "astropy.coordinates", "SkyCoord")


def is_earth_location(value: Any) -> bool:
    """Whether `value` is an astropy EarthLocation."""
    return _is_a(value, "astropy.coordinates", "EarthLocation")


def quantity_value(value: Any, unit: str, what: str) -> NDArray[np.float64]:
    """The numbers of a Quantity (or of a table column with a unit) in `unit`; masked entries are NaN."""
    from astropy import units as u

    try:
        quantity = u.Quantity(getattr(value, "unmasked", value), subok=False)
        numbers = np.asarray(quantity.to_value(u.Unit(unit)), dtype=np.float64)
    except (u.UnitConversionError, u.UnitTypeError) as error:
        given = f"a value in {value.unit}"
        raise InvalidArgument.of(what, given, f"a unit that converts to {unit or 'a pure number'}") from error
    mask = getattr(value, "mask", None)
    return numbers if mask is None else np.where(np.asarray(mask), np.nan, numbers)


def time_to_nanoseconds(time: Any) -> NDArray[np.int64]:
    """An astropy Time of any scale as nanoseconds of UTC, in its own shape, rounded to the nanosecond.

    A local time without a scale is refused. Masked instants are NaT. An instant inside a leap second
    becomes the following midnight, with a `LeapSecondWarning`.
    """
    import erfa

    if time.scale == "local":
        raise InvalidArgument.of("time", "a Time of scale 'local'", "a Time that can be converted to UTC")
    with warnings.catch_warnings():
        # "dubious year" only says that leap seconds to come are unknown: so does our leap-second table.
        warnings.simplefilter("ignore", erfa.ErfaWarning)
        utc = time.utc
        year, month, day, clock = erfa.d2dtf(b"UTC", 9, utc.jd1, utc.jd2)
    if np.any(year < 1678) or np.any(year > 2261):
        raise InvalidArgument.of("time", f"years {np.min(year)} to {np.max(year)}", "years 1678 to 2261")
    months = (np.asarray(year, dtype=np.int64) - 1970) * 12 + np.asarray(month) - 1
    days = months.astype("datetime64[M]").astype("datetime64[D]").view(np.int64) + np.asarray(day) - 1
    hours, minutes, seconds, fraction = (np.asarray(clock[key], dtype=np.int64) for key in "hmsf")
    within_leap = seconds == 60
    if np.any(within_leap):
        warnings.warn(
            f"{np.count_nonzero(within_leap)} instants lie inside a leap second and are taken as the "
            "following midnight, since datetime64 cannot hold 23:59:60",
            LeapSecondWarning,
            stacklevel=4,
        )
        fraction = np.where(within_leap, 0, fraction)
    whole = ((days * 24 + hours) * 60 + minutes) * 60 + seconds
    result: NDArray[np.int64] = np.asarray(whole * 1_000_000_000 + fraction, dtype=np.int64)
    mask = np.asarray(time.mask)
    if np.any(mask):
        result = np.where(mask, np.iinfo(np.int64).min, result)
    return result


def catalog_columns(coordinates: Any) -> dict[str, Any]:
    """The columns of a `Catalog`, by its own keywords, from a SkyCoord in any frame astropy can take to ICRS.

    Carried: proper motion, distance (as parallax), radial velocity, and `obstime` as the epoch (J2000
    without one). A frame that is itself a place of date needs its own `obstime` and location.
    """
    from astropy import units as u
    from astropy.coordinates import ICRS, SkyCoord

    if not isinstance(coordinates, SkyCoord):
        raise WrongType.of("Catalog.from_skycoord", coordinates, "an astropy SkyCoord")
    icrs = coordinates.transform_to(ICRS())
    columns: dict[str, Any] = {"ra_deg": icrs.ra.to_value(u.deg), "dec_deg": icrs.dec.to_value(u.deg)}
    if icrs.data.differentials:
        motion = icrs.data.differentials["s"]
        if hasattr(motion, "d_lon") or hasattr(motion, "d_lon_coslat") or hasattr(motion, "d_x"):
            columns["pm_ra_mas_yr"] = icrs.pm_ra_cosdec.to_value(u.mas / u.yr)
            columns["pm_dec_mas_yr"] = icrs.pm_dec.to_value(u.mas / u.yr)
        # A unit-sphere motion alone has no radial velocity, and one in 1/yr is no velocity.
        velocity = getattr(motion, "d_distance", None) if not hasattr(motion, "d_x") else icrs.radial_velocity
        if velocity is not None and velocity.unit.is_equivalent(u.km / u.s):
            columns["radial_velocity_km_s"] = velocity.to_value(u.km / u.s)
    distance = icrs.distance
    if distance.unit.is_equivalent(u.m):
        columns["parallax_mas"] = 1000.0 / distance.to_value(u.pc)
    obstime = getattr(coordinates, "obstime", None)
    if obstime is not None:
        columns["epoch_yr"] = np.asarray(obstime.tdb.jyear)
    return {key: np.ravel(np.asarray(value, dtype=np.float64)) for key, value in columns.items()}


def location_degrees(location: Any) -> tuple[float, float, float]:
    """Geodetic longitude and latitude (WGS 84), degrees, and height, m, of one EarthLocation."""
    from astropy import units as u
    from astropy.coordinates import EarthLocation

    if not isinstance(location, EarthLocation):
        raise WrongType.of("Site.from_earth_location", location, "an astropy EarthLocation")
    if location.size != 1:
        raise InvalidArgument.of("Site.from_earth_location", f"{location.size} locations", "one location")
    geodetic = location.reshape(()).to_geodetic("WGS84")
    return (
        float(geodetic.lon.to_value(u.deg)),
        float(geodetic.lat.to_value(u.deg)),
        float(geodetic.height.to_value(u.m)),
    )


def earth_location(longitude_deg: float, latitude_deg: float, height_m: float) -> EarthLocation:
    """An EarthLocation on WGS 84."""
    _need("to_earth_location()")
    from astropy import units as u
    from astropy.coordinates import EarthLocation

    return EarthLocation.from_geodetic(
        longitude_deg * u.deg, latitude_deg * u.deg, height_m * u.m, ellipsoid="WGS84"
    )


def table(columns: Mapping[str, Any]) -> QTable:
    """Columns (arrays, or `Coded`) as a QTable: units, UCD and meaning, times as UTC `Time` (NaT masked)."""
    _need("to_table()")
    from astropy import units as u
    from astropy.table import QTable

    made = QTable()
    for name, values in columns.items():
        known = COLUMNS.get(name)
        if isinstance(values, Coded):
            made[name] = words(values.codes, values.names)
        elif values.dtype.kind == "M":
            missing = np.isnat(values)
            filled = np.where(missing, np.datetime64("2000-01-01", "ns"), values.astype("datetime64[ns]"))
            day = np.datetime_data(values.dtype)[0] == "D"
            time = _utc(filled)
            if day:  # a date, not an instant
                time.format, time.out_subfmt = "iso", "date"
            if np.any(missing):
                time[missing] = np.ma.masked
            made[name] = time
        elif known is not None and known.unit:
            made[name] = values * u.Unit(known.unit)
        else:
            made[name] = values
        if known is not None:
            made[name].info.description = known.meaning
            made[name].info.meta = {"ucd": known.ucd}
    return made


def _utc(instants: NDArray[np.datetime64]) -> Any:
    """datetime64[ns] as a UTC Time of that format: the bits that `Time` itself would make of it.

    That one makes a text of each and reads it, some 4 µs each, which is seconds for a table of a million.
    """
    import erfa
    from astropy.time import Time

    days = instants.astype("datetime64[D]")
    months = days.astype("datetime64[M]")
    since_1970 = months.view(np.int64)
    seconds, nanoseconds = np.divmod((instants - days).view(np.int64), 1_000_000_000)
    with warnings.catch_warnings():
        # As in `time_to_nanoseconds`.
        warnings.simplefilter("ignore", erfa.ErfaWarning)
        julian_date = erfa.dtf2d(
            b"UTC",
            since_1970 // 12 + 1970,
            since_1970 % 12 + 1,
            (days - months).view(np.int64) + 1,
            seconds // 3600,
            seconds // 60 % 60,
            seconds % 60 + nanoseconds / 1e9,
        )
        time = Time(*julian_date, format="jd", scale="utc")
    time.format = "datetime64"
    return time


def _need(what: str) -> None:
    try:
        import astropy  # noqa: F401
    except ImportError as error:
        raise MissingPackage(f"{what}: astropy is not installed; pip install 'hourarc[interop]'") from error
