"""`hourarc sky`: where every target of a list stands at one instant."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

import click

from . import _lists, _options

if TYPE_CHECKING:
    import numpy as np


@click.command(short_help="Where everything stands at one instant.")
@_options.plan
@_options.targets
@click.option(
    "--at", type=_options.INSTANT, required=True, help="The instant, UTC, such as 2026-03-10T03:00."
)
@_options.bodies
@_options.result("The places")
@_options.threads
@_options.quiet
def command(
    plan: Path,
    targets: Path | None,
    at: np.datetime64,
    bodies: tuple[str, ...] | None,
    output: Path | None,
    threads: int | None,
    quiet: bool,
) -> int:
    """Altitude, azimuth, airmass, hour angle, declination of date, parallactic angle and the angles to
    Moon and Sun of every target of TARGETS at one instant.

    TARGETS is a table as for `hourarc night`. Of PLAN.toml, [site] and [columns] are used; the limits are
    not. If there are any, the rows that have no place are listed in FILE.rejected.csv.
    """
    import hourarc

    from ..io.plan import read_plan
    from ..io.provenance import command_line, provenance
    from ..io.results import places_table
    from ..report.sky import sky_report

    _lists.given_list(targets, bodies)
    _lists.check_output(output, plan, targets)
    read = read_plan(plan)
    site = read.site()
    rows = _lists.read_list(read, targets, bodies, quiet=quiet)
    places = hourarc.place(site, rows.part(), at, columns=hourarc.PLACE_COLUMNS, threads=threads)
    table = places_table(places, rows)
    lights = hourarc.place(site, hourarc.Bodies(["sun", "moon"]), at)
    called = command_line(
        "sky",
        plan,
        *((targets,) if targets else ("--bodies", ",".join(bodies or ()))),
        "--at",
        at,
        *(("-o", output) if output else ()),
    )
    record = provenance(
        plan=read, site=site, targets=rows, done="placed", command=called, instant=f"{at} UTC"
    )
    written = _lists.write_list(output, table, {}, rows, record)
    if not quiet:
        earth = hourarc.Orientation.packaged().at(at)
        _lists.tell(sky_report(site, at, lights, table, rows, earth), output, written)
    return _lists.tell_rejected(rows, written)
