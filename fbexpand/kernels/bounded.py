"""Logarithm, log-gamma and x^nu / (2^nu Gamma(nu + 1)) in double-double, each with a bound of its error.

Nothing here rests on the accuracy of the C library. u = 2^-53, D = 2^-100.

Operations. dd_add, dd_mul, dd_mul_d, dd_add_d have a relative error below 3, 7, 3, 2 u^2 (Joldes, Muller,
Popescu, "Tight and rigorous error bounds for basic building blocks of double-word arithmetic", ACM TOMS 44
(2017) 15, from memory), dd_div (three quotients) below 10 u^2; D = 64 u^2 is taken for every one of them.
Operands stay far from under- and overflow, since powers of two are carried apart.

dd_exp(a), |a| <= 2^40. (1) r = a - k log 2, log 2 in three doubles (off by less than 2^-160): k log2_1 is
split exactly and the two additions are off by less than 3 u^2 each of something below 1, so r is off by less
than 2^-103, and |r| < 0.35. (2) s = exp(r / 512) - 1 by 9 Taylor terms: the rest is below 2^-115 relative;
the last product and sum of Horner's rule count, those before are multiplied by r / 512 < 7e-4: relative error
p_0 < 2.1 D. (3) Nine times s <- 2 s + s^2: p <- p (1 + |s|) / (1 - |s| / 2) + 1.2 D; the product of the
factors is below 1.9 because the |s| add up to less than 0.36, so p_9 < 1.9 (2.1 + 9 * 1.2) D < 25 D. (4) |s|
< 0.42 and exp(r) > 0.7: 1 + s has a relative error below 25 D * 0.42 / 0.7 + D = 16 D. In all below 2^-96 +
2^-103: EXP_ERROR = 2^-95.

dd_log. It starts from the library's logarithm, so its result L is checked: z = a exp(-L) - 1 is computed with
an absolute error below 2^-94, and log(a) - L = log(1 + z). Hence |log(a) - L| <= 1.01 (|z| + 2^-94) wherever
that is below 2^-20.

log-gamma. z = nu + 1 + n >= 40 exactly, P = (nu + 1) ... (nu + n) to n D, log Gamma(z) by Stirling's series
to 14 terms, whose rest is below the next one (z > 0), 6.1e8 / (870 z^29) < 2^-134. Its error is bounded
operation by operation in `log_gamma_bounded`.
"""

from __future__ import annotations

import math

from fbexpand.kernels.dd import dd_add, dd_add_d, dd_div, dd_mul, dd_mul_d, two_sum
from fbexpand.kernels.elementary import (
    HALF_LOG_2PI1,
    HALF_LOG_2PI2,
    LN2_1,
    LN2_2,
    STIRLING,
    dd_exp,
    dd_log,
)
from fbexpand.kernels.jit import callee

OPERATION = 2.0**-100
EXP_ERROR = 2.0**-95
_LOG_FLOOR = 2.0**-94
_LARGEST_EXPONENT = 2.0**40


@callee
def log_bounded(ah: float, al: float) -> tuple[float, float, float]:
    """Return log(a) in two parts and a bound of the error, for a > 0."""
    lh, ll = dd_log(ah, al)
    eh, el, k = dd_exp(-lh, -ll)
    mh, e = math.frexp(ah)
    ml = al * math.ldexp(1.0, -(e // 2)) * math.ldexp(1.0, e // 2 - e)
    zh, zl = dd_mul(mh, ml, eh, el)
    scale = math.ldexp(1.0, max(min(k + e, 100), -100))
    zh, zl = dd_add_d(zh * scale, zl * scale, -1.0)
    error = 1.01 * (abs(zh) + _LOG_FLOOR)
    if not error < 2.0**-20:
        error = math.inf
    return lh, ll, error


@callee
def log_gamma_bounded(nu: float) -> tuple[float, float, float]:
    """Return log Gamma(nu + 1) in two parts and a bound of the error, for -1/2 < nu <= 1e9."""
    n = 1.0
    ph, pl = 1.0, 0.0
    zh, zl = two_sum(nu, n)
    while zh < 40.0:
        ph, pl = dd_mul(ph, pl, zh, zl)
        n += 1.0
        zh, zl = two_sum(nu, n)
    gh, gl, e_log = log_bounded(zh, zl)
    ah, al = dd_add_d(zh, zl, -0.5)
    ah, al = dd_mul(ah, al, gh, gl)
    # A = (z - 1/2) log z: two operations and the logarithm's error
    error = 2.1 * OPERATION * abs(ah) + 1.01 * zh * e_log
    rh, rl = dd_add(ah, al, -zh, -zl)
    rh, rl = dd_add(rh, rl, HALF_LOG_2PI1, HALF_LOG_2PI2)
    ih, il = dd_div(1.0, 0.0, zh, zl)
    yh, yl = dd_mul(ih, il, ih, il)
    sh, sl = STIRLING[13, 0], STIRLING[13, 1]
    for j in range(12, -1, -1):
        sh, sl = dd_mul(sh, sl, yh, yl)
        sh, sl = dd_add(sh, sl, STIRLING[j, 0], STIRLING[j, 1])
    sh, sl = dd_mul(sh, sl, ih, il)
    rh, rl = dd_add(rh, rl, sh, sl)
    # three sums, each below A + z + 1; Stirling's sum below 1/480, off by less than D, as constants and rest
    error += OPERATION * (3.1 * (abs(ah) + zh + 1.0) + 3.0)
    if n > 1.0:
        gh, gl, e_log = log_bounded(ph, pl)
        rh, rl = dd_add(rh, rl, -gh, -gl)
        error += 1.01 * e_log + OPERATION * (1.01 * n + abs(rh) + 1.0)
    return rh, rl, 1.01 * error


@callee
def power_bounded(nu: float, x: float, gh: float, gl: float, g_error: float) -> tuple[float, float, int, float]:
    """Return h, low, e, bound of the relative error: (h + low) 2^e = (x/2)^nu / Gamma(nu + 1), 0 < x < inf.

    g and its error come from `log_gamma_bounded`.
    """
    if nu == 0.0:
        return 1.0, 0.0, 0, 0.0
    lh, ll, e_log = log_bounded(x, 0.0)
    lh, ll = dd_add(lh, ll, -LN2_1, -LN2_2)
    e_log += OPERATION * (abs(lh) + 1.0)
    ah, al = dd_mul_d(lh, ll, nu)
    error = abs(nu) * 1.01 * e_log + g_error + OPERATION * 2.1 * (abs(ah) + abs(gh))
    ah, al = dd_add(ah, al, -gh, -gl)
    if not (error < 2.0**-20 and abs(ah) < _LARGEST_EXPONENT):
        return 0.0, 0.0, 0, math.inf
    h, low, e = dd_exp(ah, al)
    return h, low, e, 1.01 * (error + EXP_ERROR)
