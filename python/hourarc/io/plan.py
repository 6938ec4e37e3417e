"""The plan: one TOML file that says where the telescope stands, what it may do, and how the target table
is laid out.

    [site]       the keywords of `hourarc.Site`; skyline as a list of [azimuth, altitude] pairs in degrees, or
                 the path of a table of two such columns, from the plan's folder
    [limits]     the keywords of `hourarc.Limits`; a value for all targets, "off", or { column = "..." } for
                 each target's own; azimuth_sectors_deg and allowed_intervals as lists of pairs
    [columns]    for each field of a target the table's column: "RA", or 5 (counted from 1), or
                 { column = "RA", unit = "hourangle" }, or { value = 1991.25 } for all rows
    [targets]    layout ("csv", "tsv", "spaces", "ecsv", "fits", "votable", "parquet"), header (true or
                 false), table (the name or number of the table in a FITS or VOTable file), missing (texts
                 for "not known"), kind ("table" or "mpc_orbits", the Minor Planet Center's lines; without it
                 each file is taken for what it looks like), bodies (names such as "moon": targets beside
                 those of the files), ephemeris (an SPK file for bodies, its path counted from the plan's
                 folder)

Only `[site]` is needed. An unknown key is an error that names its line and the nearest known key.
"""

from __future__ import annotations

import hashlib
import inspect
import re
import tomllib
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

import numpy as np

from ..limits import LIMITS
from .columns import ColumnSpec, column_spec
from .fields import COLUMN_KEYS
from .problems import BrokenFile, WrongInput, nearest
from .skyline import read_skyline
from .tables import LAYOUTS
from .targets import TargetLayout, Targets

_KINDS = ("table", "mpc_orbits")
_SECTIONS = ("site", "limits", "columns", "targets")


@dataclass
class Plan:
    """A plan as it was read; `site` and `limits` build the objects that the verbs take."""

    path: Path
    sha256: str
    site_keywords: dict[str, Any]
    limit_keywords: dict[str, Any]
    #: Limits that each target brings along, and the column they stand in.
    limit_columns: dict[str, str | int] = field(default_factory=dict)
    columns: dict[str, ColumnSpec] = field(default_factory=dict)
    layout: TargetLayout = field(default_factory=TargetLayout)
    #: Bodies of the solar system that are targets beside those of the files.
    bodies: tuple[str, ...] = ()
    #: The SPK file for bodies, or None for the built-in ephemeris.
    ephemeris: Path | None = None
    _text: str = ""

    def site(self) -> Any:
        """The `hourarc.Site` of this plan."""
        import hourarc

        keywords = dict(self.site_keywords)
        with self._blaming("site"):
            return hourarc.Site(**keywords)

    def limits(self, targets: Targets | None = None, start: int = 0, stop: int | None = None) -> Any:
        """The `hourarc.Limits` of this plan, with the columns that it takes from (a slice of) the targets."""
        import hourarc

        own = (
            {key: targets.limits[key][start:stop] for key in self.limit_columns}
            if targets is not None
            else {}
        )
        with self._blaming("limits"):
            return hourarc.Limits(**self.limit_keywords, **own)

    def _blaming(self, section: str) -> _Blame:
        return _Blame(self, section)

    def where(self, section: str, key: str | None = None) -> str:
        """The file, the line if it can be found, and the section: the beginning of a message."""
        line = find_line(self._text, section, key)
        return f"{self.path}{f', line {line}' if line else ''}, [{section}]"


class _Blame:
    """Turns a complaint about a keyword into one about the plan's line that has it."""

    def __init__(self, plan: Plan, section: str) -> None:
        self._plan, self._section = plan, section

    def __enter__(self) -> None:
        return None

    def __exit__(self, kind: type[BaseException] | None, error: BaseException | None, _: object) -> None:
        if kind is None or not isinstance(error, (ValueError, TypeError)) or isinstance(error, WrongInput):
            return
        # As the plan has it: the section is named anyway, and TOML has no None.
        message = _in_the_plan(re.sub(r"^(Site|Limits): ", "", str(error)))
        keys = self._plan.site_keywords if self._section == "site" else self._plan.limit_keywords
        # The complaint names the keyword, or the quantity in plain words ("height of the site").
        words = {key: re.sub(r"_(deg|m|hpa|c|um|h|s)$", "", key).replace("_", " ") for key in keys}
        key = next((k for k in keys if re.search(rf"\b({re.escape(k)}|{words[k]})\b", message)), None)
        raise WrongInput(f"{self._plan.where(self._section, key)}: {message}") from error


def read_plan(path: str | Path) -> Plan:
    """Reads a plan and checks its words; the numbers are checked by `Plan.site` and `Plan.limits`."""
    import hourarc

    path = Path(path)
    raw = path.read_bytes()
    try:
        text = raw.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        raise BrokenFile(f"{path}: not a text file in UTF-8, byte {error.start} cannot be read") from error
    try:
        data = tomllib.loads(text)
    except tomllib.TOMLDecodeError as error:
        raise WrongInput(f"{path}: not a TOML file: {error}") from error
    plan = Plan(path, hashlib.sha256(raw).hexdigest(), {}, {}, _text=text)
    for section, content in data.items():
        line = _at(find_line(text, section, None) or find_line(text, None, section))
        if section not in _SECTIONS and not isinstance(content, dict):
            raise WrongInput(
                f"{path}{line}: {section} stands in no section; the sections are {', '.join(_SECTIONS)}"
            )
        if section not in _SECTIONS:
            raise WrongInput(f'{path}{line}: unknown section "{section}"; {nearest(section, _SECTIONS)}')
        if not isinstance(content, dict):
            raise WrongInput(
                f"{path}{line}: {section} is given {content!r}; it is a section, written [{section}]"
            )
    if "site" not in data:
        raise WrongInput(f"{path}: there is no [site]; it needs at least longitude_deg and latitude_deg")

    site = data["site"]
    site_keys = _keywords(hourarc.Site)
    _check_keys(plan, "site", site, site_keys)
    for key in ("longitude_deg", "latitude_deg"):
        if key not in site:
            raise WrongInput(f"{plan.where('site')}: {key} is missing")
    plan.site_keywords = {key: _site_value(plan, key, value) for key, value in site.items()}

    limits = data.get("limits", {})
    _check_keys(plan, "limits", limits, _keywords(hourarc.Limits))
    for key, value in limits.items():
        if isinstance(value, dict):
            if not LIMITS[key].by_target:
                raise WrongInput(
                    f"{plan.where('limits', key)}: {key} is given {value!r}; it is one for all targets, "
                    f"allowed {_in_the_plan(LIMITS[key].allowed())}"
                )
            if (
                set(value) != {"column"}
                or isinstance(value["column"], bool)
                or not isinstance(value["column"], (str, int))
            ):
                raise WrongInput(
                    f"{plan.where('limits', key)}: {key} is given {value!r}; a value, "
                    'or { column = "..." } to take each target\'s own from the table'
                )
            plan.limit_columns[key] = value["column"]
        elif isinstance(value, list) and LIMITS[key].by_target:
            raise WrongInput(
                f"{plan.where('limits', key)}: {key} is given {value!r}; one value, "
                'or { column = "..." } to take each target\'s own from the table'
            )
        else:
            # TOML has no word for nothing: "off" switches a limit off that is on by default.
            plan.limit_keywords[key] = None if value == "off" else value

    columns = data.get("columns", {})
    _check_keys(plan, "columns", columns, COLUMN_KEYS)
    plan.columns = {
        key: column_spec(key, value, plan.where("columns", key)) for key, value in columns.items()
    }
    plan.layout = _layout(plan, data.get("targets", {}))
    plan.bodies = _bodies(plan, data.get("targets", {}))
    if (kernel := data.get("targets", {}).get("ephemeris")) is not None:
        if not isinstance(kernel, str):
            raise WrongInput(
                f"{plan.where('targets', 'ephemeris')}: ephemeris is given {kernel!r}; a path is needed"
            )
        plan.ephemeris = path.parent / kernel
    return plan


def find_line(text: str, section: str | None, key: str | None) -> int | None:
    """The line, from 1, of `key` in `[section]`, of the section's heading without a key, or None."""
    bare = re.escape(key) if key is not None else ""
    current: str | None = None
    for number, line in enumerate(text.splitlines(), start=1):
        heading = re.match(r"\s*\[\s*\"?([^\]\"]+?)\"?\s*\]", line)
        if heading:
            current = heading[1]
            # [columns.ra] is the long form of ra = { ... } in [columns].
            if current == (section if key is None else f"{section}.{key}"):
                return number
        elif key is not None:
            here = current == section and re.match(rf"\s*\"?{bare}\"?\s*[.=]", line)
            dotted = section is not None and re.match(rf"\s*{re.escape(section)}\.{bare}\s*[.=]", line)
            if here or dotted:
                return number
    return None


def _in_the_plan(allowed: str) -> str:
    """What is allowed, in TOML's words."""
    return allowed.replace("or None (off)", 'or "off"').replace("True or False", "true or false")


def _at(line: int | None) -> str:
    return f", line {line}" if line else ""


def _keywords(of: Any) -> tuple[str, ...]:
    """The keywords a class is made with: the plan knows no list of its own."""
    return tuple(name for name in inspect.signature(of).parameters if name != "self")


def _check_keys(plan: Plan, section: str, content: dict[str, Any], known: tuple[str, ...]) -> None:
    for key in content:
        if key not in known:
            raise WrongInput(f'{plan.where(section, key)}: unknown key "{key}"; {nearest(key, known)}')


def _site_value(plan: Plan, key: str, value: Any) -> Any:
    if key == "name":
        if not isinstance(value, str):
            raise WrongInput(f"{plan.where('site', key)}: name is given {value!r}; a text is needed")
        return value
    if key == "skyline" and isinstance(value, str):
        return read_skyline(plan.path.parent / value, plan.where("site", key))
    if key == "skyline":
        try:
            pairs = np.array(value, dtype=np.float64)
        except (TypeError, ValueError):
            pairs = np.empty(0)
        if pairs.ndim != 2 or pairs.shape[1] != 2:
            raise WrongInput(
                f"{plan.where('site', key)}: skyline is given {value!r}; "
                "a list of [azimuth, altitude] pairs in degrees is needed, or the path of a table of them"
            )
        return pairs
    if isinstance(value, bool) or not isinstance(value, (int, float)):
        raise WrongInput(f"{plan.where('site', key)}: {key} is given {value!r}; a number is needed")
    return float(value)


def _layout(plan: Plan, content: dict[str, Any]) -> TargetLayout:
    _check_keys(
        plan, "targets", content, ("layout", "kind", "header", "table", "missing", "bodies", "ephemeris")
    )
    layouts = tuple(dict.fromkeys(LAYOUTS.values()))

    def wrong(key: str, needed: str) -> WrongInput:
        return WrongInput(
            f"{plan.where('targets', key)}: {key} is given {content[key]!r}; {needed} is needed"
        )

    layout, header, table, missing = (content.get(key) for key in ("layout", "header", "table", "missing"))
    if layout is not None and layout not in layouts:
        raise wrong("layout", "one of " + ", ".join(layouts))
    kind = content.get("kind")
    if kind is not None and kind not in _KINDS:
        raise wrong("kind", "one of " + ", ".join(_KINDS))
    if header is not None and not isinstance(header, bool):
        raise wrong("header", "true or false")
    if table is not None and (isinstance(table, bool) or not isinstance(table, (int, str))):
        raise wrong("table", "the table's name or number")
    if missing is not None and not (isinstance(missing, list) and all(isinstance(m, str) for m in missing)):
        raise wrong("missing", "a list of texts")
    return TargetLayout(layout, kind, header, table, tuple(missing or ()))


def _bodies(plan: Plan, content: dict[str, Any]) -> tuple[str, ...]:
    import hourarc

    names = content.get("bodies", [])
    if not isinstance(names, list):
        raise WrongInput(
            f"{plan.where('targets', 'bodies')}: bodies is given {names!r}; a list of names is needed"
        )
    try:
        return tuple(map(str, hourarc.Bodies(names).name))
    except (ValueError, TypeError) as error:
        said = str(error).removeprefix("Bodies: name: ")
        raise WrongInput(f"{plan.where('targets', 'bodies')}: bodies: {said}") from error
