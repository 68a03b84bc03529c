"""Checks of the arguments that the methods of a series share."""

from __future__ import annotations

from typing import Any

import numpy as np

from fbexpand import checks
from fbexpand.exceptions import ArgumentValueError
from fbexpand.types import FloatArray, Numeric

EDGE = 1.0 + 4.0 * float(np.finfo(np.float64).eps)  # radii up to this times the radius are inside
NEEDED = ("order", "radius", "growing", "roots", "eigenvalues", "norms", "modes")


def as_basis(basis: Any) -> Any:
    """Return `basis` if it has what a basis needs."""
    if isinstance(basis, type) or not all(hasattr(basis, name) for name in NEEDED):
        raise checks.type_error("basis", "a basis such as FourierBessel() or Dini(robin=1.0)", basis)
    return basis


def as_coefficients(value: Any) -> Numeric:
    """Return a read-only float64 or complex128 copy of `value`, of shape (*batch, terms)."""
    array = checks.numeric_array("coefficients", value)
    if array.ndim == 0:
        raise checks.value_error("coefficients", "an array with a last axis of terms", value)
    if array.size == 0:
        raise checks.value_error("coefficients", "non-empty", array)
    checks.all_finite("coefficients", array)
    return own(array)


def own(array: Numeric) -> Numeric:
    """Return a read-only, C-contiguous copy."""
    copy = np.array(array, order="C")
    copy.setflags(write=False)
    return copy


def as_radii(name: str, r: Any, radius: float) -> FloatArray:
    """Return `r` as float64; ValueError unless every one lies in [0, radius (1 + 4 eps)]."""
    array = checks.real_array(name, r)
    inside = (array >= 0.0) & (array <= radius * EDGE)  # NaN fails
    if not np.all(inside):
        first = float(array[~inside].flat[0])
        raise ArgumentValueError(f"{name!r} must be within [0, {radius!r}] (got {first!r})", name, r)
    return array


def as_terms(terms: Any, high: int) -> int:
    """Return `terms` as an int from 1 to `high`; None means all."""
    return high if terms is None else checks.integer("terms", terms, 1, high)


def same_basis(first: Any, second: Any) -> bool:
    """Whether two bases are the same: one object, or one class with one key."""
    if first is second:
        return True
    key = getattr(first, "key", None)
    return type(first) is type(second) and key is not None and bool(key == getattr(second, "key", None))
