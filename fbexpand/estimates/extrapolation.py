"""Errors of partial sums from the last terms and the law of decay, where no profile is at hand."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from fbexpand.estimates.cells import MOST_CELLS, cells_of
from fbexpand.estimates.law import JUMP_POWER, Decay, decay_of
from fbexpand.estimates.residual import (
    MANY,
    SUP_MARGIN,
    Measured,
    reach_of,
    root_of_squares,
    rounding_of,
    tails,
)
from fbexpand.estimates.walk import largest_errors
from fbexpand.transform.direct import as_rows, from_rows, sums
from fbexpand.types import FloatArray, Numeric

if TYPE_CHECKING:
    from fbexpand.bases import Basis
    from fbexpand.estimates.origin import Origin

SAFETY = 1.5
SAFETY_SUP = 2.2
ABSOLUTE = 3.0  # from this power on the moduli of the terms left out may be added up
LARGEST_RATIO = 0.8  # of the last two blocks of terms: above it their sum does not settle
UNSETTLED = 3.5  # times the last block: what is left beside a jump
UNSETTLED_QUARTER = 10.0  # times the last quarter


@dataclass(frozen=True, eq=False)
class Blocks:
    """Moduli (size, m) of sums of blocks of the last terms at some radii: halves and quarters."""

    last_half: FloatArray
    half_before: FloatArray
    last_quarter: FloatArray


def block_ends(terms: int) -> set[int]:
    """Return the numbers of terms at which sums are needed to form blocks."""
    return {terms // 4, terms // 2, 3 * terms // 4, terms}


def blocks_of(values: Numeric, ends: Sequence[int], terms: int) -> Blocks:
    """Form the blocks from partial sums (ends, size, m)."""
    quarter, half, three = (values[ends.index(cut)] for cut in (terms // 4, terms // 2, 3 * terms // 4))
    whole = values[ends.index(terms)]
    return Blocks(np.abs(whole - half), np.abs(half - quarter), np.abs(whole - three))


def extrapolate(basis: Basis, origin: Origin, cuts: Sequence[int], *, want_sup: bool = True) -> Measured:
    """Estimate the errors of the partial sums of `cuts` (ascending) terms from the coefficients."""
    coefficients = origin.coefficients.reshape(-1, origin.coefficients.shape[-1])
    decay = decay_of(basis, coefficients)
    terms = coefficients.shape[1]
    # what is left may be known from elsewhere: a law in time, say, has damped it
    left = SAFETY * decay.tail(terms) if origin.left is None else np.reshape(origin.left, -1)
    l2 = root_of_squares(tails(basis, coefficients, cuts), left)
    if not want_sup:
        return Measured(l2, np.zeros_like(l2), np.zeros(l2.shape[1]), np.zeros(l2.shape[1]))
    edges = np.array([0.0, float(basis.radius)])
    r = cells_of(basis, edges, terms, max(MOST_CELLS, 1024)).radii().ravel()
    many = len(set(cuts)) > MANY
    ends = sorted(block_ends(terms) if many else {*cuts, *block_ends(terms)})
    values = from_rows(sums(basis, as_rows(coefficients), r, cuts=ends), coefficients)
    beyond = sup_beyond(basis, decay, blocks_of(values, ends, terms))
    beyond = np.maximum(beyond, left / reach_of(basis))  # no field of that L2 norm is smaller everywhere
    if many:
        nothing = np.zeros((coefficients.shape[0], r.size), dtype=coefficients.dtype)
        within = largest_errors(basis, coefficients, r, nothing)[np.asarray(cuts) - 1]
    else:
        within = np.abs(values[-1] - values).max(axis=-1)[[ends.index(cut) for cut in cuts]]
    rounding = rounding_of(basis, coefficients, r)
    sup = np.where(origin.front, np.inf, SUP_MARGIN * within + beyond)
    return Measured(l2, sup, rounding, rounding * reach_of(basis))


def sup_beyond(basis: Basis, decay: Decay, blocks: Blocks) -> FloatArray:
    """Estimate the sup of the terms beyond those at hand, shape (size,).

    The sups of blocks of doubling length form a geometric series, or do not fall at all beside a jump. Where
    the coefficients fall fast, the moduli of the terms left out, added up, may be less.
    """
    late, early, quarter = (
        part.max(axis=-1) for part in (blocks.last_half, blocks.half_before, blocks.last_quarter)
    )
    with np.errstate(divide="ignore", invalid="ignore"):
        ratio = np.nan_to_num(late / early, nan=0.0, posinf=1.0)
    # the ratio by the law of the coefficients, one power less than theirs, guards against a lucky late block
    expected = np.where(decay.rate > 0.0, 0.0, 0.5 ** np.maximum(decay.power - 1.0, 0.0))
    settled = np.minimum(np.maximum(ratio, expected), LARGEST_RATIO)
    # where f(0) is not 0 but the modes rise from the axis as r^order, the blocks show only a part of f(0)
    order = float(basis.order)
    unsettled = max(UNSETTLED, 1.5 / (1.0 - 2.0**-order)) if order > 0.0 else UNSETTLED
    restless = (ratio > LARGEST_RATIO) | (decay.known & (decay.power < JUMP_POWER))
    geometric = np.where(restless, unsettled * late, SAFETY_SUP * late * settled / (1.0 - settled))
    absolute = _moduli(basis, decay)
    steady = np.where(decay.power >= ABSOLUTE, np.minimum(geometric, absolute), geometric)
    found = np.where(decay.rate > 0.0, absolute, steady)
    found = np.where(decay.flattened, UNSETTLED_QUARTER * quarter, found)
    return np.asarray(found if decay.known else geometric)


def _moduli(basis: Basis, decay: Decay) -> FloatArray:
    """Return the sum of the largest moduli of the terms left out, inf where it diverges."""
    n = decay.terms
    near = basis.radius * np.linspace(0.0, 1.0, 64)
    height = float(np.abs(basis.modes(near, 1, n)).max() / np.sqrt(basis.norms(1, n)[0]))
    fall = decay.power - 1.5  # the height of a normalised mode grows as the root of lambda
    with np.errstate(divide="ignore"):
        return np.where(fall > 0.05, SAFETY * decay.level * height * n / np.maximum(fall, 0.05), np.inf)
