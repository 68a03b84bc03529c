"""The first root of x J_nu' + robin J_nu = 0, real or imaginary, without loss as s = robin + nu goes to 0.

With y = x^2 the condition is x J_{nu+1}/J_nu = s, that is D(y) = y/s with the continued fraction (DLMF
10.10.1)

    D(y) = 2 (nu + 1) - y / (2 (nu + 2) - y / (2 (nu + 3) - ...)),

which falls from y = -inf to y = j_{nu,1}^2, where it is 0, while y/s does not fall: one root, of the sign of
s. For s < 0, y = -mu^2 and the fraction is that of mu I_{nu+1}/I_nu (DLMF 10.33.1), all of its terms
positive; where mu is large it is replaced by the expansion of mu I_nu'/I_nu in 1/mu, whose coefficients
follow from Riccati's equation.
"""

from __future__ import annotations

import math

import numpy as np

from fbexpand.kernels.dd import dd_add, dd_add_d, dd_div, dd_mul, dd_sqrt, two_prod, two_sum
from fbexpand.kernels.jit import callee, kernel

TINY = 1e-30  # below this s, y = 2 (nu + 1) s to within 1e-30
ASYMPTOTIC_TERMS = 60


@callee
def fraction_depth(nu: float, y: float) -> int:
    """Return a depth from which the continued fraction has converged to 1e-32."""
    x = math.sqrt(abs(y))
    n = 12
    while n < 1000000:
        ratio = (nu + 0.5 * n) / x if y < 0.0 else (nu + n) / x
        if y < 0.0:
            if 2.0 * n * math.asinh(ratio) > 76.0:
                break
        elif ratio > 1.0 and n * math.acosh(ratio) > 60.0:
            break
        n = n + n // 3
    return n


@callee
def fraction(nu: float, y: float, depth: int) -> tuple[float, float]:
    """Return D(y) and its derivative in doubles."""
    t = 2.0 * (nu + depth)
    for m in range(depth - 1, 1, -1):
        t = 2.0 * (nu + m) - y / t
    d = 2.0 * (nu + 1.0) - y / t
    return d, 0.5 * (d - t) / t


@callee
def fraction_pair(nu: float, yh: float, yl: float, depth: int) -> tuple[float, float]:
    """Return D(y) in two parts."""
    th, tl = two_sum(nu, float(depth))
    th, tl = 2.0 * th, 2.0 * tl
    for m in range(depth - 1, 0, -1):
        qh, ql = dd_div(-yh, -yl, th, tl)
        th, tl = two_sum(nu, float(m))
        th, tl = dd_add(2.0 * th, 2.0 * tl, qh, ql)
    return th, tl


@kernel
def first_root(nu: float, sh: float, sl: float, first_zero: float) -> tuple[float, float]:
    """Return sqrt(|y|) for s = sh + sl != 0; `first_zero` is j_{nu,1}."""
    if abs(sh) < TINY:
        return _tiny(nu, sh, sl)
    if sh < 0.0:
        if nu - sh > 60.0 + 6.0 * nu:
            return _large(nu, sh, sl)
        y = sh * (2.0 * nu + 2.0 - sh)
        low, high = -math.inf, 0.0
    else:
        low, high = 0.0, first_zero * first_zero * (1.0 + 1e-15)
        y = sh * (2.0 * nu + 2.0 - sh) if sh < 0.5 * nu else 2.0 * (nu + 1.0) / (1.0 / sh + 0.5 / (nu + 2.0))
        if not y < high:
            y = 0.999 * high
    weight = 1.0 / max(1.0, abs(sh))  # of s D - y
    depth = fraction_depth(nu, y if sh < 0.0 else high)
    for _ in range(200):
        if sh < 0.0:
            depth = fraction_depth(nu, y)
        d, slope = fraction(nu, y, depth)
        value = weight * (sh * d - y)
        slope = weight * (sh * slope - 1.0)
        new = y - value / slope
        if sh > 0.0:  # bisect where Newton leaves the bracket; for s < 0 it cannot fail, D being concave
            if value > 0.0:
                low = y
            else:
                high = y
            if not low < new < high:
                new = 0.5 * (low + high)
        step = new - y
        y = new
        if abs(step) <= 1e-13 * abs(y):
            break
    yh, yl = y, 0.0
    for _ in range(2):
        dh, dl = fraction_pair(nu, yh, yl, depth)
        _, slope = fraction(nu, yh, depth)
        if abs(sh) > 1.0:
            qh, ql = dd_div(yh, yl, sh, sl)
            dh, dl = dd_add(dh, dl, -qh, -ql)
            slope -= 1.0 / sh
        else:
            dh, dl = dd_mul(dh, dl, sh, sl)
            dh, dl = dd_add(dh, dl, -yh, -yl)
            slope = sh * slope - 1.0
        dh, dl = dd_div(-dh, -dl, slope, 0.0)
        yh, yl = dd_add(yh, yl, dh, dl)
    return dd_sqrt(abs(yh), yl if yh > 0.0 else -yl)


@callee
def _tiny(nu: float, sh: float, sl: float) -> tuple[float, float]:
    up = 2.0**200 if abs(sh) > 1e-100 else 2.0**900
    down = 2.0**-100 if abs(sh) > 1e-100 else 2.0**-450
    yh, yl = two_sum(nu, 1.0)
    yh, yl = dd_mul(2.0 * yh, 2.0 * yl, abs(sh) * up, (sl if sh > 0.0 else -sl) * up)
    xh, xl = dd_sqrt(yh, yl)
    return xh * down, xl * down


@callee
def _large(nu: float, sh: float, sl: float) -> tuple[float, float]:
    """Return mu where mu I_nu'/I_nu = nu - s from the expansion in 1/mu."""
    uh, ul = dd_add_d(-sh, -sl, nu)
    if uh > 1e60:  # the next term is below the second part
        return dd_add_d(uh, ul, 0.5)
    terms = ASYMPTOTIC_TERMS
    e = np.zeros((terms, 2))
    e[0, 0] = 1.0
    e[1, 0] = -0.5
    ph, pl = two_prod(nu, nu)
    ph, pl = dd_add_d(ph, pl, -0.25)
    e[2, 0], e[2, 1] = 0.5 * ph, 0.5 * pl
    x = uh + 0.5
    used = 3
    for m in range(3, terms):
        th, tl = dd_mul(e[m - 1, 0], e[m - 1, 1], m - 2.0, 0.0)
        for j in range(1, m):
            ph, pl = dd_mul(e[j, 0], e[j, 1], e[m - j, 0], e[m - j, 1])
            th, tl = dd_add(th, tl, -ph, -pl)
        e[m, 0], e[m, 1] = 0.5 * th, 0.5 * tl
        used = m
        if abs(e[m, 0]) <= 1e-32 * x**m and abs(e[m - 1, 0]) <= 1e-32 * x ** (m - 1):
            break
    xh, xl = dd_add_d(uh, ul, 0.5)
    for _ in range(60):
        ih, il = dd_div(1.0, 0.0, xh, xl)
        vh, vl = 0.0, 0.0
        for m in range(used, 0, -1):
            vh, vl = dd_add(vh, vl, e[m, 0], e[m, 1])
            if m > 1:
                vh, vl = dd_mul(vh, vl, ih, il)
        rh, rl = dd_add(uh, ul, -vh, -vl)  # mu = u - (v), v = sum_{m >= 1} e_m mu^(1-m)
        rh, rl = dd_add(rh, rl, -xh, -xl)
        slope = (-vh) * ((2.0 * xh + vh) / xh) + (nu / xh) * nu  # of u, from Riccati's equation
        ch, cl = dd_div(rh, rl, slope, 0.0)
        xh, xl = dd_add(xh, xl, ch, cl)
        if abs(ch) <= 1e-20 * xh:
            break
    return xh, xl
