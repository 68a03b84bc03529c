"""Questions about the error of a series: the checks of their arguments, and the answers kept."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, Any

import numpy as np

from fbexpand import checks
from fbexpand.bases import Dini, FourierBessel
from fbexpand.estimates.cells import cells_of
from fbexpand.estimates.estimate import estimate, source_of
from fbexpand.estimates.pointwise import envelope
from fbexpand.estimates.records import ErrorEstimate, PartialSum
from fbexpand.estimates.requirement import required_terms
from fbexpand.expansion.arguments import as_radii
from fbexpand.expansion.whole import values_of
from fbexpand.lifting.expected import LiftResidual, lift_residual
from fbexpand.types import FloatArray

if TYPE_CHECKING:
    from fbexpand.expansion.record import Expansion

NORMS = ("l2", "sup", "at")


def partial_sum(series: Expansion, r: FloatArray, terms: int) -> PartialSum:
    """Return the partial sum at r with the envelope of its error."""
    flat = r.ravel()
    values = values_of(series, flat, terms)
    error = np.zeros((int(np.prod(series.batch_shape)), flat.size))
    if flat.size:
        for origin in series._origins:
            error += envelope(series.basis, origin, terms, flat)
    shape = (*series.batch_shape, *r.shape)
    return PartialSum(values.reshape(shape)[()], error.reshape(shape)[()], source_of(series._origins))


def error_estimate(series: Expansion, terms: Any) -> ErrorEstimate:
    """Return the estimate for one number of terms or for several."""
    if terms is None:
        known: ErrorEstimate | None = series._known.get("estimate")
        if known is None:
            known = series._known["estimate"] = _first(
                estimate(series.basis, series._origins, [series.terms])
            )
        return known
    listed = isinstance(terms, Sequence) and not isinstance(terms, (str, bytes))
    if listed or (isinstance(terms, np.ndarray) and terms.ndim > 0):
        cuts = [checks.integer("terms", cut, 1, series.terms) for cut in terms]
        if not cuts:
            raise checks.value_error("terms", "non-empty", terms)
        return estimate(series.basis, series._origins, cuts)
    return _first(estimate(series.basis, series._origins, [checks.integer("terms", terms, 1, series.terms)]))


def _first(many: ErrorEstimate) -> ErrorEstimate:
    names = ("l2", "sup", "truncation", "quadrature", "table", "rounding")
    return ErrorEstimate(**{name: getattr(many, name)[0] for name in names}, source=many.source)


def terms_for(
    series: Expansion, tol: Any, norm: Any, at: Any, relative: Any, law: Any = None, time: Any = None
) -> Any:
    """Return the least number of terms that stays below `tol`."""
    limit = checks.positive("tol", tol)
    kind = checks.choice("norm", norm, NORMS)
    if not isinstance(relative, (bool, np.bool_)):
        raise checks.type_error("relative", "True or False", relative)
    place = None
    if kind == "at":
        if at is None:
            raise checks.type_error("at", "a radius where norm is 'at'", at)
        place = min(
            float(as_radii("at", checks.finite("at", at), float(series.basis.radius))),
            float(series.basis.radius),
        )
    elif at is not None:
        raise checks.value_error("at", f"left out where norm is {kind!r}", at)
    if (law is None) != (time is None):
        raise checks.type_error("time" if time is None else "law", "given where the other one is", None)
    if law is not None:
        if not hasattr(law, "terms_for") or isinstance(law, type):
            raise checks.type_error("law", "a law such as Diffusion(1.0)", law)
        later = law.terms_for(series, time, limit, kind, place, bool(relative))
        return np.asarray(later).reshape(series.batch_shape)[()]
    size: FloatArray | float = 1.0
    if relative and series.closed_part is not None:  # relative to f, not to what is left of it
        size = _size(series, kind)
    absolute = bool(relative) and series.closed_part is None
    answer = required_terms(series.basis, series._origins, limit * size, kind, place, absolute)
    return answer.reshape(series.batch_shape)[()]


def lift_residual_of(series: Expansion) -> LiftResidual | None:
    """Return what the profile's panels say of rim, axis and interior."""
    panels = series._origins[0].panels
    if len(series._origins) != 1 or panels is None or not isinstance(series.basis, (FourierBessel, Dini)):
        return None
    return lift_residual(series.basis, panels)


def _size(series: Expansion, kind: str) -> FloatArray:
    """Return the L2 norm, or the largest modulus on a grid that resolves the sum, shape (size,)."""
    if kind == "l2":
        return np.asarray(series.norm()).reshape(-1)
    edges = np.array([0.0, float(series.basis.radius)])
    r = cells_of(series.basis, edges, series.terms).radii().ravel()
    return np.asarray(np.abs(values_of(series, r)).reshape(-1, r.size).max(axis=1))
