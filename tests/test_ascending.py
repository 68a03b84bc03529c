"""The ascending series' bound: true always, and close; its logarithm, gamma and power on their own."""

from __future__ import annotations

import math
import pickle

import numpy as np
import pytest
from flint import arb, ctx

from fbexpand.exceptions import ArgumentTypeError, ArgumentValueError
from fbexpand.kernels.bounded import EXP_ERROR, log_bounded, log_gamma_bounded, power_bounded
from fbexpand.kernels.elementary import dd_exp
from fbexpand.special.ascending import ascending_series

TINY = math.ulp(0.0)


def draw(rng: np.random.Generator) -> tuple[float, float, int]:
    """Return an order, an argument and a number of terms, from corner to corner."""
    order = [
        0.0,
        float(rng.uniform(-0.5, 1.0)),
        float(rng.uniform(0.0, 100.0)),
        float(rng.integers(0, 100)),
        float(10.0 ** rng.uniform(0.0, 4.0)),
        float(10.0 ** rng.uniform(-20.0, 0.0)),
    ][int(rng.integers(6))]
    x = [
        10.0 ** rng.uniform(-3.0, 2.2),
        10.0 ** rng.uniform(-323.0, 5.0),
        max(order, 1.0) * rng.uniform(0.1, 2.0),
    ][int(rng.integers(3))]
    return max(order, -0.499999), float(x), int(10.0 ** rng.uniform(0.0, 2.5))


def exact(order: float, x: float) -> arb:
    ctx.prec = max(400, int(0.5 * order), min(int(3.0 * x), 4000))
    value = arb(x).bessel_j(arb(order))
    while not value.rel_accuracy_bits() > 100:
        ctx.prec *= 4
        value = arb(x).bessel_j(arb(order))
    return value


def sum_of_terms(order: float, x: float, terms: int) -> tuple[float, float]:
    """Return the sum of the terms' absolute values and the first term left out."""
    ctx.prec = 100
    half = arb(x) / 2
    term, total = half ** arb(order) / (arb(order) + 1).gamma(), arb(0)
    for k in range(terms):
        total += term
        term = term * half * half / ((k + 1) * (arb(order) + k + 1))
    return float(total.mid()), float(term.mid())


def check(samples: int, seed: int) -> None:
    rng = np.random.default_rng(seed)
    finite = 0
    for _ in range(samples):
        order, x, terms = draw(rng)
        result = ascending_series(order, x, terms)
        value, error = float(result.values), float(result.error)
        if error == math.inf:
            continue
        finite += 1
        reference = exact(order, x)
        assert abs(arb(value) - reference) <= arb(error), (order, x, terms, value, error)
    ctx.prec = 53
    assert finite > 0.8 * samples


def test_the_bound_holds() -> None:
    check(1500, seed=11)


@pytest.mark.deep
def test_the_bound_holds_deep() -> None:
    check(60_000, seed=12)


def test_the_bound_is_close() -> None:
    """Within 12 of the true error where the remainder rules, 3 eps of the terms' sum where rounding does."""
    rng = np.random.default_rng(13)
    ratios = []
    for _ in range(600):
        order, x, terms = draw(rng)
        result = ascending_series(order, x, min(terms, 60))
        value, error = float(result.values), float(result.error)
        if not 1e-290 < error < math.inf:
            continue
        total, _ = sum_of_terms(order, x, min(terms, 60))
        reference = exact(order, x)
        true = abs(float((arb(value) - reference).mid()))
        assert error <= 12.0 * true + 3.0 * 2.0**-52 * total, (order, x, terms)
        if error > 1e-13 * total:
            ratios.append(error / true)
    ctx.prec = 53
    print(f"\nbound over true remainder: median {np.median(ratios):.3g}, largest {max(ratios):.3g}")
    assert len(ratios) > 100


def test_the_remainder_is_the_first_term_left_out() -> None:
    for order, x, terms in [(0.0, 1.0, 1), (0.3, 2.0, 4), (5.5, 8.0, 6), (-0.4, 1.5, 3)]:
        _, first_out = sum_of_terms(order, x, terms)
        result = ascending_series(order, x, terms)
        assert first_out <= result.error <= 1.001 * first_out


def test_values_are_the_partial_sums() -> None:
    """Against exact rational arithmetic at integer order."""
    from fractions import Fraction

    for order in (0, 1, 7):
        for x in (0.5, 3.0, 11.25):
            half = Fraction(x) / 2
            total = Fraction(0)
            for k in range(12):
                total += (-1) ** k * half ** (2 * k + order) / (math.factorial(k) * math.factorial(k + order))
                assert ascending_series(order, x, k + 1).values == pytest.approx(float(total), rel=1e-15)


def test_enough_terms_give_the_function_to_an_ulp() -> None:
    x = np.linspace(0.01, 6.0, 60)
    for order in (0.0, 0.3, 2.5, 20.0):
        result = ascending_series(order, x, 60)
        ctx.prec = 200
        true = np.array([float(arb(t).bessel_j(arb(order))) for t in x])
        ctx.prec = 53
        assert np.all(np.abs(result.values - true) <= np.spacing(np.abs(true)))
        assert np.all(result.error <= 1.1 * 2.0**-52 * np.abs(true) + 1e-24)


def test_cancellation_is_reported() -> None:
    errors = [float(ascending_series(0.0, x, 400).error) for x in (10.0, 40.0, 80.0, 120.0)]
    assert errors[0] < 1e-15 < errors[2]
    assert errors == sorted(errors)


def test_overflow_gives_an_infinite_error() -> None:
    for x, terms in [(1e4, 10_000), (1e200, 3), (1.7e308, 2), (math.inf, 1)]:
        assert ascending_series(0.0, x, terms).error == math.inf
    assert ascending_series(0.0, 1e150, 2).error == pytest.approx(0.25e300, rel=1e-3)
    assert ascending_series(0.0, 1e300, 1).error <= 2.1  # |1 - J_0|, whatever the second term
    assert ascending_series(1e12, 1.0, 3).error == math.inf


def test_axis_underflow_parity_nan_and_shapes() -> None:
    at_axis = ascending_series(0.0, 0.0, 5)
    assert (at_axis.values, at_axis.error) == (1.0, 0.0)
    assert ascending_series(0.3, 0.0, 5).values == 0.0
    assert ascending_series(-0.3, 0.0, 5).error == math.inf
    for x in (TINY, 1e-310, 2.0**-1022, 1e-160):
        for order in (0.0, 0.3, 1.0, 2.0, 60.0):
            result = ascending_series(order, x, 3)
            assert abs(arb(float(result.values)) - exact(order, x)) <= arb(float(result.error))
    ctx.prec = 53
    x = np.array([[1.0, -1.0, np.nan], [2.0, -2.0, 0.0]])
    odd = ascending_series(3.0, x, 20)
    assert odd.values.shape == odd.error.shape == (2, 3)
    assert odd.values[0, 1] == -odd.values[0, 0]
    assert np.isnan(odd.values[0, 2])
    assert np.isnan(odd.error[0, 2])
    even = ascending_series(2, x, 20)
    assert even.values[1, 1] == even.values[1, 0]
    assert ascending_series(0.3, [], 2).values.shape == (0,)
    assert isinstance(even.source, str)
    assert even.source == "bound"
    assert not even.values.flags.writeable
    again = pickle.loads(pickle.dumps(odd))
    assert np.array_equal(again.error, odd.error, equal_nan=True)


def test_the_same_bits_whatever_the_length() -> None:
    x = np.linspace(0.0, 30.0, 77)
    whole = ascending_series(0.3, x, 40)
    parts = [ascending_series(0.3, t, 40) for t in x]
    assert [float(p.values) for p in parts] == whole.values.tolist()
    assert [float(p.error) for p in parts] == whole.error.tolist()


def test_bad_input() -> None:
    for order in (-0.5, -3.0, math.nan, math.inf):
        with pytest.raises(ArgumentValueError, match="'order'"):
            ascending_series(order, 1.0, 3)
    with pytest.raises(ArgumentTypeError, match="'order'"):
        ascending_series("0", 1.0, 3)  # type: ignore[arg-type]
    for terms in (0, -2):
        with pytest.raises(ArgumentValueError, match="'terms'"):
            ascending_series(0.0, 1.0, terms)
    for terms in (3.0, None, True):
        with pytest.raises(ArgumentTypeError, match="'terms'"):
            ascending_series(0.0, 1.0, terms)  # type: ignore[arg-type]
    with pytest.raises(ArgumentValueError, match="'x'"):
        ascending_series(0.5, -1.0, 3)
    with pytest.raises(ArgumentTypeError, match="'x'"):
        ascending_series(0.5, "1", 3)


def test_exponential_bound() -> None:
    rng = np.random.default_rng(14)
    ctx.prec = 300
    for scale in (1e-30, 1e-3, 1.0, 30.0, 700.0, 1e6, 1e12):
        for a in (scale * rng.uniform(-1.0, 1.0, 40)).tolist():
            tail = a * 2.0**-55
            h, low, k = dd_exp(a, tail)
            true = (arb(a) + arb(tail)).exp() / arb(2) ** k
            assert abs((arb(h) + arb(low)) / true - 1) < arb(EXP_ERROR)
    ctx.prec = 53


def test_logarithm_and_gamma_bounds() -> None:
    rng = np.random.default_rng(15)
    ctx.prec = 300
    for x in [*(10.0 ** rng.uniform(-320.0, 308.0, 150)).tolist(), 1.0, 1.0 + 2.0**-52, TINY, 1.7e308]:
        h, low, error = log_bounded(x, 0.0)
        assert abs(arb(h) + arb(low) - arb(x).log()) <= arb(error)
        assert error < 2.0**-80
    for nu in [*(10.0 ** rng.uniform(-3.0, 9.0, 150)).tolist(), 0.0, -0.4999, 1e-300, 39.0, 38.999]:
        h, low, error = log_gamma_bounded(nu)
        true = (arb(nu) + 1).lgamma()
        assert abs(arb(h) + arb(low) - true) <= arb(error)
        assert error <= 2.0**-85 * max(1.0, nu * math.log(nu + 2.0) / 8.0)
        for x in (1e-300, 1e-5, 1.0, 7.3, 1e5):
            g, tail, g_error = log_gamma_bounded(nu)
            h, low, k, relative = power_bounded(nu, x, g, tail, g_error)
            power = (arb(nu) * (arb(x) / 2).log() - true).exp() / arb(2) ** k
            assert abs((arb(h) + arb(low)) / power - 1) <= arb(relative) or nu == 0.0
            assert relative < 2.0**-40
    ctx.prec = 53
