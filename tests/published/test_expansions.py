"""Expansions with published or separately computed values, the source beside each."""

from __future__ import annotations

import math

import mpmath as mp
import numpy as np
import pytest
from scipy.special import j0, jv, sici

from fbexpand.analysis import expand
from fbexpand.bases import Dini, FourierBessel

# Çengel, Heat Transfer, one-term table, column of the cylinder: lambda_1 and A_1 of f = 1, four digits.
# The table prints the root of Bi = 2 as 1.5995 for 1.599449: rounded twice, it seems.
ONE_TERM = {0.01: 1.0025, 0.1: 1.0246, 0.5: 1.1143, 1.0: 1.2071, 2.0: 1.3384, 5.0: 1.5029, 10.0: 1.5677}

# f = 1, f(R) = 0, order 0: 2 / (j_k J_1(j_k)), computed with 25 digits or more
CONSTANT = (1.60197469693, -1.06479925842, 0.851399192337, -0.729645239818)
# the same as a textbook prints them, off by up to 2e-4
CONSTANT_PRINTED = (1.6020, -1.0647, 0.8512, -0.7295)

# A disk at 1 whose rim is held at 0, at four Fourier numbers: terms before the next |c_k exp(-lambda_k^2 Fo)|
# is below 1e-10, and terms for an error on the axis below 1e-10 (computed twice)
DISK = {0.2: (3, 3), 1e-2: (15, 15), 1e-3: (46, 46), 1e-4: (145, 143), 1e-5: (453, 446)}


def one(r):
    return 1.0


@pytest.mark.parametrize("biot", sorted(ONE_TERM))
def test_first_coefficient_of_the_convective_rim(biot):
    found = expand(one, Dini(robin=biot), terms=1).coefficients[0]
    assert abs(found - ONE_TERM[biot]) <= 0.5001e-4


def test_first_coefficients_computed():
    for biot, value in ((1.0, 1.20709205839185988), (100.0, 1.60152387405746796)):
        assert expand(one, Dini(robin=biot), terms=1).coefficients[0] == pytest.approx(value, rel=2e-15)


def test_constant():
    found = expand(one, FourierBessel(), terms=4).coefficients
    np.testing.assert_allclose(found, CONSTANT, rtol=0, atol=0.51e-11)
    np.testing.assert_allclose(found, CONSTANT_PRINTED, rtol=0, atol=2e-4)
    with mp.workdps(25):
        for k in range(4):
            zero = mp.besseljzero(0, k + 1)
            assert abs(found[k] - float(2 / (zero * mp.besselj(1, zero)))) <= 2e-15


@pytest.mark.parametrize("order", [0.0, 0.5, 1.0, 2.25, 7.0])
def test_power_of_the_order(order):
    """DLMF 10.23.21: x^nu = sum 2 J_nu(j_k x) / (j_k J_{nu+1}(j_k)) for 0 <= x < 1."""
    series = expand(lambda r: r**order, FourierBessel(order), terms=40)
    with mp.workdps(25):
        for k in (1, 2, 17, 40):
            zero = mp.mpf(float(series.basis.roots(1, k)[0]))
            zero -= mp.besselj(order, zero) / mp.besselj(order, zero, derivative=1)
            exact = float(2 / (zero * mp.besselj(order + 1, zero)))
            assert series.coefficients[k - 1] == pytest.approx(exact, rel=0, abs=2e-14)
    # at x = 1 the series is 0 while the function is 1
    assert series(1.0) == 0.0
    assert series(0.5) == pytest.approx(0.5**order, abs=0.1)


def test_integral_of_the_mode():
    """integral_0^1 r J_0(j_k r) dr = J_1(j_k) / j_k to k = 10^4.

    scipy.integrate.quad with default settings (SciPy 1.17) goes wrong from k of about 270 on.
    """
    basis = FourierBessel()
    found = expand(one, basis, terms=10_000).coefficients * basis.norms(10_000)
    for k in (1, 269, 270, 1000, 10_000):
        with mp.workdps(25):
            zero = mp.mpf(float(basis.roots(1, k)[0]))
            zero += mp.besselj(0, zero) / mp.besselj(1, zero)
            exact = float(mp.besselj(1, zero) / zero)
        assert abs(found[k - 1] - exact) <= 1e-16 + 1e-11 * abs(exact)


def test_order_one_half_is_the_sine_series():
    """Stempak, ETNA 14 (2002): sqrt(r) f(r) in sines, J_{1/2}(x) = sqrt(2 / (pi x)) sin x."""
    series = expand(lambda r: np.sqrt(r) * (1.0 - r), FourierBessel(0.5), terms=30)
    k = np.arange(1, 31)
    # r (1 - r) = sum b_k sin(k pi r), b_k = 8 / (k pi)^3 for odd k
    b = np.where(k % 2 == 1, 8.0 / (k * np.pi) ** 3, 0.0)
    np.testing.assert_allclose(series.coefficients, b * np.sqrt(k * np.pi**2 / 2), rtol=0, atol=2e-14)


def test_decay():
    """Order 0, f(R) = 0: f = 1 falls as k^(-1/2), 1 - r^2 as k^(-5/2)."""
    for profile, power in ((one, 0.5), (lambda r: 1.0 - r * r, 2.5)):
        c = np.abs(expand(profile, FourierBessel(), terms=4000).coefficients)
        assert math.log(c[399] / c[3999]) / math.log(10) == pytest.approx(power, abs=1e-3)


def test_overshoot():
    """Wilbraham and Gibbs: near the rim the sum overshoots to 2 Si(pi) / pi = 1.17898, at N (1 - r) about 1."""
    limit = 2.0 * sici(np.pi)[0] / np.pi
    assert limit == pytest.approx(1.17898, abs=5e-6)
    terms = 1000
    series = expand(one, FourierBessel(), terms=terms)
    distance = np.linspace(0.2, 3.0, 281)
    values = series(1.0 - distance / terms)
    assert values.max() == pytest.approx(limit, rel=2e-3)
    assert distance[values.argmax()] == pytest.approx(1.0, abs=0.05)


@pytest.mark.parametrize("fourier", sorted(DISK))
def test_terms_of_a_cooling_disk(fourier):
    terms, on_axis = DISK[fourier]
    basis = FourierBessel()
    series = expand(one, basis, terms=600)
    left = series.coefficients * np.exp(-basis.eigenvalues(600) * fourier)
    assert np.flatnonzero(np.abs(left) < 1e-10)[0] == terms
    tail = np.abs(np.cumsum(left[::-1])[::-1])  # on the axis every mode is 1
    assert np.flatnonzero(tail > 1e-10)[-1] + 1 == on_axis


def test_lommel():
    """J_nu(b r) for b between the roots, by Lommel's integral (Watson 5.11) with SciPy's functions."""
    b, basis = 4.0, Dini(robin=1.0)
    series = expand(lambda r: j0(b * r), basis, terms=10)
    roots = basis.roots(10)
    exact = (roots * j0(b) * jv(1, roots) - b * jv(1, b) * j0(roots)) / (roots**2 - b * b) / basis.norms(10)
    np.testing.assert_allclose(series.coefficients, exact, rtol=0, atol=1e-14)
