"""Proof by ball arithmetic that a root lies where it is said to lie, and its index by the leading phase."""

from __future__ import annotations

import math

import flint
from flint import arb


def condition(order, robin):
    """x J' + robin J, or J for robin = None, as a function of a ball."""
    nu = arb(order)
    if robin is None:
        return lambda x: x.bessel_j(nu)
    return lambda x: (nu + arb(robin)) * x.bessel_j(nu) - x * x.bessel_j(nu + 1)


def growing_condition(order, robin):
    """x I' + robin I as a function of a ball."""
    nu = arb(order)
    return lambda x: (nu + arb(robin)) * x.bessel_i(nu) + x * x.bessel_i(nu + 1)


def condition_of(order, robin, k):
    """The function whose root the k-th entry is."""
    growing = robin is not None and k == 1 and robin < -order
    return growing_condition(order, robin) if growing else condition(order, robin)


def _sign(function, x):
    x = arb(x.mid())
    for precision in (200, 800, 3200, 12800, 51200):
        flint.ctx.prec = precision
        value = function(x)
        if value > 0:
            return 1
        if value < 0:
            return -1
    raise ArithmeticError("no sign")


def changes_sign(function, high, low, relative):
    """Whether the function provably changes sign within `relative` of high + low."""
    before = flint.ctx.prec
    try:
        flint.ctx.prec = 200
        x = arb(float(high)) + arb(float(low))
        gap = arb(float(high)) * arb(relative)
        return _sign(function, x - gap) * _sign(function, x + gap) == -1
    finally:
        flint.ctx.prec = before


def nearest_zero_index(order, x):
    """The k whose (k - 1/2) pi is nearest to the leading phase at x, and how far off it is, over pi."""
    phase = math.sqrt((x - order) * (x + order)) - order * math.acos(order / x) - math.pi / 4
    turns = phase / math.pi + 0.5
    return round(turns), abs(turns - round(turns))
