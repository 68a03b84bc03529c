"""The first Dini mode where it is scaled to 1 at the rim, and its derivatives.

phi(x) = C(mu x) / C(mu) with C = J_nu (sigma = -1), r^nu (sigma = 0, mu = 0) or I_nu (sigma = 1), x = r/R.
Numerator and denominator over- and underflow long before the ratio does, so both are written as exp(E) f, and
E(mu x) - E(mu) is taken in two parts: by the power series (DLMF 10.2.2, 10.25.2) below w = sqrt(nu^2 + sigma
mu^2) = 25, by Debye's expansion above. For J this holds well below the turning point, J_nu(mu) < 1e-15 or so;
elsewhere J itself serves.
"""

from __future__ import annotations

import math

import numpy as np

from fbexpand.kernels.dd import (
    dd_add,
    dd_add_d,
    dd_div,
    dd_mul,
    dd_mul_d,
    fma,
    quick_two_sum,
    two_prod,
    two_sum,
)
from fbexpand.kernels.debye import DEBYE_FROM, debye_root, debye_sums
from fbexpand.kernels.elementary import LN2_1, LN2_2, dd_log_gamma1
from fbexpand.kernels.jit import callee, inline_kernel, kernel
from fbexpand.kernels.power import exp_two_part, log_two_part
from fbexpand.types import FloatArray

SERIES_TERMS = 48
_TWO_PI = 6.283185307179586


@callee
def power_series(nu: float, n: int, a: FloatArray) -> int:
    """Fill `a` with the coefficients of a series in y = (z/2)^2; return the index of the first that is not 0.

    z^n (d/dz)^n z^nu sum_m y^m / (m! (nu+1)_m) = z^nu sum_m a_m y^m. Coefficients beyond it are all of one
    sign where nu + 2m >= n.
    """
    ch, cl = 1.0, 0.0
    first = -1
    for m in range(a.size):
        if m > 0:
            dh, dl = two_sum(nu, float(m))
            dh, dl = dd_mul_d(dh, dl, float(m))
            ch, cl = dd_div(ch, cl, dh, dl)
        fh, fl = ch, cl
        for i in range(n):
            bh, bl = two_sum(nu, 2.0 * m - i)
            fh, fl = dd_mul(fh, fl, bh, bl)
        a[m] = fh
        if first < 0 and fh != 0.0:
            first = m
    return first


@inline_kernel
def series_terms(z: float) -> int:
    """Return how many terms of the series at z < 25 are above an eps of the sum."""
    return min(SERIES_TERMS, 12 + int(1.7 * z))


@callee
def compensated_sum(a: FloatArray, first: int, terms: int, yh: float, yl: float) -> float:
    """Return sum_{m >= first} a_m y^(m - first) by Horner's rule with its roundings carried along."""
    s: float = a[terms - 1]
    e = 0.0
    for m in range(terms - 2, first - 1, -1):
        p, q = two_prod(s, yh)
        e = fma(e, yh, fma(s, yl, q))
        s, t = two_sum(p, a[m])
        e += t
    return s + e


@inline_kernel
def quarter_square(zh: float, zl: float, sigma: float) -> tuple[float, float]:
    """Return sigma (z/2)^2 in two parts."""
    yh, yl = two_prod(0.5 * zh, 0.5 * zh)
    return sigma * yh, sigma * (yl + 0.5 * zh * zl)


@inline_kernel
def log_pair(xh: float, xl: float) -> tuple[float, float]:
    """Return log(x) in two parts, absolute error about 1e-20."""
    h, low = log_two_part(xh)
    return quick_two_sum(h, low + xl / xh)


@inline_kernel
def debye_derivative(zh: float, w: float, t: float, sigma: float, n: int) -> float:
    """Return z^n C^(n)(z) / C(z) by Bessel's equation, differentiated; t is T of `debye_sums`."""
    z2 = sigma * zh * zh
    g0 = 1.0
    if n == 0:
        return g0
    g1 = w - (z2 / w) / w * t
    older, old = 0.0, 0.0
    for k in range(n - 1):
        g2 = -(2.0 * k + 1.0) * g1 + (w - k) * (w + k) * g0 + k * z2 * (2.0 * old + (k - 1.0) * older)
        older, old, g0, g1 = old, g0, g1, g2
    return g1


@kernel
def scaled_i(nu: float, x: FloatArray, out: FloatArray) -> None:
    """out[i] = exp(-x[i]) I_nu(x[i]) for x >= 0, inf and NaN included."""
    a = np.zeros(SERIES_TERMS)
    power_series(nu, 0, a)
    gh, gl = dd_mul_d(LN2_1, LN2_2, nu)
    qh, ql = dd_log_gamma1(nu, 0.0)
    gh, gl = dd_add(gh, gl, qh, ql)
    for i in range(x.size):
        z = x[i]
        if not 0.0 < z < math.inf:
            out[i] = math.nan if not z >= 0.0 else (1.0 if z == 0.0 and nu == 0.0 else 0.0)
            continue
        wh, wl = debye_root(nu, z, 0.0, 1.0)
        if wh < DEBYE_FROM:
            yh, yl = quarter_square(z, 0.0, 1.0)
            f = compensated_sum(a, 0, series_terms(z), yh, yl)
            lh, ll = log_pair(z, 0.0)
            eh, el = dd_mul_d(lh, ll, nu)
            eh, el = dd_add(eh, el, -gh, -gl)
            eh, el = dd_add_d(eh, el, -z)
        else:
            f, _ = debye_sums(nu, wh)
            f /= math.sqrt(_TWO_PI * wh)
            eh, el = 0.0, 0.0
            if nu > 0.0:
                qh, ql = dd_add_d(wh, wl, nu)
                qh, ql = dd_div(z, 0.0, qh, ql)
                qh, ql = log_pair(qh, ql)
                eh, el = dd_mul_d(qh, ql, nu)
                qh, ql = dd_add_d(wh, wl, z)  # w - z = nu^2 / (w + z)
                qh, ql = dd_div(nu, 0.0, qh, ql)
                qh, ql = dd_mul_d(qh, ql, nu)
                eh, el = dd_add(eh, el, qh, ql)
        out[i] = f * exp_two_part(eh, el)


@kernel
def first_norm(nu: float, robin: float, mh: float, ml: float, sigma: float, asymptotic: bool) -> float:
    """Return the integral of phi^2 x dx over [0, 1].

    (1 - sigma (robin^2 - nu^2) / mu^2) / 2 cancels, at worst by a factor near max(nu, mu): robin + nu is
    taken exactly and the rest in two parts, which serves while that factor is moderate. Where Debye's
    expansion holds the same is (T / w)(1 - delta / 2w), delta = w - mu C'/C, without cancellation.
    """
    if sigma == 0.0:
        return 0.5 / (nu + 1.0)
    if asymptotic:
        w, _ = debye_root(nu, mh, ml, sigma)
        _, t = debye_sums(nu, w)
        return t / w * (1.0 - 0.5 * sigma * (mh / w) * (mh / w) * t / w)
    ah, al = two_sum(robin, nu)
    bh, bl = two_sum(robin, -nu)
    ah, al = dd_div(ah, al, mh, ml)
    bh, bl = dd_div(bh, bl, mh, ml)
    ah, al = dd_mul(ah, al, bh, bl)
    ah, al = dd_add_d(-sigma * ah, -sigma * al, 1.0)
    return 0.5 * ah


@kernel
def first_mode(
    nu: float,
    mh: float,
    ml: float,
    sigma: float,
    n: int,
    xh: FloatArray,
    xl: FloatArray,
    out: FloatArray,
) -> None:
    """out[i] = (d/dx)^n of phi at xh[i] + xl[i] >= 0; mu = mh + ml. Infinite at 0 where it is."""
    a = np.zeros(SERIES_TERMS)
    first = power_series(nu, n, a)
    ph, pl = two_sum(nu, 2.0 * first - n)
    vh, vl = debye_root(nu, mh, ml, sigma)
    ymh, yml = quarter_square(mh, ml, sigma)
    kh, kl = 0.0, 0.0  # the exponent's part that is the same at all radii
    if vh < DEBYE_FROM:
        b = np.zeros(SERIES_TERMS)
        power_series(nu, 0, b)
        below = compensated_sum(b, 0, series_terms(mh), ymh, yml)
    else:
        below, _ = debye_sums(nu, vh)
        below /= math.sqrt(_TWO_PI * vh)
        kh, kl = -vh, -vl
        if nu > 0.0:
            qh, ql = dd_add_d(vh, vl, nu)
            qh, ql = log_pair(qh, ql)
            qh, ql = dd_add(qh, ql, -LN2_1, -LN2_2)
            qh, ql = dd_mul_d(qh, ql, nu)
            kh, kl = dd_add(kh, kl, qh, ql)
            qh, ql = dd_log_gamma1(nu, 0.0)
            kh, kl = dd_add(kh, kl, -qh, -ql)
    factor = 1.0 / below
    for _ in range(first):
        factor *= ymh
    root = math.sqrt(_TWO_PI * vh)
    for i in range(xh.size):
        x = xh[i]
        if x == 0.0:
            if ph == 0.0:
                out[i] = exp_two_part(kh, kl) * a[first] * factor
            elif ph > 0.0:
                out[i] = 0.0
            else:
                out[i] = math.copysign(math.inf, a[first] * factor)
            continue
        zh, zl = dd_mul(mh, ml, x, xl[i])
        lh, ll = log_pair(x, xl[i])
        wh, wl = debye_root(nu, zh, zl, sigma)
        if wh < DEBYE_FROM:
            yh, yl = quarter_square(zh, zl, sigma)
            f = compensated_sum(a, first, max(series_terms(zh), first + 2), yh, yl) * factor
            eh, el = dd_mul(lh, ll, ph, pl)
            eh, el = dd_add(eh, el, kh, kl)
        else:
            u, t = debye_sums(nu, wh)
            f = debye_derivative(zh, wh, t, sigma, n) * u * (math.sqrt(vh / wh) / (below * root))
            eh, el = dd_add(wh, wl, -vh, -vl)
            if nu > 0.0:
                ah, al = dd_add_d(vh, vl, nu)
                bh, bl = dd_add_d(wh, wl, nu)
                qh, ql = dd_div(ah, al, bh, bl)
                qh, ql = dd_mul(qh, ql, x, xl[i])
                qh, ql = log_pair(qh, ql)
                qh, ql = dd_mul_d(qh, ql, nu)
                eh, el = dd_add(eh, el, qh, ql)
            if n > 0:
                qh, ql = dd_mul_d(lh, ll, -float(n))
                eh, el = dd_add(eh, el, qh, ql)
        out[i] = f * exp_two_part(eh, el)
