"""The fields of a target, the column names that are understood for each, and the units of those columns.

Names are matched without regard to case, spaces, hyphens and underscores. Where a public catalogue names
its columns in its own way (Hipparcos: `RArad`, `DErad`, `Plx`, `pmDE`; Gaia: `ref_epoch`, `source_id`),
that name is understood too.
"""

from __future__ import annotations

from dataclasses import dataclass

from .problems import WrongInput

#: Each kind of quantity: the factor from a unit to the unit used inside (degrees, mas/yr, mas, km/s).
_UNITS: dict[str, dict[str, float]] = {
    "angle": {
        "deg": 1.0,
        "rad": 57.29577951308232,
        "hourangle": 15.0,
        "arcmin": 1 / 60,
        "arcsec": 1 / 3600,
        "mas": 1 / 3.6e6,
    },
    "motion": {
        "mas/yr": 1.0,
        "arcsec/yr": 1e3,
        "uas/yr": 1e-3,
        "deg/yr": 3.6e6,
        "rad/yr": 206264806.24709636,
    },
    "parallax": {"mas": 1.0, "arcsec": 1e3, "uas": 1e-3, "deg": 3.6e6, "rad": 206264806.24709636},
    "velocity": {"km/s": 1.0, "m/s": 1e-3},
    # Epochs are Julian years; day counts are turned into them with an offset (see `to_field_unit`).
    "epoch": {"yr": 1.0, "mjd": 1 / 365.25, "jd": 1 / 365.25},
}

#: How units are spelt in files (FITS, VOTable, ECSV and by hand), against the word used here.
_SPELLINGS = {
    "degree": "deg",
    "degrees": "deg",
    "d": "deg",
    "°": "deg",
    "radian": "rad",
    "radians": "rad",
    "h": "hourangle",
    "hr": "hourangle",
    "hour": "hourangle",
    "hours": "hourangle",
    "arcminute": "arcmin",
    "'": "arcmin",
    "arcsecond": "arcsec",
    "arcseconds": "arcsec",
    "as": "arcsec",
    '"': "arcsec",
    "milliarcsecond": "mas",
    "marcsec": "mas",
    "microarcsecond": "uas",
    "µas": "uas",
    "μas": "uas",
    "muas": "uas",
    "uarcsec": "uas",
    "year": "yr",
    "years": "yr",
    "a": "yr",
    "jyear": "yr",
    "julianyear": "yr",
}

#: Sexagesimal text: the unit that says what its first number counts.
_SEXAGESIMAL = {
    "h:m:s": "hms",
    "hms": "hms",
    "hh:mm:ss": "hms",
    "d:m:s": "dms",
    "dms": "dms",
    "dd:mm:ss": "dms",
}


@dataclass(frozen=True)
class Field:
    """One quantity of a target: its key in `[columns]`, its unit inside, and what is allowed."""

    key: str
    kind: str
    unit: str
    low: float
    high: float
    needed: bool
    #: The value for every row when the table has no such column, and for a row where the cell is empty.
    default: float
    #: Squashed column names (see `squash`) and the unit that the name itself states, if it does.
    aliases: dict[str, str]


FIELDS: dict[str, Field] = {
    f.key: f
    for f in (
        Field(
            "ra",
            "angle",
            "deg",
            -360.0,
            360.0,
            True,
            0.0,
            {
                "ra": "",
                "radeg": "deg",
                "rarad": "rad",
                "rahours": "hourangle",
                "rahour": "hourangle",
                "rah": "hourangle",
                "rightascension": "",
                "raicrs": "",
                "raj2000": "",
                "alpha": "",
            },
        ),
        Field(
            "dec",
            "angle",
            "deg",
            -90.0,
            90.0,
            True,
            0.0,
            {
                "dec": "",
                "de": "",
                "decdeg": "deg",
                "dedeg": "deg",
                "decrad": "rad",
                "derad": "rad",
                "declination": "",
                "deicrs": "",
                "decicrs": "",
                "dej2000": "",
                "decj2000": "",
                "delta": "",
            },
        ),
        Field(
            "pmra",
            "motion",
            "mas/yr",
            -1e5,
            1e5,
            False,
            0.0,
            {"pmra": "", "pmramasyr": "mas/yr", "pmrac": "", "pmracosdec": ""},
        ),
        Field(
            "pmdec",
            "motion",
            "mas/yr",
            -1e5,
            1e5,
            False,
            0.0,
            {"pmdec": "", "pmde": "", "pmdecmasyr": "mas/yr"},
        ),
        Field(
            "parallax",
            "parallax",
            "mas",
            -2e3,
            2e3,
            False,
            0.0,
            {"parallax": "", "plx": "", "parallaxmas": "mas", "plxmas": "mas"},
        ),
        Field(
            "rv",
            "velocity",
            "km/s",
            -3e4,
            3e4,
            False,
            0.0,
            {"rv": "", "radialvelocity": "", "radialvelocitykms": "km/s", "rvkms": "km/s"},
        ),
        Field(
            "epoch",
            "epoch",
            "yr",
            1700.0,
            2300.0,
            False,
            2000.0,
            {"epoch": "", "refepoch": "", "epochyr": "yr", "epochmjd": "mjd", "epochjd": "jd"},
        ),
    )
}

#: Columns that may hold a target's name, the best first. Several may be present; the first found is taken.
NAME_ALIASES = (
    "name",
    "target",
    "targetname",
    "object",
    "mainid",
    "designation",
    "id",
    "sourceid",
    "targetid",
    "hip",
)

#: Columns that may hold the instant of an exposure (UTC), and the unit that the name itself states.
TIME_ALIASES = {
    "time": "",
    "utc": "",
    "timeutc": "",
    "utctime": "",
    "datetime": "",
    "dateobs": "",
    "mjd": "mjd",
    "mjdutc": "mjd",
    "mjdobs": "mjd",
    "jd": "jd",
    "jdutc": "jd",
}

#: The keys of the plan's `[columns]`.
COLUMN_KEYS = ("name", "time", *FIELDS)


def squash(name: str) -> str:
    """A column name without case, spaces, hyphens and underscores."""
    return "".join(c for c in name.lower() if c not in " _-")


def canonical_unit(text: str) -> str:
    """The word used here for a unit spelt in any of the usual ways; unknown spellings come back."""
    bare = "".join(text.split()).lower()
    if bare in _SEXAGESIMAL:
        return _SEXAGESIMAL[bare]
    bare = bare.replace("**", "").replace("^", "").strip("[]()")
    # "mas.yr-1", "mas yr-1", "mas*yr^-1" and "mas/year" are one unit.
    for tail, per in (("yr-1", "/yr"), ("a-1", "/yr"), ("year-1", "/yr"), ("s-1", "/s")):
        if bare.endswith(tail):
            bare = bare[: -len(tail)].rstrip(".*·") + per
            break
    top, slash, bottom = bare.partition("/")
    top = _SPELLINGS.get(top, top)
    if not slash:
        return top
    return f"{top}/{_SPELLINGS.get(bottom, bottom)}"


def unit_for(field: Field, text: str, where: str) -> str:
    """The canonical unit `text` if `field` can have it; otherwise `WrongInput` says what it could have."""
    unit = canonical_unit(text)
    if field.kind == "epoch" and unit == "deg" and text.strip() == "d":
        unit = "mjd"
    if unit in ("hms", "dms") and field.key in ("ra", "dec"):
        if unit == "hms" and field.key == "dec":
            raise WrongInput(
                f'{where}: a declination is never in hours; the unit of sexagesimal degrees is "dms"'
            )
        return unit
    known = _UNITS[field.kind]
    if unit not in known:
        can = (
            [*known, "hms", "dms"]
            if field.key == "ra"
            else [*known, "dms"]
            if field.key == "dec"
            else list(known)
        )
        raise WrongInput(f'{where}: {field.key} cannot be in "{text}"; known: {", ".join(can)}')
    if field.key == "dec" and unit == "hourangle":
        raise WrongInput(
            f"{where}: a declination is never in hours; known: deg, rad, arcmin, arcsec, mas, dms"
        )
    return unit


def scale(field: Field, unit: str) -> float:
    """The factor from `unit` to the field's unit inside. Epochs as day counts need `epoch_offset` too."""
    return 1.0 if unit in ("hms", "dms") else _UNITS[field.kind][unit]


def epoch_offset(unit: str) -> float:
    """What is added to a scaled epoch: J2000.0 is MJD 51544.5."""
    return {"mjd": 2000.0 - 51544.5 / 365.25, "jd": 2000.0 - 2451545.0 / 365.25}.get(unit, 0.0)
