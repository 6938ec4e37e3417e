"""Several lists of targets, each of one kind, as one: for the commands that mix them."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from .problems import Rejected

if TYPE_CHECKING:
    import pyarrow as pa

    from .targets import Targets


@dataclass
class Lists:
    """The lists in the order they were given; there is at least one."""

    parts: list[Targets]

    def __iter__(self) -> Iterator[Targets]:
        return iter(self.parts)

    def __len__(self) -> int:
        """Targets that can be planned."""
        return sum(len(part) for part in self.parts)

    @property
    def source(self) -> str:
        """Where the targets come from, for messages."""
        return ", ".join(part.source for part in self.parts)

    @property
    def rows_read(self) -> int:
        """Rows of all sources."""
        return sum(part.rows_read for part in self.parts)

    @property
    def rejected(self) -> Rejected:
        """The rejected rows of all, with their sources if there are several."""
        if len(self.parts) == 1:
            return self.parts[0].rejected
        merged = Rejected()
        for part in self.parts:
            rows = part.rejected
            for entry in zip(rows.row, rows.name, rows.column, rows.value, rows.reason, strict=True):
                merged.add(*entry)
                merged.source.append(part.source)
        return merged

    def join(self, tables: list[pa.Table]) -> pa.Table:
        """The lists' tables, one below the other, with a column `source` in front if there are several."""
        import pyarrow as pa

        if len(self.parts) == 1:
            return tables[0]
        about = {"ucd": "meta.file", "meaning": "the list that the target is from"}
        field = pa.field("source", pa.string(), metadata=about)
        named = [
            table.add_column(0, field, pa.array(np.full(len(table), part.source, dtype=object), pa.string()))
            for part, table in zip(self.parts, tables, strict=True)
        ]
        return pa.concat_tables(named)
