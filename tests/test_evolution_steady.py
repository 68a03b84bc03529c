"""Steady states: against closed forms, singular and nearly singular, with the rim, in every basis."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.special import iv, jv
from third_basis import Sines

from fbexpand import Dini, Expansion, FourierBessel, expand
from fbexpand.evolution import Diffusion, evolve, solve_steady

R = np.linspace(0.0, 1.0, 51)


def ones(r):
    return np.ones_like(r)


@pytest.mark.parametrize("lift", [1, 2])
@pytest.mark.parametrize("shift", [0.0, 9.0, -2.0])
def test_a_uniform_source_in_a_disk(lift, shift):
    f = expand(ones, FourierBessel(), terms=40, lift_terms=lift)
    u, held = solve_steady(f, shift=shift), solve_steady(f, shift=shift, rim=2.0)
    k = np.sqrt(abs(shift))
    shape = iv(0, k * R) / iv(0, k) if shift >= 0 else jv(0, k * R) / jv(0, k)
    wanted = (1.0 - R**2) / 4.0 if shift == 0 else (1.0 - shape) / shift
    assert np.abs(u(R) - wanted).max() < 1e-12
    assert np.abs(held(R) - wanted - 2.0 * shape).max() < 1e-12
    assert u.error_estimate().sup < 1e-12


@pytest.mark.parametrize("basis", [Dini(robin=2.0), Dini(2.5, robin=0.3), Dini(robin=-1.5), Dini(robin=1e-9)], ids=repr)
def test_rims_of_the_third_kind(basis):
    n = basis.order
    u = solve_steady(Expansion(basis, np.zeros(60)), rim=3.0)
    assert np.abs(u(R) - 3.0 * R**n / (n + basis.robin)).max() < 1e-12 * 3.0 / abs(n + basis.robin)


def test_the_truncation_is_estimated_where_nothing_is_lifted():
    f = expand(ones, FourierBessel(), terms=40)
    u = solve_steady(f)
    error = np.abs(u(R) - (1.0 - R**2) / 4.0).max()
    assert error < u.error_estimate().sup < 10.0 * error
    np.testing.assert_allclose(u.coefficients, f.coefficients / FourierBessel().eigenvalues(40), rtol=1e-14)
    assert u.closed_part is None


def test_singular_equations_are_solved_where_nothing_drives_the_mode():
    neumann = Dini.neumann()
    u = solve_steady(expand(ones, neumann, terms=30), rim=-0.5)  # -lap u = 1, u' = -1/2
    assert np.abs(u(R) - (1 / 8 - R**2 / 4)).max() < 1e-14  # its mean is left out
    corner = Dini(1.0, robin=-1.0)
    u = solve_steady(expand(lambda r: r, corner, terms=30), rim=-0.25)  # u = -r^3/8 + c r
    left = u(R) + R**3 / 8
    assert np.abs(left - left[-1] * R).max() < 1e-14
    f = expand(lambda r: 1 - 2 * r**2, neumann, terms=60)
    assert np.abs(solve_steady(f)(R) - solve_steady(f)(0.0) + R**2 / 4 - R**4 / 8).max() < 1e-6


def test_singular_equations_with_a_driven_mode_say_so():
    neumann = Dini.neumann()
    for call in (
        lambda: solve_steady(expand(ones, neumann, terms=9)),
        lambda: solve_steady(Expansion(neumann, np.zeros(9)), rim=1.0),
        lambda: solve_steady(expand(ones, Dini(robin=-1.0), terms=9), shift=-Dini(robin=-1.0).eigenvalues(1)[0]),
        lambda: solve_steady(Expansion(FourierBessel(), np.ones(9)), shift=-FourierBessel().eigenvalues(4)[3]),
    ):
        with pytest.raises(ValueError, match="no steady state"):
            call()
    u = solve_steady(Expansion(FourierBessel(), [1.0, 0.0, 2.0]), shift=-FourierBessel().eigenvalues(2)[1])
    assert u.coefficients[1] == 0.0
    with pytest.raises(ValueError, match=r"mode 1.*field 1 of the batch"):
        solve_steady(Expansion(neumann, [[0.0, 1.0], [1.0, 1.0]]))


def test_nearly_singular_equations_state_their_condition():
    basis = Dini(robin=-1.0)
    f = Expansion(basis, [1.0, 1.0])
    shift = -basis.eigenvalues(1)[0] * (1 + 1e-10)
    with pytest.warns(RuntimeWarning, match=r"nearly singular: shift \+ eigenvalue of mode 1 .* condition is 2e\+10"):
        u = solve_steady(f, shift=shift)
    assert u.error_estimate().quadrature > 1e-7 * u.norm()


def test_a_small_robin_coefficient_is_not_nearly_singular():
    # the eigenvalue is known to an eps of itself, however small
    basis = Dini(robin=1e-13)
    u = solve_steady(expand(ones, basis, terms=30), rim=0.0)
    assert np.abs(u(R) * 1e-13 / 0.5 - 1.0).max() < 1e-12


def test_diffusion_settles_to_it_and_any_basis_will_do():
    basis = Sines(2.0)
    f = Expansion(basis, [[1.0, 0.5, 0.25], [1j, 0.0, 1.0]])
    u = solve_steady(f, shift=0.3)
    later = evolve(f * 0.0, Diffusion(0.5, removal=0.15), 1e3, source=f * 0.5)
    np.testing.assert_allclose(u.coefficients, later.expansion.coefficients, rtol=1e-13)
    with pytest.raises(ValueError, match="'rim' must be None on a basis whose rim condition is not known"):
        solve_steady(f, rim=1.0)


def test_batches_and_complex_rims():
    f = expand(lambda r: np.stack([ones(r), r]), FourierBessel(), terms=20, lift_terms=1)
    u = solve_steady(f, rim=np.array([[1.0], [2j], [0.0]]))
    assert u.batch_shape == (3, 2)
    np.testing.assert_allclose(u(1.0), [[1.0, 1.0], [2j, 2j], [0.0, 0.0]], atol=1e-14)


def test_bad_input():
    f = Expansion(FourierBessel(), [1.0])
    for call, error, match in (
        (lambda: solve_steady(1.0), TypeError, "'expansion' must be an Expansion"),
        (lambda: solve_steady(f, shift=1j), TypeError, "'shift' must be a real number"),
        (lambda: solve_steady(f, shift=np.nan), ValueError, "'shift' must be finite"),
        (lambda: solve_steady(f, rim="hot"), TypeError, "'rim' must be numbers"),
        (lambda: solve_steady(f, rim=np.inf), ValueError, "'rim' must be finite"),
        (lambda: solve_steady(f, rim=lambda t: t), TypeError, "'rim' must be a number"),
    ):
        with pytest.raises(error, match=match):
            call()
