"""The run of one night, shared by `night` and `demo`: read, call `windows`, write, report."""

from __future__ import annotations

import contextlib
import datetime
import sys
import warnings
from collections.abc import Iterator
from pathlib import Path
from typing import Any

from ._run import DONE, DONE_WITH_REJECTED

#: Targets a call: small enough for a progress bar that moves, large enough that the track costs nothing.
BLOCK = 40_000

#: Rejected rows that are shown on the terminal; the file has all of them.
SHOWN = 5


def plan_night(
    plan_path: Path,
    targets_path: Path,
    night: datetime.date,
    *,
    output: Path | None,
    threads: int | None,
    quiet: bool,
) -> int:
    """Plans one night and returns the exit code. `output` may be "-": CSV to standard output."""
    import numpy as np
    import pyarrow as pa

    import hourarc

    from ..errors import HourarcWarning
    from ..io.plan import read_plan
    from ..io.problems import WrongInput
    from ..io.provenance import command_line, provenance
    from ..io.results import blocked_table, windows_table
    from ..io.targets import read_targets
    from ..io.writers import check_result, write_text
    from ..report.night import night_report
    from ..results import FIRST_BAD_STATUS

    to_stdout = output is not None and str(output) == "-"
    if output is not None and not to_stdout:
        check_result(output, (plan_path, targets_path))
    plan = read_plan(plan_path)
    site = plan.site()
    if not plan.limit_columns:
        plan.limits()  # a wrong limit is told before a large table is read
    targets = read_targets(targets_path, plan.columns, layout=plan.layout, limit_columns=plan.limit_columns)
    for warning in targets.warnings:
        print(f"hourarc: warning: {targets_path}: {warning}", file=sys.stderr)
    if not quiet:
        for note in targets.notes:
            print(f"hourarc: note: {targets_path}: {note}", file=sys.stderr)

    almanac = hourarc.almanac(site, night.isoformat(), 1)
    if almanac.status[0] >= FIRST_BAD_STATUS:
        raise WrongInput(f"the night of {night} cannot be computed: {almanac.status_words[0]}")
    start, stop = almanac.start[0], almanac.stop[0]
    limits = plan.limits(targets)
    found, blocked, status, words = [], [], [], []
    with _progress(len(targets), quiet) as step:
        for first in range(0, len(targets), BLOCK):
            last = min(first + BLOCK, len(targets))
            with warnings.catch_warnings():
                warnings.simplefilter("ignore", HourarcWarning)  # said once, of the whole list
                part = plan.limits(targets, first, last) if plan.limit_columns else limits
            result = hourarc.windows(site, targets.catalog(first, last), start, stop, part, threads=threads)
            found.append(windows_table(result, targets, first))
            blocked.append(blocked_table(result, targets, first))
            status.append(result.status)
            words.append(result.status_words)
            step(last - first)
    windows, without = pa.concat_tables(found), pa.concat_tables(blocked)
    targets.reject(np.concatenate(status) >= FIRST_BAD_STATUS, np.concatenate(words))

    called = command_line(
        "night", plan_path, targets_path, "--night", night, *(("-o", output) if output else ())
    )
    record = provenance(
        plan=plan, site=site, limits=limits, targets=targets, command=called, night=night.isoformat()
    )
    written: list[Path] = []
    if to_stdout:
        write_text(windows, sys.stdout.buffer, record, "csv")
        sys.stdout.buffer.flush()
    elif output is not None:
        written = _write(output, windows, without, targets, record)
    if not quiet:
        report = night_report(site, night, almanac, windows, without, targets)
        print(report, file=sys.stderr if to_stdout else sys.stdout)
        if written:
            print("\nWritten: " + ", ".join(str(path) for path in written))
    return _tell_rejected(targets, written)


def _write(output: Path, windows: Any, without: Any, targets: Any, record: dict[str, Any]) -> list[Path]:
    """The result and its companions, all or none."""
    from ..io.whole import WholeFiles
    from ..io.writers import beside, write_rejected, write_table

    rejected_path = beside(output, "rejected", ".csv")
    with WholeFiles() as files:
        write_table(windows, output, record, files)
        write_table(without, beside(output, "blocked"), record, files)
        # An older list beside a newer result would be about other rows: it is written anew, even if empty.
        if len(targets.rejected) or rejected_path.exists():
            write_rejected(targets.rejected, rejected_path, record, files)
        return files.commit()


def _tell_rejected(targets: Any, written: list[Path]) -> int:
    rejected = targets.rejected
    if not len(rejected):
        return DONE
    lines = [f"hourarc: {len(rejected):,} of {targets.rows_read:,} rows of {targets.path} were rejected:"]
    lines += [f"  {rejected.line(i)}" for i in range(min(SHOWN, len(rejected)))]
    listed = next((path for path in written if path.name.endswith(".rejected.csv")), None)
    if len(rejected) > SHOWN:
        lines.append(f"  and {len(rejected) - SHOWN:,} more" + ("" if listed else "; -o FILE lists them all"))
    if listed:
        lines.append(f"  all of them: {listed}")
    print("\n".join(lines), file=sys.stderr)
    return DONE_WITH_REJECTED


@contextlib.contextmanager
def _progress(total: int, quiet: bool) -> Iterator[Any]:
    """A bar on a terminal, nothing in a pipe."""
    import click

    if quiet or not sys.stderr.isatty() or total <= BLOCK:
        yield lambda _: None
        return
    with click.progressbar(length=total, label="planning", file=sys.stderr) as bar:
        yield bar.update
