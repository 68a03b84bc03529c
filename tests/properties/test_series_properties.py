"""Structure: Parseval, linearity and dilation of the radius for random series."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import HealthCheck, example, given, settings
from hypothesis import strategies as st

from fbexpand.bases import Dini, FourierBessel
from fbexpand.expansion import Expansion, stack

FAST = settings(max_examples=40, deadline=None, suppress_health_check=list(HealthCheck), derandomize=True)
DEEP = settings(max_examples=1500, deadline=None, suppress_health_check=list(HealthCheck))

orders = st.one_of(st.sampled_from([0.0, 0.5, 1.0, 2.0, 60.0]), st.floats(0.0, 60.0, allow_subnormal=False))
robins = st.one_of(
    st.none(), st.builds(lambda s, e: s * 10.0**e, st.sampled_from([-1.0, 1.0]), st.floats(-9.0, 6.0))
)
radii = st.floats(1e-6, 1e6)
seeds = st.integers(0, 2**32 - 1)
counts = st.integers(1, 24)


def basis_of(order, radius, robin):
    return FourierBessel(order, radius) if robin is None else Dini(order, radius, robin=robin)


def random_series(basis, terms, seed):
    """Orthonormal coefficients of order 1: all modes take part."""
    b = np.random.default_rng(seed).normal(size=terms)
    return Expansion(basis, b / np.sqrt(basis.norms(terms)))


def gauss_rule(basis, terms):
    """Radii, what rounding has moved them by, and weights for squares of sums: panels graded to axis and rim."""
    roots = basis.roots(terms)
    count = int(roots.max() if not basis.growing else (roots[1:].max() if terms > 1 else 0.0)) // 3 + 2
    edges = np.linspace(0.0, 1.0, count + 1)
    edges = np.concatenate((edges[1] * 2.0 ** -np.arange(16.0, 0.0, -1.0), edges[1:]))
    if basis.growing:
        layer = 1.0 - 2.0 ** np.arange(-2.0, 26.0) / max(roots[0], 1.0)
        edges = np.union1d(edges, layer[layer > edges[0]])
    edges = np.concatenate(([0.0], edges))
    x, w = np.polynomial.legendre.leggauss(24)
    half = 0.5 * np.diff(edges)[:, None]
    depth = np.longdouble(1.0 - edges[1:, None]) + np.longdouble(half) * (1.0 - np.longdouble(x))
    exact = (np.longdouble(basis.radius) * (1.0 - depth)).ravel()
    r = exact.astype(np.float64)
    return r, (exact - r).astype(np.float64), r * (half * w).ravel() * basis.radius


def parseval(order, radius, robin, terms, seed):
    basis = basis_of(order, radius, robin)
    e, f = random_series(basis, terms, seed), random_series(basis, terms, seed + 1)
    r, moved, w = gauss_rule(basis, terms)
    values, others = e(r), f(r)
    if basis.growing:  # a mode of mu = 1e6 changes by 1e-10 where a radius is rounded
        values, others = values + e.derivative(r) * moved, others + f.derivative(r) * moved
    assert abs(np.sum(w * values**2) / e.norm() ** 2 - 1.0) <= 1e-12
    assert abs(np.sum(w * values * others) - e.inner(f)) <= 1e-12 * e.norm() * f.norm()


@given(orders, radii, robins, counts, seeds)
@example(0.0, 1.0, -1e6, 5, 1)
@example(60.0, 1.0, -60.0, 5, 1)
@example(0.0, 1.0, 1e-300, 5, 1)
@FAST
def test_parseval(order, radius, robin, terms, seed):
    parseval(order, radius, robin, terms, seed)


@pytest.mark.deep
@given(orders, radii, robins, counts, seeds)
@DEEP
def test_parseval_deep(order, radius, robin, terms, seed):
    parseval(order, radius, robin, terms, seed)


@given(orders, radii, robins, counts, counts, seeds, st.floats(-1e3, 1e3), st.floats(-1e3, 1e3))
@FAST
def test_linearity(order, radius, robin, terms, others, seed, alpha, beta):
    basis = basis_of(order, radius, robin)
    e, f = random_series(basis, terms, seed), random_series(basis, others, seed + 1)
    alpha, beta = (0.0 if abs(v) < 1e-100 else v for v in (alpha, beta))  # no underflow
    g = alpha * e + beta * f
    r = np.linspace(0.0, radius, 9)
    scale = (
        np.abs(alpha) * np.abs(e.coefficients).max() + np.abs(beta) * np.abs(f.coefficients).max() + 1e-300
    )
    for question in (
        lambda s: s(r),
        lambda s: s.integral() / radius**2,
        lambda s: s.mean(0.2 * radius, radius),
    ):
        np.testing.assert_allclose(
            question(g),
            alpha * question(e) + beta * question(f),
            rtol=0,
            atol=1e-12 * scale * (1 + terms + others),
        )
    assert g.terms == max(terms, others)
    both = stack([e, f])
    np.testing.assert_allclose(
        both(r),
        np.stack([e(r), f(r)]),
        rtol=0,
        atol=1e-14 * (np.abs(e.coefficients).max() + np.abs(f.coefficients).max()) * (terms + others),
    )


@given(orders, st.sampled_from([2.0**-20, 0.125, 2.0, 1024.0]), robins, counts, seeds)
@FAST
def test_dilation_of_the_radius(order, factor, robin, terms, seed):
    """A power of two as radius changes the exponents only, so the answers agree to the last bits."""
    small, large = basis_of(order, 1.0, robin), basis_of(order, factor, robin)
    c = np.random.default_rng(seed).normal(size=terms) / np.sqrt(small.norms(terms))
    e, f = Expansion(small, c), Expansion(large, c)
    r = np.linspace(0.0, 1.0, 13)
    np.testing.assert_allclose(f(r * factor), e(r), rtol=1e-13, atol=1e-13 * np.abs(e(r)).max())
    np.testing.assert_allclose(f.norm(), factor * e.norm(), rtol=1e-14)
    inner = slice(1, None)
    slopes = e.derivative(r)[inner]
    np.testing.assert_allclose(
        factor * f.derivative(r * factor)[inner], slopes, rtol=1e-12, atol=1e-12 * np.abs(slopes).max()
    )
    np.testing.assert_allclose(
        f.integral(), factor**2 * e.integral(), rtol=1e-12, atol=1e-13 * factor**2 * e.norm()
    )
