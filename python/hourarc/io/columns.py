"""Which column of a table is which field of a target, and in which unit it is.

Two sources of knowledge: the plan's `[columns]`, which is binding, and the usual names. Whatever is not
certain (two columns for one field, units that contradict each other) is refused with a message that says
how to be certain.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from typing import Any

from .fields import FIELDS, NAME_ALIASES, TIME_ALIASES, canonical_unit, squash, unit_for
from .instants import TIME_UNITS
from .problems import WrongInput, nearest


@dataclass(frozen=True)
class ColumnSpec:
    """One entry of `[columns]`: a column (by name, or by its number from 1), or a value for all rows."""

    column: str | int | None = None
    unit: str | None = None
    value: float | str | None = None


@dataclass(frozen=True)
class Found:
    """A field's column as it stands in the table, its canonical unit, and who stated that unit."""

    column: str | None
    unit: str
    stated: bool
    by_plan: bool
    value: float | str | None = None


def column_spec(key: str, value: Any, where: str) -> ColumnSpec:
    """An entry of `[columns]` as TOML gives it: a name, a number, or a table of column/value and unit."""
    if isinstance(value, (str, int)) and not isinstance(value, bool):
        return ColumnSpec(column=value)
    if not isinstance(value, dict):
        raise WrongInput(
            f"{where}: {key} is given {value!r}; a column's name or number is needed, "
            'or a table such as { column = "RA", unit = "hourangle" } or { value = 2016.0 }'
        )
    for word in value:
        if word not in ("column", "unit", "value"):
            raise WrongInput(
                f'{where}: {key} has an unknown key "{word}"; {nearest(word, ("column", "unit", "value"))}'
            )
    if ("column" in value) == ("value" in value):
        raise WrongInput(f'{where}: {key} needs either "column" or "value", and not both')
    column, unit, constant = value.get("column"), value.get("unit"), value.get("value")
    if "column" in value and (isinstance(column, bool) or not isinstance(column, (str, int))):
        raise WrongInput(
            f"{where}: the column of {key} is given {column!r}; its name or its number from 1 is needed"
        )
    if unit is not None and not isinstance(unit, str):
        raise WrongInput(f'{where}: the unit of {key} is given {unit!r}; a word such as "deg" is needed')
    if (
        "value" in value
        and key in FIELDS
        and (isinstance(constant, bool) or not isinstance(constant, (int, float)))
    ):
        raise WrongInput(f"{where}: the value of {key} is given {constant!r}; a number is needed")
    if unit is not None and key in FIELDS:
        unit_for(FIELDS[key], unit, where)
    if key == "time":
        if "value" in value:
            raise WrongInput(f"{where}: time needs a column; one instant for all rows is `hourarc sky --at`")
        if unit is not None and unit not in TIME_UNITS:
            raise WrongInput(f'{where}: time cannot be in "{unit}"; known: {", ".join(TIME_UNITS)}')
    return ColumnSpec(column, unit, constant)


def find_columns(
    names: list[str],
    units: Mapping[str, str],
    specs: Mapping[str, ColumnSpec],
    source: str,
    *,
    with_time: bool = False,
) -> dict[str, Found]:
    """Every field that has a column or a value; a table without `ra` or `dec` is refused.

    `with_time`: each row has its instant; a table without `time` is refused too.
    """
    _refuse_doubled(names, specs, source, TIME_ALIASES if with_time else ())
    found: dict[str, Found] = {}
    for key in ("name", *FIELDS):
        if key in specs:
            found[key] = _by_plan(key, specs[key], names, units, source)
        elif (usual := _by_usual_name(key, names, units, source)) is not None:
            found[key] = usual
    if with_time and (time := _find_time(names, specs, source)) is not None:
        found["time"] = time
    needed = ("ra", "dec", "time") if with_time else ("ra", "dec")
    missing = [key for key in needed if key not in found]
    if missing:
        raise WrongInput(
            f"{source}: no column for {_and(missing)}; the table has {_listed(names)}. "
            f'Name it in the plan, for example: [columns] {missing[0]} = "{_guess(missing[0], names)}"'
        )
    _refuse_mixed(found, "ra", "dec", ("rad",), source)
    _refuse_mixed(found, "pmra", "pmdec", None, source)
    return found


def _by_plan(key: str, spec: ColumnSpec, names: list[str], units: Mapping[str, str], source: str) -> Found:
    if spec.column is None:
        unit = (
            unit_for(FIELDS[key], spec.unit, f"{source}: [columns] {key}")
            if spec.unit and key in FIELDS
            else ""
        )
        return Found(None, unit or (FIELDS[key].unit if key in FIELDS else ""), True, True, spec.value)
    name = locate(spec.column, names, f"[columns] {key}", source)
    if key not in FIELDS:
        return Found(name, "", True, True)
    in_file = units.get(name)
    if spec.unit is None:
        unit, stated = _unit_from_file(key, name, in_file, source)
        return Found(name, unit, stated, False)
    unit = unit_for(FIELDS[key], spec.unit, f"{source}: [columns] {key}")
    if in_file and canonical_unit(in_file) != unit and unit not in ("hms", "dms", "mjd", "jd"):
        raise WrongInput(f'{source}, column "{name}": the plan says {unit}, the file says {in_file}')
    return Found(name, unit, True, True)


def _find_time(names: list[str], specs: Mapping[str, ColumnSpec], source: str) -> Found | None:
    """The column of instants: that of the plan, or the one with a usual name."""
    if "time" in specs:
        column = specs["time"].column
        assert column is not None  # `column_spec` refuses a value
        name = locate(column, names, "[columns] time", source)
        unit = specs["time"].unit
        return Found(name, unit or TIME_ALIASES.get(squash(name), ""), unit is not None, True)
    hits = [n for n in names if squash(n) in TIME_ALIASES]
    if len(hits) > 1:
        raise _several("time", hits, source)
    return Found(hits[0], TIME_ALIASES[squash(hits[0])], False, False) if hits else None


def locate(column: str | int, names: list[str], who: str, source: str) -> str:
    """The table's name of a column given by name or by number from 1."""
    if isinstance(column, int):
        if not 1 <= column <= len(names):
            raise WrongInput(
                f"{source}: {who} asks for column {column}; the table has columns 1 to {len(names)}"
            )
        return names[column - 1]
    if column not in names:
        raise WrongInput(
            f'{source}: {who} asks for a column "{column}", which the table does not have; '
            f"{nearest(column, names)}"
        )
    return column


def _by_usual_name(key: str, names: list[str], units: Mapping[str, str], source: str) -> Found | None:
    if key == "name":
        squashed = {squash(n): n for n in reversed(names)}
        first = next((squashed[alias] for alias in NAME_ALIASES if alias in squashed), None)
        return Found(first, "", False, False) if first is not None else None
    aliases = FIELDS[key].aliases
    hits = [n for n in names if squash(n) in aliases]
    if not hits:
        return None
    if len(hits) > 1:
        raise _several(key, hits, source)
    unit, stated = _unit_from_file(key, hits[0], units.get(hits[0]), source)
    return Found(hits[0], unit, stated, False)


def _unit_from_file(key: str, name: str, in_file: str | None, source: str) -> tuple[str, bool]:
    """The unit by the file's own statement, by the column's name (`ra_rad`), or the usual one."""
    field = FIELDS[key]
    by_name = field.aliases.get(squash(name), "")
    if in_file and canonical_unit(in_file):
        unit = unit_for(field, in_file, f'{source}, column "{name}"')
        if by_name and by_name != unit:
            raise WrongInput(
                f'{source}, column "{name}": its name says {by_name}, its unit {in_file}; '
                f'say which in the plan: [columns] {key} = {{ column = "{name}", unit = "{by_name}" }}'
            )
        return unit, True
    return by_name or field.unit, bool(by_name)


def _several(key: str, hits: list[str], source: str) -> WrongInput:
    return WrongInput(
        f"{source}: the columns {_listed(hits)} could all be {key}; "
        f'say which in the plan, for example: [columns] {key} = "{hits[0]}"'
    )


def _refuse_doubled(
    names: list[str], specs: Mapping[str, ColumnSpec], source: str, more: Iterable[str]
) -> None:
    """A name that stands twice in the header is refused if anybody could mean it."""
    wanted = {s.column for s in specs.values() if isinstance(s.column, str)}
    usual = {alias for f in FIELDS.values() for alias in f.aliases} | set(NAME_ALIASES) | set(more)
    seen: dict[str, int] = {}
    for position, name in enumerate(names, start=1):
        if name in seen and (name in wanted or squash(name) in usual):
            raise WrongInput(
                f'{source}: the column "{name}" stands twice, as columns {seen[name]} and {position}; '
                "give the right one by its number in the plan's [columns], or rename the other"
            )
        seen.setdefault(name, position)


def _refuse_mixed(
    found: Mapping[str, Found], one: str, other: str, only: tuple[str, ...] | None, source: str
) -> None:
    """Two fields that belong together and whose units differ, unless the plan states both."""
    if one not in found or other not in found:
        return
    a, b = found[one], found[other]
    if a.unit == b.unit or (a.by_plan and b.by_plan):
        return
    if only is not None and a.unit not in only and b.unit not in only:
        return
    raise WrongInput(
        f'{source}: mixed units, {one} (column "{a.column}") in {_said(a)} '
        f'but {other} (column "{b.column}") in {_said(b)}; '
        f"if that is meant, state both units in the plan's [columns], for example: "
        f'{one} = {{ column = "{a.column}", unit = "{a.unit}" }}'
    )


def _said(found: Found) -> str:
    return found.unit if found.stated else f"{found.unit} (assumed, none is stated)"


def _listed(names: list[str]) -> str:
    shown = ", ".join(f'"{n}"' for n in names[:20])
    return shown + (f" and {len(names) - 20} more" if len(names) > 20 else "")


def _and(words: list[str]) -> str:
    return words[0] if len(words) == 1 else f"{', '.join(words[:-1])} and {words[-1]}"


def _guess(key: str, names: list[str]) -> str:
    """The column that most looks like the field, for the example in a message."""
    likely = {"ra": ("ra", "right", "alpha"), "dec": ("de", "delta"), "time": ("t", "date", "mjd", "obs")}[
        key
    ]
    return next((n for n in names if squash(n).startswith(likely)), "...")
