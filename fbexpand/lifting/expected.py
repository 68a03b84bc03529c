"""How a profile breaks the rim condition, and how fast coefficients can fall: the slowest of rim, axis, interior."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.polynomial import chebyshev

from fbexpand.estimates.rim import largest_value
from fbexpand.lifting.rim_terms import condition_of, rim_terms
from fbexpand.records import ReadOnlyArrays
from fbexpand.types import FloatArray, Numeric

if TYPE_CHECKING:
    from fbexpand.bases import Basis
    from fbexpand.profiles.panels import Panels

TERMS = 4  # of the rim that are looked at
SEEN = 1e-9  # of the profile: less than this at axis or breaks is rounding
DERIVATIVES = 3  # whose jumps at breaks are looked at
RELATIVE = 1e-4  # of the derivative itself: two panels agree no better on one that is steep toward the axis
NEAR = 2.0**-9  # of the radius: where the profile's power at the axis is read off
WHOLE = 0.04  # a power this close to order + 2 i is one


@dataclass(frozen=True, eq=False)
class LiftResidual(ReadOnlyArrays):
    """What is left of f at the rim, and the decay to expect of the orthonormal coefficients, b_k ~ k^(-decay).

    `defects` (*batch, 4) are B f, B lap f, B lap^2 f, B lap^3 f with lap in units of 1/R^2 (f minus its closed part,
    where one was lifted), B f = f(R) or R f'(R) + robin f(R); 0 where they are lost in rounding. `decay` (*batch,) is
    the least of `rim`, `axis` and `interior`, inf where none of them limits it; `limited_by` (*batch,) names that one,
    "none" if no limit is seen.
    """

    defects: Numeric
    rim: FloatArray
    axis: FloatArray
    interior: FloatArray

    @property
    def decay(self) -> FloatArray:
        """The exponent to expect."""
        return np.asarray(np.minimum(np.minimum(self.rim, self.axis), self.interior))

    @property
    def limited_by(self) -> Any:
        """Which of the three it is."""
        names = np.array(["rim", "axis", "interior"])
        each = np.stack((self.rim, self.axis, self.interior))
        return np.where(np.isinf(self.decay), "none", names[np.argmin(each, axis=0)])[()]


def lift_residual(basis: Basis, panels: Panels) -> LiftResidual:
    """Return what a profile's panels say."""
    robin, order = condition_of(basis), float(basis.order)
    shape = panels.batch_shape
    found, doubt = rim_terms(basis, panels, TERMS)
    scale = largest_value(panels)
    found = np.where(np.abs(found) > np.maximum(doubt, SEEN * scale[:, None]), found, 0.0)
    broken = found != 0.0
    first = np.where(broken.any(axis=1), broken.argmax(axis=1), np.inf)
    rim = 2.0 * first + (1.0 if math.isinf(robin) else 2.0)
    return LiftResidual(
        found.reshape(*shape, TERMS),
        rim.reshape(shape),
        _axis(panels, order, scale).reshape(shape),
        _interior(panels, scale).reshape(shape),
    )


def _axis(panels: Panels, order: float, scale: FloatArray) -> FloatArray:
    """Return beta + 3/2 for the lowest power r^beta at the axis that is not r^(order + 2 i), (size,).

    The power is read off by comparing four radii that halve; it is only the leading one or two that are seen.
    """
    radius = float(panels.edges[-1])
    high = min(NEAR * radius, 0.5 * float(panels.edges[1])) if panels.edges[1] > 1e-3 * radius else NEAR * radius
    r = high * 0.5 ** np.arange(4.0)
    values = panels(r).reshape(-1, 4)
    out = np.full(values.shape[0], np.inf)
    for row in range(out.size):
        f = values[row]
        if np.any(np.abs(f) <= SEEN * SEEN * scale[row]) or scale[row] == 0.0:
            continue
        g = f / (r / radius) ** order
        beta = math.log2(float(np.abs(f[2] / f[3])))
        if _foreign(beta, order):
            out[row] = beta + 1.5
            continue
        steps = np.abs(np.diff(g))  # g = g_0 + g_p r^p + ...
        if np.all(steps > SEEN * np.abs(g).max()):
            power = math.log2(float(steps[1] / steps[2]))
            if _foreign(order + power, order):
                out[row] = order + power + 1.5
    return out


def _foreign(beta: float, order: float) -> bool:
    share = (beta - order) / 2.0
    return beta < order - WHOLE or abs(share - round(share)) > WHOLE


def _interior(panels: Panels, scale: FloatArray) -> FloatArray:
    """Return j + 1 for the lowest derivative that jumps between two panels, (size,)."""
    rows, radius = panels.rows(), float(panels.edges[-1])
    out = np.full(rows.shape[0], np.inf)
    sides = np.diff(panels.edges)
    left = right = np.moveaxis(rows, -1, 0)
    residual = np.asarray(panels.residual).reshape(rows.shape[0], -1)
    for n in range(DERIVATIVES):
        if n:
            left = right = chebyshev.chebder(left) * (2.0 * radius / sides)
        ends = np.asarray(chebyshev.chebval(1.0, left))
        starts = np.asarray(chebyshev.chebval(-1.0, right))
        jumps = np.abs(ends[:, :-1] - starts[:, 1:])
        steep = (2.0 * radius * rows.shape[-1] ** 2 / np.minimum(sides[:-1], sides[1:])) ** n
        noise = np.maximum(SEEN * scale[:, None], (1e-14 * scale[:, None] + residual[:, 1:] + residual[:, :-1]) * steep)
        wide = np.minimum(sides[:-1], sides[1:]) > 1e-6 * radius
        found = (jumps > noise) & wide & (jumps > RELATIVE * (np.abs(ends[:, :-1]) + np.abs(starts[:, 1:])))
        out = np.minimum(out, np.where(found.any(axis=1), n + 1.0, np.inf))
    return out
