"""Target tables of every format behind one seam: the names of the columns, their units, and the columns
asked for.

A table is opened first (names and units only) and read second (the wanted columns only), so that a file
with a hundred columns costs what its seven cost. Columns come as Arrow arrays; an empty cell is a null in
all formats.
"""

from __future__ import annotations

import csv
from collections.abc import Sequence
from dataclasses import dataclass, field
from pathlib import Path
from typing import TYPE_CHECKING, Any, Protocol

import numpy as np

from .problems import BrokenFile, WrongInput

if TYPE_CHECKING:
    import pyarrow as pa

#: What a suffix means when the plan's `[targets]` does not say.
LAYOUTS = {
    ".csv": "csv",
    ".tsv": "tsv",
    ".ecsv": "ecsv",
    ".fits": "fits",
    ".fit": "fits",
    ".vot": "votable",
    ".votable": "votable",
    ".xml": "votable",
    ".parquet": "parquet",
    ".pq": "parquet",
    ".dat": "spaces",
    ".txt": "spaces",
}

#: Longer lines, in bytes, are taken for something else than a table.
_LONGEST_LINE = 1 << 24


@dataclass
class Content:
    """The columns asked for, of the rows that could be split into columns at all."""

    columns: dict[str, pa.Array]
    #: The number of each row in the source, from 1.
    row: np.ndarray
    #: Rows that do not have the header's number of values: (number in the source, text, fault).
    ragged: list[tuple[int, str, str]]
    #: What is to be said of the file, beside its rows.
    warnings: list[str] = field(default_factory=list)


class Table(Protocol):
    """An opened target table."""

    path: Path
    names: list[str]
    units: dict[str, str]

    def read(self, wanted: Sequence[str]) -> Content:
        """The wanted columns; each must be in `names`."""
        ...


def open_table(
    path: Path, layout: str | None, *, header: bool | None = None, table: int | str | None = None
) -> Table:
    """Opens `path` by its layout, or by its suffix when the layout is not given."""
    if layout is None:
        name = path.name.lower().removesuffix(".gz")
        layout = LAYOUTS.get(Path(name).suffix)
        if layout is None:
            raise WrongInput(
                f"{path}: nothing is known of the suffix {path.suffix!r}; known: {', '.join(LAYOUTS)}; "
                'or say layout = "..." in the plan\'s [targets]'
            )
    if path.stat().st_size == 0:
        raise BrokenFile(f"{path}: the file is empty")
    if layout == "parquet":
        return _Parquet(path)
    if layout in ("csv", "tsv", "spaces"):
        return _Text(path, layout, header)
    return _Astropy(path, layout, table)


class _Parquet:
    def __init__(self, path: Path) -> None:
        import pyarrow as pa
        import pyarrow.parquet as pq

        self.path = path
        try:
            self._file = pq.ParquetFile(path)
        except (pa.ArrowInvalid, OSError) as error:
            raise BrokenFile(
                f"{path}: not a whole Parquet file (cut short, or of another format): {_first(error)}"
            ) from error
        schema = self._file.schema_arrow
        self.names = list(schema.names)
        self.units = {}
        for column in schema:
            unit = (column.metadata or {}).get(b"unit") or (column.metadata or {}).get(b"units")
            if unit:
                self.units[column.name] = unit.decode("utf-8", "replace")

    def read(self, wanted: Sequence[str]) -> Content:
        import pyarrow as pa

        try:
            table = self._file.read(columns=list(dict.fromkeys(wanted)))
        except (pa.ArrowInvalid, OSError) as error:
            raise BrokenFile(f"{self.path}: the Parquet file is damaged: {_first(error)}") from error
        columns = {name: _one_chunk(table.column(name)) for name in table.column_names}
        return Content(columns, np.arange(1, table.num_rows + 1), [])


class _Text:
    """Comma-, tab- or space-separated text, with a header or without one (then columns are "1", "2", ...)."""

    def __init__(self, path: Path, layout: str, header: bool | None) -> None:
        self.path = path
        self.units: dict[str, str] = {}
        self._delimiter = {"csv": ",", "tsv": "\t", "spaces": " "}[layout]
        data = _bytes(path)
        if data[:2] in (b"\xff\xfe", b"\xfe\xff"):
            raise BrokenFile(f"{path}: the text is in UTF-16; UTF-8 is needed")
        if b"\n" not in data:
            data = data.replace(b"\r", b"\n")  # lines that end as on the first Macintoshes
        if layout == "spaces":
            data = _single_spaces(data)
        start = _after_comments(data)
        end = data.find(b"\n", start)
        first = data[start : end if end >= 0 else len(data)].decode("utf-8-sig", "replace").rstrip("\r")
        if not first.strip():
            raise BrokenFile(f"{path}: the file holds no header and no rows")
        if len(first) > _LONGEST_LINE:
            raise BrokenFile(f"{path}: the first line has {len(first):,} characters; no header is that long")
        words = next(csv.reader([first], delimiter=self._delimiter))
        other = next((sign for sign in ";\t|" if sign in first and sign != self._delimiter), None)
        if len(words) == 1 and other is not None:
            named = {"\t": "tabs", ";": "semicolons", "|": "bars"}[other]
            tip = (
                'say layout = "tsv" in the plan\'s [targets]'
                if other == "\t"
                else "commas or tabs are needed"
            )
            raise WrongInput(f"{path}: the header {_short(first)!r} has its columns between {named}; {tip}")
        if header is None:
            # Space-separated catalogues mostly have no header: one whose first line is all numbers has none.
            header = layout != "spaces" or not all(_is_number(word) for word in words)
        self.names = [word.strip() for word in words] if header else [str(i + 1) for i in range(len(words))]
        self._has_header = header
        self._data, self._start = data, (end + 1 if end >= 0 else len(data)) if header else start

    def read(self, wanted: Sequence[str]) -> Content:
        import pyarrow as pa
        import pyarrow.csv

        wanted = list(dict.fromkeys(wanted))
        ragged: list[tuple[int, str, str]] = []

        def skip(row: pa.csv.InvalidRow) -> str:
            values = "1 value" if row.actual_columns == 1 else f"{row.actual_columns} values"
            fault = f"{values} where there are {row.expected_columns} columns"
            # Arrow numbers the rows it was given from 1; none of them is the header.
            ragged.append((row.number, row.text, fault))
            return "skip"

        body = memoryview(self._data)[self._start :]
        if not bytes(body[:4096]).strip() and not bytes(body).strip():
            return Content({name: pa.array([], pa.string()) for name in wanted}, np.arange(0), [])
        unique = [str(i) for i in range(len(self.names))]
        indices = {name: unique[self.names.index(name)] for name in wanted}
        warnings: list[str] = []
        try:
            table = self._parse(body, unique, list(indices.values()), skip)
        except pa.ArrowInvalid as error:
            if "UTF8" not in str(error):
                raise BrokenFile(f"{self.path}: cannot be read as a table: {_said(error)}") from error
            # Bytes of another encoding must not stop the rows that have none.
            ragged.clear()
            body = memoryview(bytes(body).decode("utf-8", "replace").encode())
            table = self._parse(body, unique, list(indices.values()), skip)
            warnings.append("some bytes are not UTF-8; they are read as \N{REPLACEMENT CHARACTER}")
        total = table.num_rows + len(ragged)
        kept = np.ones(total, dtype=bool)
        kept[[number - 1 for number, _, _ in ragged]] = False
        columns = {name: _one_chunk(table.column(key)) for name, key in indices.items()}
        return Content(columns, np.flatnonzero(kept) + 1, ragged, warnings)

    def _parse(self, body: memoryview, names: list[str], wanted: list[str], skip: Any) -> pa.Table:
        import pyarrow as pa
        import pyarrow.csv

        return pa.csv.read_csv(
            pa.BufferReader(pa.py_buffer(body)),
            # One thread, so that a skipped row knows its number.
            read_options=pa.csv.ReadOptions(column_names=names, use_threads=False, block_size=_LONGEST_LINE),
            parse_options=pa.csv.ParseOptions(
                delimiter=self._delimiter, invalid_row_handler=skip, newlines_in_values=b'"' in self._data
            ),
            # Everything as text: a column's type must not hang on what its first rows look like.
            convert_options=pa.csv.ConvertOptions(
                include_columns=wanted,
                column_types={key: pa.string() for key in wanted},
                strings_can_be_null=False,
            ),
        )


class _Astropy:
    """ECSV, FITS and VOTable through astropy."""

    def __init__(self, path: Path, layout: str, table: int | str | None) -> None:
        try:
            from astropy.table import Table as AstropyTable
        except ImportError as error:
            raise WrongInput(
                f"{path}: {layout} tables need astropy: pip install 'hourarc[interop]'"
            ) from error
        import warnings

        self.path = path
        options: dict[str, Any] = {"format": {"ecsv": "ascii.ecsv"}.get(layout, layout)}
        if layout == "fits":
            options["astropy_native"] = True  # instants of a stated scale come as such
        if table is not None:
            options["hdu" if layout == "fits" else "table_id"] = table
        try:
            with warnings.catch_warnings():
                warnings.simplefilter("ignore")
                self._table = AstropyTable.read(path, **options)
        except Exception as error:  # astropy raises whatever its parsers raise
            raise BrokenFile(f"{path}: cannot be read as a {layout} table: {_first(error)}") from error
        self.names = list(self._table.colnames)
        self.units = {
            n: str(self._table[n].unit)
            for n in self.names
            if getattr(self._table[n], "unit", None) is not None
        }

    def read(self, wanted: Sequence[str]) -> Content:
        columns = {
            name: _arrow_from_astropy(self._table[name], name, self.path) for name in dict.fromkeys(wanted)
        }
        return Content(columns, np.arange(1, len(self._table) + 1), [])


def _arrow_from_astropy(column: Any, name: str, path: Path) -> pa.Array:
    import pyarrow as pa

    if hasattr(column, "utc") and hasattr(column, "scale"):  # instants of a stated scale
        column = column.utc.datetime64
    values = np.asarray(getattr(column, "value", column))
    mask = np.asarray(column.mask) if getattr(column, "mask", None) is not None else None
    if values.ndim != 1:
        raise WrongInput(
            f'{path}: column "{name}" holds arrays of shape {values.shape[1:]}, one value a row is needed'
        )
    if values.dtype.kind == "S":
        values = np.char.decode(values, "utf-8", "replace")
    if values.dtype.kind in "OU":
        mask = np.zeros(len(values), bool) if mask is None or mask.ndim == 0 else mask
        return pa.array([None if m else str(v) for v, m in zip(values, mask, strict=True)], pa.string())
    values = np.ascontiguousarray(values.astype(values.dtype.newbyteorder("="), copy=False))
    return pa.array(values, mask=mask if mask is not None and mask.ndim else None)


def _one_chunk(column: pa.ChunkedArray) -> pa.Array:
    import pyarrow as pa

    joined = column.combine_chunks()
    return joined if isinstance(joined, pa.Array) else joined.chunk(0)


def file_bytes(path: Path, first: int | None = None) -> bytes:
    """The bytes of a file, or the whole lines among the first so many; what ends in .gz is unpacked."""
    if first is not None:
        import gzip
        import zlib

        opened = gzip.open(path) if path.suffix.lower() == ".gz" else open(path, "rb")  # noqa: SIM115
        try:
            with opened as handle:
                head = handle.read(first)
        except (EOFError, zlib.error, gzip.BadGzipFile):
            return b""  # whoever reads the whole says what is wrong
        return head if len(head) < first else head[: head.rfind(b"\n") + 1]
    return _bytes(path)


def _bytes(path: Path) -> bytes:
    if path.suffix.lower() == ".gz":
        import gzip
        import zlib

        try:
            return gzip.decompress(path.read_bytes())
        except (OSError, EOFError, zlib.error) as error:
            raise BrokenFile(f"{path}: the compressed file is damaged: {_first(error)}") from error
    return path.read_bytes()


def _single_spaces(data: bytes) -> bytes:
    """Runs of spaces and tabs made one space, none at the beginning or end of a line."""
    text = np.frombuffer(data, dtype=np.uint8)
    blank = (text == 32) | (text == 9) | (text == 13)
    # Of a run of blanks the last one stays, unless the line ends there.
    following = np.empty(len(text), dtype=bool)
    following[:-1] = blank[1:] | (text[1:] == 10)
    following[-1:] = True
    squeezed = text[~(blank & following)]
    blank = (squeezed == 32) | (squeezed == 9)
    at_start = np.empty(len(squeezed), dtype=bool)
    at_start[:1] = True
    at_start[1:] = squeezed[:-1] == 10
    squeezed = np.where(squeezed == 9, np.uint8(32), squeezed)[~(blank & at_start)]
    return bytes(squeezed.tobytes())


def _after_comments(data: bytes) -> int:
    """Where the first line stands that neither begins with "#" nor is blank."""
    position = 3 if data.startswith(b"\xef\xbb\xbf") else 0
    while position < len(data):
        end = data.find(b"\n", position)
        end = len(data) if end < 0 else end
        line = data[position:end].strip()
        if line and not line.startswith(b"#"):
            break
        position = end + 1
    return min(position, len(data))


def _is_number(word: str) -> bool:
    try:
        float(word)
    except ValueError:
        return False
    return True


def _said(error: BaseException) -> str:
    """Arrow's message, put in the words of whoever wrote the file where it speaks of its own insides."""
    text = _first(error)
    return f"a line is longer than {_LONGEST_LINE >> 20} MB" if "straddl" in text else text


def _short(text: str) -> str:
    return text if len(text) <= 60 else text[:57] + "..."


def _first(error: BaseException) -> str:
    """The first line of a library's message: enough to know, short enough to read."""
    lines = str(error).strip().splitlines()
    return lines[0] if lines else type(error).__name__
