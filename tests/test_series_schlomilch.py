"""Schlömilch series: against ball arithmetic in eps of sum |a_n| m(n x), null functions, closed sums, bad input."""

from __future__ import annotations

import math

import numpy as np
import pytest
from flint import arb, ctx
from reference.make_bessel import EPS, difference
from scipy.special import gamma

from fbexpand.exceptions import ArgumentTypeError, ArgumentValueError
from fbexpand.special.bessel import bessel_j
from fbexpand.special.series.schlomilch import schlomilch_series


def exact_sum(order, coefficients, x):
    """Return sum a_n J_order(n x) and the sum of |a_n| m(n x)."""
    total, size = 0, 0.0
    ctx.prec = 400
    nu = arb(order)
    for n, a in enumerate(coefficients, start=1):
        z = arb(x) * n
        j = z.bessel_j(nu)
        assert j.rel_accuracy_bits() > 90
        total = total + j * float(a)
        y = float(z.bessel_y(nu).mid()) if n * x >= order else 0.0
        size += abs(a) * math.hypot(float(j.mid()), y)
    ctx.prec = 53
    return total, size


def sweep(points, seed):
    rng = np.random.default_rng(seed)
    print("\n order terms    x up to     error, eps of sum |a_n| m")
    for order, terms, high in ((0.0, 5, 3.0), (0.0, 700, 3.0), (0.3, 300, 1e5), (2.0, 600, 0.1), (30.4, 300, 6.0)):
        a = rng.standard_normal(terms)
        x = rng.uniform(0.0, high, points)
        worst = 0.0
        for point, value in zip(x, schlomilch_series(a, x, order=order), strict=True):
            exact, size = exact_sum(order, a, point)
            worst = max(worst, difference(value, exact) / size / EPS)
        print(f"{order:6g} {terms:5d} {high:10g} {worst:10.2f}")
        assert worst <= 1.5


def test_error_against_ball_arithmetic():
    sweep(2, seed=1)


@pytest.mark.deep
def test_error_against_ball_arithmetic_deep():
    sweep(60, seed=2)


def filtered(terms):
    """Return a factor that falls smoothly, all its derivatives with it, from 1 to 0 over n = 1 ... terms."""
    s = np.arange(1, terms + 1) / (terms + 1.0)
    rest = np.clip((s - 0.1) / 0.9, 0.0, 1.0)
    with np.errstate(over="ignore", divide="ignore"):
        return 1.0 / (1.0 + np.exp(1.0 / (1.0 - rest) - 1.0 / np.where(rest > 0.0, rest, 1e-300)))


@pytest.mark.parametrize("order", [0.0, 0.5, 1.0, 2.5])
def test_alternating_sums_are_null_functions(order):
    """Watson 19.41: 1 / (2 Gamma(nu + 1)) + sum (-1)^n J_nu(n x) / (n x / 2)^nu = 0 inside (0, pi)."""
    x = np.linspace(0.3, 2.8, 40)
    n = np.arange(1, 4001)
    a = (-1.0) ** n * n**-order * filtered(4000)
    values = schlomilch_series(a, x, order=order) / (x / 2.0) ** order
    assert np.abs(values + 0.5 / gamma(order + 1.0)).max() < 1e-10


def test_unfiltered_sum_and_its_remainder():
    x = np.linspace(0.3, 2.8, 40)
    for terms in (200, 201, 3200):
        a = (-1.0) ** np.arange(1, terms + 1)
        rest = schlomilch_series(a, x) + 0.5
        leading = (-1) ** terms * bessel_j(0, (terms + 0.5) * x) / (2.0 * np.cos(x / 2.0))
        assert np.abs(rest - leading).max() < 10.0 * terms**-1.5
        assert np.abs(rest).max() > 50.0 * np.abs(rest - leading).max()


def test_beyond_pi_the_null_function_is_not_null():
    """Watson 19.42: for pi < x < 3 pi the filtered sum is -1/2 + 2 / sqrt(x^2 - pi^2)."""
    x = np.linspace(3.6, 9.0, 20)
    n = np.arange(1, 4001)
    values = schlomilch_series((-1.0) ** n * filtered(4000), x)
    np.testing.assert_allclose(values, -0.5 + 2.0 / np.sqrt(x * x - math.pi**2), atol=1e-10)


def test_closed_sums():
    """x^2 / 8 = pi^2 / 12 + sum (-1)^n J_0(n x) / n^2; and |x| by odd n, x from -pi to pi."""
    n = np.arange(1, 30_001)
    x = np.linspace(-math.pi, math.pi, 41)
    smooth = schlomilch_series((-1.0) ** n / n**2.0, x, constant=math.pi**2 / 12.0)
    assert np.abs(smooth - x * x / 8.0).max() < 1.1 / n[-1]
    inner = np.abs(x) < 2.5
    assert np.abs(smooth - x * x / 8.0)[inner].max() < 1e-9
    a = np.where(n % 2 == 1, -2.0 / n**2.0, 0.0)
    assert np.abs(schlomilch_series(a, x, constant=math.pi**2 / 4.0) - np.abs(x))[(np.abs(x) > 0.3)].max() < 1e-6


def test_phase_of_huge_arguments():
    value = schlomilch_series(np.ones(3), 1e15 / 7.0, order=0.25)
    exact, size = exact_sum(0.25, np.ones(3), 1e15 / 7.0)
    assert difference(value, exact) <= 2.0 * EPS * size


def test_parity_batches_and_complex_coefficients():
    rng = np.random.default_rng(5)
    a = rng.standard_normal((2, 3, 60)) + 1j * rng.standard_normal((2, 3, 60))
    constant = rng.standard_normal((2, 3)) * 1j
    x = rng.uniform(0.0, 9.0, (4, 5))
    values = schlomilch_series(a, x, order=1, constant=constant)
    assert values.shape == (2, 3, 4, 5)
    for i in np.ndindex(2, 3):
        plain = schlomilch_series(a[i].real, x, order=1) + 1j * schlomilch_series(a[i].imag, x, order=1)
        assert np.array_equal(values[i], plain + constant[i])
    assert np.array_equal(schlomilch_series(a, -x, order=1), -schlomilch_series(a, x, order=1))
    assert np.array_equal(schlomilch_series(a, -x, order=2), schlomilch_series(a, x, order=2))
    assert schlomilch_series(a, 0.5, constant=1.0).shape == (2, 3)
    assert isinstance(schlomilch_series([1.0, 2.0], 1.0), np.float64)
    assert schlomilch_series(a, np.zeros((0, 2))).shape == (2, 3, 0, 2)


def test_terms_in_blocks():
    """The kernel takes 512 terms at a time: one term at a time agrees."""
    rng = np.random.default_rng(6)
    a = rng.standard_normal(1300)
    single = sum(a[n - 1] * bessel_j(0.3, n * 0.5) for n in range(1, 1301))
    assert abs(schlomilch_series(a, 0.5, order=0.3) - single) < 1e-14


def test_edges():
    assert np.array_equal(
        schlomilch_series([1.0, 2.0], [0.0, -0.0, np.inf, np.nan], constant=3.0), [6, 6, 3, np.nan], True
    )
    assert schlomilch_series([1.0, 2.0], 0.0, order=0.5) == 0.0
    assert abs(schlomilch_series(np.ones(30), 1e308)) < 1e-150


@pytest.mark.parametrize(
    ("coefficients", "x", "options", "name"),
    [
        ([], 1.0, {}, "coefficients"),
        ([np.inf], 1.0, {}, "coefficients"),
        ([1.0], -1.0, {"order": 0.5}, "x"),
        ([1.0], 1.0, {"order": -1.0}, "order"),
        ([1.0], 1.0, {"constant": np.nan}, "constant"),
        ([1.0], 1.0, {"constant": [1.0, 2.0]}, "constant"),
    ],
)
def test_bad_values(coefficients, x, options, name):
    with pytest.raises(ArgumentValueError, match=f"'{name}'"):
        schlomilch_series(coefficients, x, **options)


def test_bad_types():
    with pytest.raises(ArgumentTypeError, match="'constant'"):
        schlomilch_series([1.0], 1.0, constant="1")
    with pytest.raises(ArgumentTypeError, match="'x'"):
        schlomilch_series([1.0], 1j)
