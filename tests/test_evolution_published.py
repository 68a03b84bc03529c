"""Published solutions and worked examples of conduction and sorption in a cylinder, and independent sums.

Carslaw and Jaeger, "Conduction of Heat in Solids" (1959), chapter 7; Crank, "The Mathematics of Diffusion" (1975),
chapter 5; Çengel, "Heat Transfer", the one-term table for cylinders and the example of a long shaft. Formulas and
figures from memory; every formula is summed here by itself, with roots from SciPy or mpmath.
"""

from __future__ import annotations

import mpmath as mp
import numpy as np
import pytest
from scipy.special import j0, j1, jn_zeros

from fbexpand import Dini, Expansion, FourierBessel, expand
from fbexpand.evolution import Diffusion, Wave, evolve, solve_steady

A = 1.7  # radius
D = 0.6
ALPHA = jn_zeros(0, 400) / A
R = np.linspace(0.0, A, 18)
TIMES = np.array([0.02, 0.1, 0.5, 3.0])


def series_of(decay):
    """sum_n J0(r alpha) / (alpha J1(a alpha)) times decay(alpha, t), shape (times, radii)."""
    shapes = j0(np.outer(ALPHA, R)) / (ALPHA * j1(A * ALPHA))[:, None]
    return decay(ALPHA, TIMES[:, None]) @ shapes


def rest(terms=80):
    return Expansion(FourierBessel(0.0, A), np.zeros(terms))


def test_surface_held_at_a_constant_value():
    # Crank 5.22, Carslaw and Jaeger 7.6 (10)
    wanted = 1.0 - 2.0 / A * series_of(lambda a, t: np.exp(-D * a**2 * t))
    found = evolve(rest(), Diffusion(D), TIMES, rim=1.0)
    assert np.abs(found(R) - wanted)[:, :-1].max() < 1e-11
    assert np.abs(found(A) - 1.0).max() < 1e-14
    uptake = 1.0 - np.sum(4.0 / (A * ALPHA) ** 2 * np.exp(-D * ALPHA**2 * TIMES[:, None]), axis=1)  # Crank 5.23
    assert np.abs(found.expansion.mean() - uptake).max() < 1e-11


def test_surface_that_approaches_its_value_exponentially():
    # Crank 5.27
    beta = 2.3
    w = np.sqrt(beta / D)
    wanted = (
        1.0
        - j0(w * R) / j0(w * A) * np.exp(-beta * TIMES[:, None])
        + 2.0 * beta / (A * D) * series_of(lambda a, t: np.exp(-D * a**2 * t) / (a**2 - beta / D))
    )
    found = evolve(rest(), Diffusion(D), TIMES, rim=lambda t: 1.0 - np.exp(-beta * t))
    assert np.abs(found(R) - wanted).max() < 1e-10
    assert np.abs(found(A) - (1.0 - np.exp(-beta * TIMES))).max() < 1e-14


def test_surface_that_rises_linearly():
    # Crank 5.29, Carslaw and Jaeger 7.7
    wanted = (
        TIMES[:, None]
        - (A**2 - R**2) / (4.0 * D)
        + 2.0 / (A * D) * series_of(lambda a, t: np.exp(-D * a**2 * t) / a**2)
    )
    found = evolve(rest(), Diffusion(D), TIMES, rim=lambda t: t)
    assert np.abs(found(R) - wanted).max() < 1e-10
    assert np.abs(found(A) - TIMES).max() < 1e-14


def test_heat_production_with_the_surface_at_zero():
    # Carslaw and Jaeger 7.9: v_t = D lap v + q
    q = 1.3
    wanted = q / (4.0 * D) * (A**2 - R**2) - 2.0 * q / (A * D) * series_of(lambda a, t: np.exp(-D * a**2 * t) / a**2)
    production = expand(lambda r: q + 0.0 * r, FourierBessel(0.0, A), terms=80, lift_terms=1)
    found = evolve(rest(), Diffusion(D), TIMES, source=production)
    assert np.abs(found(R) - wanted).max() < 1e-11
    decaying = expand(lambda r: q + 0.0 * r, FourierBessel(0.0, A), terms=80, lift_terms=2)
    moving = evolve(rest(), Diffusion(D), TIMES, source=lambda t: decaying * np.exp(-t))
    w = np.sqrt(1.0 / D)  # v = q (J0(w r)/J0(w a) - 1) exp(-t) + ...
    wanted = q * (j0(w * R) / j0(w * A) - 1.0) * np.exp(-TIMES[:, None]) - 2.0 * q / A * series_of(
        lambda a, t: np.exp(-D * a**2 * t) / (D * a**2 - 1.0)
    )
    assert np.abs(moving(R) - wanted).max() < 1e-10


def test_constant_flux_at_the_surface():
    # Carslaw and Jaeger 7.8 (4), conductivity 1: a v'(a) = a F
    alpha = jn_zeros(1, 400)
    flux = 0.7
    x = R / A
    tau = D * TIMES[:, None] / A**2
    rest_of_it = np.exp(-(alpha**2) * tau) @ (j0(np.outer(alpha, x)) / (alpha**2 * j0(alpha))[:, None])
    wanted = flux * A * (2.0 * tau + 0.5 * x**2 - 0.25 - 2.0 * rest_of_it)
    found = evolve(Expansion(Dini.neumann(0.0, A), np.zeros(80)), Diffusion(D), TIMES, rim=A * flux)
    assert np.abs(found(R) - wanted).max() < 1e-11


@pytest.mark.parametrize(
    ("biot", "root", "first"),
    [
        (0.01, 0.1412, 1.0025),
        (0.1, 0.4417, 1.0246),
        (0.5, 0.9408, 1.1143),
        (1.0, 1.2558, 1.2071),
        (2.0, 1.5995, 1.3384),
        (5.0, 1.9898, 1.5029),
        (10.0, 2.1795, 1.5677),
    ],
)
def test_the_one_term_table_for_a_convective_rim(biot, root, first):
    basis = Dini(robin=biot)
    series = expand(lambda r: 1.0 + 0.0 * r, basis, terms=60)
    assert abs(float(basis.roots(1)[0]) - root) < 6e-5  # the table's last digit is off by one at Bi = 2
    assert abs(float(series.coefficients[0]) - first) < 6e-5
    centre = evolve(series, Diffusion(1.0), [0.2, 1.0])(0.0)
    one_term = series.coefficients[0] * np.exp(-basis.eigenvalues(1)[0] * np.array([0.2, 1.0]))
    assert abs(one_term[0] / centre[0] - 1.0) < 0.02  # the rule of Fourier numbers above 0.2
    assert abs(one_term[1] / centre[1] - 1.0) < 1e-6


def test_the_long_steel_shaft_of_the_textbook():
    # diameter 20 cm, 600 C, in air of 200 C for 45 min: Bi = 0.537, Fo = 1.07, one term gives 364 C at the centre
    k, h, diffusivity, radius = 14.9, 80.0, 3.95e-6, 0.1
    basis = Dini.from_transfer(h, k, radius)
    assert round(basis.robin, 3) == 0.537
    seconds = 45.0 * 60.0
    assert round(diffusivity * seconds / radius**2, 2) == 1.07
    excess = expand(lambda r: 400.0 + 0.0 * r, basis, terms=30)
    full = 200.0 + evolve(excess, Diffusion(diffusivity), seconds)(0.0)
    one_term = 200.0 + excess.truncated(1).coefficients[0] * np.exp(-diffusivity * basis.eigenvalues(1)[0] * seconds)
    assert abs(one_term - 364.0) < 0.5
    assert abs(full - one_term) < 1e-4
    # the same with the air's temperature as the rim's value: R T' + Bi T = Bi 200
    hot = expand(lambda r: 600.0 + 0.0 * r, basis, terms=30)
    same = evolve(hot, Diffusion(diffusivity), seconds, rim=basis.robin * 200.0)
    assert abs(same(0.0) - full) < 1e-9


def test_centre_temperature_to_twelve_digits_of_an_independent_sum():
    series = expand(lambda r: 1.0 + 0.0 * r, Dini(robin=1.0), terms=80)
    fourier = [0.005, 0.05, 0.5]
    found = evolve(series, Diffusion(1.0), fourier)([0.0, 0.6, 1.0])
    with mp.workdps(30):
        roots = []
        for n in range(80):
            low = mp.besseljzero(1, n) if n else mp.mpf(0)
            high = mp.besseljzero(0, n + 1)
            roots.append(mp.findroot(lambda x: x * mp.besselj(1, x) - mp.besselj(0, x), (low, high), solver="anderson"))
        for i, fo in enumerate(fourier):
            for j, x in enumerate(("0", "0.6", "1")):
                total = mp.fsum(
                    2
                    * mp.besselj(1, a)
                    / (a * (mp.besselj(0, a) ** 2 + mp.besselj(1, a) ** 2))
                    * mp.exp(-(a**2) * mp.mpf(fo))
                    * mp.besselj(0, a * mp.mpf(x))
                    for a in roots
                )
                assert abs(mp.mpf(float(found[i, j])) / total - 1) < 1e-12


def test_a_membrane_rings_at_the_published_ratios():
    # frequencies of the (0, n) modes to the first: 2.295 and 3.598; from Morse and Ingard's table of a drum
    basis = FourierBessel()
    roots = basis.roots(3)
    np.testing.assert_allclose(roots / roots[0], [1.0, 2.295, 3.598], atol=6e-4)
    period = 2.0 * np.pi / roots[0]
    pluck = Expansion(basis, [1.0, 0.0, 0.0])
    assert abs(evolve(pluck, Wave(1.0), period)(0.0) - 1.0) < 1e-14
    assert abs(evolve(pluck, Wave(1.0), 0.25 * period)(0.0)) < 1e-14


def test_radial_flow_with_removal_is_the_modified_bessel_function():
    # Krogh's kind of problem: lap u = k^2 u, u(R) = 1
    from scipy.special import iv

    for k in (0.3, 4.0, 30.0):
        u = solve_steady(Expansion(FourierBessel(), np.zeros(400)), shift=k**2, rim=1.0)
        x = np.linspace(0.0, 1.0, 41)
        assert np.abs(u(x) - iv(0, k * x) / iv(0, k)).max() < 1e-9
