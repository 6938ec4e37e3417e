"""The run of one night, shared by `night` and `demo`: read, call `windows`, write, report."""

from __future__ import annotations

import datetime
import warnings
from collections.abc import Sequence
from pathlib import Path

from . import _lists

#: Targets a call: small enough for a progress bar that moves, large enough that the track costs nothing.
BLOCK = 40_000


def plan_night(
    plan_path: Path,
    targets_paths: Sequence[Path],
    night: datetime.date,
    *,
    bodies: Sequence[str] | None = None,
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
    from ..io.provenance import command_line, provenance, sun_limit_lowered
    from ..io.results import blocked_table, windows_table
    from ..report.night import night_report
    from ..results import FIRST_BAD_STATUS

    _lists.given_lists(targets_paths, bodies)
    _lists.check_output(output, plan_path, *targets_paths)
    plan = read_plan(plan_path)
    site = plan.site()
    if not plan.limit_columns:
        plan.limits()  # a wrong limit is told before a large table is read
    targets = _lists.read_lists(plan, targets_paths, bodies, quiet=quiet, with_limits=True)

    almanac = hourarc.almanac(site, night.isoformat(), 1)
    if almanac.status[0] >= FIRST_BAD_STATUS:
        raise WrongInput(f"the night of {night} cannot be computed: {almanac.status_words[0]}")
    start, stop = almanac.start[0], almanac.stop[0]
    of_lists = [plan.limits(part) for part in targets]
    tables = []
    with _lists.progress(len(targets), quiet, BLOCK + 1) as step:
        for part, of_list in zip(targets, of_lists, strict=True):
            found, blocked, status, words = [], [], [], []
            for first in range(0, len(part), BLOCK):
                last = min(first + BLOCK, len(part))
                with warnings.catch_warnings():
                    warnings.simplefilter("ignore", HourarcWarning)  # said once, of the whole list
                    of_part = plan.limits(part, first, last) if plan.limit_columns else of_list
                rows = part.part(first, last)
                result = hourarc.windows(site, rows, start, stop, of_part, threads=threads)
                found.append(windows_table(result, part, first))
                blocked.append(blocked_table(result, part, first))
                status.append(result.status)
                words.append(result.status_words)
                step(last - first)
            tables.append((pa.concat_tables(found), pa.concat_tables(blocked)))
            _lists.tell_far(np.concatenate(words))
            part.reject(np.concatenate(status) >= FIRST_BAD_STATUS, np.concatenate(words))
    windows, without = (targets.join(list(each)) for each in zip(*tables, strict=True))

    limits = next((each for each in of_lists if sun_limit_lowered(each)), of_lists[0])
    called = command_line(
        "night",
        plan_path,
        *_lists.called_with(targets_paths, bodies),
        "--night",
        night,
        *(("-o", output) if output else ()),
    )
    record = provenance(
        plan=plan, site=site, limits=limits, targets=targets, command=called, night=night.isoformat()
    )
    written = _lists.write_list(output, windows, {"blocked": without}, targets, record)
    if not quiet:
        earth = hourarc.Orientation.packaged().at(stop)
        report = night_report(site, night, almanac, windows, without, targets, earth)
        _lists.tell(report, output, written)
    return _lists.tell_rejected(targets, written)
