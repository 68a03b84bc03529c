"""A function of time resolved into panels of Chebyshev polynomials, bisected until it is followed to rounding."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from itertools import pairwise
from typing import Any

import numpy as np
from numpy.polynomial import chebyshev

from fbexpand.types import FloatArray, Numeric

COUNT = 16  # nodes of a panel
CHECKS = np.array([-0.97, 0.43])  # where a polynomial is held against the function
SHARE = 3e-15  # of the largest value: the error of a panel times its share of the time
FIRST = 8  # panels to start from
MOST = 1 << 15  # values asked for
DEEPEST = 52  # halvings
PLATEAU = 1e-7  # of the largest value: errors below it that halving does not lower are the function's own noise
STEEP = 1e3  # see `panels.steepness`

_ODD = 2 * np.arange(COUNT) + 1
NODES: FloatArray = np.sin(np.pi * (COUNT - _ODD) / (2 * COUNT))  # symmetric to the last bit
_BACK = np.cos(np.pi * (np.outer(_ODD, np.arange(COUNT)) % (4 * COUNT)) / (2 * COUNT)) * (2.0 / COUNT)
_BACK[:, 0] *= 0.5
_AT_CHECKS = chebyshev.chebvander(CHECKS, COUNT - 1)

Measure = Callable[[Numeric], FloatArray]  # values (..., width) -> sizes (..., kinds)


@dataclass(frozen=True, eq=False)
class TimePanels:
    """Polynomials on [edges[i], edges[i + 1]]: coefficients (panels, COUNT, width); errors (panels, kinds)."""

    edges: FloatArray
    coefficients: Numeric
    errors: FloatArray
    settled: bool


def steepness(root: float) -> FloatArray:
    """Return the largest of |D^i T_j(1)| / root^i over i, (COUNT,): what a particular solution makes of T_j."""
    j = np.arange(COUNT, dtype=np.float64)
    size = largest = np.ones(COUNT)
    for i in range(COUNT):
        size = size * np.maximum(j * j - i * i, 0.0) / ((2 * i + 1) * root)
        largest = np.maximum(largest, size)
    return np.asarray(largest)


def resolve_in_time(
    function: Callable[[float], Numeric], start: float, stop: float, marks: FloatArray, measure: Measure, root: float
) -> TimePanels:
    """Resolve function(t) -> (width,) between two times; `marks` are times at which panels are to end.

    `measure` gives the sizes of the parts of a value that are held to the tolerance apart.
    """
    length = stop - start
    edges = np.union1d(np.linspace(start, stop, FIRST + 1), marks)
    waiting = [(a, b, 0, np.inf) for a, b in pairwise(edges.tolist())][::-1]
    steep = steepness(root)
    found: list[tuple[float, float, Numeric, FloatArray]] = []
    largest: Any = 0.0
    evaluations, settled = 0, True
    while waiting:
        a, b, depth, before = waiting.pop()
        middle, half = 0.5 * (a + b), 0.5 * (b - a)
        values = np.stack([function(float(t)) for t in middle + half * NODES])
        beside = np.stack([function(float(t)) for t in middle + half * CHECKS])
        evaluations += COUNT + CHECKS.size
        coefficients = _BACK.T @ values
        sizes = measure(values)
        largest = np.maximum(largest, sizes.max(axis=0))
        tail = measure(coefficients[-3:]).max(axis=0)
        error = np.maximum(tail, measure(beside - _AT_CHECKS @ coefficients).max(axis=0))
        unit = np.where(largest > 0.0, largest, 1.0)
        relative = float((error / unit).max())
        good = relative * (b - a) <= SHARE * length
        good = good and bool(np.all(steep @ measure(coefficients) <= STEEP * unit))
        noise = relative <= PLATEAU and relative >= 0.25 * before
        stop_here = depth >= DEEPEST or evaluations >= MOST or middle <= a or b <= middle
        if good or noise or stop_here:
            settled = settled and (good or noise or depth >= DEEPEST or middle <= a)
            found.append((a, b, coefficients, error))
        else:
            waiting += [(middle, b, depth + 1, relative), (a, middle, depth + 1, relative)]
    return TimePanels(
        np.array([found[0][0], *(item[1] for item in found)]),
        np.stack([item[2] for item in found]),
        np.stack([item[3] for item in found]),
        settled,
    )


def derivative(coefficients: Numeric, half: float) -> Numeric:
    """Return the Chebyshev coefficients (COUNT, ...) of the derivative on a panel of half length `half`."""
    count = coefficients.shape[0]
    out = np.zeros_like(coefficients)
    for j in range(count - 2, -1, -1):
        out[j] = 2.0 * (j + 1) * coefficients[j + 1] + (out[j + 2] if j + 2 < count else 0.0)
    out[0] *= 0.5
    return np.asarray(out / half)
