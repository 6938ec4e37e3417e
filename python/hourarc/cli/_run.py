"""The group of commands, and the one place where exceptions become messages and exit codes.

| code | meaning |
|---|---|
| 0 | done |
| 1 | failed: a file cannot be read or written, a package is missing |
| 2 | wrong call: an option, a plan, a column or a date has to be changed |
| 3 | done, but some rows were rejected |
"""

from __future__ import annotations

import importlib
import os
import pkgutil
import sys
import warnings
from collections.abc import Sequence

import click

from .. import __version__
from ..errors import HourarcError, HourarcWarning
from . import __path__ as _folder

DONE, FAILED, WRONG_CALL, DONE_WITH_REJECTED = 0, 1, 2, 3


class _Commands(click.Group):
    """Finds its commands in the files of this folder, and imports a file when its command is asked for."""

    def list_commands(self, ctx: click.Context) -> list[str]:
        return sorted(name for _, name, _ in pkgutil.iter_modules(_folder) if not name.startswith("_"))

    def get_command(self, ctx: click.Context, cmd_name: str) -> click.Command | None:
        if cmd_name not in self.list_commands(ctx):
            return None
        command: click.Command = importlib.import_module(f"{__package__}.{cmd_name}").command
        return command

    def resolve_command(
        self, ctx: click.Context, args: list[str]
    ) -> tuple[str | None, click.Command | None, list[str]]:
        if args and not args[0].startswith("-") and args[0] not in self.list_commands(ctx):
            from ..io.problems import nearest

            raise click.UsageError(
                f'there is no command "{args[0]}"; {nearest(args[0], self.list_commands(ctx))}', ctx
            )
        return super().resolve_command(ctx, args)


@click.group(
    cls=_Commands,
    context_settings={"help_option_names": ["-h", "--help"], "max_content_width": 110},
    epilog="Exit codes: 0 done, 1 failed, 2 wrong call, 3 done with rejected rows.",
)
@click.version_option(__version__, "--version", prog_name="hourarc", message="%(prog)s %(version)s")
def commands() -> None:
    """When can this telescope observe each of very many targets?

    All times are UTC. The Sun limits of a plan are for planning: they are never the interlock that keeps
    a telescope from the Sun, and the observatory's own safety rules stand above them.
    """


def run(arguments: Sequence[str]) -> int:
    """Runs one command and returns its exit code."""
    # A stream that the caller has closed is None, and what is printed to None goes to the other one.
    sys.stdout = sys.stdout or open(os.devnull, "w")  # noqa: SIM115
    sys.stderr = sys.stderr or open(os.devnull, "w")  # noqa: SIM115
    said: set[str] = set()

    def show(message: Warning | str, category: type[Warning], *_: object, **__: object) -> None:
        text = str(message)
        if text not in said:
            said.add(text)
            print(f"hourarc: caution: {text}", file=sys.stderr)

    with warnings.catch_warnings():
        warnings.simplefilter("always", HourarcWarning)
        warnings.showwarning = show
        try:
            code = commands.main(list(arguments), prog_name="hourarc", standalone_mode=False)
            sys.stdout.flush()
            return code if isinstance(code, int) else DONE
        except click.exceptions.Exit as stop:
            return stop.exit_code
        except click.ClickException as error:
            error.show()
            return error.exit_code
        except (click.Abort, KeyboardInterrupt):
            return _failed("interrupted; no result was written")
        except BrokenPipeError:
            # The reader of the pipe has gone. Keep the interpreter from flushing into it.
            os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
            return FAILED
        except HourarcError as error:
            _failed(str(error))
            return WRONG_CALL if isinstance(error, (ValueError, TypeError, AttributeError)) else FAILED
        except OSError as error:
            return _failed(
                f"{error.filename}: {error.strerror}" if error.filename and error.strerror else str(error)
            )
        except ImportError as error:
            return _failed(f"{error}: pip install 'hourarc[cli]'")


def _failed(message: str) -> int:
    print(f"hourarc: error: {message}", file=sys.stderr)
    return FAILED
