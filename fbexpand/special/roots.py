"""Zeros of J_nu and Dini roots, each with a low part, at any index without the ones before it."""

from __future__ import annotations

import threading
from collections import OrderedDict
from dataclasses import dataclass

import numpy as np

from fbexpand import checks
from fbexpand.kernels import roots_dini, roots_far, roots_mcmahon, roots_near, roots_phase
from fbexpand.kernels.roots_first import first_root
from fbexpand.types import FloatArray

MAX_ORDER = 1e6
MAX_INDEX = 2**50  # beyond this k - 1/4 is no longer exact
_KEPT = 64  # orders whose tables are kept
_CHUNK = 65536


@dataclass(frozen=True, eq=False)
class _Phase:
    """The phase of one order: panels for small x, its inverse beyond; see the kernels for the rows."""

    panels: FloatArray
    panel_count: int
    zeros_inside: int
    scale: float
    pieces: FloatArray
    piece_count: int

    @property
    def inside(self) -> tuple[FloatArray, int]:
        """The panels, as the kernels take them."""
        return self.panels, self.panel_count

    @property
    def beyond(self) -> tuple[float, FloatArray, int]:
        """The inverse beyond the panels, as the kernels take it."""
        return self.scale, self.pieces, self.piece_count


_tables: OrderedDict[float, _Phase] = OrderedDict()
_lock = threading.Lock()
_NO_PIECES = np.zeros((1, roots_far.WIDTH))


def _build(order: float) -> _Phase:
    terms = roots_phase.outer_terms(order)
    a = np.zeros((terms, 2))
    b = np.zeros((terms, 2))
    terms = roots_phase.outer_series(order, a, b)
    capacity = 48 + int(order / 40.0)
    count = 0
    while count == 0:
        panels = np.zeros((capacity, roots_phase.WIDTH))
        count = roots_phase.march(order, a, b, terms, panels)
        capacity *= 2
    panels = panels[:count].copy()
    scale = float(panels[0, 2] + roots_phase.phase_shift(order)[0])
    pieces = np.zeros((roots_far.MAX_PIECES, roots_far.WIDTH))
    piece_count = roots_far.fit_far(order, b, terms, scale, pieces)
    return _Phase(panels, count, roots_near.zeros_inside(panels), scale, pieces, piece_count)


def _phase(order: float) -> _Phase:
    with _lock:
        table = _tables.get(order)
        if table is not None:
            _tables.move_to_end(order)
            return table
    table = _build(order)
    with _lock:
        table = _tables.setdefault(order, table)
        while len(_tables) > _KEPT:
            _tables.popitem(last=False)
    return table


def _fill_zeros(order: float, start: int, high: FloatArray, low: FloatArray) -> None:
    """Fill the zeros from `start` on by the method each index belongs to, whatever else is asked for."""
    end = start + high.size
    last = int(roots_mcmahon.mcmahon_start(order))
    if start < last:
        table = _phase(order)
        near = min(max(table.zeros_inside + 1 - start, 0), high.size)
        far = min(last, end) - start
        if near:
            roots_near.near_zeros(*table.inside, start, high[:near], low[:near])
        if far > near:
            roots_far.far_zeros(order, *table.beyond, start + near, high[near:far], low[near:far])
        start, high, low = start + far, high[far:], low[far:]
    if high.size:
        roots_mcmahon.mcmahon_zeros(order, start, high, low)


def _fill_dini(order: float, robin: float, start: int, high: FloatArray, low: FloatArray) -> None:
    """Fill the Dini roots from `start` on; the first is the root of the continued fraction."""
    if start == 1:
        shift = order + robin
        if shift == 0.0:
            high[0] = low[0] = 0.0
        else:
            part = shift - order
            rest = (order - (shift - part)) + (robin - part)
            top = np.empty(1)
            roots_near.near_zeros(*_phase(order).inside, 1, top, np.empty(1))
            high[0], low[0] = first_root(order, shift, rest, float(top[0]))
        start, high, low = 2, high[1:], low[1:]
    end = start + high.size
    last = int(roots_mcmahon.mcmahon_start(order))
    if high.size and start < last:
        table = _phase(order)
        inside = roots_dini.dini_inside(order, robin, table.panels)
        near = min(max(inside + 1 - start, 0), high.size)
        far = max(min(last, end) - start, near)
        if near:
            roots_dini.near_dini(order, robin, *table.inside, start, high[:near], low[:near])
        if far > near:
            roots_dini.far_dini(order, robin, *table.beyond, start + near, high[near:far], low[near:far])
        start, high, low = start + far, high[far:], low[far:]
    if high.size:
        roots_dini.far_dini(order, robin, 1.0, _NO_PIECES, 0, start, high, low)


def zeros_two_part(order: float, count: int, start: int = 1) -> tuple[FloatArray, FloatArray]:
    """Return the zeros of J_order as nearest doubles and what is left, each (count,). Unchecked."""
    high, low = np.empty(count), np.empty(count)
    _fill_zeros(float(order), start, high, low)
    return high, low


def dini_two_part(order: float, robin: float, count: int, start: int = 1) -> tuple[FloatArray, FloatArray]:
    """Return the roots of `dini_roots` as nearest doubles and what is left, each (count,). Unchecked."""
    high, low = np.empty(count), np.empty(count)
    _fill_dini(float(order), float(robin), start, high, low)
    return high, low


def _arguments(order: float, count: int, start: int) -> tuple[float, int, int]:
    order = checks.non_negative("order", order)
    if order > MAX_ORDER:
        raise checks.value_error("order", f"at most {MAX_ORDER:g}", order)
    start = checks.integer("start", start, 1, MAX_INDEX)
    count = checks.integer("count", count, 1, MAX_INDEX)
    checks.storable("count", count, 8 * count)
    if start + count - 1 > MAX_INDEX:
        raise checks.value_error("count", f"at most {MAX_INDEX + 1 - start} for this start", count)
    return order, count, start


def bessel_zeros(order: float, count: int, start: int = 1) -> FloatArray:
    r"""Positive zeros of the Bessel function J of real order, from the `start`-th on.

    J_order(j_k) = 0, 0 < j_1 < j_2 < ...; the index is that of the phase, theta(j_k) = (k - 1/2) pi, so that
    none can be skipped, at any `start`, without computing those before. Within one unit in the last place;
    the nearest double unless the zero is within 1e-6 units of the middle between two.

    Parameters
    ----------
    order
        Real, from 0 to 1e6.
    count
        How many, at least 1; `start + count - 1` at most 2**50.
    start
        Index of the first, counted from 1.

    Returns
    -------
    Array of shape `(count,)`, dimensionless, strictly increasing.

    Raises
    ------
    TypeError, ValueError
        naming the argument and its value; a count that does not fit into memory is a ValueError.

    References
    ----------
    DLMF (https://dlmf.nist.gov), 10.18 (phase) and 10.21.19 (McMahon's expansion).

    Examples
    --------
    >>> from fbexpand.special.roots import bessel_zeros
    >>> bessel_zeros(0, 3).tolist()
    [2.404825557695773, 5.520078110286311, 8.653727912911013]
    >>> bessel_zeros(0.5, 1, start=10**9)[0] == 10**9 * 3.141592653589793
    np.True_
    """
    order, count, start = _arguments(order, count, start)
    high = np.empty(count)
    low = np.empty(min(count, _CHUNK))
    for i in range(0, count, _CHUNK):
        part = high[i : i + _CHUNK]
        _fill_zeros(order, start + i, part, low[: part.size])
    return high


def dini_roots(order: float, robin: float, count: int, start: int = 1) -> FloatArray:
    r"""Roots of x J'(x) + robin J(x) = 0, J of real order, by ascending eigenvalue.

    They are |lambda_k| of the modes of `Dini(order, robin=robin)`. With robin + order > 0 they are the
    positive roots, j_{k-1} < lambda_k < j_k. With robin + order = 0 (an exact comparison of the floats) the
    first is 0. With robin + order < 0 the first is the mu > 0 of the negative eigenvalue -mu^2, mu I'(mu) +
    robin I(mu) = 0; it does not take part in the ascending order of the others. Within two units in the last
    place, also as robin + order tends to 0; beyond |robin| = 1e16 a root and its j_k may be the same double.

    Parameters
    ----------
    order
        Real, from 0 to 1e6.
    robin
        The Robin coefficient, real and finite, dimensionless.
    count
        How many, at least 1; `start + count - 1` at most 2**50.
    start
        Index of the first, counted from 1.

    Returns
    -------
    Array of shape `(count,)`, dimensionless.

    Raises
    ------
    TypeError, ValueError
        naming the argument and its value; complex `robin` is a TypeError.

    References
    ----------
    DLMF (https://dlmf.nist.gov), 10.18 (modulus and phase) and 10.10.1, 10.33.1 (continued fractions).

    Examples
    --------
    >>> from fbexpand.special.roots import dini_roots
    >>> dini_roots(0, 1.0, 3).tolist()
    [1.2557837117945936, 4.079477710797353, 7.155799174643981]
    >>> dini_roots(0, 0.0, 2).tolist()
    [0.0, 3.8317059702075125]
    >>> dini_roots(0, -1.0, 1).tolist()
    [1.6082794717268794]
    """
    robin = checks.finite("robin", robin)
    order, count, start = _arguments(order, count, start)
    high = np.empty(count)
    low = np.empty(min(count, _CHUNK))
    for i in range(0, count, _CHUNK):
        part = high[i : i + _CHUNK]
        _fill_dini(order, robin, start + i, part, low[: part.size])
    return high
