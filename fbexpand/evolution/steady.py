"""Steady states: (shift - lap) u = f, with the rim held at what it is given."""

from __future__ import annotations

import math
import warnings
from typing import Any

import numpy as np

from fbexpand import checks
from fbexpand.estimates.origin import Origin
from fbexpand.evolution.rim import MOST, Rim
from fbexpand.evolution.source import RimValue
from fbexpand.evolution.spectrum import modes_of
from fbexpand.evolution.state import as_expansion, closed_of, rows_of, shared_shape
from fbexpand.exceptions import ArgumentValueError
from fbexpand.expansion import Expansion
from fbexpand.kernels.propagate import decay_rates
from fbexpand.types import FloatArray, Numeric

EPS = float(np.finfo(np.float64).eps)
SINGULAR = 4.0 * EPS  # of the eigenvalue: shift + eigenvalue is 0 as far as floats can tell
SOLVABLE = 1e-12  # of the size of what drives a singular mode: less than this is nothing
ILL = 1e8  # the condition from which on it is worth a warning


def solve_steady(expansion: Expansion, *, shift: float = 0.0, rim: Any = None) -> Expansion:
    """Solve (shift - lap) u = f for the field f of a series: u_k = f_k / (shift + eigenvalue_k), and the rim's part.

    It is the state that u_t = D lap u - D shift u + D f settles to (heat sources f, in K/length^2; removal D shift).

    Parameters
    ----------
    expansion
        f, on any basis.
    shift
        A real number, in 1/length^2. Where it is -eigenvalue_k the equation is singular (Neumann of order 0 and shift
        0, robin = -order and shift 0, shift = (mu/R)^2 for a growing mode, a resonance for negative shifts); it is then
        solved up to a multiple of mode k, which is left out, if f and the rim do not drive that mode.
    rim
        g in u(R) = g (`FourierBessel`) or R u'(R) + robin u(R) = g (`Dini`; an ambient value T is g = robin T), a
        number or an array over the batch. None is g = 0.

    Returns
    -------
    Expansion of u, whose `closed_part` carries what the rim, or a closed part of f, leaves beyond any number of terms:
    it is right at the rim itself.

    Raises
    ------
    TypeError, ValueError
        For arguments of a wrong type or value; for a rim on a basis whose rim condition is not known; ValueError if the
        equation is singular and a mode is driven, which says so.

    Warns
    -----
    RuntimeWarning
        If shift + eigenvalue_k is so small that more than eight digits of mode k depend on the last digit of `shift`;
        the condition is stated, and part of the result's `error_estimate()`.

    Examples
    --------
    A wire with heat source 1 whose rim is held at 2: u = 2 + (1 - r^2) / 4.

    >>> from fbexpand import FourierBessel, expand
    >>> from fbexpand.evolution import solve_steady
    >>> source = expand(lambda r: 1 + 0 * r, FourierBessel(), terms=40, lift_terms=1)
    >>> u = solve_steady(source, rim=2.0)
    >>> print(u([0.0, 0.5, 1.0]))
    [2.25   2.1875 2.    ]
    """
    as_expansion("expansion", expansion)
    number = checks.finite("shift", shift)
    basis, terms = expansion.basis, expansion.terms
    held = RimValue(rim)
    if held.moving:
        raise checks.type_error("rim", "a number or an array of numbers", rim)
    named = [("expansion", expansion.batch_shape)]
    if held.first is not None:
        named.append(("rim", held.first.shape))
    shape = shared_shape(named)
    rows = rows_of(expansion, terms, shape)
    size = rows.shape[0]
    sums = np.empty((2, terms))
    modes = modes_of(basis, terms)
    decay_rates(1.0, number, modes.radius, modes.high, modes.low, modes.growing, sums)
    divisor, eigenvalues = sums[0], modes.eigenvalues
    closed = closed_of(expansion)
    lift = Rim(basis, terms) if held.first is not None or closed is not None else None
    value: Numeric = np.zeros(size)
    pushed: Numeric = np.zeros((1, terms))
    if held.first is not None and lift is not None:
        value = np.broadcast_to(held.first, shape).reshape(size)
        pushed = value[:, None] * lift.flux
    errors = _errors(expansion, shape)
    singular = np.abs(divisor) <= SINGULAR * np.maximum(np.abs(eigenvalues), abs(number))
    drive = _without_singular(basis, rows, pushed, singular, errors[0] + errors[1])
    amplitudes = drive / np.where(singular, 1.0, divisor)
    condition = _condition(divisor, eigenvalues, number, singular)
    part = None
    if lift is not None:
        rim_terms = np.zeros((size, MOST), dtype=np.result_type(value, rows))
        rim_terms[:, 0] = value
        sources = np.zeros((size, MOST)) if closed is None else _rim_terms_of(closed, lift, shape)
        scale, last = modes.radius**2, max(float(modes.high[-1]), 1.0)
        for i in range(1, lift.kept):
            following = scale * (number * rim_terms[:, i - 1] - sources[:, i - 1])
            if i > 1 and np.any(np.abs(following) > last**2 * np.abs(rim_terms[:, i - 1])):
                break  # a shift beyond the last eigenvalue: no use
            rim_terms[:, i] = following
        amplitudes = amplitudes - rim_terms @ lift.projected
        part = lift.closed_part(rim_terms.reshape(*shape, MOST))
    largest = float(np.max(1.0 / np.abs(divisor[~singular]))) if not singular.all() else 0.0
    norms = np.sqrt(basis.norms(terms))
    rounding = EPS * np.sqrt(np.sum((np.abs(amplitudes) * condition * norms) ** 2, axis=1))
    origin = Origin(
        amplitudes.reshape(*shape, terms),
        None,
        (errors[0] * largest + rounding).reshape(shape),
        (errors[1] * largest).reshape(shape),
    )
    return Expansion._derive(basis, origin.coefficients, (origin,), 0, part)


def _errors(expansion: Expansion, shape: tuple[int, ...]) -> tuple[FloatArray, FloatArray]:
    """Return the L2 errors of the coefficients by quadrature and table, each (size,)."""
    origins = expansion._origins
    parts = (sum(o.quadrature for o in origins), sum(o.table for o in origins))
    first, second = (np.broadcast_to(part, shape).reshape(-1) for part in parts)
    return first, second


def _rim_terms_of(closed: Any, lift: Rim, shape: tuple[int, ...]) -> Numeric:
    found = closed.coefficients @ lift.terms_of(closed.exponents).T
    return np.broadcast_to(found, (*shape, MOST)).reshape(-1, MOST)


def _without_singular(
    basis: Any, rows: Numeric, pushed: Numeric, singular: np.ndarray[Any, Any], errors: FloatArray
) -> Numeric:
    """Return f_k + rho_k g with the singular modes' share, which must be nothing, left out."""
    drive = rows + pushed
    for k in np.flatnonzero(singular):
        root = math.sqrt(float(basis.norms(1, int(k) + 1)[0]))
        norm = np.sqrt(np.sum(np.abs(rows * np.sqrt(basis.norms(rows.shape[1]))) ** 2, axis=1))
        allowed = SOLVABLE * (norm + np.abs(pushed[:, k]) * root) + errors
        over = np.flatnonzero(np.abs(drive[:, k]) * root > allowed)
        if over.size:
            i = int(over[0])
            which = f" (field {i} of the batch)" if rows.shape[0] > 1 else ""
            raise ArgumentValueError(
                f"'expansion' must not drive mode {k + 1}, whose shift + eigenvalue is 0: there is no steady state"
                f"{which} (got {drive[i, k]:.3g} from source and rim)",
                "expansion",
                drive[i, k],
            )
        drive[:, k] = 0.0
    return drive


def _condition(
    divisor: FloatArray, eigenvalues: FloatArray, shift: float, singular: np.ndarray[Any, Any]
) -> FloatArray:
    """Return the condition of each mode's division, with a warning where it is large; 0 for a singular mode."""
    with np.errstate(divide="ignore", invalid="ignore"):
        condition = (np.abs(eigenvalues) + abs(shift)) / np.abs(divisor)
    condition = np.where(singular, 0.0, np.maximum(condition, 1.0))
    worst = int(np.argmax(condition))
    if condition[worst] > ILL:
        warnings.warn(
            f"nearly singular: shift + eigenvalue of mode {worst + 1} is {divisor[worst]:.3g}, its condition is "
            f"{condition[worst]:.2g}",
            RuntimeWarning,
            stacklevel=3,
        )
    return condition
