"""Matrices between values at Chebyshev points and Chebyshev coefficients, kept for reuse."""

from __future__ import annotations

from functools import lru_cache

import numpy as np
from numpy.polynomial import chebyshev

from fbexpand.records import read_only
from fbexpand.types import FloatArray


@lru_cache(maxsize=16)
def points(degrees: int) -> FloatArray:
    """Return the zeros of T_degrees, ascending: they lie inside (-1, 1), so no end is ever sampled."""
    k = np.arange(degrees)
    return read_only(np.sin(np.pi * (2 * k + 1 - degrees) / (2 * degrees)))


@lru_cache(maxsize=16)
def transform(degrees: int) -> FloatArray:
    """Return the matrix F, (degrees, degrees), with coefficients = values @ F for values at `points`."""
    k = np.arange(degrees)
    # T_j(x_k) at the angle of x_k = cos(theta); whole multiples of pi / (2 degrees) are reduced exactly
    whole = np.outer(2 * (degrees - 1 - k) + 1, k) % (4 * degrees)
    matrix = np.cos(np.pi * whole / (2 * degrees)) * (2.0 / degrees)
    matrix[:, 0] *= 0.5
    return read_only(matrix)


def evaluation(t: FloatArray, degrees: int) -> FloatArray:
    """Return the matrix E, (degrees, m), with values = coefficients @ E at t in [-1, 1]."""
    return np.ascontiguousarray(chebyshev.chebvander(t, degrees - 1).T)


def local(r: FloatArray, low: FloatArray, high: FloatArray) -> FloatArray:
    """Return where r lies in [low, high], mapped to [-1, 1], with both ends exact."""
    return np.clip(((r - low) - (high - r)) / (high - low), -1.0, 1.0)
