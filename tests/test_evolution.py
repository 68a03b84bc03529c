"""The laws, mode by mode, against closed forms at 40 digits and fields known in closed form."""

from __future__ import annotations

import mpmath as mp
import numpy as np
import pytest
from third_basis import Sines

from fbexpand import Dini, Expansion, FourierBessel, expand
from fbexpand.evolution import Diffusion, Evolution, ModalLaw, Paraxial, Wave, evolve

BASES = [
    FourierBessel(),
    FourierBessel(2.5, 3.0),
    Dini(robin=1.0, radius=2.0),
    Dini.neumann(),
    Dini(1.0, robin=-1.0),
    Dini(1.0, robin=-3.0),
    Dini(0.3, robin=-0.3 - 1e-9),
]
TIMES = [0.0, 1e-9, 1e-3, 0.1, 0.7, 2.0, 30.0, 400.0, 1e5]


def exact_root(basis, k):
    """lambda_k at 40 digits, from the rim condition; mu where the eigenvalue is negative."""
    order = mp.mpf(basis.order)
    robin = getattr(basis, "robin", None)
    start = mp.mpf(float(basis.roots(1, k)[0]))
    bessel = mp.besseli if k == 1 and basis.growing else mp.besselj
    if robin is None:
        return mp.findroot(lambda x: bessel(order, x), start)
    if start == 0:
        return start
    return mp.findroot(lambda x: x * bessel(order, x, derivative=1) + mp.mpf(robin) * bessel(order, x), start)


def exact_wave(square, g, t):
    """u and u' of u'' + 2 g u' + square u = 0 for (u, u') = (1, 0) and (0, 1) at 0."""
    omega = mp.sqrt(mp.mpc(square - g * g))
    if omega == 0:
        c, s = mp.exp(-g * t), t * mp.exp(-g * t)
    else:
        c, s = mp.exp(-g * t) * mp.cos(omega * t), mp.exp(-g * t) * mp.sin(omega * t) / omega
    c, s = mp.re(c), mp.re(s)
    return c + g * s, s, -square * s, c - g * s


def close(found, wanted, scale, tol):
    with mp.workdps(30):
        allowed = tol * max(abs(wanted), scale) + mp.mpf(10) ** -300
        return abs(mp.mpmathify(found) - wanted) <= allowed


@pytest.mark.parametrize("basis", BASES, ids=repr)
def test_every_mode_of_diffusion_decays_as_it_should(basis):
    law = Diffusion(0.7, removal=0.2)
    later = evolve(Expansion(basis, np.ones(4)), law, TIMES).expansion.coefficients
    with mp.workdps(40):
        for k in range(4):
            square = (exact_root(basis, k + 1) / mp.mpf(basis.radius)) ** 2
            if k == 0 and basis.growing:
                square = -square
            rate = mp.mpf(0.7) * square + mp.mpf(0.2)
            for t, c in zip(TIMES, later[:, k], strict=True):
                wanted = mp.exp(-rate * mp.mpf(t))
                if wanted > 1.7e308:
                    assert np.isposinf(c)
                else:
                    assert close(c, wanted, 0, 1e-12), (k, t, c, wanted)


@pytest.mark.parametrize("basis", BASES, ids=repr)
@pytest.mark.parametrize("share", [0.0, 1e-7, 0.4, 1 - 1e-13, 1.0, 1 + 1e-10, 3.0, 1e5])
def test_every_mode_of_a_wave_moves_as_it_should_through_critical_damping(basis, share):
    # the third mode is critically damped at share = 1, up to the rounding of the damping itself
    damping = share * 2.0 * float(basis.roots(1, 3)[0]) / basis.radius
    law = Wave(1.0, damping=damping)
    one, zero = Expansion(basis, np.ones(4)), Expansion(basis, np.zeros(4))
    first, second = evolve(one, law, TIMES), evolve(zero, law, TIMES, velocity=one)
    found = [series.coefficients for ev in (first, second) for series in (ev.expansion, ev.velocity)]
    with mp.workdps(400):
        g = mp.mpf(damping) / 2
        for k in range(4):
            with mp.workdps(40):
                root = exact_root(basis, k + 1)
            square = (root / mp.mpf(basis.radius)) ** 2 * (-1 if k == 0 and basis.growing else 1)
            for i, t in enumerate(TIMES):
                u, s, du, ds = exact_wave(square, g, mp.mpf(t))
                fall = mp.exp(-g * mp.mpf(t)) if square > g * g else mp.mpf(0)
                w = mp.sqrt(abs(square))
                sizes = (fall, fall / max(w, 1 / mp.mpf(t or 1)), fall * w, fall)
                wanted = (u, du, s, ds)
                for c, value, size in zip(found, wanted, (sizes[0], sizes[2], sizes[1], sizes[3]), strict=True):
                    if abs(value) > 1.7e308:
                        assert np.isinf(c[i, k])
                    else:
                        assert close(c[i, k], value, size, 1e-12), (k, t, c[i, k], mp.nstr(value, 17))


@pytest.mark.parametrize("basis", BASES, ids=repr)
def test_every_mode_of_a_beam_turns_as_it_should(basis):
    z = [-1e6, -3.0, 0.0, 1e-3, 0.5, 40.0, 1e9]
    beam = evolve(Expansion(basis, np.ones(4)), Paraxial(2.5), z).expansion.coefficients
    with mp.workdps(60):
        for k in range(4):
            square = (exact_root(basis, k + 1) / mp.mpf(basis.radius)) ** 2
            square = -square if k == 0 and basis.growing else square
            for i, distance in enumerate(z):
                wanted = mp.exp(-1j * square * mp.mpf(distance) / 5)
                assert close(beam[i, k], wanted, 0, 1e-12), (k, distance)
    if basis.eigenvalues(1)[0] == 0.0:
        assert np.all(beam[:, 0] == 1.0)


def test_damping_mode_by_mode_and_its_length():
    basis = FourierBessel()
    law = Wave(2.0, damping=[0.0, 5.0, 400.0])
    series = Expansion(basis, [1.0, 1.0, 1.0])
    together = evolve(series, law, [0.3, 1.0]).expansion.coefficients
    for k, damping in enumerate([0.0, 5.0, 400.0]):
        alone = evolve(series, Wave(2.0, damping=damping), [0.3, 1.0]).expansion.coefficients
        np.testing.assert_allclose(together[:, k], alone[:, k], rtol=1e-13)


def test_a_gaussian_in_a_wide_disk_spreads_as_in_the_plane():
    # u(r, t) = exp(-r^2 / (a + 4 D t)) a / (a + 4 D t): nothing reaches the rim
    basis = FourierBessel(0.0, 12.0)
    a, r = 0.5, np.linspace(0.0, 6.0, 61)
    series = expand(lambda x: np.exp(-(x**2) / a), basis, terms=120)
    times = np.array([0.0, 0.01, 0.3, 1.0])
    wide = a + 4.0 * 0.6 * times[:, None]
    wanted = a / wide * np.exp(-(r**2) / wide)
    found = evolve(series, Diffusion(0.6), times)(r)
    assert np.abs(found - wanted).max() < 1e-12


def test_a_paraxial_gaussian_in_a_wide_disk():
    # u = q0/q exp(i k r^2 / (2 q)), q = z - i zR; q0 = -i zR
    k, waist = 8.0, 1.0
    basis = FourierBessel(0.0, 16.0)
    rayleigh = 0.5 * k * waist**2
    series = expand(lambda x: np.exp(-(x**2) / waist**2), basis, terms=200)
    z, r = np.array([-4.0, 0.0, 1.0, 6.0]), np.linspace(0.0, 5.0, 41)
    q = z[:, None] - 1j * rayleigh
    wanted = -1j * rayleigh / q * np.exp(0.5j * k * r**2 / q)
    assert np.abs(evolve(series, Paraxial(k), z)(r) - wanted).max() < 1e-12


def test_energy_of_an_undamped_wave_over_a_million_periods_and_its_phase():
    basis = Dini(robin=0.5)
    rng = np.random.default_rng(5)
    u, v = Expansion(basis, rng.normal(size=50)), Expansion(basis, rng.normal(size=50))
    period = 2.0 * np.pi / basis.roots(1)[0]
    times = period * np.array([0.0, 0.3, 17.7, 1e3, 123456.7, 1e6])
    ev = evolve(u, Wave(1.0), times, velocity=v)
    energy = np.sum(
        basis.norms(50) * (ev.velocity.coefficients**2 + basis.eigenvalues(50) * ev.expansion.coefficients**2), axis=-1
    )
    assert np.abs(energy / energy[0] - 1.0).max() < 1e-13
    with mp.workdps(40):
        for k in (1, 2, 7, 50):
            phase = exact_root(basis, k) * mp.mpf(times[-1])
            found = evolve(Expansion(basis, np.eye(50)[k - 1]), Wave(1.0), times[-1]).expansion.coefficients[k - 1]
            assert abs(mp.mpf(found) - mp.cos(phase)) < 1e-12


def test_a_phase_at_a_time_of_1e9_that_a_root_in_double_loses():
    basis = FourierBessel()
    found = evolve(Expansion(basis, np.ones(40)), Wave(1.0), 1e9).expansion.coefficients
    naive = np.cos(basis.roots(40) * 1e9)
    with mp.workdps(40):
        wanted = np.array([float(mp.cos(exact_root(basis, k) * 10**9)) for k in range(1, 41)])
    assert np.abs(found - wanted).max() < 1e-12
    assert np.abs(naive - wanted).max() > 1e-8  # the reason for roots in two parts


def test_restarting_and_going_back():
    basis = Dini(1.0, robin=0.5)
    series = expand(lambda r: r * np.exp(-4 * r**2), basis, terms=30)
    struck = expand(lambda r: r * (1 - r), basis, terms=30)
    law = Wave(1.3, damping=0.4)
    half = evolve(series, law, 0.7, velocity=struck)
    whole = evolve(half.expansion, law, 0.9, velocity=half.velocity)
    once = evolve(series, law, 1.6, velocity=struck)
    np.testing.assert_allclose(whole.expansion.coefficients, once.expansion.coefficients, atol=1e-14)
    np.testing.assert_allclose(whole.velocity.coefficients, once.velocity.coefficients, atol=1e-13)
    there = evolve(series, Wave(1.3), 5.0, velocity=struck)
    back = evolve(there.expansion, Wave(1.3), -5.0, velocity=there.velocity)
    np.testing.assert_allclose(back.expansion.coefficients, series.coefficients, atol=1e-13)
    np.testing.assert_allclose(back.velocity.coefficients, struck.coefficients, atol=1e-12)


def test_times_in_any_order_alone_or_together_are_the_same():
    basis = Dini(robin=-1.5)
    series = expand(lambda r: np.stack([np.exp(-3 * r), np.cos(r)]), basis, terms=25)
    rng = np.random.default_rng(0)
    times, r = np.geomspace(1e-6, 20.0, 40), np.linspace(0.0, 1.0, 7)
    for law in (Diffusion(0.3, removal=1.0), Wave(0.8, damping=2.0), Paraxial(3.0)):
        together = evolve(series, law, times)
        values = together(r)
        assert values.shape == (40, 2, 7)
        order = rng.permutation(40)
        np.testing.assert_array_equal(
            evolve(series, law, times[order]).expansion.coefficients[np.argsort(order)], together.expansion.coefficients
        )
        for i in (0, 13, 39):
            alone = evolve(series, law, float(times[i]))
            assert alone(r).shape == (2, 7)
            assert alone.expansion.batch_shape == (2,)
            np.testing.assert_array_equal(alone.expansion.coefficients, together.expansion.coefficients[i])
            np.testing.assert_allclose(alone(r), values[i], rtol=1e-13, atol=1e-15)
            np.testing.assert_array_equal(together[i].expansion.coefficients, alone.expansion.coefficients)
        np.testing.assert_allclose(together.expansion(r), values, rtol=1e-12, atol=1e-14)


def test_growing_modes_are_infinite_only_where_the_value_is():
    basis = Dini(robin=-40.0)  # mu near 40: phi_1 is near exp(-40) at the axis
    series = Expansion(basis, [1e-20, 0.0, 0.0])
    rate = float(basis.eigenvalues(1)[0])
    time = 745.0 / -rate
    ev = evolve(series, Diffusion(1.0), time)
    with mp.workdps(40):
        mu = exact_root(basis, 1)
        for r in (0.0, 0.5, 1.0):
            value = mp.mpf(1e-20) * mp.exp(mu**2 * mp.mpf(time)) * mp.besseli(0, mu * r) / mp.besseli(0, mu)
            if value < 1e308:
                assert close(ev(r), value, 0, 1e-11), r
            else:
                assert np.isposinf(ev(r))
    assert np.isposinf(evolve(series, Diffusion(1.0), 900.0 / -rate).expansion.coefficients[0])
    assert evolve(series * 0.0, Diffusion(1.0), 900.0 / -rate).expansion.coefficients[0] == 0.0


def test_a_basis_of_the_users_own_and_a_law_of_the_users_own():
    basis = Sines(2.0)
    series = Expansion(basis, [1.0, -0.5, 0.25, 0.0])
    k = np.arange(1, 5)
    found = evolve(series, Diffusion(0.4), [0.0, 0.3]).expansion.coefficients
    np.testing.assert_allclose(found[1], series.coefficients * np.exp(-0.4 * (k * np.pi / 2) ** 2 * 0.3), rtol=1e-13)
    own = ModalLaw(lambda eigenvalues, t: np.exp(-0.4 * eigenvalues * t))
    np.testing.assert_allclose(evolve(series, own, [0.0, 0.3])(0.7), evolve(series, Diffusion(0.4), [0.0, 0.3])(0.7))
    twisted = ModalLaw(lambda eigenvalues, t: np.exp(1j * np.sqrt(eigenvalues) * t))
    assert evolve(series, twisted, 0.3).expansion.coefficients.dtype == np.complex128


def test_a_million_times_at_one_radius_hold_no_matrix_of_times_and_terms():
    import tracemalloc

    basis = FourierBessel()
    series = expand(lambda r: (1 - r**2) ** 2, basis, terms=60)
    times = np.linspace(0.0, 40.0, 10**6)
    ev = evolve(series, Wave(1.0), times)
    tracemalloc.start()
    sound = ev(0.0)
    peak = tracemalloc.get_traced_memory()[1]
    tracemalloc.stop()
    assert sound.shape == (10**6,)
    assert peak < 8 * 10**6 * 8  # the matrix would be 60 times the sound
    np.testing.assert_allclose(sound[777777], evolve(series, Wave(1.0), times[777777])(0.0), atol=1e-14)


def test_the_record():
    basis = FourierBessel()
    series = expand(lambda r: 1 - r**2, basis, terms=12)
    ev = evolve(series, Diffusion(1.0), [0.1, 0.2, 0.3])
    assert isinstance(ev, Evolution)
    assert len(ev) == 3
    assert [float(e.times) for e in ev] == [0.1, 0.2, 0.3]
    assert ev[1:].times.tolist() == [0.2, 0.3]
    assert ev.velocity is None
    assert ev.terms == 12
    assert repr(ev) == (
        "Evolution(Diffusion(diffusivity=1.0, removal=0.0), 3 times 0.1 to 0.3, "
        "FourierBessel(order=0.0, radius=1.0), 12 terms)"
    )
    assert not ev.times.flags.writeable
    with pytest.raises(TypeError, match="no length"):
        len(ev[0])
    with pytest.raises(IndexError):
        ev[3]
    with pytest.raises(ValueError, match="'r' must be within"):
        ev(1.5)
    with pytest.raises(AttributeError):
        ev.times = [0.0]


def test_a_single_growing_mode_that_overflows_leaves_no_other_terms():
    from fbexpand import Diffusion, Dini, Expansion, evolve

    field = evolve(Expansion(Dini(robin=-40.0), [1.0]), Diffusion(1.0), [0.0, 10.0])
    values = field(np.array([0.5, 1.0]))
    assert np.all(np.isfinite(values[0]))
    assert np.all(np.isinf(values[1]))
