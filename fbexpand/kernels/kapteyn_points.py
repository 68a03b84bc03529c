"""What the expansions of J_m(m t) need of t alone, in two parts: tau, xi and zeta (see `kernels/kapteyn_sum.py`)."""

from __future__ import annotations

import math
from fractions import Fraction

import numpy as np

from fbexpand.kernels.dd import dd_add, dd_add_d, dd_div, dd_mul, dd_mul_d, dd_sqrt, two_sum
from fbexpand.kernels.elementary import dd_log, split
from fbexpand.kernels.jit import callee, kernel
from fbexpand.types import FloatArray

TAU, XI, XI_LOW, ZETA, ZETA_LOW, FACTOR = range(6)
POINT_SIZE = 6
_SERIES = 34  # tau^2 <= 1/4
_ODD = np.array([split(Fraction(1, 2 * k + 3)) for k in range(_SERIES)])


@callee
def xi_of(t: float, th: float, tl: float) -> tuple[float, float]:
    """Return artanh(tau) - tau for tau = sqrt(1 - t^2), 0 < t <= 1."""
    if th < 0.5:
        qh, ql = dd_mul(th, tl, th, tl)
        sh, sl = _ODD[_SERIES - 1, 0], _ODD[_SERIES - 1, 1]
        for k in range(_SERIES - 2, -1, -1):
            sh, sl = dd_mul(sh, sl, qh, ql)
            sh, sl = dd_add(sh, sl, _ODD[k, 0], _ODD[k, 1])
        sh, sl = dd_mul(sh, sl, qh, ql)
        return dd_mul(sh, sl, th, tl)
    ah, al = dd_add_d(th, tl, 1.0)
    ah, al = dd_log(ah, al)
    bh, bl = dd_log(t, 0.0)
    ah, al = dd_add(ah, al, -bh, -bl)
    return dd_add(ah, al, -th, -tl)


@callee
def zeta_of(xh: float, xl: float) -> tuple[float, float]:
    """Return (3 xi / 2)^(2/3)."""
    if xh == 0.0:
        return 0.0, 0.0
    xh, xl = dd_mul_d(xh, xl, 1.5)
    z = math.exp(2.0 / 3.0 * math.log(xh))
    z *= 1.0 + ((xh / z) * (xh / z) / z - 1.0) / 3.0
    qh, ql = dd_div(xh, xl, z, 0.0)
    qh, ql = dd_mul(qh, ql, qh, ql)
    qh, ql = dd_div(qh, ql, z, 0.0)
    correction = dd_add_d(qh, ql, -1.0)[0] / 3.0
    return two_sum(z, z * correction)


@kernel
def kapteyn_points(t: FloatArray, out: FloatArray) -> None:
    """Fill out (m, POINT_SIZE) for 0 < t <= 1."""
    for i in range(t.shape[0]):
        ah, al = two_sum(1.0, -t[i])
        bh, bl = two_sum(1.0, t[i])
        ah, al = dd_mul(ah, al, bh, bl)
        th, tl = dd_sqrt(ah, al)
        xh, xl = xi_of(t[i], th, tl)
        zh, zl = zeta_of(xh, xl)
        out[i, TAU] = th
        out[i, XI], out[i, XI_LOW] = xh, xl
        out[i, ZETA], out[i, ZETA_LOW] = zh, zl
        ratio = zh / ah if ah > 0.0 else 2.0 ** (-2.0 / 3.0)
        out[i, FACTOR] = math.sqrt(math.sqrt(4.0 * ratio))
