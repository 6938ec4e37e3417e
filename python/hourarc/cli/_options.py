"""Options and argument types that several commands share."""

from __future__ import annotations

import calendar
import datetime
import re
from pathlib import Path
from typing import Any

import click

#: The dates that the built-in ephemeris covers.
FIRST_NIGHT, LAST_NIGHT = datetime.date(1900, 1, 1), datetime.date(2100, 12, 31)

FILE = click.Path(exists=True, dir_okay=False, readable=True, path_type=Path)


class Night(click.ParamType):  # type: ignore[type-arg, unused-ignore]  # generic in new releases only
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
            self.fail(f"given {value}, allowed {FIRST_NIGHT} to {LAST_NIGHT}", param, ctx)
        return datetime.date(year, month, day)


NIGHT = Night()

threads = click.option(
    "--threads",
    type=click.IntRange(1, 4096),
    metavar="N",
    help="Threads to compute with; all cores if not given.",
)
quiet = click.option(
    "-q", "--quiet", is_flag=True, help="No summary, notes or progress; warnings and errors only."
)
