"""Terms enough for a tolerance: the series grows until f - S, measured on the panels, is small enough."""

from __future__ import annotations

import math
import warnings
from typing import TYPE_CHECKING

import numpy as np

from fbexpand.analysis.quadrature import coefficients_of
from fbexpand.estimates.origin import Origin
from fbexpand.estimates.requirement import MOST_TERMS, measure_l2, predicted_terms
from fbexpand.estimates.residual import by_parseval, root_of_squares, tails
from fbexpand.exceptions import TruncationWarning
from fbexpand.expansion import Expansion
from fbexpand.profiles.panels import Panels
from fbexpand.types import FloatArray, Numeric

if TYPE_CHECKING:
    from fbexpand.bases import Basis
    from fbexpand.lifting.closed_part import ClosedPart

BoolArray = np.ndarray[tuple[int, ...], np.dtype[np.bool_]]

FIRST_TERMS = 32
BEST = 1.0 + 1e-6  # times the least error reached
STOPPED = 0.8  # of the error with half the terms: it has stopped falling, even as slowly as beside a jump
FLOOR = 1e-9  # of the norm: where that can only be rounding, in the sum or in the profile


def series_to_tolerance(
    panels: Panels,
    basis: Basis,
    limit: FloatArray,
    most: int,
    table: FloatArray | None,
    closed_part: ClosedPart | None,
) -> Expansion:
    """Return the shortest series with an L2 truncation error of at most `limit` (size,) for every profile."""
    norm = panels.norm().reshape(-1)
    terms = min(FIRST_TERMS, most)
    coefficients = coefficients_of(panels, basis, terms)
    errors = np.full((1, norm.size), np.inf)
    while True:
        last = by_parseval(basis, coefficients, norm)
        if terms == most or not np.any(last > limit):
            before = errors[-1]
            errors = _errors(panels, basis, coefficients, last)
            settled = (errors[-1] > STOPPED * before) & (errors[-1] <= FLOOR * norm)
            if terms == most or np.all(settled | (errors[-1] <= limit)):
                break
        more = min(terms, most - terms)
        added = coefficients_of(panels, basis, more, terms + 1)
        coefficients = np.concatenate((coefficients, added), axis=-1)
        terms += more
    # a profile that misses its tolerance gets the fewest terms that do as well as all
    reached = errors <= np.maximum(limit, BEST * errors[-1])
    count = int(reached.argmax(axis=0).max()) + 1
    series = Expansion._make(
        basis,
        coefficients[..., :count],
        panels=panels,
        evaluations=panels.evaluations,
        table=table,
        left=errors[count - 1].reshape(panels.batch_shape),
        closed_part=closed_part,
    )
    if np.any(errors[-1] > limit):
        _warn(basis, panels, coefficients, errors[-1], limit, norm, settled)
    return series


def _errors(panels: Panels, basis: Basis, coefficients: Numeric, last: FloatArray) -> FloatArray:
    """Return the L2 errors after 1, 2, ... terms, (terms, size); measured where `last` is 0."""
    rows = coefficients.reshape(last.size, -1)
    errors = root_of_squares(tails(basis, rows, range(1, rows.shape[1] + 1)), last)
    unknown = np.flatnonzero(last == 0.0)
    if unknown.size:
        errors[:, unknown] = measure_l2(basis, _origin(panels, coefficients).take(unknown))
    return errors


def _origin(panels: Panels, coefficients: Numeric) -> Origin:
    zero = np.zeros(panels.batch_shape)
    return Origin(coefficients, panels, zero, zero)


def _warn(
    basis: Basis,
    panels: Panels,
    coefficients: Numeric,
    errors: FloatArray,
    limit: FloatArray,
    norm: FloatArray,
    settled: BoolArray,
) -> None:
    """Warn about the profile that is furthest from its tolerance."""
    with np.errstate(divide="ignore", over="ignore", invalid="ignore"):
        row = int(np.argmax(np.where(errors > limit, errors / limit, 0.0)))
    error, wanted = float(errors[row]), float(limit[row])
    which = f" of profile {row} of the batch" if errors.size > 1 else ""
    reached = f"the L2 error{which} is {error:.3g} after {coefficients.shape[-1]} terms"
    if norm[row] > 0.0:
        reached += f" ({error / norm[row]:.3g} of its norm)"
    if settled[row]:
        advice = "more terms will not lower it: it is at rounding"
    else:
        predicted = predicted_terms(basis, _origin(panels, coefficients), row, error, wanted)
        needed = f"{predicted:.3g}" if math.isfinite(predicted) else f"more than {MOST_TERMS:.0g}"
        advice = f"by the law of its tail {needed} terms would reach it"
    message = f"the tolerance {wanted:.3g} was not reached: {reached}; {advice}"
    warnings.warn(message, TruncationWarning, stacklevel=4)
