"""Modulus and phase beyond the panels of a table: theta = x - c + delta(y), M = sqrt(2/(pi x)) g(y), y = X/x.

From the series of `modulus_series`: `a` for (pi x/2) M^2 = g^2, and `d` for delta = sum d_k y^(2k-1).
"""

from __future__ import annotations

import math

import numpy as np

from fbexpand.kernels.bessel_direct import phase_constant
from fbexpand.kernels.dd import dd_add, dd_add_d, dd_mul, dd_mul_d, dd_sqrt, two_prod
from fbexpand.kernels.elementary import PI1, PI2
from fbexpand.kernels.jit import kernel
from fbexpand.types import FloatArray

_PHASE_TERMS = 20  # as in the table's layout
_SMOOTH_TERMS = 9


@kernel
def within_turn(vh: float, vl: float) -> tuple[float, float]:
    """Return v less a multiple of 2 pi, at most pi in size."""
    turns = 2.0 * math.floor(vh / (2.0 * PI1) + 0.5)
    ph, pl = two_prod(PI1, turns)
    vh, vl = dd_add(vh, vl, -ph, -pl)
    ph, pl = two_prod(PI2, turns)
    return dd_add(vh, vl, -ph, -pl)


@kernel
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


@kernel
def phase_panels(nh: float, nl: float, a: FloatArray, d: FloatArray, terms: int, panels: int, out: FloatArray) -> None:
    """Fill the panels of delta = sum d_k y^(2k-1) - c and g = sqrt(sum a_k y^2k)."""
    ch, cl = phase_constant(nh, nl)
    m = np.zeros(9)
    powers = np.zeros(2 * terms + 1)
    for i in range(panels):
        y = (i + 0.5) / panels
        o = i * _PHASE_TERMS
        zh, zl = two_prod(y, y)
        ah, al = d[terms - 1, 0], d[terms - 1, 1]  # sum d_k z^(k-1)
        bh, bl = 0.0, 0.0  # its derivative
        sh, sl = a[terms - 1, 0], a[terms - 1, 1]
        for k in range(terms - 2, 0, -1):
            bh, bl = dd_mul(bh, bl, zh, zl)
            bh, bl = dd_add(bh, bl, ah, al)
            ah, al = dd_mul(ah, al, zh, zl)
            ah, al = dd_add(ah, al, d[k, 0], d[k, 1])
            sh, sl = dd_mul(sh, sl, zh, zl)
            sh, sl = dd_add(sh, sl, a[k, 0], a[k, 1])
        sh, sl = dd_mul(sh, sl, zh, zl)
        sh, sl = dd_add_d(sh, sl, 1.0)
        vh, vl = dd_mul_d(ah, al, y)
        wh, wl = dd_mul(bh, bl, zh, zl)
        wh, wl = dd_add(ah, al, 2.0 * wh, 2.0 * wl)
        vh, vl = dd_add(vh, vl, -ch, -cl)
        vh, vl = within_turn(vh, vl)
        out[o] = vh
        out[o + 1] = vl
        out[o + 2] = wh
        out[o + 3] = wl
        powers[0] = 1.0
        for k in range(1, 2 * terms + 1):
            powers[k] = powers[k - 1] * y
        for j in range(9):
            s = 0.0
            u = 0.0
            for k in range(terms - 1, 0, -1):
                if 2 * k < j:
                    break
                binomial = 1.0
                for q in range(j):
                    binomial *= (2 * k - q) / (q + 1.0)
                u += a[k, 0] * binomial * powers[2 * k - j]
                if 2 * k - 1 >= j:
                    s += d[k, 0] * binomial * (2 * k - j) / (2.0 * k) * powers[2 * k - 1 - j]
            m[j] = u
            if j >= 2:
                out[o + 2 + j] = s
        gh, _ = dd_sqrt(sh, sl)
        out[o + 11] = gh
        for j in range(1, 9):
            s = m[j]
            for q in range(1, j):
                s -= out[o + 11 + q] * out[o + 11 + j - q]
            out[o + 11 + j] = s / (2.0 * gh)
