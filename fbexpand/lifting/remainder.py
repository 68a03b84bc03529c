"""The panels of f - p: those of f, divided toward the axis where a power is no polynomial, p subtracted on each."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING

import numpy as np

from fbexpand.estimates.origin import regrid
from fbexpand.profiles import chebyshev
from fbexpand.types import FloatArray

if TYPE_CHECKING:
    from fbexpand.lifting.closed_part import ClosedPart
    from fbexpand.profiles.panels import Panels

DEGREES = 64  # at the least: they resolve r^s, s up to 70, on [h/4, h]
GRADE = 0.25
DEEPEST = 1e-60  # of the radius, where the power is still
NEGLIGIBLE = 1e-18  # of its value at the rim
EPS = float(np.finfo(np.float64).eps)


def remainder(panels: Panels, part: ClosedPart) -> Panels:
    """Return the panels of f - p."""
    edges = _edges(panels.edges, part)
    degrees = max(panels.degrees, DEGREES)
    coefficients, residual = regrid(panels, edges, degrees)
    middle, half = 0.5 * (edges[1:] + edges[:-1]), 0.5 * np.diff(edges)
    r = middle[:, None] + half[:, None] * chebyshev.points(degrees)
    subtracted = part(r) @ chebyshev.transform(degrees)
    shape = np.broadcast_shapes(coefficients.shape[:-2], subtracted.shape[:-2])
    left = np.broadcast_to(coefficients - subtracted, (*shape, *coefficients.shape[-2:]))
    size = np.abs(coefficients).max(axis=(-2, -1), keepdims=True) + np.abs(subtracted).max(axis=(-2, -1), keepdims=True)
    left = np.where(np.abs(left) > EPS * size, left, 0.0)  # what is left of equals is rounding
    return replace(
        panels,
        edges=edges,
        coefficients=left,
        residual=np.broadcast_to(residual, (*shape, residual.shape[-1])) + 2.0 * EPS * size[..., 0],
    )


def _edges(edges: FloatArray, part: ClosedPart) -> FloatArray:
    """Divide the panel at the axis, [0, h], by fours, unless all powers are polynomials that it resolves."""
    exponents = part.exponents
    if np.all(exponents == np.rint(exponents)) and exponents.max() < 0.5 * DEGREES:
        return edges
    high, radius = float(edges[1]), float(edges[-1])
    if edges[1] <= DEEPEST * radius:
        return edges
    cuts = [high]
    while cuts[-1] > DEEPEST * radius and (cuts[-1] / radius) ** float(exponents.min()) > NEGLIGIBLE:
        cuts.append(GRADE * cuts[-1])
    return np.concatenate((edges[:1], cuts[:0:-1], edges[1:]))
