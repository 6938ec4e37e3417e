"""`hourarc almanac`: Sun and Moon, night by night."""

from __future__ import annotations

import datetime
import sys
from pathlib import Path

import click

from . import _options


@click.command(short_help="Sun and Moon at the site, night by night.")
@click.argument("plan", type=_options.FILE, metavar="PLAN.toml")
@click.option("--from", "first", type=_options.NIGHT, required=True, help="Date of the first evening.")
@click.option(
    "--nights",
    type=click.IntRange(1, 75_000),
    default=30,
    show_default=True,
    metavar="N",
    help="How many nights.",
)
@click.option(
    "-o",
    "--output",
    type=click.Path(dir_okay=False, path_type=Path),
    help="Also to a .parquet, .csv or .ecsv file.",
)
@_options.quiet
def command(plan: Path, first: datetime.date, nights: int, output: Path | None, quiet: bool) -> int:
    """Sunset and sunrise, the three dusks and dawns, moonrise and moonset, the Moon's age and light, dark
    hours.

    A night runs from local mean noon to noon and is labelled by the date of its evening. Only [site] of
    PLAN.toml is used.
    """
    import hourarc

    from ..io.plan import read_plan
    from ..io.problems import WrongInput
    from ..io.provenance import command_line, provenance
    from ..io.whole import WholeFiles
    from ..io.writers import check_result, write_table
    from ..report.almanac import almanac_report
    from ..results import FIRST_BAD_STATUS

    last = first + datetime.timedelta(days=nights - 1)
    if last > _options.LAST_NIGHT:
        raise click.BadParameter(
            f"the last night would be {last}, allowed to {_options.LAST_NIGHT}", param_hint="--nights"
        )
    if output is not None:
        check_result(output, (plan,))
    read = read_plan(plan)
    site = read.site()
    result = hourarc.almanac(site, first.isoformat(), nights)
    if (result.status >= FIRST_BAD_STATUS).all():
        raise WrongInput(f"the nights from {first} cannot be computed: {result.status_words[0]}")
    if output is not None:
        called = command_line("almanac", plan, "--from", first, "--nights", nights, "-o", output)
        record = provenance(plan=read, site=site, command=called, span=f"{nights} nights from {first}")
        with WholeFiles() as files:
            write_table(result.to_arrow(), output, record, files)
    if not quiet:
        print(almanac_report(site, result))
        if output is not None:
            print(f"written: {output}", file=sys.stderr)
    return 0
