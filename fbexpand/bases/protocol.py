"""What a basis is: the one thing that expansions, transforms and estimates rely on."""

from __future__ import annotations

from typing import Any, Protocol, runtime_checkable

from fbexpand.types import ArrayLike, FloatArray


@runtime_checkable
class Basis(Protocol):
    """Eigenfunctions phi_1, phi_2, ... of the radial Laplacian on 0 <= r <= radius, with weight r dr.

    lap phi_k = -eigenvalue_k phi_k with lap = d2/dr2 + (1/r) d/dr - order^2/r^2, phi_k ~ r^order at the axis,
    and integral_0^radius phi_j phi_k r dr = norm_k if j = k, else 0. k counts from 1. A class with these
    members is a basis, without inheriting from anything; all that takes a basis works with it.

    `order` (real, >= 0) and `radius` (a length) are floats; `growing` says whether the first eigenvalue is
    negative. Two extras are used where a basis offers them: a keyword `derivative=n` of `modes`, for d^n
    phi_k / dr^n (without it derivatives are interpolated, with fewer digits), and a hashable `key` by which
    two equal bases are known as the same (without it, only one object is the same as itself).

    >>> import numpy as np
    >>> class Sines:
    ...     '''phi_k = sin(k pi r) / sqrt(r) on the unit radius: order 1/2, norms 1/2.'''
    ...     order, radius, growing = 0.5, 1.0, False
    ...     def roots(self, count, start=1):
    ...         return np.pi * np.arange(start, start + count)
    ...     def eigenvalues(self, count, start=1):
    ...         return self.roots(count, start) ** 2
    ...     def norms(self, count, start=1):
    ...         return np.full(count, 0.5)
    ...     def modes(self, r, count, start=1):
    ...         r = np.asarray(r, dtype=float)[..., None]
    ...         x = np.maximum(r, 1e-300)
    ...         return np.sin(self.roots(count, start) * x) / np.sqrt(x)
    >>> isinstance(Sines(), Basis)
    True
    """

    @property
    def order(self) -> float:
        """The order nu >= 0 of the radial Laplacian."""

    @property
    def radius(self) -> float:
        """The radius R of the rim, in the unit of length."""

    @property
    def growing(self) -> bool:
        """Whether the first eigenvalue is negative."""

    def roots(self, count: int, start: int = 1) -> FloatArray:
        """Return R sqrt(|eigenvalue_k|), k = start, ..., start + count - 1, shape `(count,)`; no unit."""

    def eigenvalues(self, count: int, start: int = 1) -> FloatArray:
        """Return the eigenvalues, ascending, shape `(count,)`, in 1/length^2."""

    def norms(self, count: int, start: int = 1) -> FloatArray:
        """Return the integrals of phi_k^2 r dr, shape `(count,)`, in length^2."""

    def modes(self, r: ArrayLike, count: int, start: int = 1) -> FloatArray:
        """Return phi_k(r), shape `(*r.shape, count)`."""


def same_basis(first: Any, second: Any) -> bool:
    """Return whether two bases are the same: one object, or one class with one `key`."""
    if first is second:
        return True
    key = getattr(first, "key", None)
    return type(first) is type(second) and key is not None and bool(key == getattr(second, "key", None))
