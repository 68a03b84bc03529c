"""The modes by mpmath, to as many digits as asked for: SciPy's roots are only where Newton's method starts."""

from __future__ import annotations

import math
from typing import Any

import numpy as np

from fbexpand.crosscheck.modes import Mode, ScipyModes
from fbexpand.crosscheck.scipy_roots import EPS
from fbexpand.types import FloatArray


class MpmathModes:
    """Modes whose roots, J_nu and norms have `digits` digits; rounded to double where they meet the profile."""

    name = "mpmath"

    def __init__(self, order: float, robin: float, radius: float, digits: int) -> None:
        try:
            import mpmath
        except ImportError as error:
            raise ImportError("digits= needs mpmath: python -m pip install mpmath") from error
        self.mp = mpmath.mp.clone()  # its own precision: the global one is the user's
        self.mp.dps = digits + 8
        self.digits = digits
        self.near = ScipyModes(order, robin, radius)
        self.order = self.mp.mpf(order)
        self.robin = math.inf if math.isinf(robin) else self.mp.mpf(robin)
        self.radius = self.mp.mpf(radius)

    def mode(self, k: int) -> Mode:
        """Return the k-th mode."""
        mp, order = self.mp, self.order
        start, _, error = self.near.roots.root(k)
        first = k == 1 and (self.robin < 0 or self.robin == -order)
        growing = k == 1 and self.robin < -order
        bessel = mp.besseli if growing else mp.besselj
        if start == 0.0:
            root = mp.mpf(0)
            return self._made(root, lambda x: x**order, self.radius**2 / (2 * order + 2), np.zeros(0))
        # near the corner the norm's formula cancels; so many digits more make up for it
        mp.dps = self.digits + 8 + int(2.0 * max(0.0, math.log10((float(order) + 1.0) / start))) + 2
        root = self._solve(start, max(error, 8.0 * EPS * start), growing)
        rim = bessel(order, root)
        slope = order / root * rim + (1 if growing else -1) * bessel(order + 1, root)
        if growing:
            norm = ((1 + (order / root) ** 2) * rim**2 - slope**2) / 2
        else:
            norm = (slope**2 + (1 - (order / root) ** 2) * rim**2) / 2
        scale = rim if first else mp.mpf(1)
        cuts = np.zeros(0) if first else self.near.cuts(float(root))
        return self._made(root, lambda x: bessel(order, root * x) / scale, self.radius**2 * norm / scale**2, cuts)

    def _made(self, root: Any, shape: Any, norm: Any, cuts: FloatArray) -> Mode:
        mp, radius = self.mp, self.radius

        def value(r: float) -> float:
            return float(shape(mp.mpf(r) / radius))

        def values(r: FloatArray) -> FloatArray:
            return np.array([value(float(x)) for x in r])

        def spread(r: FloatArray, phi: FloatArray) -> FloatArray:
            return EPS * np.abs(phi)

        return Mode(float(root), EPS * abs(float(root)), value, values, spread, cuts, float(norm), EPS * float(norm))

    def _solve(self, start: float, error: float, growing: bool) -> Any:
        """Return the root by Newton's method on x J' + robin J (or J), sure to be the one at `start`."""
        mp, order, robin = self.mp, self.order, self.robin
        bessel, sign = (mp.besseli, 1) if growing else (mp.besselj, -1)
        x = mp.mpf(start)
        for _ in range(60):
            f = bessel(order, x)
            slope = order / x * f + sign * bessel(order + 1, x)
            if robin == math.inf:
                step = f / slope
            else:
                value = (robin + order) * f + sign * x * bessel(order + 1, x)
                step = value / (robin * slope + (sign * x + order**2 / x) * f)
            x -= step
            if abs(step) < mp.mpf(10) ** (-self.digits - 4) * x:
                break
        if not abs(x - start) <= 64 * mp.mpf(error):
            raise ArithmeticError(f"no root of order {float(order)} near {start!r}: found {float(x)!r}")
        return x
