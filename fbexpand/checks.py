"""Argument checks: one function per kind of argument, each naming the argument and its value.

A wrong type is a TypeError, a wrong value a ValueError; comparisons are written so that NaN fails.
"""

from __future__ import annotations

import math
import operator
import os
from typing import Any

import numpy as np

from fbexpand.exceptions import ArgumentTypeError, ArgumentValueError
from fbexpand.types import FloatArray, Numeric


def type_error(name: str, what: str, value: Any) -> ArgumentTypeError:
    """Make the TypeError `'name' must be <what> (got <value>)`."""
    return ArgumentTypeError(f"{name!r} must be {what} (got {shown(value)})", name, value)


def value_error(name: str, what: str, value: Any) -> ArgumentValueError:
    """Make the ValueError `'name' must be <what> (got <value>)`."""
    return ArgumentValueError(f"{name!r} must be {what} (got {shown(value)})", name, value)


def shown(value: Any) -> str:
    """Show a value briefly: scalars by repr, arrays by shape and dtype."""
    if isinstance(value, np.ndarray) and value.ndim > 0:
        return f"an array of shape {value.shape} and dtype {value.dtype}"
    if isinstance(value, np.generic):
        value = value.item()
    text = repr(value)
    return text if len(text) <= 80 else f"{text[:77]}..."


def real(name: str, value: Any) -> float:
    """Return `value` as a float; TypeError unless it is a real scalar (bool and str are not)."""
    if isinstance(value, float):
        return float(value)
    if isinstance(value, (bool, np.bool_, str, bytes, complex, np.complexfloating)) or value is None:
        raise type_error(name, "a real number", value)
    if isinstance(value, np.ndarray) and value.ndim > 0:
        raise type_error(name, "a real number", value)
    try:
        return float(value)
    except OverflowError:
        raise value_error(name, "finite", value) from None
    except (TypeError, ValueError):
        raise type_error(name, "a real number", value) from None


def finite(name: str, value: Any) -> float:
    """Return `value` as a finite float."""
    number = real(name, value)
    if not math.isfinite(number):
        raise value_error(name, "finite", value)
    return number


def positive(name: str, value: Any) -> float:
    """Return `value` as a positive, finite float."""
    number = real(name, value)
    if not (number > 0.0 and math.isfinite(number)):
        raise value_error(name, "positive and finite", value)
    return number


def non_negative(name: str, value: Any) -> float:
    """Return `value` as a float that is at least 0 and finite; -0.0 becomes 0.0."""
    number = real(name, value)
    if not (number >= 0.0 and math.isfinite(number)):
        raise value_error(name, "at least 0 and finite", value)
    return number + 0.0


def integer(name: str, value: Any, low: int, high: int | None = None) -> int:
    """Return `value` as an int from `low` to `high`; floats and bools are a TypeError."""
    if isinstance(value, (bool, np.bool_)):
        raise type_error(name, "an integer", value)
    try:
        number = operator.index(value)
    except TypeError:
        raise type_error(name, "an integer", value) from None
    if number < low:
        raise value_error(name, f"at least {low}", value)
    if high is not None and number > high:
        raise value_error(name, f"at most {high}", value)
    return number


def choice(name: str, value: Any, options: tuple[str, ...]) -> str:
    """Return `value` if it is one of `options`."""
    listed = ", ".join(repr(option) for option in options)
    if not isinstance(value, str):
        raise type_error(name, f"one of {listed}", value)
    if value not in options:
        raise value_error(name, f"one of {listed}", value)
    return value


def real_array(name: str, value: Any) -> FloatArray:
    """Return `value` as a float64 array of any shape; TypeError unless it holds real numbers."""
    array = _numbers(name, value)
    if array.dtype.kind == "c":
        raise type_error(name, "real", value)
    return np.asarray(array, dtype=np.float64)


def numeric_array(name: str, value: Any) -> Numeric:
    """Return `value` as a float64 or complex128 array; TypeError unless it holds numbers."""
    array = _numbers(name, value)
    return np.asarray(array, dtype=np.complex128 if array.dtype.kind == "c" else np.float64)


def _numbers(name: str, value: Any) -> Numeric:
    if isinstance(value, np.ma.MaskedArray) and np.ma.is_masked(value):
        raise value_error(name, "free of masked entries", value)
    try:
        array = np.asarray(value)
    except ValueError:
        raise value_error(name, "a regular array of numbers", value) from None
    if array.dtype.kind not in "fiuc":
        raise type_error(name, "numbers", value)
    return array


def all_finite(name: str, array: Numeric) -> Numeric:
    """Return `array` if every entry is finite; the message names the first that is not."""
    good = np.isfinite(array)
    if not good.all():
        where = tuple(int(i) for i in np.argwhere(~good)[0])
        place = f" at index {where[0] if len(where) == 1 else where}" if where else ""
        raise ArgumentValueError(f"{name!r} must be finite (got {array[where]}{place})", name, array)
    return array


def storable(name: str, value: Any, size: int) -> None:
    """Raise the ValueError about argument `name` if it asks for more bytes than the machine's memory."""
    try:
        limit = os.sysconf("SC_PHYS_PAGES") * os.sysconf("SC_PAGE_SIZE")
    except (AttributeError, ValueError, OSError):  # no such question on this platform
        limit = 1 << 40
    if size > limit:
        what = f"small enough for the machine's memory, {min(size, 10**300) / 1e9:.3g} GB would be needed"
        raise value_error(name, what, value)
