"""Profiles whose integrals against the modes are known in closed form, and those integrals in ball arithmetic.

Every profile is a function of x = r/R and the order nu; its integral of f phi_k x dx over [0, 1] is written
with q(m, a) = C_{nu+m}(lambda a) / (lambda^m scale), C = J or I, with A = 2^nu Gamma(nu + 1) lim phi_k / x^nu
at the axis, and with the eigenvalue e. Written so, the formulas hold for an oscillating, a zero and a growing
mode alike. Sources (from memory): Sonine's first and second finite integrals, Watson, Theory of Bessel
functions, 12.11 and 12.13; Lommel's integrals, Watson 5.11; the Gaussian, DLMF 10.22.51; powers by
term-by-term integration; the logarithm by parts.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import NamedTuple

import mpmath as mp
import numpy as np
from basis_references import ReferenceBasis, cylinder, from_ball, to_ball
from flint import ctx
from scipy.special import j0, j1


class Mode:
    """The k-th mode of a reference basis on the unit radius."""

    def __init__(self, reference: ReferenceBasis, k: int) -> None:
        self.nu = mp.mpf(reference.order)
        self.root, self.sigma = reference.root(k), reference.sigma(k)
        self.eigenvalue = -self.sigma * self.root**2
        self.norm = reference.norm(k)
        self.scale = mp.mpf(1)
        self._known = {}
        if reference.scaled(k) and self.root:
            self.scale = cylinder(self.sigma, self.nu, self.root)[0]

    def q(self, m, a=1):
        """C_{nu+m}(lambda a) / (lambda^m scale)."""
        m, a = mp.mpf(m), mp.mpf(a)
        if (m, a) not in self._known:
            if self.root:
                value = cylinder(self.sigma, self.nu + m, self.root * a)[0] / self.root**m / self.scale
            else:
                value = a ** (self.nu + m) * mp.gamma(self.nu + 1) / (2**m * mp.gamma(self.nu + m + 1))
            self._known[m, a] = value
        return self._known[m, a]

    @property
    def axis(self):
        """2^nu Gamma(nu + 1) times the limit of phi_k / x^nu at the axis."""
        return self.root**self.nu / self.scale if self.root else 2**self.nu * mp.gamma(self.nu + 1)


def entire(order, square):
    """J_order(w) / w^order as a function of w^2 of either sign."""
    w = mp.sqrt(abs(square))
    return cylinder(-1 if square > 0 else 1, order, w)[0] / w**order


def power_series(numerator, first, second, z):
    """1F2(numerator; first, second; z) by ball arithmetic."""
    working = 256
    while working < 100_000:
        ctx.prec = working
        ball = to_ball(z).hypgeom([to_ball(numerator)], [to_ball(first), to_ball(second)])
        if ball.rel_accuracy_bits() >= 150:
            return from_ball(ball)
        working *= 2
    raise ArithmeticError("no accuracy")


class ClosedForm(NamedTuple):
    """A profile of x and nu; its integral against a mode; where it jumps; whether it suits order and growth."""

    profile: Callable
    integral: Callable
    breaks: tuple[float, ...] = ()
    applies: Callable = lambda order, robin: True


def step(low, high):
    """x^nu between two radii, 0 elsewhere."""

    def integral(mode):
        outer = mp.mpf(high) ** (mode.nu + 1) * mode.q(1, high)
        return outer - (mp.mpf(low) ** (mode.nu + 1) * mode.q(1, low) if low else 0)

    return ClosedForm(
        lambda x, nu: np.where((x > low) & (x < high), x**nu, 0.0),
        integral,
        tuple(x for x in (low, high) if 0.0 < x < 1.0),
    )


def sonine_first(p, a=1.0):
    """x^nu (a^2 - x^2)^p up to a, 0 beyond."""

    def integral(mode):
        return 2 ** mp.mpf(p) * mp.gamma(p + 1) * mp.mpf(a) ** (mode.nu + p + 1) * mode.q(p + 1, a)

    return ClosedForm(
        lambda x, nu: x**nu * np.where(x < a, np.maximum((a - x) * (a + x), 0.0) ** p, 0.0),
        integral,
        (a,) if a < 1.0 else (),
    )


def sonine_second(mu, b):
    """x^nu (1 - x^2)^(mu/2) J_mu(b sqrt(1 - x^2)), mu = 0 or 1: smooth at the rim."""

    def profile(x, nu):
        w = np.sqrt((1.0 - x) * (1.0 + x))
        return x**nu * (j0(b * w) if mu == 0 else w * j1(b * w))

    return ClosedForm(
        profile,
        lambda mode: mode.axis * mp.mpf(b) ** mu * entire(mode.nu + mu + 1, mode.eigenvalue + mp.mpf(b) ** 2),
    )


def lommel(square):
    """Gamma(nu + 1) (2/b)^nu times J_nu(b x) (square = -b^2) or I_nu(b x) (square = b^2)."""

    def profile(x, nu):
        t = square * x * x / 4.0
        total, term = np.ones_like(x), np.ones_like(x)
        for m in range(1, 60):
            term = term * t / (m * (m + nu))
            total = total + term
        return x**nu * total

    def integral(mode):
        b, sign = mp.sqrt(abs(mp.mpf(square))), 1 if square > 0 else -1
        value, above = (cylinder(sign, order, b)[0] for order in (mode.nu, mode.nu + 1))
        numerator = mode.eigenvalue * mode.q(1) * value + sign * b * above * mode.q(0)
        return mp.gamma(mode.nu + 1) * (2 / b) ** mode.nu * numerator / (mode.eigenvalue + square)

    return ClosedForm(profile, integral)


def gaussian(s):
    """x^nu exp(-s x^2), s real or complex: expanded in powers of 1 - x^2, each of them Sonine's."""

    def integral(mode):
        z, total, factor = mp.mpmathify(s), mp.mpf(0), mp.mpf(1)
        for m in range(200):
            added = factor * mode.q(m + 1)
            total += added
            if m > 4 and abs(added) < mp.mpf(10) ** -25 * abs(total):
                break
            factor *= 2 * z
        return mp.exp(-z) * total

    return ClosedForm(lambda x, nu: x**nu * np.exp(-s * x * x), integral)


def narrow_gaussian(s):
    """x^nu exp(-s x^2) with s so large that nothing is left at the rim: the integral to infinity."""
    return ClosedForm(
        lambda x, nu: x**nu * np.exp(-s * x * x),
        lambda mode: mode.axis / mp.mpf(2 * s) ** (mode.nu + 1) * mp.exp(-mode.eigenvalue / (4 * mp.mpf(s))),
        (),
        lambda order, robin: order < 3.0 and robin > -50.0,  # else what is at the rim counts
    )


def power(beta):
    """x^beta at whatever order: beta = 0 is the constant."""

    def integral(mode):
        total = mp.mpf(beta) + mode.nu + 2
        series = power_series(total / 2, total / 2 + 1, mode.nu + 1, -mode.eigenvalue / 4)
        return mode.axis / (2**mode.nu * mp.gamma(mode.nu + 1)) / total * series

    # at a growth like exp(1e6) the series takes too long
    return ClosedForm(lambda x, nu: x**beta, integral, (), lambda order, robin: robin > -1e5)


def logarithm():
    """log x, at order 0."""

    def integral(mode):
        return (mode.q(0) - mode.axis) / mode.eigenvalue if mode.root else -mp.mpf(1) / 4

    return ClosedForm(lambda x, nu: np.log(x), integral, (), lambda order, robin: order == 0.0)


FORMS = {
    "x^nu": step(0.0, 1.0),
    "step at 0.3": step(0.0, 0.3),
    "ring from 0.25 to 0.7": step(0.25, 0.7),
    "x^nu (x^2 - 1/2)": ClosedForm(lambda x, nu: x**nu * (x * x - 0.5), lambda mode: mode.q(1) / 2 - 2 * mode.q(2)),
    "x^nu (1 - x^2)": sonine_first(1.0),
    "x^nu (1 - x^2)^3": sonine_first(3.0),
    "x^nu (1 - x^2)^2.5": sonine_first(2.5),
    "x^nu (1 - x^2)^0.5": sonine_first(0.5),
    "x^nu (0.36 - x^2) to 0.6": sonine_first(1.0, 0.6),
    "J_0(7 w), w^2 = 1 - x^2": sonine_second(0, 7.0),
    "w J_1(5 w)": sonine_second(1, 5.0),
    "J_nu(4 x)": lommel(-16.0),
    "I_nu(3 x)": lommel(9.0),
    "Gaussian, s = 3": gaussian(3.0),
    "Gaussian, s = 2 + 7i": gaussian(2.0 + 7.0j),
    "Gaussian, s = 60": narrow_gaussian(60.0),
    "Gaussian, s = 4000": narrow_gaussian(4000.0),
    "constant": power(0.0),
    "x^0.01": power(0.01),
    "x^0.7": power(0.7),
    "x^2.5": power(2.5),
    "log x": logarithm(),
}


def forms_for(order, robin):
    """The profiles that suit a basis."""
    return {name: form for name, form in FORMS.items() if form.applies(order, robin)}
