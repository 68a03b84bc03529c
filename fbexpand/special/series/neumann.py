"""Neumann series: sum a_n J_{order+n}(x)."""

from __future__ import annotations

from typing import Any

import numpy as np

from fbexpand import checks
from fbexpand.kernels.neumann_sum import neumann_sum
from fbexpand.kernels.sequence import TINY
from fbexpand.special.bessel import MAX_DERIVATIVE, bessel_at, bessel_pair_at
from fbexpand.special.series.arguments import checked_coefficients, checked_order, checked_points, rows_of, values_of
from fbexpand.types import FloatArray


def neumann_series(coefficients: Any, x: Any, *, order: float = 0.0, derivative: int = 0) -> Any:
    """Sum a series of Bessel functions of ascending orders, S(x) = sum_{n>=0} a_n J_{order+n}(x).

    All orders are made in one sweep, by the three-term recurrence in double-double, upward where order + n <= x and
    downward beyond, anchored on `bessel_j`; order + n is the exact sum, though it need not be a double. The cost is
    O(terms + x) a point at most. The rounding error is at most 4 eps of sum_n |a_n| m_n(x), and measured below 2 eps
    of it, where m_n = |J_{order+n}(x)| for x < order + n and sqrt(J^2 + Y^2) at order + n else. It does not grow with
    the number of terms. A term counts wherever a_n J_{order+n}(x) is a double, even if J itself is too small for one,
    unless J_order(x) is.

    Where it converges: J_{nu+n}(x) behaves as (x/2)^(nu+n) / Gamma(nu+n+1) for large n, so that the series converges
    inside the circle |x| < r where the power series sum a_n (x/2)^n / Gamma(nu+n+1) does, and for every x where a_n
    grows no faster than a power of n.

    Parameters
    ----------
    coefficients
        `(*batch, terms)`, real or complex, finite; `coefficients[..., 0]` is a_0.
    x
        Real array of any shape, dimensionless. Negative values need an integer order. NaN gives NaN, infinity 0.
    order
        Real number from 0 to 10^6.
    derivative
        0 to 4: how often to differentiate with respect to x, by J_m' = (J_{m-1} - J_{m+1}) / 2; the bound then holds
        with the coefficients so made.

    Returns
    -------
    Array of shape `(*batch, *x.shape)`, a NumPy scalar when that is `()`.

    Raises
    ------
    TypeError
        If an argument is of the wrong type.
    ValueError
        If `coefficients` are empty or not finite, `order` is negative, not finite or too large, `x` is negative at an
        order that is not an integer, or `derivative` is outside 0 to 4.

    References
    ----------
    DLMF 10.23.15 (powers of x as such series), 10.12 (Jacobi-Anger), 10.6.1 (the recurrence and the derivative), 3.6
    (its direction). G. N. Watson, A Treatise on the Theory of Bessel Functions, chapter XVI (convergence: 16.2).

    Examples
    --------
    The generating function at t = 1, J_0 + 2 J_2 + 2 J_4 + ... = 1:

    >>> from fbexpand.special.series.neumann import neumann_series
    >>> neumann_series([1.0] + [0.0, 2.0] * 20, [0.5, 1.0, 10.0]).round(14)
    array([1., 1., 1.])
    """
    order = checked_order(order)
    array = checked_coefficients(coefficients)
    points = checked_points("x", x, order)
    derivative = checks.integer("derivative", derivative, 0, MAX_DERIVATIVE)
    rows, back = rows_of(array)
    flat = np.abs(points).ravel()
    sums = _sums(rows, flat, order, derivative) if flat.size else np.empty((rows.shape[0], 0))
    negative = (points < 0.0).ravel()
    if negative.any():
        signs = np.where((order % 2.0 + np.arange(rows.shape[1])) % 2.0 == 0.0, 1.0, -1.0)
        mirrored = _sums(rows * signs, flat[negative], order, derivative)
        sums[:, negative] = -mirrored if derivative % 2 else mirrored
    return values_of(sums * back[:, None], array, points.shape)


def _sums(rows: FloatArray, x: FloatArray, order: float, derivative: int) -> FloatArray:
    """Return the sums (rows, m) at x >= 0."""
    finite = np.isfinite(x)
    if not finite.all():
        out = np.where(np.isnan(x), np.nan, np.zeros((rows.shape[0], 1)))
        if finite.any():
            out[:, finite] = _sums(rows, x[finite], order, derivative)
        return out
    rank = np.argsort(x, kind="stable")
    x = x[rank]
    leading = np.zeros((rows.shape[0], x.size))
    for left in range(derivative, 0, -1):  # a_0 J_order^(left) is kept, the others are written in orders beside theirs
        leading = _plus_leading(leading, rows[:, :1], bessel_at(order, x, derivative=left))
        rows = _differentiated(rows)
    inner = x >= max(order, TINY)
    j, slope = np.empty_like(x), np.zeros_like(x)
    if inner.any():
        j[inner], slope[inner] = bessel_pair_at(order, x[inner])
    if not inner.all():
        j[~inner] = bessel_at(order, x[~inner])
    sums = np.empty((rows.shape[0], x.size))
    with np.errstate(over="ignore", invalid="ignore", divide="ignore"):  # points past their last order
        neumann_sum(order, x, j, slope, np.ascontiguousarray(rows.T), sums)
    if derivative:
        sums = np.where(np.isfinite(leading), leading + sums, leading)
    out = np.empty_like(sums)
    out[:, rank] = sums
    return out


def _differentiated(rows: FloatArray) -> FloatArray:
    """Return b with sum_{n>=1} a_n J_{nu+n}' = sum_n b_n J_{nu+n}."""
    out = np.zeros((rows.shape[0], rows.shape[1] + 1))
    out[:, : rows.shape[1] - 1] = 0.5 * rows[:, 1:]
    out[:, 2:] -= 0.5 * rows[:, 1:]
    return out


def _plus_leading(total: FloatArray, factor: FloatArray, values: FloatArray) -> FloatArray:
    """Add factor * values, from the most singular at x = 0 on: what is infinite already stays so."""
    with np.errstate(invalid="ignore"):
        more = np.where(factor == 0.0, 0.0, factor * values)
        return np.where(np.isfinite(total), total + more, total)
