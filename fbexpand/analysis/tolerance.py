"""Terms enough for a tolerance: the series grows until f - S, measured on the panels, is small enough."""

from __future__ import annotations

import math
import warnings
from typing import TYPE_CHECKING

import numpy as np

from fbexpand.analysis.quadrature import coefficients_of
from fbexpand.estimates.origin import Origin
from fbexpand.estimates.requirement import measure_l2, predicted_terms
from fbexpand.exceptions import TruncationWarning
from fbexpand.expansion import Expansion
from fbexpand.profiles.panels import Panels
from fbexpand.types import FloatArray, Numeric

if TYPE_CHECKING:
    from fbexpand.bases import Basis

FIRST_TERMS = 32
CERTAIN = 4.0  # times the tolerance: an error this much above it by Parseval's difference is above it
BEST = 1.0 + 1e-6  # times the least error reached
STOPPED = 0.9  # of the error with half the terms: it has stopped falling
FLOOR = 1e-9  # of the norm: where that can only be rounding, in the sum or in the profile
PARSEVAL = 1e-13  # of the norm squared: differences above it have digits


def series_to_tolerance(
    panels: Panels, basis: Basis, tol: float, atol: float, most: int, table: FloatArray | None
) -> Expansion:
    """Return the shortest series with an L2 truncation error of at most max(tol |f|, atol) for all profiles."""
    norm = panels.norm().reshape(-1)
    limit = np.maximum(tol * norm, atol)
    terms = min(FIRST_TERMS, most)
    coefficients = coefficients_of(panels, basis, terms)
    while True:
        if terms == most or not _far(coefficients, basis, norm, limit):
            errors = measure_l2(basis, _origin(panels, coefficients))  # (terms, size), falling
            if (errors[-1] <= limit).all() or terms == most or _settled(errors, norm, limit):
                break
        more = min(terms, most - terms)
        added = coefficients_of(panels, basis, more, terms + 1)
        coefficients = np.concatenate((coefficients, added), axis=-1)
        terms += more
    # a profile that misses its tolerance gets the fewest terms that do as well as all
    reached = errors <= np.maximum(limit, BEST * errors[-1])
    count = int(reached.argmax(axis=0).max()) + 1
    series = Expansion._make(
        basis, coefficients[..., :count], panels=panels, evaluations=panels.evaluations, table=table
    )
    if np.any(errors[-1] > limit):
        _warn(basis, panels, coefficients, errors[-1], limit, norm)
    return series


def _origin(panels: Panels, coefficients: Numeric) -> Origin:
    zero = np.zeros(panels.batch_shape)
    return Origin(coefficients, panels, zero, zero)


def _far(coefficients: Numeric, basis: Basis, norm: FloatArray, limit: FloatArray) -> bool:
    """Whether some profile's error is so far above its tolerance that Parseval's difference shows it."""
    rows = np.abs(coefficients.reshape(norm.size, -1)) * np.sqrt(basis.norms(coefficients.shape[-1]))
    unit = np.where(norm > 0.0, norm, 1.0)
    missing = 1.0 - np.sum((rows / unit[:, None]) ** 2, axis=1)
    return bool(np.any((missing > PARSEVAL) & (missing > (CERTAIN * limit / unit) ** 2) & (norm > 0.0)))


def _settled(errors: FloatArray, norm: FloatArray, limit: FloatArray) -> bool:
    """Whether every error above its tolerance has stopped falling, at the level of rounding."""
    last, before = errors[-1], errors[errors.shape[0] // 2 - 1]
    flat = (last > STOPPED * before) & (last <= FLOOR * norm)
    return bool(np.all(flat | (last <= limit)))


def _warn(
    basis: Basis, panels: Panels, coefficients: Numeric, errors: FloatArray, limit: FloatArray, norm: FloatArray
) -> None:
    """Warn about the profile that is furthest from its tolerance."""
    with np.errstate(divide="ignore", over="ignore"):
        row = int(np.argmax(np.where(errors > limit, errors / limit, 0.0)))
    error, wanted = float(errors[row]), float(limit[row])
    which = f" of profile {row} of the batch" if errors.size > 1 else ""
    reached = f"the L2 error{which} is {error:.3g} after {coefficients.shape[-1]} terms"
    if norm[row] > 0.0:
        reached += f" ({error / norm[row]:.3g} of its norm)"
    predicted = predicted_terms(basis, _origin(panels, coefficients), row, error, wanted)
    advice = (
        f"by the law of its tail {predicted:.3g} terms would reach it"
        if math.isfinite(predicted)
        else "more terms will not lower it: it is at rounding"
    )
    message = f"the tolerance {wanted:.3g} was not reached: {reached}; {advice}"
    warnings.warn(message, TruncationWarning, stacklevel=4)
