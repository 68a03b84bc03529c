"""Scaled modified Bessel functions and the scaled first mode against ball arithmetic."""

from __future__ import annotations

import mpmath as mp
import numpy as np
import pytest
from basis_references import EPS, cylinder

from fbexpand.special.modified import bessel_i_scaled, rim_scaled


def split(value):
    high = float(value)
    return high, float(value - high)


@pytest.mark.parametrize("order", [0.0, 0.3, 1.0, 5.5, 24.9, 25.1, 60.0, 1000.0, 10000.0])
def test_scaled_values(order):
    rng = np.random.default_rng(int(order))
    x = np.concatenate(
        (10.0 ** rng.uniform(-3, 6, 12), rng.uniform(0, 60, 12), rng.uniform(0, 3 * order + 1, 6))
    )
    x = np.append(x, [24.999, 25.001])
    for at, found in zip(x, bessel_i_scaled(order, x), strict=True):
        exact = cylinder(1, order, mp.mpf(at))[0] * mp.exp(-mp.mpf(at))
        if exact > 1e-290:
            assert abs(found - exact) <= 2.5 * EPS * exact, at


def test_scaled_edges():
    assert np.isnan(bessel_i_scaled(0.0, np.array([np.nan]))[0])
    np.testing.assert_array_equal(bessel_i_scaled(0.0, np.array([0.0, np.inf])), [1.0, 0.0])
    np.testing.assert_array_equal(bessel_i_scaled(0.5, np.array([[0.0]])), [[0.0]])
    at = bessel_i_scaled(3.0, np.array([1e300]))[0]
    assert at == pytest.approx(1.0 / np.sqrt(2.0 * np.pi) / 1e150, rel=1e-15)


def test_recurrence():
    """I_{nu-1} - I_{nu+1} = (2 nu / x) I_nu: three tables that know nothing of each other."""
    x = np.geomspace(0.5, 1e4, 50)
    for order in (1.5, 20.25, 25.5, 80.0):
        below, at, above = (bessel_i_scaled(order + d, x) for d in (-1.0, 0.0, 1.0))
        np.testing.assert_allclose(below - above, 2.0 * order / x * at, rtol=0, atol=6 * EPS * below.max())


GROWING = [
    (0.0, 1e-3),
    (0.0, 20.0),
    (0.0, 30.0),
    (0.0, 1e6),
    (0.3, 1e-10),
    (0.3, 24.0),
    (0.3, 3e3),
    (24.9, 3.0),
    (24.9, 100.0),
    (60.0, 1e-5),
    (60.0, 1e3),
    (1e4, 1e6),
]
NEAR_CORNER = [(0.0, 1e-9), (0.7, 1e-30), (5.0, 1e-4), (24.0, 1.0), (26.0, 1.0), (60.0, 8.0), (1e4, 9600.0)]
CASES = [(1, *case) for case in GROWING] + [(-1, *case) for case in NEAR_CORNER]


@pytest.mark.parametrize(("sigma", "order", "mu"), CASES)
@pytest.mark.parametrize(("n", "allowed"), [(0, 2.5), (1, 3.0), (2, 4.0)])
def test_ratios(sigma, order, mu, n, allowed):
    """The exact root need not be a double: a low part of the root changes exp(mu (x - 1)) by many eps."""
    rng = np.random.default_rng(int(order) + 7 * n)
    exact_mu = mp.mpf(mu) * (1 + mp.mpf(rng.uniform(-1e-16, 1e-16)))
    high, low = split(exact_mu)
    exact_mu = mp.mpf(high) + mp.mpf(low)
    x = np.concatenate((rng.uniform(0, 1, 4), 1 - 10.0 ** rng.uniform(-15, 0, 4), [1e-2, 1.0]))
    found = rim_scaled(order, high, low, float(sigma), x, np.zeros(x.size), derivative=n)
    bottom = cylinder(sigma, order, exact_mu)[0]
    for at, ours in zip(x, found, strict=True):
        z = exact_mu * mp.mpf(at)
        value, slope = cylinder(sigma, order, z)
        second = (mp.mpf(order) ** 2 / z**2 + sigma) * value - slope / z
        exact = (value, slope * exact_mu, second * exact_mu**2)[n] / bottom
        if abs(exact) > 1e-290:
            assert abs(ours - exact) <= allowed * EPS * abs(exact), at


def test_zero_mode_and_axis():
    x = np.array([0.0, 0.25, 1.0])
    none = np.zeros(3)
    np.testing.assert_array_equal(rim_scaled(0.0, 0.0, 0.0, 0.0, x, none), [1.0, 1.0, 1.0])
    np.testing.assert_array_equal(rim_scaled(2.0, 0.0, 0.0, 0.0, x, none), [0.0, 0.0625, 1.0])
    np.testing.assert_array_equal(rim_scaled(2.0, 0.0, 0.0, 0.0, x, none, derivative=2), [2.0, 2.0, 2.0])
    np.testing.assert_array_equal(rim_scaled(2.0, 0.0, 0.0, 0.0, x, none, derivative=3), [0.0, 0.0, 0.0])
    np.testing.assert_array_equal(rim_scaled(0.5, 0.0, 0.0, 0.0, x, none, derivative=1), [np.inf, 1.0, 0.5])
    np.testing.assert_array_equal(rim_scaled(0.5, 3.0, 0.0, 1.0, x, none, derivative=2)[:1], [-np.inf])
