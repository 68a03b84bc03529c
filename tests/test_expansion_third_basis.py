"""Everything a series does, on a basis that offers the protocol and nothing more: sines, at order 1/2."""

from __future__ import annotations

import copy
import pickle

import numpy as np
import pytest
from series_helpers import PROFILES, coefficients_of, measured_series, resolve, true_errors

from fbexpand.bases import FourierBessel
from fbexpand.expansion import Expansion, stack


class Sines:
    """phi_k = sin(k pi r / R) / sqrt(r): proportional to J_{1/2}(k pi r / R), N_k = R / 2."""

    order = 0.5
    growing = False

    def __init__(self, radius=1.0):
        self.radius = radius

    def roots(self, count, start=1):
        return np.pi * np.arange(start, start + count)

    def eigenvalues(self, count, start=1):
        return (self.roots(count, start) / self.radius) ** 2

    def norms(self, count, start=1):
        return np.full(count, self.radius / 2.0)

    def modes(self, r, count, start=1):
        r = np.asarray(r)[..., None]
        root = np.sqrt(np.where(r > 0.0, r, 1.0))
        return np.where(r > 0.0, np.sin(self.roots(count, start) * r / self.radius) / root, 0.0)


BASIS = Sines(2.0)
OURS = FourierBessel(0.5, 2.0)


def pair(terms=15):
    """The same function on both bases."""
    b = np.random.default_rng(5).normal(size=terms)
    signs = np.sign(OURS.modes(np.array([1e-3]), terms)[0])
    return Expansion(BASIS, b / np.sqrt(BASIS.norms(terms))), Expansion(
        OURS, signs * b / np.sqrt(OURS.norms(terms))
    )


def test_values_integrals_and_norms():
    e, f = pair()
    r = np.linspace(0.0, 2.0, 41)
    np.testing.assert_allclose(e(r), f(r), atol=1e-12)
    np.testing.assert_allclose(e.norm(), f.norm(), rtol=1e-13)
    for a, b in ((0.0, 2.0), (0.0, 0.3), (0.4, 1.9)):
        np.testing.assert_allclose(e.integral(a, b), f.integral(a, b), atol=1e-13)
    np.testing.assert_allclose(e.mean(0.1, 0.2), f.mean(0.1, 0.2), rtol=1e-11)
    np.testing.assert_allclose(e.laplacian()(r), f.laplacian()(r), atol=1e-9)


@pytest.mark.parametrize(("n", "allowed"), [(1, 1e-12), (2, 5e-11), (3, 3e-9)])
def test_derivatives_by_interpolation(n, allowed):
    e, f = pair()
    r = np.linspace(0.05, 2.0, 40)
    scale = np.abs(e(r)).max() * (BASIS.roots(1, 15)[0] / 2.0) ** n
    np.testing.assert_allclose(e.derivative(r, n), f.derivative(r, n), rtol=0, atol=allowed * scale)
    b = e.coefficients * BASIS.roots(15) / 2.0  # the slope of sum b sin(k pi r / R) at the axis
    assert e.derivative(0.0) == np.copysign(np.inf, b.sum())
    assert e.derivative(0.0, 2) == -np.copysign(np.inf, b.sum())


@pytest.mark.parametrize("name", ["parabola", "step", "gaussian", "kink", "waves"])
def test_errors(name):
    e = measured_series(name, BASIS, 40)
    l2, sup, r, error = true_errors(name, e)
    found = e.error_estimate()
    assert (1 - 1e-5) * l2 <= found.l2 <= 1.05 * l2
    assert sup <= found.sup <= 1.1 * sup
    assert np.all(error[::5] <= e.partial_sum(r[::5]).error)
    law = Expansion(BASIS, e.coefficients).error_estimate()
    assert l2 <= law.l2 <= 5 * l2
    n = int(e.terms_for(0.2))
    assert n <= 40
    assert e.error_estimate(n).truncation <= 0.2 * 1.001 * np.hypot(e.norm(), l2)
    assert int(e.terms_for(1e-4)) > 40


def test_bases_without_a_key_are_the_same_only_if_they_are_one():
    e, _ = pair()
    assert (e + e).terms == 15
    with pytest.raises(ValueError, match="'other'"):
        e + Expansion(Sines(2.0), [1.0])
    assert copy.copy(e)(0.3) == e(0.3)
    assert pickle.loads(pickle.dumps(e))(0.3) == e(0.3)
    assert "Sines" in repr(e)
    assert stack([e, 2 * e]).batch_shape == (2,)


def test_one_profile_for_a_whole_batch():
    """Panels without batch axes serve every row."""
    c = coefficients_of(*PROFILES["kink"], BASIS, 20)
    e = Expansion._make(BASIS, np.stack([c, c]), panels=resolve(*PROFILES["kink"], 2.0))
    alone = Expansion._make(BASIS, c, panels=resolve(*PROFILES["kink"], 2.0)).error_estimate()
    np.testing.assert_allclose(e.error_estimate().l2, [alone.l2] * 2, rtol=1e-9)
    np.testing.assert_allclose((e * [1.0, 2.0]).error_estimate().sup, [alone.sup, 2 * alone.sup], rtol=1e-9)
