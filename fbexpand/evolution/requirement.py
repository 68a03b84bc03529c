"""How many terms the field at a later time takes, for a tolerance."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from fbexpand.estimates.cells import cells_of
from fbexpand.estimates.walk import largest_errors
from fbexpand.evolution.motion import grown
from fbexpand.evolution.spectrum import modes_of
from fbexpand.evolution.state import rows_of
from fbexpand.evolution.tails import Tail, least
from fbexpand.exceptions import UnreachableError
from fbexpand.transform.direct import series_at
from fbexpand.types import FloatArray, IntArray, Numeric

if TYPE_CHECKING:
    from fbexpand.evolution.laws import Law
    from fbexpand.expansion import Expansion

MARGIN = 1.1  # on what is left out: it does not fall quite as the law
NEIGHBOURS = 4  # modes in a row that are looked at for how large one can be at a radius


def terms_at_time(
    series: Expansion, law: Law, time: float, tol: float, norm: str, at: float | None, relative: bool
) -> IntArray:
    """Return the least n whose truncation error at `time` stays below tol from n on, shape (size,).

    The coefficients at hand are evolved; those beyond are continued by the law of their decay from what is known to be
    left out, and damped. In the L2 norm a wave counts with its envelope; at a radius, or for the largest error, the
    moduli of predicted terms are added up.
    """
    basis, terms = series.basis, series.terms
    rows = rows_of(series, terms, series.batch_shape)
    zero = np.zeros(rows.shape[0])
    estimate = series.error_estimate()
    left = MARGIN * np.reshape(estimate.truncation, -1) if estimate.source == "residual" else None
    tail = Tail(basis, law, rows, None, errors=(zero, zero), left=left)
    times = np.array([time])
    root_norms = np.sqrt(basis.norms(terms))
    motion = law.motion(modes_of(basis, terms))
    known = np.abs(rows * root_norms) * motion.gain(times)[0]
    if norm == "l2":
        errors, beyond = tail.tails(time, known)
        size = np.where(np.isfinite(errors[:, 0]), errors[:, 0], np.sqrt(np.sum(known**2, axis=1)))
        limit = tol * size if relative else np.full(rows.shape[0], tol)
    else:
        parts = motion.parts(times)
        coefficients: Numeric = np.zeros(rows.shape, dtype=np.result_type(rows, parts.state))
        coefficients[:, : parts.state.shape[1]] = parts.state[0] * rows[:, : parts.state.shape[1]]
        if parts.growth is not None:
            coefficients[:, 0] = grown(coefficients[None, :, 0], parts.growth)[0]
        grid = cells_of(basis, np.array([0.0, float(basis.radius)]), terms).radii().ravel()
        largest = np.abs(series_at(basis, coefficients, grid)).max(axis=1)
        limit = tol * largest if relative else np.full(rows.shape[0], tol)
        absolute = tail.moduli(times)[0] * tail.sample.share * _heights(tail, at)
        beyond = np.cumsum(absolute[:, ::-1], axis=1)[:, ::-1]
        if tail.falls_too_slowly:
            beyond = np.full_like(beyond, np.inf)
        radii = grid if at is None else np.array([at])
        left_out = np.zeros((rows.shape[0], radii.size), dtype=coefficients.dtype)
        errors = np.empty((rows.shape[0], terms + 1))
        errors[:, 0] = largest + beyond[:, 0]
        errors[:, 1:] = largest_errors(basis, coefficients, radii, left_out).T + beyond[:, :1]
    answer = least(errors, beyond, tail.sample, limit)
    if not np.isfinite(answer).all():
        row = int(np.argmin(np.isfinite(answer)))
        which = f" (profile {row} of the batch)" if answer.size > 1 else ""
        raise UnreachableError(
            f"no number of terms up to {tail.sample.last:.0f} brings the {norm!r} error at time {time:g} to "
            f"{limit[row]:.3g}{which}: after {terms} it is near {errors[row, -1]:.3g}"
        )
    return answer.astype(np.int64)


def _heights(tail: Tail, at: float | None) -> FloatArray:
    """Return how large the normalised modes looked at can be, at one radius or anywhere, (modes,)."""
    basis = tail.basis
    if at is None:
        n = tail.terms + 1
        grid = basis.radius * np.linspace(0.0, 1.0, 64)
        height = float(np.abs(basis.modes(grid, 1, n)).max() / np.sqrt(basis.norms(1, n)[0]))
        roots = tail.sample.modes.high
        return np.asarray(height * np.sqrt(roots / roots[0]))
    radius = np.array([at])
    found = [
        np.abs(basis.modes(radius, NEIGHBOURS, int(k))[0] / np.sqrt(basis.norms(NEIGHBOURS, int(k)))).max()
        for k in tail.sample.modes.number
    ]
    return np.array(found)
