"""The `hourarc` command. One command a file: a module here whose name has no underscore in front is a
command.

Nothing is computed in this package; commands read, call one verb, and hand its result to `io` and `report`.
"""

from __future__ import annotations

import sys
from collections.abc import Sequence


def main(arguments: Sequence[str] | None = None) -> None:
    """Runs the command line and ends the process with its exit code."""
    try:
        import click  # noqa: F401
    except ImportError:
        print(
            "hourarc: error: the command line needs click and pyarrow: pip install 'hourarc[cli]'",
            file=sys.stderr,
        )
        raise SystemExit(1) from None
    from ._run import run

    raise SystemExit(run(sys.argv[1:] if arguments is None else list(arguments)))
