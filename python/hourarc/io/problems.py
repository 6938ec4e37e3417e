"""What can be wrong with a file, as two exceptions, and the list of rows that were refused.

A file that asks for something impossible is a `WrongInput`: its author has to change it. A file that cannot
be read to its end is a `BrokenFile`: the author may be innocent. A bad row is neither; it goes on the list
`Rejected` and the others are planned without it.
"""

from __future__ import annotations

import difflib
from collections.abc import Iterable
from dataclasses import dataclass, field

import numpy as np

from ..errors import HourarcError


class WrongInput(HourarcError, ValueError):
    """A plan, a column or a date that has to be changed by whoever wrote it."""


class BrokenFile(HourarcError, OSError):
    """A file that is empty, cut short, or not of the format its name says."""


def nearest(word: str, known: Iterable[str]) -> str:
    """A half sentence naming the known word nearest to `word`, or all of them when none is near."""
    known = list(known)
    lowered = {k.lower(): k for k in known}
    close = difflib.get_close_matches(word.lower(), lowered, n=1, cutoff=0.55)
    if close:
        return f'did you mean "{lowered[close[0]]}"?'
    return "known: " + ", ".join(known)


@dataclass
class Rejected:
    """Rows of the source that cannot be planned, each once, with the first fault found in it.

    `row` counts the data rows of the source from 1, blank lines and comments not counted.
    """

    row: list[int] = field(default_factory=list)
    name: list[str] = field(default_factory=list)
    column: list[str] = field(default_factory=list)
    value: list[str] = field(default_factory=list)
    reason: list[str] = field(default_factory=list)
    #: The source of each, where there are several; otherwise empty.
    source: list[str] = field(default_factory=list)

    def add(self, row: int, name: str, column: str, value: str, reason: str) -> None:
        """Puts one row on the list."""
        self.row.append(int(row))
        self.name.append(name)
        self.column.append(column)
        self.value.append(value)
        self.reason.append(reason)

    def __len__(self) -> int:
        return len(self.row)

    def sort(self) -> None:
        """Into the order of the source, so that the list reads beside it."""
        order = np.argsort(np.asarray(self.row, dtype=np.int64), kind="stable")
        for column in (self.row, self.name, self.column, self.value, self.reason):
            column[:] = [column[i] for i in order]

    def line(self, index: int) -> str:
        """One entry as a sentence for a terminal."""
        value = self.value[index]
        given = f" = {value!r}" if value else ""
        source = f"{self.source[index]}, " if self.source else ""
        where = f', column "{self.column[index]}"' if self.column[index] else ""
        return f"{source}row {self.row[index]}{where}{given}: {self.reason[index]}"
