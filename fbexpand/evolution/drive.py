"""What drives the modes from outside: a steady or moving source, a held or moving rim, and what both leave at the rim.

Everything is an amplitude forcing F_k(t) = f_k(t) + flux rho_k g(t) (see `rim`). What is steady goes into the motion's
own closed forms; what moves is resolved in panels of time and answered panel by panel (see `response`), from rest.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from functools import cached_property
from typing import TYPE_CHECKING, Any

import numpy as np

from fbexpand.evolution.motion import Motion
from fbexpand.evolution.panels import COUNT, TimePanels, derivative
from fbexpand.evolution.response import Response, at, moved
from fbexpand.evolution.rim import MOST, Rim
from fbexpand.types import FloatArray, Numeric

NOISE = 1e-15  # of the largest coefficient: what is below it is rounding, and would grow in the derivatives
if TYPE_CHECKING:
    from fbexpand.lifting.closed_part import ClosedPart

KEPT = 8  # responses and particular solutions kept


@dataclass(eq=False)
class Side:
    """The answer on one side of time 0: panels from 0 on, in the direction of `sign`."""

    motion: Motion
    panels: TimePanels
    size: int
    sign: float
    rim: Rim | None
    force: Numeric  # (panels, COUNT, size, terms), the time running away from 0
    rim_terms: Numeric | None  # (panels, COUNT, size, MOST)
    _responses: dict[float, Response] = field(default_factory=dict)
    _solutions: dict[int, list[Numeric]] = field(default_factory=dict)

    @cached_property
    def states(self) -> list[list[Numeric]]:
        """The state (size, terms) and its derivatives at the start of every panel."""
        motion = self.motion
        zero = np.zeros((self.size, motion.terms), dtype=self.force.dtype)
        states = [[zero] * motion.order]
        edges = self.panels.edges
        for i in range(edges.size - 2):
            length = np.array([self.sign * (edges[i + 1] - edges[i])])
            answers = self._solution(i)
            start = self._above(states[i], answers)
            end = [sum_of(answer) for answer in answers]
            after = [moved(motion, start, length)[0]]
            if motion.order == 2:
                after.append(moved(motion, start, length, velocity=True)[0])
            states.append([a + b for a, b in zip(after, end, strict=True)])
        return states

    def _above(self, state: list[Numeric], answers: list[Numeric]) -> list[Numeric]:
        """Return what a state is above the particular solution at the start of its panel."""
        first = np.array([-1.0])
        return [a - at(answer, first)[0] for a, answer in zip(state, answers, strict=True)]

    def _solution(self, i: int) -> list[Numeric]:
        """Return the particular solution on panel i and its derivatives, in the law's own time."""
        found = self._solutions.get(i)
        if found is None:
            half = 0.5 * float(self.panels.edges[i + 1] - self.panels.edges[i])
            response = self._responses.get(half)
            if response is None:
                if len(self._responses) >= KEPT:
                    self._responses.pop(next(iter(self._responses)))
                response = self._responses[half] = Response(self.motion, self.sign * half)
            found = response.particular(self.force[i])
            if len(self._solutions) >= KEPT:
                self._solutions.pop(next(iter(self._solutions)))
            self._solutions[i] = found
        return found

    def respond(self, times: FloatArray, velocity: bool) -> Numeric:
        """Return amplitudes (times, size, terms) from rest, or their time derivatives."""
        kind = np.result_type(self.force, *self.motion.equation)
        out = np.empty((times.size, self.size, self.motion.terms), dtype=kind)
        place, x, since = self._places(times)
        for i in np.unique(place):
            here = np.flatnonzero(place == i)
            answers = self._solution(int(i))
            start = self._above(self.states[int(i)], answers)
            part = moved(self.motion, start, self.sign * since[here], velocity=velocity)
            out[here] = part + at(answers[1 if velocity else 0], x[here])
        return out

    def terms_at(self, times: FloatArray, velocity: bool) -> Numeric:
        """Return the rim terms (times, size, MOST), or their time derivatives."""
        if self.rim_terms is None:
            return np.zeros((times.size, self.size, MOST))
        out = np.empty((times.size, self.size, MOST), dtype=self.rim_terms.dtype)
        place, x, _ = self._places(times)
        for i in np.unique(place):
            here = np.flatnonzero(place == i)
            terms = self.rim_terms[i]
            if velocity:
                terms = derivative(terms, 0.5 * self.sign * float(self.panels.edges[i + 1] - self.panels.edges[i]))
            out[here] = at(terms, x[here])
        return out

    def error(self, times: FloatArray, held: float) -> FloatArray:
        """Return the L2 error (times,) by what the panels do not follow; `held` is that of a rim value off by 1."""
        lengths = np.diff(self.panels.edges)
        place, _, _ = self._places(times)
        sources = np.cumsum(self.panels.errors[:, 0] * lengths)
        rims = np.maximum.accumulate(self.panels.errors[:, 1])
        t = np.abs(times)
        if self.motion.order == 2:  # a source acts for the rest of the time; a rim sends waves
            return np.asarray(sources[place] * t + held * rims[place] * (1.0 + t * abs(self.motion.flux) ** 0.5))
        return np.asarray(sources[place] + held * rims[place])

    def _places(self, times: FloatArray) -> tuple[np.ndarray[Any, Any], FloatArray, FloatArray]:
        """Return the panel of each time, its place in it from -1 to 1, and the time since its start."""
        t = np.abs(times)
        edges = self.panels.edges
        place = np.clip(np.searchsorted(edges, t, side="left") - 1, 0, edges.size - 2)
        low, high = edges[place], edges[place + 1]
        x = ((t - low) - (high - t)) / (high - low)
        return place, np.clip(x, -1.0, 1.0), t - low


def sum_of(coefficients: Numeric) -> Numeric:
    """Return the value of Chebyshev series (degrees, ...) at the end of their panel."""
    return np.asarray(coefficients.sum(axis=0))


def rim_terms_of(motion: Motion, radius: float, value: Numeric, source: Numeric, half: float) -> Numeric:
    """Return B (R^2 lap)^i u, (COUNT, size, MOST), on a panel from those of g (COUNT, size) and f (COUNT, size, MOST).

    flux lap u = (b_0 + b_1 D + ...) u - f gives each from the one before. In the terms left out each counts with the
    last root to the power -2i: from the first on that counts more than the one before, the series is of no use.
    """
    operator = motion.operator
    scale = radius**2 / motion.flux
    kind = np.result_type(value, source, np.asarray(scale))
    out = np.zeros((COUNT, value.shape[1], MOST), dtype=kind)
    out[:, :, 0] = value
    if operator is None:
        return out
    size = np.abs(value)
    current: Numeric = np.where(size > NOISE * size.max(axis=0), value, 0.0).astype(kind)
    last = max(float(motion.modes.high[-1]), 1.0)
    before = np.abs(value).sum(axis=0)
    for i in range(1, MOST):
        changed, level = operator[0] * current, current
        for b in operator[1:]:
            level = derivative(level, half)
            changed = changed + b * level
        current = scale * (changed - source[:, :, i - 1])
        counts = np.abs(current).sum(axis=0) / last ** (2 * i)
        if i > 1 or not np.any(source):
            current = np.where(counts <= before, current, 0.0)
        before = np.where(counts <= before, counts, 0.0) if i > 1 else counts
        out[:, :, i] = current
    return out


class Drive:
    """Steady rim terms and the sides of what moves; either may be missing."""

    def __init__(
        self,
        motion: Motion,
        rim: Rim | None,
        steady: Numeric | None,
        sides: list[Side],
    ) -> None:
        self._motion = motion
        self.rim = rim
        self._steady = steady  # (size, MOST)
        self.sides = sides

    @property
    def moving(self) -> bool:
        """Whether anything is resolved in time."""
        return bool(self.sides)

    @property
    def is_complex(self) -> bool:
        """Whether any of it is complex."""
        moving = any(np.iscomplexobj(side.force) for side in self.sides)
        return moving or self._motion.is_complex or (self._steady is not None and np.iscomplexobj(self._steady))

    def _split(self, times: FloatArray) -> list[tuple[np.ndarray[Any, Any], Side]]:
        pairs = []
        for side in self.sides:
            here = np.flatnonzero((times < 0.0) == (side.sign < 0.0))
            if here.size:
                pairs.append((here, side))
        return pairs

    def respond(self, times: FloatArray, velocity: bool, size: int) -> Numeric:
        """Return amplitudes (times, size, terms) that what moves has brought about from rest."""
        kind = np.complex128 if self.is_complex else np.float64
        out = np.zeros((times.size, size, self._motion.terms), dtype=kind)
        for here, side in self._split(times):
            out[here] = side.respond(times[here], velocity)
        return out

    def closed(self, times: FloatArray, size: int, velocity: bool = False) -> Numeric:
        """Return the rim terms, (times, size, MOST), or their time derivatives."""
        kind = np.complex128 if self.is_complex else np.float64
        terms = np.zeros((times.size, size, MOST), dtype=kind)
        if self._steady is not None and not velocity:
            terms += self._steady
        for here, side in self._split(times):
            terms[here] += side.terms_at(times[here], velocity)
        return terms

    def closed_part(self, terms: Numeric) -> ClosedPart | None:
        """Return the sum of the powers that rim terms (..., MOST) stand for."""
        if self.rim is None:
            return None
        return self.rim.closed_part(terms)

    def error(self, times: FloatArray) -> FloatArray:
        """Return the L2 error (times,) by what is not followed in time."""
        found = np.zeros(times.size)
        held = 0.0 if self.rim is None else self.rim.reach
        for here, side in self._split(times):
            found[here] = side.error(times[here], held)
        return found
