"""Exponential, logarithm, sine, cosine and log-gamma in double-double.

Arguments are reduced with the constants below, then summed as Taylor series (Stirling's for log-gamma, DLMF 5.11.1,
after a shift to z >= 40). Relative errors are about 1e-30, far below what the tables built from them need.
"""

from __future__ import annotations

import math
from fractions import Fraction

import numpy as np

from fbexpand.kernels.dd import dd_add, dd_add_d, dd_div, dd_mul, quick_two_sum, two_prod
from fbexpand.kernels.jit import callee

PI1, PI2, PI3 = 3.141592653589793, 1.2246467991473532e-16, -2.9947698097183397e-33  # pi in three doubles
HALF_PI1, HALF_PI2, HALF_PI3 = PI1 / 2.0, PI2 / 2.0, PI3 / 2.0
LN2_1, LN2_2, LN2_3 = 0.6931471805599453, 2.3190468138462996e-17, 5.7077084384162121e-34
HALF_LOG_2PI1, HALF_LOG_2PI2 = 0.9189385332046728, -3.878294158067242e-17


def split(value: Fraction) -> tuple[float, float]:
    """Return `value` as a double and the double nearest to what is left."""
    high = float(value)
    return high, float(value - Fraction(high))


def _bernoulli(count: int) -> list[Fraction]:
    numbers = []
    row = [Fraction(0)] * count
    for m in range(count):
        row[m] = Fraction(1, m + 1)
        for j in range(m, 0, -1):
            row[j - 1] = j * (row[j - 1] - row[j])
        numbers.append(row[0])
    return numbers


_BERNOULLI = _bernoulli(30)
STIRLING = np.array([split(_BERNOULLI[2 * k] / (2 * k * (2 * k - 1))) for k in range(1, 15)])
INVERSE_FACTORIAL = np.array([split(Fraction(1, math.factorial(k))) for k in range(30)])


@callee
def dd_exp(ah: float, al: float) -> tuple[float, float, int]:
    """Return h, l, e with exp(a) = (h + l) 2^e."""
    k = math.floor(ah / LN2_1 + 0.5)
    ph, pl = two_prod(LN2_1, k)
    rh, rl = dd_add(ah, al, -ph, -pl)
    ph, pl = two_prod(LN2_2, k)
    rh, rl = dd_add(rh, rl, -ph, -pl)
    rh, rl = quick_two_sum(rh, rl - LN2_3 * k)
    rh /= 512.0
    rl /= 512.0
    sh, sl = INVERSE_FACTORIAL[9, 0], INVERSE_FACTORIAL[9, 1]
    for j in range(8, 0, -1):
        sh, sl = dd_mul(sh, sl, rh, rl)
        sh, sl = dd_add(sh, sl, INVERSE_FACTORIAL[j, 0], INVERSE_FACTORIAL[j, 1])
    sh, sl = dd_mul(sh, sl, rh, rl)
    for _ in range(9):  # exp(2 r) - 1 from exp(r) - 1
        th, tl = dd_mul(sh, sl, sh, sl)
        sh, sl = dd_add(2.0 * sh, 2.0 * sl, th, tl)
    sh, sl = dd_add_d(sh, sl, 1.0)
    return sh, sl, int(k)


@callee
def dd_log(ah: float, al: float) -> tuple[float, float]:
    """Return log(a) for a > 0: one Newton step on the double's logarithm."""
    _, e = math.frexp(ah)
    half = -(e // 2)
    ah = ah * math.ldexp(1.0, half) * math.ldexp(1.0, -e - half)
    al = al * math.ldexp(1.0, half) * math.ldexp(1.0, -e - half)
    x = math.log(ah)
    eh, el, k = dd_exp(-x, 0.0)
    scale = math.ldexp(1.0, k)
    ph, pl = dd_mul(ah, al, eh * scale, el * scale)
    ph, pl = dd_add_d(ph, pl, -1.0)
    ph, pl = dd_add_d(ph, pl, -0.5 * ph * ph)
    rh, rl = dd_add_d(ph, pl, x)
    qh, ql = two_prod(LN2_1, float(e))
    qh, ql = quick_two_sum(qh, ql + LN2_2 * e)
    return dd_add(rh, rl, qh, ql)


@callee
def dd_sincos(ah: float, al: float) -> tuple[float, float, float, float]:
    """Return sin(a) and cos(a) for |a| up to about 1e9."""
    k = math.floor(ah / HALF_PI1 + 0.5)
    ph, pl = two_prod(HALF_PI1, k)
    rh, rl = dd_add(ah, al, -ph, -pl)
    ph, pl = two_prod(HALF_PI2, k)
    rh, rl = dd_add(rh, rl, -ph, -pl)
    rh, rl = dd_add_d(rh, rl, -HALF_PI3 * k)
    zh, zl = dd_mul(rh, rl, rh, rl)
    sh, sl = -INVERSE_FACTORIAL[27, 0], -INVERSE_FACTORIAL[27, 1]
    ch, cl = -INVERSE_FACTORIAL[26, 0], -INVERSE_FACTORIAL[26, 1]
    for j in range(12, -1, -1):
        sign = 1.0 if j % 2 == 0 else -1.0
        sh, sl = dd_mul(sh, sl, zh, zl)
        sh, sl = dd_add(sh, sl, sign * INVERSE_FACTORIAL[2 * j + 1, 0], sign * INVERSE_FACTORIAL[2 * j + 1, 1])
        ch, cl = dd_mul(ch, cl, zh, zl)
        ch, cl = dd_add(ch, cl, sign * INVERSE_FACTORIAL[2 * j, 0], sign * INVERSE_FACTORIAL[2 * j, 1])
    sh, sl = dd_mul(sh, sl, rh, rl)
    quadrant = int(k) & 3
    if quadrant == 0:
        return sh, sl, ch, cl
    if quadrant == 1:
        return ch, cl, -sh, -sl
    if quadrant == 2:
        return -sh, -sl, -ch, -cl
    return -ch, -cl, sh, sl


@callee
def dd_log_gamma1(nh: float, nl: float) -> tuple[float, float]:
    """Return log Gamma(nu + 1) for nu >= 0."""
    zh, zl = dd_add_d(nh, nl, 1.0)
    ph, pl = 1.0, 0.0
    while zh < 40.0:
        ph, pl = dd_mul(ph, pl, zh, zl)
        zh, zl = dd_add_d(zh, zl, 1.0)
    gh, gl = dd_log(zh, zl)
    ah, al = dd_add_d(zh, zl, -0.5)
    rh, rl = dd_mul(ah, al, gh, gl)
    rh, rl = dd_add(rh, rl, -zh, -zl)
    rh, rl = dd_add(rh, rl, HALF_LOG_2PI1, HALF_LOG_2PI2)
    ih, il = dd_div(1.0, 0.0, zh, zl)
    yh, yl = dd_mul(ih, il, ih, il)
    sh, sl = STIRLING[13, 0], STIRLING[13, 1]
    for j in range(12, -1, -1):
        sh, sl = dd_mul(sh, sl, yh, yl)
        sh, sl = dd_add(sh, sl, STIRLING[j, 0], STIRLING[j, 1])
    sh, sl = dd_mul(sh, sl, ih, il)
    rh, rl = dd_add(rh, rl, sh, sl)
    if ph != 1.0:
        gh, gl = dd_log(ph, pl)
        rh, rl = dd_add(rh, rl, -gh, -gl)
    return rh, rl
