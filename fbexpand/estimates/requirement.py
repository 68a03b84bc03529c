"""How many terms a tolerance takes."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from fbexpand.estimates.cells import cells_of, panel_cells, panel_of, panel_values
from fbexpand.estimates.defects import DefectTail, defect_tail, terms_until
from fbexpand.estimates.extrapolation import extrapolate
from fbexpand.estimates.law import JUMP_POWER, decay_of
from fbexpand.estimates.residual import SAMPLED_MARGIN, SUP_MARGIN, measure, tails
from fbexpand.estimates.rim import largest_value, sup_floor
from fbexpand.estimates.walk import largest_errors
from fbexpand.exceptions import UnreachableError
from fbexpand.transform.direct import series_at
from fbexpand.types import FloatArray, IntArray, Numeric

if TYPE_CHECKING:
    from fbexpand.bases import Basis
    from fbexpand.estimates.origin import Origin

MOST_TERMS = 1e15
EXPLAINED = 1.25  # times more or less than the profile's defects leave: they are the reason


@dataclass(frozen=True, eq=False)
class Curve:
    """Errors after 1, 2, ... terms (terms, size), how they fall from there, and their floor."""

    errors: FloatArray
    power: FloatArray
    rate: FloatArray
    floor: FloatArray


def required_terms(
    basis: Basis, origins: Sequence[Origin], tol: float | FloatArray, norm: str, at: float | None, relative: bool
) -> IntArray:
    """Return the least n whose truncation error stays below tol from n on, shape (size,)."""
    size = int(np.prod(origins[0].batch_shape))
    terms = max(origin.coefficients.shape[-1] for origin in origins)
    errors = np.zeros((terms, size))
    floor = np.zeros(size)
    power = np.full(size, np.inf)
    rate = np.full(size, np.inf)
    for origin in origins:
        curve = _curve(basis, origin, norm, at)
        errors += np.concatenate(
            (curve.errors, np.repeat(curve.errors[-1:], terms - len(curve.errors), axis=0))
        )
        floor += curve.floor
        power = np.minimum(power, curve.power)
        rate = np.minimum(rate, curve.rate)
    limit = np.broadcast_to(np.asarray(tol, dtype=np.float64), (size,)).copy()
    if relative:
        limit *= _scale(basis, origins, norm)
    worst_from = np.maximum.accumulate(errors[::-1], axis=0)[::-1]
    reached = worst_from <= limit
    answer = np.where(reached.any(axis=0), reached.argmax(axis=0) + 1, 0)
    tail = defect_tail(basis, origins[0].panels, terms) if norm == "l2" and len(origins) == 1 else None
    for row in map(int, np.flatnonzero((floor > limit) | (answer == 0))):
        error, wanted = float(errors[-1, row]), float(limit[row])
        predicted = _predicted(terms, error, wanted, float(power[row]), float(rate[row]))
        if tail is not None:
            predicted = _with_defects(tail, row, terms, error, wanted, predicted)
        which = f" (profile {row} of the batch)" if size > 1 else ""
        if floor[row] > limit[row]:
            raise UnreachableError(
                f"no number of terms brings the {norm!r} error to {wanted:.3g}{which}: "
                f"it stays above {floor[row]:.3g}"
            )
        if not predicted <= MOST_TERMS:
            raise UnreachableError(
                f"no number of terms up to {MOST_TERMS:g} brings the {norm!r} error to {wanted:.3g}{which}: "
                f"after {terms} it is near {error:.3g}"
            )
        answer[row] = max(terms + 1, int(np.ceil(predicted)))
    return answer.astype(np.int64)


def _predicted(terms: int, error: float, limit: float, power: float, rate: float) -> float:
    """Continue the error at `terms` by its law down to the limit; inf where it does not get there."""
    if not (limit > 0.0 and power > 0.0) or math.isinf(error):
        return math.inf
    drop = math.log(error / limit)
    growth = drop / power
    more = terms * math.exp(growth) if growth < 50.0 else math.inf
    return min(more, terms + drop / rate) if rate > 0.0 else more


def predicted_terms(basis: Basis, origin: Origin, row: int, error: float, limit: float) -> float:
    """Continue one profile's L2 error from the terms at hand down to `limit`; inf where it does not get there."""
    coefficients = origin.coefficients.reshape(-1, origin.coefficients.shape[-1])
    terms = coefficients.shape[1]
    decay = decay_of(basis, coefficients[row : row + 1])
    power, rate = (0.0, 0.0) if decay.saturated[0] else (float(decay.power[0]) - 0.5, float(decay.rate[0]))
    predicted = _predicted(terms, error, limit, power, rate)
    tail = defect_tail(basis, origin.panels, terms)
    if tail is not None and limit > 0.0:
        predicted = _with_defects(tail, row, terms, error, limit, predicted)
    return predicted


def _with_defects(
    tail: DefectTail, row: int, terms: int, error: float, limit: float, predicted: float
) -> float:
    """Correct a prediction by what the profile's defects are known to leave.

    Where they explain the error at hand their law is the better one (the error at hand itself goes up and
    down about it); else it is a lower bound.
    """
    known = float(tail(terms)[row])
    if known > 0.0 and 1.0 / EXPLAINED <= error / known <= EXPLAINED:
        return terms_until(tail, row, limit, terms, MOST_TERMS)
    return max(predicted, terms_until(tail, row, limit, terms, MOST_TERMS))


def _scale(basis: Basis, origins: Sequence[Origin], norm: str) -> FloatArray:
    """Return the norm of the profile: L2, or the largest modulus on the points of the cells."""
    panels = origins[0].panels if len(origins) == 1 else None
    if norm == "l2" and panels is not None:
        return np.asarray(panels.norm()).reshape(-1)  # what `expand` takes its tolerance of
    terms = max(origin.coefficients.shape[-1] for origin in origins)
    size = int(np.prod(origins[0].batch_shape))
    total = np.zeros((size, terms), dtype=np.result_type(*(origin.coefficients for origin in origins)))
    for origin in origins:
        total[:, : origin.coefficients.shape[-1]] += origin.coefficients.reshape(size, -1)
    if norm == "l2":
        missing = sum(measure_l2(basis, origin)[-1] for origin in origins)
        known = tails(basis, total, [0])[0]
        return np.asarray(np.hypot(known, np.where(np.isfinite(missing), missing, 0.0)))
    r = cells_of(basis, np.array([0.0, float(basis.radius)]), terms).radii().ravel()
    largest = np.abs(series_at(basis, total, r)).max(axis=1)
    if panels is not None:
        largest = largest_value(panels)
    return np.asarray(largest)


def measure_l2(basis: Basis, origin: Origin) -> FloatArray:
    """Return the L2 truncation errors after 1, 2, ... terms, shape (terms, size)."""
    cuts = range(1, origin.coefficients.shape[-1] + 1)
    if origin.panels is None:
        return extrapolate(basis, origin, cuts, want_sup=False).l2
    return measure(basis, origin, cuts, want_sup=False).l2


def _curve(basis: Basis, origin: Origin, norm: str, at: float | None) -> Curve:
    coefficients = origin.coefficients.reshape(-1, origin.coefficients.shape[-1])
    size = coefficients.shape[0]
    decay = decay_of(basis, coefficients)
    floor = np.zeros(size)
    if norm == "l2":
        errors, power = measure_l2(basis, origin), decay.power - 0.5
    else:
        errors = _pointwise_errors(basis, origin, at)
        power = decay.power - (1.0 if norm == "sup" else 0.5)
        if norm == "sup":
            if origin.panels is not None:
                floor = sup_floor(basis, origin.panels)
            power = np.where(decay.known & (decay.power < JUMP_POWER), 0.0, power)
    power = np.where(decay.saturated, 0.0, power)
    rate = np.where(decay.saturated, 0.0, decay.rate)
    zero = decay.level == 0.0
    return Curve(errors, np.where(zero, np.inf, power), np.where(zero, np.inf, rate), floor)


def _pointwise_errors(basis: Basis, origin: Origin, at: float | None) -> FloatArray:
    """Return the largest |f - S_n| on the cells, or at one radius, for n = 1, 2, ...: (terms, size)."""
    coefficients = origin.coefficients.reshape(-1, origin.coefficients.shape[-1])
    size, terms = coefficients.shape
    panels = origin.panels
    edges = np.array([0.0, float(basis.radius)]) if panels is None else panels.edges
    cells = cells_of(basis, edges, terms) if panels is None else panel_cells(basis, panels, terms)
    if at is None:
        r, panel = cells.radii(), cells.panel
        margin = SAMPLED_MARGIN if cells.sampled else SUP_MARGIN
    else:
        both = [panel_of(edges, np.array([at]))[0]]
        if at == edges[both[0]] and both[0] > 0:
            both.append(both[0] - 1)
        r, panel, margin = np.full((len(both), 1), at), np.array(both), 1.0
    flat = r.ravel()
    if panels is None:
        left: Numeric = np.zeros((size, flat.size), dtype=coefficients.dtype)
        beyond = extrapolate(basis, origin, [terms]).sup[0]
    else:
        polynomials = panels.coefficients.reshape(size, *panels.coefficients.shape[-2:])
        left = panel_values(panels, polynomials, panel, r).reshape(size, -1) - series_at(
            basis, coefficients, flat
        )
        beyond = np.asarray(panels.residual).reshape(size, -1).max(axis=1)
    return np.asarray(margin * largest_errors(basis, coefficients, flat, left) + beyond)
