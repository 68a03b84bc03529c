"""Derivatives and integrals of the sum."""

from __future__ import annotations

import inspect
import math
from functools import lru_cache
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.polynomial import chebyshev

from fbexpand.estimates.cells import half_wave, layer_edges
from fbexpand.transform.direct import as_rows, from_rows, series_at, sums
from fbexpand.types import FloatArray, Numeric

if TYPE_CHECKING:
    from fbexpand.bases import Basis

DEGREE = 18  # of the Chebyshev panels, half a wave long, of a basis that does not differentiate its modes
NODES = 24  # Gauss points in a panel of
HALF_WAVES = 8  # half waves: a sum of modes is integrated to rounding


def derivative_at(basis: Basis, coefficients: Numeric, r: FloatArray, n: int) -> Numeric:
    """Return the n-th derivative of the sum at one-dimensional r, shape (*batch, m), in 1/length^n.

    At order nu > 0 the sum starts as A r^nu: where nu is no integer and n > nu its derivative is infinite at
    the axis, with the sign of A nu (nu - 1) ... (nu - n + 1).
    """
    if n == 0:
        return series_at(basis, coefficients, r)
    rows = as_rows(coefficients)
    whole_order = float(basis.order).is_integer()
    result = np.zeros((rows.shape[0], r.size))
    inside = np.ones(r.size, dtype=bool) if whole_order else r > 0.0
    with np.errstate(invalid="ignore", over="ignore"):
        if differentiates(basis):
            result[:, inside] = sums(basis, rows, r[inside], derivative=n)
        else:
            result[:, inside] = _spectral(basis, rows, r[inside], n)
    if not whole_order and n > basis.order:
        lost = ~inside | ~np.isfinite(result).all(axis=0)
        if lost.any():
            result[:, lost] = _axis_limit(basis, rows, n)[:, None]
    return from_rows(result, coefficients)


def differentiates(basis: Any) -> bool:
    """Whether the basis offers derivatives of its modes."""
    try:
        return "derivative" in inspect.signature(basis.modes).parameters
    except (TypeError, ValueError):
        return False


def _axis_limit(basis: Basis, rows: FloatArray, n: int) -> FloatArray:
    """Return the infinite n-th derivatives at the axis, 0 where the sum vanishes there identically."""
    order = float(basis.order)
    root = max(float(basis.roots(1, rows.shape[1])[0]), 1.0)
    near = basis.radius * max(1e-8 / root, 10.0 ** (-200.0 / order))
    leading = sums(basis, rows, np.array([near]))[:, 0]
    falling = math.prod(math.copysign(1.0, order - j) for j in range(n))
    return np.asarray(np.where(leading == 0.0, 0.0, np.copysign(np.inf, leading * falling)))


def _spectral(basis: Basis, rows: FloatArray, r: FloatArray, n: int) -> FloatArray:
    """Differentiate by Chebyshev interpolation of the sum on panels half a wave long.

    Near the axis the sum is divided by r^order first, which leaves a smooth function. The error is about
    1e-13 sup |f| (root / radius)^n at n = 1 and grows by a factor of 50 with each n.
    """
    count = max(1, math.ceil(basis.radius / half_wave(basis, rows.shape[1])))
    cuts = np.union1d(np.linspace(0.0, basis.radius, count + 1), layer_edges(basis))
    result = np.zeros((rows.shape[0], r.size))
    t = np.cos(np.pi * (np.arange(DEGREE) + 0.5) / DEGREE)
    index = np.clip(np.searchsorted(cuts, r, side="right") - 1, 0, cuts.size - 2)
    order = float(basis.order)
    for panel in np.unique(index):
        low, high = cuts[panel], cuts[panel + 1]
        middle, half = 0.5 * (low + high), 0.5 * (high - low)
        nodes = middle + half * t
        values = sums(basis, rows, nodes)
        here = index == panel
        at = np.clip((r[here] - middle) / half, -1.0, 1.0)
        singular = order > 0.0 and panel < 2
        if singular:
            values = values / (nodes / high) ** order
        coefficients = chebyshev.chebfit(t, values.T, DEGREE - 1)
        derivatives = [
            chebyshev.chebval(at, chebyshev.chebder(coefficients, m) if m else coefficients) / half**m
            for m in range(n + 1)
        ]
        if not singular:
            result[:, here] = derivatives[n]
            continue
        power = 1.0
        for j in range(n + 1):  # Leibniz: derivatives of (r / high)^order times those of the smooth factor
            if power != 0.0:
                scale = (r[here] / high) ** (order - j) / high**j
                result[:, here] += math.comb(n, j) * power * scale * derivatives[n - j]
            power *= order - j
    return result


def integral_of(basis: Basis, coefficients: Numeric, a: float, b: float) -> Any:
    """Return the integral of the sum from a to b with weight r dr, shape (*batch,)."""
    sign = 1.0
    if b < a:
        a, b, sign = b, a, -1.0
    if a == b:
        return np.zeros(coefficients.shape[:-1], dtype=coefficients.dtype)[()]
    r, weights = _rule(basis, coefficients.shape[-1], a, b)
    rows = as_rows(coefficients)
    values = np.zeros((rows.shape[0], 1))
    step = 1 << 14
    for low in range(0, r.size, step):
        values[:, 0] += sums(basis, rows, r[low : low + step]) @ weights[low : low + step]
    return (sign * from_rows(values, coefficients)[..., 0])[()]


def _rule(basis: Basis, terms: int, a: float, b: float) -> tuple[FloatArray, FloatArray]:
    """Return radii and weights that integrate sums of modes over [a, b] with weight r dr, to rounding.

    Panels of some half waves with Gauss-Legendre points, no longer than their distance from the axis, where
    r^order is not smooth; the panel at the axis itself takes Gauss-Jacobi points for the weight r^(order +
    1).
    """
    order = float(basis.order)
    width = min(HALF_WAVES * half_wave(basis, terms), float(basis.radius))
    layer = layer_edges(basis, b)
    start, rules = a, []
    if a == 0.0:
        start = min(width, b, *layer)
        rules.append(_axis_rule(order, start))
    grading = [start]
    while start > 0.0 and grading[-1] < min(b, width):
        grading.append(min(2.0 * grading[-1], b))
    start = grading[-1]
    steps = np.linspace(start, b, max(1, math.ceil((b - start) / width)) + 1) if start < b else np.array([b])
    cuts = np.union1d(np.concatenate((grading, steps)), layer[layer > grading[0]])
    x, w = np.polynomial.legendre.leggauss(NODES)
    half = 0.5 * np.diff(cuts)[:, None]
    r = cuts[:-1, None] + half * (x + 1.0)
    rules.append((r.ravel(), (half * w * r).ravel()))
    return np.concatenate([rule[0] for rule in rules]), np.concatenate([rule[1] for rule in rules])


def _axis_rule(order: float, high: float) -> tuple[FloatArray, FloatArray]:
    t, w = _unit_rule(order)
    return high * t, high**2 * w


@lru_cache(maxsize=64)
def _unit_rule(order: float) -> tuple[FloatArray, FloatArray]:
    """Return nodes t and weights w with sum w f(t) = integral_0^1 f t dt for f = t^order times a polynomial.

    Gauss-Jacobi for the weight t^(order + 1), by the eigenvectors of the Jacobi matrix (Golub and Welsch
    1969), whose entries neither over- nor underflow at any order.
    """
    b = order + 1.0
    k = np.arange(NODES)
    diagonal = b * b / ((2 * k + b) * (2 * k + b + 2.0))
    k = k[1:]
    beside = 2.0 * k * (k + b) / ((2 * k + b) * np.sqrt((2 * k + b + 1.0) * (2 * k + b - 1.0)))
    x, vectors = np.linalg.eigh(np.diag(diagonal) + np.diag(beside, 1) + np.diag(beside, -1))
    t = 0.5 * (1.0 + x)
    return t, vectors[0] ** 2 / (order + 2.0) / t**order
