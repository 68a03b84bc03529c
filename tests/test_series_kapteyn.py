"""Kapteyn series: against ball arithmetic in eps of sum |a_n J_n|, Kepler's equation, closed sums, edges, bad input."""

from __future__ import annotations

import math

import numpy as np
import pytest
from flint import arb, ctx
from reference.make_bessel import EPS, difference
from scipy.special import gammaln

from fbexpand.exceptions import ArgumentTypeError, ArgumentValueError
from fbexpand.special.bessel import bessel_j
from fbexpand.special.series.kapteyn import kapteyn_series


def exact_j(order, n, t):
    """Return a ball about J_m(m t), m = order + n exactly, of relative radius below 2^-80."""
    precision = 200
    try:
        while precision < 100_000:
            ctx.prec = precision
            m = arb(order) + n
            value = (m * arb(t)).bessel_j(m)
            if value.rel_accuracy_bits() >= 80:
                return value
            precision *= 2
    finally:
        ctx.prec = 53
    raise ArithmeticError(f"no 80 bits of order {order!r} + {n} at {t!r}")


def one_term(order, n, t, scale=1.0):
    coefficients = np.zeros(n)
    coefficients[-1] = scale
    return kapteyn_series(coefficients, t, order=order)


def check_terms(cases, rng, points):
    print("\n order     n   largest relative error of J, eps, over t")
    near = 1.0 - np.concatenate([[0.0, 2.0**-53], 10.0 ** rng.uniform(-12, -1, points)])
    for order, n in cases:
        t = np.concatenate([near, rng.uniform(0.05, 1.0, points)])
        worst = 0.0
        for point, value in zip(t, one_term(order, n, t), strict=True):
            exact = exact_j(order, n, point)
            size = abs(float(exact.mid()))
            if size > 1e-290:
                worst = max(worst, difference(value, exact) / size / EPS)
            else:
                assert difference(value, exact) <= 1e-300
        print(f"{order:6g} {n:6d} {worst:10.2f}")
        assert worst <= 3.0


def test_every_term_against_ball_arithmetic():
    cases = [(0.0, 1), (0.3, 2), (0.0, 13), (0.7, 19), (0.0, 20), (3.3, 18), (0.1, 60), (0.0, 700), (41.9, 2500)]
    check_terms(cases, np.random.default_rng(1), 4)


@pytest.mark.deep
def test_every_term_against_ball_arithmetic_deep():
    rng = np.random.default_rng(2)
    orders = [0.0, 0.3, 17.1, 260.7]
    check_terms([(o, int(n)) for o in orders for n in np.unique(np.geomspace(1, 5000, 30).astype(int))], rng, 20)


def test_sum_against_ball_arithmetic():
    rng = np.random.default_rng(3)
    a = rng.standard_normal(300)
    for order, t in ((0.0, 1.0), (0.0, 0.97), (2.6, 0.8), (0.4, 0.2)):
        total, size = 0, 0.0
        for n in range(1, 301):
            j = exact_j(order, n, t)
            ctx.prec = 300
            total = total + j * a[n - 1]
            ctx.prec = 53
            size += abs(a[n - 1] * float(j.mid()))
        assert difference(kapteyn_series(a, t, order=order), total) <= 2.0 * EPS * size


def newton(mean, eccentricity):
    anomaly = mean + eccentricity * np.sin(mean)
    for _ in range(60):
        slope = 1.0 - eccentricity * np.cos(anomaly)
        anomaly = anomaly - (anomaly - eccentricity * np.sin(anomaly) - mean) / slope
    return anomaly


@pytest.mark.parametrize(
    ("eccentricity", "terms", "allowed"),
    [(0.0, 5, 1e-15), (0.1, 60, 2e-13), (0.3, 100, 2e-13), (0.6, 300, 2e-13), (0.9, 3000, 1e-12)],
)
def test_kepler(eccentricity, terms, allowed):
    """E = M + sum (2/n) J_n(n e) sin(n M): Watson 17.21, against Newton's method."""
    mean = np.linspace(0.0, math.pi, 80)
    n = np.arange(1, terms + 1)
    anomaly = mean + kapteyn_series(2.0 / n * np.sin(n * mean[:, None]), eccentricity)
    assert np.abs(anomaly - newton(mean, eccentricity)).max() < allowed


def test_closed_sums():
    """Watson 17.2 and 17.23: 1/(1-t), even orders alone, and t/2, t^2/2 from squares of 1/n."""
    t = np.array([0.0, 1e-300, 1e-9, 0.1, 0.5, 0.8, 0.9])
    n = np.arange(1, 2001)
    ones = np.ones(2000)
    np.testing.assert_allclose(kapteyn_series(ones, t), t / (2.0 * (1.0 - t)), rtol=1e-14)
    even = np.where(n % 2 == 0, 1.0, 0.0)
    np.testing.assert_allclose(kapteyn_series(even, t), t * t / (2.0 * (1.0 - t * t)), rtol=1e-14)
    np.testing.assert_allclose(kapteyn_series((1 - even) / n**2, t), t / 2.0, rtol=1e-14)
    np.testing.assert_allclose(kapteyn_series(even * 4 / n**2, t), t * t / 2.0, rtol=1e-14)


@pytest.mark.parametrize("power", [1.0, 1.3, 2.5, 7.7])
def test_powers(power):
    """Watson 17.5: (t/2)^nu = nu^2 sum_m Gamma(nu + m) / (m! (nu + 2m)^(nu + 1)) J_{nu+2m}((nu + 2m) t)."""
    m = np.arange(600)
    a = np.zeros(1199)
    a[::2] = power**2 * np.exp(gammaln(power + m) - gammaln(m + 1.0) - (power + 1.0) * np.log(power + 2.0 * m))
    t = np.linspace(0.05, 0.85, 20)
    np.testing.assert_allclose(kapteyn_series(a, t, order=power - 1.0), (t / 2.0) ** power, rtol=5e-12)


def test_where_the_expansions_take_over():
    """Order 20 is the first of the expansions: they agree with bessel_j on both sides."""
    t = np.linspace(0.0, 1.0, 301)
    for order, n in ((0.0, 19), (0.0, 20), (0.0, 21), (19.5, 1), (18.5, 1)):
        m = order + n
        values, expected = one_term(order, n, t), bessel_j(m, m * t)
        assert np.abs(values - expected).max() <= 1e-14 * np.abs(expected).max()
        inner = t > 0.1
        np.testing.assert_allclose(values[inner], expected[inner], rtol=1e-12)  # m t is rounded in `expected`


def test_terms_count_where_j_itself_underflows():
    """J_2000(600) is 3e-609."""
    n, t = 2000, 0.3
    value = one_term(0.0, n, t, scale=1e300)
    assert value == 0.0  # the product is below 1e-308 too
    n, t = 900, 0.3
    exact = exact_j(0.0, n, t)
    assert abs(float(exact.mid())) < 1e-305
    ctx.prec = 300
    exact = exact * arb(1e300)
    value = one_term(0.0, n, t, scale=1e300)
    assert difference(value, exact) <= 3 * EPS * abs(value)


def test_batches_and_complex_coefficients():
    rng = np.random.default_rng(5)
    a = rng.standard_normal((2, 3, 60)) + 1j * rng.standard_normal((2, 3, 60))
    t = rng.uniform(0.0, 1.0, (4, 5))
    values = kapteyn_series(a, t, order=1.25)
    assert values.shape == (2, 3, 4, 5)
    for i in np.ndindex(2, 3):
        assert np.array_equal(values[i].real, kapteyn_series(a[i].real, t, order=1.25))
        assert np.array_equal(values[i].imag, kapteyn_series(a[i].imag, t, order=1.25))
    assert kapteyn_series(a, 0.5).shape == (2, 3)
    assert isinstance(kapteyn_series([1.0, 2.0], 1.0), np.float64)
    assert kapteyn_series(a, np.zeros((0, 2))).shape == (2, 3, 0, 2)
    assert kapteyn_series(np.zeros((0, 30)), [0.1, 0.2]).shape == (0, 2)


def test_edges():
    assert np.array_equal(kapteyn_series(np.ones(50), [0.0, -0.0]), [0.0, 0.0])
    assert kapteyn_series([0.0, 1.0], 1e-300) == 0.0
    assert kapteyn_series([1.0], 1e-300) == pytest.approx(5e-301, rel=1e-15)
    assert np.isfinite(kapteyn_series(np.full(100, 1e307), [1e-5, 0.5])).all()


@pytest.mark.parametrize(
    ("coefficients", "t", "order", "name"),
    [
        ([], 0.5, 0, "coefficients"),
        ([1.0, np.nan], 0.5, 0, "coefficients"),
        ([1.0], -1e-300, 0, "t"),
        ([1.0], math.nextafter(1.0, 2.0), 0, "t"),
        ([1.0], [0.5, np.nan], 0, "t"),
        ([1.0], 0.5, -0.5, "order"),
    ],
)
def test_bad_values(coefficients, t, order, name):
    with pytest.raises(ArgumentValueError, match=f"'{name}'"):
        kapteyn_series(coefficients, t, order=order)


def test_bad_types():
    with pytest.raises(ArgumentTypeError, match="'t'"):
        kapteyn_series([1.0], 0.5j)
    with pytest.raises(ArgumentTypeError, match="'order'"):
        kapteyn_series([1.0], 0.5, order="1")
