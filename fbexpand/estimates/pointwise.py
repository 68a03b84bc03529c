"""An envelope of |f - S| at given radii: the largest error within half a wave to either side.

The error of a partial sum changes sign about once in half a wave of the first mode left out, so that its
modulus at one radius says nothing of the error beside it; the envelope does not vanish there.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import TYPE_CHECKING

import numpy as np

from fbexpand.estimates.cells import cells_of, fine_widths, half_wave, panel_of, panel_values
from fbexpand.estimates.extrapolation import block_ends, blocks_of, sup_beyond
from fbexpand.estimates.law import decay_of
from fbexpand.estimates.residual import ROUNDING, SUP_MARGIN
from fbexpand.transform.direct import as_rows, from_rows, series_at, sums
from fbexpand.types import FloatArray, Numeric

if TYPE_CHECKING:
    from fbexpand.bases import Basis
    from fbexpand.estimates.origin import Origin

SPREAD = 16  # points in half a wave
FINEST = 8  # times finer still where the profile varies faster than the modes
COARSE = 256  # cells on which the law's blocks are compared

Moduli = Callable[[FloatArray], FloatArray]  # radii (m,) -> moduli (..., m)


def envelope(basis: Basis, origin: Origin, terms: int, r: FloatArray) -> FloatArray:
    """Return the envelope of the error of the first `terms` terms at one-dimensional r, shape (size, m)."""
    coefficients = origin.coefficients.reshape(-1, origin.coefficients.shape[-1])
    used = min(terms, coefficients.shape[1])
    r = np.minimum(r, basis.radius)
    rounding = ROUNDING * sums(basis, np.abs(coefficients[:, :used]), r, absolute=True)
    if origin.panels is None:
        return rounding + _by_law(basis, coefficients, used, r, origin.left)
    return rounding + _measured(basis, origin, coefficients[:, :used], r)


def windowed(
    basis: Basis, terms: int, r: FloatArray, marks: FloatArray, moduli: Moduli, finest: float = np.inf
) -> FloatArray:
    """Return the largest of moduli(...) within half a wave of each r, looking at `marks` (breaks) as well.

    `finest` is the length of half a wave of the moduli where that is shorter; it is followed up to a point.
    """
    radius = float(basis.radius)
    width = half_wave(basis, terms)
    spread = int(SPREAD * np.clip(np.ceil(width / finest), 1.0, FINEST))
    distinct, back = np.unique(r, return_inverse=True)
    own = moduli(distinct)
    steps = max(1, int(np.ceil(radius / width * spread)))
    if distinct.size * 2 * spread > steps:
        grid = np.linspace(0.0, radius, steps + 1)
        values = moduli(grid)
        if marks.size:
            beside = moduli(marks)
            for i, place in enumerate(np.rint(marks / radius * steps).astype(np.int64)):
                values[..., place] = np.maximum(values[..., place], beside[..., i])
        from scipy.ndimage import maximum_filter1d  # a fifth of a second to import: only when asked for

        values = maximum_filter1d(values, 2 * spread + 3, axis=-1, mode="nearest")
        near = values[..., np.rint(distinct / radius * steps).astype(np.int64)]
    else:
        window = np.clip(distinct[:, None] + width * np.linspace(-1.0, 1.0, 2 * spread + 1), 0.0, radius)
        near = moduli(window.ravel())
        near = near.reshape((*near.shape[:-1], *window.shape)).max(axis=-1)
        if marks.size:
            values = moduli(marks)
            close = np.abs(distinct[:, None] - marks) <= width
            near = np.maximum(near, np.where(close, values[..., None, :], 0.0).max(axis=-1))
    return np.asarray(np.maximum(own, near)[..., back])


def _measured(basis: Basis, origin: Origin, used: Numeric, r: FloatArray) -> FloatArray:
    panels = origin.panels
    if panels is None:
        raise ValueError("'origin' must know its profile (got none)")
    polynomials = panels.coefficients.reshape(used.shape[0], *panels.coefficients.shape[-2:])
    residual = np.asarray(panels.residual).reshape(used.shape[0], -1)

    def moduli(points: FloatArray) -> FloatArray:
        panel = panel_of(panels.edges, points)
        values = series_at(basis, used, points)
        error = np.abs(panel_values(panels, polynomials, panel, points[:, None])[..., 0] - values)
        left = np.flatnonzero((points == panels.edges[panel]) & (panel > 0))  # on a break both sides count
        if left.size:
            other = panel_values(panels, polynomials, panel[left] - 1, points[left, None])[..., 0]
            error[:, left] = np.maximum(error[:, left], np.abs(other - values[:, left]))
        return np.asarray(error + residual[:, panel])

    finest = float(fine_widths(panels).min())
    return SUP_MARGIN * windowed(basis, used.shape[1], r, panels.edges[1:-1], moduli, finest)


def _by_law(
    basis: Basis, coefficients: Numeric, used: int, r: FloatArray, left: FloatArray | None
) -> FloatArray:
    """Return the envelope by the decay of the coefficients, shape (size, m).

    The terms beyond those at hand are spread over the radius as the last half (or quarter) of the terms is.
    """
    terms = coefficients.shape[1]
    decay = decay_of(basis, coefficients)
    ends = sorted({used, *block_ends(terms)})
    rows = as_rows(coefficients)

    def partial(points: FloatArray) -> Numeric:
        return from_rows(sums(basis, rows, points, cuts=ends), coefficients)

    coarse = cells_of(basis, np.array([0.0, float(basis.radius)]), terms, COARSE).radii().ravel()
    blocks = blocks_of(partial(coarse), ends, terms)
    beyond = sup_beyond(basis, decay, blocks)
    if left is None:
        beyond = np.where(np.isinf(decay.tail(terms)), np.inf, beyond)
    whole = np.where(decay.flattened, blocks.last_quarter.max(axis=-1), blocks.last_half.max(axis=-1))
    with np.errstate(divide="ignore", invalid="ignore"):
        share = np.nan_to_num(beyond / whole, nan=0.0, posinf=0.0)

    def moduli(points: FloatArray) -> FloatArray:
        values = partial(points)
        found = blocks_of(values, ends, terms)
        local = np.where(decay.flattened[:, None], found.last_quarter, found.last_half)
        return np.stack((local, np.abs(values[-1] - values[ends.index(used)])))

    local, missing = windowed(basis, terms, r, np.empty(0), moduli)
    return np.asarray(
        np.where(share[:, None] > 0.0, share[:, None] * local, beyond[:, None]) + SUP_MARGIN * missing
    )
