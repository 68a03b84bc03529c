"""A sum of powers r^(order + 2 j): what is subtracted from a profile before its coefficients are taken."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING, Any

import numpy as np

from fbexpand.lifting.projection import projections
from fbexpand.records import ReadOnlyArrays
from fbexpand.types import FloatArray, Numeric

if TYPE_CHECKING:
    from fbexpand.bases import Basis


@dataclass(frozen=True, eq=False)
class ClosedPart(ReadOnlyArrays):
    """p(r) = sum_i coefficients[..., i] (r / radius)^(order + 2 powers[i]).

    `coefficients` have shape `(*batch, m)` and the unit of f; `powers` are whole numbers from 0 on, ascending.
    Calling it gives values, shape `(*batch, *r.shape)`.
    """

    order: float
    radius: float
    powers: tuple[int, ...]
    coefficients: Numeric

    @property
    def batch_shape(self) -> tuple[int, ...]:
        """Shape of the batch axes."""
        return self.coefficients.shape[:-1]

    @property
    def exponents(self) -> FloatArray:
        """The exponents order + 2 j."""
        return self.order + 2.0 * np.array(self.powers, dtype=np.float64)

    def __call__(self, r: Any) -> Numeric:
        """Return the values at r."""
        return self.derivative(r, 0)

    def derivative(self, r: Any, n: int = 1) -> Numeric:
        """Return the n-th derivative at r, infinite at the axis where it is."""
        x = np.asarray(r, dtype=np.float64) / self.radius
        total = np.zeros((*self.batch_shape, *x.shape), dtype=self.coefficients.dtype)
        for i, s in enumerate(self.exponents):
            factor = float(np.prod(s - np.arange(n)))  # 0 where a whole power has been used up
            if factor == 0.0:
                continue
            a = self.coefficients[..., i].reshape(*self.batch_shape, *[1] * x.ndim) * (factor / self.radius**n)
            with np.errstate(divide="ignore", invalid="ignore"):
                term = a * x ** (s - n)
            total = total + np.where(a == 0.0, 0.0, term)
        return np.asarray(total)

    def integral(self, a: float, b: float) -> Numeric:
        """Return the integral of p r dr from a to b, shape (*batch,)."""
        s = self.exponents + 2.0
        weights = self.radius**2 * ((b / self.radius) ** s - (a / self.radius) ** s) / s
        return np.asarray(self.coefficients @ weights)

    def inner(self, other: ClosedPart) -> Numeric:
        """Return the integral of conj(p) q r dr, batches broadcast."""
        s = self.exponents[:, None] + other.exponents + 2.0
        return np.asarray(
            np.einsum("...i,ij,...j->...", np.conjugate(self.coefficients), self.radius**2 / s, other.coefficients)
        )

    def projected(self, basis: Basis, count: int) -> Numeric:
        """Return the coefficients c_k of p in the basis, shape (*batch, count)."""
        return np.asarray(self.coefficients @ projections(basis, self.powers, count))

    def laplacian(self) -> ClosedPart | None:
        """Return p'' + p'/r - order^2 p/r^2; None where nothing is left."""
        kept = [i for i, j in enumerate(self.powers) if j > 0]
        if not kept:
            return None
        factors = np.array([4.0 * self.powers[i] * (self.order + self.powers[i]) for i in kept]) / self.radius**2
        powers = tuple(self.powers[i] - 1 for i in kept)
        return replace(self, powers=powers, coefficients=self.coefficients[..., kept] * factors)

    def changed(self, change: Callable[[Numeric], Numeric]) -> ClosedPart:
        """Return the part with change(coefficients)."""
        return replace(self, coefficients=np.array(change(self.coefficients)))

    def broadcast(self, shape: tuple[int, ...]) -> ClosedPart:
        """Repeat over the batch shape `shape`."""
        return self.changed(lambda c: np.broadcast_to(c, (*shape, c.shape[-1])))

    def plus(self, other: ClosedPart | None) -> ClosedPart:
        """Return the sum of both, batches broadcast."""
        if other is None:
            return self
        powers = tuple(sorted({*self.powers, *other.powers}))
        shape = np.broadcast_shapes(self.batch_shape, other.batch_shape)
        total = np.zeros((*shape, len(powers)), dtype=np.result_type(self.coefficients, other.coefficients))
        for part in (self, other):
            for i, power in enumerate(part.powers):
                total[..., powers.index(power)] += part.coefficients[..., i]
        return replace(self, powers=powers, coefficients=total)
