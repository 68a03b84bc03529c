"""How modes answer a forcing that is a polynomial on a panel of time: Duhamel's integral, mode by mode, without steps.

On a panel a mode's answer is p + (homogeneous motion of what the state at its start is above p), p a particular
solution of sum_i a_i D^i p = F. Where the mode is fast on the panel, p is the one that is a polynomial of F's own
degree, by back substitution: p = F / a_0 - ... Where it is slow, p starts from rest and is a polynomial to rounding:
D^n p solves an integral equation whose matrix is near the identity. A strongly damped wave is both, and is split into
its two exponentials. All are exact for the polynomial F.
"""

from __future__ import annotations

from functools import lru_cache

import numpy as np

from fbexpand.evolution.motion import Motion, grown
from fbexpand.evolution.panels import COUNT, derivative
from fbexpand.types import FloatArray, IntArray, Numeric

SLOW = 6.0  # times 1/half panel: the rate below which a mode is slow
DEGREES = 44  # of a slow mode's answer: they resolve exp(-2 SLOW x) on a panel


@lru_cache(maxsize=1)
def _integration() -> FloatArray:
    """Return the matrix that integrates Chebyshev series of DEGREES coefficients from -1."""
    matrix = np.zeros((DEGREES, DEGREES))
    for j in range(DEGREES):
        if j == 0:
            matrix[1, 0] = 1.0
        elif j == 1:
            matrix[2, 1] = 0.25
        else:
            if j + 1 < DEGREES:
                matrix[j + 1, j] = 0.5 / (j + 1)
            matrix[j - 1, j] = -0.5 / (j - 1)
    signs = (-1.0) ** np.arange(DEGREES)
    matrix[0] = 0.0
    matrix[0] = -signs @ matrix
    return matrix


class Response:
    """The particular solutions of one motion on panels of one half length."""

    def __init__(self, motion: Motion, half: float) -> None:
        self._order = motion.order
        self._half = half
        self._equation = [np.broadcast_to(a, (motion.terms,)) for a in motion.equation]
        low, high = motion.exponents
        slower, faster = np.abs(low) * abs(half), np.abs(high) * abs(half)
        self._fast: IntArray = np.flatnonzero(slower >= SLOW)
        self._slow: IntArray = np.flatnonzero((slower < SLOW) & (faster < 2.0 * SLOW))
        self._both: IntArray = np.flatnonzero((slower < SLOW) & (faster >= 2.0 * SLOW))
        self._matrix = _slow_matrix([a[self._slow] for a in self._equation], half)
        if self._both.size:  # two exponentials, real ones
            self._low, self._high = (np.real(rate[self._both]) for rate in (low, high))
            self._low_matrix = _slow_matrix([-self._low, np.ones_like(self._low)], half)

    def particular(self, forcing: Numeric) -> list[Numeric]:
        """Return p, Dp, ..., D^(order-1) p for F (COUNT, size, terms), each (DEGREES, size, terms)."""
        kind = np.result_type(forcing, self._matrix, *self._equation)
        answers = [np.zeros((DEGREES, *forcing.shape[1:]), dtype=kind) for _ in range(self._order)]
        if self._fast.size:
            found = _back_substitution([a[self._fast] for a in self._equation], forcing[:, :, self._fast], self._half)
            for answer in answers:
                answer[:COUNT, :, self._fast] = found
                found = derivative(found, self._half)
        if self._slow.size:
            found = _slow_solution(self._matrix, forcing[:, :, self._slow])
            for answer in answers[::-1]:
                found = np.tensordot(_integration() * self._half, found, axes=1)
                answer[:, :, self._slow] = found
        if self._both.size:
            here = forcing[:, :, self._both]
            first = np.tensordot(_integration() * self._half, _slow_solution(self._low_matrix, here), axes=1)
            second = np.zeros_like(first)
            second[:COUNT] = _back_substitution([-self._high, np.ones_like(self._high)], here, self._half)
            apart = self._low - self._high
            answers[0][:, :, self._both] = (first - second) / apart
            answers[1][:, :, self._both] = (self._low * first - self._high * second) / apart
        return answers


def _slow_matrix(equation: list[Numeric], half: float) -> Numeric:
    """Return what takes F's coefficients to those of D^order p, (modes, DEGREES, COUNT)."""
    order = len(equation) - 1
    unit = np.eye(DEGREES)
    step = _integration() * half
    matrix = equation[order][:, None, None] * unit
    power = unit
    for i in range(order - 1, -1, -1):
        power = power @ step
        matrix = matrix + equation[i][:, None, None] * power
    right = np.broadcast_to(unit[:, :COUNT], (equation[0].size, DEGREES, COUNT))
    return np.asarray(np.linalg.solve(matrix, right))


def _slow_solution(matrix: Numeric, forcing: Numeric) -> Numeric:
    """Return D^order p, (DEGREES, size, modes)."""
    return np.asarray(np.einsum("kdc,csk->dsk", matrix, forcing))


def _back_substitution(equation: list[Numeric], forcing: Numeric, half: float) -> Numeric:
    """Return the polynomial p, (COUNT, size, modes), with sum_i a_i D^i p = F, from its highest coefficient down."""
    order = len(equation) - 1
    count = forcing.shape[0]
    kind = np.result_type(forcing, *equation)
    levels = [np.zeros((count + 2, *forcing.shape[1:]), dtype=kind) for _ in range(order + 1)]
    for j in range(count - 1, -1, -1):
        total = forcing[j].astype(kind)
        for i in range(1, order + 1):
            levels[i][j] = levels[i][j + 2] + (2.0 * (j + 1) / half) * levels[i - 1][j + 1]
            if j == 0:
                levels[i][0] *= 0.5
            total = total - equation[i] * levels[i][j]
        levels[0][j] = total / equation[0]
    return levels[0][:count]


def at(coefficients: Numeric, x: FloatArray) -> Numeric:
    """Return Chebyshev series (degrees, ...) at local coordinates x, (x, ...)."""
    from numpy.polynomial import chebyshev

    return np.tensordot(chebyshev.chebvander(x, coefficients.shape[0] - 1), coefficients, axes=1)


def moved(motion: Motion, state: list[Numeric], times: FloatArray, *, velocity: bool = False) -> Numeric:
    """Return the homogeneous motion of a state (size, terms) after each time, or its velocity: (times, size, terms)."""
    parts = motion.parts(times, speed=motion.order == 2, velocity=velocity)
    alive = parts.state.shape[1]
    total = np.zeros((times.size, *state[0].shape), dtype=np.result_type(parts.state, *state))
    total[..., :alive] = parts.state[:, None, :] * state[0][:, :alive]
    if motion.order == 2 and parts.speed is not None:
        total += parts.speed[:, None, :] * state[1]
    if parts.growth is not None:
        total[..., 0] = grown(total[..., 0], parts.growth)
    return total
