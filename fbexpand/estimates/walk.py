"""The largest error after every number of terms, by taking the terms away one by one."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from fbexpand.transform.direct import CHUNK
from fbexpand.types import FloatArray, Numeric

if TYPE_CHECKING:
    from fbexpand.bases import Basis

POINTS_AT_ONCE = 1 << 12


def largest_errors(basis: Basis, coefficients: Numeric, r: FloatArray, left: Numeric) -> FloatArray:
    """Return max |left + sum_{k > n} c_k phi_k(r)| for n = 1, 2, ..., from the last term back: (terms, size).

    `left` (size, m) is the error after all terms.
    """
    size, terms = coefficients.shape
    largest = np.zeros((terms, size))
    for low in range(0, r.size, POINTS_AT_ONCE):
        here = slice(low, low + POINTS_AT_ONCE)
        error = left[:, here].copy()
        for stop in range(terms, 0, -CHUNK):
            start = max(0, stop - CHUNK)
            modes = basis.modes(r[here], stop - start, start + 1)[:, ::-1]
            for row in range(size):
                # the error after stop, stop - 1, ..., start terms
                added = error[row, :, None] + np.cumsum(modes * coefficients[row, start:stop][::-1], axis=1)
                after = np.abs(added[:, :-1]).max(axis=0) if stop - start > 1 else np.empty(0)
                first = np.abs(error[row]).max()
                found = np.concatenate(([first], after))[::-1]
                largest[start:stop, row] = np.maximum(largest[start:stop, row], found)
                error[row] = added[:, -1]
    return largest
