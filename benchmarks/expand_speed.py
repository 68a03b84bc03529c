"""Time `expand` beside quadrature by SciPy in one run, with the errors of each: required and measured.

    python -m benchmarks.expand_speed

One hundred Fourier-Bessel coefficients of f(r) = exp(-4 r^2) (1 + r^2) on [0, 1], at orders 0 and 0.3. The
rivals are given roots and norms for nothing: a loop of scipy.integrate.quad over a scalar profile, quad_vec
over all coefficients at once (both with epsabs = 1e-13, limit = 200), and Gauss-Legendre by hand in NumPy
with SciPy's Bessel functions and its nodes at hand, two to a coefficient. Errors are of the orthonormal
coefficients relative to the largest, against ball arithmetic (needs python-flint).
"""

from __future__ import annotations

import math
from collections.abc import Callable
from itertools import pairwise

import numpy as np
from flint import acb, arb, ctx
from scipy.integrate import quad, quad_vec
from scipy.special import j0, jv

from benchmarks.measure import best, seconds, side_by_side, table, verdict, versions
from fbexpand import FourierBessel, expand

TERMS = 100


def profile(r: np.ndarray) -> np.ndarray:
    square = r * r
    return np.exp(-4.0 * square) * (1.0 + square)


def scalar_profile(r: float) -> float:
    square = r * r
    return math.exp(-4.0 * square) * (1.0 + square)


def exact(order: float, terms: int) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Return zeros, norms and coefficients by ball arithmetic."""
    ctx.prec = 640  # the series of 0F1 cancels by exp(312)
    nu = arb(order)
    roots, norms, coefficients = [], [], []
    near = FourierBessel(order).roots(terms)
    for start in near.tolist():
        x = arb(start)
        for _ in range(3):  # Newton from a double: 3 steps are plenty for 100 bits
            x = (x - x.bessel_j(nu) / (nu / x * x.bessel_j(nu) - x.bessel_j(nu + 1))).mid()
        left, right = x - arb(2) ** -70, x + arb(2) ** -70
        assert (left.bessel_j(nu) < 0) != (right.bessel_j(nu) < 0)
        norm = x.bessel_j(nu + 1) ** 2 / 2

        # r = u^10 and J_nu(x r) = (x r / 2)^nu / Gamma(nu + 1) 0F1: entire in u where 10 nu is a whole number
        power = round(10 * order)
        factor = (x / 2) ** nu / (nu + 1).gamma()

        def integrand(u: acb, analytic: bool, x: arb = x, power: int = power) -> acb:
            r = u**10
            inner = (-((acb(x) * r / 2) ** 2)).hypgeom_0f1(acb(nu + 1))
            return (-4 * r * r).exp() * (1 + r * r) * inner * 10 * u ** (power + 19)

        total = acb(0)
        for low, high in pairwise(((np.arange(33.0) / 32.0) ** 0.1).tolist()):
            total += acb.integral(integrand, acb(low), acb(high), rel_tol=2.0**-75, abs_tol=2.0**-75, eval_limit=10**6)
        total = total * factor
        if not float(total.real.rad()) < 1e-19:
            raise ArithmeticError(f"the integral of coefficient {len(roots) + 1} is not known to 1e-19")
        roots.append(float(x))
        norms.append(float(norm.mid()))
        coefficients.append(float((total.real / norm).mid()))
    ctx.prec = 53
    return np.array(roots), np.array(norms), np.array(coefficients)


def rivals(
    order: float, roots: np.ndarray, norms: np.ndarray, nodes: int
) -> dict[str, Callable[[], np.ndarray]]:
    """Return the three other ways, each a function that returns the coefficients."""
    bessel = j0 if order == 0.0 else (lambda x: jv(order, x))
    options = {"epsabs": 1e-13, "limit": 200}
    listed = roots.tolist()

    def loop() -> np.ndarray:
        return (
            np.array(
                [
                    quad(lambda r, root=root: scalar_profile(r) * bessel(root * r) * r, 0.0, 1.0, **options)[
                        0
                    ]
                    for root in listed
                ]
            )
            / norms
        )

    def vector() -> np.ndarray:
        return quad_vec(lambda r: scalar_profile(r) * bessel(roots * r) * r, 0.0, 1.0, **options)[0] / norms

    t, w = np.polynomial.legendre.leggauss(nodes)
    r, w = 0.5 * (t + 1.0), 0.5 * w

    def gauss() -> np.ndarray:
        return bessel(np.outer(roots, r)) @ (w * profile(r) * r) / norms

    return {"loop of quad": loop, "quad_vec": vector, f"Gauss-Legendre, {nodes} nodes": gauss}


def main() -> None:
    rows = []
    for order, required in ((0.0, (60.0, 20.0, 2.0)), (0.3, (200.0, 100.0, 10.0))):
        roots, norms, true = exact(order, TERMS)
        scale = float(np.max(np.abs(true) * np.sqrt(norms)))

        def error(
            c: np.ndarray, norms: np.ndarray = norms, true: np.ndarray = true, scale: float = scale
        ) -> float:
            return float(np.max(np.abs(c - true) * np.sqrt(norms)) / scale)

        basis = FourierBessel(order)
        expand(profile, basis, terms=TERMS)
        others = rivals(order, roots, norms, 2 * TERMS)
        mine = error(expand(profile, basis, terms=TERMS).coefficients)
        for (name, function), wanted in zip(others.items(), required, strict=True):
            ours, theirs = side_by_side(
                lambda b=basis: expand(profile, b, terms=TERMS), function, 9 if "Gauss" in name else 3
            )
            ours = min(ours, best(lambda b=basis: expand(profile, b, terms=TERMS), 15))
            fresh = min(
                best(lambda o=order, i=i: expand(profile, FourierBessel(o, 1.0 + i / 64.0), terms=TERMS), 1)
                for i in range(1, 8)
            )
            good = theirs / ours >= wanted and mine <= max(error(function()), 1e-14)
            rows.append(
                [
                    f"order {order:g}, against {name}",
                    seconds(ours),
                    seconds(theirs),
                    f"{mine:.1e}",
                    f"{error(function()):.1e}",
                    f">= {wanted:g}x",
                    f"{theirs / ours:.0f}x",
                    f"{theirs / fresh:.0f}x",
                    verdict(good),
                ]
            )
    head = ["what", "ours", "theirs", "our error", "their error", "required", "measured", "new radius", ""]
    print(table(head, rows))
    print("new radius: every call makes a basis of another radius; the order's table stays.")
    print(versions())


if __name__ == "__main__":
    main()
