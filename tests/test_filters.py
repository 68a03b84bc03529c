"""Filters: their published factors, what they do beside and away from a jump, and the error they state."""

from __future__ import annotations

import math

import numpy as np
import pytest
from scipy.integrate import trapezoid

from fbexpand import Dini, Expansion, FourierBessel, expand
from fbexpand.expansion.filters import FILTERS

NAMES = sorted(FILTERS)
BASES = [FourierBessel(), FourierBessel(0.3), Dini(1.0, robin=2.0), Dini(robin=-4.0)]
R = np.linspace(0.0, 1.0, 1201)


def step(r):
    return 1.0 * (r < 0.5)


@pytest.mark.parametrize("name", NAMES)
def test_factors_fall_from_1_to_0(name):
    x = np.linspace(0.0, 1.0, 101)
    s = FILTERS[name](x)
    assert s[0] == 1.0
    assert abs(s[-1]) <= 1e-15
    assert np.all(np.diff(s) <= 1e-15)


def test_published_values():
    """Lanczos's sigma factors, sin(pi x)/(pi x); Vandeven's polynomial of order 4 is odd about (1/2, 1/2)."""
    assert FILTERS["lanczos"](np.array([0.5]))[0] == pytest.approx(2 / math.pi)
    x = np.linspace(0, 1, 11)
    np.testing.assert_allclose(FILTERS["vandeven"](x) + FILTERS["vandeven"](1 - x), 1.0, atol=1e-14)
    assert FILTERS["exponential"](np.array([1.0]))[0] == pytest.approx(2.3e-16, rel=0.02)


@pytest.mark.parametrize("basis", BASES)
@pytest.mark.parametrize("name", NAMES)
def test_the_error_is_measured_anew(basis, name):
    e = expand(step, basis, terms=60, breaks=[0.5]).filtered(name)
    error = np.abs(e(R) - step(R))
    partial = e.partial_sum(R)
    beside = np.abs(R - 0.5) < 1e-9
    assert partial.source == "residual"
    assert np.all(error[~beside] <= partial.error[~beside] * 1.01 + 1e-14)
    true = math.sqrt(trapezoid((e(R) - step(R)) ** 2 * R, R))
    assert e.error_estimate().l2 == pytest.approx(true, rel=0.05)
    cuts = [10, 25, 60]
    for n, l2 in zip(cuts, e.error_estimate(cuts).l2, strict=True):
        true = math.sqrt(trapezoid((e.truncated(n)(R) - step(R)) ** 2 * R, R))
        assert l2 == pytest.approx(true, rel=0.05)
        assert e.truncated(n).error_estimate().l2 == pytest.approx(l2, rel=1e-4)  # on cells of their own


@pytest.mark.parametrize("basis", BASES)
def test_away_from_a_jump_the_sum_is_better(basis):
    def profile(r):
        return r**basis.order * step(r)

    plain = expand(profile, basis, terms=80, breaks=[0.5], lift_terms=2)
    away = (np.abs(R - 0.5) > 0.15) & (R > 0.15)
    before = np.abs(plain(R) - profile(R))[away].max()
    for name, gain in (("lanczos", 8.0), ("raised cosine", 20.0), ("vandeven", 30.0)):
        after = np.abs(plain.filtered(name)(R) - profile(R))[away].max()
        assert after < before / gain, name


def test_a_growing_mode_is_not_damped():
    e = expand(lambda r: np.cosh(9 * r), Dini(robin=-9.0), terms=20)
    assert e.filtered("lanczos").coefficients[0] == e.coefficients[0]


def test_sums_batches_and_scales_keep_the_measure():
    basis = FourierBessel()
    e = expand(lambda r: np.stack((step(r), 2.0 * step(r))), basis, terms=40, breaks=[0.5]).filtered("lanczos")
    l2 = e.error_estimate().l2
    assert l2[1] == pytest.approx(2.0 * l2[0])
    assert (3.0 * e[0]).error_estimate().l2 == pytest.approx(3.0 * l2[0])
    assert (e[0] + e[1]).error_estimate().l2 == pytest.approx(l2.sum())


def test_wrong_input():
    e = expand(step, FourierBessel(), terms=5, breaks=[0.5])
    with pytest.raises(ValueError, match="'name' must be one of 'fejer'"):
        e.filtered("other")
    with pytest.raises(TypeError, match="'name'"):
        e.filtered(3)
    with pytest.raises(ValueError, match="'series' must know its profile"):
        Expansion(FourierBessel(), [1.0, 2.0]).filtered("lanczos")
