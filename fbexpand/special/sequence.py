"""J_order, J_{order+1}, ... at the same points, by recurrence."""

from __future__ import annotations

from typing import Any

import numpy as np

from fbexpand import checks
from fbexpand.kernels.sequence import TINY, sequence
from fbexpand.special.bessel import MAX_ORDER, bessel_at, bessel_pair_at
from fbexpand.types import FloatArray


def bessel_j_sequence(order: float, count: int, x: Any) -> FloatArray:
    """Compute J_order, J_{order+1}, ..., J_{order+count-1} at once.

    out[..., n] = J_{order+n}(x), where order + n is the exact sum, although it need not be a double. The
    recurrence J_{n+1} = (2 (order + n) / x) J_n - J_{n-1} is run in double-double, upward from the pair J, J'
    at `order` where order + n <= x, downward where order + n > x. The error is a few eps, as that of
    `bessel_j`: relative to sqrt(J^2 + Y^2) for order + n <= x, relative to |J| beyond, gradual underflow
    aside.

    Parameters
    ----------
    order
        Real number from 0 to 10^6, as for `bessel_j`.
    count
        How many orders, at least 1.
    x
        Real array of any shape, dimensionless. Negative values need an integer order, J_n(-x) = (-1)^n
        J_n(x). NaN gives NaN, infinity 0.

    Returns
    -------
    Array of shape `(*x.shape, count)`.

    Raises
    ------
    TypeError
        If an argument is of the wrong type.
    ValueError
        If `order` is negative, not finite or too large, `count` is less than 1 or asks for more memory than
        there is, or `x` is negative at an order that is not an integer.

    References
    ----------
    DLMF 10.6.1 (the recurrence), 3.6 (its direction and Miller's algorithm).

    Examples
    --------
    >>> from fbexpand.special.sequence import bessel_j_sequence
    >>> bessel_j_sequence(0.0, 3, [0.0, 1.0]).round(4)
    array([[1.    , 0.    , 0.    ],
           [0.7652, 0.4401, 0.1149]])
    """
    order = checks.non_negative("order", order)
    if order > MAX_ORDER:
        raise checks.value_error("order", f"within [0, {MAX_ORDER:g}]", order)
    count = checks.integer("count", count, 1)
    array = checks.real_array("x", x)
    checks.storable("count", count, 8 * count * array.size)
    negative = array < 0.0
    if order % 1.0 != 0.0 and negative.any():
        value = float(array[negative][0])
        raise checks.value_error("x", "at least 0 where order is not an integer", value)
    out = np.empty((array.size, count))
    flat = np.abs(array).ravel()
    finite = np.isfinite(flat)
    work = np.where(finite, flat, 1.0)
    inner = work >= max(order, TINY)
    j = np.empty_like(work)
    slope = np.zeros_like(work)
    if inner.any():
        j[inner], slope[inner] = bessel_pair_at(order, work[inner])
    if not inner.all():
        j[~inner] = bessel_at(order, work[~inner])
    with np.errstate(over="ignore", invalid="ignore", divide="ignore"):  # points past their last order
        sequence(order, work, j, slope, out)
    if not finite.all():
        out[~finite] = np.where(np.isnan(flat[~finite]), np.nan, 0.0)[:, None]
    if negative.any():
        odd = (order % 2.0 + np.arange(count)) % 2.0 != 0.0
        out[np.ix_(negative.ravel(), odd)] *= -1.0
    return out.reshape(*array.shape, count)
