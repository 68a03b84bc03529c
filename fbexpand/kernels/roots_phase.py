"""The phase theta of J_nu = M cos(theta) in double-double, from far outside inward to below the first zero.

With w = (pi x / 2) M^2 the phase is theta' = 1/w (DLMF 10.18.8), theta = -pi/2 at the axis, so the k-th zero
of J_nu is where theta = (k - 1/2) pi: the phase is the index. w obeys x^3 w''' + 4 (x^3 - kappa x) w' + 4
kappa w = 0, kappa = nu^2 - 1/4; towards smaller x it is a growing or a neutral solution, so Taylor steps
inward are stable.

A panel is a row: its outer end c, its length h, theta(c) in two parts, and the coefficients of (x - c)^n in
theta - theta(c), n = 1 ... TERMS, the first PAIRS of them in two parts.
"""

from __future__ import annotations

import math

import numpy as np

from fbexpand.kernels.bessel_direct import modulus_series
from fbexpand.kernels.dd import dd_add, dd_add_d, dd_div, dd_mul, dd_mul_d, two_prod
from fbexpand.kernels.elementary import PI1, PI2
from fbexpand.kernels.jit import callee, inline_kernel, kernel
from fbexpand.types import FloatArray

TERMS = 36
PAIRS = 12
SINGLES = 4 + 2 * PAIRS - (PAIRS + 1)  # coefficient n > PAIRS stands at SINGLES + n
WIDTH = 4 + 2 * PAIRS + (TERMS - PAIRS)


@callee
def outer_end(nu: float) -> float:
    """Return the x from which the series of the modulus is good to 1e-26."""
    return 1.25 * nu + 30.0


@kernel
def outer_terms(nu: float) -> int:
    """Return how many terms of the modulus series to use there."""
    x = outer_end(nu)
    ratio = max((nu / x) ** 2, 0.25)
    return int(62.0 / -math.log(ratio)) + 6


@kernel
def phase_shift(nu: float) -> tuple[float, float]:
    """Return (nu/2 + 1/4) pi in two parts."""
    qh, ql = dd_add_d(0.5 * nu, 0.0, 0.25)
    return dd_mul(qh, ql, PI1, PI2)


@kernel
def outer_series(nu: float, a: FloatArray, b: FloatArray) -> int:
    """Fill w = sum a_k (X/x)^2k and theta = x - shift - X sum_{k>=1} b_k (X/x)^(2k-1); return the terms."""
    x = outer_end(nu)
    terms = modulus_series(nu, 0.0, x, a, b)
    for k in range(1, terms):
        b[k, 0], b[k, 1] = dd_div(b[k, 0], b[k, 1], 2.0 * k - 1.0, 0.0)
    return terms


@callee
def _expand(nu: float, c: float, w: FloatArray, t: FloatArray, r: FloatArray) -> None:
    """Fill the Taylor coefficients t of w at c from its value and two derivatives, and r of 1/w."""
    kh, kl = two_prod(nu, nu)
    kh, kl = dd_add_d(kh, kl, -0.25)
    ih, il = dd_div(1.0, 0.0, c, 0.0)
    i2h, i2l = dd_mul(ih, il, ih, il)
    i3h, i3l = dd_mul(i2h, i2l, ih, il)
    qh, ql = dd_add_d(-nu, 0.0, c)
    ph, pl = dd_add_d(nu, 0.0, c)
    qh, ql = dd_mul(qh, ql, ph, pl)
    qh, ql = dd_add_d(qh, ql, 0.25)
    qh, ql = dd_mul(qh, ql, i2h, i2l)  # 1 - kappa/c^2
    kh, kl = dd_mul(kh, kl, i2h, i2l)
    t[0, 0], t[0, 1] = w[0, 0], w[0, 1]
    t[1, 0], t[1, 1] = w[1, 0], w[1, 1]
    t[2, 0], t[2, 1] = 0.5 * w[2, 0], 0.5 * w[2, 1]
    for n in range(TERMS - 3):
        if n + 3 <= PAIRS + 1:
            ah, al = dd_mul_d(ih, il, 3.0 * ((n + 2.0) * (n + 1.0) * n))
            sh, sl = dd_mul(ah, al, t[n + 2, 0], t[n + 2, 1])
            ah, al = dd_mul_d(i2h, i2l, 3.0 * ((n + 1.0) * n * (n - 1.0)))
            bh, bl = dd_mul_d(qh, ql, 4.0 * (n + 1.0))
            ah, al = dd_add(ah, al, bh, bl)
            ah, al = dd_mul(ah, al, t[n + 1, 0], t[n + 1, 1])
            sh, sl = dd_add(sh, sl, ah, al)
            ah, al = dd_mul_d(i2h, i2l, n * (n - 1.0) * (n - 2.0))
            bh, bl = dd_mul_d(-kh, -kl, 4.0 * (n - 1.0))
            ah, al = dd_add(ah, al, bh, bl)
            ah, al = dd_add_d(ah, al, 12.0 * n)
            ah, al = dd_mul(ah, al, ih, il)
            ah, al = dd_mul(ah, al, t[n, 0], t[n, 1])
            sh, sl = dd_add(sh, sl, ah, al)
            if n >= 1:
                ah, al = dd_mul_d(i2h, i2l, 12.0 * (n - 1.0))
                ah, al = dd_mul(ah, al, t[n - 1, 0], t[n - 1, 1])
                sh, sl = dd_add(sh, sl, ah, al)
            if n >= 2:
                ah, al = dd_mul_d(i3h, i3l, 4.0 * (n - 2.0))
                ah, al = dd_mul(ah, al, t[n - 2, 0], t[n - 2, 1])
                sh, sl = dd_add(sh, sl, ah, al)
            t[n + 3, 0], t[n + 3, 1] = dd_div(-sh, -sl, (n + 3.0) * (n + 2.0) * (n + 1.0), 0.0)
        else:
            s = 3.0 * (n + 2.0) * (n + 1.0) * n * ih * t[n + 2, 0]
            s += (3.0 * (n + 1.0) * n * (n - 1.0) * i2h + 4.0 * (n + 1.0) * qh) * t[n + 1, 0]
            s += (n * (n - 1.0) * (n - 2.0) * i2h - 4.0 * (n - 1.0) * kh + 12.0 * n) * ih * t[n, 0]
            s += 12.0 * (n - 1.0) * i2h * t[n - 1, 0] + 4.0 * (n - 2.0) * i3h * t[n - 2, 0]
            t[n + 3, 0] = -s / ((n + 3.0) * (n + 2.0) * (n + 1.0))
            t[n + 3, 1] = 0.0
    r[0, 0], r[0, 1] = dd_div(1.0, 0.0, t[0, 0], t[0, 1])
    for n in range(1, TERMS):
        if n <= PAIRS:
            sh, sl = 0.0, 0.0
            for j in range(1, n + 1):
                ah, al = dd_mul(t[j, 0], t[j, 1], r[n - j, 0], r[n - j, 1])
                sh, sl = dd_add(sh, sl, ah, al)
            r[n, 0], r[n, 1] = dd_mul(-sh, -sl, r[0, 0], r[0, 1])
        else:
            s = 0.0
            for j in range(1, n + 1):
                s += t[j, 0] * r[n - j, 0]
            r[n, 0] = -s * r[0, 0]
            r[n, 1] = 0.0


@callee
def _step(t: FloatArray, h: float, w: FloatArray) -> None:
    """Put the value and two derivatives of the Taylor polynomial t at distance h into w."""
    for d in range(3):
        s = 0.0
        for n in range(TERMS - 1, PAIRS, -1):
            factor = 1.0
            for j in range(d):
                factor *= n - j
            s = s * h + factor * t[n, 0]
        sh, sl = s, 0.0
        for n in range(PAIRS, d - 1, -1):
            factor = 1.0
            for j in range(d):
                factor *= n - j
            sh, sl = dd_mul_d(sh, sl, h)
            ah, al = dd_mul_d(t[n, 0], t[n, 1], factor)
            sh, sl = dd_add(sh, sl, ah, al)
        w[d, 0], w[d, 1] = sh, sl


@callee
def _length(t: FloatArray, r: FloatArray) -> float:
    """Return how far inward the expansions at a point are good to 1e-24."""
    h = math.inf
    for n in range(TERMS - 4, TERMS):
        size = abs(t[n, 0] / t[0, 0])
        if size > 0.0:
            h = min(h, (1e-24 / size) ** (1.0 / n))
        size = abs(r[n, 0])
        if size > 0.0:
            h = min(h, (1e-24 / size) ** (1.0 / (n + 1.0)))
    for n in range(PAIRS, PAIRS + 3):  # these are rounded to doubles
        size = abs(t[n, 0] / t[0, 0])
        if size > 0.0:
            h = min(h, (1e-8 / size) ** (1.0 / n))
        size = abs(r[n, 0])
        if size > 0.0:
            h = min(h, (1e-8 / size) ** (1.0 / (n + 1.0)))
    return h


@kernel
def march(nu: float, a: FloatArray, b: FloatArray, terms: int, panels: FloatArray) -> int:
    """Fill `panels` (capacity, WIDTH) inward to theta < pi/2 - 0.1; return their number, 0 if too many."""
    c = outer_end(nu)
    w = np.zeros((3, 2))
    th, tl = 0.0, 0.0
    for k in range(terms - 1, -1, -1):
        w[0, 0], w[0, 1] = dd_add(w[0, 0], w[0, 1], a[k, 0], a[k, 1])
        ah, al = dd_mul_d(a[k, 0], a[k, 1], -2.0 * k)
        w[1, 0], w[1, 1] = dd_add(w[1, 0], w[1, 1], ah, al)
        ah, al = dd_mul_d(a[k, 0], a[k, 1], 2.0 * k * (2.0 * k + 1.0))
        w[2, 0], w[2, 1] = dd_add(w[2, 0], w[2, 1], ah, al)
        if k > 0:
            th, tl = dd_add(th, tl, -b[k, 0], -b[k, 1])
    w[1, 0], w[1, 1] = dd_div(w[1, 0], w[1, 1], c, 0.0)
    w[2, 0], w[2, 1] = dd_div(w[2, 0], w[2, 1], c, 0.0)
    w[2, 0], w[2, 1] = dd_div(w[2, 0], w[2, 1], c, 0.0)
    th, tl = dd_add_d(th, tl, 1.0)
    th, tl = dd_mul_d(th, tl, c)
    ah, al = phase_shift(nu)
    th, tl = dd_add(th, tl, -ah, -al)
    t = np.zeros((TERMS, 2))
    r = np.zeros((TERMS, 2))
    for p in range(panels.shape[0]):
        _expand(nu, c, w, t, r)
        h = min(_length(t, r), 0.25 * c)
        end = c - h
        h = c - end
        panels[p, 0] = c
        panels[p, 1] = h
        panels[p, 2] = th
        panels[p, 3] = tl
        for n in range(1, TERMS + 1):
            if n <= PAIRS:
                panels[p, 2 + 2 * n], panels[p, 3 + 2 * n] = dd_div(r[n - 1, 0], r[n - 1, 1], float(n), 0.0)
            else:
                panels[p, SINGLES + n] = r[n - 1, 0] / n
        ah, al = phase_rise(panels, p, -h)
        th, tl = dd_add(th, tl, ah, al)
        if th < 0.5 * PI1 - 0.1:
            return p + 1
        _step(t, -h, w)
        c = end
    return 0


@inline_kernel
def phase_rise(panels: FloatArray, p: int, s: float) -> tuple[float, float]:
    """Return theta(c + s) - theta(c) of panel p."""
    v = panels[p, SINGLES + TERMS]
    for n in range(TERMS - 1, PAIRS, -1):
        v = v * s + panels[p, SINGLES + n]
    vh, vl = v, 0.0
    for n in range(PAIRS, 0, -1):
        vh, vl = dd_mul_d(vh, vl, s)
        vh, vl = dd_add(vh, vl, panels[p, 2 + 2 * n], panels[p, 3 + 2 * n])
    return dd_mul_d(vh, vl, s)


@inline_kernel
def phase_rise_double(panels: FloatArray, p: int, s: float) -> tuple[float, float, float]:
    """Return theta(c + s) - theta(c) and two derivatives of theta, to double precision."""
    v = panels[p, SINGLES + TERMS]
    d = 0.0
    e = 0.0
    for n in range(TERMS - 1, PAIRS, -1):
        e = e * s + d
        d = d * s + v
        v = v * s + panels[p, SINGLES + n]
    for n in range(PAIRS, 0, -1):
        e = e * s + d
        d = d * s + v
        v = v * s + panels[p, 2 + 2 * n]
    e = e * s + d
    d = d * s + v
    return v * s, d, 2.0 * e


@inline_kernel
def phase_rise_pairs(panels: FloatArray, p: int, s: float) -> tuple[float, float, float, float]:
    """Return theta' and theta'' at c + s, each in two parts."""
    v = panels[p, SINGLES + TERMS]
    d = TERMS * v
    e = (TERMS - 1.0) * d
    for n in range(TERMS - 1, PAIRS, -1):
        v = n * panels[p, SINGLES + n]
        d = d * s + v
        e = e * s + (n - 1.0) * v
    dh, dl = d, 0.0
    eh, el = e, 0.0
    for n in range(PAIRS, 0, -1):
        vh, vl = dd_mul_d(panels[p, 2 + 2 * n], panels[p, 3 + 2 * n], float(n))
        dh, dl = dd_mul_d(dh, dl, s)
        dh, dl = dd_add(dh, dl, vh, vl)
        if n > 1:
            vh, vl = dd_mul_d(vh, vl, n - 1.0)
            eh, el = dd_mul_d(eh, el, s)
            eh, el = dd_add(eh, el, vh, vl)
    return dh, dl, eh, el
