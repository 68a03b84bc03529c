"""Lifting: what breaks the rim condition subtracted in closed form, in every operation, on every kind of basis."""

from __future__ import annotations

import math
import pickle

import numpy as np
import pytest
from third_basis import Sines

from fbexpand import Dini, Expansion, FourierBessel, RadialTable, expand, stack

KINDS = {
    "cos(3 r^2)": (0.0, lambda r: np.cos(3 * r**2), lambda r: -6 * r * np.sin(3 * r**2)),
    "r exp(r^2)": (1.0, lambda r: r * np.exp(r**2), lambda r: (1 + 2 * r**2) * np.exp(r**2)),
    "r^0.3/(2 - r^2)": (
        0.3,
        lambda r: r**0.3 / (2 - r**2),
        lambda r: 0.3 * r**-0.7 / (2 - r**2) + 2 * r**1.3 / (2 - r**2) ** 2,
    ),
}
RADII = np.concatenate((np.linspace(0.0, 1.0, 401), 1.0 - np.geomspace(1e-6, 1e-2, 40)))


def bases(order):
    """Plain, convective, near the corner from both sides, on it, and with a growing first mode."""
    found = [FourierBessel(order), Dini(order, robin=2.0), Dini(order, robin=1e4), Dini(order, robin=-order)]
    found += [Dini(order, robin=-order - 3.0), Dini(order, robin=-order + 1e-9), Dini(order, robin=-order - 0.3)]
    return found


@pytest.mark.parametrize("kind", KINDS)
@pytest.mark.parametrize("which", range(7))
def test_decay_gains_two_powers_for_each_term(kind, which):
    order, profile, _ = KINDS[kind]
    basis = bases(order)[which]
    k = np.array([24, 48, 96])
    roots = basis.roots(96)[k - 1]
    before = None
    for m in range(4):
        b = np.abs(expand(profile, basis, terms=96, lift_terms=m).orthonormal)
        seen = b[k - 1] > 1e3 * 2e-16 * max(1.0, b.max())
        if seen.sum() < 2:
            break
        power = -np.polyfit(np.log(roots[seen]), np.log(b[k - 1][seen]), 1)[0]
        if before is not None and basis.roots(1, 24)[0] > 4 * abs(getattr(basis, "robin", 0.0)):
            assert power - before == pytest.approx(2.0, abs=0.1), m
        before = power


@pytest.mark.parametrize("kind", KINDS)
@pytest.mark.parametrize("basis", [FourierBessel, lambda order: Dini(order, robin=2.0)])
def test_fifty_terms_are_right_everywhere(kind, basis):
    order, profile, _ = KINDS[kind]
    e = expand(profile, basis(order), terms=50, lift_terms=3)
    # what 50 terms leave of r^0.3/(2 - r^2) with f(R) = 0 is 1.031e-9 at r = 0.992, whoever computes them
    assert np.max(np.abs(e(RADII) - profile(RADII))) < (1.04e-9 if kind == "r^0.3/(2 - r^2)" else 1e-9)
    assert abs(e(1.0) - profile(1.0)) < 1e-9


@pytest.mark.parametrize("order", [0.0, 0.3, 1.0, 7.0, 40.5])
def test_the_first_power_is_exact(order):
    cases = [FourierBessel(order, 2.0), Dini(order, 2.0, robin=1.5), Dini(order, 2.0, robin=-order - 2.0)]
    cases += [Dini(order, 2.0, robin=-order + 1e-3), Dini(order, 2.0, robin=1e5)]
    for basis in cases:
        e = expand(lambda r: 3.0 * (r / 2.0) ** order, basis, terms=5, lift_terms=1)
        assert np.abs(e.orthonormal).max() <= 1e-13
        r = np.linspace(0.0, 2.0, 50)
        np.testing.assert_allclose(e(r), 3.0 * (r / 2.0) ** order, rtol=0, atol=2e-14)


@pytest.mark.parametrize("kind", KINDS)
@pytest.mark.parametrize("which", range(7))
def test_every_operation_includes_the_closed_part(kind, which):
    order, profile, slope = KINDS[kind]
    basis = bases(order)[which]
    e = expand(profile, basis, terms=80, lift_terms=2)
    plain = Expansion(basis, [1.0, -0.5, 0.25])
    assert e.closed_part is not None
    r = RADII[RADII > 0.01]
    x, w = np.polynomial.legendre.leggauss(60)
    cuts = np.concatenate(([0.0], 0.3 ** np.arange(24.0, -1.0, -1.0)))
    half = 0.5 * np.diff(cuts)[:, None]
    nodes = (cuts[:-1, None] + half * (x + 1)).ravel()
    weights = (half * w).ravel() * nodes
    scale = np.abs(profile(RADII[1:])).max()
    tol = 1e-7 * scale
    np.testing.assert_allclose(e(r), profile(r), rtol=0, atol=tol)
    steep = 1.0 if order != 0.3 else 30.0
    np.testing.assert_allclose(e.derivative(r), slope(r), rtol=0, atol=2e-4 * steep * scale)
    assert e.integral() == pytest.approx(weights @ profile(nodes), abs=tol)
    inside = nodes < 0.3 * (1 + 1e-12)
    assert e.integral(0.0, 0.3) == pytest.approx(weights[inside] @ profile(nodes[inside]), abs=tol)
    assert e.mean() == pytest.approx(2.0 * (weights @ profile(nodes)), abs=2 * tol)
    assert e.norm() == pytest.approx(math.sqrt(weights @ profile(nodes) ** 2), abs=tol)
    assert e.inner(plain) == pytest.approx(weights @ (profile(nodes) * plain(nodes)), abs=tol)
    assert plain.inner(e) == pytest.approx(e.inner(plain))
    assert e.inner(e) == pytest.approx(e.norm() ** 2, rel=1e-9)
    np.testing.assert_allclose((2.0 * e - plain)(r), 2.0 * profile(r) - plain(r), rtol=0, atol=3 * tol)
    np.testing.assert_allclose((plain + e / 2.0)(r), profile(r) / 2.0 + plain(r), rtol=0, atol=tol)
    both = stack([plain, e])
    np.testing.assert_allclose(both(r), np.stack([plain(r), e(r)]), rtol=0, atol=1e-12 * scale)
    np.testing.assert_allclose(both[1](r), e(r), rtol=0, atol=1e-12 * scale)
    np.testing.assert_array_equal(pickle.loads(pickle.dumps(e))(r), e(r))
    turned = e * (1.0 + 2.0j)
    np.testing.assert_allclose(turned.imag(r), 2.0 * e(r), rtol=1e-13, atol=1e-13 * scale)
    np.testing.assert_allclose(turned.conj()(r), (1.0 - 2.0j) * e(r), rtol=1e-13, atol=1e-13 * scale)
    np.testing.assert_allclose(turned.norm(), math.sqrt(5.0) * e.norm(), rtol=1e-12)
    assert e.truncated(10).closed_part is e.closed_part


def test_the_laplacian_of_a_lifted_series_converges():
    basis = FourierBessel()
    e = expand(lambda r: np.cos(3 * r**2), basis, terms=100, lift_terms=3)
    r = np.linspace(0.0, 1.0, 101)
    exact = -12 * np.sin(3 * r**2) - 36 * r**2 * np.cos(3 * r**2)
    np.testing.assert_allclose(e.laplacian()(r), exact, rtol=0, atol=1e-5)


@pytest.mark.parametrize("kind", KINDS)
def test_the_slope_at_the_rim_is_right(kind):
    order, profile, slope = KINDS[kind]
    for basis in (FourierBessel(order), Dini(order, robin=3.0)):
        e = expand(profile, basis, terms=200, lift_terms=3)
        assert e.derivative(1.0) == pytest.approx(slope(np.array(1.0)), rel=1e-7)


@pytest.mark.parametrize("kind", KINDS)
@pytest.mark.parametrize("which", range(7))
@pytest.mark.parametrize("m", [1, 2, 3])
def test_estimates_are_of_the_whole(kind, which, m):
    order, profile, _ = KINDS[kind]
    e = expand(profile, bases(order)[which], terms=60, lift_terms=m)
    for terms in (5, 20, 60):
        shorter = e.partial_sum(RADII, terms)
        error = np.abs(shorter.values - profile(RADII))
        estimate = e.error_estimate(terms)
        assert error.max() <= 1.01 * estimate.sup + 1e-15
        if error.max() > 1e-12 and order != 0.3:  # within 1e-10 R of the axis r^0.3 is not resolved, and is counted
            assert estimate.sup <= 3.0 * error.max()
            assert np.mean(error <= shorter.error) >= 0.98
    for tol in (1e-2, 1e-4, 1e-6):
        needed = int(e.terms_for(tol))
        if needed <= 60:
            assert e.error_estimate(needed).truncation <= tol * e.norm() * (1 + 1e-9)
            assert needed == 1 or e.error_estimate(needed - 1).truncation > tol * e.norm() * (1 - 1e-9)


def test_a_tolerance_is_relative_to_the_profile():
    e = expand(lambda r: 5.0 + np.cos(3 * r**2), FourierBessel(), tol=1e-8, lift_terms=3)
    plain = expand(lambda r: 5.0 + np.cos(3 * r**2), FourierBessel(), terms=200)
    assert e.terms < 60
    assert e.error_estimate().truncation <= 1e-8 * e.norm()
    assert e.norm() == pytest.approx(math.hypot(plain.norm(), plain.error_estimate().truncation), rel=1e-4)


def test_batches_and_tables():
    r = np.linspace(0.0, 2.0, 60)
    table = RadialTable(r, np.stack((np.cos(r), np.exp(-(r**2)), 0 * r)))
    e = expand(table, FourierBessel(0, 2.0), terms=40, lift_terms=2)
    np.testing.assert_allclose(e(r), table.values, rtol=0, atol=2e-5)
    assert np.all(e.coefficients[2] == 0.0)
    one = expand(RadialTable(r, np.cos(r)), FourierBessel(0, 2.0), terms=40, lift_terms=2)
    np.testing.assert_allclose(e[0](r), one(r), rtol=0, atol=1e-13)


@pytest.mark.parametrize("bad", [-1, 9, 10**30])
def test_wrong_values(bad):
    with pytest.raises(ValueError, match="'lift_terms'"):
        expand(np.cos, FourierBessel(), terms=3, lift_terms=bad)


@pytest.mark.parametrize("bad", [1.5, "1", None, True, [1]])
def test_wrong_types(bad):
    with pytest.raises(TypeError, match="'lift_terms'"):
        expand(np.cos, FourierBessel(), terms=3, lift_terms=bad)


def test_a_basis_of_an_unknown_rim_condition():
    with pytest.raises(ValueError, match="'lift_terms' must be 0 on a basis"):
        expand(np.cos, Sines(), terms=3, lift_terms=1)


@pytest.mark.parametrize(
    ("order", "profile", "breaks", "m", "decay", "why"),
    [
        (0.0, lambda r: np.cos(3 * r**2), (), 0, (1.0, 2.0), "rim"),
        (0.0, lambda r: np.cos(3 * r**2), (), 1, (3.0, 4.0), "rim"),
        (0.0, lambda r: np.cos(3 * r**2), (), 2, (5.0, 6.0), "rim"),
        (1.0, lambda r: 1 - r**2, (), 0, (1.5, 1.5), "axis"),
        (1.0, lambda r: 1 - r**2, (), 2, (1.5, 1.5), "axis"),
        (0.0, lambda r: 1.0 * (r < 0.5), (0.5,), 1, (1.0, 1.0), "interior"),
        (0.0, lambda r: np.abs(r - 0.5), (0.5,), 1, (2.0, 2.0), "interior"),
        (0.3, lambda r: r**0.3 / (2 - r**2), (), 1, (3.0, 4.0), "rim"),
        (0.0, lambda r: r * (1 + r), (), 3, (2.5, 2.5), "axis"),
        (0.0, lambda r: 1 + r**2, (), 2, (np.inf, np.inf), "none"),
    ],
)
def test_the_decay_to_expect(order, profile, breaks, m, decay, why):
    for basis, expected in zip((FourierBessel(order), Dini(order, robin=2.0)), decay, strict=True):
        e = expand(profile, basis, terms=400, breaks=breaks, lift_terms=m)
        residual = e.lift_residual
        assert residual.decay == pytest.approx(expected, abs=0.1)
        assert residual.limited_by == why
        k = np.arange(60, 400)
        b = np.abs(e.orthonormal[k - 1])
        if (np.isfinite(expected) and b.min() > 1e-13) or why in ("axis", "interior"):
            heights = [b[i : i + 40].max() for i in range(0, 320, 40)]  # a jump's coefficients go up and down
            centres = [k[i : i + 40][b[i : i + 40].argmax()] for i in range(0, 320, 40)]
            assert -np.polyfit(np.log(centres), np.log(heights), 1)[0] == pytest.approx(expected, abs=0.25)
        assert Expansion(basis, e.coefficients).lift_residual is None
