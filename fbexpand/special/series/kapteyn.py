"""Kapteyn series: sum a_n J_{order+n}((order + n) t)."""

from __future__ import annotations

from typing import Any

import numpy as np

from fbexpand import checks
from fbexpand.kernels.kapteyn_points import POINT_SIZE, ZETA, kapteyn_points
from fbexpand.kernels.kapteyn_sum import ORDER_SIZE, kapteyn_orders, kapteyn_sum
from fbexpand.special.bessel import bessel_at
from fbexpand.special.series.arguments import checked_coefficients, checked_order, rows_of, values_of
from fbexpand.special.series.transition import FROM_ORDER, ZETA_MAX, airy_panels, coefficient_tables, debye_table
from fbexpand.types import FloatArray

_CHUNK = 1 << 14  # points whose expansions are held at a time


def kapteyn_series(coefficients: Any, t: Any, *, order: float = 0.0) -> Any:
    """Sum a Kapteyn series S(t) = sum_{n>=1} a_n J_{order+n}((order + n) t), 0 <= t <= 1.

    Orders below 20 are those of `bessel_j`, all others come from expansions uniform in the order, whose
    coefficients are made once for each t: Debye's where J is exponentially small, that in Airy functions through the
    transition at t = 1. (order + n) t and the exponents are carried in two parts. Each J has a relative error of at
    most 4 eps (measured below 2), and additions are compensated: the rounding error is at most 5 eps of sum_n |a_n J|,
    whatever the number of terms. A term counts wherever a_n J is a double, even if J itself is too small for one.

    Where it converges: J_m(m t) behaves as exp(-m xi) / sqrt(2 pi m tau) for large m, tau = sqrt(1 - t^2), xi =
    artanh(tau) - tau. So coefficients that grow or fall as exp(n rho) give convergence where xi > rho, which for
    rho < 0 includes t = 1; coefficients like powers of n for every t < 1. At t = 1 itself J_m(m) falls as 0.447 /
    m^(1/3) only.

    Parameters
    ----------
    coefficients
        `(*batch, terms)`, real or complex, finite; `coefficients[..., 0]` is a_1.
    t
        Real array of any shape, from 0 to 1, dimensionless.
    order
        Real number from 0 to 10^6.

    Returns
    -------
    Array of shape `(*batch, *t.shape)`, a NumPy scalar when that is `()`.

    Raises
    ------
    TypeError
        If an argument is of the wrong type.
    ValueError
        If `coefficients` are empty or not finite, `t` is outside [0, 1] or NaN, or `order` is negative, not finite or
        too large.

    References
    ----------
    DLMF 10.19.3 and 10.20.4 (the expansions). G. N. Watson, A Treatise on the Theory of Bessel Functions, chapter XVII
    (convergence: 17.3).

    Examples
    --------
    Sum of J_n(n t) = t / (2 (1 - t)), and Kepler's equation, E = M + sum_n (2 / n) J_n(n e) sin(n M):

    >>> import numpy as np
    >>> from fbexpand.special.series.kapteyn import kapteyn_series
    >>> kapteyn_series(np.ones(400), [0.0, 0.5, 0.75]).round(14)
    array([0. , 0.5, 1.5])
    >>> n, mean, eccentricity = np.arange(1, 200), 1.0, 0.5
    >>> anomaly = mean + kapteyn_series(2 / n * np.sin(n * mean), eccentricity)
    >>> round(float(anomaly - eccentricity * np.sin(anomaly)), 14)
    1.0
    """
    order = checked_order(order)
    array = checked_coefficients(coefficients)
    points = checks.real_array("t", t)
    good = (points >= 0.0) & (points <= 1.0)
    if not good.all():
        raise checks.value_error("t", "within [0, 1]", float(points[~good].flat[0]))
    rows, back = rows_of(array)
    flat = points.ravel()
    sums = np.zeros((rows.shape[0], flat.size))
    positive = np.flatnonzero(flat)
    for i in range(0, positive.size, _CHUNK):
        here = positive[i : i + _CHUNK]
        sums[:, here] = _sums(rows, flat[here], order)
    return values_of(sums * back[:, None], array, points.shape)


def _sums(rows: FloatArray, t: FloatArray, order: float) -> FloatArray:
    """Return the sums (rows, m) at 0 < t <= 1."""
    count = rows.shape[1]
    few = int(min(count, max(0.0, np.ceil(FROM_ORDER - order) - 1.0)))
    sums = np.zeros((rows.shape[0], t.size))
    if few < count:
        made = np.empty((t.size, POINT_SIZE))
        kapteyn_points(t, made)
        place = np.minimum(made[:, ZETA] / (0.5 * ZETA_MAX) - 1.0, 1.0)
        tables = coefficient_tables()
        first, second = (np.ascontiguousarray(np.polynomial.chebyshev.chebval(place, table).T) for table in tables)
        orders = np.empty((count - few, ORDER_SIZE))
        kapteyn_orders(order, few + 1, orders)
        later = np.ascontiguousarray(rows[:, few:])
        kapteyn_sum(made, orders, first, second, airy_panels(), debye_table(), later, sums)
    for n in range(few, 0, -1):
        high = order + n
        low = (order - (high - n)) + (n - (high - (high - n)))
        x, x_low = _product(high, low, t)
        sums += rows[:, n - 1 : n] * bessel_at(high, x, x_low, order_low=low)
    return sums


def _product(high: float, low: float, t: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Return (high + low) t in two parts, by Dekker's splitting; 0 <= t <= 1, high < 32."""
    x = high * t
    a = 134217729.0 * high
    a1 = a - (a - high)
    a2 = high - a1
    b = 134217729.0 * t
    b1 = b - (b - t)
    b2 = t - b1
    return x, (((a1 * b1 - x) + a1 * b2 + a2 * b1) + a2 * b2) + low * t
