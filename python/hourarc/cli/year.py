"""`hourarc year`: what every target of a list offers on every night of a season."""

from __future__ import annotations

import datetime
from pathlib import Path

import click

from . import _lists, _options


@click.command(short_help="Hours of every target on every night of a season or a year.")
@_options.plan
@_options.targets
@click.option("--from", "first", type=_options.NIGHT, required=True, help="Date of the first evening.")
@click.option(
    "--nights",
    type=click.IntRange(1, 75_000),
    default=365,
    show_default=True,
    metavar="N",
    help="How many nights.",
)
@click.option(
    "--quantities",
    type=_options.QUANTITIES,
    default="hours",
    show_default=True,
    metavar="NAMES",
    help="What to compute: hours,window_count,start,stop,best_airmass,transit,moon_separation_min",
)
@_options.bodies
@click.option(
    "-o",
    "--output",
    required=True,
    type=click.Path(file_okay=False, path_type=Path),
    help="The season: a .zarr store.",
)
@_options.threads
@_options.quiet
def command(
    plan: Path,
    targets: Path | None,
    first: datetime.date,
    nights: int,
    quantities: tuple[str, ...],
    bodies: tuple[str, ...] | None,
    output: Path,
    threads: int | None,
    quiet: bool,
) -> int:
    """The hours, and more, of every target of TARGETS on every night under the limits of PLAN.toml.

    year.zarr is a Zarr store of arrays of nights by targets, which xarray opens as a dataset: the numbers of
    a night stand together. Hours are always in it. Beside it stand year.season.parquet, a row a target with
    its first and last useful night, their number and its hours, and, if there are any, year.rejected.csv, the
    rows that could not be planned and why. The season is computed and written some nights at a time and
    never is in memory as a whole; the files appear whole or not at all.
    """
    from ._plan_year import plan_year

    _lists.given_list(targets, bodies)
    return plan_year(
        plan, targets, first, nights, quantities, bodies=bodies, output=output, threads=threads, quiet=quiet
    )
