"""The error of a series by its parts: what every origin of it contributes."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, Any

import numpy as np

from fbexpand.estimates import extrapolation
from fbexpand.estimates.records import ErrorEstimate
from fbexpand.estimates.residual import measure, reach_of
from fbexpand.estimates.singular import unbounded
from fbexpand.types import FloatArray

if TYPE_CHECKING:
    from fbexpand.bases import Basis
    from fbexpand.estimates.origin import Origin


def source_of(origins: Sequence[Origin]) -> str:
    """Return "residual" where every origin knows its profile, else "law"."""
    return "residual" if all(origin.panels is not None for origin in origins) else "law"


def estimate(basis: Basis, origins: Sequence[Origin], cuts: Sequence[int]) -> ErrorEstimate:
    """Estimate the errors of the partial sums of `cuts` terms; arrays of shape (cuts, *batch)."""
    shape = origins[0].batch_shape
    order = sorted(set(cuts))
    places = [order.index(cut) for cut in cuts]
    totals = {
        name: np.zeros((len(cuts), *shape))
        for name in ("truncation", "quadrature", "table", "rounding", "sup")
    }
    for origin in origins:
        parts = _parts(basis, origin, order)
        for name, value in parts.items():
            totals[name] += value.reshape(-1, *shape)[
                places if value.shape[0] == len(order) else [0] * len(cuts)
            ]
    l2 = totals["truncation"] + totals["quadrature"] + totals["table"] + totals["rounding"]
    return ErrorEstimate(l2=l2, source=source_of(origins), **totals)


def _parts(basis: Basis, origin: Origin, cuts: Sequence[int]) -> dict[str, Any]:
    """Return the parts of one origin, each of shape (cuts or 1, size)."""
    terms = origin.coefficients.shape[-1]
    own = sorted({min(cut, terms) for cut in cuts})
    back = [own.index(min(cut, terms)) for cut in cuts]
    quadrature: FloatArray = np.array(origin.quadrature).reshape(1, -1)
    table: FloatArray = np.array(origin.table).reshape(1, -1)
    panels = origin.panels
    found = extrapolation.extrapolate(basis, origin, own) if panels is None else measure(basis, origin, own)
    sup = found.sup[back]
    if panels is not None:
        edges = panels.edges
        rings = 0.5 * (edges[1:] - edges[:-1]) * (edges[1:] + edges[:-1])
        residual = np.asarray(panels.residual).reshape(-1, edges.size - 1)
        largest = residual.max(axis=1, keepdims=True)
        unit = np.where((largest > 0.0) & np.isfinite(largest), largest, 1.0)  # squares neither over- nor underflow
        quadrature = np.maximum(quadrature, unit.T * np.sqrt((residual / unit) ** 2 @ rings)[None])
        sup = np.where(unbounded(panels), np.inf, sup + residual.max(axis=1))
    return {
        "truncation": found.l2[back],
        "quadrature": quadrature,
        "table": table,
        "rounding": found.l2_rounding[None],
        "sup": np.where(np.isinf(quadrature), np.inf, sup + found.sup_rounding + table / reach_of(basis)),
    }
