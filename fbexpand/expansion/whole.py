"""What a series and its closed part make together: values, norms, inner products."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import numpy as np

from fbexpand.expansion import calculus
from fbexpand.transform.direct import series_at
from fbexpand.types import FloatArray, Numeric

if TYPE_CHECKING:
    from fbexpand.expansion.record import Expansion
    from fbexpand.lifting.closed_part import ClosedPart


def values_of(series: Expansion, r: FloatArray, terms: int | None = None) -> Numeric:
    """Return the sum of the first terms (all by default) and the closed part at one-dimensional r."""
    values = series_at(series.basis, series.coefficients[..., :terms], r)
    return values if series.closed_part is None else np.asarray(values + series.closed_part(r))


def derivatives_of(series: Expansion, r: FloatArray, n: int) -> Numeric:
    """Return the n-th derivative at one-dimensional r."""
    values = calculus.derivative_at(series.basis, series.coefficients, r, n)
    if series.closed_part is None:
        return values
    with np.errstate(invalid="ignore"):
        return np.asarray(values + series.closed_part.derivative(r, n))


def integral_of(series: Expansion, a: float, b: float) -> Any:
    """Return the integral with weight r dr from a to b."""
    value = calculus.integral_of(series.basis, series.coefficients, a, b)
    return value if series.closed_part is None else value + series.closed_part.integral(a, b)


def norm_of(series: Expansion) -> Any:
    """Return the L2 norm; by Parseval's identity, with the cross term where there is a closed part."""
    b = np.abs(series.orthonormal)
    largest = b.max(axis=-1, keepdims=True)
    unit = np.where(largest > 0.0, largest, 1.0)
    alone = unit[..., 0] * np.sqrt(np.sum((b / unit) ** 2, axis=-1))
    part = series.closed_part
    if part is None:
        return alone[()]
    # |p + S|^2 = |p - its first terms|^2 + |those and S|^2: no difference of large squares is left
    terms = series.terms
    projected = part.projected(series.basis, terms)
    norms = series.basis.norms(terms)
    together = np.sum(np.abs(projected + series.coefficients) ** 2 * norms, axis=-1)
    beyond = np.real(part.inner(part)) - np.sum(np.abs(projected) ** 2 * norms, axis=-1)
    return np.sqrt(together + np.maximum(beyond, 0.0))[()]


def inner_of(first: Expansion, second: Expansion) -> Any:
    """Return the integral of conj(f) g r dr, batches broadcast."""
    terms = min(first.terms, second.terms)
    total = np.sum(np.conjugate(first.orthonormal[..., :terms]) * second.orthonormal[..., :terms], axis=-1)
    p, q = first.closed_part, second.closed_part
    if p is not None:
        total = total + _cross(p, second)
    if q is not None:
        total = total + np.conjugate(_cross(q, first))
    if p is not None and q is not None:
        total = total + p.inner(q)
    return np.asarray(total)[()]


def _cross(part: ClosedPart, series: Expansion) -> Numeric:
    """Return the integral of conj(p) S r dr."""
    projected = part.projected(series.basis, series.terms)
    return np.asarray(np.sum(np.conjugate(projected) * series.coefficients * series.basis.norms(series.terms), axis=-1))


def closed_sum(first: Expansion, second: Expansion) -> ClosedPart | None:
    """Return the closed part of a sum."""
    if first.closed_part is None:
        return second.closed_part
    return first.closed_part.plus(second.closed_part)
