"""Nodes and weights over all panels of a profile, fine enough for modes up to a root."""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass
from functools import lru_cache
from typing import NamedTuple

import numpy as np

from fbexpand.analysis.rules import MOST_NODES, Rule, composite_rule, sizes
from fbexpand.records import ReadOnlyArrays
from fbexpand.types import FloatArray, IntArray

KEPT_REACH = 4096.0  # of roots: layouts of one panel up to there are kept


class Group(NamedTuple):
    """Panels that share a rule."""

    panels: IntArray
    rule: Rule


@dataclass(frozen=True, eq=False)
class Layout(ReadOnlyArrays):
    """Radii, group after group and panel after panel, and weights of integral f phi r dr, both (m,)."""

    groups: tuple[Group, ...]
    degrees: int
    radii: FloatArray
    weights: FloatArray

    def values(self, rows: FloatArray) -> FloatArray:
        """Return piecewise polynomials of coefficients (size, P, degrees) at the radii, (size, m)."""
        size = rows.shape[0]
        if len(self.groups) == 1 and self.groups[0].panels.size == rows.shape[1]:
            return (rows @ self.groups[0].rule.evaluation(self.degrees)).reshape(size, -1)
        parts = [
            (rows[:, group.panels] @ group.rule.evaluation(self.degrees)).reshape(size, -1) for group in self.groups
        ]
        return np.concatenate(parts, axis=1)

    def blocks(self, rows: FloatArray, step: int) -> Iterator[tuple[int, FloatArray]]:
        """Yield (first radius, values) for blocks of about `step` radii, (size, radii of the block)."""
        start = 0
        for group in self.groups:
            nodes = group.rule.nodes.size
            many = max(1, step // nodes)
            for low in range(0, group.panels.size, many):
                chosen = rows[:, group.panels[low : low + many]]
                for first in range(0, nodes, step):
                    values = chosen @ group.rule.evaluation(self.degrees, first, first + step)
                    yield start + low * nodes + first, values.reshape(rows.shape[0], -1)
            start += group.panels.size * nodes

    def moments(self, modes: FloatArray) -> FloatArray:
        """Return integral T_j phi_k r dr on every panel from modes (m, count) at the radii: (P, degrees, count)."""
        count = modes.shape[1]
        total = np.empty((sum(group.panels.size for group in self.groups), self.degrees, count))
        weighted = modes * self.weights[:, None]
        start = 0
        for group in self.groups:
            nodes = group.rule.nodes.size
            stop = start + group.panels.size * nodes
            part = weighted[start:stop].reshape(group.panels.size, nodes, count)
            total[group.panels] = group.rule.evaluation(self.degrees) @ part
            start = stop
        return total


def lay_out(edges: FloatArray, degrees: int, order: float, root: float) -> Layout:
    """Return the layout for polynomials of `degrees` coefficients and modes of `order` with roots up to `root`.

    A mode of order nu varies as r^nu where its root is below nu, which takes no finer nodes than a root of nu.
    """
    reach = max(root, order)
    if edges.size == 2 and reach <= KEPT_REACH:
        return _one_panel(float(edges[1]), degrees, order % 1.0, math.ceil(reach))
    return _lay_out(edges, degrees, order % 1.0, reach)


@lru_cache(maxsize=32)
def _one_panel(radius: float, degrees: int, fraction: float, reach: int) -> Layout:
    """Return the layout of one panel: bases whose roots reach about as far share it."""
    return _lay_out(np.array([0.0, radius]), degrees, fraction, float(reach))


def _lay_out(edges: FloatArray, degrees: int, fraction: float, reach: float) -> Layout:
    low, high = edges[:-1], edges[1:]
    width = high - low
    stretches, counts = sizes(0.5 * reach * width / edges[-1], degrees, low / high, fraction)
    kinds = stretches * (2 * MOST_NODES) + counts
    if fraction:
        kinds[0] = -kinds[0]  # the panel at the axis has weights of its own
    groups, radii, weights = [], [], []
    for kind in np.unique(kinds):
        panels = np.flatnonzero(kinds == kind)
        first = int(panels[0])
        rule = composite_rule(int(stretches[first]), int(counts[first]), fraction if kind < 0 else 0.0)
        groups.append(Group(panels, rule))
        r = low[panels, None] + width[panels, None] * rule.nodes
        radii.append(r.ravel())
        weights.append((width[panels, None] * rule.weights * r).ravel())
    return Layout(tuple(groups), degrees, np.concatenate(radii), np.concatenate(weights))
