"""Sums, multiples and selections of series."""

from __future__ import annotations

from collections.abc import Callable
from typing import TYPE_CHECKING, Any

import numpy as np

from fbexpand import checks
from fbexpand.estimates.origin import MOST_ORIGINS, Origin
from fbexpand.exceptions import ArgumentValueError
from fbexpand.expansion.arguments import same_basis
from fbexpand.expansion.whole import closed_sum
from fbexpand.types import Numeric

if TYPE_CHECKING:
    from fbexpand.expansion.record import Expansion
    from fbexpand.lifting.closed_part import ClosedPart


def require_same_basis(first: Expansion, second: Expansion, name: str = "other") -> None:
    """ValueError unless both series stand on the same basis."""
    if not same_basis(first.basis, second.basis):
        raise ArgumentValueError(
            f"{name!r} must be on the same basis {first.basis!r} (got {second.basis!r})", name, second
        )


def joint_shape(first: tuple[int, ...], second: tuple[int, ...], name: str, value: Any) -> tuple[int, ...]:
    """Return the batch shape that two batch shapes broadcast to; ValueError names the argument."""
    try:
        return np.broadcast_shapes(first, second)
    except ValueError:
        raise ArgumentValueError(
            f"{name!r} must broadcast against the batch shape {first} (got shape {second})", name, value
        ) from None


def padded(coefficients: Numeric, terms: int, shape: tuple[int, ...]) -> Numeric:
    """Return coefficients with zeros up to `terms`, repeated over the batch shape."""
    missing = terms - coefficients.shape[-1]
    if missing:
        coefficients = np.concatenate((coefficients, np.zeros((*coefficients.shape[:-1], missing))), axis=-1)
    return np.broadcast_to(coefficients, (*shape, terms))


def add(first: Expansion, second: Expansion) -> Expansion:
    """Return the sum; the errors of both add."""
    require_same_basis(first, second)
    shape = joint_shape(first.batch_shape, second.batch_shape, "other", second)
    terms = max(first.terms, second.terms)
    coefficients = padded(first.coefficients, terms, shape) + padded(second.coefficients, terms, shape)
    origins = tuple(origin.broadcast(shape) for origin in (*first._origins, *second._origins))
    if len(origins) > MOST_ORIGINS:
        origins = (_merged(coefficients, origins),)
    part = closed_sum(first, second)
    part = part if part is None else part.broadcast(shape)
    return first._derive(first.basis, coefficients, origins, first.evaluations + second.evaluations, part)


def _merged(coefficients: Numeric, origins: tuple[Origin, ...]) -> Origin:
    quadrature = np.sum([origin.quadrature for origin in origins], axis=0)
    table = np.sum([origin.table for origin in origins], axis=0)
    return Origin(coefficients, None, quadrature, table)


def scale(series: Expansion, factor: Any, name: str = "factor", *, divide: bool = False) -> Expansion:
    """Return the series times (or divided by) a scalar or an array that broadcasts with the batch."""
    numbers = checks.all_finite(name, checks.numeric_array(name, factor))
    joint_shape(series.batch_shape, numbers.shape, name, factor)
    if divide and np.any(numbers == 0.0):
        raise checks.value_error(name, "non-zero", factor)
    with np.errstate(over="ignore"):
        coefficients = (
            series.coefficients / numbers[..., None] if divide else series.coefficients * numbers[..., None]
        )
        checks.all_finite("coefficients", coefficients)
        origins = tuple(origin.scaled(1.0 / numbers if divide else numbers) for origin in series._origins)
        factors = numbers[..., None]
        part = changed(series, lambda c: c / factors if divide else c * factors)
    return series._derive(series.basis, coefficients, origins, series.evaluations, part)


def select(series: Expansion, key: Any) -> Expansion:
    """Return the entries of the batch that `key` selects from the batch axes."""
    shape = series.batch_shape
    if not shape:
        raise IndexError("this series has no batch axes to index")
    index = np.arange(int(np.prod(shape))).reshape(shape)[key]
    terms = series.terms
    coefficients = series.coefficients.reshape(-1, terms)[index]
    origins = tuple(origin.take(index) for origin in series._origins)
    chosen = changed(series, lambda c: c.reshape(-1, c.shape[-1])[index])
    return series._derive(series.basis, coefficients, origins, series.evaluations, chosen)


def part(series: Expansion, name: str) -> Expansion:
    """Return the series of the "real" or "imag" part or the "conjugate"; the modes are real."""
    if name == "conjugate":
        coefficients: Numeric = np.conjugate(series.coefficients)
    else:
        coefficients = np.array(getattr(series.coefficients, name))
    origins = tuple(origin.part(name) for origin in series._origins)
    closed = changed(series, lambda c: np.conjugate(c) if name == "conjugate" else getattr(c, name))
    return series._derive(series.basis, coefficients, origins, series.evaluations, closed)


def shorten(series: Expansion, terms: int) -> Expansion:
    """Return the series of the first `terms` terms."""
    origins = tuple(origin.truncated(terms) for origin in series._origins)
    return series._derive(
        series.basis, series.coefficients[..., :terms], origins, series.evaluations, series.closed_part
    )


def changed(series: Expansion, change: Callable[[Numeric], Numeric]) -> ClosedPart | None:
    """Return the closed part with its coefficients changed."""
    return None if series.closed_part is None else series.closed_part.changed(change)
