"""L2 tails that are known in advance: a broken rim condition, jumps, a value on the axis where modes vanish.

Leading terms, with x = r/R, L the root where the tail starts and one root in every pi: each comes from the
asymptotic form of the coefficients (two integrations by parts against the mode, J_nu and J_nu' at large
argument) and is the root of an integral over lambda.
"""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

import numpy as np

from fbexpand.estimates.cells import panel_of, panel_values
from fbexpand.estimates.rim import end_values, rim_defect
from fbexpand.types import FloatArray, Numeric

if TYPE_CHECKING:
    from fbexpand.bases import Basis
    from fbexpand.profiles.panels import Panels


class DefectTail:
    """The L2 norm of the terms beyond n, (size,), as far as the profile's defects of order zero make it.

    On a basis with b_k the orthonormal coefficients: a value f(R) that should vanish gives sqrt(2) R f(R) /
    lambda, a Robin defect B f gives sqrt(2) R B f / (lambda sqrt(lambda^2 + robin^2 - nu^2)), a jump at x on
    average sqrt(x) R [f] / lambda, a value on the axis at order > 0 nu sqrt(pi) R f(0) lambda^(-3/2).
    """

    def __init__(self, basis: Basis, panels: Panels, terms: int) -> None:
        self._terms = terms
        self._root = float(basis.roots(1, terms)[0])
        order, radius = float(basis.order), float(basis.radius)
        size = end_values(panels, 0, 0.0).size
        self.steady = np.zeros(size)  # over sqrt(pi L)
        self._axis = np.zeros(size)
        self._robin = np.zeros(size)
        self._depth: float = 0.0
        self._size: float = 1.0
        for panel in range(1, panels.edges.size - 1):
            jump = np.abs(end_values(panels, panel, -1.0) - end_values(panels, panel - 1, 1.0))
            self.steady = np.hypot(self.steady, jump * math.sqrt(panels.edges[panel] * radius))
        if order > 0.0:
            axis = end_values(panels, 0, -1.0)
            beside = _value(panels, radius / max(self._root, 1.0))
            # a value that the profile leaves within a wave is no defect of order zero
            stays = np.abs(axis - beside) <= 0.5 * np.abs(axis)
            self._axis = order * radius * np.where(stays, np.abs(axis), 0.0)
        defect, _ = rim_defect(basis, panels)
        if panels.edges[-1] - panels.edges[-2] < 0.1 * radius / max(self._root, 1.0):
            defect = None  # panels that shrink toward the rim: the slope there says nothing yet
        if defect is not None and hasattr(basis, "robin"):
            self._robin = radius * np.abs(defect)
            robin = abs(float(getattr(basis, "robin", 0.0)))
            self._size = max(robin, 1.0)
            self._depth = math.sqrt(robin - order) * math.sqrt(robin + order) if robin > order else 0.0
        elif defect is not None:
            self.steady = np.hypot(self.steady, math.sqrt(2.0) * radius * np.abs(defect))

    def __call__(self, terms: float) -> FloatArray:
        """Return the tail beyond `terms`."""
        reach = max(self._root + math.pi * (terms - self._terms + 0.5), math.pi)
        robin = math.sqrt(2.0 / math.pi) * _robin_root(reach, self._depth, self._size)
        steady = self.steady / math.sqrt(math.pi * reach)
        return np.asarray(
            np.hypot(np.hypot(steady, self._axis / (math.sqrt(2.0) * reach)), self._robin * robin)
        )


def _value(panels: Panels, r: float) -> Numeric:
    """Return the profile at one radius, shape (size,)."""
    at = np.array([min(r, float(panels.edges[-1]))])
    polynomials = panels.coefficients.reshape(-1, *panels.coefficients.shape[-2:])
    return panel_values(panels, polynomials, panel_of(panels.edges, at), at[:, None])[:, 0, 0]


def _robin_root(low: float, depth: float, size: float) -> float:
    """Return size times the root of the integral of dx / (x^2 (x^2 + depth^2)) from `low` to infinity."""
    ratio = depth / low
    if ratio < 0.03:
        return size * math.sqrt((1.0 - 0.6 * ratio**2) / low) / (math.sqrt(3.0) * low)
    return size / depth * math.sqrt(1.0 / low - math.atan(ratio) / depth)


def defect_tail(basis: Basis, panels: Panels | None, terms: int) -> DefectTail | None:
    """Return the known tails for our bases and a profile at hand, else None."""
    from fbexpand.bases import Dini, FourierBessel  # not at the top: only their modes have these tails

    known = panels is not None and isinstance(basis, (FourierBessel, Dini)) and terms >= 2
    return DefectTail(basis, panels, terms) if known and panels is not None else None


def terms_until(tail: DefectTail, row: int, limit: float, start: int, most: float) -> float:
    """Return the least n >= start at which one profile's tail is below `limit`; inf beyond `most`."""
    if tail(start)[row] <= limit:
        return float(start)
    low, high = float(start), most
    if tail(high)[row] > limit:
        return math.inf
    while high > low * (1.0 + 1e-12) and high - low > 0.5:
        middle = math.sqrt(low * high)
        low, high = (low, middle) if tail(middle)[row] <= limit else (middle, high)
    return math.ceil(high)
