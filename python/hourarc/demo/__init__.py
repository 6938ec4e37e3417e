"""The demonstration: an invented station, Saltpan Ridge, and a target list of its invented programmes.

Nothing here is a real place, a real star or a real survey.
"""

from __future__ import annotations

from importlib.resources import files
from pathlib import Path

PLAN_NAME, TARGETS_NAME = "saltpan-ridge.toml", "targets.csv"


def write_demo(folder: Path, *, replace: bool = False) -> tuple[Path, Path, list[Path]]:
    """Writes plan and targets to `folder`. Returns their paths, and the changed ones that it kept."""
    from ..io.whole import WholeFiles
    from .programmes import target_list

    folder.mkdir(parents=True, exist_ok=True)
    contents = {
        folder / PLAN_NAME: files(__package__).joinpath(PLAN_NAME).read_text(encoding="utf-8"),
        folder / TARGETS_NAME: target_list(),
    }
    kept = []
    with WholeFiles() as whole:
        for path, text in contents.items():
            if path.exists() and not replace:
                if path.read_bytes() != text.encode():
                    kept.append(path)
                continue
            with whole.create(path) as passing:
                passing.write_bytes(text.encode())
    plan, targets = contents
    return plan, targets, kept
