"""Orthogonality of the modes by quadratures not ours: order in [0, 60], robin over fifteen decades."""

from __future__ import annotations

from functools import lru_cache
from itertools import pairwise

import numpy as np
import pytest
from hypothesis import HealthCheck, example, given, settings
from hypothesis import strategies as st
from numpy.polynomial.legendre import leggauss
from scipy.special import roots_jacobi
from third_basis import Sines

from fbexpand.bases import Dini, FourierBessel

FAST = settings(max_examples=60, deadline=None, suppress_health_check=list(HealthCheck), derandomize=True)
DEEP = settings(max_examples=2000, deadline=None, suppress_health_check=list(HealthCheck))
TERMS = 10
ALLOWED = 1e-13

orders = st.one_of(
    st.sampled_from([0.0, 0.5, 1.0, 2.0, 60.0]),
    st.floats(0.0, 60.0, allow_subnormal=False),
    st.floats(-15.0, 0.0).map(lambda e: 10.0**e),
)
decades = st.builds(lambda s, e: s * 10.0**e, st.sampled_from([-1.0, 1.0]), st.floats(-9.0, 6.0))


def near_corner(order, kind, size):
    """-order, one ulp beside it, or a relative distance from it."""
    if kind == "at":
        return -order
    if kind in {"above", "below"}:
        return float(np.nextafter(-order, np.inf if kind == "above" else -np.inf))
    return -order * (1.0 + size)


corners = st.tuples(st.sampled_from(["at", "above", "below", "beside"]), st.floats(-1e-3, 1e-3))


def rule_at(t):
    """Weights of the interpolating rule on [-1, 1] at Gauss-Legendre's nodes, moved by rounding."""
    values = np.polynomial.legendre.legvander(t, t.size - 1)
    moments = np.zeros(t.size)
    moments[0] = 2.0
    return np.linalg.solve(values.T, moments)


def graded_rule():
    """Nodes and weights on [0, 1] for the weight x dx: Gauss-Legendre panels, halved toward axis and rim.

    Toward the rim the rounded nodes' own distance 1 - x counts: exp(1e6 (x - 1)) feels the rounding of x.
    """
    t, w = leggauss(24)
    toward = 2.0 ** -np.arange(3.0, 33.0)
    edges = np.concatenate(([0.0], toward[::-1], np.arange(0.15625, 0.876, 0.03125)))
    nodes, weights = [], []
    for low, high in pairwise(edges):
        nodes.append(low + 0.5 * (high - low) * (t + 1.0))
        weights.append(0.5 * (high - low) * w)
    for deep, shallow in pairwise([*toward, 0.0]):
        half = 0.5 * (deep - shallow)
        x = 1.0 - (shallow + half * (t + 1.0))
        nodes.append(x)
        weights.append(half * rule_at((1.0 - x - shallow) / half - 1.0))
    x, w = np.concatenate(nodes), np.concatenate(weights)
    return x, w * x


@lru_cache(maxsize=8)
def jacobi_rule(order, nodes=48):
    """Gauss-Jacobi for the weight y^order dy on [0, 1].

    SciPy's nodes, and Christoffel's 1 / sum p_k^2 for the weights. SciPy's own weights are off by up to 4e-13
    at these sizes, which is more than what is tested.
    """
    t, _ = roots_jacobi(nodes, 0.0, order)
    k = np.arange(nodes + 1.0)
    with np.errstate(invalid="ignore"):
        middle = np.where(k + order > 0, order**2 / ((2 * k + order) * (2 * k + order + 2)), 0.0)
        beside = 4 * k**2 * (k + order) ** 2 / ((2 * k + order) ** 2 * ((2 * k + order) ** 2 - 1))
    beside = np.sqrt(beside[1:])
    old, new = np.zeros(nodes), np.full(nodes, np.sqrt(order + 1.0))
    total = new**2
    for i in range(nodes - 1):
        old, new = new, ((t - middle[i]) * new - (beside[i - 1] * old if i else 0.0)) / beside[i]
        total += new**2
    return 0.5 * (1.0 + t), 1.0 / total


GRADED = graded_rule()


def defect(gram, norms):
    return np.abs(gram / np.sqrt(np.outer(norms, norms)) - np.eye(norms.size)).max()


def by_graded_panels(basis, terms=TERMS):
    x, weights = GRADED
    modes = basis.modes(basis.radius * x, terms)
    return defect(modes.T @ (weights[:, None] * modes) * basis.radius**2, basis.norms(terms))


def by_gauss_jacobi(basis, terms=TERMS, nodes=48):
    """phi_j phi_k / x^(2 nu) is entire in y = x^2: Gauss-Jacobi for the weight y^nu dy / 2."""
    y, w = jacobi_rule(basis.order, nodes)
    x = np.sqrt(y)
    modes = basis.modes(basis.radius * x, terms) / x[:, None] ** basis.order
    return defect(modes.T @ (0.5 * w[:, None] * modes) * basis.radius**2, basis.norms(terms))


def check(basis):
    assert by_graded_panels(basis) <= ALLOWED
    if basis.roots(1)[0] < 50.0:  # a steeper growing mode has its weight between the last nodes and the rim
        assert by_gauss_jacobi(basis) <= ALLOWED


def test_the_rules_themselves():
    x, weights = GRADED
    for power in (0.0, 0.5, 30.0):
        np.testing.assert_allclose(weights @ x**power, 1.0 / (power + 2.0), rtol=1e-14)
    steep = weights @ np.exp(2e6 * (x - 1.0))
    np.testing.assert_allclose(steep, 5e-7 * (1.0 - 5e-7), rtol=1e-14)
    for order in (0.0, 0.3, 1.0, 60.0):
        y, w = jacobi_rule(order)
        for power in (0.0, 1.0, 40.0):
            np.testing.assert_allclose(w @ y**power, 1.0 / (power + order + 1.0), rtol=1e-13)


@FAST
@given(orders, decades)
@example(0.0, -1e6)
@example(60.0, -1e6)
@example(0.0, 1e6)
@example(60.0, 1e-9)
def test_dini(order, robin):
    check(Dini(order, robin=robin))


@FAST
@given(orders, corners)
@example(0.0, ("above", 0.0))
@example(60.0, ("below", 0.0))
@example(60.0, ("above", 0.0))
@example(1.0, ("at", 0.0))
def test_dini_at_the_corner(order, where):
    check(Dini(order, robin=near_corner(order, *where)))


@FAST
@given(orders, st.floats(-6.0, 6.0))
def test_fourier_bessel(order, decade):
    check(FourierBessel(order, 10.0**decade))


def test_third_basis():
    check(Sines(3.0))


@pytest.mark.parametrize("robin", [1e12, 1e17, 1e300, 1e-300, -1e-300])
def test_dini_far_out(robin):
    for order in (0.0, 0.7, 12.0):
        check(Dini(order, robin=robin))


@pytest.mark.parametrize("order", [0.0, 1.7])
def test_many_modes(order):
    for basis in (FourierBessel(order), Dini(order, robin=-5.0)):
        assert by_gauss_jacobi(basis, 100, 260) <= ALLOWED


def test_what_is_wrong_is_found():
    """The check can fail: a norm off by 1e-12, modes of roots off by 1e-12."""

    class WrongNorm(Sines):
        def norms(self, count, start=1):
            return super().norms(count, start) * (1.0 + 1e-12)

    class WrongRoots(Sines):
        def modes(self, r, count, start=1):
            return super().modes(np.asarray(r) * (1.0 - 1e-12), count, start)

    for wrong in (WrongNorm(), WrongRoots()):
        assert by_graded_panels(wrong) > ALLOWED
        assert by_gauss_jacobi(wrong) > ALLOWED


@pytest.mark.deep
@DEEP
@given(orders, decades, corners)
def test_orthogonality_deep(order, robin, where):
    check(Dini(order, robin=robin))
    check(Dini(order, robin=near_corner(order, *where)))
    check(FourierBessel(order))
