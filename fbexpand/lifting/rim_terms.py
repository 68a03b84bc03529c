"""What a profile has at the rim: B f, B lap f, B lap^2 f, ... of its last panel, with x = r/R.

B f is f(R) for a basis of f(R) = 0 and R f'(R) + robin f(R) for one with a `robin`; lap is taken in units of 1/R^2.
Every B lap^i f that is not 0 leaves a term in the coefficients that falls two powers of k faster than the one before.
"""

from __future__ import annotations

import math
from typing import TYPE_CHECKING, Any

import numpy as np

from fbexpand.exceptions import ArgumentValueError
from fbexpand.lifting.closed_part import ClosedPart
from fbexpand.types import FloatArray, Numeric

if TYPE_CHECKING:
    from fbexpand.bases import Basis
    from fbexpand.profiles.panels import Panels

EPS = float(np.finfo(np.float64).eps)
POINTS = 97  # at which a profile is compared with a sum of powers
ROUNDING = 32.0 * EPS  # of its largest value: by so much they may differ
SAFETY = 8.0  # times the rounding of a derivative: less than this is nothing


def condition_of(basis: Any) -> float:
    """Return the Robin coefficient of the rim condition, inf for f(R) = 0; ValueError for any other basis."""
    from fbexpand.bases import Dini, FourierBessel  # not at the top: lifting is for their rim conditions

    if isinstance(basis, FourierBessel):
        return math.inf
    if isinstance(basis, Dini):
        return basis.robin
    raise ArgumentValueError(
        f"'lift_terms' must be 0 on a basis whose rim condition is not known (got {basis!r})", "lift_terms", basis
    )


def rim_terms(basis: Basis, panels: Panels, count: int) -> tuple[Numeric, FloatArray]:
    """Return B lap^i f for i < count, shape (size, count), and what rounding may have made of them."""
    robin = condition_of(basis)
    order = float(basis.order)
    derivatives = 2 * count
    taylor, noise = _taylor(panels, derivatives)
    out = np.zeros((taylor.shape[0], count), dtype=taylor.dtype)
    doubt = np.zeros((taylor.shape[0], count))
    for i in range(count):
        if math.isinf(robin):
            out[:, i], doubt[:, i] = taylor[:, 0], noise[:, 0]
        else:
            out[:, i] = taylor[:, 1] + robin * taylor[:, 0]
            doubt[:, i] = noise[:, 1] + abs(robin) * noise[:, 0]
        taylor, noise = _laplacian(taylor, order, 1.0), _laplacian(noise, order, -1.0)
    return out, doubt


def _taylor(panels: Panels, count: int) -> tuple[Numeric, FloatArray]:
    """Return the coefficients in y of f(R (1 + y)), (size, count), and their rounding."""
    rows = panels.rows()[:, -1]
    radius = float(panels.edges[-1])
    half = 0.5 * float(panels.edges[-1] - panels.edges[-2]) / radius
    size = np.abs(rows)
    scale = size.max(axis=1, keepdims=True)
    rows = np.where(size > EPS * scale, rows, 0.0)  # what is below is rounding, and counts most in high derivatives
    j = np.arange(rows.shape[1], dtype=np.float64)
    heavy = np.ones_like(j)  # T_j^(n)(1) / n!
    taylor = np.empty((rows.shape[0], count), dtype=rows.dtype)
    noise = np.empty((rows.shape[0], count))
    for n in range(count):
        taylor[:, n] = rows @ heavy
        noise[:, n] = SAFETY * EPS * (np.abs(rows) @ heavy + scale[:, 0] * heavy[_last(rows)])
        heavy = heavy * (j * j - n * n) / ((2.0 * n + 1.0) * (n + 1.0) * half)
    return taylor, noise


def _last(rows: Numeric) -> np.ndarray[tuple[int, ...], np.dtype[np.int64]]:
    """Return the index of the last coefficient that is not 0, (size,)."""
    return np.asarray(np.where(np.abs(rows) > 0.0, np.arange(rows.shape[1]), 0).max(axis=1))


def _laplacian(taylor: Numeric, order: float, sign: float) -> Numeric:
    """Return the coefficients of f'' + f'/x - order^2 f/x^2, x = 1 + y; with sign = -1 a bound from moduli."""
    count = taylor.shape[1]
    n = np.arange(count)
    alternating = np.where(n % 2 == 0, 1.0, -sign if sign < 0.0 else -1.0)
    if sign < 0.0:
        alternating = np.ones(count)
    inverse, square = alternating, alternating * (n + 1.0)
    first = np.zeros_like(taylor)
    first[:, :-1] = taylor[:, 1:] * n[1:]
    second = np.zeros_like(taylor)
    second[:, :-1] = first[:, 1:] * n[1:]
    out = second.copy()
    for k in range(count):
        out[:, k] += first[:, : k + 1] @ inverse[k::-1] if k else first[:, 0]
        out[:, k] -= sign * order**2 * (taylor[:, : k + 1] @ square[k::-1] if k else taylor[:, 0])
    return out


def powers_for(basis: Basis, count: int) -> tuple[int, ...]:
    """Return j of the powers r^(order + 2 j) that are matched: from 0, or from 1 where that would be singular."""
    robin = condition_of(basis)
    first = 0 if math.isinf(robin) or abs(robin + float(basis.order)) >= 1.0 else 1
    return tuple(range(first, first + count))


def closed_part_of(basis: Basis, panels: Panels, count: int) -> ClosedPart:
    """Return p with B lap^i p = B lap^i f for i < count; what rounding leaves of them unknown is not matched.

    Profiles that are such a sum themselves, as far as rounding can tell, are taken whole.
    """
    whole = _fitted(panels, float(basis.order), count)
    if whole is not None:
        return whole
    robin, order = condition_of(basis), float(basis.order)
    powers = powers_for(basis, count)
    wanted, doubt = rim_terms(basis, panels, count)
    wanted = np.where(np.abs(wanted) > doubt, wanted, 0.0)
    matrix = np.zeros((count, count))
    for column, j in enumerate(powers):
        for i in range(min(count, j + 1)):
            steps = math.prod(4.0 * (j - t) * (order + j - t) for t in range(i))
            matrix[i, column] = steps * (1.0 if math.isinf(robin) else order + 2.0 * (j - i) + robin)
    scale = np.abs(matrix).max(axis=1)
    coefficients = np.linalg.solve(matrix / scale[:, None], (wanted / scale).T).T
    return ClosedPart(
        order, float(basis.radius), powers, coefficients.reshape(*panels.batch_shape, count).astype(wanted.dtype)
    )


def _fitted(panels: Panels, order: float, count: int) -> ClosedPart | None:
    """Return the sum of the first `count` powers that all profiles are, None where one is not."""
    radius = float(panels.edges[-1])
    r = radius * (0.5 - 0.5 * np.cos(np.pi * (np.arange(POINTS) + 0.5) / POINTS))
    powers = tuple(range(count))
    matrix = (r / radius)[:, None] ** (order + 2.0 * np.array(powers))
    values = panels(r).reshape(-1, POINTS)
    found = np.linalg.lstsq(matrix, values.T, rcond=None)[0]
    left = np.abs(values.T - matrix @ found).max(axis=0)
    if np.any(left > ROUNDING * np.abs(values).max(axis=1)):
        return None
    return ClosedPart(order, radius, powers, found.T.reshape(*panels.batch_shape, count))
