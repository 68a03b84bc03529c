"""Modulus and phase beyond the panels of a table: theta = x - c + delta(y), M = sqrt(2/(pi x)) g(y), y = X/x.

m = g^2 = (pi x/2) M^2 and theta' = 1/m. Below order 14 both are polynomials in y^2. From there on they come in panels
uniform in y, each from the order and its place alone: the constants by Debye's expansions, the rest by the series
m = sum a_k y^2k (DLMF 10.18.17) about the panel's centre and delta' = (X/y^2) (1 - 1/m).
"""

from __future__ import annotations

import math

import numpy as np

from fbexpand.kernels.bessel_direct import phase_constant
from fbexpand.kernels.bessel_station import debye_phase, debye_sums_above, root_of
from fbexpand.kernels.dd import dd_add, dd_add_d, dd_div, dd_mul, two_prod
from fbexpand.kernels.elementary import PI1, PI2
from fbexpand.kernels.jit import callee
from fbexpand.types import FloatArray

MODULUS_TERMS = 128
_REACH = 28  # terms of delta's own series, which serves in the outer half, y < 1/2
_DEGREE = 9  # of a panel, plus one
_SMOOTH_TERMS = 9


@callee
def within_turn(vh: float, vl: float) -> tuple[float, float]:
    """Return v less a multiple of 2 pi, at most pi in size."""
    turns = 2.0 * math.floor(vh / (2.0 * PI1) + 0.5)
    ph, pl = two_prod(PI1, turns)
    vh, vl = dd_add(vh, vl, -ph, -pl)
    ph, pl = two_prod(PI2, turns)
    return dd_add(vh, vl, -ph, -pl)


@callee
def smooth_phase(nh: float, nl: float, a: FloatArray, d: FloatArray, terms: int, out: FloatArray) -> None:
    """Fill -c in two parts, then delta/y and g as polynomials in y^2; terms left out are below 1e-17."""
    ch, cl = phase_constant(nh, nl)
    out[0], out[1] = within_turn(-ch, -cl)
    for k in range(_SMOOTH_TERMS):
        out[2 + k] = d[k + 1, 0] if k + 1 < terms else 0.0
    g = out[2 + _SMOOTH_TERMS : 2 + 2 * _SMOOTH_TERMS]
    g[0] = 1.0
    for k in range(1, _SMOOTH_TERMS):
        s = a[k, 0] if k < terms else 0.0
        for j in range(1, k):
            s -= g[j] * g[k - j]
        g[k] = 0.5 * s


@callee
def plain_series(nu: float, scale: float, series: FloatArray) -> None:
    """Fill rows 0 and 1 of `series` (2, MODULUS_TERMS) with a_k of m, and d_k+1 of delta = y sum d_k+1 y^2k."""
    a, d = series[0], series[1]
    a[:] = 0.0
    a[0] = 1.0
    for k in range(1, MODULUS_TERMS):
        half = k - 0.5
        f = (nu - half) / scale * ((nu + half) / scale) * (half / k)
        if abs(f) >= 1.0 and k > nu + 1.0:
            break  # here the terms begin to grow
        a[k] = a[k - 1] * f
    d[0] = 1.0
    for k in range(1, _REACH):  # the series of 1/m
        s = a[k]
        for j in range(1, k):
            s += a[j] * d[k - j]
        d[k] = -s
    for k in range(1, _REACH):
        d[k - 1] = -scale * d[k] / (2.0 * k - 1.0)
    d[_REACH - 1 :] = 0.0


@callee
def _about(coefficients: FloatArray, y: float, out: FloatArray) -> None:
    """Fill `out` with the Taylor coefficients in t of sum c_k (y + t)^2k."""
    z = y * y
    local = np.zeros(_DEGREE)
    last = coefficients.size - 1
    while last > 1 and abs(coefficients[last]) * z**last < 1e-30:
        last -= 1
    for k in range(last, -1, -1):  # in powers of z - z0
        for j in range(_DEGREE - 1, 0, -1):
            local[j] = local[j] * z + local[j - 1]
        local[0] = local[0] * z + coefficients[k]
    out[:] = 0.0
    for k in range(_DEGREE - 1, -1, -1):  # z - z0 = 2 y t + t^2
        for j in range(_DEGREE - 1, 1, -1):
            out[j] = 2.0 * y * out[j - 1] + out[j - 2]
        out[1] = 2.0 * y * out[0]
        out[0] = local[k]


@callee
def phase_panel(nh: float, nl: float, scale: float, y: float, series: FloatArray, out: FloatArray) -> None:
    """Fill a panel about y: delta - c (2), its linear term (2), delta_2..8 and g_0..8."""
    xh, xl = dd_div(scale, 0.0, y, 0.0)
    wh, wl = root_of(nh, nl, xh, xl)
    ah, al, bh, bl, _, _, _, _ = debye_sums_above(nh, nl, wh, wl)
    # m - 1 = (x - w)/w + (x/w) s, s = A^2 + B^2 - 1
    sh, sl = dd_add_d(ah, al, 2.0)
    sh, sl = dd_mul(sh, sl, ah, al)
    ph, pl = dd_mul(bh, bl, bh, bl)
    sh, sl = dd_add(sh, sl, ph, pl)
    ph, pl = dd_mul(nh, nl, nh, nl)
    qh, ql = dd_add(xh, xl, wh, wl)
    ph, pl = dd_div(ph, pl, qh, ql)
    qh, ql = dd_mul(xh, xl, sh, sl)
    qh, ql = dd_add(qh, ql, ph, pl)
    qh, ql = dd_div(qh, ql, wh, wl)
    mh, ml = dd_add_d(qh, ql, 1.0)
    qh, ql = dd_div(qh, ql, mh, ml)  # 1 - 1/m
    outer = y < 0.5
    # w - x - nu acos(nu/x) - pi/4 - atan(B/A)
    ch, cl = debye_phase(nh, nl, xh, xl, wh, wl)
    ph, pl = dd_add(-ph, -pl, -ch, -cl)
    ah, al = dd_add_d(ah, al, 1.0)
    ah, al = dd_div(bh, bl, ah, al)
    r = ah * ah
    r = ah * r * (1.0 / 3.0 - r * (1.0 / 5.0 - r * (1.0 / 7.0 - r / 9.0)))
    ah, al = dd_add_d(ah, al, -r)
    ph, pl = dd_add(ph, pl, -ah, -al)
    out[0], out[1] = within_turn(ph, pl)
    ph, pl = dd_mul(qh, ql, xh, xl)
    out[2], out[3] = dd_div(ph, pl, y, 0.0)
    # the rest
    m = np.empty(_DEGREE)
    _about(series[0], y, m)
    m[0] = mh
    g = out[11:20]
    g[0] = math.sqrt(mh)
    for j in range(1, _DEGREE):
        s = m[j]
        for i in range(1, j):
            s -= g[i] * g[j - i]
        g[j] = s / (2.0 * g[0])
    if outer:
        d = np.empty(_DEGREE)
        _about(series[1], y, d)
        for j in range(2, _DEGREE):
            out[2 + j] = y * d[j] + d[j - 1]
        return
    e = np.empty(_DEGREE)  # 1 - 1/m
    e[0] = qh
    for j in range(1, _DEGREE):
        s = m[j] * (1.0 - e[0])
        for i in range(1, j):
            s -= m[i] * e[j - i]
        e[j] = s / mh
    for j in range(1, _DEGREE - 1):  # times X/y^2, integrated
        s = 0.0
        power = scale / (y * y)
        for i in range(j + 1):
            s += e[j - i] * power * (i + 1.0)
            power /= -y
        out[3 + j] = s / (j + 1.0)
