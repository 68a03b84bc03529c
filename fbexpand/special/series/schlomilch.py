"""Schlömilch series: constant + sum a_n J_order(n x)."""

from __future__ import annotations

from typing import Any

import numpy as np

from fbexpand import checks
from fbexpand.kernels.schlomilch_sum import schlomilch_sum
from fbexpand.special.bessel import table_of
from fbexpand.special.series.arguments import checked_coefficients, checked_order, checked_points, rows_of, values_of
from fbexpand.types import FloatArray, Numeric


def schlomilch_series(coefficients: Any, x: Any, *, order: float = 0.0, constant: Any = 0.0) -> Any:
    """Sum a Schlömilch series S(x) = constant + sum_{n>=1} a_n J_order(n x).

    n x is carried in two parts, so that its phase is exact, and additions are compensated. The rounding error is at
    most 4 eps of sum_n |a_n| m(n x), and measured below 2 eps of it, where m = |J_order| below the order and
    sqrt(J^2 + Y^2) above. It does not grow with the number of terms.

    Where it converges: J_nu(n x) behaves as sqrt(2 / (pi n x)) cos(n x - (nu / 2 + 1/4) pi), so that the series
    converges for every x > 0 if sum |a_n| n^(-1/2) does; and if a_n n^(-1/2) falls to 0 monotonically, for every x > 0
    but the multiples of 2 pi. Its sum need not have period 2 pi, and may jump or have kinks there; with alternating
    signs, at odd multiples of pi. At x = 0, where J_0 = 1, sum a_n itself has to converge.

    Parameters
    ----------
    coefficients
        `(*batch, terms)`, real or complex, finite; `coefficients[..., 0]` is a_1.
    x
        Real array of any shape, dimensionless. Negative values need an integer order. NaN gives NaN, infinity
        `constant`.
    order
        Real number from 0 to 10^6.
    constant
        What is added, as in an expansion of order 0 on [0, pi]; real or complex, a number or `(*batch)`.

    Returns
    -------
    Array of shape `(*batch, *x.shape)`, a NumPy scalar when that is `()`.

    Raises
    ------
    TypeError
        If an argument is of the wrong type.
    ValueError
        If `coefficients` are empty or not finite, `x` is negative at an order that is not an integer, `order` is
        negative, not finite or too large, or `constant` is not finite or of another shape.

    References
    ----------
    G. N. Watson, A Treatise on the Theory of Bessel Functions, chapter XIX.

    Examples
    --------
    On [0, pi], x^2 / 8 = pi^2 / 12 + sum_{n>=1} (-1)^n J_0(n x) / n^2:

    >>> import numpy as np
    >>> from fbexpand.special.series.schlomilch import schlomilch_series
    >>> n = np.arange(1, 100_000)
    >>> schlomilch_series((-1.0) ** n / n**2, [1.0, 2.0], constant=np.pi**2 / 12).round(8)
    array([0.125, 0.5  ])
    """
    order = checked_order(order)
    array = checked_coefficients(coefficients)
    points = checked_points("x", x, order)
    added = _checked_constant(constant, array.shape[:-1])
    rows, back = rows_of(array)
    flat = np.abs(points).ravel()
    finite = np.isfinite(flat)
    sums = np.where(np.isnan(flat), np.nan, np.zeros((rows.shape[0], 1)))
    if finite.any():
        sums[:, finite] = _sums(rows, flat[finite], order)
    if order % 2.0 == 1.0:
        sums[:, (points < 0.0).ravel()] *= -1.0
    values = np.asarray(values_of(sums * back[:, None], array, points.shape))
    if added is not None:
        values = values + added.reshape(added.shape + (1,) * points.ndim)
    return values[()]


def _checked_constant(constant: Any, batch: tuple[int, ...]) -> Numeric | None:
    """Return the constant with the batch's axes, None if it is 0."""
    added = checks.all_finite("constant", checks.numeric_array("constant", constant))
    if added.ndim == 0 and added == 0.0:
        return None
    try:
        return np.broadcast_to(added, batch)
    except ValueError:
        raise checks.value_error("constant", f"a number or of shape {batch}", constant) from None


def _sums(rows: FloatArray, x: FloatArray, order: float) -> FloatArray:
    """Return the sums (rows, m) at x >= 0."""
    sums = np.empty((rows.shape[0], x.size))
    with np.errstate(over="ignore"):
        schlomilch_sum(table_of(order), x, np.ascontiguousarray(rows), sums)
    return sums
