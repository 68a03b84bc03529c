"""What a series says about itself in one line."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from fbexpand.estimates.law import STEEPEST, decay_of

if TYPE_CHECKING:
    from fbexpand.expansion.record import Expansion

MOST_READ = 4096  # coefficients looked at for the decay of a large batch
MOST_MEASURED = 8192  # coefficients of which the error is measured for the sake of the text: some milliseconds


def describe(series: Expansion) -> str:
    """Return the basis, the terms, the error where it is cheap to know, and the decay of the coefficients."""
    words = [repr(series.basis), f"{series.terms} term{'s' if series.terms > 1 else ''}"]
    if series.batch_shape:
        words.append(f"batch {series.batch_shape}")
    if series.closed_part is not None:
        words.append(f"closed part of {len(series.closed_part.powers)} powers")
    if np.iscomplexobj(series.coefficients):
        words.append("complex")
    rows = series.coefficients.reshape(-1, series.terms)
    rows = rows[: max(1, MOST_READ // series.terms)]
    decay = decay_of(series.basis, rows)
    known = series._known.get("estimate")
    measurable = all(origin.panels is not None for origin in series._origins)
    if known is None and measurable and series.coefficients.size <= MOST_MEASURED:
        known = series.error_estimate()
    if known is not None:
        most = "up to " if series.batch_shape else ""
        words.append(f"L2 error {most}{np.max(known.l2):.1e} ({known.source})")
    elif decay.known:
        words.append(f"L2 tail about {np.max(decay.tail(series.terms)):.1e} by the law")
    words.append(_decay_words(rows, decay.known, decay.saturated, decay.power))
    return f"Expansion({', '.join(word for word in words if word)})"


def _decay_words(rows: np.ndarray, known: bool, saturated: np.ndarray, power: np.ndarray) -> str:
    if not np.any(rows):
        return "zero"
    if not known:
        return ""
    if saturated.all():
        return "decayed to rounding"
    slowest = float(power[~saturated].min())
    if slowest >= min(12.0, STEEPEST):
        return "decay faster than k^-12"
    return f"decay about k^-{slowest:.1f}"
