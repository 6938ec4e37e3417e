"""`hourarc demo`: the main job on an invented station."""

from __future__ import annotations

import datetime
import sys
from pathlib import Path

import click

from . import _options


@click.command(short_help="Write a demonstration plan and target list, and plan one night with them.")
@click.argument(
    "folder", type=click.Path(file_okay=False, path_type=Path), default="hourarc-demo", metavar="[DIR]"
)
@click.option(
    "--night",
    type=_options.NIGHT,
    default="2026-03-10",
    show_default=True,
    help="Date of the night's evening.",
)
@click.option(
    "--replace", is_flag=True, help="Write the demonstration's files again where they were changed."
)
@_options.threads
@_options.quiet
def command(folder: Path, night: datetime.date, replace: bool, threads: int | None, quiet: bool) -> int:
    """Write the plan and the targets of the invented Saltpan Ridge station to DIR, and plan one night.

    DIR (hourarc-demo if not given) then holds saltpan-ridge.toml, targets.csv, windows.parquet and
    windows.blocked.parquet. Files that you changed are used as they are.
    """
    from ..demo import write_demo
    from ._plan_night import plan_night

    plan, targets, kept = write_demo(folder, replace=replace)
    if not quiet:
        for path in kept:
            print(
                f"hourarc: {path} is not as the demonstration has it; it is used as it is (or say --replace)",
                file=sys.stderr,
            )
    output = folder / "windows.parquet"
    code = plan_night(plan, (targets,), night, output=output, threads=threads, quiet=quiet)
    if not quiet:
        print(f"\nThe same by hand:\n  hourarc night {plan} {targets} --night {night} -o {output}")
    return code
