"""A series, a law, times: the field at those times."""

from __future__ import annotations

import math
import warnings
from collections.abc import Callable
from typing import Any

import numpy as np

from fbexpand import checks
from fbexpand.evolution.drive import Drive
from fbexpand.evolution.laws import Law
from fbexpand.evolution.modal import Propagated
from fbexpand.evolution.modal_source import ModalDrive
from fbexpand.evolution.record import Evolution
from fbexpand.evolution.source import RimValue, Source, driven
from fbexpand.evolution.spectrum import modes_of
from fbexpand.evolution.state import State, as_expansion, on_basis, rows_of, shared_shape
from fbexpand.evolution.tails import FARTHEST, Tail
from fbexpand.exceptions import ArgumentValueError, TruncationWarning
from fbexpand.expansion import Expansion
from fbexpand.types import ArrayLike, FloatArray

TOO_SHORT = 1e-2  # of the field's norm: a series whose terms left out are more than this is too short
ENOUGH = 1e-6  # what the number of terms in the warning is for


def as_times(times: Any, law: Law, reversible: bool) -> FloatArray:
    """Return `times` as a read-only float64 array, 0- or one-dimensional."""
    array = np.array(checks.all_finite("times", checks.real_array("times", times)))
    if array.ndim > 1 or array.size == 0:
        raise checks.value_error("times", "a number or a non-empty one-dimensional array", times)
    if not reversible and np.any(array < 0.0):
        first = float(array[array < 0.0].flat[0])
        raise ArgumentValueError(f"'times' must be at least 0 for {law!r} (got {first!r})", "times", times)
    array.setflags(write=False)
    return array


def evolve(
    expansion: Expansion,
    law: Law,
    times: ArrayLike,
    *,
    velocity: Expansion | None = None,
    source: Expansion | Callable[[float], Expansion] | None = None,
    rim: Any = None,
) -> Evolution:
    """Evolve a series by a law, exactly in time: mode by mode, without steps.

    Parameters
    ----------
    expansion
        The field at time 0; its `closed_part`, if any, is turned into coefficients.
    law
        `Diffusion`, `Wave`, `Paraxial` or `ModalLaw`.
    times
        A number or a one-dimensional array, in any order, in the unit of time of the law (for `Paraxial` a length);
        each is as accurate as the others. Negative ones make sense for beams, for waves without damping, and where a
        `ModalLaw` says so.
    velocity
        For waves: the time derivative at time 0, on the same basis; 0 by default. With `.velocity` of an earlier
        evolution the motion goes on, and with another one it is struck again.
    source
        What is added to the right-hand side: an Expansion, or a function of time (a float, 0 at the start) that returns
        one. A function is resolved in panels of time to rounding, and Duhamel's integral over them is exact; what it
        does between some hundred points between time 0 and the last time, and between `times`, may be overlooked.
    rim
        g in u(R) = g (`FourierBessel`), or in R u'(R) + robin u(R) = g (`Dini`; an ambient value T is g = robin T, a
        flux q into the body g = q R / conductivity): a number, an array over the batch, or a function of time. None is
        g = 0. The solution is right at the rim itself, by closed forms for what the terms left out add up to there.

    Returns
    -------
    Evolution

    Raises
    ------
    TypeError
        For an expansion, law, velocity, source or rim of a wrong kind, and if `source` returns no Expansion.
    ValueError
        For times that are not finite, or negative where the law cannot go back; a velocity for a law of first order in
        time; a velocity or source in another basis; batches that do not fit together; a rim on a basis whose rim
        condition is not known, or for a law whose equation is not.

    Warns
    -----
    TruncationWarning
        Where the series is too short for the earliest time, with the number of terms that would do; where jumps move
        through the field undamped (a wave or beam that starts with a rim value its modes do not have, say), with the L2
        error: nothing is then stated of the largest error; where what drives the modes could not be followed in time.

    Examples
    --------
    A rod at temperature 1 whose surface is held at 0 from time 0 on, after a fifth of R^2/D:

    >>> from fbexpand import FourierBessel, expand
    >>> from fbexpand.evolution import Diffusion, evolve
    >>> rod = expand(lambda r: 1 + 0 * r, FourierBessel(), terms=40)
    >>> later = evolve(rod, Diffusion(1.0), 0.2)
    >>> print(later([0.0, 0.5, 1.0]).round(6))
    [0.501487 0.337974 0.      ]
    >>> heated = evolve(rod * 0.0, Diffusion(1.0), [0.05, 0.2], rim=1.0)
    >>> print(heated([0.0, 0.5, 1.0]).round(6))
    [[0.012901 0.164458 1.      ]
     [0.498513 0.662026 1.      ]]
    """
    as_expansion("expansion", expansion)
    if not isinstance(law, Law):
        raise checks.type_error("law", "a law such as Diffusion(1.0)", law)
    basis = expansion.basis
    named = [("expansion", expansion.batch_shape)]
    terms = expansion.terms
    if velocity is not None:
        on_basis("velocity", velocity, basis)
        named.append(("velocity", velocity.batch_shape))
        terms = max(terms, velocity.terms)
    forced, held = Source(source, basis), RimValue(rim)
    if forced.first is not None:
        named.append(("source", forced.first.batch_shape))
        terms = max(terms, forced.first.terms)
    if held.first is not None:
        named.append(("rim", held.first.shape))
    shape = shared_shape(named)
    law.check_terms(terms)
    motion = law.motion(modes_of(basis, terms))
    when = as_times(times, law, motion.reversible)
    if velocity is not None and motion.order < 2:
        raise ArgumentValueError(f"'velocity' must be None for {law!r} (got {velocity!r})", "velocity", velocity)
    if isinstance(motion, Propagated):
        motion.look(float(when.flat[0]))
    found = driven(motion, basis, shape, when.ravel(), forced, held)
    state = State(
        rows_of(expansion, terms, shape),
        None if velocity is None else rows_of(velocity, terms, shape),
        found.forcing,
        shape,
    )
    evolution = Evolution(law, when, basis, state, found.drive, _tail(expansion, law, state, found.drive), motion)
    if not found.settled:
        worst = float(np.max(found.drive.error(when.ravel()))) if found.drive is not None else 0.0
        warnings.warn(
            f"what drives the modes was not followed in time to rounding: the L2 error by that is near {worst:.3g}",
            TruncationWarning,
            stacklevel=2,
        )
    _warn_if_short(evolution)
    return evolution


def _tail(expansion: Expansion, law: Law, state: State, drive: Drive | ModalDrive | None) -> Tail:
    """Return what the terms left out are known by: what the first field is above the part that the rim holds."""
    basis = expansion.basis
    size = state.displacement.shape[0]
    first = state.displacement
    scale = 0.0
    if drive is not None and drive.rim is not None:
        held = drive.closed(np.zeros(1), size)[0] @ drive.rim.projected
        scale = float(max(np.abs(part * np.sqrt(basis.norms(state.terms))).max() for part in (first, held)))
        first = first - held
    quadrature, table = np.zeros(expansion.batch_shape), np.zeros(expansion.batch_shape)
    for origin in expansion._origins:
        quadrature = quadrature + origin.quadrature
        table = table + origin.table
    errors = tuple(np.broadcast_to(part, state.batch_shape).reshape(-1) for part in (quadrature, table))
    # coefficients that somebody wrote down are taken at their word
    trusted = not np.any(state.displacement) or any(
        origin.panels is not None or origin.left is not None or origin.front for origin in expansion._origins
    )
    left = None
    if len(expansion._origins) == 1 and state.terms == expansion.terms and expansion.closed_part is None:
        left = expansion._origins[0].left
    return Tail(
        basis,
        law,
        first,
        state.velocity,
        errors=(errors[0], errors[1]),
        left=None if left is None else np.broadcast_to(left, state.batch_shape).reshape(-1),
        driven=drive is not None or state.forcing is not None,
        trusted=trusted,
        front=any(origin.front for origin in expansion._origins),
        scale=scale,
    )


def _warn_if_short(evolution: Evolution) -> None:
    """Warn where fronts move about undamped, or where the terms left out still count at the earliest time."""
    times = evolution.times.ravel()
    moving = times[times != 0.0]
    if not moving.size:
        return
    tail = evolution._tail
    if not tail.trusted:
        return
    if tail.driven:
        tail.look_for_fronts(evolution._coefficients(float(moving[np.argmax(np.abs(moving))])))
    earliest = moving[np.argmin(np.abs(moving)) :][:1]
    left = tail.l2(earliest)[0]
    known = np.abs(evolution._coefficients(float(earliest[0])) * np.sqrt(evolution.basis.norms(evolution.terms)))
    norm = np.hypot(np.sqrt(np.sum(known**2, axis=1)), np.where(np.isfinite(left), left, 0.0))
    with np.errstate(divide="ignore", invalid="ignore"):
        share = np.where(norm > 0.0, left / norm, 0.0)
    row = int(np.argmax(share))
    front = tail.front
    if not front and not share[row] > TOO_SHORT:
        return
    needed = float(tail.needed(float(earliest[0]), known, ENOUGH * norm)[row])
    advice = f"{needed:.0f}" if math.isfinite(needed) else f"more than {FARTHEST:.0f} times as many"
    which = f" of field {row} of the batch" if share.size > 1 else ""
    if front:
        message = (
            f"fronts move through the field undamped: the L2 error{which} is near {left[row]:.3g} ({share[row]:.3g} of "
            f"the norm) at all times, and nothing is stated of the largest error"
        )
    else:
        message = (
            f"the series is too short: at time {earliest[0]:.3g} its terms left out{which} have the L2 norm "
            f"{left[row]:.3g} ({share[row]:.3g} of the field's); {advice} terms would bring that to {ENOUGH:.0e}"
        )
    warnings.warn(message, TruncationWarning, stacklevel=3)
