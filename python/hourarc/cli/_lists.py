"""What the commands that take a list of targets share: reading it, writing the result, telling of rejects."""

from __future__ import annotations

import contextlib
import sys
from collections.abc import Callable, Iterator, Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

from ._run import DONE, DONE_WITH_REJECTED

if TYPE_CHECKING:
    from ..io.lists import Lists
    from ..io.plan import Plan
    from ..io.targets import Targets

#: Rejected rows that are shown on the terminal; the file has all of them.
SHOWN = 5


def given_list(targets: Path | None, bodies: Sequence[str] | None) -> None:
    """Refuses a call with neither a table nor bodies, or with both."""
    if targets is None and bodies is None:
        raise click.UsageError("Missing argument 'TARGETS' (or name bodies of the solar system: --bodies).")
    if targets is not None and bodies is not None:
        raise click.UsageError(f"both TARGETS ({targets}) and --bodies are given; one of them is needed")


def given_lists(targets: Sequence[Path], bodies: Sequence[str] | None) -> None:
    """Refuses a call with both files and bodies, or with a file twice."""
    if targets and bodies is not None:
        raise click.UsageError(f"both TARGETS ({targets[0]}) and --bodies are given; one of them is needed")
    doubled = next((path for i, path in enumerate(targets) if path in targets[:i]), None)
    if doubled is not None:
        raise click.UsageError(f"{doubled} is given twice")


def read_lists(
    plan: Plan,
    targets: Sequence[Path],
    bodies: Sequence[str] | None = None,
    *,
    quiet: bool,
    with_limits: bool = False,
) -> Lists:
    """The targets of every file, whatever kind each holds, and of the plan's own bodies."""
    from ..io.lists import Lists

    if not targets and bodies is None and not plan.bodies:
        raise click.UsageError(
            "Missing argument 'TARGETS' (or name bodies of the solar system: --bodies, "
            "or bodies in the plan's [targets])."
        )
    parts = [read_list(plan, path, quiet=quiet, with_limits=with_limits) for path in targets]
    named = tuple(dict.fromkeys((*(bodies or ()), *plan.bodies)))
    if named:
        parts.append(read_list(plan, None, named, quiet=quiet, with_limits=with_limits))
    return Lists(parts)


def called_with(targets: Sequence[Path], bodies: Sequence[str] | None) -> list[object]:
    """The words of a command line that name the targets."""
    return [*targets, *(("--bodies", ",".join(bodies)) if bodies else ())]


def tell_far(status_words: Any) -> None:
    """Says of how many orbits the epoch is too far away."""
    far = int((status_words == "far_from_epoch").sum())
    if far:
        were = "orbit is" if far == 1 else "orbits are"
        print(
            f"hourarc: warning: {far:,} {were} so far from the epoch that two-body motion may be off by more "
            "than 5″; take elements of a nearer epoch, or hourarc.Orbits.advance",
            file=sys.stderr,
        )


def to_stdout(output: Path | None) -> bool:
    """Whether the result goes to standard output."""
    return output is not None and str(output) == "-"


def check_output(output: Path | None, *inputs: Path | None) -> None:
    """Refuses a result that cannot be written or would replace an input, before the work."""
    from ..io.writers import check_result

    if output is not None and not to_stdout(output):
        check_result(output, [path for path in inputs if path is not None])


def read_list(
    plan: Plan,
    targets: Path | None,
    bodies: Sequence[str] | None = None,
    *,
    quiet: bool,
    with_limits: bool = False,
    with_time: bool = False,
    other_columns: dict[str, str] | None = None,
) -> Targets:
    """The targets, with what is to be said about them on standard error."""
    from ..io.problems import WrongInput
    from ..io.targets import named_bodies, read_targets

    of_limits = plan.limit_columns if with_limits else {}
    if targets is None:
        if other_columns:
            key, column = next(iter(other_columns.items()))
            raise WrongInput(
                f"{key} is taken from the column {column!r}, and --bodies has no columns; give a number"
            )
        if of_limits:
            key = next(iter(of_limits))
            raise WrongInput(
                f"{plan.where('limits', key)}: {key} is taken from a column, and --bodies has no columns; "
                "give one value"
            )
        return named_bodies(bodies or (), plan.ephemeris)
    read = read_targets(
        targets,
        plan.columns,
        layout=plan.layout,
        limit_columns={**of_limits, **(other_columns or {})},
        with_time=with_time,
    )
    for warning in read.warnings:
        print(f"hourarc: warning: {targets}: {warning}", file=sys.stderr)
    if not quiet:
        for note in read.notes:
            print(f"hourarc: note: {targets}: {note}", file=sys.stderr)
    return read


def write_list(
    output: Path | None,
    main: Any,
    companions: dict[str, Any],
    targets: Targets | Lists,
    record: dict[str, Any],
) -> list[Path]:
    """The result, its companions by the word in their name, and the rejected rows: all files or none."""
    from ..io.whole import WholeFiles
    from ..io.writers import beside, write_rejected, write_table, write_text

    if output is None:
        return []
    if to_stdout(output):
        try:
            write_text(main, sys.stdout.buffer, record, "csv")
            sys.stdout.buffer.flush()
        except BrokenPipeError:
            raise
        except OSError as error:
            raise OSError(error.errno, error.strerror, "standard output") from error
        return []
    rejected_path = beside(output, "rejected", ".csv")
    with WholeFiles() as files:
        write_table(main, output, record, files)
        for word, table in companions.items():
            write_table(table, beside(output, word), record, files)
        # An older list beside a newer result would be about other rows: it is written anew, even if empty.
        if len(targets.rejected) or rejected_path.exists():
            write_rejected(targets.rejected, rejected_path, record, files)
        return files.commit()


@contextlib.contextmanager
def progress(total: int, quiet: bool, least: int) -> Iterator[Callable[[int], None]]:
    """A bar on a terminal, nothing in a pipe, nor where there is less to do than `least`."""
    if quiet or not sys.stderr.isatty() or total < least:
        yield lambda _: None
        return
    with click.progressbar(length=total, label="planning", file=sys.stderr) as bar:
        yield bar.update


def write_one(output: Path, table: Any, record: dict[str, Any]) -> None:
    """A result without companions: a file, or CSV to standard output."""
    from ..io.whole import WholeFiles
    from ..io.writers import write_table, write_text

    if to_stdout(output):
        write_text(table, sys.stdout.buffer, record, "csv")
        sys.stdout.buffer.flush()
        return
    with WholeFiles() as files:
        write_table(table, output, record, files)
        files.commit()


def tell(report: str, output: Path | None, written: list[Path]) -> None:
    """The report, away from the result if that goes to standard output."""
    print(report, file=sys.stderr if to_stdout(output) else sys.stdout)
    if written:
        print("\nWritten: " + ", ".join(str(path) for path in written))


def tell_rejected(targets: Targets | Lists, written: list[Path]) -> int:
    """The first rejected rows, on standard error. Returns the exit code."""
    rejected = targets.rejected
    if not len(rejected):
        return DONE
    were = "was" if len(rejected) == 1 else "were"
    lines = [f"hourarc: {len(rejected):,} of {targets.rows_read:,} rows of {targets.source} {were} rejected:"]
    lines += [f"  {rejected.line(i)}" for i in range(min(SHOWN, len(rejected)))]
    listed = next((path for path in written if path.name.endswith(".rejected.csv")), None)
    if len(rejected) > SHOWN:
        lines.append(f"  and {len(rejected) - SHOWN:,} more" + ("" if listed else "; -o FILE lists them all"))
    if listed:
        lines.append(f"  all of them: {listed}")
    print("\n".join(lines), file=sys.stderr)
    return DONE_WITH_REJECTED
