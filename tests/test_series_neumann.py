"""Neumann series: against ball arithmetic in eps of sum |a_n J_n|, classical expansions, edges, bad input."""

from __future__ import annotations

import math

import numpy as np
import pytest
from flint import ctx
from reference.make_bessel import EPS, ball, difference
from scipy.special import gammaln

from fbexpand.exceptions import ArgumentTypeError, ArgumentValueError
from fbexpand.special.bessel import bessel_j
from fbexpand.special.sequence import bessel_j_sequence
from fbexpand.special.series.neumann import neumann_series

# order, terms, x from, x to
CASES = [
    (0.0, 20, 0.0, 20.0),
    (0.0, 140, 0.0, 60.0),
    (0.1, 5, 0.0, 2.0),
    (0.3, 300, 0.0, 3.0),
    (7.3, 200, 0.0, 220.0),
    (33.3, 3000, 0.0, 10.0),
    (63.9, 20, 20.0, 125.0),
    (0.0, 31, 1e3, 1e6),
]


def exact_sum(order, coefficients, x):
    """Return sum a_n J_{order+n}(x) and the sum of |a_n| m_n, terms from where J is below 2^-1200 left out."""
    total, size = 0, 0.0
    for n, a in enumerate(coefficients):
        if order + n > max(400.0, 2.0 * x):
            break
        j = ball(order, x, shift=n, bits=80)
        y = 0.0 if order + n > x else float(ball(order, x, shift=n, bits=30, kind="y").mid())
        ctx.prec = 300
        total = total + j * float(a)
        ctx.prec = 53
        size += abs(a) * math.hypot(float(j.mid()), y)
    return total, size


def sweep(points, seed):
    rng = np.random.default_rng(seed)
    print("\n order terms      x            error, eps of sum |a_n| m_n")
    for order, terms, low, high in CASES:
        x = rng.uniform(low, high, points)
        a = rng.standard_normal(terms)
        values = neumann_series(a, x, order=order)
        worst = 0.0
        for point, value in zip(x, values, strict=True):
            exact, size = exact_sum(order, a, point)
            worst = max(worst, difference(value, exact) / size / EPS)
        print(f"{order:6g} {terms:5d} {low:6g}..{high:<8g} {worst:10.2f}")
        assert worst <= 1.5


def test_error_against_ball_arithmetic():
    sweep(2, seed=1)


@pytest.mark.deep
def test_error_against_ball_arithmetic_deep():
    sweep(40, seed=2)


def test_jacobi_anger():
    """DLMF 10.12.1 to 10.12.3 with 140 terms to x = 60."""
    x = np.linspace(-60.0, 60.0, 401)
    n = np.arange(140)
    twice = np.where(n == 0, 1.0, 2.0)
    for angle in (0.0, 0.3, 1.0, math.pi / 2, 2.5, math.pi):
        wave = neumann_series(twice * 1j**n * np.cos(n * angle), x)
        assert np.abs(wave - np.exp(1j * x * math.cos(angle))).max() < 2e-13
        even = neumann_series(np.where(n % 2 == 0, twice * np.cos(n * angle), 0.0), x)
        assert np.abs(even - np.cos(x * math.sin(angle))).max() < 2e-13
        odd = neumann_series(np.where(n % 2 == 1, 2.0 * np.sin(n * angle), 0.0), x)
        assert np.abs(odd - np.sin(x * math.sin(angle))).max() < 2e-13


def test_handbook_sums():
    """Abramowitz & Stegun 9.1.46 to 9.1.48: 1, cos z and sin z."""
    x = np.linspace(0.0, 40.0, 200)
    n = np.arange(120)
    twice = np.where(n == 0, 1.0, 2.0)
    even = np.where(n % 2 == 0, twice, 0.0)
    assert np.abs(neumann_series(even, x) - 1.0).max() < 2e-14
    assert np.abs(neumann_series(even * np.where(n % 4 == 0, 1.0, -1.0), x) - np.cos(x)).max() < 2e-14
    sine = np.where(n % 2 == 1, 2.0, 0.0) * np.where(n % 4 == 1, 1.0, -1.0)
    assert np.abs(neumann_series(sine, x) - np.sin(x)).max() < 2e-14


@pytest.mark.parametrize("order", [0.25, 0.5, 1.0, 2.7, 10.3])
def test_powers_at_real_order(order):
    """DLMF 10.23.15: (x/2)^nu = sum_k (nu + 2k) Gamma(nu + k) / k! J_{nu+2k}(x)."""
    k = np.arange(80)
    a = np.zeros(160)
    a[::2] = (order + 2 * k) * np.exp(gammaln(order + k) - gammaln(k + 1.0))
    x = np.linspace(0.01, 20.0, 100)
    values = neumann_series(a, x, order=order)
    allowed = np.abs(a) @ np.abs(bessel_j_sequence(order, 160, x)).T
    assert (np.abs(values - (x / 2) ** order) / np.maximum((x / 2) ** order, EPS * 20 * allowed)).max() < 5e-12


def test_addition_theorem():
    """DLMF 10.23.2 with integer order 0 and 10.23.3: sum over squares is one."""
    n = np.arange(90)
    for u in (0.7, 11.0):
        j = bessel_j_sequence(0.0, 90, u)
        x = np.linspace(0.0, 30.0, 50)
        twice = np.where(n == 0, 1.0, 2.0)
        minus = neumann_series(twice * j, x)
        plus = neumann_series(twice * j * (-1.0) ** n, x)
        assert np.abs(minus - bessel_j(0, x - u)).max() < 2e-14
        assert np.abs(plus - bessel_j(0, x + u)).max() < 2e-14
        assert abs(neumann_series(twice * j, u) - 1.0) < 1e-14


def test_growing_coefficients_beyond_the_range_of_j():
    """1/(1 - x) has coefficients of about 2^n n!; near its pole terms count where J itself is below 1e-308."""
    terms = 150
    a = np.array([2.0**n * math.gamma(n + 1.0) for n in range(terms)])
    x = np.array([1e-9, 0.3, 0.9, 0.99])
    for point, value in zip(x, neumann_series(a, x), strict=True):
        exact, size = exact_sum(0.0, a, point)
        assert difference(value, exact) <= 2.0 * EPS * size
    big = neumann_series(np.array([0.0] * 170 + [1e308]), np.array([1.0, 50.0]))
    assert np.isfinite(big).all()
    assert difference(big[1], ball(0.0, 50.0, shift=170) * 1e308) <= 2 * EPS * big[1]


def test_huge_coefficients_do_not_overflow():
    value = neumann_series([1e308, -1e308, 1e308], np.array([5.0, 1e5]))
    assert np.allclose(value / 1e308, neumann_series([1.0, -1.0, 1.0], [5.0, 1e5]), rtol=1e-14)


@pytest.mark.parametrize("order", [0.0, 1.0, 2.0, 0.4, 1.5, 30.2])
@pytest.mark.parametrize("derivative", [1, 2, 3, 4])
def test_derivatives(order, derivative):
    rng = np.random.default_rng(4)
    a = rng.standard_normal(30)
    low = -40.0 if order % 1 == 0 else 0.5
    x = rng.uniform(low, 40.0, 50)
    values = neumann_series(a, x, order=order, derivative=derivative)
    terms = [bessel_j(order + n, x, derivative=derivative) for n in range(30)]
    assert np.abs(values - a @ np.array(terms)).max() < 1e-13 * np.abs(a).sum()


def test_derivatives_at_the_axis():
    assert neumann_series([1.0, 2.0, 3.0], 0.0, derivative=1) == 1.0  # 2 J_1'(0)
    assert neumann_series([1.0, 2.0, 3.0, 1.0], 0.0, derivative=2) == pytest.approx(-0.5 + 3.0 / 4.0)
    assert neumann_series([1.0], 0.0, order=0.3, derivative=1) == np.inf
    assert neumann_series([1.0, 1.0], 0.0, order=0.3, derivative=2) == -np.inf
    assert neumann_series([0.0, 1.0], 0.0, order=0.3, derivative=2) == np.inf
    assert neumann_series([0.0, 0.0, 1.0], 0.0, order=0.3, derivative=1) == 0.0


def test_batches_and_complex_coefficients():
    rng = np.random.default_rng(5)
    a = rng.standard_normal((2, 3, 40)) + 1j * rng.standard_normal((2, 3, 40))
    x = rng.uniform(-30.0, 30.0, (4, 5))
    values = neumann_series(a, x, order=2)
    assert values.shape == (2, 3, 4, 5)
    assert values.dtype == np.complex128
    for i in np.ndindex(2, 3):
        assert np.array_equal(values[i].real, neumann_series(a[i].real, x, order=2))
        assert np.array_equal(values[i].imag, neumann_series(a[i].imag, x, order=2))
    assert neumann_series(a, 1.0).shape == (2, 3)
    assert isinstance(neumann_series([1.0, 2.0], 1.0), np.float64)
    assert neumann_series(a, np.zeros((0, 2))).shape == (2, 3, 0, 2)
    assert neumann_series(np.zeros((0, 3)), [1.0, 2.0]).shape == (0, 2)
    assert neumann_series(np.array([1, 2], dtype=np.int32), np.float32(0.0)) == 1.0


def test_a_value_depends_on_its_own_point_only():
    rng = np.random.default_rng(6)
    a = rng.standard_normal(100)
    x = rng.uniform(0.0, 200.0, 300)
    together = neumann_series(a, x, order=0.7)
    alone = np.array([neumann_series(a, x[i : i + 9], order=0.7)[0] for i in range(0, 290, 10)])
    assert np.array_equal(alone, together[0:290:10])


def test_edges():
    assert np.array_equal(neumann_series([3.0, 1.0], [0.0, -0.0, np.inf, -np.inf, np.nan]), [3, 3, 0, 0, np.nan], True)
    assert neumann_series([1.0, 1.0], 0.0, order=0.5) == 0.0
    tiny = np.array([1e-300, 1e-20, 2.0**-31])
    assert np.allclose(neumann_series([0.0, 1.0, 1.0], tiny), tiny / 2, rtol=1e-9)
    assert neumann_series([1.0, 1.0], 1e300) == pytest.approx(bessel_j(0, 1e300) + bessel_j(1, 1e300), abs=1e-165)


@pytest.mark.parametrize(
    ("coefficients", "x", "order", "name"),
    [
        ([], 1.0, 0, "coefficients"),
        (1.0, 1.0, 0, "coefficients"),
        ([1.0, np.nan], 1.0, 0, "coefficients"),
        ([1.0, np.inf], 1.0, 0, "coefficients"),
        ([1.0], -1.0, 0.5, "x"),
        ([1.0], 1.0, -1, "order"),
        ([1.0], 1.0, np.nan, "order"),
        ([1.0], 1.0, 2e6, "order"),
    ],
)
def test_bad_values(coefficients, x, order, name):
    with pytest.raises(ArgumentValueError, match=f"'{name}'"):
        neumann_series(coefficients, x, order=order)


def test_bad_types():
    with pytest.raises(ArgumentTypeError, match="'x'"):
        neumann_series([1.0], 1j)
    with pytest.raises(ArgumentTypeError, match="'coefficients'"):
        neumann_series("ab", 1.0)
    with pytest.raises(ArgumentTypeError, match="'derivative'"):
        neumann_series([1.0], 1.0, derivative=1.0)
    with pytest.raises(ArgumentValueError, match="'derivative'"):
        neumann_series([1.0], 1.0, derivative=5)
