"""x modulo pi/2 for huge x, after Payne and Hanek (SIGNUM Newsletter 18 (1983) 19): only the bits of 2/pi that matter.

x = m 2^e with an integer m of 53 bits. Of 2/pi, kept as 24-bit digits, those whose product with x is a multiple of 4
are skipped; the next eight give the fraction of a quarter turn to more than 110 bits.
"""

from __future__ import annotations

import math

import numpy as np

from fbexpand.kernels.dd import dd_mul, quick_two_sum, two_sum
from fbexpand.kernels.elementary import HALF_PI1, HALF_PI2
from fbexpand.kernels.jit import callee

_BITS = 24
_COUNT = 60  # 1440 bits: enough for the largest double


def _two_over_pi() -> list[float]:
    """Return the 24-bit digits of 2/pi, pi by Machin's formula in exact integers."""
    shift = _BITS * _COUNT + 80
    one = 1 << shift

    def arctan_inverse(n: int) -> int:
        total, power, k = 0, one // n, 1
        while power:
            total += power // k if k % 4 == 1 else -(power // k)
            power //= n * n
            k += 2
        return total

    pi = 4 * (4 * arctan_inverse(5) - arctan_inverse(239))
    ratio = (2 * one * one) // pi
    return [float((ratio >> (shift - _BITS * (i + 1))) & ((1 << _BITS) - 1)) for i in range(_COUNT)]


TWO_OVER_PI = np.array(_two_over_pi())


@callee
def reduce_large(x: float) -> tuple[int, float, float]:
    """Return k mod 4 and x - k pi/2 in two parts for finite x >= 2^30."""
    m, e = math.frexp(x)
    e -= 53
    m = math.ldexp(m, 53)  # x = m 2^e, m < 2^53
    m2 = math.floor(m / 134217728.0)  # m = m2 2^27 + m1
    m1 = m - m2 * 134217728.0
    # digit i of 2/pi has weight 2^(-24 (i+1)); m 2^e times it is a multiple of 4 while e - 24 (i+1) >= 2
    first = max((e - 2) // _BITS, 0)
    h = 0.0
    l = 0.0
    whole = 0
    for i in range(first, min(first + 8, _COUNT)):
        exponent = e - _BITS * (i + 1)
        for part in range(2):
            term = (m2 if part == 0 else m1) * TWO_OVER_PI[i]  # exact: 27 + 24 bits
            term = math.ldexp(term, exponent + (27 if part == 0 else 0))
            k = np.floor(term)  # math.floor would give an int64: a term may be 2^80
            whole += int(k - 4.0 * np.floor(0.25 * k))
            h, t = two_sum(h, term - k)
            h, l = quick_two_sum(h, l + t)
    k = math.floor(h + 0.5)
    whole += int(k)
    h, l = quick_two_sum(h - k, l)
    h, l = dd_mul(h, l, HALF_PI1, HALF_PI2)
    return whole & 3, h, l
