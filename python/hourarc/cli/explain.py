"""`hourarc explain`: why one target may be observed when it may, or why not at all."""

from __future__ import annotations

import datetime
from pathlib import Path
from typing import TYPE_CHECKING

import click

from . import _lists, _options

if TYPE_CHECKING:
    from ..io.targets import Targets


@click.command(short_help="Why a target may be observed when it may, or not at all.")
@_options.plan
@_options.targets
@click.option("--name", metavar="NAME", help="The target, by its name.")
@click.option("--row", type=click.IntRange(1), metavar="N", help="The target, by its row in TARGETS, from 1.")
@click.option(
    "--night", type=_options.NIGHT, required=True, help="Date of the night's evening, such as 2026-03-10."
)
@_options.bodies
@_options.result("The intervals of every limit")
@_options.quiet
def command(
    plan: Path,
    targets: Path | None,
    name: str | None,
    row: int | None,
    night: datetime.date,
    bodies: tuple[str, ...] | None,
    output: Path | None,
    quiet: bool,
) -> int:
    """Show when each limit of PLAN.toml holds for one target of TARGETS in one night, and how they intersect.

    The target is named by --name or --row; of one body (--bodies mars) neither is needed. The limits stand in
    the order in which they are applied, each with what it and those above it leave of the night.
    """
    import hourarc

    from ..io.plan import read_plan
    from ..io.provenance import command_line, provenance
    from ..io.results import explanation_table
    from ._run import DONE

    _lists.given_list(targets, bodies)
    if name is not None and row is not None:
        raise click.UsageError(f"both --name {name} and --row {row} are given; one of them is needed")
    _lists.check_output(output, plan, targets)
    read = read_plan(plan)
    site = read.site()
    rows = _lists.read_list(read, targets, bodies, quiet=True, with_limits=True)
    index = _found(rows, name, row)
    limits = read.limits(rows, index, index + 1)
    target = rows.part(index, index + 1)
    called = rows.name[index].as_py()
    explained = hourarc.explain(site, _named(target, called), night.isoformat(), limits)
    if output is not None:
        typed = command_line(
            "explain",
            plan,
            *((targets,) if targets else ("--bodies", ",".join(bodies or ()))),
            *(("--name", name) if name is not None else ("--row", row) if row is not None else ()),
            "--night",
            night,
            "-o",
            output,
        )
        record = provenance(
            plan=read, site=site, limits=limits, command=typed, night=night.isoformat(), target=called
        )
        _lists.write_one(output, explanation_table(explained, rows, index), record)
    if not quiet:
        _lists.tell(str(explained), output, [] if output is None or _lists.to_stdout(output) else [output])
    return DONE


def _found(rows: Targets, name: str | None, row: int | None) -> int:
    """The place among the targets of the one that is meant."""
    import numpy as np

    from ..io.problems import WrongInput, nearest

    if name is None and row is None:
        if len(rows) == 1:
            return 0
        raise click.UsageError(f"{rows.source} has {len(rows):,} targets; --name or --row is needed")
    rejected = rows.rejected
    if name is not None:
        names = np.asarray(rows.name.to_pylist(), dtype=np.str_)
        found = np.flatnonzero(names == name)
        if len(found) > 1:
            listed = ", ".join(map(str, rows.row[found[:5]])) + (", ..." if len(found) > 5 else "")
            raise WrongInput(f"{rows.source}: {len(found)} rows are named {name!r}; one of --row {listed}")
        refused = [i for i, other in enumerate(rejected.name) if other == name]
        if not len(found) and not refused:
            raise WrongInput(
                f"{rows.source}: no target is named {name!r}; {_hint(nearest(name, names[:100_000]))}"
            )
    else:
        found = np.flatnonzero(rows.row == row)
        refused = [i for i, other in enumerate(rejected.row) if other == row]
        if not len(found) and not refused:
            raise WrongInput(f"{rows.source}: there is no row {row}; it has {rows.rows_read:,}")
    if not len(found):
        raise WrongInput(f"{rows.source}: that row was rejected: {rejected.line(refused[0])}")
    return int(found[0])


def _hint(said: str) -> str:
    """The nearest name; a list of all of them would help nobody."""
    return said if said.startswith("did you mean") else "the names are those of the table's name column"


def _named(target: object, name: str) -> object:
    """The target with its name, which parts of a list do not carry."""
    import hourarc

    if not isinstance(target, hourarc.Catalog):
        return target
    columns = {
        key: getattr(target, key)
        for key in (
            "ra_deg",
            "dec_deg",
            "epoch_yr",
            "pm_ra_mas_yr",
            "pm_dec_mas_yr",
            "parallax_mas",
            "radial_velocity_km_s",
        )
    }
    return hourarc.Catalog(**columns, name=[name])
