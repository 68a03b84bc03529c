"""What the profile itself says about the limits of its series: the rim, the axis, jumps."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.polynomial import chebyshev

from fbexpand.estimates.singular import unbounded
from fbexpand.types import FloatArray, Numeric

if TYPE_CHECKING:
    from fbexpand.bases import Basis
    from fbexpand.profiles.panels import Panels


def end_values(panels: Panels, panel: int, t: float) -> Numeric:
    """Return the value of one panel's polynomial at the local coordinate t, shape (size,)."""
    degrees = panels.coefficients.shape[-1]
    return np.asarray(
        panels.coefficients.reshape(-1, *panels.coefficients.shape[-2:])[:, panel]
        @ (chebyshev.chebvander(np.array([t]), degrees - 1)[0])
    )


def largest_value(panels: Panels) -> FloatArray:
    """Return the largest modulus of the profile at Chebyshev points, shape (size,)."""
    degrees = panels.coefficients.shape[-1]
    t = np.cos(np.pi * np.arange(2 * degrees + 1) / (2 * degrees))
    matrix = chebyshev.chebvander(t, degrees - 1)
    flat = panels.coefficients.reshape(-1, *panels.coefficients.shape[-2:])
    return np.asarray(np.abs(flat @ matrix.T).max(axis=(-2, -1)))


def rim_defect(basis: Any, panels: Panels) -> tuple[Numeric | None, FloatArray]:
    """Return by how much the profile breaks the rim condition, and the size that this compares with.

    f(R) for a basis of zero rim, R f'(R) + robin f(R) for one with a `robin`, None for a basis that has no
    such name and does not vanish at the rim.
    """
    scale = largest_value(panels)
    rim = end_values(panels, -1, 1.0)
    robin = getattr(basis, "robin", None)
    if robin is None:
        return (rim if vanishes(basis, basis.radius) else None), scale
    length = panels.edges[-1] - panels.edges[-2]
    last = panels.coefficients.reshape(-1, *panels.coefficients.shape[-2:])[:, -1]
    slope = (
        chebyshev.chebval(1.0, chebyshev.chebder(last.T)) * (2.0 / length)
        if last.shape[-1] > 1
        else 0.0 * rim
    )
    size = max(1.0, abs(robin))
    slope = basis.radius * slope / size
    return slope + (robin / size) * rim, scale + np.abs(slope)


def vanishes(basis: Basis, r: float) -> bool:
    """Whether the first modes all vanish at r, as far as rounding can tell."""
    inside = basis.radius * np.linspace(0.0, 1.0, 33)
    heights = np.abs(basis.modes(inside, 4)).max(axis=0)
    return bool(np.all(np.abs(basis.modes(np.array([r]), 4))[0] <= 1e-10 * heights))


def sup_floor(basis: Basis, panels: Panels) -> FloatArray:
    """Return what no partial sum can get below in the sup norm, shape (size,).

    Half of every jump; the value at the rim, or at the axis, where all modes vanish. Differences at the level
    of the panels' own error do not count.
    """
    scale = largest_value(panels)
    residual = np.asarray(panels.residual).reshape(scale.size, -1).max(axis=1)
    floor = np.zeros(scale.size)
    for panel in range(1, panels.edges.size - 1):
        floor = np.maximum(
            floor, 0.5 * np.abs(end_values(panels, panel, -1.0) - end_values(panels, panel - 1, 1.0))
        )
    if vanishes(basis, basis.radius):
        floor = np.maximum(floor, np.abs(end_values(panels, -1, 1.0)))
    if vanishes(basis, 0.0):
        floor = np.maximum(floor, np.abs(end_values(panels, 0, -1.0)))
    floor = np.where(floor > 1e-12 * scale + 4.0 * residual, floor, 0.0)
    return np.where(unbounded(panels), np.inf, floor)
