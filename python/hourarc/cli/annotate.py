"""`hourarc annotate`: where each exposure of an archive was pointed, seen from the telescope."""

from __future__ import annotations

from pathlib import Path

import click

from . import _lists, _options


@click.command(short_help="Add altitude, airmass, Moon, Sun and more to a table of exposures.")
@_options.plan
@click.argument("exposures", type=_options.FILE, metavar="EXPOSURES")
@_options.result("The annotations", required=True)
@_options.threads
@_options.quiet
def command(plan: Path, exposures: Path, output: Path, threads: int | None, quiet: bool) -> int:
    """Altitude, azimuth, airmass, hour angle, declination of date, parallactic angle and the angles to
    Moon and Sun of each row of EXPOSURES at the row's own instant.

    EXPOSURES is a table as TARGETS of `hourarc night`, with a column of instants in UTC besides: ISO 8601
    text, timestamps, MJD or JD, found by its name (time, utc, date-obs, mjd, jd) or said in the plan:
    time = { column = "start", unit = "mjd" }. Which instant of an exposure that is, beginning or middle, is
    yours to choose.

    A row of the result is a row of EXPOSURES, by its number; rows without a place are listed in
    FILE.rejected.csv. Of PLAN.toml, [site] and [columns] are used.
    """
    import hourarc

    from ..io.plan import read_plan
    from ..io.provenance import command_line, provenance
    from ..io.results import places_table
    from ..report.annotate import annotate_report

    _lists.check_output(output, plan, exposures)
    read = read_plan(plan)
    site = read.site()
    rows = _lists.read_list(read, exposures, quiet=quiet, with_time=True)
    places = hourarc.place(
        site, rows.part(), rows.time, columns=hourarc.PLACE_COLUMNS, pairwise=True, threads=threads
    )
    table = places_table(places, rows)
    called = command_line("annotate", plan, exposures, "-o", output)
    record = provenance(plan=read, site=site, targets=rows, done="annotated", command=called)
    written = _lists.write_list(output, table, {}, rows, record)
    if not quiet:
        _lists.tell(annotate_report(site, table, rows), output, written)
    return _lists.tell_rejected(rows, written)
