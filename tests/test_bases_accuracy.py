"""Roots, norms and modes against ball arithmetic, with the first Dini mode in its three regimes."""

from __future__ import annotations

import math

import mpmath as mp
import numpy as np
import pytest
from basis_references import EPS, ReferenceBasis

INF = math.inf


def corner(order):
    """Robin coefficients around -order: one ulp, 1e-12, and 1e-300 at order 0."""
    if order == 0.0:
        return [1e-300, -1e-300, 1e-12, -1e-12]
    return [
        float(np.nextafter(-order, 0.0)),
        float(np.nextafter(-order, -1e9)),
        -order + 1e-12,
        -order - 1e-12,
    ]


ORDERS = (0.0, 0.3, 1.0, 7.0, 24.5, 60.0)
ROBINS = (INF, 0.0, 1.0, 1e3, 1e6, 1e17, 1e300, -1e3, -1e6)
CASES = [
    (order, robin)
    for order in ORDERS
    for robin in (*ROBINS, -order, -0.5 * order, -order - 1.0, -order - 100.0, *corner(order))
]
LARGE = [(nu, robin) for nu in (200.0, 1e3) for robin in (INF, 1.0, -0.99 * nu, -nu, -1.5 * nu)]
LARGEST = [(1e4, robin) for robin in (INF, 1.0, -1e3, -9.9e3, -1e4, -1.5e4)]


def check_norms(order, robin, ks, allowed):
    reference = ReferenceBasis(order, robin)
    basis = reference.basis()
    for k in ks:
        exact = reference.norm(k)
        assert abs(basis.norms(1, k)[0] - exact) <= allowed * EPS * exact, (order, robin, k)
        assert abs(basis.roots(1, k)[0] - reference.root(k)) <= 2 * EPS * reference.root(k), (order, robin, k)


@pytest.mark.parametrize("order", ORDERS)
def test_norms_and_roots(order):
    for robin in [case[1] for case in CASES if case[0] == order]:
        check_norms(order, robin, (1, 2, 9), 5.0)


def test_norms_and_roots_at_large_order():
    for order, robin in LARGE:
        check_norms(order, robin, (1, 2), 8.0)


def check_modes(order, robin, terms, n, allowed, seed):
    """A random sum, its terms added exactly: |error| <= allowed eps sum |c_k phi_k|."""
    rng = np.random.default_rng(seed)
    reference = ReferenceBasis(order, robin)
    radius = float(10.0 ** rng.uniform(-3, 3))
    x = np.concatenate(
        (rng.uniform(0, 1, 4), 1 - 10.0 ** rng.uniform(-15.5, -0.3, 4), 10.0 ** rng.uniform(-6, 0, 2), [1.0])
    )
    r = np.minimum(radius * x, radius)
    modes = reference.basis(radius).modes(r, terms, derivative=n)
    c = rng.normal(size=terms)
    for i, at in enumerate(r):
        exact = [
            c[k] * reference.mode(k + 1, mp.mpf(at) / mp.mpf(radius), n) / mp.mpf(radius) ** n
            for k in range(terms)
        ]
        size = sum(abs(v) for v in exact)
        if size < 1e-280:
            continue
        ours = sum(mp.mpf(c[k]) * mp.mpf(modes[i, k]) for k in range(terms))
        assert abs(ours - sum(exact)) <= allowed * EPS * size, (order, robin, n, at / radius)


@pytest.mark.parametrize("order", ORDERS)
def test_modes(order):
    for i, robin in enumerate(case[1] for case in CASES if case[0] == order):
        check_modes(order, robin, 1 + (5 * i) % 11, 0, 4.0, i)


@pytest.mark.parametrize(("n", "allowed"), [(1, 6.0), (2, 8.0), (3, 8.0)])
def test_derivatives(n, allowed):
    for order in ORDERS:
        for i, robin in enumerate((INF, 0.0, 1.0, 1e6, -1e-9, -1e3, -order, -0.5 * order, -order - 1.0)):
            if (order, robin, n) != (1.0, -1.0, 3):  # it is exactly 0 at the rim
                check_modes(order, robin, 12, n, allowed, 100 * n + i)


def test_third_derivative_that_nearly_vanishes_at_the_rim():
    """At robin = -1 what leads in the third derivative at the rim cancels, for all modes at once."""
    for i, (order, robin) in enumerate([(0.0, -1.0), (0.0, -0.999), (0.3, -1.0), (1.0, -0.99), (2.0, -1.0)]):
        check_modes(order, robin, 12, 3, 8.0, i)
    for i, robin in enumerate((-1.0 + 1e-12, -1.0 - 1e-9)):  # at order 1 it vanishes as robin + 1
        check_modes(1.0, robin, 3, 3, 8.0, i)


def test_third_derivative_of_a_nearly_constant_mode():
    """At order 0 and small robin the first mode is 1 - robin x^2 / 2 and its third derivative of size robin^2."""
    for i, robin in enumerate((1e-12, 1e-5, 1e-3)):
        check_modes(0.0, robin, 1, 3, 8.0, i)


def test_modes_at_large_order():
    for i, (order, robin) in enumerate(LARGE):
        check_modes(order, robin, 3, i % 2, 8.0, i)


def test_derivatives_about_the_turning_point():
    """(nu - z)(nu + z) is small beside nu^2 there, and both z = lambda x and lambda are rounded."""
    for i, (order, robin) in enumerate([*LARGE[1:3], *LARGE[5:8]]):
        for n in (1, 2, 3):
            check_modes(order, robin, 3, n, 8.0, i)


@pytest.mark.deep
def test_order_ten_thousand():
    for i, (order, robin) in enumerate(LARGEST):
        check_norms(order, robin, (1, 2), 14.0)
        check_modes(order, robin, 3, i % 2, 8.0, i)


@pytest.mark.deep
def test_modes_deep():
    rng = np.random.default_rng(3)
    for i in range(400):
        order = float(rng.choice([rng.uniform(0, 60), rng.integers(0, 61), 10.0 ** rng.uniform(-12, 0)]))
        robin = float(rng.choice([-1, 1]) * 10.0 ** rng.uniform(-9, 6))
        robin = float(
            rng.choice([robin, -order, -order * (1 + 1e-12 * rng.normal()), -order * rng.uniform(0, 2)])
        )
        check_norms(order, robin, (1, 2, 9), 6.0)
        check_modes(order, robin, 12, 0, 4.0, i)
        check_modes(order, robin, 12, 1, 8.0, i)


@pytest.mark.parametrize("order", [0.0, 1e-3, 0.3, 1.0, 7.0, 24.5, 60.0])
def test_the_first_mode_is_continuous_through_the_corner(order):
    """The mode, its slope and its norm differ by what robin differs by: no digit is lost on either side."""
    r = np.linspace(0.0, 1.0, 11)[1:]
    middle = ReferenceBasis(order, -order).basis()
    for robin in corner(order):
        basis = ReferenceBasis(order, robin).basis()
        shift = abs(robin + order)
        if robin < 0:
            np.testing.assert_allclose(basis.modes(r, 1), middle.modes(r, 1), rtol=8 * EPS + 2 * shift)
        else:  # order 0: J_0(lambda r), not scaled
            np.testing.assert_allclose(basis.modes(r, 1), np.ones((10, 1)), rtol=4 * EPS + 2 * shift)
        np.testing.assert_allclose(basis.norms(1), middle.norms(1), rtol=8 * EPS + 2 * shift)
        exact = 2.0 * (order + 1.0) * (robin + order)
        np.testing.assert_allclose(basis.eigenvalues(1), exact, rtol=8 * EPS + 2 * shift)
