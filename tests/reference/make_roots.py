"""Write roots.json: zeros of J_nu and Dini roots by ball arithmetic, nothing of it from the library.

    python tests/reference/make_roots.py

A zero is started from the leading phase sqrt(x^2 - nu^2) - nu arccos(nu/x) - pi/4 = (k - 1/2) pi, which is
off by less than a tenth of pi from the first zero on, so that the index is right; a Dini root is bracketed by
the zeros beside it. Each is refined until the function provably changes sign within 1e-40 of it. Inputs are
doubles, written in hex; a root is written as the nearest double and what is left, each in hex.
"""

from __future__ import annotations

import json
import math
import random
from collections.abc import Callable
from pathlib import Path

import flint
import mpmath
from flint import arb

SEED = 20240611
flint.ctx.prec = 400
mpmath.mp.prec = 200
Function = Callable[[arb], arb]


def sign(value: arb) -> int:
    """Return the proven sign of a ball, 0 if it is not proven."""
    return 1 if value > 0 else -1 if value < 0 else 0


def proven(function: Function, x: arb) -> arb:
    """Return the function at x as an exact number, its sign proven."""
    precision = flint.ctx.prec
    try:
        while flint.ctx.prec < 50_000:
            found = function(x)
            if found.rel_accuracy_bits() > 30:
                return arb(found.mid())
            flint.ctx.prec *= 2
    finally:
        flint.ctx.prec = precision
    raise ArithmeticError("no sign")


def proven_sign(function: Function, x: arb) -> int:
    """Return the sign of the function at x."""
    return sign(proven(function, x))


def mid(x: arb) -> arb:
    """Return the centre of a ball as an exact number."""
    return arb(x.mid())


def bracketed_root(function: Function, low: arb, high: arb) -> arb:
    """Return the root between two points of opposite sign, by the Illinois variant of regula falsi."""
    f_low, f_high = proven(function, low), proven(function, high)
    side = sign(f_low)
    assert side != sign(f_high)
    last = 0
    for turn in range(5000):
        width = high - low
        if width < abs(low) * arb("1e-60"):
            break
        x = mid((low * f_high - high * f_low) / (f_high - f_low))
        if turn % 8 == 7 or not (x > low and x < high):
            x = mid((low + high) / 2)
        f = proven(function, x)
        if sign(f) == side:
            low, f_low = x, f
            if last == 1:
                f_high = f_high / 2
            last = 1
        else:
            high, f_high = x, f
            if last == -1:
                f_low = f_low / 2
            last = -1
    root = mid((low + high) / 2)
    gap = mid(abs(root) * arb("1e-40"))
    assert proven_sign(function, mid(root - gap)) * proven_sign(function, mid(root + gap)) == -1
    return root


def zero(order: float, k: int) -> arb:
    """Return the k-th positive zero of J_order."""
    nu = mpmath.mpf(order)

    def at_phase(quarters: int) -> arb:
        low, high = nu, 2 * nu + quarters * mpmath.pi + 10
        for _ in range(200):
            x = (low + high) / 2
            below = mpmath.sqrt(x * x - nu * nu) - nu * mpmath.acos(nu / x) < quarters * mpmath.pi / 4
            low, high = (x, high) if below else (low, x)
        return mid(arb(mpmath.nstr(low, 60)))

    def function(x: arb) -> arb:
        return x.bessel_j(arb(order))

    return bracketed_root(function, at_phase(4 * k - 2), at_phase(4 * k))


def dini_root(order: float, robin: float, k: int) -> arb:
    """Return the k-th Dini root; mu where robin + order < 0 and k = 1."""
    nu = arb(order)
    s = mid(nu + arb(robin))

    def condition(x: arb) -> arb:
        return s * x.bessel_j(nu) - x * x.bessel_j(nu + 1)

    def growing(x: arb) -> arb:
        return s * x.bessel_i(nu) + x * x.bessel_i(nu + 1)

    if k > 1:
        aside = 1 + arb("1e-39") * (1 if robin > 0.0 else -1)  # a large robin puts it on a zero
        return bracketed_root(condition, mid(zero(order, k - 1) * aside), mid(zero(order, k) * aside))
    square = 2 * (nu + 1) * s  # of the first root as s tends to 0
    if s < 0:
        low = mid((-square).sqrt() * arb("0.5"))
        high = low
        while proven_sign(growing, high) < 0:
            low, high = high, high * 2
        return bracketed_root(growing, low, high)
    high = mid(zero(order, 1) * (1 + arb("1e-39")))
    bound = mid(square.sqrt() * arb("1.0001"))  # the root is below sqrt(2 (nu + 1) s)
    if bound < high:
        high = bound
    low = mid(high / 2)
    while proven_sign(condition, low) < 0:
        high, low = low, mid(low / 2)
    return bracketed_root(condition, low, high)


def parts(x: arb) -> list[str]:
    """Return a number as the nearest double and the double nearest to what is left."""
    high = float(x)
    return [high.hex(), float(x - arb(high)).hex()]


def draw_order(rng: random.Random, top: float) -> float:
    """Return an order: integer, half-integer, uniform or logarithmic."""
    return rng.choice(
        [
            float(rng.randint(0, int(top))),
            rng.randint(0, int(top) - 1) + 0.5,
            rng.uniform(0.0, top),
            10.0 ** rng.uniform(-4.0, math.log10(top)),
        ]
    )


def draw_robin(rng: random.Random, order: float) -> float:
    """Return a Robin coefficient over fifteen decades of either sign, or close to the corner -order."""
    return rng.choice(
        [
            10.0 ** rng.uniform(-7.5, 7.5),
            10.0 ** rng.uniform(-300.0, 300.0),
            -(10.0 ** rng.uniform(-9.0, 6.0)),
            -order + rng.choice([1.0, -1.0]) * 10.0 ** rng.uniform(-16.0, 0.0),
            math.nextafter(-order, rng.choice([-math.inf, math.inf])),
            rng.uniform(-order, order),
            0.0,
        ]
    )


def main() -> None:
    """Write the file beside this script."""
    rng = random.Random(SEED)
    zeros, dini = [], []
    bands = [(5.0, 150), (100.0, 150), (1000.0, 60), (10000.0, 24)]
    for top, samples in bands:
        for _ in range(samples):
            order = draw_order(rng, top)
            far = [int(10.0 ** rng.uniform(0.0, 3.0)), int(10.0 ** rng.uniform(3.0, 9.0))]
            k = rng.choice([1, 2, rng.randint(1, 30), *far])
            zeros.append([order.hex(), k, *parts(zero(order, k))])
            robin = draw_robin(rng, order)
            k = rng.choice([1, 1, 2, rng.randint(1, 30), int(10.0 ** rng.uniform(0.0, 9.0))])
            if robin + order != 0.0 or k > 1:
                dini.append([order.hex(), robin.hex(), k, *parts(dini_root(order, robin, k))])
    data = {"seed": SEED, "zeros": zeros, "dini": dini}
    lines = json.dumps(data).replace("], [", "],\n[").replace('"dini"', '\n"dini"')
    Path(__file__).with_name("roots.json").write_text(lines + "\n")


if __name__ == "__main__":
    main()
