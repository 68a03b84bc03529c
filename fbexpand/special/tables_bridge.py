"""TEMPORARY: the table of an order, until `fbexpand.special.bessel` offers it. To be deleted."""

from __future__ import annotations

from functools import lru_cache

import numpy as np

from fbexpand.kernels.bessel_eval import j_pairs
from fbexpand.kernels.bessel_table import build, layout
from fbexpand.types import FloatArray


@lru_cache(maxsize=32)
def table_of(order: float) -> FloatArray:
    """Return the table."""
    head = np.zeros(16)
    data = np.zeros(layout(order, 0.0, head))
    data[:16] = head
    build(data)
    return data


def bessel_pair_at(order: float, x: FloatArray, x_low: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Return J and J'."""
    value, slope = np.empty_like(x), np.empty_like(x)
    j_pairs(table_of(order), np.ascontiguousarray(x), np.ascontiguousarray(x_low), value, slope)
    return value, slope
