"""Profiles whose integrals against J_nu(lambda x) x or I_nu(mu x) x are known, in ball arithmetic.

Every profile lives on the unit radius and is given twice: as a NumPy function, and as the exact integral
over [0, 1] for a root of any size. The integrals are

- of powers, x^(a+1) J_nu(z x), by the power series of J, which covers polynomials and Gaussians;
- Sonine's first finite integral, for x^nu (1 - x^2)^m (Watson, Bessel Functions, 12.11);
- Lommel's, for products of two Bessel functions (Watson 5.11);
- over part of the radius, for steps (Watson 5.1);
- of log x at order 0, by parts.
"""

from __future__ import annotations

from functools import lru_cache

import mpmath as mp
import numpy as np
from basis_references import from_ball, to_ball
from flint import arb, ctx


def working_bits(z):
    """Enough for the cancellation in a series whose terms reach exp(z)."""
    return int(1.6 * float(z)) + 260


def checked(ball, size):
    """The ball's middle, after making sure that 90 bits of `size` are right."""
    assert float(ball.rad()) <= float(size) * 2.0**-90, ball
    return from_ball(ball)


@lru_cache(maxsize=4096)
def _series(sigma, order, z):
    """The coefficients of (z/2)^(2j + order) in the series of J (sigma = -1) or I, as balls with z in them."""
    ctx.prec = working_bits(z)
    nu, half = to_ball(order), to_ball(z) / 2
    square = half * half * sigma
    term = half ** (nu) / (nu + 1).gamma()
    terms = []
    j = 0
    limit = arb(2) ** -ctx.prec
    while True:
        terms.append(term)
        j += 1
        term = term * square / (j * (nu + j))
        if j > float(z) and abs(term) < limit:
            return terms


def power(sigma, order, z, a):
    """integral_0^1 x^(a + 1) C(z x) dx for C = J_order or I_order."""
    terms = _series(sigma, float(order), mp.mpf(z))
    ctx.prec = working_bits(z)
    start = to_ball(order) + to_ball(a) + 2
    total = arb(0)
    for j, term in enumerate(terms):
        total += term / (start + 2 * j)
    return total


def cylinder_ball(sigma, order, z, shift=0):
    """J or I of order + shift at z."""
    ctx.prec = working_bits(z)
    nu = to_ball(order) + shift
    return to_ball(z).bessel_j(nu) if sigma < 0 else to_ball(z).bessel_i(nu)


class Power:
    """x^a, a real."""

    def __init__(self, a, times=1.0):
        self.a, self.times = a, times

    def __call__(self, x):
        return self.times * x**self.a

    def integral(self, sigma, order, z):
        return to_ball(self.times) * power(sigma, order, z, self.a)


class Polynomial:
    """sum c_i x^(a_i)."""

    def __init__(self, **terms):
        self.parts = [Power(float(name[1:].replace("_", ".")), c) for name, c in terms.items()]

    def __call__(self, x):
        return sum(part(x) for part in self.parts)

    def integral(self, sigma, order, z):
        return sum((part.integral(sigma, order, z) for part in self.parts), arb(0))


class Gaussian:
    """x^a exp(-s x^2), for s up to about 10."""

    def __init__(self, s, a=0.0):
        self.s, self.a = s, a

    def __call__(self, x):
        return x**self.a * np.exp(-self.s * x * x)

    def integral(self, sigma, order, z):
        total, factor = arb(0), arb(1)
        for m in range(110):
            total += factor * power(sigma, order, z, self.a + 2 * m)
            factor *= -to_ball(self.s) / (m + 1)
        return total


class Sonine:
    """x^order (1 - x^2)^m, m > -1."""

    def __init__(self, m):
        self.m = m

    def at_order(self, order):
        return lambda x: x**order * ((1.0 - x) * (1.0 + x)) ** self.m

    def integral(self, sigma, order, z):
        value = cylinder_ball(sigma, order, z, to_ball(self.m) + 1)
        m = to_ball(self.m)
        return arb(2) ** (m) * (m + 1).gamma() * value / to_ball(z) ** (m + 1)


class Lommel:
    """J_order(b x)."""

    def __init__(self, b):
        self.b = b

    def at_order(self, order):
        from scipy.special import jv

        return lambda x: jv(order, self.b * x)

    def integral(self, sigma, order, z):
        ctx.prec = working_bits(z)
        b, w, nu = to_ball(self.b), to_ball(z), to_ball(order)
        jb, jb1 = b.bessel_j(nu), b.bessel_j(nu + 1)
        c, c1 = cylinder_ball(sigma, order, z), cylinder_ball(sigma, order, z, 1)
        # x J_nu(b x) C_nu(w x), integrated: (b J_{nu+1}(b) C(w) + sigma w J(b) C_{nu+1}(w)) / (b^2 + sigma w^2)
        return (b * jb1 * c + sigma * w * jb * c1) / (b * b + sigma * w * w)


class Step:
    """x^order inside x < edge, 0 outside."""

    def __init__(self, edge):
        self.edge = edge

    def at_order(self, order):
        return lambda x: np.where(x < self.edge, x**order, 0.0)

    def integral(self, sigma, order, z):
        ctx.prec = working_bits(z)
        edge, w = to_ball(self.edge), to_ball(z)
        nu = to_ball(order)
        inner = (w * edge).bessel_j(nu + 1) if sigma < 0 else (w * edge).bessel_i(nu + 1)
        return edge ** (nu + 1) * inner / w


class Log:
    """log x, at order 0."""

    def __call__(self, x):
        return np.log(x)

    def integral(self, sigma, order, z):
        assert order == 0.0
        return sigma * (cylinder_ball(sigma, 0.0, z) - 1) / (to_ball(z) * to_ball(z)) * -1


def coefficient(reference, profile, k):
    """c_k of a profile on a reference basis (basis_references.ReferenceBasis), and the norm, as mpf."""
    z = reference.root(k)
    norm = reference.norm(k)
    sigma, order = reference.sigma(k), reference.order
    if z == 0:  # the mode x^order
        ctx.prec = 300
        value = from_ball(zero_mode_integral(profile, order))
    else:
        ball = profile.integral(sigma, order, z)
        value = from_ball(ball)
        if reference.scaled(k):
            height = from_ball(cylinder_ball(sigma, order, z))
            value /= height
            ball_error = mp.mpf(float(ball.rad())) / abs(height)
        else:
            ball_error = mp.mpf(float(ball.rad()))
        assert ball_error <= mp.mpf(2) ** -80 * mp.sqrt(norm), (k, ball_error)
    return value / norm, norm


def zero_mode_integral(profile, order):
    """integral_0^1 f x^(order + 1) dx as the limit of the integrals for z -> 0, times Gamma(order + 1) (2/z)^order."""
    z = mp.mpf(2) ** -120
    ctx.prec = 900
    scale = (to_ball(order) + 1).gamma() * (2 / to_ball(z)) ** (to_ball(order))
    return profile.integral(-1, order, z) * scale
