"""Where to look at f - S: half-wave cells that respect the profile's breaks.

The radius is cut at the panels' edges, every panel into cells no longer than half a wave of the last mode,
every cell gets Gauss-Legendre points and its two ends. Where that would be too many, the cells near the ends
of each panel are all kept and of those inside one stands for a growing number of its neighbours: away from
edges the envelope of f - S varies slowly.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from fbexpand.types import FloatArray, IntArray, Numeric

if TYPE_CHECKING:
    from fbexpand.bases import Basis
    from fbexpand.profiles.panels import Panels

POINTS = 12
MOST_CELLS = 768
KEPT = 8  # cells kept beside each end of a panel when cells are sampled
DEGREE_OF_CELL = 8  # a cell's points resolve polynomials of some degrees more
FINE = 1e-6  # of the largest Chebyshev coefficient: what is below it does not shape f - S
GROWTH = 1.25  # of the strata further inside

_x, _w = np.polynomial.legendre.leggauss(POINTS)
NODES: FloatArray = np.concatenate(([-1.0], _x, [1.0]))
WEIGHTS: FloatArray = np.concatenate(([0.0], _w, [0.0]))


@dataclass(frozen=True, eq=False)
class Cells:
    """Intervals [low, high] inside panels; `share` counts the cells that each one stands for."""

    low: FloatArray
    high: FloatArray
    panel: IntArray
    share: FloatArray

    @property
    def sampled(self) -> bool:
        """Whether some cell stands for others."""
        return bool(np.any(self.share > 1.0))

    def radii(self) -> FloatArray:
        """Return the points, shape (cells, points)."""
        half = 0.5 * (self.high - self.low)
        inner = self.low[:, None] + half[:, None] * (NODES + 1.0)
        inner[:, 0] = self.low
        inner[:, -1] = self.high
        return inner

    def weights(self) -> FloatArray:
        """Return weights with which a sum over the points is the integral with weight r dr."""
        half = 0.5 * (self.high - self.low) * self.share
        return np.asarray(half[:, None] * WEIGHTS * self.radii())


def half_wave(basis: Basis, terms: int) -> float:
    """Return the length of half a wave of mode `terms`, at most the radius."""
    root = float(basis.roots(1, max(terms, 1))[0])
    if terms <= 1 and basis.growing:
        root = 0.0
    return float(basis.radius) * (math.pi / root if root > math.pi else 1.0)


def layer_edges(basis: Basis, end: float | None = None) -> FloatArray:
    """Return edges in (0, end) that resolve the steep rise of a growing mode toward `end`, by default the rim."""
    if not basis.growing:
        return np.empty(0)
    end = float(basis.radius) if end is None else end
    depth = basis.radius / max(float(basis.roots(1)[0]), 1.0)
    steps = int(math.log2(end / depth)) if depth < end else 0
    edges = end - depth * 2.0 ** np.arange(-1, steps)
    return np.asarray(edges[(edges > 0.0) & (edges < end)])


def fine_widths(panels: Panels) -> FloatArray:
    """Return for every panel the length on which its polynomial varies like half a wave."""
    moduli = np.abs(panels.coefficients.reshape(-1, *panels.coefficients.shape[-2:]))
    largest = moduli.max(axis=(1, 2), keepdims=True)
    seen = (moduli > FINE * largest).any(axis=0)  # (panels, degrees)
    degree = np.where(seen, np.arange(seen.shape[-1]), 0).max(axis=-1)
    return np.asarray(np.diff(panels.edges) / np.maximum(1.0, degree / DEGREE_OF_CELL))


def panel_cells(basis: Basis, panels: Panels, terms: int) -> Cells:
    """Cut the panels into cells fit for the profile and for sums of up to `terms` terms."""
    return cells_of(basis, panels.edges, terms, widths=fine_widths(panels))


def cells_of(
    basis: Basis, edges: FloatArray, terms: int, most: int = MOST_CELLS, widths: FloatArray | None = None
) -> Cells:
    """Cut the panels into cells for sums of up to `terms` terms, none longer than its panel's width."""
    width = half_wave(basis, terms)
    wanted = np.full(edges.size - 1, width) if widths is None else np.minimum(widths, width)
    cuts = np.union1d(edges, layer_edges(basis))
    cuts = cuts[(cuts >= edges[0]) & (cuts <= edges[-1])]
    wanted = wanted[panel_of(edges, 0.5 * (cuts[1:] + cuts[:-1]))]
    counts = np.maximum(np.ceil((cuts[1:] - cuts[:-1]) / wanted - 1e-9), 1.0).astype(np.int64)
    whole = int(counts.sum()) <= most
    lows, highs, shares = [], [], []
    for a, b, count in zip(cuts[:-1], cuts[1:], counts, strict=True):
        index, share = (np.arange(count), np.ones(count)) if whole else _sample(int(count))
        low = a + (b - a) * index / count
        high = a + (b - a) * (index + 1) / count
        high[index == count - 1] = b
        lows.append(low)
        highs.append(high)
        shares.append(share)
    low, high = np.concatenate(lows), np.concatenate(highs)
    return Cells(low, high, panel_of(edges, 0.5 * (low + high)), np.concatenate(shares))


def _sample(count: int) -> tuple[IntArray, FloatArray]:
    """Choose cells of `count`: all near the ends, one of a growing stratum inside."""
    if count <= 4 * KEPT:
        return np.arange(count), np.ones(count)
    half = count // 2
    edges = list(range(KEPT + 1))
    while edges[-1] < half:
        edges.append(min(max(edges[-1] + 1, int(edges[-1] * GROWTH)), half))
    bounds = np.array(edges)
    share = np.diff(bounds).astype(np.float64)
    golden = np.modf(np.arange(1, share.size + 1) * 0.6180339887498949)[0]
    left = bounds[:-1] + (golden * share).astype(np.int64)
    right = count - 1 - (bounds[:-1] + ((1.0 - golden) * share).astype(np.int64))
    index = np.concatenate((left, right[::-1]))
    shares = np.concatenate((share, share[::-1]))
    if count % 2:  # the two halves leave the middle cell out
        shares[share.size - 1] += 1.0
    return index, shares


def panel_of(edges: FloatArray, r: FloatArray) -> IntArray:
    """Return the index of the panel that holds each radius."""
    return np.clip(np.searchsorted(edges, r, side="right") - 1, 0, edges.size - 2)


def panel_values(panels: Panels, coefficients: Numeric, panel: IntArray, r: FloatArray) -> Numeric:
    """Evaluate panel polynomials at r (cells, points), each row in its panel: (size, cells, points).

    `coefficients` are those of the panels with the batch axes flattened, (size, panels, degrees).
    """
    low, high = panels.edges[panel][:, None], panels.edges[panel + 1][:, None]
    t = np.clip(((r - low) - (high - r)) / (high - low), -1.0, 1.0)
    chosen = coefficients[:, panel, :]
    ahead = after = np.zeros((coefficients.shape[0], *r.shape), dtype=coefficients.dtype)
    for j in range(chosen.shape[-1] - 1, 0, -1):  # Clenshaw's recurrence
        ahead, after = chosen[:, :, j, None] + 2.0 * t * ahead - after, ahead
    return np.asarray(chosen[:, :, 0, None] + t * ahead - after)
