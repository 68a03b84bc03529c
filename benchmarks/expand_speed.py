"""Time `expand` beside quadrature by SciPy in one run, with the errors of each: required and measured.

    python -m benchmarks.expand_speed

One hundred Fourier-Bessel coefficients of f(r) = exp(-4 r^2) (1 + r^2) on [0, 1], at orders 0 and 0.3. The rivals:
a loop of scipy.integrate.quad over a scalar profile and quad_vec over all coefficients at once (both with
epsabs = 1e-13, limit = 200), and Gauss quadrature by hand in NumPy with SciPy's Bessel functions, all modes in one
call: with two nodes to a coefficient, with the fewest nodes that are as accurate (which it takes a search to know),
and with the zeros, where SciPy has them, the norms and the rule made within the call. The others are given these for
nothing. At order 0.3 the rule is Gauss-Jacobi for the weight r^1.3; Gauss-Legendre would stay at 1e-9.

`expand` finds out itself how finely to sample. "cold": the order's table is there, the weights of the coefficients
are not; "cached": they are, as for every further profile on any radius. Times are medians of runs taken in turn.
Errors are of the orthonormal coefficients relative to the largest, against ball arithmetic (needs python-flint).
"""

from __future__ import annotations

import math
from collections.abc import Callable
from itertools import pairwise
from typing import NamedTuple

import numpy as np
from flint import acb, arb, ctx
from scipy.integrate import quad, quad_vec
from scipy.special import j0, jn_zeros, jv, roots_jacobi

from benchmarks.measure import once, seconds, table, verdict, versions
from fbexpand import FourierBessel, expand
from fbexpand.analysis import quadrature

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


class Rival(NamedTuple):
    """Another way to the coefficients, what is required against it, and in how many rounds it is timed."""

    name: str
    coefficients: Callable[[], np.ndarray]
    required: float
    rounds: int


def adaptive(order: float, roots: np.ndarray, norms: np.ndarray) -> list[Rival]:
    """Return quad in a loop and quad_vec."""
    bessel = j0 if order == 0.0 else (lambda x: jv(order, x))
    options = {"epsabs": 1e-13, "limit": 200}
    listed = roots.tolist()

    def loop() -> np.ndarray:
        integrals = [
            quad(lambda r, root=root: scalar_profile(r) * bessel(root * r) * r, 0.0, 1.0, **options)[0]
            for root in listed
        ]
        return np.array(integrals) / norms

    def vector() -> np.ndarray:
        return quad_vec(lambda r: scalar_profile(r) * bessel(roots * r) * r, 0.0, 1.0, **options)[0] / norms

    required = (60.0, 20.0) if order == 0.0 else (200.0, 100.0)
    return [Rival("loop of quad", loop, required[0], 3), Rival("quad_vec", vector, required[1], 3)]


def by_hand(
    order: float, roots: np.ndarray, norms: np.ndarray, error: Callable[[np.ndarray], float], wanted: float
) -> list[Rival]:
    """Return Gauss quadrature of all coefficients at once, with an error of at most `wanted`."""
    bessel = j0 if order == 0.0 else (lambda x: jv(order, x))
    power = 1.0 + order if order % 1.0 else 0.0

    def rule(nodes: int) -> tuple[np.ndarray, np.ndarray]:
        """Return radii and weights of integral_0^1 g r dr."""
        if power == 0.0:
            t, w = np.polynomial.legendre.leggauss(nodes)
            return 0.5 * (t + 1.0), 0.25 * w * (t + 1.0)
        t, w = roots_jacobi(nodes, 0.0, power)
        return 0.5 * (t + 1.0), 0.5 ** (power + 1.0) * w * (0.5 * (t + 1.0)) ** (1.0 - power)

    def at_hand(nodes: int) -> Callable[[], np.ndarray]:
        r, w = rule(nodes)
        return lambda: bessel(np.outer(roots, r)) @ (w * profile(r)) / norms

    def from_scratch(nodes: int) -> np.ndarray:
        r, w = rule(nodes)
        zeros = jn_zeros(int(order), TERMS) if order % 1.0 == 0.0 else roots
        return bessel(np.outer(zeros, r)) @ (w * profile(r)) * 2.0 / jv(order + 1.0, zeros) ** 2

    fewest = next(n for n in range(TERMS // 2, 4 * TERMS, 2) if error(at_hand(n)()) <= wanted)
    required, rounds = (2.0, 200) if order == 0.0 else (10.0, 15)
    return [
        Rival(f"Gauss, {2 * TERMS} nodes", at_hand(2 * TERMS), required, rounds),
        Rival(f"Gauss, {fewest} nodes", at_hand(fewest), required, rounds),
        Rival(f"Gauss, {fewest} nodes, from scratch", lambda: from_scratch(fewest), required, 15),
    ]


def medians(
    ours: list[Callable[[], np.ndarray]], theirs: Callable[[], np.ndarray], rounds: int
) -> tuple[list[float], float]:
    """Return the median seconds of our functions and theirs, in turn; ours more often where theirs is slow."""
    times: list[list[float]] = [[] for _ in ours]
    their_times = []
    for _ in range(rounds):
        for _ in range(max(1, 100 // rounds)):
            for function, taken in zip(ours, times, strict=True):
                taken.append(once(function))
        their_times.append(once(theirs))
    return [float(np.median(taken)) for taken in times], float(np.median(their_times))


def main() -> None:
    rows = []
    for order in (0.0, 0.3):
        roots, norms, true = exact(order, TERMS)
        unit = np.sqrt(norms) / float(np.max(np.abs(true) * np.sqrt(norms)))

        def error(c: np.ndarray, true: np.ndarray = true, unit: np.ndarray = unit) -> float:
            return float(np.max(np.abs(c - true) * unit))

        def cached(basis: FourierBessel = FourierBessel(order)) -> np.ndarray:  # noqa: B008
            return expand(profile, basis, terms=TERMS).coefficients

        def cold(cached: Callable[[], np.ndarray] = cached) -> np.ndarray:
            quadrature.forget()
            return cached()

        mine = error(cold())
        wanted = max(mine, 1e-14)
        for rival in adaptive(order, roots, norms) + by_hand(order, roots, norms, error, wanted):
            (fresh, ours), theirs = medians([cold, cached], rival.coefficients, rival.rounds)
            rows.append(
                [
                    f"order {order:g}, {rival.name}",
                    seconds(fresh),
                    seconds(ours),
                    seconds(theirs),
                    f"{mine:.1e}",
                    f"{error(rival.coefficients()):.1e}",
                    f">= {rival.required:g}x",
                    f"{theirs / fresh:.3g}x",
                    f"{theirs / ours:.3g}x",
                    verdict(theirs / fresh >= rival.required and mine <= 1e-14),
                    verdict(theirs / ours >= 3.0 * rival.required),
                ]
            )
    head = ["against", "cold", "cached", "theirs", "our error", "their error"]
    print(table([*head, "required", "cold", "cached", "cold", "3x that, cached"], rows))
    print(versions())


if __name__ == "__main__":
    main()
