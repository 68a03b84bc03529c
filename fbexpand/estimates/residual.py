"""The error of partial sums, measured: f - S on the panels of the profile.

The L2 error is Parseval's |f|^2 - sum |b_k|^2 where that has digits to spare; below, where it cancels, it is the norm
of f - S itself. For fewer terms the squares of the orthonormal coefficients left out are added, which does not cancel.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from fbexpand.estimates.cells import Cells, panel_cells, panel_values
from fbexpand.estimates.walk import largest_errors
from fbexpand.transform.direct import as_rows, from_rows, sums
from fbexpand.types import FloatArray, Numeric

if TYPE_CHECKING:
    from fbexpand.bases import Basis
    from fbexpand.estimates.origin import Origin
    from fbexpand.profiles.panels import Panels

EPS = float(np.finfo(np.float64).eps)
ROUNDING = 4.0 * EPS  # of the sum of the moduli: the error of an evaluated sum
SUP_MARGIN = 1.03  # the points of a cell miss at most this much of a wave's crest
SAMPLED_MARGIN = 1.5  # where one cell stands for many
MARGIN_L2 = 1.0005  # the quadrature in cells is not exact where f - S is not smooth
SAMPLED_MARGIN_L2 = 1.1
MANY = 40  # numbers of terms asked for at once
BLOCK = 1 << 21  # numbers held at once
PARSEVAL = 1e-9  # of the norm squared: a difference of squares above it has digits to spare
MARGIN_PARSEVAL = 1.0 + 1e-4  # for those it lacks
THINNED = 256  # points at which the sum of the moduli is looked at


@dataclass(frozen=True, eq=False)
class Measured:
    """L2 and largest error for every cut and profile, (cuts, size), and what rounding adds (size,)."""

    l2: FloatArray
    sup: FloatArray
    sup_rounding: FloatArray
    l2_rounding: FloatArray


def tails(basis: Basis, coefficients: Numeric, cuts: Sequence[int]) -> FloatArray:
    """Return sqrt(sum_{k > cut} |b_k|^2) over the coefficients at hand (size, terms), shape (cuts, size)."""
    size, terms = coefficients.shape
    b = np.abs(coefficients) * np.sqrt(basis.norms(terms))
    unit = b.max(axis=1, keepdims=True)
    unit = np.where(unit > 0.0, unit, 1.0)
    left_out = np.zeros((size, terms + 1))
    left_out[:, :-1] = np.cumsum(((b / unit) ** 2)[:, ::-1], axis=1)[:, ::-1]
    return np.ascontiguousarray((unit * np.sqrt(left_out))[:, np.asarray(cuts, dtype=np.int64)].T)


def by_parseval(basis: Basis, coefficients: Numeric, norm: FloatArray) -> FloatArray:
    """Return the L2 error (size,) by |f|^2 - sum |b_k|^2 where that does not cancel, else 0."""
    rows = np.abs(coefficients.reshape(norm.size, -1)) * np.sqrt(basis.norms(coefficients.shape[-1]))
    unit = np.where(norm > 0.0, norm, 1.0)
    missing = 1.0 - np.sum((rows / unit[:, None]) ** 2, axis=1)
    known = (missing > PARSEVAL) & (norm > 0.0)
    return np.where(known, MARGIN_PARSEVAL * norm * np.sqrt(np.maximum(missing, 0.0)), 0.0)


def root_of_squares(first: FloatArray, second: FloatArray) -> FloatArray:
    """Return sqrt(first^2 + second^2) without overflow."""
    return np.asarray(np.hypot(first, second))


def measure(basis: Basis, origin: Origin, cuts: Sequence[int], *, want_sup: bool = True) -> Measured:
    """Measure the errors of the partial sums of `cuts` (ascending) terms against the panels of `origin`."""
    panels = origin.panels
    if panels is None:
        raise ValueError("'origin' must know its profile (got none)")
    coefficients = origin.coefficients.reshape(-1, origin.coefficients.shape[-1])
    size, terms = coefficients.shape
    cells = panel_cells(basis, panels, terms)
    r = cells.radii()
    weights = cells.weights()
    many = want_sup and len(set(cuts)) > MANY  # then the terms are taken away one by one
    if not origin.projected:
        many = False
    ends = sorted({*cuts, terms}) if (want_sup and not many) or not origin.projected else [terms]
    polynomials = panels.coefficients.reshape(size, *panels.coefficients.shape[-2:])
    last = np.zeros(size)
    direct = np.zeros((len(ends), size))
    sup = np.zeros((len(cuts) if many else len(ends), size))
    rounding, rounding_l2 = np.zeros(size), np.zeros(size)
    step = max(1, BLOCK // (r.size * (len(ends) + 2)))
    for low in range(0, size, step):
        batch = slice(low, low + step)
        difference, target = _differences(
            basis, coefficients[batch], polynomials[batch], panels, cells, r, ends
        )
        largest = np.abs(difference).max(axis=(-2, -1))
        if many:
            left = difference[-1].reshape(-1, r.size)
            sup[:, batch] = largest_errors(basis, coefficients[batch], r.ravel(), left)[np.asarray(cuts) - 1]
        else:
            sup[:, batch] = largest
        last[batch] = _norm(difference[-1], largest[-1], weights)
        if not origin.projected:
            direct[:, batch] = [_norm(d, h, weights) for d, h in zip(difference, largest, strict=True)]
        of_sums = rounding_of(basis, coefficients[batch], r.ravel())
        heights = np.abs(target).max(axis=(-2, -1))
        rounding[batch] = np.maximum(of_sums, ROUNDING * heights)
        rounding_l2[batch] = np.maximum(of_sums * reach_of(basis), ROUNDING * _norm(target, heights, weights))
    sup *= SAMPLED_MARGIN if cells.sampled else SUP_MARGIN
    last *= SAMPLED_MARGIN_L2 if cells.sampled else MARGIN_L2
    if origin.left is not None:
        last = np.array(origin.left).reshape(-1)
    else:
        exact = by_parseval(basis, coefficients, panels.norm().reshape(-1))
        last = np.where(exact > 0.0, exact, last)
    places = list(range(len(cuts))) if many else [ends.index(cut) for cut in cuts] if want_sup else []
    if not origin.projected:
        direct *= SAMPLED_MARGIN_L2 if cells.sampled else MARGIN_L2
        return Measured(direct[[ends.index(cut) for cut in cuts]], sup[places], rounding, rounding_l2)
    return Measured(
        root_of_squares(tails(basis, coefficients, cuts), last), sup[places], rounding, rounding_l2
    )


def _differences(
    basis: Basis,
    coefficients: Numeric,
    polynomials: Numeric,
    panels: Panels,
    cells: Cells,
    r: FloatArray,
    ends: Sequence[int],
) -> tuple[Numeric, Numeric]:
    """Return f - S of shape (ends, size, cells, points), and f."""
    values = from_rows(sums(basis, as_rows(coefficients), r.ravel(), cuts=ends), coefficients)
    target = panel_values(panels, polynomials, cells.panel, r)
    return target - values.reshape((*values.shape[:-1], *r.shape)), target


def _norm(values: Numeric, largest: FloatArray, weights: FloatArray) -> FloatArray:
    """Return the L2 norms (size,) of values (size, cells, points) whose largest moduli are known."""
    unit = np.where(largest > 0.0, largest, 1.0)
    return np.asarray(
        unit * np.sqrt(np.einsum("sij,ij->s", np.abs(values / unit[:, None, None]) ** 2, weights))
    )


def reach_of(basis: Basis) -> float:
    """Return the L2 norm of the function 1."""
    return float(basis.radius) / math.sqrt(2.0)


def rounding_of(basis: Basis, coefficients: Numeric, r: FloatArray) -> FloatArray:
    """Return the rounding error (size,) of sums of coefficients (size, terms), on some of the radii."""
    thinned = r[:: max(1, r.size // THINNED)]
    return np.asarray(ROUNDING * sums(basis, np.abs(coefficients), thinned, absolute=True).max(axis=-1))
