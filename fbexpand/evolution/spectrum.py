"""What a basis says about its modes, as the laws need it: roots in two parts, which ones grow."""

from __future__ import annotations

from typing import TYPE_CHECKING, NamedTuple

import numpy as np

from fbexpand.bases.radial import RadialBasis
from fbexpand.types import FloatArray, IntArray

if TYPE_CHECKING:
    from fbexpand.bases import Basis


class Modes(NamedTuple):
    """Some modes: their numbers, roots as high and low parts, and how many of them, the first, grow."""

    number: IntArray
    high: FloatArray
    low: FloatArray
    growing: int
    radius: float

    @property
    def eigenvalues(self) -> FloatArray:
        """The eigenvalues, in 1/length^2."""
        values = (self.high / self.radius) ** 2
        values[: self.growing] *= -1.0
        return np.asarray(values)


def modes_of(basis: Basis, count: int, start: int = 1) -> Modes:
    """Return what the laws need to know of `count` modes; a basis of the user's own has no low parts."""
    if isinstance(basis, RadialBasis):
        high, low = basis._spectrum.roots(count, start)
    else:
        high = np.ascontiguousarray(basis.roots(count, start), dtype=np.float64)
        low = np.zeros(count)
    growing = int(bool(basis.growing) and start == 1)
    return Modes(np.arange(start, start + count), high.copy(), low.copy(), growing, float(basis.radius))


def chosen_modes(basis: Basis, index: IntArray) -> Modes:
    """Return the same for ascending indices beyond 1, without the roots between them."""
    high = np.array([float(basis.roots(1, int(k))[0]) for k in index])
    return Modes(index, high, np.zeros(index.size), 0, float(basis.radius))
