"""Coefficients of panels: c_k = (1/N_k) integral f phi_k r dr, the modes' values kept for the next profile."""

from __future__ import annotations

import threading
from collections import OrderedDict
from collections.abc import Hashable, Iterator
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np

from fbexpand.analysis.growing import growing_moments
from fbexpand.analysis.layout import Layout, lay_out
from fbexpand.profiles.panels import Panels
from fbexpand.transform.direct import as_rows, from_rows
from fbexpand.types import FloatArray, Numeric

if TYPE_CHECKING:
    from fbexpand.bases import Basis

TERMS_AT_ONCE = 256  # at the least; then an octave, up to
MOST_TERMS_AT_ONCE = 1024  # on the nodes that the last of them takes
NUMBERS_AT_ONCE = 1 << 21  # modes, or values of the profiles, held at once
KEPT_BYTES = 64 << 20
MANY = 2  # profiles per degree of a panel from which it pays to integrate Chebyshev polynomials first


@dataclass(frozen=True, eq=False)
class Weights:
    """What the coefficients of modes start, ..., start + count - 1 take on given panels.

    `modes` (m, count) are their values at the layout's radii, None where they are too many to keep; `growing`
    (P, degrees) are the moments of a steep first mode, which has nodes of its own.
    """

    basis: Basis  # held so that a key made of its identity stays its own
    layout: Layout
    norms: FloatArray
    modes: FloatArray | None
    growing: FloatArray | None

    @property
    def nbytes(self) -> int:
        """Bytes held, about."""
        return 16 * self.layout.radii.size + 8 * self.norms.size + (0 if self.modes is None else self.modes.nbytes)


class _Kept:
    """The weights used last, up to a number of bytes."""

    def __init__(self, limit: int) -> None:
        self._limit = limit
        self._entries: OrderedDict[Hashable, Weights] = OrderedDict()
        self._total = 0
        self._lock = threading.Lock()

    def get(self, key: Hashable) -> Weights | None:
        """Return what is kept under `key`, None if nothing is."""
        with self._lock:
            known = self._entries.get(key)
            if known is not None:
                self._entries.move_to_end(key)
            return known

    def keep(self, key: Hashable, weights: Weights) -> None:
        """Keep the weights; those not used for longest go first."""
        with self._lock:
            old = self._entries.pop(key, None)
            self._entries[key] = weights
            self._total += weights.nbytes - (0 if old is None else old.nbytes)
            while self._total > self._limit and len(self._entries) > 1:
                self._total -= self._entries.popitem(last=False)[1].nbytes

    def clear(self) -> None:
        """Keep nothing."""
        with self._lock:
            self._entries.clear()
            self._total = 0

    def __len__(self) -> int:
        return len(self._entries)

    @property
    def nbytes(self) -> int:
        """Bytes held, about."""
        with self._lock:
            return sum(entry.nbytes for entry in self._entries.values())


_kept = _Kept(KEPT_BYTES)


def forget() -> None:
    """Drop the weights that are kept."""
    _kept.clear()


def coefficients_of(panels: Panels, basis: Basis, count: int, start: int = 1) -> Numeric:
    """Return c_k for k = start, ..., start + count - 1, shape (*batch, count)."""
    rows = as_rows(panels.coefficients.reshape(*panels.batch_shape, -1)).reshape(
        -1, panels.edges.size - 1, panels.degrees
    )
    out = np.empty((rows.shape[0], count))
    unit: Basis = getattr(basis, "unit", basis)  # profiles on any radius share the weights of the radius 1
    edges = panels.edges if unit.radius == basis.radius else panels.edges / panels.edges[-1]
    for first, number in _chunks(start, count):
        weights = weights_of(unit, edges, panels.degrees, number, first)
        out[:, first - start : first - start + number] = _integrals(rows, weights, first) / weights.norms
    return from_rows(out, panels.coefficients[..., 0])


def _chunks(start: int, count: int) -> Iterator[tuple[int, int]]:
    """Cut the terms into octaves, so that low modes are not summed on the nodes of high ones."""
    stop = start + count
    while start < stop:
        number = min(max(TERMS_AT_ONCE, min(start, MOST_TERMS_AT_ONCE)), stop - start)
        yield start, number
        start += number


def weights_of(basis: Basis, edges: FloatArray, degrees: int, count: int, start: int) -> Weights:
    """Return the weights, from those kept where they are known; the least recently used go first."""
    own: Any = getattr(basis, "key", None)
    key = (id(basis) if own is None else own, edges.tobytes(), degrees, count, start)
    weights = _kept.get(key)
    if weights is None:
        weights = _make(basis, edges, degrees, count, start)
        _kept.keep(key, weights)
    return weights


def _make(basis: Basis, edges: FloatArray, degrees: int, count: int, start: int) -> Weights:
    root = float(basis.roots(1, start + count - 1)[0])
    growing = None
    if start == 1 and basis.growing:
        steep = float(basis.roots(1)[0])
        if count == 1:
            root = 0.0
        if steep > max(root, float(basis.order)):
            growing = growing_moments(basis, edges, degrees)
        elif count == 1:
            root = steep
    layout = lay_out(edges, degrees, float(basis.order), root)
    modes = None
    if layout.radii.size * count <= NUMBERS_AT_ONCE:
        modes = np.ascontiguousarray(basis.modes(layout.radii, count, start))
    return Weights(basis, layout, basis.norms(count, start), modes, growing)


def _integrals(rows: FloatArray, weights: Weights, start: int) -> FloatArray:
    """Return integral f phi_k r dr, (size, count)."""
    layout, modes = weights.layout, weights.modes
    size = rows.shape[0]
    if modes is not None and size > MANY * layout.degrees:
        moments = layout.moments(modes)
        total = rows.reshape(size, -1) @ moments.reshape(-1, moments.shape[2])
    elif modes is not None and size * layout.radii.size <= NUMBERS_AT_ONCE:
        total = (layout.values(rows) * layout.weights) @ modes
    else:
        total = _in_blocks(rows, weights, start)
    if weights.growing is not None:
        total[:, 0] = rows.reshape(size, -1) @ weights.growing.ravel()
    return total


def _in_blocks(rows: FloatArray, weights: Weights, start: int) -> FloatArray:
    """Sum over blocks of radii, so that neither the modes nor the profiles' values fill the memory."""
    layout, count = weights.layout, weights.norms.size
    total = np.zeros((rows.shape[0], count))
    step = max(1, NUMBERS_AT_ONCE // max(count, rows.shape[0]))
    for low, values in layout.blocks(rows, step):
        here = slice(low, low + values.shape[1])
        modes = weights.basis.modes(layout.radii[here], count, start) if weights.modes is None else weights.modes[here]
        total += (values * layout.weights[here]) @ modes
    return total
