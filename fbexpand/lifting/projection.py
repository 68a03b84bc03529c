"""Coefficients of the powers r^(order + 2 j) in a basis.

With x = r/R, s = order + 2 j, e_k = R^2 eigenvalue_k and Green's identity,

    e_k int x^s phi_k x dx = s phi_k(R) - R phi_k'(R) + 4 j (order + j) ... the same of x^(s - 2) with a minus sign,

which ends at j = 0. Where e_k is small the steps would cancel, and a Gauss-Jacobi rule for the weight
x^(2 order + 1) serves: what is left of x^s phi_k is an entire function of x^2.
"""

from __future__ import annotations

from functools import lru_cache
from typing import TYPE_CHECKING

import numpy as np

from fbexpand.records import read_only
from fbexpand.types import FloatArray

if TYPE_CHECKING:
    from fbexpand.bases import Basis

NODES = 48  # for modes up to a root of
LOW = 40.0


def projections(basis: Basis, powers: tuple[int, ...], count: int) -> FloatArray:
    """Return c_k of (r/R)^(order + 2 j) for every j of `powers`, shape (powers, count)."""
    order, radius = float(basis.order), float(basis.radius)
    most = max(powers)
    e = basis.eigenvalues(count) * radius**2
    rim = np.array([radius])
    value = basis.modes(rim, count)[0]
    slope = radius * basis.modes(rim, count, derivative=1)[0]  # type: ignore[call-arg]
    table = np.zeros((most + 1, count))
    before = np.zeros(count)
    with np.errstate(divide="ignore", invalid="ignore"):
        for j in range(most + 1):
            s = order + 2.0 * j
            before = table[j] = (s * value - slope - 4.0 * j * (order + j) * before) / e
    low = np.flatnonzero(np.abs(e) < max(LOW**2, 16.0 * (most + 1) * (order + most + 1)))
    if low.size:
        number = int(low[-1]) + 1
        root = float(basis.roots(1, number)[0]) if not (number == 1 and basis.growing) else 0.0
        extra = 0 if not basis.growing else int(min(float(basis.roots(1)[0]), 400.0))
        x, w = _rule(NODES + int(0.6 * root) + extra + 2 * most, 2.0 * order + 1.0)
        modes = basis.modes(radius * x, number) * x[:, None] ** -order
        for j in range(most + 1):
            moments = (w * x ** (2.0 * j)) @ modes
            table[j, low] = moments[low]
    return np.asarray(table[list(powers)] * radius**2 / basis.norms(count))


@lru_cache(maxsize=32)
def _rule(count: int, power: float) -> tuple[FloatArray, FloatArray]:
    """Return nodes and weights on (0, 1) for the weight x^power: Golub and Welsch's, refined."""
    from scipy.special import roots_jacobi

    t, w = roots_jacobi(count, 0.0, power)
    return read_only(0.5 * (1.0 + t)), read_only(w * 0.5 ** (power + 1.0))
