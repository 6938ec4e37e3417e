"""`hourarc demand`: requested hours against dark hours, by local sidereal time."""

from __future__ import annotations

import datetime
from pathlib import Path

import click

from . import _lists, _options


@click.command(short_help="Requested hours against dark hours, by local sidereal time.")
@_options.plan
@_options.targets
@click.option("--from", "first", type=_options.NIGHT, required=True, help="Date of the first evening.")
@click.option(
    "--nights",
    type=click.IntRange(1, 3_660),
    required=True,
    metavar="N",
    help="How many nights.",
)
@click.option(
    "--hours",
    required=True,
    metavar="HOURS",
    help="Requested hours: a number for every target, or the column of TARGETS that has each target's own.",
)
@click.option(
    "--bin",
    "bin_h",
    type=click.FLOAT,
    default=1.0,
    show_default=True,
    metavar="H",
    help="Width of a bin, hours of sidereal time; it divides 24.",
)
@_options.bodies
@_options.result("The bins")
@_options.threads
@_options.quiet
def command(
    plan: Path,
    targets: Path | None,
    first: datetime.date,
    nights: int,
    hours: str,
    bin_h: float,
    bodies: tuple[str, ...] | None,
    output: Path | None,
    threads: int | None,
    quiet: bool,
) -> int:
    """Compare what the targets of TARGETS ask for with what the sky of a season has, under the limits of
    PLAN.toml, by local mean sidereal time.

    The supply of a bin is the hours in it in which the limits on Sun and Moon hold; the hours of a target are
    spread over the bins as its own observable hours are. Beside FILE stands FILE.targets, each target with
    what it asks for and what it has.
    """
    import numpy as np

    import hourarc

    from ..io.plan import read_plan
    from ..io.provenance import command_line, provenance
    from ..io.results import requests_table
    from ..report.demand import demand_report
    from ..results import FIRST_BAD_STATUS

    last = first + datetime.timedelta(days=nights - 1)
    if last > _options.LAST_NIGHT:
        raise click.BadParameter(
            f"the last night would be {last}, allowed to {_options.LAST_NIGHT}", param_hint="--nights"
        )
    _lists.given_list(targets, bodies)
    _lists.check_output(output, plan, targets)
    read = read_plan(plan)
    site = read.site()
    number = _number(hours)
    column = {} if number is not None else {"requested_hours": hours}
    rows = _lists.read_list(read, targets, bodies, quiet=quiet, with_limits=True, other_columns=column)
    asked = number if number is not None else rows.limits["requested_hours"]
    limits = read.limits(rows)
    made = hourarc.demand(
        site, rows.part(), first.isoformat(), nights, limits, asked, bin_h=bin_h, threads=threads
    )
    each = requests_table(made, rows)
    rows.reject(made.status >= FIRST_BAD_STATUS, made.status_words)
    typed = command_line(
        "demand",
        plan,
        *((targets,) if targets else ("--bodies", ",".join(bodies or ()))),
        "--from",
        first,
        "--nights",
        nights,
        "--hours",
        hours,
        *(("--bin", f"{bin_h:g}") if bin_h != 1.0 else ()),
        *(("-o", output) if output else ()),
    )
    record = provenance(
        plan=read,
        site=site,
        limits=limits,
        targets=rows,
        done="counted",
        command=typed,
        span=f"{nights} nights from {first}",
    )
    written = _lists.write_list(output, made.to_arrow(), {"targets": each}, rows, record)
    if not quiet:
        names = np.asarray(each["name"].to_pylist(), dtype=np.str_)
        _lists.tell(demand_report(site, first, nights, made, names, rows), output, written)
    return _lists.tell_rejected(rows, written)


def _number(text: str) -> float | None:
    """The number that a text spells; None for the name of a column."""
    try:
        number = float(text)
    except ValueError:
        return None
    if not 0.0 <= number <= 1e5:
        raise click.BadParameter(f"given {text}, allowed 0 to 100000 h", param_hint="--hours")
    return number
