"""Pointwise functions of a field: against the expansion of the function of the profile, and their error."""

from __future__ import annotations

import numpy as np
import pytest

from fbexpand import Dini, Expansion, FourierBessel, expand

R = np.linspace(0.0, 1.0, 301)
BASES = [FourierBessel(), Dini(robin=2.0), Dini(robin=-3.0), Dini.neumann()]


def smooth(r):
    return np.exp(-4 * r**2) * (1 - r**2) ** 2


@pytest.mark.parametrize("basis", BASES)
@pytest.mark.parametrize("function", [np.square, np.exp, lambda f: f / (1 + f), lambda f: f**5])
def test_against_the_function_of_the_profile(basis, function):
    e = expand(smooth, basis, tol=1e-9) if basis.order == 0 and not basis.growing else expand(smooth, basis, terms=60)
    mapped = e.map(function, 50)
    direct = expand(lambda r: function(smooth(r)), basis, terms=50)
    allowed = mapped.error_estimate().quadrature + 1e-13
    assert np.abs(mapped.orthonormal - direct.orthonormal).max() <= allowed
    error = np.abs(mapped(R) - function(smooth(R)))
    assert np.all(error <= mapped.partial_sum(R).error * 1.01 + 3 * e.error_estimate().sup + 1e-13)


def test_nothing_is_aliased():
    """A wave of the highest mode squared has twice its wave number: its coefficients are exact all the same."""
    basis = FourierBessel()
    c = np.zeros(40)
    c[39] = 1.0
    square = Expansion(basis, c).map(np.square, 120)
    x, w = np.polynomial.legendre.leggauss(600)
    r, w = 0.5 * (x + 1), 0.5 * w * 0.5 * (x + 1)
    exact = (w * basis.modes(r, 40)[:, 39] ** 2) @ basis.modes(r, 120) / basis.norms(120)
    np.testing.assert_allclose(square.coefficients, exact, rtol=0, atol=1e-14)


def test_batches_complex_fields_and_lifted_series():
    e = expand(lambda r: np.stack((np.cos(3 * r**2), 1j * r**2)), Dini(robin=1.0), terms=60, lift_terms=2)
    mapped = e.map(lambda f: np.abs(f) ** 2, 80)
    assert mapped.batch_shape == (2,)
    inside = R < 0.8
    np.testing.assert_allclose(mapped(R)[0][inside], np.cos(3 * R**2)[inside] ** 2, atol=0.02)


def test_the_error_of_the_field_is_carried_over():
    short = expand(lambda r: 1.0 - r, FourierBessel(), terms=6)
    mapped = short.map(np.exp, 200)
    reference = expand(lambda r: np.exp(1.0 - r), FourierBessel(), terms=200)
    wrong = np.linalg.norm(mapped.orthonormal - reference.orthonormal)
    assert wrong <= mapped.error_estimate().quadrature <= 20 * wrong


def test_wrong_input():
    e = expand(smooth, FourierBessel(), terms=5)
    with pytest.raises(TypeError, match="'function' must be a function"):
        e.map(3, 5)
    with pytest.raises(ValueError, match="'terms'"):
        e.map(np.exp, 0)
    with pytest.raises(TypeError, match="'terms'"):
        e.map(np.exp, "5")
    with pytest.raises(ValueError, match="'function' must be finite"):
        e.map(lambda f: f * np.nan, 5)
    with pytest.raises(ValueError, match="'function' must return"):
        e.map(lambda f: f[..., :3], 5)
    with pytest.raises(ValueError, match="'function' must return an array of the shape"):
        e.map(lambda f: np.stack((f, f)), 5)
    with pytest.raises(ZeroDivisionError):
        e.map(lambda f: 1 / 0, 5)
