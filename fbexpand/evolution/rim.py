"""What a driven rim does: its flux into the modes, and the part of the field that no finite number of modes has.

The rim is held at B u = g, B u = u(R) or R u'(R) + robin u(R). By Green's identity (lap u)_k = -eigenvalue_k a_k +
rho_k g with rho_k = -R phi_k'(R) / N_k or phi_k(R) / N_k: this is all the modes need to know, whether 0 is an
eigenvalue or not. The coefficients a_k then fall slowly. What the terms left out add is, up to what falls faster than
any power kept, the part beyond these terms of a sum p of powers r^(order + 2j) with B lap^i p = B lap^i u for i < MOST:
the law itself gives B lap u, B lap^2 u, ... from g and its time derivatives. So p is added in closed form, and its own
coefficients are taken away.
"""

from __future__ import annotations

import math
from functools import cached_property
from typing import TYPE_CHECKING, Any

import numpy as np

from fbexpand.exceptions import ArgumentValueError
from fbexpand.lifting.closed_part import ClosedPart
from fbexpand.lifting.projection import projections
from fbexpand.types import FloatArray, Numeric

if TYPE_CHECKING:
    from fbexpand.bases import Basis

MOST = 4  # rim terms kept
SUMMED = 30  # times the terms at hand: how far the part beyond them is summed up, where it falls as k^-7
MOST_SUMMED = 20_000
BLOCK = 512
LOST = 1.6e-14  # of the size of P_i: what its powers lose


def condition_of(basis: Any) -> float:
    """Return the Robin coefficient of the rim condition, inf for f(R) = 0; ValueError for any other basis."""
    from fbexpand.bases import Dini, FourierBessel

    if isinstance(basis, FourierBessel):
        return math.inf
    if isinstance(basis, Dini):
        return float(basis.robin)
    raise ArgumentValueError(
        f"'rim' must be None on a basis whose rim condition is not known (got the basis {basis!r})", "rim", basis
    )


def _flux(basis: Basis, robin: float, count: int, start: int) -> FloatArray:
    """Return rho_k, k = start, ..., in 1/length^2."""
    rim = np.array([float(basis.radius)])
    norms = basis.norms(count, start)
    if math.isinf(robin):
        slope = basis.modes(rim, count, start, derivative=1)[0]  # type: ignore[call-arg]
        return np.asarray(-basis.radius * slope / norms)
    return np.asarray(basis.modes(rim, count, start)[0] / norms)


class Rim:
    """The rim of a basis, for `terms` modes."""

    def __init__(self, basis: Basis, terms: int) -> None:
        self.basis = basis
        self.terms = terms
        self.radius = float(basis.radius)
        self._robin = condition_of(basis)
        order = float(basis.order)
        first = 0 if math.isinf(self._robin) or abs(self._robin + order) >= 1.0 else 1
        self.powers = tuple(range(first, first + MOST))
        self.exponents = order + 2.0 * np.array(self.powers)

    @cached_property
    def flux(self) -> FloatArray:
        """rho_k, (terms,), in 1/length^2."""
        return _flux(self.basis, self._robin, self.terms, 1)

    @cached_property
    def projected(self) -> FloatArray:
        """The coefficients of the functions P_i with B (R^2 lap)^j P_i = 1 if j = i, else 0, (MOST, terms).

        Integrations by parts give them as rho_k (-1)^i / lambda_k^(2 i + 2), to which (R^2 lap)^MOST P_i, a multiple of
        r^order, adds a part where it is not 0. Where lambda_k is small the powers are projected one by one.
        """
        order = float(self.basis.order)
        square = self.basis.eigenvalues(self.terms) * self.radius**2
        sign = (-1.0) ** np.arange(MOST)[:, None]
        with np.errstate(divide="ignore", invalid="ignore", over="ignore"):
            flux = self.flux * self.radius**2 / square
            table = sign * flux / square ** np.arange(MOST)[:, None]
            if self.powers[0] > 0:
                j = float(self.powers[-1])
                steps = np.prod([4.0 * (j - t) * (order + j - t) for t in range(MOST)])
                shift = order + self._robin
                table += self._solver[-1][:, None] * steps * shift * flux * (-1.0) ** MOST / square**MOST
        low = np.flatnonzero(np.abs(square) < 1.0)
        if low.size:
            count = int(low[-1]) + 1
            table[:, :count] = self._solver.T @ projections(self.basis, self.powers, count)
        return table

    def beyond(self, r: FloatArray, modes: FloatArray) -> FloatArray:
        """Return what the P_i have at r beyond the modes at hand (terms, radii), (MOST, radii).

        The last of them is far smaller than P_i itself, which may be multiplied by large numbers: it is summed up.
        """
        found = self._solver.T @ (r / self.radius) ** self.exponents[:, None] - self.projected @ modes
        found[-1] = 0.0
        first, stop = self.terms + 1, self.terms + min(SUMMED * self.terms, MOST_SUMMED)
        while first <= stop:
            count = min(BLOCK, stop + 1 - first)
            square = (self.basis.roots(count, first) / self.radius) ** 2
            series = _flux(self.basis, self._robin, count, first) * (-1.0 / self.radius**2) ** (MOST - 1) / square**MOST
            found[-1] += self.basis.modes(r, count, first) @ series
            first += count
        return np.asarray(found)

    def terms_of(self, exponents: FloatArray) -> FloatArray:
        """Return B (R^2 lap)^i of (r/R)^exponent, (MOST, exponents)."""
        order = float(self.basis.order)
        matrix = np.zeros((MOST, exponents.size))
        factor, s = np.ones(exponents.size), np.array(exponents)
        for i in range(MOST):
            matrix[i] = factor * (1.0 if math.isinf(self._robin) else s + self._robin)
            factor = factor * (s - order) * (s + order)
            s = s - 2.0
        return matrix

    @cached_property
    def kept(self) -> int:
        """How many rim terms a closed part made of powers is to have.

        The terms left out of P_i are about lambda_n^(-2 i) / 10, and P_i, about 1 / (4^i i!^2), loses digits where its
        powers cancel: with many terms at hand the rounding of the last ones is more than they are worth.
        """
        last = max(float(self.basis.roots(1, self.terms)[0]), 1.0)
        i = np.arange(MOST)
        factorials = np.array([math.factorial(j) for j in range(MOST)], dtype=np.float64)
        return int(np.sum(0.1 / last ** (2.0 * i) > LOST / (4.0**i * factorials**2)))

    @cached_property
    def _solver(self) -> FloatArray:
        """What the powers are multiplied by in each P_i, (powers, MOST)."""
        matrix = self.terms_of(self.exponents)
        scale = np.abs(matrix).max(axis=1, keepdims=True)
        return np.asarray(np.linalg.inv(matrix / scale) / scale.T)

    def closed_part(self, rim_terms: Numeric) -> ClosedPart:
        """Return sum_i rim_terms_i P_i for rim terms (..., MOST)."""
        coefficients = np.asarray(rim_terms[..., : self.kept] @ self._solver.T[: self.kept])
        return ClosedPart(float(self.basis.order), self.radius, self.powers, coefficients)

    @cached_property
    def reach(self) -> float:
        """The L2 norm of P_0, the field that a rim value of 1 holds."""
        part = self.closed_part(np.eye(MOST)[0])
        return math.sqrt(max(float(part.inner(part)), 0.0))
