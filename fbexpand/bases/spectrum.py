"""Roots, values at the rim and norms on the unit radius, computed once for each order and rim condition."""

from __future__ import annotations

import math
from functools import lru_cache
from typing import NamedTuple

import numpy as np

from fbexpand.special.norms import PLAIN, RATIO, first_kind, first_norm_at, rim_values
from fbexpand.special.roots import dini_two_part, zeros_two_part
from fbexpand.types import FloatArray

KEPT = 1 << 15  # roots from the first on that are kept


class Rim(NamedTuple):
    """J_nu and J_nu' at the roots, and the norms; where the first mode is scaled, its own norm."""

    value: FloatArray
    slope: FloatArray
    norm: FloatArray


class Spectrum:
    """The dimensionless part of a basis: robin = inf stands for f(R) = 0.

    Arrays grow as asked and are replaced, never changed, so that threads need no lock: at worst two of them
    compute the same.
    """

    def __init__(self, order: float, robin: float) -> None:
        self.order = order
        self.robin = robin
        self._roots = (np.zeros(0), np.zeros(0))
        self._rim = Rim(np.zeros(0), np.zeros(0), np.zeros(0))
        self.kind, self.sigma = PLAIN, -1.0
        if robin < 0.0:
            root = float(self.roots(1, 1)[0][0])
            self.kind, self.sigma = first_kind(order, robin, root)
        elif robin == -order:
            self.kind, self.sigma = RATIO, 0.0

    def roots(self, count: int, start: int) -> tuple[FloatArray, FloatArray]:
        """Return the roots in two parts, each of shape (count,)."""
        stop = start - 1 + count
        if stop > KEPT:
            return self._compute_roots(count, start)
        have = self._roots
        known = have[0].size
        if stop > known:
            grown = min(max(stop, 2 * known, 16), KEPT)
            high, low = self._compute_roots(grown - known, known + 1)
            have = self._roots = (np.concatenate((have[0], high)), np.concatenate((have[1], low)))
        return have[0][start - 1 : stop], have[1][start - 1 : stop]

    def rim(self, count: int, start: int) -> Rim:
        """Return what is known at the rim, each of shape (count,)."""
        stop = start - 1 + count
        if stop > KEPT:
            return self._compute_rim(*self.roots(count, start), start)
        have = self._rim
        known = have.norm.size
        if stop > known:
            grown = min(max(stop, 2 * known, 16), KEPT)
            more = self._compute_rim(*self.roots(grown - known, known + 1), known + 1)
            have = self._rim = Rim(*(np.concatenate(pair) for pair in zip(have, more, strict=True)))
        return Rim(*(part[start - 1 : stop] for part in have))

    def _compute_roots(self, count: int, start: int) -> tuple[FloatArray, FloatArray]:
        if math.isinf(self.robin):
            return zeros_two_part(self.order, count, start)
        return dini_two_part(self.order, self.robin, count, start)

    def _compute_rim(self, high: FloatArray, low: FloatArray, start: int) -> Rim:
        special = start == 1 and (self.kind != PLAIN)
        if not special:
            return Rim(*rim_values(self.order, self.robin, high, low))
        parts = Rim(*(np.concatenate((np.zeros(1), p)) for p in self._others(high[1:], low[1:])))
        if self.kind != RATIO:
            value, slope, _ = rim_values(self.order, self.robin, high[:1], low[:1])
            parts.value[0], parts.slope[0] = value[0], slope[0]
        root, root_low = float(high[0]), float(low[0])
        parts.norm[0] = first_norm_at(self.order, self.robin, root, root_low, self.sigma, self.kind)
        return parts

    def _others(self, high: FloatArray, low: FloatArray) -> tuple[FloatArray, FloatArray, FloatArray]:
        if high.size == 0:
            return high, high, high
        return rim_values(self.order, self.robin, high, low)


@lru_cache(maxsize=32)
def spectrum_of(order: float, robin: float) -> Spectrum:
    """Return the shared spectrum; equal bases of any radius have the same."""
    return Spectrum(order, robin)
