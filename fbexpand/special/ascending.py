"""The ascending series of J_order with a proven bound."""

from __future__ import annotations

from typing import Any

import numpy as np

from fbexpand import checks
from fbexpand.kernels.ascending import ascending
from fbexpand.records import PartialSum


def ascending_series(order: float, x: Any, terms: int) -> PartialSum:
    """Sum the first terms of the power series of J_order, with a proven bound of the error.

    values = sum_{k=0}^{terms-1} (-1)^k (x/2)^(2k+order) / (k! Gamma(k+order+1)), and |J_order(x) - values| <=
    error at every x, remainder and rounding included.

    The remainder is at most the first term left out, for every x >= 0 and order > -1/2: put Taylor's
    remainder of the cosine into Poisson's integral. Power, gamma function and sum are computed in
    double-double with bounds of their own, so the rounding counted is an eps of the value and about 1e-30 of
    the terms' sum, times how many they are. Where the terms grow first (x > 2 sqrt(order + 1)) their
    cancellation shows in `error`; beyond x of 60 or so nothing useful is left. The error is infinite where a
    term overflows, and beyond order 1e9.

    Parameters
    ----------
    order
        Real number greater than -1/2.
    x
        Real array of any shape, dimensionless. Negative values need an integer order (the sum is even or odd
        in x). NaN gives NaN.
    terms
        How many terms to sum, at least 1. Terms that cannot matter any more are skipped.

    Returns
    -------
    PartialSum
        `values` and `error` of the shape of x; `source` is "bound".

    Raises
    ------
    TypeError
        If an argument is of the wrong type.
    ValueError
        If `order` is at most -1/2 or not finite, `terms` is less than 1, or `x` is negative at an order that
        is not an integer.

    References
    ----------
    DLMF 10.2.2 (the series), 10.9.4 (Poisson's integral).

    Examples
    --------
    >>> from fbexpand.special.ascending import ascending_series
    >>> sums = ascending_series(0.0, [0.5, 1.0], terms=3)
    >>> sums.values
    array([0.93847656, 0.765625  ])
    >>> [f"{e:.2e}" for e in sums.error]
    ['6.78e-06', '4.34e-04']
    """
    order = checks.finite("order", order) + 0.0
    if not order > -0.5:
        raise checks.value_error("order", "greater than -1/2", order)
    terms = checks.integer("terms", terms, 1)
    array = checks.real_array("x", x)
    negative = array < 0.0
    if order % 1.0 != 0.0 and negative.any():
        raise checks.value_error("x", "at least 0 where order is not an integer", float(array[negative][0]))
    flat = np.abs(array).ravel()
    values = np.empty_like(flat)
    errors = np.empty_like(flat)
    with np.errstate(over="ignore"):  # where nothing is compiled NumPy would warn
        ascending(order, flat, min(terms, 1 << 62), values, errors)
    if order % 2.0 == 1.0:
        values[negative.ravel()] *= -1.0
    return PartialSum(values.reshape(array.shape)[()], errors.reshape(array.shape)[()], "bound")
