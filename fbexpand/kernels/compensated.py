"""Compensated sums of products: the rounding of the additions is kept and added at the end."""

from __future__ import annotations

from fbexpand.kernels.dd import two_sum
from fbexpand.kernels.jit import callee
from fbexpand.types import FloatArray

LANES = 8


@callee
def compensated_dot(a: FloatArray, b: FloatArray, begin: int, end: int, work: FloatArray) -> float:
    """Return sum a[i] b[i], begin <= i < end, as if only the products were rounded; work is (2, LANES)."""
    for l in range(LANES):
        work[0, l], work[1, l] = 0.0, 0.0
    i = begin
    while i + LANES <= end:
        for l in range(LANES):
            work[0, l], e = two_sum(work[0, l], a[i + l] * b[i + l])
            work[1, l] += e
        i += LANES
    s, low = 0.0, 0.0
    for j in range(i, end):
        s, e = two_sum(s, a[j] * b[j])
        low += e
    for l in range(LANES):
        s, e = two_sum(s, work[0, l])
        low += e + work[1, l]
    return s + low
