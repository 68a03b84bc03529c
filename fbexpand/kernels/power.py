"""exp(nu log x - c) to a few ulp whatever the size of the exponent: logarithm and exponential in two parts.

Tang's table-driven reductions (ACM TOMS 15 (1989) 144 and 16 (1990) 378, from memory), with the low parts kept.
"""

from __future__ import annotations

import math
from decimal import Context, Decimal

import numpy as np

from fbexpand.kernels.dd import fma, quick_two_sum, two_prod, two_sum
from fbexpand.kernels.jit import callee, inline_kernel
from fbexpand.kernels.memory import from_bits, to_bits

_DIGITS = Context(prec=50)
_LN2 = _DIGITS.ln(Decimal(2))


def _pair(value: Decimal) -> tuple[float, float]:
    high = float(value)
    return high, float(_DIGITS.subtract(value, Decimal(high)))


def _leading(value: Decimal, bits: int) -> tuple[float, float]:
    """Split so that the first part has at most `bits` bits and takes part in exact products."""
    _, e = math.frexp(float(value))
    high = math.ldexp(math.floor(math.ldexp(float(value), bits - e)), e - bits)
    return high, float(_DIGITS.subtract(value, Decimal(high)))


def _log_table() -> list[float]:
    rows: list[float] = []
    for j in range(64):
        reciprocal = round(512.0 / (1.0 + (j + 0.5) / 64.0)) / 512.0
        rows += [reciprocal, *_pair(-_DIGITS.ln(Decimal(reciprocal)))]
    return rows


def _exp_table() -> list[float]:
    rows: list[float] = []
    for j in range(32):
        rows += _pair(_DIGITS.exp(_LN2 * j / 32))
    return rows


LOG_TABLE = np.array(_log_table())
EXP_TABLE = np.array(_exp_table())
LN2_HIGH, LN2_LOW = _leading(_LN2, 30)
LN2_32_HIGH, LN2_32_LOW = _leading(_LN2 / 32, 30)
INV_LN2_32 = float(32 / _LN2)
_MANTISSA = (1 << 52) - 1
_ONE = 1023 << 52


@inline_kernel
def log_two_part(x: float) -> tuple[float, float]:
    """Return log(x), x > 0, in two parts; absolute error about 1e-20 (1 + |log x| / 100)."""
    e = -1023
    if x < 2.3e-308:  # subnormal
        x *= 18014398509481984.0
        e -= 54
    bits = to_bits(x)
    e += bits >> 52
    m = from_bits((bits & _MANTISSA) | _ONE)
    j = int((m - 1.0) * 64.0)
    p, q = two_prod(m, LOG_TABLE[3 * j])
    r = p - 1.0
    rh, rl = two_prod(r, r)
    tail = r * rh * (1 / 3.0 + r * (-0.25 + r * (0.2 + r * (-1 / 6.0 + r * (1 / 7.0 + r * (-0.125 + r * (1 / 9.0)))))))
    s, t1 = two_sum(e * LN2_HIGH, LOG_TABLE[3 * j + 1])
    s, t2 = two_sum(s, r)
    s, t3 = two_sum(s, -0.5 * rh)
    low = t1 + t2 + t3 + (e * LN2_LOW + LOG_TABLE[3 * j + 2] + (q - r * q - 0.5 * rl + tail))
    return quick_two_sum(s, low)


@inline_kernel
def exp_two_part(h: float, l: float) -> float:
    """Return exp(h + l) with gradual underflow, 0 below it and inf above."""
    if h < -760.0:
        return 0.0
    if h > 710.0:
        return math.inf
    k = math.floor(h * INV_LN2_32 + 0.5)
    r = fma(-k, LN2_32_HIGH, h)
    r, s = two_sum(r, l - k * LN2_32_LOW)
    n = int(k)
    j = n & 31
    e = (n - j) >> 5
    p = r * r * (0.5 + r * (1 / 6.0 + r * (1 / 24.0 + r * (1 / 120.0 + r * (1 / 720.0)))))
    p = r + (p + s)
    t = float(EXP_TABLE[2 * j])
    v = t + (EXP_TABLE[2 * j + 1] + t * p)
    half = e >> 1
    return float(v * from_bits((half + 1023) << 52) * from_bits((e - half + 1023) << 52))


@callee
def power_factor(nh: float, nl: float, x: float, relative: float, ch: float, cl: float) -> float:
    """Return x^nu (1 + relative)^nu exp(-c) for x > 0, |relative| of the order of eps."""
    h, l = log_two_part(x)
    p, q = two_prod(h, nh)
    q += l * nh + h * nl + nh * relative
    a, b = two_sum(p, -ch)
    a, b = quick_two_sum(a, b + (q - cl))
    return exp_two_part(a, b)
