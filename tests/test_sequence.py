"""J_order, J_{order+1}, ...: against ball arithmetic at the exact order + n; identities, edges, bad input."""

from __future__ import annotations

import math

import numpy as np
import pytest
from reference.make_bessel import EPS, ball, difference
from scipy.special import jv, yv

from fbexpand.exceptions import ArgumentTypeError, ArgumentValueError
from fbexpand.special.bessel import bessel_at
from fbexpand.special.sequence import bessel_j_sequence

# order, count, x from, x to: from far below the lowest order to far beyond the highest
CASES = [
    (0.0, 51, 0.0, 50.0),
    (0.0, 400, 0.0, 500.0),
    (0.0, 51, 1e3, 1e6),
    (0.1, 5, 0.0, 2.0),
    (0.3, 300, 0.0, 3.0),
    (0.3, 300, 0.0, 330.0),
    (0.5, 40, 0.0, 3.0),
    (7.3, 300, 0.0, 1000.0),
    (50.5, 60, 0.0, 150.0),
    (63.9, 3, 20.0, 100.0),
    (99.7, 20, 95.0, 125.0),
    (333.3, 40, 300.0, 420.0),
]


def sequence_errors(order: float, count: int, x: np.ndarray, rng: np.random.Generator) -> tuple[float, float]:
    """Return the largest error, in eps, relative to the modulus (order + n <= x) and to |J| (beyond)."""
    values = bessel_j_sequence(order, count, x)
    modulus_error = relative_error = 0.0
    for i, point in enumerate(x):
        for n in rng.choice(count, min(count, 8), replace=False).tolist():
            exact = ball(order, point, shift=n, bits=70)
            size = abs(float(exact.mid()))
            gap = difference(values[i, n], exact)
            if order + n <= point:
                size = np.hypot(jv(order + n, point), yv(order + n, point))  # two digits are enough
                modulus_error = max(modulus_error, gap / size / EPS)
            elif size > 1e-290:
                relative_error = max(relative_error, gap / size / EPS)
            else:
                assert gap <= 1e-300
    return modulus_error, relative_error


def sweep(points: int, seed: int) -> None:
    rng = np.random.default_rng(seed)
    print("\n order count      x        error/modulus  error/|J| beyond the turning point   (eps)")
    for order, count, low, high in CASES:
        x = rng.uniform(low, high, points)
        a, b = sequence_errors(order, count, x, rng)
        print(f"{order:6g} {count:5d} {low:6g}..{high:<8g} {a:10.2f} {b:12.2f}")
        assert a <= (3.0 if order + count < 100 else 4.0)
        assert b <= 4.0  # well inside 20 eps near the turning point and (4 + 2 order) eps below it


def test_error_against_ball_arithmetic() -> None:
    sweep(12, seed=1)


@pytest.mark.deep
def test_error_against_ball_arithmetic_deep() -> None:
    sweep(300, seed=2)


def test_large_orders() -> None:
    rng = np.random.default_rng(3)
    a, b = sequence_errors(9000.3, 60, rng.uniform(8900.0, 9100.0, 2), rng)
    assert a <= 6.0
    assert b <= 6.0


def test_order_plus_n_is_exact() -> None:
    """63.9 + 1 is not a double: the value at the rounded sum is off by many eps."""
    order, x = 63.9, 40.0
    exact = ball(order, x, shift=1)
    rounded = ball(order + 1.0, x)
    assert difference(float(rounded.mid()), exact) > 8.0 * EPS * abs(float(exact.mid()))
    assert difference(bessel_j_sequence(order, 2, x)[1], exact) <= 4.0 * EPS * abs(float(exact.mid()))


def test_first_column_is_the_function_itself() -> None:
    x = np.linspace(0.0, 60.0, 301)
    for order in (0.0, 0.3, 7.0, 50.5):
        first = bessel_j_sequence(order, 9, x)[:, 0]
        np.testing.assert_allclose(first, bessel_at(order, x), rtol=0, atol=2 * EPS)


def test_sums_of_squares() -> None:
    """J_0^2 + 2 sum J_n^2 = 1 and J_0 + 2 sum J_2n = 1 (DLMF 10.23.3, 10.12.4)."""
    x = np.linspace(0.0, 100.0, 41)
    j = bessel_j_sequence(0.0, 200, x)
    np.testing.assert_allclose(j[:, 0] ** 2 + 2.0 * np.sum(j[:, 1:] ** 2, axis=1), 1.0, rtol=0, atol=2e-15)
    np.testing.assert_allclose(j[:, 0] + 2.0 * np.sum(j[:, 2::2], axis=1), 1.0, rtol=0, atol=4e-15)


def test_half_integer_closed_form() -> None:
    x = np.linspace(4.0, 200.0, 57)
    j = bessel_j_sequence(0.5, 3, x)
    scale = np.sqrt(2.0 / (math.pi * x))
    closed = [np.sin(x), np.sin(x) / x - np.cos(x), (3.0 / x**2 - 1.0) * np.sin(x) - 3.0 / x * np.cos(x)]
    for n in range(3):
        np.testing.assert_allclose(j[:, n] / scale, closed[n], rtol=0, atol=6 * EPS)


@pytest.mark.parametrize("order", [0.0, 0.3, 40.0])
def test_the_same_bits_whatever_the_length_or_the_neighbours(order: float) -> None:
    rng = np.random.default_rng(4)
    x = np.concatenate([80.0 * rng.random(150), 10.0 ** rng.uniform(-12.0, 9.0, 50), [0.0, 1e300, 1e-310]])
    whole = bessel_j_sequence(order, 30, x)
    for i in range(0, x.size, 7):
        assert np.array_equal(bessel_j_sequence(order, 30, x[i : i + 3]), whole[i : i + 3])
    shuffle = rng.permutation(x.size)
    assert np.array_equal(bessel_j_sequence(order, 30, x[shuffle]), whole[shuffle])
    assert np.array_equal(bessel_j_sequence(order, 30, x[::-1])[::-1], whole)


def test_the_count_changes_nothing_but_the_last_bits() -> None:
    x = np.linspace(0.0, 70.0, 141)
    long = bessel_j_sequence(0.3, 60, x)
    for count in (1, 2, 3, 33):
        short = bessel_j_sequence(0.3, count, x)
        np.testing.assert_allclose(short, long[:, :count], rtol=4 * EPS, atol=1e-300)


def test_tiny_arguments_and_underflow() -> None:
    tiny = math.ulp(0.0)
    j = bessel_j_sequence(0.0, 4, [0.0, tiny, 1e-300, 1e-160, 1e-100, 2.0**-31, 2.0**-29])
    assert np.array_equal(j[0], [1.0, 0.0, 0.0, 0.0])
    assert np.array_equal(j[:, 0], np.ones(7))
    assert j[2, 1] == 5e-301
    assert np.array_equal(j[3, 1:3], [5e-161, 0.125e-320])
    for i, x in ((4, 1e-100), (5, 2.0**-31), (6, 2.0**-29)):
        for n in range(1, 4):
            assert j[i, n] == pytest.approx((x / 2) ** n / math.factorial(n), rel=1e-15)
    # from 0.5 to nothing within the run: gradual, without NaN or a jump
    j = bessel_j_sequence(0.3, 400, [0.5, 2.0])
    assert np.all(j >= 0.0)
    assert j[0, -1] == 0.0
    assert np.all(np.diff(j[0]) <= 0.0)
    last = int(np.flatnonzero(j[0])[-1])
    for n in (last, last - 1, last - 3):
        assert difference(j[0, n], ball(0.3, 0.5, shift=n)) <= 2.0 * tiny


def test_a_start_that_underflows() -> None:
    j = bessel_j_sequence(1000.0, 5, [1.0, 1e-5, 300.0])
    assert np.array_equal(j[:2], np.zeros((2, 5)))
    assert np.all(j[2] >= 0.0)


def test_huge_arguments() -> None:
    for x in (1e9, 1e15, 1e300):
        j = bessel_j_sequence(0.3, 40, x)
        size = math.sqrt(2.0 / math.pi) / math.sqrt(x)
        for n in (0, 1, 17, 39):
            assert difference(j[n], ball(0.3, x, shift=n)) <= 3.0 * EPS * size
    assert np.array_equal(bessel_j_sequence(0.3, 3, math.inf), np.zeros(3))


def test_parity_nan_and_shapes() -> None:
    x = np.array([[1.5, -1.5, np.nan], [-math.inf, -0.0, 3.0]])
    j = bessel_j_sequence(1.0, 4, x)
    assert j.shape == (2, 3, 4)
    assert np.array_equal(j[0, 1], j[0, 0] * [-1.0, 1.0, -1.0, 1.0])
    assert np.all(np.isnan(j[0, 2]))
    assert np.array_equal(j[1, :2], np.zeros((2, 4)))
    assert bessel_j_sequence(0, 3, 2).shape == (3,)
    assert bessel_j_sequence(0.3, 3, []).shape == (0, 3)
    assert bessel_j_sequence(0.3, 1, np.ones((2, 0, 3))).shape == (2, 0, 3, 1)
    assert np.array_equal(bessel_j_sequence(2.0, 3, np.arange(4)), bessel_j_sequence(2.0, 3, np.arange(4.0)))
    assert np.all(np.isnan(bessel_j_sequence(0.3, 2, np.nan)))


def test_bad_input() -> None:
    for order in (-0.1, 2e6, math.nan, math.inf):
        with pytest.raises(ArgumentValueError, match="'order'"):
            bessel_j_sequence(order, 3, 1.0)
    for order in ("1", None, 1j, [0.0]):
        with pytest.raises(ArgumentTypeError, match="'order'"):
            bessel_j_sequence(order, 3, 1.0)  # type: ignore[arg-type]
    for count in (0, -1, 10**18):
        with pytest.raises(ArgumentValueError, match="'count'"):
            bessel_j_sequence(0.3, count, 1.0)
    for count in (2.0, "2", None, True):
        with pytest.raises(ArgumentTypeError, match="'count'"):
            bessel_j_sequence(0.3, count, 1.0)  # type: ignore[arg-type]
    for x in ("1", 1j, [None], None):
        with pytest.raises(ArgumentTypeError, match="'x'"):
            bessel_j_sequence(0.3, 3, x)
    with pytest.raises(ArgumentValueError, match="'x'"):
        bessel_j_sequence(0.3, 3, [1.0, -1.0])
