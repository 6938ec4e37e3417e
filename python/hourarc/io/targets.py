"""Reading the list of targets: from any table to columns in degrees, mas/yr, mas, km/s and Julian years.

No row is lost: the number of rows read is the number planned plus the number rejected, and that is checked.
"""

from __future__ import annotations

import hashlib
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np

from ..limits import LIMITS
from .cells import begins_sexagesimal, looks_sexagesimal, numbers, sexagesimal
from .columns import ColumnSpec, Found, find_columns, locate
from .fields import FIELDS, Field, epoch_offset, scale
from .instants import FORM, instants
from .problems import BrokenFile, Rejected, WrongInput
from .tables import open_table

if TYPE_CHECKING:
    import pyarrow as pa


#: Statuses whose word alone would leave a reader asking.
_SAID = {
    "before_utc": "before 1960, when UTC begins",
    "outside_ephemeris": "outside 1900 to 2100, which the ephemeris covers",
}


#: What else than a limit a column may hold for each target, and its range.
_OTHER = {"requested_hours": (0.0, 1e5)}


@dataclass(frozen=True)
class TargetLayout:
    """The plan's `[targets]`: how the file is laid out, where the suffix does not say so."""

    layout: str | None = None
    #: "table" or "mpc_orbits"; None: by what the file holds.
    kind: str | None = None
    header: bool | None = None
    table: int | str | None = None
    #: Texts that stand for "not known", besides an empty cell.
    missing: tuple[str, ...] = ()


@dataclass
class Targets:
    """Targets that can be planned, and the rows that cannot."""

    #: The file, or None for bodies by name.
    path: Path | None
    sha256: str
    rows_read: int
    #: Row in the source, from 1, for each planned target.
    row: np.ndarray
    name: pa.Array
    #: The fields of `fields.FIELDS` by key, in the units inside, float64.
    columns: dict[str, np.ndarray]
    #: Per-target limits that the plan takes from a column.
    limits: dict[str, np.ndarray]
    rejected: Rejected
    #: What a reader should know (notes) and what is probably wrong (warnings).
    notes: list[str] = field(default_factory=list)
    warnings: list[str] = field(default_factory=list)
    #: The instant of each row, UTC, datetime64[ns], if the table was read with them.
    time: np.ndarray | None = None
    #: The names of bodies, where they are the targets: row i is the i-th of them, and there are no columns.
    bodies: tuple[str, ...] = ()
    #: The SPK file that the bodies are from, or None for the built-in ephemeris.
    ephemeris: Path | None = None
    #: The `hourarc.Orbits` of the planned rows, where orbits are the targets: there are no columns either.
    orbits: Any = None

    @property
    def source(self) -> str:
        """Where the targets come from, for messages."""
        return str(self.path) if self.path is not None else "--bodies"

    def __len__(self) -> int:
        return len(self.row)

    def part(self, start: int = 0, stop: int | None = None) -> Any:
        """The planned targets, or a slice of them, as a `hourarc.Catalog`, `Bodies` or `Orbits`."""
        import hourarc

        if self.orbits is not None:
            return self.orbits if (start, stop) == (0, None) else self.orbits[start:stop]
        if self.bodies:
            return hourarc.Bodies([self.bodies[row - 1] for row in self.row[start:stop]], self.ephemeris)
        part = {key: values[start:stop] for key, values in self.columns.items()}
        return hourarc.Catalog(
            part["ra"],
            part["dec"],
            epoch_yr=part["epoch"],
            pm_ra_mas_yr=part["pmra"],
            pm_dec_mas_yr=part["pmdec"],
            parallax_mas=part["parallax"],
            radial_velocity_km_s=part["rv"],
        )

    def reject(self, bad: np.ndarray, reason: np.ndarray) -> None:
        """Moves the targets where `bad` to the rejected rows; for faults that only the engine finds."""
        import pyarrow as pa

        for i in np.flatnonzero(bad):
            value = "" if self.time is None else str(self.time[i])
            said = _SAID.get(str(reason[i]), str(reason[i]))
            if self.ephemeris is not None and reason[i] == "outside_ephemeris":
                said = f"outside the span of {self.ephemeris}"
            self.rejected.add(self.row[i], self.name[int(i)].as_py(), "", value, said)
        self.rejected.sort()
        keep = ~bad
        self.row = self.row[keep]
        self.name = self.name.filter(pa.array(keep))
        self.columns = {key: values[keep] for key, values in self.columns.items()}
        self.limits = {key: values[keep] for key, values in self.limits.items()}
        self.time = None if self.time is None else self.time[keep]
        self.orbits = self.orbits if self.orbits is None or keep.all() else self.orbits[keep]
        self.check_counts()

    def check_counts(self) -> None:
        """Rows read = planned + rejected, each row once."""
        if self.rows_read != len(self.row) + len(self.rejected):
            raise AssertionError(
                f"{self.source}: {self.rows_read} rows read, "
                f"but {len(self.row)} planned and {len(self.rejected)} rejected"
            )


def read_targets(
    path: str | Path,
    columns: Mapping[str, ColumnSpec] | None = None,
    *,
    layout: TargetLayout | None = None,
    limit_columns: Mapping[str, str | int] | None = None,
    with_time: bool = False,
) -> Targets:
    """Reads a target table; `with_time`: one whose rows each have an instant too.

    `columns` is the plan's `[columns]`; without an entry the usual names are looked for. `limit_columns`
    names, for some limits, the column that holds each target's own value.

    Raises `WrongInput` when columns or units are missing, doubled or contradictory, and `BrokenFile` when
    the file cannot be read to its end. A row with a fault is put on `Targets.rejected` and the others are
    read.
    """
    import pyarrow as pa

    path, layout = Path(path), layout or TargetLayout()
    if layout.kind == "mpc_orbits" or (layout.kind is None and _may_be_orbits(path, layout)):
        return _orbits(path, limit_columns or {}, with_time)
    table = open_table(path, layout.layout, header=layout.header, table=layout.table)
    found = find_columns(table.names, table.units, columns or {}, str(path), with_time=with_time)
    of_limits = {
        key: locate(column, table.names, key if key in _OTHER else f"[limits] {key}", str(path))
        for key, column in (limit_columns or {}).items()
    }
    content = table.read(
        [f.column for f in found.values() if f.column is not None] + list(of_limits.values())
    )
    count = len(content.row)
    faults = _Faults(count)
    result: dict[str, np.ndarray] = {}
    notes: list[str] = []
    for key, spec in FIELDS.items():
        result[key] = _field(
            spec, found.get(key), content.columns, count, faults, layout.missing, notes, path
        )
    limits = {
        key: _limit(key, column, content.columns[column], faults, layout.missing, path)
        for key, column in of_limits.items()
    }
    time = _time(found["time"], content.columns, faults, layout.missing, path) if with_time else None
    hours = _hours_suspected(found["ra"], result["ra"], faults.good)
    warnings = [*content.warnings, *([hours] if hours else [])]
    if "epoch" not in found and any(key in found for key in ("pmra", "pmdec")):
        notes.append(
            "no column for the epoch: proper motions are counted from J2000.0 (or say epoch in [columns])"
        )
    name = _names(found.get("name"), content.columns, content.row)
    if not with_time and (shared := len(name) - len(name.unique())):
        have = "row has" if shared == 1 else "rows have"
        notes.append(f"{shared:,} {have} the name of an earlier one; their numbers tell them apart")

    rejected = Rejected()
    for number, text, fault in content.ragged:
        rejected.add(number, "", "", text.strip()[:80], fault)
    faults.into(rejected, content.row, name)
    rejected.sort()
    good = faults.good
    targets = Targets(
        path=path,
        sha256=file_sha256(path),
        rows_read=count + len(content.ragged),
        row=content.row[good],
        name=name.filter(pa.array(good)),
        columns={key: values[good] for key, values in result.items()},
        limits={key: values[good] for key, values in limits.items()},
        rejected=rejected,
        notes=notes,
        warnings=warnings,
        time=None if time is None else time[good],
    )
    targets.check_counts()
    if targets.rows_read == 0:
        raise BrokenFile(f"{path}: the file has a header but no rows")
    if len(targets) == 0:
        raise WrongInput(
            f"{path}: none of the {targets.rows_read} rows can be planned; the first: {rejected.line(0)}"
        )
    return targets


def _may_be_orbits(path: Path, layout: TargetLayout) -> bool:
    from .orbits import holds_orbits

    return layout.layout is None and layout.header is None and layout.table is None and holds_orbits(path)


def _orbits(path: Path, limit_columns: Mapping[str, str | int], with_time: bool) -> Targets:
    from .orbits import read_orbits

    if with_time:
        raise WrongInput(f"{path}: the file holds orbits; a table with an instant in every row is needed")
    if limit_columns:
        key = next(iter(limit_columns))
        raise WrongInput(
            f"{path}: {key} is taken from a column, and orbit lines have no columns; give one value"
        )
    return read_orbits(path)


def named_bodies(names: Sequence[str], ephemeris: Path | None = None) -> Targets:
    """Bodies of the solar system as targets; names that are not known raise `hourarc.errors.UnknownName`.

    `ephemeris`: an SPK file, or None for the built-in one.
    """
    import pyarrow as pa

    import hourarc

    bodies = tuple(map(str, hourarc.Bodies(names, ephemeris).name))
    row = np.arange(1, len(bodies) + 1)
    targets = Targets(None, "", len(bodies), row, pa.array(bodies), {}, {}, Rejected(), bodies=bodies)
    targets.ephemeris = ephemeris
    return targets


class _Faults:
    """The first fault of each row: which column, what stood there, what is wrong with it."""

    def __init__(self, count: int) -> None:
        self.good = np.ones(count, dtype=bool)
        self._list: list[tuple[int, str, str, str]] = []

    def add(self, bad: np.ndarray, column: str, values: Any, reason: str) -> None:
        """Marks the rows where `bad`, as far as no earlier fault has them."""
        for i in np.flatnonzero(bad & self.good):
            value = values[int(i)]
            value = value.as_py() if hasattr(value, "as_py") else value
            self._list.append((int(i), column, "" if value is None else str(value), reason))
        self.good &= ~bad

    def into(self, rejected: Rejected, row: np.ndarray, name: pa.Array) -> None:
        for i, column, value, reason in self._list:
            rejected.add(row[i], name[i].as_py(), column, value, reason)


def _field(
    spec: Field,
    found: Found | None,
    columns: Mapping[str, pa.Array],
    count: int,
    faults: _Faults,
    missing: tuple[str, ...],
    notes: list[str],
    path: Path,
) -> np.ndarray:
    if found is None:
        return np.full(count, spec.default)
    factor, offset = scale(spec, found.unit), epoch_offset(found.unit) if spec.kind == "epoch" else 0.0
    if found.column is None:
        value = float(found.value) * factor + offset  # type: ignore[arg-type]
        if not spec.low <= value <= spec.high:
            raise WrongInput(
                f"{path}: [columns] {spec.key}: given {found.value} {found.unit}, allowed {_range(spec)}"
            )
        return np.full(count, value)
    raw = columns[found.column]
    if found.unit in ("hms", "dms") or (found.unit == "hourangle" and begins_sexagesimal(raw)):
        values, null, text = sexagesimal(raw, 15.0 if found.unit in ("hms", "hourangle") else 1.0, missing)
        shape = "hours, minutes, seconds" if found.unit != "dms" else "degrees, minutes, seconds"
        faults.add(text, found.column, raw, f"not {shape} such as 12:34:56.7")
    else:
        values, null, text = numbers(raw, found.column, missing, path)
        if text.any():
            colons = text & looks_sexagesimal(raw) if spec.key in ("ra", "dec") else np.zeros_like(text)
            unit = "hms" if spec.key == "ra" else "dms"
            faults.add(
                colons,
                found.column,
                raw,
                f'sexagesimal text; if that is meant, say unit = "{unit}" for {spec.key} in [columns]',
            )
            faults.add(text, found.column, raw, "not a number")
        if factor != 1.0 or offset != 0.0:
            values = values * factor + offset
    if spec.needed or spec.key == "epoch":
        faults.add(null, found.column, raw, "empty")
    elif null.any():
        values = np.where(null, spec.default, values)
        notes.append(
            f'column "{found.column}": {int(null.sum()):,} empty cells, {spec.key} taken as {spec.default:g}'
        )
    with np.errstate(invalid="ignore"):
        faults.add(~np.isfinite(values), found.column, raw, "not a finite number")
        faults.add((values < spec.low) | (values > spec.high), found.column, raw, f"outside {_range(spec)}")
    return values


def _time(
    found: Found, columns: Mapping[str, pa.Array], faults: _Faults, missing: tuple[str, ...], path: Path
) -> np.ndarray:
    assert found.column is not None  # an instant for all rows is refused by the plan
    raw = columns[found.column]
    times, null, wrong = instants(raw, found.unit, found.column, missing, path)
    faults.add(null, found.column, raw, "empty")
    faults.add(wrong, found.column, raw, f"not {FORM}" if found.unit in ("", "iso") else "not a day count")
    return times


def _limit(
    key: str, column: str, raw: pa.Array, faults: _Faults, missing: tuple[str, ...], path: Path
) -> np.ndarray:
    values, null, text = numbers(raw, column, missing, path)
    faults.add(text, column, raw, "not a number")
    what = key if key in _OTHER else "a limit"
    faults.add(null, column, raw, f"empty, but {what} is taken from here")
    faults.add(~np.isfinite(values), column, raw, "not a finite number")
    low, high = _OTHER.get(key) or (LIMITS[key].low, LIMITS[key].high)
    outside = (values < low) | (values > high)
    faults.add(outside, column, raw, f"outside {low:g} to {high:g} of {key}")
    return values


def _names(found: Found | None, columns: Mapping[str, pa.Array], row: np.ndarray) -> pa.Array:
    import pyarrow as pa
    import pyarrow.compute as pc

    by_row = pc.binary_join_element_wise("row", pc.cast(pa.array(row), pa.string()), " ")
    if found is None:
        return by_row
    if found.column is None:
        return pa.array([str(found.value)] * len(row), pa.string())
    raw = columns[found.column]
    if pa.types.is_dictionary(raw.type):
        raw = pc.cast(raw, raw.type.value_type)
    text = pc.utf8_trim_whitespace(pc.cast(raw, pa.string()))
    return pc.if_else(pc.equal(pc.fill_null(text, ""), ""), by_row, text)


def _hours_suspected(ra: Found, values: np.ndarray, good: np.ndarray) -> str | None:
    """A warning when right ascensions that pass for degrees all lie in 0 to 24."""
    if ra.column is None or ra.by_plan or ra.unit != "deg" or not good.any():
        return None
    low, high = float(values[good].min()), float(values[good].max())
    if low < 0.0 or high > 24.0:
        return None
    return (
        f'column "{ra.column}": all right ascensions lie between {low:g} and {high:g}. They are read as '
        "degrees but look like hours. If they are, say in [columns] "
        f'ra = {{ column = "{ra.column}", unit = "hourangle" }}; if not, say unit = "deg" there'
    )


def _range(spec: Field) -> str:
    return f"{spec.low:g} to {spec.high:g} {spec.unit}"


def file_sha256(path: Path) -> str:
    """The SHA-256 of a file, as hexadecimal digits."""
    with open(path, "rb") as handle:
        return hashlib.file_digest(handle, "sha256").hexdigest()
