"""Direct sums of modes, blocked in memory and accumulated so that many terms cost no digits.

Sixteen terms at a time go through a matrix product; its partial sums are added up without rounding loss
(Knuth's two_sum), so that the error of the summation stays near one eps of sum |c_k phi_k| whatever the
number of terms.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from typing import TYPE_CHECKING, Any

import numpy as np

from fbexpand.types import FloatArray, Numeric

if TYPE_CHECKING:
    from fbexpand.bases import Basis

TERMS_AT_ONCE = 128  # modes asked for in one call
CHUNK = 16  # terms in one matrix product: its own rounding stays near one eps
ELEMENTS = 1 << 17  # entries in a block of modes: a megabyte, near the cache


def mode_blocks(
    basis: Basis, r: FloatArray, terms: int, derivative: int = 0
) -> Iterator[tuple[slice, int, FloatArray]]:
    """Yield (radii, first, modes): modes first + 1 ... at r[radii], shape (radii, modes), radii outermost."""
    width = min(terms, TERMS_AT_ONCE)
    modes_of: Any = basis.modes  # `derivative` is an extra that not every basis has
    height = max(1, ELEMENTS // max(width, 1))
    for low in range(0, r.size, height):
        radii = slice(low, min(low + height, r.size))
        for first in range(0, terms, width):
            count = min(width, terms - first)
            if derivative:
                yield radii, first, modes_of(r[radii], count, first + 1, derivative=derivative)
            else:
                yield radii, first, modes_of(r[radii], count, first + 1)


def as_rows(coefficients: Numeric) -> FloatArray:
    """Return coefficients (*batch, terms) as real rows (size, terms), the imaginary parts after the real."""
    flat = coefficients.reshape(-1, coefficients.shape[-1])
    if np.iscomplexobj(flat):
        return np.ascontiguousarray(np.concatenate((flat.real, flat.imag)))
    return np.ascontiguousarray(flat)


def from_rows(rows: FloatArray, coefficients: Numeric) -> Numeric:
    """Undo `as_rows` for values (..., size, m) of the sums: (..., *batch, m)."""
    values: Numeric = rows
    if np.iscomplexobj(coefficients):
        half = rows.shape[-2] // 2
        values = np.empty((*rows.shape[:-2], half, rows.shape[-1]), dtype=np.complex128)
        values.real = rows[..., :half, :]
        values.imag = rows[..., half:, :]
    return values.reshape(*rows.shape[:-2], *coefficients.shape[:-1], rows.shape[-1])


def sums(
    basis: Basis,
    rows: FloatArray,
    r: FloatArray,
    *,
    cuts: Sequence[int] | None = None,
    derivative: int = 0,
    absolute: bool = False,
) -> FloatArray:
    """Return sum_{k <= cut} c_k phi_k(r) for every cut (ascending), shape (cuts, rows, m).

    `rows` are real coefficients (rows, terms), `r` is one-dimensional. Without `cuts`, all terms: shape
    (rows, m). `absolute` sums |c_k phi_k|.
    """
    count, terms = rows.shape
    ends = [terms] if cuts is None else list(cuts)
    if absolute:
        rows = np.abs(rows)
    result = np.zeros((len(ends), count, r.size))
    if terms and r.size and count and ends[-1]:
        columns = np.ascontiguousarray(rows.T)
        total = compensation = np.zeros((0, count))
        place = 0
        for radii, first, modes in mode_blocks(basis, r, ends[-1], derivative):
            if absolute:
                modes = np.abs(modes)
            if first == 0:
                total = np.zeros((modes.shape[0], count))
                compensation = np.zeros_like(total)
                place = 0
            low, stop = first, first + modes.shape[1]
            while True:
                while place < len(ends) and ends[place] == low:
                    np.add(total.T, compensation.T, out=result[place, :, radii])
                    place += 1
                if low == stop:
                    break
                high = min(low + CHUNK, stop)
                if place < len(ends):
                    high = min(high, max(ends[place], low + 1))
                part = modes[:, low - first : high - first] @ columns[low:high]
                if low == 0:
                    total = part
                else:
                    new = total + part
                    shift = new - total
                    compensation += (total - (new - shift)) + (part - shift)
                    total = new
                low = high
    return result[0] if cuts is None else result


def series_at(basis: Basis, coefficients: Numeric, r: FloatArray, *, derivative: int = 0) -> Numeric:
    """Return sum_k c_k phi_k(r), or a derivative of it, shape (*batch, m), for one-dimensional r."""
    return from_rows(sums(basis, as_rows(coefficients), r, derivative=derivative), coefficients)
