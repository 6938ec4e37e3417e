"""`hourarc night`: the windows of every target of a list in one night."""

from __future__ import annotations

import datetime
from pathlib import Path

import click

from . import _options


@click.command(short_help="Plan one night: the windows of each target, or what blocks it.")
@_options.plan
@_options.target_lists
@click.option(
    "--night", type=_options.NIGHT, required=True, help="Date of the night's evening, such as 2026-03-10."
)
@_options.bodies
@_options.result("The windows")
@_options.threads
@_options.quiet
def command(
    plan: Path,
    targets: tuple[Path, ...],
    night: datetime.date,
    bodies: tuple[str, ...] | None,
    output: Path | None,
    threads: int | None,
    quiet: bool,
) -> int:
    """Plan one night for every target of TARGETS under the limits of PLAN.toml.

    TARGETS is a CSV, ECSV, FITS, VOTable or Parquet table, or space-separated text; the plan's [columns]
    says which column is what where the names do not. Or a file of orbits in the Minor Planet Center's
    formats. Several files are planned together, of whatever kind each is, with the bodies of the plan's
    [targets]; the result then has a column for the source. The night runs from local mean noon to noon.

    Beside windows.parquet stand windows.blocked.parquet, the targets without a window and what blocks
    each, and, if there are any, windows.rejected.csv, the rows that could not be planned and why.
    """
    from ._plan_night import plan_night

    return plan_night(plan, targets, night, bodies=bodies, output=output, threads=threads, quiet=quiet)
