"""The mode that grows toward the rim: its coefficient as a weight for every Chebyshev coefficient.

I_nu(mu x) / I_nu(mu) lives in a layer of depth R / mu at the rim. Its panels double in width from there, and
nodes are counted by their distance from the rim: a node rounded to double is off by up to eps R, by which the
mode changes as exp(mu eps); what that changes in the mode goes into the weight.
"""

from __future__ import annotations

import math
from itertools import pairwise
from typing import TYPE_CHECKING

import numpy as np

from fbexpand.analysis.rules import composite_rule, sizes
from fbexpand.profiles import chebyshev
from fbexpand.types import FloatArray

if TYPE_CHECKING:
    from fbexpand.bases import Basis

DEEPEST = 64.0  # depths of the layer beyond which the mode counts for nothing, exp(-64)


def growing_moments(basis: Basis, edges: FloatArray, degrees: int) -> FloatArray:
    """Return integral T_j phi_1 r dr on every panel, (P, degrees), for a basis whose first mode grows."""
    order, radius = float(basis.order), float(basis.radius)
    mu = float(basis.roots(1)[0])
    total = np.zeros((edges.size - 1, degrees))
    layers = radius * (1.0 - 2.0 ** np.arange(-1.0, math.log2(DEEPEST) + 1.0) / mu)
    begin = max(float(layers[-1]), 0.0)
    cuts = np.unique(np.concatenate((edges, layers[layers > 0.0])))
    cuts = cuts[cuts >= begin]
    slope = math.hypot(mu, order) / radius
    for low, high in pairwise(cuts.tolist()):
        panel = int(np.searchsorted(edges, low, side="right")) - 1
        a, b = float(edges[panel]), float(edges[panel + 1])
        width = high - low
        fraction = order % 1.0
        waves = 0.5 * math.hypot(mu, order) * width / radius
        stretches, counts = sizes(np.array([waves]), degrees, np.array([low / high]), fraction)
        rule = composite_rule(int(stretches[0]), int(counts[0]), fraction if low == 0.0 else 0.0)
        depth = (radius - low) - width * rule.nodes
        r = radius - depth
        moved = (radius - r) - depth  # by which the exact node lies further out than the rounded one
        mode = basis.modes(r, 1)[:, 0] * np.exp(slope * moved)
        t = np.clip((2.0 * (((b - radius) + depth) / (a - b)) + 1.0), -1.0, 1.0)
        total[panel] += chebyshev.evaluation(t, degrees) @ (width * rule.weights * r * mode)
    return total
