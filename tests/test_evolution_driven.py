"""Sources and driven rims against solutions that are known in closed form, at the rim and everywhere else."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.special import iv, jv

from fbexpand import Dini, Expansion, FourierBessel, TruncationWarning, expand
from fbexpand.evolution import Diffusion, ModalLaw, Paraxial, Wave, evolve

R = np.linspace(0.0, 1.0, 101)
RIMS = [  # a basis of unit radius, and B u of a profile given with its slope
    (FourierBessel(), lambda u, s: u),
    (FourierBessel(2.0), lambda u, s: u),
    (Dini.neumann(), lambda u, s: s),
    (Dini(robin=2.0), lambda u, s: s + 2.0 * u),
    (Dini(1.5, robin=-1.5), lambda u, s: s - 1.5 * u),
    (Dini(0.3, robin=-0.3 + 1e-7), lambda u, s: s + (-0.3 + 1e-7) * u),
    (Dini(robin=40.0), lambda u, s: s + 40.0 * u),
]


def slope(function, order, k):
    """k f'(k) of a Bessel function."""
    step = 1.0 if function is iv else -1.0
    return order * function(order, k) + step * k * function(order + 1.0, k)


def rows(basis, profile, terms):
    """Expansions of real and imaginary part."""
    both = expand(lambda r: np.stack([profile(r).real, profile(r).imag]), basis, terms=terms)
    return both[0], both[1]


@pytest.mark.parametrize(("basis", "condition"), RIMS, ids=lambda x: repr(x) if hasattr(x, "order") else "")
@pytest.mark.parametrize("omega", [0.5, 9.0])
def test_diffusion_with_a_rim_that_oscillates(basis, condition, omega):
    # u = Re I(s r) / B I(s r) exp(i omega t), D s^2 = i omega + removal
    diffusivity, removal = 0.8, 0.6
    s = np.sqrt((1j * omega + removal) / diffusivity)
    bottom = condition(iv(basis.order, s), slope(iv, basis.order, s))
    series, _ = rows(basis, lambda r: iv(basis.order, s * r) / bottom, 60)
    times = np.array([0.0, 1e-3, 0.2, 1.0, 5.0])
    law = Diffusion(diffusivity, removal=removal)
    ev = evolve(series, law, times, rim=lambda t: np.cos(omega * t))
    wanted = (iv(basis.order, s * R) / bottom * np.exp(1j * omega * times[:, None])).real
    assert np.abs(ev(R)[1:] - wanted[1:]).max() < 1e-10
    assert np.abs(ev.expansion(R) - ev(R)).max() < 1e-11  # the closed part goes along
    if isinstance(basis, FourierBessel):
        assert np.abs(ev(1.0) - np.cos(omega * times)).max() < 1e-13


@pytest.mark.parametrize(("basis", "condition"), RIMS, ids=lambda x: repr(x) if hasattr(x, "order") else "")
@pytest.mark.parametrize("damping", [0.0, 0.4, 12.0, 300.0])
def test_a_wave_with_a_rim_that_oscillates(basis, condition, damping):
    # u = Re J(k r) / B J(k r) exp(-i omega t), k^2 = (omega^2 + i damping omega) / c^2
    speed, omega = 1.3, 2.1
    k = np.sqrt(omega**2 + 1j * damping * omega) / speed
    bottom = condition(jv(basis.order, k), slope(jv, basis.order, k))
    series, _ = rows(basis, lambda r: jv(basis.order, k * r) / bottom, 160)
    moving, _ = rows(basis, lambda r: -1j * omega * jv(basis.order, k * r) / bottom, 160)
    times = np.array([0.0, 0.03, 0.4, 1.0, 6.0])
    ev = evolve(series, Wave(speed, damping=damping), times, velocity=moving, rim=lambda t: np.cos(omega * t))
    turn = np.exp(-1j * omega * times[:, None])
    wanted = (jv(basis.order, k * R) / bottom * turn).real
    assert np.abs(ev(R)[1:] - wanted[1:]).max() < 1e-10 * max(1.0, np.abs(wanted).max())
    speeds = (-1j * omega * jv(basis.order, k * R) / bottom * turn).real
    assert np.abs(ev.velocity(R)[1:] - speeds[1:]).max() < 1e-7 * max(1.0, np.abs(speeds).max())


def test_a_beam_with_a_rim_that_turns():
    k, omega = 3.0, 4.0
    q = np.sqrt(2.0 * k * omega)
    series = expand(lambda r: jv(0, q * r) / jv(0, q), FourierBessel(), terms=60)
    z = np.array([-1.0, 1e-3, 0.1, 1.0, 7.3])
    found = evolve(series, Paraxial(k), z, rim=lambda z: np.exp(-1j * omega * z))(R)
    wanted = jv(0, q * R) / jv(0, q) * np.exp(-1j * omega * z[:, None])
    assert np.abs(found - wanted).max() < 1e-11


def test_a_steady_rim_and_a_steady_source_come_to_their_steady_state():
    basis = FourierBessel(0.0, 2.0)
    source = expand(lambda r: np.ones_like(r), basis, terms=30, lift_terms=1)
    ev = evolve(Expansion(basis, np.zeros(30)), Diffusion(0.5), [1e-2, 80.0], source=source, rim=3.0)
    r = np.linspace(0.0, 2.0, 21)
    assert np.abs(ev(r)[1] - (3.0 + (4.0 - r**2) / 4.0 / 0.5)).max() < 1e-12
    assert np.abs(ev(2.0) - 3.0).max() < 1e-14
    uniform = Dini.neumann()
    heated = evolve(Expansion(uniform, np.zeros(40)), Diffusion(0.7), [0.0, 4.0], rim=1.5)
    # flux in: mean rises as 2 D g t; the profile is quadratic
    assert np.abs(heated(R)[1] - (2 * 0.7 * 1.5 * 4.0 + 1.5 * (R**2 / 2.0 - 0.25))).max() < 1e-12
    assert np.abs(evolve(Expansion(uniform, np.zeros(40)), Diffusion(0.7), 2.0, rim=1.5).expansion.mean() - 4.2) < 1e-12


def test_wave_and_beam_with_a_steady_rim_and_source():
    basis = Dini(robin=2.0)
    f = Expansion(basis, [1.0, -0.5, 0.2])
    rest = Expansion(basis, np.zeros(3))
    w = np.sqrt(basis.eigenvalues(3)) * 1.5
    times = np.array([0.0, 1e-6, 0.3, 2.0, 50.0])
    found = evolve(rest, Wave(1.5), times, source=f)
    wanted = 2.0 * (np.sin(0.5 * w * times[:, None]) / w) ** 2 * f.coefficients
    np.testing.assert_allclose(found.expansion.coefficients, wanted, rtol=1e-9, atol=1e-16)
    beam = evolve(rest, Paraxial(2.0), times, source=f).expansion.coefficients
    rate = 1j * basis.eigenvalues(3) / 4.0
    with np.errstate(invalid="ignore"):
        np.testing.assert_allclose(beam, -np.expm1(-rate * times[:, None]) / rate * f.coefficients, atol=1e-15)


@pytest.mark.parametrize("damping", [0.0, 1e-7, 0.3, 4.0, 11.0, 11.04015, 300.0, 1e6])
@pytest.mark.parametrize("basis", [FourierBessel(), Dini.neumann(), Dini(robin=-1.0)], ids=repr)
def test_a_source_that_oscillates_moves_every_mode_of_a_wave_as_it_should(basis, damping):
    import mpmath as mp

    f, omega = Expansion(basis, np.ones(5)), 3.0
    rest = Expansion(basis, np.zeros(5))
    times = [1e-3, 0.4, 3.0]
    found = evolve(rest, Wave(1.0, damping=damping), times, source=lambda t: f * np.cos(omega * t))
    with mp.workdps(60):
        for k, square in enumerate(basis.eigenvalues(5)):
            half = mp.mpf(damping) / 2
            apart = mp.sqrt(mp.mpc(half**2 - mp.mpf(float(square))))
            a, b = apart - half, -apart - half
            i = 1j * mp.mpf(omega)
            for j, t in enumerate(times):
                # integral of (exp(a s) - exp(b s)) / (a - b) cos(omega (t - s))
                def one(e, i=i, t=t):
                    return (mp.exp(e * t) - mp.exp(i * t)) / (e - i)

                if a == b:
                    continue
                wanted = mp.re((one(a) - one(b)) / (a - b))
                size = max(abs(wanted), 1e-3 * t * t / (1 + damping * t))
                assert abs(mp.mpf(float(found.expansion.coefficients[j, k])) - wanted) < 2e-12 * size, (k, t)


def test_sources_that_move_jump_and_pulse():
    basis = FourierBessel()
    f = Expansion(basis, np.r_[1.0, -0.5, 0.25, np.zeros(37)])
    rest = Expansion(basis, np.zeros(40))
    e, times = basis.eigenvalues(40), np.array([0.0, 1e-3, 0.1, 0.5, 2.0])[:, None]
    turning = evolve(rest, Diffusion(1.0), times[:, 0], source=lambda t: f * np.cos(3.0 * t))
    wanted = (e * np.cos(3 * times) + 3 * np.sin(3 * times) - e * np.exp(-e * times)) / (e**2 + 9) * f.coefficients
    assert np.abs(turning.expansion.coefficients - wanted).max() < 1e-15
    stated = turning.expansion.error_estimate().quadrature
    assert stated.max() < 1e-14
    off = evolve(rest, Diffusion(1.0), times[:, 0], source=lambda t: f * (1.0 if t < 0.3 else 0.0))
    wanted = (1 - np.exp(-e * np.minimum(times, 0.3))) / e * np.exp(-e * np.maximum(times - 0.3, 0.0)) * f.coefficients
    assert np.abs(off.expansion.coefficients - wanted).max() < 1e-14
    pulse = evolve(rest, Diffusion(1.0), [0.4, 0.5], source=lambda t: f * np.exp(-(((t - 0.3) / 0.01) ** 2)))
    area = 0.01 * np.sqrt(np.pi) * np.exp(e[:3] ** 2 * 0.01**2 / 4.0)
    wanted = area * np.exp(-e[:3] * np.array([[0.1], [0.2]])) * f.coefficients[:3]
    np.testing.assert_allclose(pulse.expansion.coefficients[:, :3], wanted, rtol=1e-10)


def test_a_source_in_a_batch_and_with_more_terms():
    basis = FourierBessel()
    rest = Expansion(basis, np.zeros((2, 1, 3)))

    def source(t):
        return Expansion(basis, np.outer([1.0, 2.0, 3.0], [1.0, 0.0, 0.5, 0.0, t]))

    ev = evolve(rest, Diffusion(1.0), [0.1, 0.2], source=source)
    assert ev.expansion.coefficients.shape == (2, 2, 3, 5)
    assert ev(0.5).shape == (2, 2, 3)
    np.testing.assert_allclose(ev.expansion.coefficients[:, :, 2], 3.0 * ev.expansion.coefficients[:, :, 0], rtol=1e-14)


def test_a_law_of_the_users_own_with_a_source_agrees_with_the_closed_form():
    basis = FourierBessel()
    f = Expansion(basis, np.r_[1.0, -0.5, 0.25, np.zeros(17)])
    rest = Expansion(basis, np.zeros(20))
    own, known = ModalLaw(lambda e, t: np.exp(-e * t)), Diffusion(1.0)
    times = [0.5, 0.0, 2.0, 1e-3]
    for source in (f, lambda t: f * np.cos(3.0 * t)):
        first, second = (evolve(rest, law, times, source=source).expansion for law in (own, known))
        assert np.abs(first.coefficients - second.coefficients).max() < 1e-14
        assert first.error_estimate().quadrature.max() < 1e-13


def test_a_rim_that_is_switched_on_later_is_the_same_rim_later():
    basis = FourierBessel()
    rest = Expansion(basis, np.zeros(100))
    for law in (Diffusion(1.0), Wave(1.0, damping=0.5)):
        front = pytest.warns(TruncationWarning, match="fronts") if isinstance(law, Wave) else _nothing()
        with front:
            late = evolve(rest, law, [0.2, 0.5, 1.0], rim=lambda t: 1.0 if t > 0.3 else 0.0)
            soon = evolve(rest, law, [0.2, 0.7], rim=1.0)
        assert np.all(late(R)[0] == 0.0)
        assert np.abs(late(R)[1:] - soon(R)).max() < 1e-12


def _nothing():
    from contextlib import nullcontext

    return nullcontext()


def test_a_restart_goes_on_with_the_rim():
    basis = Dini(robin=3.0)
    series = expand(lambda r: 1.0 - 0.5 * r**2, basis, terms=50)
    law = Diffusion(0.2)
    once = evolve(series, law, 1.1, rim=2.0)
    half = evolve(series, law, 0.4, rim=2.0)
    assert half.expansion.closed_part is not None
    again = evolve(half.expansion, law, 0.7, rim=2.0)
    assert np.abs(once(R) - again(R)).max() < 1e-13
    free = evolve(half.expansion, law, 0.7)  # a closed part is turned into coefficients
    assert np.abs(free(0.0) - evolve(series, law, [1.1], rim=lambda t: 2.0 if t <= 0.4 else 0.0)(0.0)) < 1e-10
