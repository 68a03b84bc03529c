"""Write bessel_j.csv: J_order(x) and sqrt(J^2 + Y^2) by ball arithmetic, order and x representable exactly.

    python tests/reference/make_bessel.py

needs python-flint. A row holds order and x as hexadecimal floats, J to 30 digits (each proven: the ball is
narrower than that) and the modulus to 10. The functions are used by the tests and benchmarks too, at points
of their own.
"""

from __future__ import annotations

import csv
import math
from pathlib import Path

import numpy as np
from flint import arb, ctx

SEED = 20240611
FILE = Path(__file__).with_name("bessel_j.csv")
EPS = 2.0**-52
BANDS = ((0.0, 5.0), (5.0, 100.0), (100.0, 1000.0), (1000.0, 10000.0))
REGIONS = ("tiny", "below", "near below", "near above", "middle", "far", "huge")


def ball(order: float, x: float, *, shift: int = 0, bits: int = 110, kind: str = "j") -> arb:
    """Return a ball about J (or Y, kind="y") at the exact order + shift, of relative radius below 2^-bits."""
    precision = max(2 * bits, int(0.1 * order))
    try:
        while precision < 400_000:
            ctx.prec = precision
            nu = arb(order) + shift
            value = arb(x).bessel_j(nu) if kind == "j" else arb(x).bessel_y(nu)
            if value.rel_accuracy_bits() >= bits or value.is_exact():
                return value
            precision *= 2
    finally:
        ctx.prec = 53
    raise ArithmeticError(f"no {bits} bits of order {order!r} + {shift} at {x!r}")


def modulus(order: float, x: float, *, shift: int = 0) -> float:
    """Return sqrt(J^2 + Y^2) to about 10 digits; inf where Y overflows or at x = 0."""
    if x == 0.0:
        return math.inf
    y = ball(order, x, shift=shift, bits=40, kind="y")
    j = ball(order, x, shift=shift, bits=40)
    ctx.prec = 80
    value = float((j * j + y * y).sqrt().mid())
    ctx.prec = 53
    return value


def difference(value: float, exact: arb) -> float:
    """Return |value - exact| rounded to a double."""
    if not math.isfinite(value):
        return math.inf
    ctx.prec = 300
    gap = float(abs(arb(value) - exact).mid())
    ctx.prec = 53
    return gap


def orders(rng: np.random.Generator, band: tuple[float, float], count: int) -> np.ndarray:
    """Return orders of a band: half of them real, a quarter integer, a quarter half-integer."""
    low, high = band
    out = rng.uniform(low, high, count)
    out[count // 2 : 3 * count // 4] = np.floor(out[count // 2 : 3 * count // 4])
    out[3 * count // 4 :] = np.floor(out[3 * count // 4 :]) + 0.5
    return out


def arguments(rng: np.random.Generator, region: str, order: np.ndarray) -> np.ndarray:
    """Return one x for each order, in a region of the (order, x) plane.

    By operations that every machine rounds alike, so that the file can be made again anywhere.
    """
    size = order.size
    scale = np.maximum(order, 1.0)
    if region == "tiny":
        return scale * _spread(rng, -40, -7, size)
    if region == "below":
        return scale * rng.uniform(0.01, 0.9, size)
    if region == "near below":
        return scale * rng.uniform(0.9, 1.0, size)
    if region == "near above":
        return scale * rng.uniform(1.0, 1.1, size)
    if region == "middle":
        return scale * rng.uniform(1.1, 10.0, size)
    if region == "far":
        share = rng.uniform(0.0, 1.0, size)
        return 10.0 * scale + (1e6 - 10.0 * scale) * (share * share * share * share)
    if region == "huge":
        return _spread(rng, 20, 50, size)
    raise ValueError(region)


def _spread(rng: np.random.Generator, low: int, high: int, size: int) -> np.ndarray:
    """Return numbers from 2^low to 2^high, about as many in every octave."""
    return np.ldexp(rng.uniform(1.0, 2.0, size), rng.integers(low, high, size))


def corners() -> list[tuple[float, float]]:
    """Return the points a sweep misses."""
    tiny, largest = math.ulp(0.0), 1.7976931348623157e308
    points = [(order, 0.0) for order in (0.0, 0.3, 1.0)]
    points += [(order, largest) for order in (0.0, 0.3, 63.9, 1e4)]
    for order in (0.0, 0.25, 0.5, 1.0, 1.5, 2.0, 7.0, 50.5, 99.99):
        points += [(order, x) for x in (tiny, 2.0**-1030, 2.0**-1022, 1e-300, 1e-150, 1e-20, 2.0**-27, 1e-3)]
    points += [(math.ulp(0.0), 1.0), (1e-300, 1e-300), (2.0**-53, 0.5), (1e-10, 1e-5), (1.0 - EPS / 2, 1.0)]
    for order in (0.0, 0.3, 0.5, 3.0, 50.5, 64.9, 1e3, 1e4):
        points += [(order, x) for x in (1e6, 1e9, 2.0**50, 2.0**53 + 2.0, 1e15, 1e16, 1e22, 1e100, 1e300)]
    for order in (1.0, 2.0, 5.5, 20.0, 63.9, 100.0, 333.3, 1000.0, 5000.5, 1e4):  # about the turning point
        step = order ** (1.0 / 3.0)
        points += [(order, order + k * step) for k in (-3.0, -1.0, 0.0, 1.0, 1.8557571, 3.0)]
    points = [(order, x) for order, x in points if x >= 0.0]
    points += [(float(n), float(n) + 0.5) for n in range(20)]
    points += [(n + 0.5, math.pi * (n + 1.0)) for n in range(20)]
    zeros = (2.404825557695773, 5.520078110286311, 3.8317059702075125, 7.015586669815619, 8.771483815959954)
    points += list(zip((0.0, 0.0, 1.0, 1.0, 5.0), zeros, strict=True))  # next to zeros of J
    return points


def make(per_cell: int = 50, seed: int = SEED) -> list[tuple[float, float]]:
    """Return the points of the file."""
    rng = np.random.default_rng(seed)
    points = corners()
    for band in BANDS:
        for region in REGIONS:
            order = orders(rng, band, per_cell)
            points += list(zip(order.tolist(), arguments(rng, region, order).tolist(), strict=True))
    return points


def main() -> None:
    with FILE.open("w", newline="") as file:
        out = csv.writer(file, lineterminator="\n")
        out.writerow(["order", "x", "j", "modulus"])
        for order, x in make():
            value = ball(order, x)
            ctx.prec = 200
            text = value.str(30, radius=False)
            ctx.prec = 53
            out.writerow([order.hex(), x.hex(), text, f"{modulus(order, x):.10g}"])


if __name__ == "__main__":
    main()
