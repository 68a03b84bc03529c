"""The transform by sums over blocks of modes that are made, used and forgotten: no matrix is stored."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from typing import TYPE_CHECKING

import numpy as np

from fbexpand.transform.modal import two_part_modes
from fbexpand.types import FloatArray, Numeric

if TYPE_CHECKING:
    from fbexpand.bases import Basis

BLOCK = 1 << 16  # modes in a block: half a megabyte, near the cache
WIDEST = 4096  # terms in a block


class DirectSums:
    """Both directions, modes computed each time."""

    name = "direct"

    def __init__(
        self, basis: Basis, terms: int, r: FloatArray, low: FloatArray | None, weights: Callable[[], FloatArray]
    ) -> None:
        self._basis, self._terms, self._r, self._low, self._weights = basis, terms, r, low, weights
        self._norms: FloatArray | None = None

    @staticmethod
    def bytes_needed(terms: int, size: int) -> int:
        """Return the bytes held at once."""
        return 4 * 8 * min(BLOCK, terms * size)

    @property
    def nbytes(self) -> int:
        """Bytes held."""
        return 0 if self._norms is None else self._norms.nbytes

    def synthesize(self, rows: Numeric, out: Numeric) -> None:
        """Fill out (size, m) with the sums of rows (size, terms), or out (m,) with those of (terms,)."""
        out.fill(0.0)
        for radii, terms, modes in self._blocks():
            out[..., radii] += rows[..., terms] @ modes.T

    def analyze(self, rows: Numeric, out: Numeric) -> None:
        """Fill out (size, terms) with the coefficients of rows (size, m), or out (terms,) with those of (m,)."""
        weights = self._weights()
        if self._norms is None:
            self._norms = np.array(self._basis.norms(self._terms))
        out.fill(0.0)
        for radii, terms, modes in self._blocks():
            out[..., terms] += (rows[..., radii] * weights[radii]) @ modes
        out /= self._norms

    def _blocks(self) -> Iterator[tuple[slice, slice, FloatArray]]:
        width = min(self._terms, WIDEST)
        height = max(1, BLOCK // width)
        for begin in range(0, self._r.size, height):
            radii = slice(begin, min(begin + height, self._r.size))
            low = None if self._low is None else self._low[radii]
            for first in range(0, self._terms, width):
                count = min(width, self._terms - first)
                modes = two_part_modes(self._basis, self._r[radii], low, count, first + 1)
                yield radii, slice(first, first + count), modes
