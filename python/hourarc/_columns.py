"""Turning what a caller hands in into the arrays the engine takes: float64 or int64, contiguous.

All normalising of dtype, unit, shape and contiguity happens here and in `times`, so that the engine
sees one kind of array only, and a scalar takes the same path as an array (and gives the same bits).
"""

from __future__ import annotations

import os
import sys
from typing import Any

import numpy as np
from numpy.typing import DTypeLike, NDArray

from . import _engine
from .errors import InvalidArgument, UnknownName, WrongType

Floats = NDArray[np.float64]


def numbers(value: Any, what: str, unit: str = "") -> Floats:
    """`value` as a float64 array of its own shape; masked entries become NaN.

    A value that carries a unit (an astropy Quantity or Column) is converted to `unit`, which is why
    degrees cannot be mistaken for radians or hours. Text and dates are refused, complex numbers too.
    """
    if "astropy" in sys.modules and getattr(value, "unit", None) is not None:
        from . import interop

        value = interop.quantity_value(value, unit, what)
    mask = np.ma.getmask(value) if isinstance(value, np.ma.MaskedArray) else np.ma.nomask
    try:
        array = np.asarray(value)
    except (TypeError, ValueError) as error:  # ragged nesting, for example
        raise WrongType.of(what, value, "a number or an array of numbers") from error
    if array.dtype == object:  # None becomes NaN, a Decimal a float; text that spells a number does not pass
        try:
            if any(isinstance(each, (str, bytes)) for each in array.reshape(-1)):
                raise TypeError("text")
            array = array.astype(np.float64)
        except (TypeError, ValueError) as error:
            raise WrongType.of(what, value, "a number or an array of numbers") from error
    if array.dtype.kind not in "fiu":
        raise WrongType.of(what, value, "a number or an array of numbers")
    result = np.asarray(array, dtype=np.float64)
    if mask is not np.ma.nomask:
        result = np.where(mask, np.nan, result)
    return result


def column(value: Any, what: str, unit: str = "") -> Floats:
    """`value` as a float64 array of one dimension; a scalar becomes a row."""
    array = numbers(value, what, unit)
    if array.ndim > 1:
        raise InvalidArgument.of(what, f"an array of shape {array.shape}", "a scalar or one dimension")
    return np.ascontiguousarray(np.atleast_1d(array))


def columns_of_one_length(values: dict[str, tuple[Any, str]], where: str) -> dict[str, Floats]:
    """Each value (given with its unit) as a column, scalars spread over the length of the others."""
    made = {name: column(value, f"{where}: {name}", unit) for name, (value, unit) in values.items()}
    lengths = {name: len(array) for name, array in made.items() if len(array) != 1}
    if len(set(lengths.values())) > 1:
        shown = ", ".join(f"{name} {length}" for name, length in lengths.items())
        raise InvalidArgument.of(f"{where}: columns of different lengths", shown, "one length, or scalars")
    length = next(iter(lengths.values()), 1)
    return {name: np.broadcast_to(array, (length,)) for name, array in made.items()}


def scalar(value: Any, what: str, unit: str = "") -> float:
    """`value` as one finite float."""
    array = numbers(value, what, unit)
    if array.size != 1:
        raise InvalidArgument.of(what, f"an array of shape {array.shape}", "one number")
    number = float(array.reshape(())[()])
    if not np.isfinite(number):
        raise InvalidArgument.of(what, number, "a finite number")
    return number


def broadcast_flat(values: dict[str, tuple[Any, str]], where: str) -> tuple[tuple[int, ...], list[Floats]]:
    """The common shape of some values, and each spread over it and flattened to a contiguous row."""
    made = [numbers(value, f"{where}: {name}", unit) for name, (value, unit) in values.items()]
    try:
        shape = np.broadcast_shapes(*(array.shape for array in made))
    except ValueError as error:
        shown = ", ".join(f"{name} {array.shape}" for name, array in zip(values, made, strict=True))
        raise InvalidArgument.of(f"{where}: shapes", shown, "shapes that broadcast together") from error
    return shape, [np.ascontiguousarray(np.broadcast_to(array, shape)).reshape(-1) for array in made]


def writable(array: Any, where: str, shape: tuple[int, ...], kind: DTypeLike) -> NDArray[Any]:
    """`array` if it can be filled in place as a result of that shape and type; a memory map can."""
    allowed = f"a writable C-contiguous {np.dtype(kind)} array of shape {shape}"
    if array is None:
        raise InvalidArgument.of(where, "nothing", allowed)
    if not isinstance(array, np.ndarray):
        raise WrongType.of(where, array, allowed)
    if array.shape != shape or array.dtype != np.dtype(kind):
        raise InvalidArgument.of(where, f"{array.dtype} of shape {array.shape}", allowed)
    wrong = {
        "a read-only array": array.flags.writeable,
        "an array that is not C-contiguous": array.flags.c_contiguous,
        "an array that is not aligned": array.flags.aligned,
    }
    for what, good in wrong.items():
        if not good:
            raise InvalidArgument.of(where, what, allowed)
    return array


def read_only(array: NDArray[Any]) -> NDArray[Any]:
    """A view of `array` that cannot be written through."""
    view = array.view()
    view.flags.writeable = False
    return view


def workers(threads: int | None) -> tuple[int, str]:
    """How the engine is to work: on so many threads (0 for all cores), and with which instruction set."""
    if threads is None:
        return 0, instruction_set()
    if isinstance(threads, bool) or not isinstance(threads, (int, np.integer)):
        raise WrongType.of("threads", threads, "None (all cores) or a whole number from 1")
    if not 1 <= threads <= 4096:
        raise InvalidArgument.of("threads", threads, "None (all cores) or a whole number from 1 to 4096")
    return int(threads), instruction_set()


def instruction_set() -> str:
    """The instruction set that the inner loops are run with.

    The widest of this processor, unless the environment variable ``HOURARC_ISA`` names another: so that
    machines of different kinds give the same bits. It is read at every call.
    """
    available = _engine.instruction_sets()
    word = os.environ.get("HOURARC_ISA", "")
    if not word:
        return available[-1]
    if word not in available:
        raise UnknownName.among("environment variable HOURARC_ISA, on this processor", word, available)
    return word
