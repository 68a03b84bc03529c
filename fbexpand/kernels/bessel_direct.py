"""J_nu and J_nu' in double-double by the three expansions the tables are built from.

Ascending series (DLMF 10.2.2), the expansion of the modulus (DLMF 10.18.17) with the phase integrated from it
(DLMF 10.18.8), and Taylor steps of Bessel's equation.
"""

from __future__ import annotations

import math
from fractions import Fraction

import numpy as np

from fbexpand.kernels.dd import dd_add, dd_add_d, dd_div, dd_mul, dd_mul_d, dd_sqrt, two_prod
from fbexpand.kernels.elementary import PI1, PI2, dd_exp, dd_log, dd_sincos, split
from fbexpand.kernels.jit import callee
from fbexpand.types import FloatArray

TAYLOR_TERMS = 26
EXACT_TERMS = 12  # of these the first carry two parts; the rest are below 1e-12 of the sum
_INVERSE_PRODUCT = np.array([split(Fraction(1, (k + 1) * (k + 2))) for k in range(64)])


@callee
def ascending_pair(nh: float, nl: float, x: float, gh: float, gl: float) -> tuple[float, float, float, float, int]:
    """Return J and J' at x as (jh, jl, dh, dl, e), scaled by 2^-e; g = log Gamma(nu + 1)."""
    zh, zl = two_prod(0.5 * x, 0.5 * x)
    th, tl = 1.0, 0.0
    sh, sl = 1.0, 0.0
    uh, ul = 0.0, 0.0
    for k in range(1, 1000):
        dh, dl = dd_add_d(nh, nl, float(k))
        dh, dl = dd_mul_d(dh, dl, float(k))
        qh, ql = dd_div(-zh, -zl, dh, dl)
        th, tl = dd_mul(th, tl, qh, ql)
        sh, sl = dd_add(sh, sl, th, tl)
        ph, pl = dd_mul_d(th, tl, 2.0 * k)
        uh, ul = dd_add(uh, ul, ph, pl)
        if abs(th) * k < 1e-34 * abs(sh) and k * (nh + k) > zh:
            break
    wh, wl = dd_mul(nh, nl, sh, sl)
    wh, wl = dd_add(wh, wl, uh, ul)
    wh, wl = dd_div(wh, wl, x, 0.0)
    lh, ll = dd_log(0.5 * x, 0.0)
    lh, ll = dd_mul(lh, ll, nh, nl)
    lh, ll = dd_add(lh, ll, -gh, -gl)
    eh, el, e = dd_exp(lh, ll)
    jh, jl = dd_mul(sh, sl, eh, el)
    dh, dl = dd_mul(wh, wl, eh, el)
    return jh, jl, dh, dl, e


@callee
def modulus_series(nh: float, nl: float, scale: float, a: FloatArray, b: FloatArray) -> int:
    """Fill (pi x / 2) M^2 = sum a_k (scale/x)^2k and its reciprocal theta' = sum b_k (scale/x)^2k; return the terms.

    a_k = a_{k-1} (2k - 1)/(2k) (mu - (2k - 1)^2)/(4 scale^2), mu = 4 nu^2. Where the terms begin to grow (they do
    from k of about x on) the sums are cut.
    """
    terms = int(a.shape[0])
    mh, ml = dd_mul(nh, nl, nh, nl)
    ih, il = two_prod(scale, scale)
    ih, il = dd_div(1.0, 0.0, ih, il)
    a[0, 0] = 1.0
    a[0, 1] = 0.0
    used = terms
    for k in range(1, terms):
        half = k - 0.5
        fh, fl = dd_add_d(mh, ml, -half * half)
        fh, fl = dd_mul(fh, fl, ih, il)
        fh, fl = dd_mul_d(fh, fl, 2.0 * k - 1.0)
        fh, fl = dd_div(fh, fl, 2.0 * k, 0.0)
        if abs(fh) >= 1.0 and k > nh + 1.0:
            used = k
            break
        a[k, 0], a[k, 1] = dd_mul(a[k - 1, 0], a[k - 1, 1], fh, fl)
    b[0, 0] = 1.0
    b[0, 1] = 0.0
    for k in range(1, used):
        sh, sl = 0.0, 0.0
        for j in range(1, k + 1):
            ph, pl = dd_mul(a[j, 0], a[j, 1], b[k - j, 0], b[k - j, 1])
            sh, sl = dd_add(sh, sl, ph, pl)
        b[k, 0] = -sh
        b[k, 1] = -sl
    return used


@callee
def phase_constant(nh: float, nl: float) -> tuple[float, float]:
    """Return (nu/2 + 1/4) pi less a multiple of 2 pi."""
    qh, ql = dd_add_d(0.5 * nh, 0.5 * nl, 0.25)
    qh, ql = dd_add_d(qh, ql, -2.0 * math.floor(0.5 * qh))
    return dd_mul(qh, ql, PI1, PI2)


@callee
def series_pair(
    nh: float, nl: float, x: float, scale: float, a: FloatArray, b: FloatArray, terms: int
) -> tuple[float, float, float, float]:
    """Return J and J' at x from M cos(theta), the series `a`, `b` of `modulus_series` with that scale."""
    zh, zl = two_prod(scale, scale)
    dh, dl = two_prod(x, x)
    zh, zl = dd_div(zh, zl, dh, dl)
    k = terms - 1
    sh, sl = a[k, 0], a[k, 1]
    th, tl = b[k, 0], b[k, 1]
    gh, gl = dd_mul_d(sh, sl, -2.0 * k)  # x m'(x)
    eh, el = dd_mul_d(th, tl, -x)  # theta - x + c
    eh, el = dd_div(eh, el, 2.0 * k - 1.0, 0.0)
    for i in range(terms - 2, 0, -1):
        sh, sl = dd_mul(sh, sl, zh, zl)
        sh, sl = dd_add(sh, sl, a[i, 0], a[i, 1])
        th, tl = dd_mul(th, tl, zh, zl)
        th, tl = dd_add(th, tl, b[i, 0], b[i, 1])
        gh, gl = dd_mul(gh, gl, zh, zl)
        ph, pl = dd_mul_d(a[i, 0], a[i, 1], -2.0 * i)
        gh, gl = dd_add(gh, gl, ph, pl)
        eh, el = dd_mul(eh, el, zh, zl)
        ph, pl = dd_mul_d(b[i, 0], b[i, 1], -x)
        ph, pl = dd_div(ph, pl, 2.0 * i - 1.0, 0.0)
        eh, el = dd_add(eh, el, ph, pl)
    sh, sl = dd_mul(sh, sl, zh, zl)
    sh, sl = dd_add_d(sh, sl, 1.0)
    th, tl = dd_mul(th, tl, zh, zl)
    th, tl = dd_add_d(th, tl, 1.0)
    gh, gl = dd_mul(gh, gl, zh, zl)
    eh, el = dd_mul(eh, el, zh, zl)
    ch, cl = phase_constant(nh, nl)
    eh, el = dd_add(eh, el, -ch, -cl)
    eh, el = dd_add_d(eh, el, x)
    snh, snl, csh, csl = dd_sincos(eh, el)
    ph, pl = dd_mul_d(PI1, PI2, 0.5 * x)
    ph, pl = dd_div(sh, sl, ph, pl)
    mh, ml = dd_sqrt(ph, pl)
    jh, jl = dd_mul(mh, ml, csh, csl)
    ph, pl = dd_div(gh, gl, sh, sl)
    ph, pl = dd_add_d(ph, pl, -1.0)
    ph, pl = dd_div(0.5 * ph, 0.5 * pl, x, 0.0)  # M'/M
    ph, pl = dd_mul(ph, pl, jh, jl)
    qh, ql = dd_mul(mh, ml, snh, snl)
    qh, ql = dd_mul(qh, ql, th, tl)
    dh, dl = dd_add(ph, pl, -qh, -ql)
    return jh, jl, dh, dl


@callee
def taylor(
    nh: float, nl: float, c: float, jh: float, jl: float, dh: float, dl: float, t: FloatArray, exact: int
) -> None:
    """Fill `t` (terms, 2) with the Taylor coefficients at c of the solution with these values there.

    c^2 (k+2)(k+1) t_{k+2} + c (k+1)(2k+1) t_{k+1} + (k^2 + c^2 - nu^2) t_k + 2 c t_{k-1} + t_{k-2} = 0.
    """
    ih, il = dd_div(1.0, 0.0, c, 0.0)
    sqh, sql = dd_mul(ih, il, ih, il)
    ah, al = dd_add_d(-nh, -nl, c)
    bh, bl = dd_add_d(nh, nl, c)
    qh, ql = dd_mul(ah, al, bh, bl)
    qh, ql = dd_mul(qh, ql, sqh, sql)
    t[0, 0] = jh
    t[0, 1] = jl
    t[1, 0] = dh
    t[1, 1] = dl
    for k in range(exact):
        sh, sl = dd_mul_d(ih, il, (k + 1.0) * (2.0 * k + 1.0))
        sh, sl = dd_mul(sh, sl, t[k + 1, 0], t[k + 1, 1])
        ah, al = dd_mul_d(sqh, sql, float(k * k))
        ah, al = dd_add(ah, al, qh, ql)
        ah, al = dd_mul(ah, al, t[k, 0], t[k, 1])
        sh, sl = dd_add(sh, sl, ah, al)
        if k >= 1:
            ah, al = dd_mul(2.0 * ih, 2.0 * il, t[k - 1, 0], t[k - 1, 1])
            sh, sl = dd_add(sh, sl, ah, al)
        if k >= 2:
            ah, al = dd_mul(sqh, sql, t[k - 2, 0], t[k - 2, 1])
            sh, sl = dd_add(sh, sl, ah, al)
        sh, sl = dd_mul(sh, sl, _INVERSE_PRODUCT[k, 0], _INVERSE_PRODUCT[k, 1])
        t[k + 2, 0] = -sh
        t[k + 2, 1] = -sl
    for k in range(exact, t.shape[0] - 2):
        s = ih * ((k + 1.0) * (2.0 * k + 1.0)) * t[k + 1, 0] + (k * k * sqh + qh) * t[k, 0]
        s += 2.0 * ih * t[k - 1, 0] + sqh * t[k - 2, 0]
        t[k + 2, 0] = -s * _INVERSE_PRODUCT[k, 0]
        t[k + 2, 1] = 0.0


@callee
def taylor_step(t: FloatArray, h: float, exact: int) -> tuple[float, float, float, float]:
    """Return the value and derivative of the Taylor polynomial `t` at distance h."""
    s = 0.0
    u = 0.0
    for k in range(t.shape[0] - 1, exact + 1, -1):
        u = u * h + k * t[k, 0]
        s = s * h + t[k, 0]
    sh, sl = s, 0.0
    uh, ul = u, 0.0
    for k in range(exact + 1, -1, -1):
        if k >= 1:
            uh, ul = dd_mul_d(uh, ul, h)
            ph, pl = dd_mul_d(t[k, 0], t[k, 1], float(k))
            uh, ul = dd_add(uh, ul, ph, pl)
        sh, sl = dd_mul_d(sh, sl, h)
        sh, sl = dd_add(sh, sl, t[k, 0], t[k, 1])
    return sh, sl, uh, ul
