"""A site: where the telescope stands, the air above it, and the skyline around it."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import ArrayLike

from . import _engine, interop
from ._columns import Floats, numbers, read_only, scalar
from .errors import InvalidArgument, WrongType

if TYPE_CHECKING:
    from astropy.coordinates import EarthLocation

__all__ = ["Site", "as_site"]


class Site:
    """A telescope's place on the Earth (geodetic, WGS 84), its atmosphere and its skyline.

    * ``longitude_deg``: east positive, -360 to 360 degrees. ``latitude_deg``: -90 to 90.
    * ``height_m``: above the ellipsoid, -500 to 10,000 m.
    * ``name``: any text; it is only carried along.
    * ``pressure_hpa``: at the site. None is the standard atmosphere at the height; 0 is no refraction,
      and observed altitudes are then topocentric ones.
    * ``temperature_c``, ``relative_humidity`` (0 to 1), ``wavelength_um``: for the refraction.
    * ``sky_extinction_mag``: extinction in V, magnitudes an airmass, 0.01 to 2; ``dark_sky_mag_arcsec2``: the
      dark zenith in V, 15 to 25. For the brightness of the sky (Krisciunas & Schaefer 1991, whose values for
      Mauna Kea are the defaults).
    * ``skyline``: altitude of the local horizon against azimuth: an array (n, 2) of azimuth (north
      through east, 0 to 360, in order) and altitude in degrees, or None. Between the points run straight
      lines, through north too; two points at one azimuth are a step. Targets below it are not observed,
      unless ``Limits(skyline=False)`` says so.

    The refraction is tabulated once, here: within 0.1″ of the published ray trace from the zenith to an
    altitude of 10°, within 0.1′ at the horizon (`tests/test_accuracy_refraction.py`). A Site does not change.
    """

    __slots__ = (
        "_handle",
        "dark_sky_mag_arcsec2",
        "height_m",
        "latitude_deg",
        "longitude_deg",
        "name",
        "pressure_hpa",
        "relative_humidity",
        "sky_extinction_mag",
        "skyline",
        "temperature_c",
        "wavelength_um",
    )

    _handle: _engine.Site
    longitude_deg: float
    latitude_deg: float
    height_m: float
    name: str
    pressure_hpa: float
    """The pressure in force, hPa: what was given, or the standard atmosphere's at the height."""
    temperature_c: float
    relative_humidity: float
    wavelength_um: float
    sky_extinction_mag: float
    dark_sky_mag_arcsec2: float
    skyline: Floats | None
    """The skyline as given, shape (n, 2), degrees, or None."""

    def __init__(
        self,
        longitude_deg: float,
        latitude_deg: float,
        height_m: float = 0.0,
        *,
        name: str = "",
        pressure_hpa: float | None = None,
        temperature_c: float = 10.0,
        relative_humidity: float = 0.3,
        wavelength_um: float = 0.55,
        sky_extinction_mag: float = 0.172,
        dark_sky_mag_arcsec2: float = 21.587,
        skyline: ArrayLike | None = None,
    ) -> None:
        place = {
            "longitude_deg": scalar(longitude_deg, "Site: longitude_deg", "deg"),
            "latitude_deg": scalar(latitude_deg, "Site: latitude_deg", "deg"),
            "height_m": scalar(height_m, "Site: height_m", "m"),
        }
        pressure = None if pressure_hpa is None else scalar(pressure_hpa, "Site: pressure_hpa", "hPa")
        air = {
            "temperature_c": scalar(temperature_c, "Site: temperature_c", "deg_C"),
            "relative_humidity": scalar(relative_humidity, "Site: relative_humidity"),
            "wavelength_um": scalar(wavelength_um, "Site: wavelength_um", "um"),
            "sky_extinction_mag": scalar(sky_extinction_mag, "Site: sky_extinction_mag", "mag"),
            "dark_sky_mag_arcsec2": scalar(
                dark_sky_mag_arcsec2, "Site: dark_sky_mag_arcsec2", "mag / arcsec2"
            ),
        }
        if not isinstance(name, str):
            raise WrongType.of("Site: name", name, "text")
        horizon = None if skyline is None else _skyline(skyline)
        azimuth = None if horizon is None else np.ascontiguousarray(horizon[:, 0])
        altitude = None if horizon is None else np.ascontiguousarray(horizon[:, 1])
        made = _engine.Site(
            longitude_deg=place["longitude_deg"],
            latitude_deg=place["latitude_deg"],
            height_m=place["height_m"],
            pressure_hpa=pressure,
            temperature_c=air["temperature_c"],
            relative_humidity=air["relative_humidity"],
            wavelength_um=air["wavelength_um"],
            sky_extinction_mag=air["sky_extinction_mag"],
            dark_sky_mag_arcsec2=air["dark_sky_mag_arcsec2"],
            skyline_azimuth_deg=azimuth,
            skyline_altitude_deg=altitude,
        )
        for attribute, value in {
            **place,
            **air,
            "_handle": made,
            "name": name,
            "pressure_hpa": made.pressure_hpa,
            "skyline": horizon,
        }.items():
            object.__setattr__(self, attribute, value)

    @classmethod
    def from_earth_location(cls, location: EarthLocation, **keywords: Any) -> Site:
        """A site from one astropy EarthLocation; `keywords` are those of `Site`."""
        return cls(*interop.location_degrees(location), **keywords)

    def to_earth_location(self) -> EarthLocation:
        """The place as an astropy EarthLocation (without the atmosphere and the skyline)."""
        return interop.earth_location(self.longitude_deg, self.latitude_deg, self.height_m)

    @property
    def lowest_altitude_deg(self) -> float:
        """The lowest observed altitude for which the refraction is tabulated, degrees."""
        return self._handle.lowest_altitude_deg

    @property
    def horizon_dip_deg(self) -> float:
        """How far the sea horizon lies below the horizontal plane, refraction included, degrees."""
        return self._handle.horizon_dip_deg

    def __setattr__(self, attribute: str, value: object) -> None:
        raise AttributeError(f"Site: {attribute} cannot be set; a Site does not change")

    def _described(self) -> dict[str, Any]:
        """Everything that makes this site, by keyword."""
        return {key: getattr(self, key) for key in self.__slots__ if key != "_handle"}

    def __reduce__(self) -> tuple[Any, ...]:
        return _site_again, (self._described(),)

    def __eq__(self, other: object) -> bool:
        if not isinstance(other, Site):
            return NotImplemented
        mine, theirs = self._described(), other._described()
        if not _same(mine.pop("skyline"), theirs.pop("skyline")):
            return False
        return mine == theirs

    def __hash__(self) -> int:
        return hash((self.longitude_deg, self.latitude_deg, self.height_m, self.name))

    def __repr__(self) -> str:
        name = f" {self.name!r}" if self.name else ""
        horizon = "" if self.skyline is None else f", skyline of {len(self.skyline)} points"
        return (
            f"<Site{name} longitude {self.longitude_deg:.6f}, latitude {self.latitude_deg:.6f}, "
            f"{self.height_m:.1f} m, {self.pressure_hpa:.1f} hPa{horizon}>"
        )


def as_site(site: Any) -> Site:
    """`site` as every verb takes it: a Site, or an astropy EarthLocation (with the standard atmosphere)."""
    if isinstance(site, Site):
        return site
    if interop.is_earth_location(site):
        return Site.from_earth_location(site)
    raise WrongType.of("site", site, "a Site or an astropy EarthLocation")


def _skyline(given: ArrayLike) -> Floats:
    points = numbers(given, "Site: skyline", "deg")
    if points.ndim != 2 or points.shape[1] != 2:
        raise InvalidArgument.of(
            "Site: skyline",
            f"an array of shape {points.shape}",
            "shape (n, 2): azimuth and altitude in degrees",
        )
    return read_only(points.copy())


def _same(one: Floats | None, other: Floats | None) -> bool:
    if one is None or other is None:
        return one is other
    return np.array_equal(one, other)


def _site_again(keywords: dict[str, Any]) -> Site:
    return Site(**keywords)
