"""Derivatives at the axis and by interpolation, integrals, means, norms, the Laplacian."""

from __future__ import annotations

from itertools import pairwise

import mpmath
import numpy as np
import pytest
from scipy.special import j0, j1, jn_zeros
from series_helpers import measured_series

from fbexpand.bases import Dini, FourierBessel
from fbexpand.exceptions import TruncationWarning
from fbexpand.expansion import Expansion
from fbexpand.expansion.calculus import _spectral

BASES = [FourierBessel(0.0, 2.0), FourierBessel(0.3, 2.0), FourierBessel(1.0, 2.0), FourierBessel(7.25, 2.0),
         Dini(0.0, 2.0, robin=1.5), Dini(2.5, 2.0, robin=0.5)]  # fmt: skip
SCALED = [Dini(2.5, 2.0, robin=-0.5), Dini(1.0, 2.0, robin=-1.0), Dini(0.0, 2.0, robin=-3.0)]  # fmt: skip


def plain(basis, terms=6, seed=0):
    return Expansion(basis, np.random.default_rng(seed).normal(size=terms))


@pytest.mark.parametrize("basis", BASES, ids=repr)
@pytest.mark.parametrize(
    ("a", "b"), [(0.0, None), (0.0, 1e-3), (0.0, 0.7), (0.3, 1.7), (1e-6, 0.5), (1.9, 2.0)]
)
def test_integral_against_adaptive_quadrature(basis, a, b):
    e = plain(basis)
    top = basis.radius if b is None else b
    with mpmath.workdps(25):
        total = moduli = mpmath.mpf(0)
        for c, root in zip(e.coefficients, basis.roots(e.terms), strict=True):
            pieces = max(2, int(root * (top - a) / basis.radius / 3))
            points = [a + (top - a) * i / pieces for i in range(pieces + 1)]
            scale = mpmath.mpf(float(root)) / basis.radius
            part = float(c) * mpmath.quad(lambda r, s=scale: r * mpmath.besselj(basis.order, s * r), points)
            total, moduli = total + part, moduli + abs(part)
    assert abs(e.integral(a, b) - float(total)) <= 2e-14 * float(moduli) + 4e-16 * top**2
    assert e.integral(top, a) == -e.integral(a, b)
    mean = e.mean(a, b)
    assert mean == pytest.approx(e.integral(a, b) * 2 / (top**2 - a**2), rel=1e-12)
    assert e.mean(top, a) == pytest.approx(mean, rel=1e-13)


def test_integral_over_the_disk_in_closed_form():
    """integral_0^1 r J_0(j_k r) dr = J_1(j_k) / j_k."""
    zeros = jn_zeros(0, 200)
    c = np.random.default_rng(1).normal(size=200)
    ours = Expansion(FourierBessel(0.0), c).integral()
    assert ours == pytest.approx(np.sum(c * j1(zeros) / zeros), rel=1e-13, abs=1e-15)


def test_whole_and_parts():
    e = plain(BASES[1], 40)
    cuts = np.linspace(0.0, 2.0, 8)
    parts = [e.integral(a, b) for a, b in pairwise(cuts)]
    assert sum(parts) == pytest.approx(e.integral(), rel=1e-13, abs=1e-15)
    assert e.integral(0.5, 0.5) == 0.0


def test_complex_and_batches():
    c = np.random.default_rng(2).normal(size=(2, 3, 9))
    e = Expansion(BASES[1], c[0] + 1j * c[1])
    for ours, real, imag in (
        (e.integral(0.1, 1.0), Expansion(BASES[1], c[0]).integral(0.1, 1.0), Expansion(BASES[1],
        c[1]).integral(0.1, 1.0)), (e.derivative(0.3), Expansion(BASES[1], c[0]).derivative(0.3),
        Expansion(BASES[1], c[1]).derivative(0.3)),
    ):  # fmt: skip
        np.testing.assert_allclose(ours, real + 1j * imag, rtol=1e-13)


@pytest.mark.parametrize("order", [0.25, 0.5, 0.75])
@pytest.mark.parametrize("sign", [1.0, -1.0])
def test_infinite_slope_at_the_axis(order, sign):
    e = Expansion(FourierBessel(order), sign * np.array([1.0, 0.3]))
    with np.errstate(all="raise"):
        slopes = e.derivative([0.0, 1e-12])
        assert e.derivative(0.0) == sign * np.inf
        assert e.derivative(0.0, 2) == -sign * np.inf
        assert e.derivative(0.0, 3) == sign * np.inf
    assert np.isfinite(slopes[1])
    assert slopes[1] * sign > 1.0
    assert Expansion(FourierBessel(order), [0.0, 0.0]).derivative(0.0) == 0.0
    both = Expansion(FourierBessel(order), [[1.0, 0.3], [-1.0, 0.0], [0.0, 0.0]])
    np.testing.assert_array_equal(both.derivative(0.0), [np.inf, -np.inf, 0.0])
    turned = (1j * e).derivative(0.0)
    assert (turned.real, turned.imag) == (0.0, sign * np.inf)
    # the leading terms cancel in part: the sum decides, not any one mode
    roots = FourierBessel(order).roots(2)
    c = np.array([1.0, -2.0 * (roots[0] / roots[1]) ** order])
    assert Expansion(FourierBessel(order), c).derivative(0.0) == -np.inf


def test_finite_slopes_at_the_axis():
    c = np.array([1.0, 0.3])
    roots = FourierBessel(1.0).roots(2)
    assert Expansion(FourierBessel(1.0), c).derivative(0.0) == pytest.approx(np.sum(c * roots) / 2, rel=1e-14)
    assert Expansion(FourierBessel(0.0), c).derivative(0.0) == 0.0
    assert Expansion(FourierBessel(1.5), c).derivative(0.0) == 0.0
    assert Expansion(FourierBessel(1.5), c).derivative(0.0, 2) == np.inf
    zero = FourierBessel(0.0).roots(2)
    assert Expansion(FourierBessel(0.0), c).derivative(0.0, 2) == pytest.approx(
        -np.sum(c * zero**2) / 2, rel=1e-14
    )


def test_derivative_carries_the_unit_of_length():
    c = np.array([1.0, 0.3, -0.2])
    small, large = Expansion(FourierBessel(0.5, 1.0), c), Expansion(FourierBessel(0.5, 8.0), c)
    for n in range(4):
        assert large.derivative(4.0, n) * 8.0**n == pytest.approx(small.derivative(0.5, n), rel=1e-12)


@pytest.mark.parametrize("basis", BASES[:4], ids=repr)
@pytest.mark.parametrize("n", [1, 2, 3])
def test_derivative_by_interpolation(basis, n):
    """The road for a basis that cannot differentiate its modes."""
    e = plain(basis, 40)
    r = np.linspace(0.01, 2.0, 101)
    direct = e.derivative(r, n)
    scale = np.abs(e(np.linspace(0, 2, 1001))).max() * (basis.roots(1, 40)[0] / 2.0) ** n
    ours = _spectral(basis, e.coefficients[None], r, n)[0]
    assert np.abs(ours - direct).max() <= 5e-13 * 50.0 ** (n - 1) * scale


@pytest.mark.parametrize("basis", SCALED, ids=repr)
def test_integral_with_a_first_mode_of_its_own_scale(basis):
    """The mode that is scaled to 1 at the rim: positive, zero and negative eigenvalue."""
    e = plain(basis, 9)
    x, w = np.polynomial.legendre.leggauss(60)
    for a, b in ((0.0, 2.0), (0.5, 1.5)):
        cuts = (
            np.linspace(a, b, 9) if a else np.concatenate(([0.0], 2.0 * 2.0 ** -np.arange(30.0, -1.0, -1.0)))
        )
        half = 0.5 * np.diff(cuts)[:, None]
        r = (cuts[:-1, None] + half * (x + 1)).ravel()
        direct = np.sum((half * w).ravel() * r * e(r))
        assert e.integral(a, b) == pytest.approx(direct, rel=1e-12, abs=1e-14)
    assert Expansion(basis, [1.0])(2.0) == pytest.approx(1.0, rel=1e-13)


@pytest.mark.parametrize("basis", BASES + SCALED, ids=repr)
def test_parseval(basis):
    e, f = plain(basis, 20, 1), plain(basis, 15, 2)
    x, w = np.polynomial.legendre.leggauss(400)
    r = 1.0 + x
    assert e.norm() == pytest.approx(np.sqrt(np.sum(w * r * e(r) ** 2)), rel=1e-11)
    assert e.inner(f) == pytest.approx(np.sum(w * r * e(r) * f(r)), rel=1e-10)
    np.testing.assert_allclose(e.orthonormal, e.coefficients * np.sqrt(basis.norms(20)), rtol=1e-15)


def test_inner_conjugates_the_first():
    e, f = Expansion(BASES[0], [1j, 1.0]), Expansion(BASES[0], [1.0, 2j, 5.0])
    norms = BASES[0].norms(2)
    assert e.inner(f) == pytest.approx(-1j * norms[0] + 2j * norms[1], rel=1e-15)
    assert f.inner(e) == pytest.approx(np.conj(e.inner(f)), rel=1e-15)
    many = Expansion(BASES[0], np.ones((3, 1, 2))).inner(Expansion(BASES[0], np.ones((4, 2))))
    assert many.shape == (3, 4)


def test_norm_neither_overflows_nor_underflows():
    for size in (1e-300, 1e300):
        e = Expansion(BASES[0], [size, size])
        assert e.norm() == pytest.approx(size * Expansion(BASES[0], [1.0, 1.0]).norm(), rel=1e-14)
    assert Expansion(BASES[0], [0.0]).norm() == 0.0


def test_laplacian_is_the_operator():
    for basis in BASES + SCALED:
        e = plain(basis, 10)
        r = np.linspace(0.2, 1.9, 31)
        direct = e.derivative(r, 2) + e.derivative(r) / r - basis.order**2 * e(r) / r**2
        np.testing.assert_allclose(e.laplacian()(r), direct, atol=1e-9)


def test_laplacian_of_a_profile_that_keeps_the_rim_condition():
    """lap (1 - r^2) = -4; its series has the coefficients of that constant."""
    basis = FourierBessel(0.0)
    lap = measured_series("parabola", basis, 40).laplacian()
    zeros = jn_zeros(0, 40)
    np.testing.assert_allclose(lap.coefficients, -8.0 / (zeros * j1(zeros)), rtol=1e-9)
    assert np.isfinite(lap.error_estimate().l2)
    assert lap.error_estimate().source == "law"
    assert abs(lap(0.3) + 4.0) <= lap.partial_sum(0.3).error


def test_laplacian_that_does_not_converge():
    for name in ("one", "step", "kink", "gaussian"):
        with pytest.warns(TruncationWarning, match="does not converge"):
            lap = measured_series(name, FourierBessel(0.0), 40).laplacian()
        assert lap.error_estimate().l2 == np.inf
        assert lap.error_estimate().sup == np.inf
        assert (2.0 * lap).error_estimate().l2 == np.inf
    assert Expansion(FourierBessel(0.0), [1.0]).laplacian()(0.0) == -FourierBessel(0.0).eigenvalues(1)[
        0
    ] * j0(0.0)
