"""Gauss rules for a panel's polynomial times modes, composite where a panel is many waves long.

Gauss-Legendre for the integral of f phi r dr; on the panel at the axis, at an
order that is no integer, Gauss-Jacobi for the weight r^(mu + 1), mu the fraction of the order, so that what
is left of phi_k, a power series in r, is smooth.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache

import numpy as np

from fbexpand.kernels.gauss import refine_rule
from fbexpand.profiles import chebyshev
from fbexpand.records import ReadOnlyArrays
from fbexpand.types import FloatArray, IntArray

MOST_NODES = 176  # in one stretch of a rule; a panel with more waves is cut into stretches
KEPT_NODES = 1024  # of a rule whose matrices are kept
DIGITS = 38.0  # natural logarithm of the accuracy of a truncated geometric series, with something to spare


@dataclass(frozen=True, eq=False)
class Rule(ReadOnlyArrays):
    """Nodes ascending in (0, 1), shares of a panel; integral_0^1 g ds is the sum of weights times g.

    For a panel at the axis, at an order that is no integer, g is s^(mu + 1) times a smooth function.
    """

    nodes: FloatArray
    weights: FloatArray

    def evaluation(self, degrees: int, first: int = 0, stop: int | None = None) -> FloatArray:
        """Return values at nodes first, ..., stop - 1 from Chebyshev coefficients, a matrix (degrees, nodes)."""
        if self.nodes.size <= KEPT_NODES:
            return _evaluation(self, degrees)[:, first:stop]
        return chebyshev.evaluation(2.0 * self.nodes[first:stop] - 1.0, degrees)


@lru_cache(maxsize=128)
def _evaluation(rule: Rule, degrees: int) -> FloatArray:
    return chebyshev.evaluation(2.0 * rule.nodes - 1.0, degrees)


def sizes(waves: FloatArray, degrees: int, ratio: FloatArray, fraction: float) -> tuple[IntArray, IntArray]:
    """Return stretches and nodes per stretch for panels [a, b] with a/b = `ratio`, both (P,).

    Right to rounding for polynomials of `degrees` coefficients times modes that turn by up to `waves` radians
    in half a panel; `fraction` is that of the order.
    """
    extra = power_degree(ratio) if fraction else np.zeros_like(ratio)
    stretches = np.ones(waves.size, dtype=np.int64)
    counts = _count(waves, degrees + extra)
    while True:
        long = counts > MOST_NODES
        if not long.any():
            break
        more = np.ceil(stretches * counts / MOST_NODES).astype(np.int64)
        stretches = np.where(long, np.maximum(stretches + 1, more), stretches)
        if fraction:  # the stretch beside the first one begins at half its end
            extra = np.where(long, np.maximum(extra, power_degree(0.5)), extra)
        counts = np.where(long, _count(waves / stretches, degrees + extra), counts)
    grain = np.where(counts <= 32, 4, 8)
    return stretches, grain * -(-counts // grain)


def _count(waves: FloatArray, degrees: FloatArray | float) -> IntArray:
    """Return the Gauss points that integrate a polynomial times a wave.

    cos(w t) is resolved by a degree somewhat beyond w, and exp(w (t - 1)) by less.
    """
    degree = waves + 11.0 * np.cbrt(0.5 * waves) + 6.0
    return np.ceil(0.5 * (degree + degrees + 2.0)).astype(np.int64)


def power_degree(ratio: FloatArray | float) -> FloatArray:
    """Return the degree that resolves a power of r on [a, b], a/b = `ratio`, to rounding; 0 at the axis."""
    x = (1.0 + np.asarray(ratio)) / (1.0 - np.asarray(ratio))
    with np.errstate(divide="ignore"):
        return np.where(x > 1.0, DIGITS / np.log(x + np.sqrt(x * x - 1.0)), 0.0)


@lru_cache(maxsize=256)
def composite_rule(stretches: int, count: int, fraction: float) -> Rule:
    """Return the rule of `stretches` times `count` nodes; `fraction` is 0 but on a panel at the axis."""
    share, w = jacobi_rule(count, 0.0)
    nodes = (np.arange(stretches)[:, None] + share) / stretches
    weights = np.repeat(w[None] / stretches, stretches, axis=0)
    if fraction:
        share, w = jacobi_rule(count, 1.0 + fraction)
        nodes[0] = share / stretches
        weights[0] = w / share ** (1.0 + fraction) / stretches
    return Rule(nodes.ravel(), weights.ravel())


@lru_cache(maxsize=64)
def jacobi_rule(count: int, power: float) -> tuple[FloatArray, FloatArray]:
    """Return nodes and weights, sum w g = integral_0^1 s^power g ds for polynomials g of degree 2 count - 1.

    The eigenvalues of the Jacobi matrix (Golub and Welsch 1969), refined in double-double.
    """
    k = np.arange(count, dtype=np.float64)
    m = 2.0 * k + power
    diagonal = np.empty(count)
    diagonal[0] = power / (power + 2.0)
    diagonal[1:] = power * power / (m[1:] * (m[1:] + 2.0))
    k, m = k[1:], m[1:]
    beside = 2.0 * k * (k + power) / (m * np.sqrt((m + 1.0) * (m - 1.0)))
    # the lower triangle of a dense matrix: it is small, and importing a tridiagonal solver takes longer
    eigenvalues = np.asarray(np.linalg.eigvalsh(np.diag(diagonal) + np.diag(beside, -1)), dtype=np.float64)
    t = 0.5 * (1.0 + eigenvalues)
    weights = np.empty(count)
    refine_rule(power, t, weights)
    return t, weights
