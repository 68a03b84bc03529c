"""Zeros of J_nu and roots of x J_nu' + robin J_nu by SciPy: scanned for, bracketed and solved; none of it ours.

The index is proven by counting. Neighbouring zeros of J_nu, nu >= 0, are more than 3.1 apart and none is below nu, so
a scan in steps of 1.5 from nu on sees every one once. x J_nu' / J_nu falls from +inf to -inf between two of them, and
from nu before the first, so there is one root of x J_nu' + robin J_nu between neighbours, and one before the first
zero where robin + nu > 0.
"""

from __future__ import annotations

import math
from collections.abc import Callable

import numpy as np
from scipy.optimize import brentq
from scipy.special import hyp0f1, ive, jv

from fbexpand.types import FloatArray

EPS = float(np.finfo(np.float64).eps)
STEP = 1.5
TINY = 1e-307


def jv_error(order: float, z: FloatArray) -> FloatArray:
    """Return the largest error of jv in units of the modulus sqrt(J^2 + Y^2), of |J| below the turning point.

    Measured against ball arithmetic (SciPy 1.17, thousands of points of order below 1000, x below 1e5) and rounded
    up: a few eps where Hankel's expansion serves, 12 for small integer orders, hundreds to millions else.
    """
    near = 12.0 if small_integer(order) else 400.0 + 6.0 * z
    return EPS * np.where(z > max(30.0, 0.5 * order * order), 4.0, near)


def small_integer(order: float) -> bool:
    """Whether jv is good to a dozen eps at every argument."""
    return order <= 10.0 and order == int(order)


def modulus(order: float, z: FloatArray, value: FloatArray) -> FloatArray:
    """Return sqrt(J^2 + Y^2) for z > order and |J| below; `value` is J."""
    from scipy.special import yv

    out = np.abs(value)
    wave = z > max(order, 1e-3)
    out[wave] = np.hypot(value[wave], yv(order, z[wave]))
    return out


class ScipyRoots:
    """Roots of one order and rim condition, robin = inf for J_nu = 0; the k-th on demand."""

    def __init__(self, order: float, robin: float) -> None:
        self.order = order
        self.robin = robin
        self._zeros: FloatArray = np.zeros(0)

    def zeros(self, count: int) -> FloatArray:
        """Return the first zeros of J_nu, at least `count` of them."""
        if self._zeros.size < count:
            order = self.order
            last = order + 1.86 * order ** (1.0 / 3.0) + 2.5 + (count + 1) * (math.pi + 0.2) + 0.2 * order
            while True:
                grid = np.arange(max(order, 1e-3), last + STEP, STEP)
                signs = jv(order, grid) > 0.0
                places = np.nonzero(signs[1:] != signs[:-1])[0]
                if places.size >= count:
                    break
                last *= 1.3
            self._zeros = np.array(
                [solve(lambda x: jv(order, x), grid[i], grid[i + 1]) for i in places[:count]], dtype=np.float64
            )
        return self._zeros

    def root(self, k: int) -> tuple[float, float, float]:
        """Return the k-th root (mu of a growing first mode) in two parts, and what the error of their sum may be."""
        if math.isinf(self.robin):
            x = float(self.zeros(k)[k - 1])
        elif k == 1:
            return self._first()
        else:
            low, high = (float(z) for z in self.zeros(k)[k - 2 : k])
            x = solve(lambda t: self._residual(t, t in (low, high)), low, high)
        for _ in range(2):  # brentq stops at 4 eps; a step of Newton's method from a double leaves the low part
            step = self._step(x)
            x, rest = x + step, step - ((x + step) - x)
        slope = max(1.0 - (self.order / x) ** 2, 1e-3) ** 0.5
        return x, rest, 2.0 * float(jv_error(self.order, np.array(x))) / slope

    def _residual(self, x: float, at_zero: bool) -> float:
        # x J' + robin J, divided by the larger of x and |robin|: no overflow, and the same zeros
        shift = self.robin + self.order
        size = max(x, abs(shift))
        value = 0.0 if at_zero else (shift / size) * jv(self.order, x)  # the rounded zero would leave its sign open
        return float(value - (x / size) * jv(self.order + 1.0, x))

    def _step(self, x: float) -> float:
        """Return the step of Newton's method from x."""
        f = jv(self.order, x)
        slope = self.order / x * f - jv(self.order + 1.0, x)
        if math.isinf(self.robin):
            return float(-f / slope)
        # d/dx (x J' + robin J) = robin J' - (x - nu^2 / x) J, by Bessel's equation; divided by the larger coefficient
        size = max(x, abs(self.robin))
        change = self.robin / size * slope - (x - self.order**2 / x) / size * f
        step = -(x / size * slope + self.robin / size * f) / change if change != 0.0 else 0.0
        return float(step) if abs(step) < 1e-9 * x else 0.0

    def _first(self) -> tuple[float, float, float]:
        order, shift = self.order, self.robin + self.order
        if self.robin == -order:
            return 0.0, 0.0, 0.0
        near = math.sqrt(2.0 * (order + 1.0)) * math.sqrt(abs(shift))
        if self.robin < -order:  # mu I_{nu+1} / I_nu = -shift; the ratio lies between mu / (2 nu + 2) and bounds
            high = math.sqrt(shift * shift + 2.0 * (order + 1.0) * abs(shift))
            x = solve(
                lambda mu: mu * ratio_i(order, mu) + shift, max(near, -shift) * (1.0 - 1e-12), high * (1.0 + 1e-12)
            )
            return x, 0.0, (64.0 + 4.0 * order) * EPS * x  # hyp0f1 loses an eps or so per unit of order
        j1 = float(self.zeros(1)[0])

        def residual(x: float) -> float:
            z = -0.25 * x * x
            first = hyp0f1(order + 1.0, z)
            return float(shift * first - x * x / (2.0 * order + 2.0) * hyp0f1(order + 2.0, z))

        low = near / math.sqrt(1.0 + 2.0 * (order + 1.0) * min(shift / (j1 * j1), 1e300))
        high = min(near, j1)
        x = solve(residual, max(low * (1.0 - 1e-12), TINY), high * (1.0 + 1e-12))
        # conditioning: d ln x / d ln shift is below 1/2, J beside its turning point at large order
        return x, 0.0, ((64.0 + 4.0 * order) * EPS + float(jv_error(order, np.array(x)))) * x


def ratio_i(order: float, mu: float) -> float:
    """Return I_{nu+1}(mu) / I_nu(mu), where neither underflows or overflows."""
    if mu * mu < 40.0 * (order + 1.0):
        z = 0.25 * mu * mu
        return float(0.5 * mu / (order + 1.0) * hyp0f1(order + 2.0, z) / hyp0f1(order + 1.0, z))
    return float(ive(order + 1.0, mu) / ive(order, mu))


def solve(function: Callable[[float], float], low: float, high: float) -> float:
    """Return the root between two ends of different sign, to rounding."""
    at_low, at_high = function(low), function(high)
    if at_low == 0.0:
        return float(low)
    if at_high == 0.0:
        return float(high)
    if (at_low > 0.0) == (at_high > 0.0):  # the root is an end, to rounding
        return float(low if abs(at_low) < abs(at_high) else high)
    return float(brentq(function, low, high, xtol=TINY, rtol=4.0 * EPS, maxiter=500))
