"""The basis of profiles that vanish at the rim."""

from __future__ import annotations

import math
from dataclasses import dataclass

from fbexpand.bases.radial import RadialBasis


@dataclass(frozen=True, eq=False)
class FourierBessel(RadialBasis):
    """The basis of f(R) = 0: phi_k(r) = J_order(j_k r / R), j_k the k-th positive zero of J_order.

    Weight r dr on [0, R]; N_k = R^2 J'_order(j_k)^2 / 2, not normalised away; eigenvalues (j_k / R)^2.
    `order` is any real number >= 0, `radius` a length. `.roots`, `.eigenvalues`, `.norms` have shape
    `(count,)`, `.modes` `(*r.shape, count)`. `==` is identity.

    Raises TypeError for what is no real number, ValueError for an order below 0, a radius that is not
    positive, and for either if not finite.

    DLMF 10.22.37 (norms), 10.23.18 (expansion), from memory.

    >>> from fbexpand.bases import FourierBessel
    >>> basis = FourierBessel(order=0, radius=2.0)
    >>> basis
    FourierBessel(order=0.0, radius=2.0)
    >>> print(basis.roots(2))
    [2.40482556 5.52007811]
    >>> print(basis.modes([0.0, 2.0], 2))
    [[1. 1.]
     [0. 0.]]
    """

    order: float = 0.0
    radius: float = 1.0

    def __post_init__(self) -> None:
        self._check()

    @property
    def _condition(self) -> float:
        return math.inf
