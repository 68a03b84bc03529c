"""A little of everything, few points each: also run with numba's bounds checks on, and without compilation.

Values by mpmath or published ones; the sizes are such that interpreted kernels finish in a minute or two.
"""

from __future__ import annotations

import mpmath
import numpy as np
import pytest

from fbexpand import (
    Dini,
    Expansion,
    FourierBessel,
    RadialTable,
    ascending_series,
    bessel_j,
    bessel_j_sequence,
    bessel_zeros,
    crosscheck,
    dini_roots,
    expand,
)
from fbexpand.evolution import Diffusion, Paraxial, Wave, evolve

EPS = np.finfo(float).eps


@pytest.mark.parametrize("order", [0.0, 0.3, 7.5, 60.0])
def test_bessel_j(order):
    x = np.array([0.25, 3.0, 20.0, 75.5, 1000.25, 1e6])
    exact = np.array([float(mpmath.besselj(order, z)) for z in x.tolist()])
    hankel = np.array([float(abs(mpmath.hankel1(order, z))) for z in x.tolist()])
    modulus = np.where(x > order, hankel, np.abs(exact))
    assert np.all(np.abs(bessel_j(order, x) - exact) <= 4.0 * EPS * modulus)
    slope = np.array([float(mpmath.besselj(order, z, derivative=1)) for z in x[:4].tolist()])
    np.testing.assert_allclose(bessel_j(order, x[:4], derivative=1), slope, rtol=1e-13, atol=1e-16)


def test_a_sequence_of_orders():
    found = bessel_j_sequence(0.5, 6, np.array([2.0, 30.0]))
    exact = [[float(mpmath.besselj(0.5 + n, z)) for n in range(6)] for z in (2.0, 30.0)]
    np.testing.assert_allclose(found, exact, rtol=1e-13, atol=1e-15)


def test_zeros_and_dini_roots():
    # Boost.Math's 50-digit test data
    assert bessel_zeros(0.0, 3).tolist() == [2.4048255576957727686, 5.5200781102863106496, 8.6537279129110122170]
    assert bessel_zeros(0.0, 1, start=10000)[0] == 31415.14114171350798533666  # mpmath's documentation of besseljzero
    # computed to 25 digits, see test_convective_rim
    np.testing.assert_allclose(dini_roots(0.0, 1.0, 2), [1.2557837117945935219, 4.079477710797353323], rtol=2 * EPS)
    np.testing.assert_allclose(dini_roots(0.0, -1.0, 2), [1.6082794717268792669, 3.56794936120787752], rtol=2 * EPS)
    assert dini_roots(0.0, 0.0, 1)[0] == 0.0
    assert bessel_zeros(50.0, 1)[0] == pytest.approx(57.11689916011917411936, rel=2 * EPS)


@pytest.mark.parametrize("robin", [np.inf, 1.2, 0.0, -0.3, -0.25, -4.0, 1e9])
def test_modes_obey_the_condition_at_the_rim_and_are_orthogonal(robin):
    basis = FourierBessel(0.3) if np.isinf(robin) else Dini(0.3, robin=robin)
    rim = np.array([1.0])
    value, slope = basis.modes(rim, 4)[0], basis.modes(rim, 4, derivative=1)[0]
    size = np.abs(slope) + (1.0 if np.isinf(robin) else 1.0 + abs(robin)) * np.abs(value) + 1.0
    condition = value if np.isinf(robin) else slope + robin * value
    assert np.all(np.abs(condition) <= 1e-13 * size)
    nodes, weights = np.polynomial.legendre.leggauss(40)
    s = 0.5 * (nodes + 1.0)
    r = s**5  # r^1.6 is smooth in s
    modes = basis.modes(r, 4)
    gram = modes.T @ (modes * (0.5 * weights * 5.0 * s**4 * r)[:, None])
    scale = np.sqrt(basis.norms(4))
    np.testing.assert_allclose(gram / np.outer(scale, scale), np.eye(4), atol=1e-12)


def test_expand_to_a_closed_form():
    j = bessel_zeros(0.0, 6)
    series = expand(lambda r: 1.0 - r**2, FourierBessel(), terms=6)
    np.testing.assert_allclose(series.coefficients, 8.0 / (j**3 * bessel_j(1.0, j)), rtol=1e-13)  # Watson 18.1
    assert series.norm() == pytest.approx(np.sqrt(1.0 / 6.0), rel=1e-4)
    error = series.error_estimate()
    true = np.sqrt(1.0 / 6.0 - np.sum(series.orthonormal**2))
    assert true <= error.l2 * (1.0 + 1e-9)
    assert error.l2 <= 3.0 * true
    assert int(series.terms_for(0.2)) <= 2
    found = series.partial_sum(np.array([0.2, 0.9]), terms=3)
    assert np.all(np.abs(found.values - (1.0 - np.array([0.2, 0.9]) ** 2)) <= found.error)


def test_a_table_and_its_cross_check():
    r = np.linspace(0.0, 2.0, 5)
    basis = Dini(0.0, 2.0, robin=1.0)
    table = RadialTable(r, np.exp(-r))
    series = expand(table, basis, terms=3)
    check = crosscheck(series, table)
    assert check.all_agree
    assert not crosscheck(Expansion(basis, series.coefficients * (1.0 + 1e-10)), table).agrees.any()


def test_growing_mode_derivative_integral_laplacian():
    basis = Dini(1.0, robin=-3.0)
    series = Expansion(basis, [1.0, -0.5, 0.25])
    r, h = 0.4, 1e-5
    slope = (series(r + h) - series(r - h)) / (2.0 * h)
    assert series.derivative(r) == pytest.approx(slope, rel=1e-8)
    nodes, weights = np.polynomial.legendre.leggauss(30)
    r = 0.5 * (nodes + 1.0)
    assert series.integral() == pytest.approx(0.5 * np.sum(weights * series(r) * r), rel=1e-13)
    np.testing.assert_allclose(series.laplacian().coefficients, -basis.eigenvalues(3) * series.coefficients)


def test_modes_in_time():
    basis = Dini(robin=-1.0)
    mu, root = 1.6082794717268792669, 3.56794936120787752
    ones = Expansion(basis, [1.0, 1.0])
    later = evolve(ones, Diffusion(0.5), [0.0, 2.0]).expansion.coefficients
    np.testing.assert_allclose(later[1], np.exp([mu**2, -(root**2)]), rtol=1e-13)
    wave = evolve(ones, Wave(2.0, damping=1.0), 0.7, velocity=ones)
    slow, fast = -0.5 + np.sqrt(0.25 + 4.0 * mu**2), -0.5 - np.sqrt(0.25 + 4.0 * mu**2)
    grown = ((1.0 - fast) * np.exp(0.7 * slow) - (1.0 - slow) * np.exp(0.7 * fast)) / (slow - fast)
    omega = np.sqrt(4.0 * root**2 - 0.25)
    swung = np.exp(-0.35) * (np.cos(0.7 * omega) + 1.5 * np.sin(0.7 * omega) / omega)
    np.testing.assert_allclose(wave.expansion.coefficients, [grown, swung], rtol=1e-12)
    far = 2.0**55
    with mpmath.workdps(60):
        zero = mpmath.besseljzero(0, 1)
        phase = complex(mpmath.exp(-0.5j * zero**2 * far))
        turned = float(mpmath.cos(zero * far))
    one = Expansion(FourierBessel(), [1.0])
    assert abs(evolve(one, Paraxial(1.0), far).expansion.coefficients[0] - phase) < 1e-6  # the root is good to 1e-24
    assert abs(evolve(one, Wave(1.0), far).expansion.coefficients[0] - turned) < 1e-6


def test_ascending_series():
    found = ascending_series(0.3, 1.5, 12)
    assert abs(found.values - float(mpmath.besselj(0.3, 1.5))) <= found.error
