"""What the series of this folder have in common: their arguments, and rows of real coefficients for the kernels."""

from __future__ import annotations

from typing import Any

import numpy as np

from fbexpand import checks
from fbexpand.special.bessel import MAX_ORDER
from fbexpand.types import FloatArray, Numeric

LARGEST = 2.0**700  # what kernels take without danger of overflow; beyond, rows are scaled by a power of two


def checked_order(order: Any) -> float:
    """Return the order, a real number from 0 to MAX_ORDER."""
    number = checks.non_negative("order", order)
    if number > MAX_ORDER:
        raise checks.value_error("order", f"within [0, {MAX_ORDER:g}]", order)
    return number


def checked_coefficients(coefficients: Any) -> Numeric:
    """Return the coefficients (*batch, terms), finite, at least one term."""
    array = checks.numeric_array("coefficients", coefficients)
    if array.ndim == 0 or array.shape[-1] == 0:
        raise checks.value_error("coefficients", "an array of at least one term", coefficients)
    return checks.all_finite("coefficients", array)


def checked_points(name: str, x: Any, order: float) -> FloatArray:
    """Return x; negative points are for integer orders only."""
    array = checks.real_array(name, x)
    negative = array < 0.0
    if order % 1.0 != 0.0 and negative.any():
        raise checks.value_error(name, "at least 0 where order is not an integer", float(array[negative][0]))
    return array


def rows_of(coefficients: Numeric) -> tuple[FloatArray, FloatArray]:
    """Return real rows (rows, terms), each scaled to at most LARGEST, and the factors to undo that.

    Complex batches become twice as many rows, real parts first.
    """
    flat = coefficients.reshape(-1, coefficients.shape[-1])
    rows = np.concatenate([flat.real, flat.imag]) if np.iscomplexobj(flat) else np.array(flat, dtype=np.float64)
    back = np.where(np.abs(rows).max(axis=1) > LARGEST, 2.0**330, 1.0)
    return rows / back[:, None], back


def values_of(sums: FloatArray, coefficients: Numeric, shape: tuple[int, ...]) -> Any:
    """Return sums (rows, m) as an array (*batch, *shape), complex as the coefficients are."""
    if np.iscomplexobj(coefficients):
        half = sums.shape[0] // 2
        values: Numeric = np.empty((half, sums.shape[1]), dtype=np.complex128)
        values.real, values.imag = sums[:half], sums[half:]
    else:
        values = sums
    return values.reshape(coefficients.shape[:-1] + shape)[()]
