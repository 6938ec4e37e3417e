"""Options and argument types that several commands share."""

from __future__ import annotations

import calendar
import datetime
import re
from collections.abc import Callable
from pathlib import Path
from typing import TYPE_CHECKING, Any, TypeVar

import click

_Command = TypeVar("_Command", bound=Callable[..., Any])

#: The nights that can be planned: UTC begins with 1960, the built-in ephemeris ends with 2100.
FIRST_NIGHT, LAST_NIGHT = datetime.date(1960, 1, 1), datetime.date(2100, 12, 31)

FILE = click.Path(exists=True, dir_okay=False, readable=True, path_type=Path)


if TYPE_CHECKING:
    import numpy as np

    _Date = click.ParamType[datetime.date]
    _Time = click.ParamType[np.datetime64]
    _Names = click.ParamType[tuple[str, ...]]
else:  # older click knows no type argument
    _Date = _Time = _Names = click.ParamType


class Night(_Date):
    """The date of a night's evening, such as 2026-03-10."""

    name = "date"

    def convert(self, value: Any, param: click.Parameter | None, ctx: click.Context | None) -> datetime.date:
        if isinstance(value, datetime.date):
            return value
        match = re.fullmatch(r"(\d{4})-(\d{2})-(\d{2})", str(value).strip())
        if not match:
            self.fail(f"given {value!r}; a date such as 2026-03-10 is needed", param, ctx)
        year, month, day = (int(part) for part in match.groups())
        if not 1 <= month <= 12:
            self.fail(f"{value} does not exist: there is no month {month}", param, ctx)
        if year >= 1 and not 1 <= day <= (length := calendar.monthrange(year, month)[1]):
            self.fail(
                f"{value} does not exist: {calendar.month_name[month]} {year} has {length} days", param, ctx
            )
        if not FIRST_NIGHT.year <= year <= LAST_NIGHT.year:
            why = "there is no UTC before 1960" if year < FIRST_NIGHT.year else "the ephemeris ends there"
            self.fail(f"given {value}, allowed {FIRST_NIGHT} to {LAST_NIGHT}: {why}", param, ctx)
        return datetime.date(year, month, day)


class Instant(_Time):
    """An instant such as 2026-03-10T03:00, UTC."""

    name = "instant"

    def convert(self, value: Any, param: click.Parameter | None, ctx: click.Context | None) -> np.datetime64:
        import numpy as np

        from ..errors import InvalidArgument
        from ..times import to_nanoseconds

        if isinstance(value, np.datetime64):
            return value
        example = "UTC such as 2026-03-10T03:00 (Z or an offset may follow)"
        try:
            nanoseconds, _ = to_nanoseconds(str(value), "the instant")
        except InvalidArgument as error:
            known = re.fullmatch(r"the instant: given (.*), allowed (.*)", str(error))
            said, allowed = known.groups() if known else (repr(value), example)
            allowed = example if allowed.startswith("UTC") else allowed
            self.fail(f"given {said}, allowed {allowed}", param, ctx)
        time: np.datetime64 = nanoseconds.view("datetime64[ns]")[0]
        if np.isnat(time):
            self.fail(f"given {value!r}, allowed {example}", param, ctx)
        if not FIRST_NIGHT.year <= int(str(time)[:4]) <= LAST_NIGHT.year:
            self.fail(f"given {value}, allowed {FIRST_NIGHT} to {LAST_NIGHT}, UTC", param, ctx)
        return time


class BodyNames(_Names):
    """Bodies of the solar system: moon,mars."""

    name = "names"

    def convert(
        self, value: Any, param: click.Parameter | None, ctx: click.Context | None
    ) -> tuple[str, ...]:
        if isinstance(value, tuple):
            return value
        from ..errors import UnknownName
        from ..targets import Bodies

        names = tuple(str(value).replace(",", " ").lower().split())
        if not names:
            self.fail("no name is given; names such as moon,mars are needed", param, ctx)
        if doubled := next((name for name in names if names.count(name) > 1), None):
            self.fail(f"{doubled} is given twice", param, ctx)
        try:
            Bodies(names)
        except UnknownName as error:
            self.fail(str(error).removeprefix("Bodies: name: "), param, ctx)
        return names


class Quantities(_Names):
    """Quantities of a season: hours,start,stop."""

    name = "names"

    def convert(
        self, value: Any, param: click.Parameter | None, ctx: click.Context | None
    ) -> tuple[str, ...]:
        if isinstance(value, tuple):
            return value
        from ..errors import UnknownName
        from ..season import GRID_QUANTITIES

        names = tuple(str(value).replace(",", " ").lower().split())
        if not names:
            self.fail(f"no name is given; allowed {', '.join(GRID_QUANTITIES)}", param, ctx)
        if doubled := next((name for name in names if names.count(name) > 1), None):
            self.fail(f"{doubled} is given twice", param, ctx)
        if unknown := next((name for name in names if name not in GRID_QUANTITIES), None):
            self.fail(str(UnknownName.among("quantity", unknown, GRID_QUANTITIES)), param, ctx)
        return names


NIGHT, INSTANT, BODY_NAMES, QUANTITIES = Night(), Instant(), BodyNames(), Quantities()

plan = click.argument("plan", type=FILE, metavar="PLAN.toml")
targets = click.argument("targets", type=FILE, required=False, metavar="[TARGETS]")
target_lists = click.argument("targets", type=FILE, nargs=-1, metavar="[TARGETS]...")
bodies = click.option(
    "--bodies",
    type=BODY_NAMES,
    metavar="NAMES",
    help="Bodies of the solar system in the place of TARGETS: moon,mars",
)
threads = click.option(
    "--threads",
    type=click.IntRange(1, 4096),
    metavar="N",
    help="Threads to compute with; all cores if not given.",
)
quiet = click.option(
    "-q", "--quiet", is_flag=True, help="No summary, notes or progress; warnings and errors only."
)


def result(what: str, *, required: bool = False) -> Callable[[_Command], _Command]:
    """The option `-o` of a command that writes a table and its companions."""
    return click.option(
        "-o",
        "--output",
        required=required,
        type=click.Path(dir_okay=False, allow_dash=True, path_type=Path),
        help=f"{what}: a .parquet, .csv or .ecsv file, or - for CSV to standard output.",
    )
