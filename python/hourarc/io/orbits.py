"""Files of orbits in the Minor Planet Center's formats, as a list of targets."""

from __future__ import annotations

from pathlib import Path

import numpy as np

from .problems import BrokenFile, Rejected, WrongInput
from .tables import LAYOUTS, file_bytes
from .targets import Targets, file_sha256

#: So much of a file is looked at to tell what it is: longer than the heading of the Center's files.
_HEAD = 1 << 16


def holds_orbits(path: Path) -> bool:
    """Whether a file looks like orbit lines: a text whose suffix says nothing else, with a line that is one.

    No line of a table is taken for one by chance: two hundred columns would have to agree.
    """
    import hourarc

    suffix = Path(path.name.lower().removesuffix(".gz")).suffix
    if LAYOUTS.get(suffix, "spaces") != "spaces":
        return False
    head = file_bytes(path, _HEAD).decode("utf-8", "replace")
    return len(hourarc.Orbits.from_mpc(head + "\n")) > 0


def read_orbits(path: Path) -> Targets:
    """The orbits of a file. A row is a line of it, by its number; lines that are no orbits are rejected."""
    import pyarrow as pa

    import hourarc

    text = file_bytes(path).decode("utf-8", "replace")
    orbits = hourarc.Orbits.from_mpc(text + "\n")
    rejected = Rejected()
    lines = text.split("\n") if orbits.rejected else []
    for number, first, last, reason in orbits.rejected:
        value = lines[number - 1][first - 1 : last].strip()[:80]
        rejected.add(number, "", f"{first}-{last}", value, reason)
    rows_read = len(orbits) + len(rejected)
    if rows_read == 0:
        raise BrokenFile(f"{path}: the file has no lines of orbits")
    if len(orbits) == 0:
        raise WrongInput(f"{path}: none of the {rows_read} lines is an orbit; the first: {rejected.line(0)}")
    assert orbits.line is not None and orbits.name is not None
    targets = Targets(
        path=path,
        sha256=file_sha256(path),
        rows_read=rows_read,
        row=np.asarray(orbits.line),
        name=pa.array(orbits.name, pa.string()),
        columns={},
        limits={},
        rejected=rejected,
        orbits=orbits,
    )
    targets.check_counts()
    return targets
