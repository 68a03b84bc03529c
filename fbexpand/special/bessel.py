"""J_nu at many points: tables per order, built in double-double on first use and kept."""

from __future__ import annotations

import threading
from collections import OrderedDict
from typing import Any

import numpy as np

from fbexpand import checks
from fbexpand.kernels.bessel_eval import j_pairs, j_values
from fbexpand.kernels.bessel_few import few_pairs
from fbexpand.kernels.bessel_table import PANEL_START, SMOOTH_ORDER, fill_high, fill_low, layout
from fbexpand.types import FloatArray

MAX_ORDER = 1e6
MAX_DERIVATIVE = 4
_KEPT_BYTES = 64 * 2**20

_tables: OrderedDict[tuple[float, float], FloatArray] = OrderedDict()
_asked: OrderedDict[tuple[float, float], int] = OrderedDict()  # points, while there is no table
_lock = threading.Lock()
_FEW = 8
_PAYS = 100
_KEPT_ORDERS = 1024
_NO_LOW = np.zeros(0)


def table_of(order: float, order_low: float = 0.0) -> FloatArray:
    """Return the whole table of order + order_low; the least recently used go once all take over 64 MB."""
    key = (order, order_low)
    with _lock:
        data = _tables.get(key)
        if data is not None:
            _tables.move_to_end(key)
            return data
    made = _blank(order, order_low)
    if order < SMOOTH_ORDER:
        fill_low(made)
    else:
        fill_high(made)
    with _lock:
        data = _tables.setdefault(key, made)
        _asked.pop(key, None)
        total = sum(table.nbytes for table in _tables.values())
        while total > _KEPT_BYTES and len(_tables) > 1:
            total -= _tables.popitem(last=False)[1].nbytes
    return data


def _blank(order: float, order_low: float) -> FloatArray:
    head = np.empty(PANEL_START)
    data = np.zeros(layout(order, order_low, head))
    data[:PANEL_START] = head
    return data


def _too_few(order: float, order_low: float, size: int) -> bool:
    """Say whether so few points of the order have been asked for that a table does not pay."""
    if size > _FEW:
        return False
    key = (order, order_low)
    with _lock:
        if key in _tables:
            return False
        asked = _asked.pop(key, 0) + size
        _asked[key] = asked
        if len(_asked) > _KEPT_ORDERS:
            _asked.popitem(last=False)
    return asked <= _PAYS


def _plain(x: Any) -> FloatArray:
    """Return x as the kernels take it: one-dimensional, contiguous, writable; copied only if it is not."""
    array = np.ascontiguousarray(x, dtype=np.float64)
    return (array if array.flags.writeable and array.flags.aligned else array.copy()).reshape(-1)


def _flat(x: FloatArray, x_low: FloatArray | None) -> tuple[FloatArray, FloatArray]:
    return _plain(x), _NO_LOW if x_low is None else _plain(x_low)


def bessel_pair_at(
    order: float, x: FloatArray, x_low: FloatArray | None = None, *, order_low: float = 0.0
) -> tuple[FloatArray, FloatArray]:
    """Return J and J' of order + order_low at x + x_low, x >= 0; nothing is checked."""
    flat, low = _flat(x, x_low)
    value, slope = np.empty_like(flat), np.empty_like(flat)
    if _too_few(order, order_low, flat.size):
        few_pairs(order, order_low, flat, low, value, slope, True)
    else:
        j_pairs(table_of(order, order_low), flat, low, value, slope)
    shape = np.shape(x)
    return value.reshape(shape), slope.reshape(shape)


def bessel_at(
    order: float,
    x: FloatArray,
    x_low: FloatArray | None = None,
    *,
    order_low: float = 0.0,
    derivative: int = 0,
) -> FloatArray:
    """Return the derivative of J of order + order_low at x + x_low, x >= 0; nothing is checked."""
    if derivative == 1:
        return bessel_pair_at(order, x, x_low, order_low=order_low)[1]
    flat, low = _flat(x, x_low)
    out = np.empty_like(flat)
    if derivative == 0 and _too_few(order, order_low, flat.size):
        few_pairs(order, order_low, flat, low, out, _NO_LOW, False)
    elif derivative == 0:
        j_values(table_of(order, order_low), flat, low, out)
    else:
        from fbexpand.kernels.modes import plain_modes

        if low.size == 0:
            low = np.zeros_like(flat)
        one, zero = np.ones(1), np.zeros(1)
        finite = np.isfinite(flat)
        plain_modes(
            table_of(order, order_low), order, derivative, one, zero, one,
            np.where(finite, flat, 1.0), np.where(finite, low, 0.0), out,
        )  # fmt: skip
        if not finite.all():
            out[~finite] = np.where(np.isnan(flat[~finite]), np.nan, 0.0)
    return out.reshape(np.shape(x))


def bessel_j(order: Any, x: Any, *, derivative: int = 0) -> Any:
    """Compute the Bessel function of the first kind J_order(x), or a derivative of it.

    J_nu(x) = sum_k (-1)^k (x/2)^(2k+nu) / (k! Gamma(k+nu+1)). The error is at most 3 eps times the modulus
    sqrt(J^2 + Y^2) for order < 100, 4 eps below 1000, 6 eps to 10^4, at any x >= order however large (x is taken
    as exact, and reduced with as many digits of pi as it needs); for x < order it is at most 20 eps of |J| down to
    0.9 order and (4 + 2 order) eps below, gradual underflow aside. Measured, it stays below 2 eps in all of these, and
    in samples of orders up to 2e5; from 10^4 to the largest order accepted nothing is promised, and a table is large.
    A few points at an order not seen before cost 4 to 20 microseconds each; more make its table, which is kept.

    Parameters
    ----------
    order
        Real number, or array that broadcasts with `x`, from 0 to 10^6; equal orders share one table.
    x
        Real array of any shape, dimensionless. Negative values need an integer order, J_n(-x) = (-1)^n J_n(x).
        NaN gives NaN, infinity 0.
    derivative
        0 to 4: how often to differentiate.

    Returns
    -------
    Array of the broadcast shape, a NumPy scalar when that is `()`.

    Raises
    ------
    TypeError
        If an argument is of the wrong type.
    ValueError
        If `order` is negative, not finite or too large, `x` is negative at an order that is not an integer, or
        `derivative` is outside 0 to 4.

    References
    ----------
    DLMF 10.2.2 (the series), 10.18.17 (the modulus), 10.13.1 (the equation).

    Examples
    --------
    >>> from fbexpand import bessel_j
    >>> bessel_j(0.0, [0.0, 1.0]).round(4)
    array([1.    , 0.7652])
    """
    plain = type(x) is float and type(order) is float and type(derivative) is int
    if plain and derivative == 0 and 0.0 <= order <= MAX_ORDER and x >= 0.0:
        return _one_point(order + 0.0, x)
    n = checks.integer("derivative", derivative, 0, MAX_DERIVATIVE)
    points = checks.real_array("x", x)
    orders = checks.real_array("order", order)
    good = (orders >= 0.0) & (orders <= MAX_ORDER)
    if not good.all():
        bad = float(orders[~good].flat[0])
        raise checks.value_error("order", f"within [0, {MAX_ORDER:g}]", bad)
    if orders.ndim == 0:
        return _one_order(float(orders) + 0.0, points, n)[()]
    try:
        orders, points = np.broadcast_arrays(orders, points)
    except ValueError:
        shapes = f"{np.shape(order)} and {np.shape(x)}"
        raise checks.value_error("x", f"of a shape that broadcasts with 'order', not {shapes}", x) from None
    distinct, which = np.unique(orders, return_inverse=True)
    which = which.reshape(-1)
    flat = points.reshape(-1)
    out = np.empty(flat.size)
    rank = np.argsort(which, kind="stable")
    ends = np.cumsum(np.bincount(which, minlength=distinct.size)) if flat.size else np.zeros(0, np.int64)
    begin = 0
    for value, end in zip(distinct, ends, strict=True):
        here = rank[begin:end]
        out[here] = _one_order(float(value) + 0.0, flat[here], n)
        begin = int(end)
    return out.reshape(points.shape)[()]


def _one_point(order: float, x: float) -> Any:
    """Evaluate one float without the cost of arrays' checks; the same kernel, the same bits."""
    points, out = np.array((x,)), np.empty(1)
    if _too_few(order, 0.0, 1):
        few_pairs(order, 0.0, points, _NO_LOW, out, _NO_LOW, False)
    else:
        j_values(table_of(order), points, _NO_LOW, out)
    return out[0]


def _one_order(order: float, x: FloatArray, n: int) -> FloatArray:
    negative = x < 0.0
    if not negative.any():
        return bessel_at(order, x, derivative=n)
    if order % 1.0 != 0.0:
        raise checks.value_error("x", "at least 0 where order is not an integer", float(x[negative].flat[0]))
    out = bessel_at(order, np.abs(x), derivative=n)
    if (order % 2.0 + n) % 2.0 != 0.0:
        out = np.where(negative, -out, out)
    return out
