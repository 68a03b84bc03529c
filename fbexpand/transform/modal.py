"""Modes at radii in two parts, r + low, so that a grid keeps the phase lambda r / R to more than a double's digits."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import numpy as np

from fbexpand.types import FloatArray

if TYPE_CHECKING:
    from fbexpand.bases import Basis

STEP = 1e-4  # of a wave: a difference quotient where a basis offers no derivatives


def two_part_modes(basis: Basis, r: FloatArray, low: FloatArray | None, count: int, start: int = 1) -> FloatArray:
    """Return phi_k(r + low), shape (m, count); `low` is None, or at most about an ulp of r.

    The low part enters by the first derivative: what is left out is (lambda low / R)^2.
    """
    modes = np.ascontiguousarray(basis.modes(r, count, start), dtype=np.float64)
    if low is not None and low.any():
        if not modes.flags.writeable:
            modes = modes.copy()
        modes += low[:, None] * _slopes(basis, r, count, start)
    return modes


def _slopes(basis: Basis, r: FloatArray, count: int, start: int) -> FloatArray:
    modes_of: Any = basis.modes  # `derivative` is an extra that not every basis has
    try:
        return np.asarray(modes_of(r, count, start, derivative=1))
    except TypeError:
        # a rough slope will do: it is multiplied by an ulp
        h = STEP * basis.radius / max(1.0, float(basis.roots(1, start + count - 1)[0]))
        inner, outer = np.maximum(r - h, 0.0), np.minimum(r + h, basis.radius)
        rise = np.asarray(basis.modes(outer, count, start) - basis.modes(inner, count, start), dtype=np.float64)
        return np.asarray(rise / (outer - inner)[:, None])
