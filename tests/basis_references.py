"""Roots, norms and modes of the bases in ball arithmetic (python-flint): the other road for the tests.

Values are mpmath numbers of about 60 digits, taken from balls that are proven narrower than that.
"""

from __future__ import annotations

import math

import mpmath as mp
from flint import arb, ctx

from fbexpand.bases import Dini, FourierBessel

EPS = 2.0**-52
mp.mp.dps = 60


def to_ball(x):
    """An mpf or float as an exact ball."""
    sign, mantissa, exponent, _ = mp.mpf(x)._mpf_
    return arb((int(-mantissa if sign else mantissa), int(exponent)))


def from_ball(ball):
    mantissa, exponent = ball.mid().man_exp()
    return mp.ldexp(mp.mpf(int(mantissa)), int(exponent))


def cylinder(sigma, order, z, bits=220):
    """J (sigma = -1) or I (sigma = 1) and its derivative at z > 0, at an exact order."""
    name = "bessel_i" if sigma > 0 else "bessel_j"
    working = 256
    while True:
        ctx.prec = working
        ball = to_ball(z)
        value = getattr(ball, name)(to_ball(order))
        above = getattr(ball, name)(to_ball(order) + 1)
        if min(value.rel_accuracy_bits(), above.rel_accuracy_bits()) >= bits:
            break
        working *= 2
        if working > 500_000:
            raise ArithmeticError(f"no accuracy at order {order}, z {z}")
    mp.mp.prec = max(mp.mp.prec, bits)
    value, above = from_ball(value), from_ball(above)
    return value, mp.mpf(order) / z * value + sigma * above


class ReferenceBasis:
    """The same basis from ball arithmetic on the unit radius: exact roots, norms and modes."""

    def __init__(self, order, robin):
        self.order, self.robin = float(order), float(robin)  # robin = inf: f(R) = 0
        self._roots = {}

    def basis(self, radius=1.0):
        if math.isinf(self.robin):
            return FourierBessel(self.order, radius)
        return Dini(self.order, radius, robin=self.robin)

    def sigma(self, k):
        return 1 if k == 1 and self.robin < -self.order else -1

    def scaled(self, k):
        return k == 1 and (self.robin < 0 or self.robin == -self.order)

    def root(self, k):
        """lambda_k (mu for the growing mode) by Newton's method from the library's double, which must be
        near."""
        if k not in self._roots:
            self._roots[k] = self._newton(k)
        return self._roots[k]

    def _newton(self, k):
        start = z = mp.mpf(float(self.basis().roots(1, k)[0]))
        if z == 0:
            assert self.robin == -self.order
            return z
        sigma, order, robin = self.sigma(k), mp.mpf(self.order), mp.mpf(self.robin)
        for _ in range(6):
            value, slope = cylinder(sigma, self.order, z)
            if mp.isinf(robin):
                step = value / slope
            elif abs(robin) > 10 * z:  # value + z slope / robin, which has no pole near the root
                change = slope + ((order * order / z + sigma * z) * value) / robin
                step = (value + z * slope / robin) / change
            else:
                log_slope = z * slope / value
                step = (log_slope + robin) / ((order**2 + sigma * z * z - log_slope**2) / z)
            z -= step
            if abs(step) < mp.mpf(10) ** -45 * z:
                break
        assert abs(z - start) < 8 * EPS * start, (self.order, self.robin, k, start, z)
        return z

    def norm(self, k):
        """The integral of phi_k^2 x dx over [0, 1]."""
        z, order, robin = self.root(k), mp.mpf(self.order), mp.mpf(self.robin)
        if z == 0:
            return 1 / (2 * order + 2)
        sigma = self.sigma(k)
        if self.scaled(k):
            return (1 - sigma * (robin**2 - order**2) / z**2) / 2
        value, slope = cylinder(sigma, self.order, z)
        if mp.isinf(robin):
            return slope**2 / 2
        if abs(robin) > 1:
            return slope**2 * (1 + (z * z - order**2) / robin**2) / 2
        return value**2 * (1 + (robin**2 - order**2) / z**2) / 2

    def mode(self, k, x, n=0):
        """d^n phi_k / dx^n at x > 0, an mpf."""
        z, sigma, order, robin = self.root(k), self.sigma(k), mp.mpf(self.order), mp.mpf(self.robin)
        if z == 0:
            factor = mp.mpf(1)
            for i in range(n):
                factor *= order - i
            return factor * x ** (order - n)
        at = z * x
        d = list(cylinder(sigma, self.order, at))
        if x == 1 and not self.scaled(k):  # the rim condition holds exactly, the root has but 45 digits
            if mp.isinf(robin):
                d[0] = mp.mpf(0)
            elif abs(robin) > z:
                d[0] = -z * d[1] / robin
            else:
                d[1] = -robin * d[0] / z
        for j in range(n - 1):  # Bessel's equation, differentiated
            following = (2 * j + 1) * at * d[j + 1] + (j * j - order**2 - sigma * at * at) * d[j]
            if j >= 1:
                following -= sigma * 2 * j * at * d[j - 1]
            if j >= 2:
                following -= sigma * j * (j - 1) * d[j - 2]
            d.append(-following / at**2)
        value = d[n] * z**n
        return value / cylinder(sigma, self.order, z)[0] if self.scaled(k) else value
