"""The run of a season: read, call `visibility_grid` some nights at a time, write, report."""

from __future__ import annotations

import datetime
import sys
from collections.abc import Sequence
from pathlib import Path

from . import _lists, _options

#: Bytes of results in memory at once: the buffer that is computed into and written from.
BUFFER = 128_000_000


def plan_year(
    plan_path: Path,
    targets_path: Path | None,
    first: datetime.date,
    nights: int,
    quantities: tuple[str, ...],
    *,
    bodies: Sequence[str] | None = None,
    output: Path,
    threads: int | None,
    quiet: bool,
) -> int:
    """Plans the nights and returns the exit code. `output` is a Zarr store."""
    import click
    import numpy as np

    import hourarc

    from ..io.plan import read_plan
    from ..io.provenance import command_line, provenance
    from ..io.results import season_table
    from ..io.season_store import CHUNK_NIGHTS, SeasonStore, check_store
    from ..io.whole import WholeFiles
    from ..io.writers import beside, check_result, write_rejected, write_table
    from ..report.year import year_report
    from ..results import FIRST_BAD_STATUS
    from ..season_summary import SeasonTally

    last = first + datetime.timedelta(days=nights - 1)
    if last > _options.LAST_NIGHT:
        raise click.BadParameter(
            f"the last night would be {last}, allowed to {_options.LAST_NIGHT}", param_hint="--nights"
        )
    inputs = [path for path in (plan_path, targets_path) if path is not None]
    season_path, rejected_path = beside(output, "season", ".parquet"), beside(output, "rejected", ".csv")
    check_store(output, inputs)
    check_result(season_path, inputs)
    plan = read_plan(plan_path)
    site = plan.site()
    if not plan.limit_columns:
        plan.limits()  # a wrong limit is told before a large table is read
    targets = _lists.read_list(plan, targets_path, bodies, quiet=quiet, with_limits=True)

    # One night tells which rows cannot be planned, and whether the span can.
    names = tuple(dict.fromkeys(("hours", *quantities)))
    trial = hourarc.visibility_grid(site, targets.part(), first, 1, plan.limits(targets), threads=threads)
    targets.reject(trial.status >= FIRST_BAD_STATUS, trial.status_words)
    rows, limits = targets.part(), plan.limits(targets)

    types = [hourarc.GRID_QUANTITIES[name] for name in names]
    together = max(1, BUFFER // max(1, len(targets) * sum(each.itemsize for each in types)))
    # Whole chunks, and no more nights than a progress bar wants to step by.
    together = min(together, nights, 8 * CHUNK_NIGHTS)
    together -= together % CHUNK_NIGHTS if together > CHUNK_NIGHTS else 0
    buffer = {name: np.empty((together, len(targets)), each) for name, each in zip(names, types, strict=True)}
    night = np.datetime64(first, "D") + np.arange(nights)
    tally, dark_hours = SeasonTally(len(targets)), []
    with WholeFiles() as files:
        # The store is renamed last: where it stands, its companions stand.
        store = SeasonStore(
            files.create_folder(output), names, night, len(targets), min(together, CHUNK_NIGHTS)
        )
        store.write_targets(targets.row, targets.name)
        with _lists.progress(nights, quiet, 2) as step:
            for begun in range(0, nights, together):
                count = min(together, nights - begun)
                out = {name: values[:count] for name, values in buffer.items()}
                grid = hourarc.visibility_grid(
                    site, rows, night[begun], count, limits, quantities=names, out=out, threads=threads
                )
                store.write_nights(begun, grid)
                tally.add(grid.night, grid.hours)
                dark_hours.append(grid.dark_hours)
                step(count)
        summary = tally.summary(trial.status[trial.status < FIRST_BAD_STATUS], None)
        season = season_table(summary, targets)
        called = command_line(
            "year",
            plan_path,
            *((targets_path,) if targets_path else ("--bodies", ",".join(bodies or ()))),
            *("--from", first, "--nights", nights, "--quantities", ",".join(quantities), "-o", output),
        )
        record = provenance(
            plan=plan,
            site=site,
            limits=limits,
            targets=targets,
            command=called,
            span=f"{nights} nights from {first}",
        )
        store.finish(record)
        write_table(season, season_path, record, files)
        if len(targets.rejected) or rejected_path.exists():
            write_rejected(targets.rejected, rejected_path, record, files)
        written = files.commit()
    if not quiet:
        report = year_report(site, summary, season, np.concatenate(dark_hours), targets)
        _lists.tell(report, output, written)
    sys.stdout.flush()
    return _lists.tell_rejected(targets, written)
