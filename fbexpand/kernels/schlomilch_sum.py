"""Sums of a_n J_nu(n x) over n = 1, 2, ...: n x in two parts, a block of terms at a time."""

from __future__ import annotations

import numpy as np

from fbexpand.kernels.bessel_eval import BLOCK, evaluate
from fbexpand.kernels.compensated import LANES, compensated_dot
from fbexpand.kernels.dd import two_prod, two_sum
from fbexpand.kernels.jit import kernel
from fbexpand.types import FloatArray


@kernel
def schlomilch_sum(data: FloatArray, x: FloatArray, coefficients: FloatArray, out: FloatArray) -> None:
    """Fill out (batch, m) with sum_n coefficients[b, n - 1] J_nu(n x), 0 <= x < inf; data is the order's table."""
    batch, terms = coefficients.shape
    arguments = np.empty(BLOCK)
    low = np.empty(BLOCK)
    values = np.empty(BLOCK)
    work = np.zeros((2, LANES))
    rest = np.zeros(batch)
    for i in range(x.shape[0]):
        for b in range(batch):
            out[b, i], rest[b] = 0.0, 0.0
        for begin in range(0, terms, BLOCK):
            size = min(BLOCK, terms - begin)
            for n in range(size):
                arguments[n], low[n] = two_prod(begin + n + 1.0, x[i])
            if not arguments[size - 1] < np.inf:
                for n in range(size):
                    low[n] = low[n] if arguments[n] < np.inf else 0.0
            evaluate(data, arguments[:size], low[:size], values[:size], values[:0])
            for b in range(batch):
                s = compensated_dot(values, coefficients[b, begin : begin + size], 0, size, work)
                out[b, i], e = two_sum(out[b, i], s)
                rest[b] += e
        for b in range(batch):
            out[b, i] += rest[b]
