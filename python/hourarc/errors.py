"""What can go wrong with a call, and what the package warns of.

A wrong *call* raises one of the exceptions below; each says what was given, what is allowed, and
where. A wrong *row* never raises: its status says why, and its outputs are NaN or NaT.

    HourarcError
    ├── InvalidArgument (ValueError)      a value, a shape or a combination that is not allowed
    │   └── UnknownName (ValueError)      a keyword, column or word that does not exist
    ├── WrongType (TypeError)             an argument of a kind that cannot be understood
    ├── MissingColumn (AttributeError)    a column of a result that was not asked for
    ├── TableError (ValueError)           a table of Earth orientation or leap seconds that cannot be read
    ├── OutsideOrientation (ValueError)   an instant past the Earth orientation table, with policy "strict"
    └── MissingPackage (ImportError)      an optional package that is not installed
"""

from __future__ import annotations

from collections.abc import Iterable

__all__ = [
    "DebugBuildWarning",
    "HourarcError",
    "HourarcWarning",
    "InvalidArgument",
    "LeapSecondWarning",
    "MissingColumn",
    "MissingPackage",
    "OutsideOrientation",
    "SunLimitWarning",
    "TableError",
    "UnknownName",
    "WrongType",
    "nearest",
]


class HourarcError(Exception):
    """The root of all exceptions of this package."""


class InvalidArgument(HourarcError, ValueError):
    """An argument with a value, shape or combination that is not allowed."""

    @classmethod
    def of(cls, what: str, given: object, allowed: str) -> InvalidArgument:
        """The message in its usual form: where, what was given, what is allowed."""
        return cls(f"{what}: given {given}, allowed {allowed}")


class UnknownName(InvalidArgument):
    """A keyword, column or word that does not exist; the message names the nearest one that does."""

    @classmethod
    def among(cls, what: str, given: object, known: Iterable[str]) -> UnknownName:
        """The message for `given`, which is none of `known`."""
        names = list(known)
        guess = nearest(str(given), names)
        hint = f"; the nearest is {guess!r}" if guess is not None else ""
        return cls(f"{what}: given {given!r}, which is unknown{hint}; allowed {', '.join(names)}")


class WrongType(HourarcError, TypeError):
    """An argument of a kind that cannot be understood."""

    @classmethod
    def of(cls, what: str, given: object, allowed: str) -> WrongType:
        """The message in its usual form, with the type of what was given."""
        shown = repr(given)
        if len(shown) > 80:
            shown = shown[:77] + "..."
        return cls(f"{what}: given {shown} ({type(given).__name__}), allowed {allowed}")


class MissingColumn(HourarcError, AttributeError):
    """A column of a result that was not asked for."""


class TableError(HourarcError, ValueError):
    """A table of Earth orientation or leap seconds that cannot be read; names the file and the line."""


class OutsideOrientation(HourarcError, ValueError):
    """An instant outside the Earth orientation table while its policy is "strict"."""


class MissingPackage(HourarcError, ImportError):
    """An optional package that is needed here and is not installed."""


class HourarcWarning(UserWarning):
    """The root of all warnings of this package."""


class SunLimitWarning(HourarcWarning):
    """The Sun separation limit was lowered below its default."""


class LeapSecondWarning(HourarcWarning):
    """An instant inside a leap second, which `datetime64` cannot hold."""


class DebugBuildWarning(HourarcWarning):
    """The extension was built without optimisation: its answers are right, its speed is not."""


def nearest(given: str, known: Iterable[str]) -> str | None:
    """The name among `known` that looks most like `given`, or None when none is like it."""
    import difflib  # only when something went wrong: keeps the import light

    found = difflib.get_close_matches(given.lower(), list(known), n=1, cutoff=0.5)
    return found[0] if found else None
