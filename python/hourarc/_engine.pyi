"""The compiled engine, as the package sees it. Not public: use the nouns and verbs of `hourarc`.

Arrays are one-dimensional and C-contiguous unless said. Instants are int64 nanoseconds of UTC since 1970,
a datetime64[ns] viewed; NaT is the least int64. `workers` is a number of threads, 0 for all cores, and one of
`instruction_sets()`. A test holds this file and the binary together.
"""

from collections.abc import Callable
from typing import Any, final

import numpy as np
from numpy.typing import NDArray

_Floats = NDArray[np.float64]
_Nanoseconds = NDArray[np.int64]
_Bytes = NDArray[np.uint8]

__all__ = [
    "Bodies",
    "Catalog",
    "Orbits",
    "Orientation",
    "Site",
    "Watch",
    "airmass_model_words",
    "almanac",
    "bias_precession_nutation",
    "body_words",
    "debug_build",
    "event_status_words",
    "explain",
    "first_bad_status",
    "grid_quantities",
    "instruction_sets",
    "phase_scale_words",
    "place",
    "position_angle",
    "precession_nutation",
    "reason_words",
    "rise_transit_set",
    "rotation_angle",
    "separation",
    "sidereal_time",
    "slots",
    "status_words",
    "version",
    "visibility_grid",
    "windows",
    "windows_after_gap",
]

version: str
debug_build: bool
first_bad_status: int

@final
class Site:
    def __new__(
        cls,
        longitude_deg: float,
        latitude_deg: float,
        height_m: float,
        pressure_hpa: float | None,
        temperature_c: float,
        relative_humidity: float,
        wavelength_um: float,
        sky_extinction_mag: float,
        dark_sky_mag_arcsec2: float,
        skyline_azimuth_deg: _Floats | None,
        skyline_altitude_deg: _Floats | None,
    ) -> Site: ...
    @property
    def pressure_hpa(self) -> float: ...
    @property
    def lowest_altitude_deg(self) -> float: ...
    @property
    def horizon_dip_deg(self) -> float: ...

@final
class Catalog:
    def __new__(
        cls,
        ra_deg: _Floats,
        dec_deg: _Floats,
        epoch_yr: _Floats,
        pm_ra_mas_yr: _Floats,
        pm_dec_mas_yr: _Floats,
        parallax_mas: _Floats,
        radial_velocity_km_s: _Floats,
    ) -> Catalog: ...
    def __len__(self) -> int: ...
    @property
    def status(self) -> _Bytes: ...

@final
class Bodies:
    def __new__(cls, words: list[str], kernel: str | None) -> Bodies: ...
    def __len__(self) -> int: ...
    def states(self, mjd_tdb: _Floats, fraction: _Floats) -> _Floats: ...
    @property
    def ephemeris(self) -> str: ...

@final
class Orbits:
    def __new__(
        cls,
        epoch_mjd_tt: _Floats,
        eccentricity: _Floats,
        inclination_deg: _Floats,
        node_deg: _Floats,
        perihelion_argument_deg: _Floats,
        size_au: _Floats,
        place: _Floats,
        by_mean_anomaly: bool,
        h_mag: _Floats,
        slope_g: _Floats,
        slope_g2: _Floats | None,
    ) -> Orbits: ...
    @staticmethod
    def from_mpc(
        text: str,
    ) -> tuple[Orbits, list[str], NDArray[np.int64], list[tuple[int, int, int, str]]]: ...
    @staticmethod
    def from_rows(numbers: _Floats) -> Orbits: ...
    def __len__(self) -> int: ...
    @property
    def status(self) -> _Bytes: ...
    def rows(self) -> _Floats: ...
    def elements(self) -> dict[str, _Floats]: ...
    def advance(self, to_mjd_tt: float, workers: tuple[int, str]) -> Orbits: ...
    def drift_au(self, mjd_tt: float) -> _Floats: ...

@final
class Orientation:
    @staticmethod
    def tables(
        leap_seconds: tuple[str, str], c04: tuple[str, str] | None, finals: tuple[str, str] | None
    ) -> Orientation: ...
    @staticmethod
    def constant(
        leap_seconds: tuple[str, str],
        dut1_s: float,
        xp_arcsec: float,
        yp_arcsec: float,
        dx_mas: float,
        dy_mas: float,
    ) -> Orientation: ...
    def at(self, utc_ns: _Nanoseconds) -> dict[str, NDArray[Any]]: ...
    def provenance(self) -> dict[str, int | None]: ...

@final
class Watch:
    def __new__(
        cls,
        site: Site,
        targets: Catalog | Bodies | Orbits,
        orientation: Orientation,
        start_ns: int,
        stop_ns: int,
        offsets: _Nanoseconds,
        start: _Nanoseconds,
        stop: _Nanoseconds,
        stop_reason: _Bytes,
        status: _Bytes,
        workers: tuple[int, str],
    ) -> Watch: ...
    def at(
        self,
        site: Site,
        targets: Catalog | Bodies | Orbits,
        orientation: Orientation,
        utc_ns: int,
        up: NDArray[np.bool_],
        stop_reason: _Bytes,
        status: _Bytes,
        columns: dict[str, _Floats],
        workers: tuple[int, str],
    ) -> None: ...

def place(
    site: Site,
    targets: Catalog | Bodies | Orbits,
    orientation: Orientation,
    utc_ns: _Nanoseconds,
    columns: dict[str, _Floats],
    status: _Bytes,
    pairwise: bool,
    workers: tuple[int, str],
) -> None: ...
def rise_transit_set(
    site: Site,
    targets: Catalog | Bodies | Orbits,
    orientation: Orientation,
    start_ns: int,
    stop_ns: int,
    altitude_deg: float,
    workers: tuple[int, str],
) -> dict[str, NDArray[Any]]: ...
def almanac(site: Site, orientation: Orientation, first_mjd: int, nights: int) -> dict[str, NDArray[Any]]: ...
def windows(
    site: Site,
    targets: Catalog | Bodies | Orbits,
    orientation: Orientation,
    start_ns: int,
    stop_ns: int,
    limits: dict[str, Any],
    position_error_mas: float | _Floats | None,
    workers: tuple[int, str],
) -> dict[str, NDArray[Any]]: ...
def explain(
    site: Site,
    targets: Catalog | Bodies | Orbits,
    row: int,
    orientation: Orientation,
    start_ns: int,
    stop_ns: int,
    limits: dict[str, Any],
) -> list[tuple[int, _Nanoseconds, _Nanoseconds]]: ...
def slots(
    start: _Nanoseconds, stop: _Nanoseconds, origin_ns: int, step_ns: int, duration_ns: int
) -> tuple[_Nanoseconds, _Nanoseconds]: ...
def windows_after_gap(
    offsets: _Nanoseconds,
    start: _Nanoseconds,
    stop: _Nanoseconds,
    last_visit_ns: _Nanoseconds,
    gap_ns: int,
) -> tuple[_Nanoseconds, _Nanoseconds, _Nanoseconds, NDArray[np.bool_]]: ...
def visibility_grid(
    site: Site,
    targets: Catalog | Bodies | Orbits,
    orientation: Orientation,
    first_mjd: int,
    nights: int,
    limits: dict[str, Any],
    quantities: dict[str, NDArray[np.float32] | _Floats],
    progress: Callable[[int], object] | None,
    workers: tuple[int, str],
) -> dict[str, NDArray[Any]]: ...
def grid_quantities() -> list[tuple[str, bool]]: ...
def rotation_angle(ut1_mjd: _Floats, ut1_fraction: _Floats) -> _Floats: ...
def sidereal_time(
    ut1_mjd: _Floats, ut1_fraction: _Floats, tt_mjd: _Floats, tt_fraction: _Floats, apparent: bool
) -> _Floats: ...
def precession_nutation(tt_mjd: _Floats, tt_fraction: _Floats) -> _Floats: ...
def bias_precession_nutation(tt_mjd: _Floats, tt_fraction: _Floats) -> _Floats: ...
def separation(lon1_deg: _Floats, lat1_deg: _Floats, lon2_deg: _Floats, lat2_deg: _Floats) -> _Floats: ...
def position_angle(lon1_deg: _Floats, lat1_deg: _Floats, lon2_deg: _Floats, lat2_deg: _Floats) -> _Floats: ...
def reason_words() -> list[str]: ...
def status_words() -> dict[int, str]: ...
def event_status_words() -> list[str]: ...
def body_words() -> list[str]: ...
def airmass_model_words() -> list[str]: ...
def phase_scale_words() -> list[str]: ...
def instruction_sets() -> list[str]: ...
