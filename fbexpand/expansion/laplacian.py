"""The Laplacian of a series, and whether it converges."""

from __future__ import annotations

import warnings
from typing import TYPE_CHECKING

import numpy as np

from fbexpand.estimates.law import decay_of
from fbexpand.estimates.origin import Origin
from fbexpand.estimates.rim import rim_defect
from fbexpand.exceptions import TruncationWarning

if TYPE_CHECKING:
    from fbexpand.expansion.record import Expansion

TOLERANCE = 1e-9  # of the profile's largest modulus: below it the rim condition holds as far as one can tell
SLOWEST = 2.5  # orthonormal coefficients that fall as k^-p have a Laplacian in L2 for p > 2.5


def laplacian_of(series: Expansion) -> Expansion:
    """Return the series of coefficients -eigenvalue_k c_k, with the error of its origins."""
    eigenvalues = series.basis.eigenvalues(series.terms)
    largest = float(np.abs(eigenvalues).max())
    origins = []
    lost = False
    for origin in series._origins:
        diverges = _diverges(series, origin)
        lost = lost or bool(diverges.any())
        origins.append(
            Origin(
                -origin.coefficients * eigenvalues[: origin.coefficients.shape[-1]],
                None,
                np.where(diverges, np.inf, origin.quadrature * largest),
                origin.table * largest,
            )
        )
    if lost:
        warnings.warn(
            "the Laplacian of this series does not converge: the profile breaks the condition at the rim "
            "or is not smooth; its error estimate is inf",
            TruncationWarning,
            stacklevel=3,
        )
    part = None if series.closed_part is None else series.closed_part.laplacian()
    coefficients = -series.coefficients * eigenvalues
    return series._derive(series.basis, coefficients, tuple(origins), series.evaluations, part)


def _diverges(series: Expansion, origin: Origin) -> np.ndarray[tuple[int, ...], np.dtype[np.bool_]]:
    """Whether lap of each profile's series is known not to converge in L2, shape (*batch,).

    Coefficients without a profile are taken at their word: the law of their decay judges the result.
    """
    rows = origin.coefficients.reshape(-1, origin.coefficients.shape[-1])
    if origin.panels is None:
        return np.zeros(origin.batch_shape, dtype=bool)
    decay = decay_of(series.basis, rows)
    found = decay.known & (decay.power < SLOWEST) & ~decay.saturated & (decay.level > 0.0)
    defect, scale = rim_defect(series.basis, origin.panels)
    if defect is not None:
        found = found | (np.abs(defect) > TOLERANCE * scale)
    return np.asarray(found.reshape(origin.batch_shape))
