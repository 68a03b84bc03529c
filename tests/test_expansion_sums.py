"""Values and derivatives of sums against ball arithmetic; the summation on its own; its memory and speed."""

from __future__ import annotations

import math
import tracemalloc

import flint
import mpmath
import numpy as np
import pytest
from scipy.special import jv

from fbexpand.bases import FourierBessel
from fbexpand.expansion import Expansion
from fbexpand.transform.direct import sums

EPS = np.finfo(float).eps


def ball_sums(order, radius, coefficients, r, derivative):
    """The sum at r and the sum of the moduli, or of a derivative; roots by mpmath, polished to 40 digits."""
    with mpmath.workdps(45):
        roots = [mpmath.besseljzero(order, k) for k in range(1, len(coefficients) + 1)]
    before = flint.ctx.prec
    flint.ctx.prec = 160
    try:
        roots = [_polished(flint.arb(order), flint.arb(mpmath.nstr(root, 42))) for root in roots]
        nu, values, moduli = flint.arb(order), [], []
        for x in r:
            total = absolute = flint.arb(0)
            for c, root in zip(coefficients, roots, strict=True):
                scale = root / flint.arb(radius)
                z = scale * flint.arb(float(x))
                term = flint.arb(float(c)) * scale**derivative * _bessel(nu, z, derivative)
                total, absolute = total + term, absolute + abs(term)
            values.append(float(total.mid()))
            moduli.append(float(absolute.mid()))
    finally:
        flint.ctx.prec = before
    return np.array(values), np.array(moduli)


def _polished(nu, z):
    """Newton's steps in ball arithmetic; mpmath gives some zeros of real order to 16 digits only."""
    for _ in range(3):
        z = (z - z.bessel_j(nu) / _bessel(nu, z, 1)).mid()
    return z


def _bessel(nu, z, derivative):
    """J_nu^(derivative)(z) by 2 J' = J_{nu-1} - J_{nu+1}, again and again."""
    total = flint.arb(0)
    for i in range(derivative + 1):
        total += (-1) ** i * math.comb(derivative, i) * z.bessel_j(nu - derivative + 2 * i)
    return total / 2**derivative


@pytest.mark.parametrize("order", [0.0, 0.3, 1.0, 7.25])
@pytest.mark.parametrize("derivative", [0, 1, 2])
def test_against_ball_arithmetic(order, derivative):
    rng = np.random.default_rng(int(10 * order) + derivative)
    c = rng.normal(size=30)
    r = np.concatenate((rng.uniform(0.0, 1.25, 25), [1.25, 1e-3, 1e-9]))
    e = Expansion(FourierBessel(order, 1.25), c)
    ours = e.derivative(r, derivative) if derivative else e(r)
    exact, moduli = ball_sums(order, 1.25, c, r, derivative)
    if derivative == 0:
        assert ours[25] == 0.0  # the rim, where the exact sum is 0 too
        moduli[25] = 1.0
    worst = np.max(np.abs(ours - exact) / moduli) / EPS
    assert worst <= (8.0 if derivative else 4.0), f"{worst:.2f} eps of the sum of the moduli"


class Tabulated:
    """A stand-in for a basis whose modes are given numbers; the radii are row numbers."""

    order, radius, growing = 0.0, 1.0, False

    def __init__(self, modes):
        self.table = modes

    def modes(self, r, count, start=1):
        return self.table[r.astype(int), start - 1 : start - 1 + count]


@pytest.mark.parametrize("terms", [1, 15, 64, 1000, 10_000])
@pytest.mark.parametrize("kind", ["one sign", "random", "decaying"])
def test_summation_adds_less_than_two_eps(terms, kind):
    rng = np.random.default_rng(terms)
    modes = rng.random((40, terms)) if kind == "one sign" else rng.normal(size=(40, terms))
    c = np.ones(terms) if kind == "one sign" else rng.normal(size=terms)
    if kind == "decaying":
        c = c / np.arange(1, terms + 1) ** 1.5
    for count in (1, 5):
        ours = sums(Tabulated(modes), np.stack([c] * count), np.arange(40.0))
        for i in range(40):
            products = modes[i] * c
            exact = math.fsum(products)
            allowed = 2.0 * EPS * math.fsum(np.abs(products))
            assert np.all(np.abs(ours[:, i] - exact) <= allowed)


def test_cuts_are_the_partial_sums():
    rng = np.random.default_rng(3)
    modes, c = rng.normal(size=(9, 300)), rng.normal(size=(2, 300))
    cuts = [0, 1, 2, 16, 17, 127, 128, 129, 299, 300]
    ours = sums(Tabulated(modes), c, np.arange(9.0), cuts=cuts)
    for cut, values in zip(cuts, ours, strict=True):
        np.testing.assert_allclose(values, c[:, :cut] @ modes[:, :cut].T, atol=1e-12)
    absolute = sums(Tabulated(modes), c, np.arange(9.0), absolute=True)
    np.testing.assert_allclose(absolute, np.abs(c) @ np.abs(modes).T, rtol=1e-13)


class Blank(Tabulated):
    """Modes that cost nothing."""

    def __init__(self):
        super().__init__(np.ones((1, 1)))

    def modes(self, r, count, start=1):
        return np.broadcast_to(self.table, (r.size, count)).copy()


def test_memory_stays_bounded():
    r = np.linspace(0.0, 1.0, 20_000)
    rows = np.ones((1, 10_000))
    tracemalloc.start()
    try:
        values = sums(Blank(), rows, r)
        peak = tracemalloc.get_traced_memory()[1]
    finally:
        tracemalloc.stop()
    assert np.all(values == 10_000.0)
    assert peak < 32e6  # all modes at once would take 1.6 GB


def test_against_the_same_sum_by_scipy():
    basis = FourierBessel(0.3)
    rng = np.random.default_rng(0)
    e = Expansion(basis, rng.normal(size=64))
    r = rng.uniform(0.0, 1.0, 4000)
    reference = jv(0.3, r[:, None] * basis.roots(64)) @ e.coefficients
    np.testing.assert_allclose(e(r), reference, atol=1e-11)
