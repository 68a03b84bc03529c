"""Sums of a_n J_m(m t), m = nu + n, 0 < t <= 1: the orders from FROM_ORDER on by expansions uniform in the order.

With tau = sqrt(1 - t^2), xi = artanh(tau) - tau = (2/3) zeta^(3/2), all of which depend on t alone:

    m xi >= SWITCH:  exp(-m xi) / sqrt(2 pi m tau) sum_k U_k(1/tau) / m^k                       (DLMF 10.19.3)
    else:            (4 zeta / tau^2)^(1/4) [ m^(-1/3) Ai(m^(2/3) zeta) sum_k A_k(zeta) / m^(2k)
                                              + m^(-5/3) Ai'(m^(2/3) zeta) sum_k B_k(zeta) / m^(2k) ]   (10.20.4)

The exponent and Airy's argument are carried in two parts, so that each J keeps its relative accuracy however small it
is. Where m xi passes 700, J is kept without a factor exp(-700), so that a_n J comes out right wherever it is a double.
"""

from __future__ import annotations

import math

import numpy as np

from fbexpand.kernels.compensated import LANES, compensated_dot
from fbexpand.kernels.dd import dd_div, dd_mul, quick_two_sum, two_prod, two_sum
from fbexpand.kernels.jit import callee, kernel
from fbexpand.kernels.kapteyn_points import FACTOR, TAU, XI, XI_LOW, ZETA, ZETA_LOW
from fbexpand.kernels.power import exp_two_part
from fbexpand.types import FloatArray

SWITCH = 22.0  # from m xi on, Debye's expansion alone is as good
ORDER, ORDER_LOW, TWO_THIRDS, TWO_THIRDS_LOW, THIRD, ROOT = range(6)
ORDER_SIZE = 6
_SCALED = 700.0
_NOTHING = 1450.0
_UNSCALE = math.exp(-_SCALED)


@kernel
def kapteyn_orders(nu: float, first: int, out: FloatArray) -> None:
    """Fill out (count, ORDER_SIZE) with m = nu + n, m^(2/3), m^(-1/3) and sqrt(2 pi m), n = first, first + 1, ..."""
    for i in range(out.shape[0]):
        mh, ml = two_sum(nu, float(first + i))
        z = math.exp(2.0 / 3.0 * math.log(mh))
        z *= 1.0 + ((mh / z) * (mh / z) / z - 1.0) / 3.0
        qh, ql = dd_div(mh, ml, z, 0.0)
        qh, ql = dd_mul(qh, ql, qh, ql)
        qh, ql = dd_div(qh, ql, z, 0.0)
        zh, zl = quick_two_sum(z, z * (((qh - 1.0) + ql) / 3.0))
        out[i, ORDER], out[i, ORDER_LOW] = mh, ml
        out[i, TWO_THIRDS], out[i, TWO_THIRDS_LOW] = zh, zl
        out[i, THIRD] = math.sqrt(1.0 / zh)
        out[i, ROOT] = math.sqrt(2.0 * math.pi * mh)


@callee
def transition_value(
    point: FloatArray, order: FloatArray, first: FloatArray, second: FloatArray, airy: FloatArray
) -> float:
    """Return J_m(m t) by the expansion in Airy functions; `first` and `second` are A_k and B_k at zeta."""
    sh, e = two_prod(order[TWO_THIRDS], point[ZETA])
    sl = e + (order[TWO_THIRDS] * point[ZETA_LOW] + order[TWO_THIRDS_LOW] * point[ZETA])
    panel = int(2.0 * sh)
    x = (sh - (0.5 * panel + 0.25)) + sl
    degree = airy.shape[1] - 1
    value = airy[panel, degree]
    slope = 0.0
    for k in range(degree - 1, -1, -1):
        slope = slope * x + value
        value = value * x + airy[panel, k]
    w = 1.0 / (order[ORDER] * order[ORDER])
    terms = first.shape[0]
    a, b = first[terms - 1], second[terms - 1]
    for k in range(terms - 2, 0, -1):
        a = a * w + first[k]
        b = b * w + second[k]
    b = b * w + second[0]
    # Ai (1 + a w) + Ai' b m^(-4/3): what is added to Ai is small
    scale = order[THIRD] * order[THIRD]
    return float(point[FACTOR] * order[THIRD] * (value + (value * (a * w) + slope * (b * scale * scale))))


@callee
def debye_coefficients(point: FloatArray, table: FloatArray, out: FloatArray) -> None:
    """Fill out with U_k(1/tau) from polynomials in 1/tau^2 - 1."""
    p = 1.0 / point[TAU]
    q = (1.0 - point[TAU]) * (1.0 + point[TAU]) * p * p
    power = 1.0
    for k in range(out.shape[0]):
        s = table[k, k]
        for j in range(k - 1, -1, -1):
            s = s * q + table[k, j]
        out[k] = s * power
        power *= p


@callee
def needed(debye: FloatArray, w: float) -> int:
    """Return the index of the last term that matters; beyond it rounding in U_k would."""
    power = w
    for k in range(1, debye.shape[0] - 1):
        if abs(debye[k]) * power < 1e-18 and abs(debye[k + 1]) * power * w < 1e-18:
            return k
        power *= w
    return int(debye.shape[0] - 1)


@kernel
def kapteyn_sum(
    points: FloatArray,
    orders: FloatArray,
    first: FloatArray,
    second: FloatArray,
    airy: FloatArray,
    polynomials: FloatArray,
    coefficients: FloatArray,
    out: FloatArray,
) -> None:
    """Add sum_n coefficients[b, n] J_m(m t_i) to out[b, i], the orders ascending; |coefficients| <= 2^700.

    `first` and `second`, (points, terms), are read where m xi < SWITCH; `airy` reaches to m^(2/3) zeta there.
    """
    count = orders.shape[0]
    values = np.empty(count)
    debye = np.empty(polynomials.shape[0])
    work = np.zeros((2, LANES))
    for i in range(points.shape[0]):
        xh, xl = points[i, XI], points[i, XI_LOW]
        n = 0
        while n < count and orders[n, ORDER] * xh < SWITCH:
            values[n] = transition_value(points[i], orders[n], first[i], second[i], airy)
            n += 1
        split = count
        if n < count:
            debye_coefficients(points[i], polynomials, debye)
            root = 1.0 / math.sqrt(points[i, TAU])
            last = needed(debye, 1.0 / orders[n, ORDER])
            shift = 0.0
            while n < count:
                mh = orders[n, ORDER]
                eh, el = dd_mul(xh, xl, mh, orders[n, ORDER_LOW])
                if eh > _NOTHING:
                    break
                if shift == 0.0 and eh > _SCALED:
                    shift = _SCALED
                    split = n
                w = 1.0 / mh
                while last > 1 and abs(debye[last]) * w**last < 1e-18:  # fewer as m grows
                    last -= 1
                s = debye[last]
                for k in range(last - 1, 0, -1):
                    s = s * w + debye[k]
                values[n] = exp_two_part(shift - eh, -el) * (1.0 + s * w) * root / orders[n, ROOT]
                n += 1
        split = min(split, n)
        for b in range(coefficients.shape[0]):
            s = compensated_dot(values, coefficients[b], 0, split, work)
            if split < n:
                s += compensated_dot(values, coefficients[b], split, n, work) * _UNSCALE
            out[b, i] += s
