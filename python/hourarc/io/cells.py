"""From the cells of a column to numbers: which are numbers, which are empty, which are neither."""

from __future__ import annotations

import re
from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np

from .problems import WrongInput

if TYPE_CHECKING:
    import pyarrow as pa

_NUMBER = r"^[+-]?([0-9]+\.?[0-9]*|\.[0-9]+)([eE][+-]?[0-9]+)?$|^[+-]?(?i:nan|inf|infinity)$"
_SEXAGESIMAL = r"^([+-]?)([0-9]{1,3})[: ]([0-9]{1,2})(?:[: ]([0-9]{1,2}(?:\.[0-9]*)?))?$"


def numbers(
    raw: pa.Array, column: str, missing: tuple[str, ...], path: Path
) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Values as float64 (0 where there is none), which cells are empty, which hold text that is no number."""
    import pyarrow as pa
    import pyarrow.compute as pc

    if pa.types.is_dictionary(raw.type):
        raw = pc.cast(raw, raw.type.value_type)
    if is_text(raw.type):
        raw = trimmed(raw, missing)
        try:
            parsed = pc.cast(raw, pa.float64())
        except pa.ArrowInvalid:
            numeric = pc.match_substring_regex(raw, _NUMBER)
            text = np.asarray(pc.fill_null(pc.invert(numeric), False))
            parsed = pc.cast(pc.if_else(numeric, raw, None), pa.float64())
            null = np.asarray(pc.is_null(raw))
            return np.asarray(pc.fill_null(parsed, 0.0)), null, text
    elif pa.types.is_integer(raw.type) or pa.types.is_floating(raw.type) or pa.types.is_decimal(raw.type):
        parsed = pc.cast(raw, pa.float64(), safe=False)
    elif pa.types.is_null(raw.type):
        parsed = pa.nulls(len(raw), pa.float64())
    else:
        raise WrongInput(f'{path}, column "{column}": it holds {raw.type}, numbers are needed')
    null = np.asarray(pc.is_null(parsed))
    return np.asarray(pc.fill_null(parsed, 0.0)), null, np.zeros(len(raw), dtype=bool)


def sexagesimal(
    raw: pa.Array, factor: float, missing: tuple[str, ...]
) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """As `_numbers`, of texts such as "12:34:56.7" or "-12 34 56". The sign holds for all three parts."""
    pattern = re.compile(_SEXAGESIMAL)
    values, null, text = (np.zeros(len(raw)), np.zeros(len(raw), dtype=bool), np.zeros(len(raw), dtype=bool))
    for i, cell in enumerate(raw.to_pylist()):
        cell = "" if cell is None else str(cell).strip()
        match = pattern.match(cell)
        if cell in ("", *missing):
            null[i] = True
        elif match is None or int(match[3]) >= 60 or float(match[4] or 0) >= 60:
            text[i] = True
        else:
            size = int(match[2]) + int(match[3]) / 60 + float(match[4] or 0) / 3600
            values[i] = factor * (-size if match[1] == "-" else size)
    return values, null, text


def begins_sexagesimal(raw: pa.Array) -> bool:
    """Whether a column is text, and its first cell that is not empty looks like 12:34:56."""
    if not is_text(raw.type):
        return False
    first = next((str(c).strip() for c in raw.to_pylist() if c is not None and str(c).strip()), "")
    return re.match(_SEXAGESIMAL, first) is not None


def looks_sexagesimal(raw: pa.Array) -> np.ndarray:
    """Which cells look like 12:34:56."""
    import pyarrow.compute as pc

    if not is_text(raw.type):
        return np.zeros(len(raw), dtype=bool)
    return np.asarray(
        pc.fill_null(pc.match_substring_regex(pc.utf8_trim_whitespace(raw), _SEXAGESIMAL), False)
    )


def trimmed(raw: pa.Array, missing: tuple[str, ...]) -> pa.Array:
    """Text without the blanks around it; null where nothing is left, or a word for "missing"."""
    import pyarrow as pa
    import pyarrow.compute as pc

    raw = pc.utf8_trim_whitespace(raw)
    return pc.if_else(pc.is_in(raw, value_set=pa.array(["", *missing], raw.type)), None, raw)


def is_text(kind: pa.DataType) -> bool:
    import pyarrow as pa

    types = pa.types
    return bool(types.is_string(kind) or types.is_large_string(kind) or types.is_string_view(kind))
