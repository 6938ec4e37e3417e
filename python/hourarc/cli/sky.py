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
@_options.target_lists
@click.option(
    "--at", type=_options.INSTANT, required=True, help="The instant, UTC, such as 2026-03-10T03:00."
)
@_options.bodies
@_options.result("The places")
@_options.threads
@_options.quiet
def command(
    plan: Path,
    targets: tuple[Path, ...],
    at: np.datetime64,
    bodies: tuple[str, ...] | None,
    output: Path | None,
    threads: int | None,
    quiet: bool,
) -> int:
    """Altitude, azimuth, airmass, hour angle, declination of date, parallactic angle and the angles to
    Moon and Sun of every target of TARGETS at one instant.

    TARGETS are tables as for `hourarc night`, or files of orbits in the Minor Planet Center's formats, in any
    mixture; bodies of the plan's [targets] are added. For what belongs to the solar system there are
    besides: distances, phase angle, elongation, magnitude, motion, illuminated fraction and diameter.

    Of PLAN.toml, [site], [columns] and [targets] are used; the limits are not. If there are any, the rows
    that have no place are listed in FILE.rejected.csv.
    """
    import hourarc

    from ..io.plan import read_plan
    from ..io.provenance import command_line, provenance
    from ..io.results import places_table
    from ..report.sky import sky_report

    _lists.given_lists(targets, bodies)
    _lists.check_output(output, plan, *targets)
    read = read_plan(plan)
    site = read.site()
    rows = _lists.read_lists(read, targets, bodies, quiet=quiet)
    tables = []
    for part in rows:
        places = hourarc.place(site, part.part(), at, columns=hourarc.PLACE_COLUMNS, threads=threads)
        _lists.tell_far(places.status_words)
        tables.append(places_table(places, part))
    table = rows.join(tables)
    lights = hourarc.place(site, hourarc.Bodies(["sun", "moon"]), at)
    called = command_line(
        "sky",
        plan,
        *_lists.called_with(targets, bodies),
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
