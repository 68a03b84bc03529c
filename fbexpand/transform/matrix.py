"""The transform as a product with a stored matrix of modes."""

from __future__ import annotations

import threading
from collections.abc import Callable
from typing import TYPE_CHECKING

import numpy as np

from fbexpand.transform.arguments import REAL
from fbexpand.transform.modal import two_part_modes
from fbexpand.types import FloatArray, Numeric

if TYPE_CHECKING:
    from fbexpand.bases import Basis

BLOCK = 1 << 17  # modes computed at once


class MatrixSums:
    """Both directions by BLAS: modes (m, terms), and them times w_i / N_k for the way back, made when first needed."""

    name = "matrix"

    def __init__(
        self, basis: Basis, terms: int, r: FloatArray, low: FloatArray | None, weights: Callable[[], FloatArray]
    ) -> None:
        self._basis, self._terms, self._r, self._low, self._weights = basis, terms, r, low, weights
        self._lock = threading.Lock()
        self._out: FloatArray | None = None  # transposed, (terms, m): so that rows @ matrix is the product
        self._back: FloatArray | None = None  # (m, terms), transposed likewise

    @staticmethod
    def bytes_needed(terms: int, size: int) -> int:
        """Return the bytes of the matrices: one where there are too few radii for the way back, else two."""
        return 8 * terms * size * (2 if size >= terms else 1)

    @property
    def nbytes(self) -> int:
        """Bytes held."""
        return sum(0 if m is None else m.nbytes for m in (self._out, self._back))

    def synthesize(self, rows: Numeric, out: Numeric) -> None:
        """Fill out (size, m) with the sums of rows (size, terms), or out (m,) with those of (terms,)."""
        matrix = self._out
        if matrix is None:
            matrix = self._make_out()
        if rows.ndim == 1:
            _one(matrix.T, rows, out)
        elif len(rows) == 1:
            np.dot(matrix.T, rows[0], out=out[0])
        else:
            np.dot(rows, matrix, out=out)

    def analyze(self, rows: Numeric, out: Numeric) -> None:
        """Fill out (size, terms) with the coefficients of rows (size, m), or out (terms,) with those of (m,)."""
        matrix = self._back
        if matrix is None:
            matrix = self._make_back()
        if rows.ndim == 1:
            _one(matrix.T, rows, out)
        elif len(rows) == 1:
            np.dot(matrix.T, rows[0], out=out[0])
        else:
            np.dot(rows, matrix, out=out)

    def _make_out(self) -> FloatArray:
        with self._lock:
            if self._out is None:
                modes = np.empty((self._r.size, self._terms))
                step = max(1, BLOCK // self._terms)
                for begin in range(0, self._r.size, step):
                    here = slice(begin, begin + step)
                    low = None if self._low is None else self._low[here]
                    modes[here] = two_part_modes(self._basis, self._r[here], low, self._terms)
                self._out = modes.T
            return self._out

    def _make_back(self) -> FloatArray:
        modes = self._make_out().T
        weights = self._weights()
        with self._lock:
            if self._back is None:
                back = np.ascontiguousarray(modes.T)
                back *= weights
                back /= self._basis.norms(self._terms)[:, None]
                self._back = back.T
            return self._back


def _one(matrix: FloatArray, row: Numeric, out: Numeric) -> None:
    """Fill out with matrix @ row; a complex row is one of pairs of doubles."""
    if row.dtype == REAL:
        np.dot(matrix, row, out=out)
    else:
        np.dot(matrix, row.view(REAL).reshape(-1, 2), out=out.view(REAL).reshape(-1, 2))
