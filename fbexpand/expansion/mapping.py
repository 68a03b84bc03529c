"""A pointwise function of the field, back to a series: the function of the sum is resolved and projected anew.

Nothing is aliased: the function of the sum is divided into panels until it is resolved, whatever the number of terms.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import TYPE_CHECKING, Any

import numpy as np

from fbexpand import checks
from fbexpand.estimates.cells import cells_of
from fbexpand.exceptions import ArgumentValueError
from fbexpand.profiles.resolve import resolve
from fbexpand.types import FloatArray, Numeric

if TYPE_CHECKING:
    from fbexpand.expansion.record import Expansion


def mapped(series: Expansion, function: Any, terms: Any) -> Expansion:
    """Return the series of function(f); what the error of f becomes counts as an error of its coefficients."""
    from fbexpand.analysis.quadrature import coefficients_of  # not at the top: `expand` there makes series

    if not callable(function):
        raise checks.type_error("function", "a function of the field's values", function)
    count = checks.integer("terms", terms, 1)
    checks.storable("terms", count, 100 * count)
    basis = series.basis
    try:
        panels = resolve(lambda r: function(series(np.minimum(r, basis.radius))), (), float(basis.radius))
    except ArgumentValueError as error:
        if error.name != "profile":
            raise
        raise ArgumentValueError(str(error).replace("'profile'", "'function'"), "function", function) from error
    if panels.batch_shape != series.batch_shape:
        raise ArgumentValueError(
            f"'function' must return an array of the shape of its argument (got batch {panels.batch_shape} for "
            f"{series.batch_shape})",
            "function",
            function,
        )
    coefficients = coefficients_of(panels, basis, count)
    return series._make(
        basis, coefficients, panels=panels, evaluations=series.evaluations, quadrature=_carried(series, function)
    )


def _carried(series: Expansion, function: Callable[[Numeric], Any]) -> FloatArray:
    """Return the L2 norm of what the error of f, up or down, changes in function(f), shape (*batch,)."""
    cells = cells_of(series.basis, np.array([0.0, float(series.basis.radius)]), series.terms)
    r, weights = cells.radii(), cells.weights()
    partial = series.partial_sum(r)
    values, error = partial.values, partial.error
    with np.errstate(all="ignore"):
        middle = np.asarray(function(values))
        changes = [np.abs(np.asarray(function(values + s * error)) - middle) for s in (-1.0, 1.0)]
    largest = np.maximum(*changes)
    known = np.isfinite(error) & np.isfinite(largest)  # where the law knows no bound, none is known of the result
    total = np.sqrt(np.sum(np.where(known, largest, 0.0) ** 2 * weights, axis=(-2, -1)))
    return np.asarray(np.where(known.all(axis=(-2, -1)), total, np.inf))
