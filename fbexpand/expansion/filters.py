"""Filters that damp the oscillation a jump or a broken rim condition leaves in the sum, by their published names.

Coefficients are multiplied by s(lambda_k / lambda_{n+1}), s(0) = 1, s(1) = 0. Away from the jump the error then falls
faster, beside it slower: over a width of about one wave more.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import replace
from typing import TYPE_CHECKING, Any

import numpy as np

from fbexpand import checks
from fbexpand.exceptions import ArgumentValueError
from fbexpand.types import FloatArray

if TYPE_CHECKING:
    from fbexpand.expansion.record import Expansion

ORDER = 8  # of the exponential filter
STRENGTH = 36.0  # -log(eps): it ends at rounding


def _vandeven(x: FloatArray) -> FloatArray:
    """Return 1 - (2p - 1)!/(p - 1)!^2 times the integral of (t (1 - t))^(p-1) from 0 to x, p = 4."""
    t = x**4
    return np.asarray(1.0 - t * (35.0 - 84.0 * x + 70.0 * x**2 - 20.0 * x**3))


FILTERS: dict[str, Callable[[FloatArray], FloatArray]] = {
    "fejer": lambda x: 1.0 - x,
    "lanczos": np.sinc,
    "raised cosine": lambda x: 0.5 * (1.0 + np.cos(math.pi * x)),
    "exponential": lambda x: np.exp(-STRENGTH * x**ORDER),
    "vandeven": _vandeven,
}


def filtered(series: Expansion, name: Any) -> Expansion:
    """Return the series with damped coefficients; its error is measured against the profile anew."""
    chosen = checks.choice("name", name, tuple(FILTERS))
    if any(origin.panels is None for origin in series._origins):
        raise ArgumentValueError(
            "'series' must know its profile to be filtered, as one from `expand` does: from coefficients alone the "
            f"error of the filtered sum cannot be told (got {series!r})",
            "series",
            series,
        )
    roots = series.basis.roots(series.terms + 1)
    share = roots[:-1] / roots[-1]
    if series.basis.growing:
        share[0] = 0.0
    factors = FILTERS[chosen](np.clip(share, 0.0, 1.0))
    origins = tuple(
        replace(
            origin,
            coefficients=origin.coefficients * factors[: origin.coefficients.shape[-1]],
            left=None,
            projected=False,
        )
        for origin in series._origins
    )
    return series._derive(
        series.basis, series.coefficients * factors, origins, series.evaluations, series.closed_part
    )
