"""Writing a result table as Parquet, CSV or ECSV, each with the record of where it came from.

| suffix | instants | record of origin |
|---|---|---|
| `.parquet` | timestamp[ns, UTC] | key-value metadata `hourarc.*` of the file; units with the columns |
| `.csv` | ISO 8601 to the microsecond, UTC | comment lines `# hourarc.*` above the header |
| `.ecsv` | the same | `meta` of the header; units with the columns |
"""

from __future__ import annotations

import json
from collections.abc import Iterable, Mapping
from pathlib import Path
from typing import IO, TYPE_CHECKING, Any

from .problems import Rejected, WrongInput
from .results import DECIMALS
from .whole import WholeFiles

if TYPE_CHECKING:
    import pyarrow as pa

_FORMATS = {".parquet": "parquet", ".pq": "parquet", ".csv": "csv", ".ecsv": "ecsv"}


def check_result(path: str | Path, inputs: Iterable[Path]) -> None:
    """Refuses a result that cannot be written, or would replace an input. Ask before the work, not after."""
    result_format(path)
    results = (Path(path), beside(path, "blocked"), beside(path, "rejected", ".csv"))
    for result in results:
        for given in inputs:
            if result.exists() and result.samefile(given):
                raise WrongInput(f"{path}: writing it would replace {given}, which is an input")


def result_format(path: str | Path) -> str:
    """The format that a result's suffix asks for."""
    suffix = Path(path).suffix.lower()
    if suffix not in _FORMATS:
        raise WrongInput(f"{path}: results are written as {', '.join(_FORMATS)}; the suffix is {suffix!r}")
    folder = Path(path).parent
    if not folder.is_dir():
        raise WrongInput(f"{path}: there is no folder {str(folder)!r}")
    return _FORMATS[suffix]


def beside(path: str | Path, what: str, suffix: str | None = None) -> Path:
    """The companion of a result, such as `windows.blocked.parquet` of `windows.parquet`."""
    path = Path(path)
    return path.with_name(f"{path.stem}.{what}{suffix or path.suffix}")


def write_table(table: pa.Table, path: str | Path, provenance: Mapping[str, Any], files: WholeFiles) -> None:
    """Writes one table in the format of its suffix; it appears when `files` is committed."""
    format = result_format(path)
    with files.create(path) as passing:
        if format == "parquet":
            _write_parquet(table, passing, provenance)
            return
        with open(passing, "wb") as handle:
            write_text(table, handle, provenance, format)


def write_rejected(
    rejected: Rejected, path: str | Path, provenance: Mapping[str, Any], files: WholeFiles
) -> None:
    """Writes the list of rejected rows as CSV."""
    import csv

    with files.create(path) as passing, open(passing, "w", encoding="utf-8", newline="") as handle:
        handle.writelines(f"# {line}\n" for line in _lines(provenance))
        writer = csv.writer(handle, lineterminator="\n")
        names = [*(["source"] if rejected.source else []), "row", "name", "column", "value", "reason"]
        writer.writerow(names)
        writer.writerows(zip(*(getattr(rejected, name) for name in names), strict=True))


def write_text(table: pa.Table, handle: IO[bytes], provenance: Mapping[str, Any], format: str) -> None:
    """Writes a table as CSV or ECSV to an open stream."""
    import pyarrow.csv

    text = _as_text(table)
    head = _ecsv_header(table, provenance) if format == "ecsv" else _csv_comments(table, provenance)
    handle.write("".join(f"# {line}\n" for line in head).encode())
    handle.write((",".join(table.column_names) + "\n").encode())
    # Arrow's "needed" quotes every text; most results need no quotes at all and read better without.
    style = "needed" if _needs_quotes(text) else "none"
    options = pyarrow.csv.WriteOptions(include_header=False, quoting_style=style)
    pyarrow.csv.write_csv(text, handle, options)


def _write_parquet(table: pa.Table, path: Path, provenance: Mapping[str, Any]) -> None:
    import pyarrow.parquet as pq

    metadata = {
        f"hourarc.{key}": value if isinstance(value, str) else _json(value)
        for key, value in provenance.items()
    }
    table = table.replace_schema_metadata({**(table.schema.metadata or {}), **metadata})
    pq.write_table(table, path, compression="zstd", version="2.6")


def _as_text(table: pa.Table) -> pa.Table:
    """Every column in the form in which it stands in a text file."""
    import pyarrow as pa
    import pyarrow.compute as pc

    columns = []
    for name in table.column_names:
        column = table.column(name)
        if pa.types.is_timestamp(column.type):
            # Arrow prints "2026-03-10 04:05:06.000000"; the standard wants a T for the space.
            plain = column.cast(pa.timestamp("us", "UTC"), safe=False).cast(pa.timestamp("us"))
            column = pc.binary_replace_slice(plain.cast(pa.string()), 10, 11, "T")
        elif pa.types.is_date(column.type) or pa.types.is_dictionary(column.type):
            column = column.cast(pa.string())
        elif name in DECIMALS:
            column = pc.round(column, DECIMALS[name])
        columns.append(column)
    return pa.table(columns, names=table.column_names)


def _needs_quotes(text: pa.Table) -> bool:
    """Whether a text holds a character that has a meaning in CSV."""
    import pyarrow as pa
    import pyarrow.compute as pc

    texts = [column for column in text.columns if pa.types.is_string(column.type)]
    return any(pc.any(pc.match_substring_regex(column, '[,"\r\n]')).as_py() for column in texts)


def _csv_comments(table: pa.Table, provenance: Mapping[str, Any]) -> list[str]:
    lines = _lines(provenance)
    for column in table.schema:
        metadata = {k.decode(): v.decode() for k, v in (column.metadata or {}).items()}
        unit = f" [{metadata['unit']}]" if "unit" in metadata else ""
        lines.append(f"column {column.name}{unit}: {metadata.get('meaning', '')}")
    return lines


def _ecsv_header(table: pa.Table, provenance: Mapping[str, Any]) -> list[str]:
    """The header of the Enhanced CSV format 1.0 (Astropy Proposal for Enhancement 6)."""
    import pyarrow as pa

    lines = ["%ECSV 1.0", "---", "delimiter: ','", "datatype:"]
    for column in table.schema:
        metadata = {k.decode(): v.decode() for k, v in (column.metadata or {}).items()}
        kind = column.type
        datatype = (
            "int64" if pa.types.is_integer(kind) else "float64" if pa.types.is_floating(kind) else "string"
        )
        entry: dict[str, Any] = {"name": column.name, "datatype": datatype}
        if "unit" in metadata:
            entry["unit"] = metadata["unit"]
        if "meaning" in metadata:
            entry["description"] = metadata["meaning"]
        if "ucd" in metadata:
            entry["meta"] = {"ucd": metadata["ucd"]}
        lines.append(f"- {_json(entry)}")
    # JSON is a subset of YAML: no YAML library is needed to write a header.
    lines += [
        "meta:",
        *(f"  hourarc.{key}: {_json(value)}" for key, value in provenance.items()),
        "schema: astropy-2.0",
    ]
    return lines


def _lines(provenance: Mapping[str, Any]) -> list[str]:
    return [
        f"hourarc.{key}: {value if isinstance(value, str) else _json(value)}"
        for key, value in provenance.items()
    ]


def _json(value: Any) -> str:
    return json.dumps(value, ensure_ascii=False, default=_plain)


def _plain(value: Any) -> Any:
    """Numpy's values as JSON can write them."""
    if hasattr(value, "tolist"):
        return value.tolist()
    return str(value)
