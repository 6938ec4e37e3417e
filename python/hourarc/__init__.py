"""Hourarc: when can this telescope observe each of very many targets?

Angles are degrees and names end in their unit. Times are UTC: numpy datetime64, ISO strings, datetimes or
astropy Times; results are datetime64[ns]. Results are small frozen objects with plain numpy columns.

    import hourarc as ha
    site = ha.Site(24.5127, -20.8714, 1148.0, name="Saltpan Ridge")
    stars = ha.Catalog([83.8, 201.3], [-5.4, -43.0])
    found = ha.windows(site, stars, "2026-03-10T16:00", "2026-03-11T16:00", ha.Limits(airmass_max=1.8))

Pointing at or near the Sun can blind a person and destroy an instrument: the Sun limit here is for planning
and is never the interlock. Not for navigation, aviation, or legal time.
"""

from __future__ import annotations

from . import _engine, earth, errors
from ._columns import instruction_set
from .almanac import Almanac, almanac
from .demand import Demand, demand
from .earth import Orientation
from .errors import HourarcError, HourarcWarning
from .events import Event, Events, rise_transit_set
from .explain import Explanation, explain
from .geometry import position_angle, separation
from .limits import LIMITS, Limits
from .orbits import Orbits, RejectedLine
from .place import PLACE_COLUMNS, Places, place
from .results import STATUS_WORDS
from .season import GRID_QUANTITIES, Grid, visibility_grid
from .season_summary import SeasonSummary
from .site import Site
from .slots import Revisits, Slots, after_gap, slots
from .targets import Bodies, Catalog
from .watch import WATCH_COLUMNS, Moment, Watch
from .windows import REASON_WORDS, Window, Windows, windows

__version__: str = _engine.version

__all__ = [
    "GRID_QUANTITIES",
    "LIMITS",
    "PLACE_COLUMNS",
    "REASON_WORDS",
    "STATUS_WORDS",
    "WATCH_COLUMNS",
    "Almanac",
    "Bodies",
    "Catalog",
    "Demand",
    "Event",
    "Events",
    "Explanation",
    "Grid",
    "HourarcError",
    "HourarcWarning",
    "Limits",
    "Moment",
    "Orbits",
    "Orientation",
    "Places",
    "RejectedLine",
    "Revisits",
    "SeasonSummary",
    "Site",
    "Slots",
    "Watch",
    "Window",
    "Windows",
    "__version__",
    "after_gap",
    "almanac",
    "demand",
    "earth",
    "errors",
    "explain",
    "instruction_set",
    "place",
    "position_angle",
    "rise_transit_set",
    "separation",
    "slots",
    "visibility_grid",
    "windows",
]

if _engine.debug_build:
    import warnings

    warnings.warn(
        "hourarc's extension is a debug build: its answers are right, its speed is not",
        errors.DebugBuildWarning,
        stacklevel=2,
    )
