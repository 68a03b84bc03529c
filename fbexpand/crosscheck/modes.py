"""The modes of a basis without this library's help: SciPy's J_nu and I_nu on SciPy's roots.

A basis of the user's own has no rim condition that could be solved again: its modes are its own, their norms are
integrated, and its root is held against J_nu(root r / R) and against the other modes.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass
from fractions import Fraction
from typing import Any

import numpy as np
from scipy.special import hyp0f1, ive, jv

from fbexpand.bases import Dini, FourierBessel
from fbexpand.crosscheck.scipy_roots import EPS, ScipyRoots, jv_error, modulus, small_integer
from fbexpand.types import FloatArray

SPLIT = 2.0**27 + 1.0


@dataclass(frozen=True, eq=False)
class Mode:
    """One mode: phi at one radius and at many, what their error may be, and radii between which phi has one sign.

    `norm` is None where it is to be integrated.
    """

    root: float
    root_error: float
    value: Callable[[float], float]
    values: Callable[[FloatArray], FloatArray]
    spread: Callable[[FloatArray, FloatArray], FloatArray]
    cuts: FloatArray
    norm: float | None = None
    norm_error: float = 0.0


def rim_condition(basis: Any) -> float | None:
    """Return the Robin coefficient, inf for f(R) = 0, None for a basis that is not one of the library's."""
    if isinstance(basis, FourierBessel):
        return math.inf
    return float(basis.robin) if isinstance(basis, Dini) else None


class ScipyModes:
    """Modes by SciPy alone."""

    name = "SciPy"

    def __init__(self, order: float, robin: float, radius: float) -> None:
        self.order = float(order)
        self.robin = float(robin)
        self.radius = float(radius)
        self.roots = ScipyRoots(self.order, self.robin)

    def mode(self, k: int) -> Mode:
        """Return the k-th mode."""
        root, rest, error = self.roots.root(k)
        if k == 1 and (self.robin < 0.0 or self.robin == -self.order):
            return self._first(root, error)
        order = self.order
        w, w_rest = divided(root, rest, self.radius)
        # beyond `far` jv is better than its rounded argument: the rest of the argument is made up for by J'
        far = 4.0 if small_integer(order) else max(30.0, 0.5 * order * order)

        def value(r: float) -> float:
            z = w * r
            j = jv(order, z)
            if z <= far:
                return float(j)
            slope = order / z * j - jv(order + 1.0, z)
            return float(j + slope * (product_rest(w, r, z) + w_rest * r))

        def spread(r: FloatArray, phi: FloatArray) -> FloatArray:
            z = w * r
            argument = np.where(z > far, 0.0, 2.0 * EPS * np.maximum(z, order)) + (error / root) * z
            return modulus(order, z, phi) * (jv_error(order, z) + argument)

        return Mode(root, error + abs(rest), value, lambda r: jv(order, w * r), spread, self.cuts(root))

    def cuts(self, root: float) -> FloatArray:
        """Return the radii at which a mode of this root changes sign."""
        count = max(1, int(root / math.pi) + 1)
        zeros = self.roots.zeros(count)
        return zeros[zeros < root * (1.0 - 1e-9)] * (self.radius / root) if root > 0.0 else np.zeros(0)

    def _first(self, root: float, error: float) -> Mode:
        """Return the first mode of a negative robin, scaled to 1 at the rim; or the power of eigenvalue 0."""
        shape = scaled(self.order, self.robin, root)
        radius = self.radius
        share = 64.0 + (self.order + root) * (2.0 + error / (EPS * root) if root > 0.0 else 2.0)
        if -self.order < self.robin:
            share += float(jv_error(self.order, np.array(root))) / EPS
        return Mode(
            root,
            error,
            lambda r: float(shape(r / radius)),
            lambda r: np.asarray(shape(r / radius)),
            lambda r, phi: np.abs(phi) * (share * EPS),
            np.zeros(0),
        )


def divided(root: float, rest: float, radius: float) -> tuple[float, float]:
    """Return (root + rest) / radius in two parts."""
    exact = (Fraction(root) + Fraction(rest)) / Fraction(radius)
    high = float(exact)
    return high, float(exact - Fraction(high))


def product_rest(a: float, b: float, product: float) -> float:
    """Return a b - product, exactly (Dekker)."""
    t = SPLIT * a
    ah = t - (t - a)
    al = a - ah
    t = SPLIT * b
    bh = t - (t - b)
    bl = b - bh
    return ((ah * bh - product) + ah * bl + al * bh) + al * bl


def scaled(order: float, robin: float, root: float) -> Callable[[Any], Any]:
    """Return the first mode as a function of x = r/R, 1 at x = 1.

    Near the corner robin + order = 0 both Bessel functions may be too small for doubles while their quotient is not:
    there the power is split off, J_nu(z) = (z/2)^nu / Gamma(nu + 1) 0F1(; nu + 1; -z^2/4).
    """
    if robin == -order:
        return lambda x: x**order
    if root * root < 4.0 * (order + 1.0) or (robin > -order and order > 100.0):
        z = 0.25 * root * root * (1.0 if robin < -order else -1.0)
        at_rim = hyp0f1(order + 1.0, z)
        return lambda x: x**order * (hyp0f1(order + 1.0, z * (x * x)) / at_rim)
    if robin > -order:
        at_rim = jv(order, root)
        return lambda x: jv(order, root * x) / at_rim
    at_rim = ive(order, root)
    return lambda x: ive(order, root * x) / at_rim * np.exp(root * (x - 1.0))


class OwnModes:
    """The modes of a basis written by the user, taken from it as they are."""

    name = "the basis"

    def __init__(self, basis: Any) -> None:
        self.basis = basis
        self.radius = float(basis.radius)
        self.order = float(basis.order)

    def mode(self, k: int) -> Mode:
        """Return the k-th mode; the root's error is judged by `mismatch`."""
        basis, radius = self.basis, self.radius

        def values(r: FloatArray) -> FloatArray:
            return np.asarray(basis.modes(r, 1, k), dtype=np.float64)[..., 0]

        def spread(r: FloatArray, phi: FloatArray) -> FloatArray:
            return np.asarray(8.0 * EPS * (np.abs(phi) + np.max(np.abs(phi), initial=0.0)))

        root = float(basis.roots(1, k)[0])
        cuts = radius * np.arange(1, k) / k  # about where the mode changes sign: enough for quadrature
        return Mode(root, 0.0, lambda r: float(values(np.array([r]))[0]), values, spread, cuts)

    def mismatch(self, k: int, neighbour: int) -> float:
        """Return how far the mode is from a multiple of J_nu(root r / R), or from orthogonality to a neighbour.

        I_nu stands for J_nu where the mode grows, r^nu at root 0; both are 0 where root and mode are right.
        """
        x, w = np.polynomial.legendre.leggauss(8 * (max(k, neighbour) + 8))
        x = 0.5 * (x + 1.0)
        w = np.sqrt(w * x)
        mine, other = (np.asarray(self.basis.modes(self.radius * x, 1, j))[:, 0] * w for j in (k, neighbour))
        root = float(self.basis.roots(1, k)[0])
        if k == 1 and root == 0.0:
            exact = x**self.order * w
        elif k == 1 and self.basis.growing:
            exact = ive(self.order, root * x) * np.exp(root * (x - 1.0)) * w
        else:
            exact = jv(self.order, root * x) * w
        mine, other, exact = (v / np.linalg.norm(v) for v in (mine, other, exact))
        skew = np.linalg.norm(mine - exact * np.dot(mine, exact))
        return float(max(skew, abs(np.dot(mine, other))))
