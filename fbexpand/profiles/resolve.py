"""A callable profile resolved into panels: divided until Chebyshev coefficients have fallen to rounding.

The panels are those of the whole batch; each profile has its own scale, noise and residual. A scan over the
whole radius checks the polynomials at points that they were not made from, so that a narrow feature between
the Chebyshev points is found. Beside an end where f is not smooth panels shrink by a factor of four.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np

from fbexpand.profiles import chebyshev
from fbexpand.profiles.division import MOST_EVALUATIONS, divide, level_jumps
from fbexpand.profiles.first_look import FIRST, SCAN, first_look
from fbexpand.profiles.judge import EPS, Judge, Verdict
from fbexpand.profiles.panels import Panels
from fbexpand.profiles.sampling import Sampler
from fbexpand.types import FloatArray, Numeric

SCANNED = 3  # at most one in three of the evaluations allowed goes into the scan
GRAIN = 8  # few different numbers of degrees, so that profiles share the weights of their integrals


def resolve(
    profile: Callable[..., Any],
    breaks: tuple[float, ...],
    radius: float,
    *,
    scan: int = SCAN,
    most: int = MOST_EVALUATIONS,
) -> Panels:
    """Return the panels of a profile that may jump at `breaks` (ascending, inside (0, radius)).

    The first scan has about `scan` points; not more than `most` evaluations are made in all.
    """
    sampler = Sampler(profile)
    look = first_look((0.0, *breaks, radius), min(scan, (most - FIRST * (len(breaks) + 1)) // SCANNED))
    values = sampler(look.radii)
    edges = look.edges
    split = (edges.size - 1) * FIRST
    nodes = values[:, :split].reshape(values.shape[0], -1, FIRST)
    on_scan = values[:, split:]
    coefficients = nodes @ chebyshev.transform(FIRST)
    judge = Judge(sampler.scale, on_scan, look)
    verdict = judge.verdict(edges[:-1], edges[1:], nodes, coefficients)
    if verdict.smooth.all():
        trimmed = _trimmed(coefficients, verdict)
        misses = np.maximum.reduceat(np.abs(on_scan - look.on_scan(trimmed)), look.starts, axis=1)
        if (misses <= judge.allowed(verdict.height, verdict.level)).all():
            return _panels(edges, trimmed, verdict.residual, sampler)
    pieces = divide(sampler, judge, look, verdict, coefficients, on_scan, most)
    level_jumps(pieces)
    return _panels(
        np.array([piece.low for piece in pieces] + [radius]),
        np.stack([piece.coefficients for piece in pieces], axis=1),
        np.stack([piece.residual for piece in pieces], axis=1),
        sampler,
    )


def _panels(edges: FloatArray, coefficients: Numeric, residual: FloatArray, sampler: Sampler) -> Panels:
    shape = sampler.batch_shape
    if sampler.unit is not None:
        coefficients, residual = coefficients * sampler.unit[:, :, None], residual * sampler.unit
    return Panels(
        edges,
        coefficients.reshape(*shape, *coefficients.shape[1:]),
        residual.reshape(*shape, residual.shape[1]),
        sampler.evaluations,
    )


def _trimmed(coefficients: Numeric, verdict: Verdict) -> Numeric:
    """Leave out degrees that no profile needs, GRAIN at a time: those lost in the rounding of the others."""
    least = np.maximum(verdict.residual / 16.0, EPS * verdict.height)
    needed = np.flatnonzero((np.abs(coefficients) > least[..., None]).any(axis=(0, 1)))
    last = int(needed[-1]) if needed.size else 0
    return np.ascontiguousarray(coefficients[..., : GRAIN * (last // GRAIN + 1)])
