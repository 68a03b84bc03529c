"""Profiles that grow without bound: read off panels that shrink toward an edge."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
from numpy.polynomial import chebyshev

from fbexpand.types import FloatArray

if TYPE_CHECKING:
    from fbexpand.profiles.panels import Panels

BoolArray = np.ndarray[tuple[int, ...], np.dtype[np.bool_]]

DEEP = 16  # panels in a row that shrink toward an edge
SHRINKS = 1.4  # times from one to the next, at least
LASTING = 0.5  # of its earlier growth per panel must remain: a root levels off, a logarithm does not


def unbounded(panels: Panels) -> BoolArray:
    """Whether each profile grows without bound toward some edge, as far as the panels tell, shape (size,).

    Where panels shrink geometrically toward an edge, the growth of |f| from one to the next falls
    geometrically if f has a limit there; if it does not fall, f has none.
    """
    flat = panels.coefficients.reshape(-1, *panels.coefficients.shape[-2:])
    found = np.zeros(flat.shape[0], dtype=bool)
    count = panels.edges.size - 1
    if count < DEEP:
        return found
    lengths = np.diff(panels.edges)
    matrix = chebyshev.chebvander(np.array([-1.0, 1.0]), flat.shape[-1] - 1)
    ends = np.abs(flat @ matrix.T)  # (size, panels, 2)
    for edge in range(count + 1):
        for step, side in ((1, 0), (-1, 1)):
            row = np.arange(DEEP) * step + (edge if step == 1 else edge - 1)
            if row.min() < 0 or row.max() >= count:
                continue
            if np.all(lengths[row[2:]] >= SHRINKS * lengths[row[1:-1]]):
                found |= _keeps_growing(ends[:, row[1:], side])
    return found


def _keeps_growing(values: FloatArray) -> BoolArray:
    """Whether |f| (size, panels) grows toward the first panel without slowing down."""
    growth = values[:, :-1] - values[:, 1:]
    return np.asarray(np.all(growth > 0.0, axis=1) & (growth[:, 0] >= LASTING * growth[:, -1]))
