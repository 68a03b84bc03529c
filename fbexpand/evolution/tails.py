"""What the terms left out are at a later time: the decay of the first coefficients, continued and damped by the law."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from functools import cached_property
from typing import TYPE_CHECKING

import numpy as np

from fbexpand.estimates.extrapolation import SAFETY
from fbexpand.estimates.law import JUMP_POWER, Decay, decay_of
from fbexpand.estimates.origin import Origin
from fbexpand.evolution.motion import Motion
from fbexpand.evolution.spectrum import Modes, chosen_modes, modes_of
from fbexpand.expansion import Expansion
from fbexpand.types import FloatArray, Numeric

if TYPE_CHECKING:
    from fbexpand.bases import Basis
    from fbexpand.evolution.laws import Law
    from fbexpand.lifting.closed_part import ClosedPart

SINGLE = 64  # modes beyond the last that are looked at one by one
RATIO = 1.06  # of the blocks further out
FARTHEST = 1e3  # times the terms at hand
AT_ONCE = 1 << 20
ROUNDING = 1e-11
NOTHING = 1e-30  # of the sum of squares


@dataclass(frozen=True, eq=False)
class Sample:
    """Blocks of modes beyond those at hand: the middle of each and how many modes it stands for."""

    modes: Modes
    share: FloatArray
    last: float  # index of the last mode that belongs to a block


def sample_of(basis: Basis, terms: int) -> Sample:
    """Cut the modes beyond `terms` into blocks, the first ones single."""
    edges = [float(terms + i) for i in range(SINGLE + 1)]
    while edges[-1] < FARTHEST * terms:
        edges.append(math.ceil(edges[-1] * RATIO))
    low, high = np.array(edges[:-1]), np.array(edges[1:])
    middle = np.maximum(np.rint(np.sqrt((low + 1.0) * high)), low + 1.0).astype(np.int64)
    return Sample(chosen_modes(basis, middle), high - low, edges[-1])


class Tail:
    """The orthonormal coefficients beyond `terms` of an evolution, predicted.

    `displacement` and `velocity` (size, terms) are the coefficients whose decay is continued: those of what the first
    field is above the part that a driven rim holds.
    """

    def __init__(
        self,
        basis: Basis,
        law: Law,
        displacement: Numeric,
        velocity: Numeric | None,
        *,
        errors: tuple[FloatArray, FloatArray],
        left: FloatArray | None = None,
        driven: bool = False,
        trusted: bool = True,
        front: bool = False,
        scale: float = 0.0,
    ) -> None:
        self.basis = basis
        self.law = law
        self.terms = int(displacement.shape[-1])
        self._scale = scale
        self._decay = self._above_rounding(decay_of(basis, displacement))
        self._speed = None if velocity is None else decay_of(basis, velocity)
        self._left = left
        self._errors = errors
        self.driven = driven
        self.trusted = trusted and self._decay.known
        self._front = front

    def _above_rounding(self, decay: Decay) -> Decay:
        """Take coefficients for 0 that are the rounding of what was subtracted, whose size is `scale`."""
        return replace(decay, level=np.where(decay.level > ROUNDING * self._scale, decay.level, 0.0))

    @cached_property
    def sample(self) -> Sample:
        """The modes looked at."""
        return sample_of(self.basis, self.terms)

    @cached_property
    def _moving(self) -> Motion:
        return self.law.motion(self.sample.modes)

    def _gain(self, times: FloatArray) -> FloatArray:
        """Return what the law makes of each mode at most, (times, modes)."""
        if self._moving.equation:
            return self._moving.gain(times)
        # a propagator of the user's own may know the terms at hand only: those beyond are taken to be as the last
        last = self.law.motion(modes_of(self.basis, self.terms)).gain(times)[:, -1:]
        return np.broadcast_to(last, (times.size, self.sample.share.size))

    @cached_property
    def front(self) -> bool:
        """Whether a jump, or a rim value that the modes do not have, moves about in the field undamped."""
        return self._keeps_fronts and (self._front or (self.trusted and has_front(self._decay)))

    @property
    def _velocity_jumps(self) -> bool:
        """Whether jumps move about in the velocity: its own first ones, or a kink of the displacement."""
        return self.trusted and (has_front(self._decay, 1.0) or (self._speed is not None and has_front(self._speed)))

    @property
    def _keeps_fronts(self) -> bool:
        return self._moving.order == 2 or self._moving.is_complex

    def look_for_fronts(self, coefficients: Numeric) -> None:
        """Note a front in coefficients (size, terms) of a later time, where something drives the modes."""
        if self._keeps_fronts and has_front(self._above_rounding(decay_of(self.basis, coefficients))):
            self.__dict__["front"] = True

    def moduli(self, times: FloatArray, velocity: bool = False) -> FloatArray:
        """Return |b_k| of the modes looked at, (times, size, modes)."""
        gain = self._gain(times)[:, None, :]
        roots = self.sample.modes.high / self.sample.modes.radius
        found = self._first(self._decay) * gain
        if velocity and self._moving.order == 2:
            found = found * abs(self._moving.flux) ** 0.5 * roots
        if self._speed is not None:
            speed = self._first(self._speed)
            with np.errstate(divide="ignore"):
                each = 1.0 if velocity else np.minimum(np.abs(times)[:, None], self._period(roots))[:, None, :]
            found = np.hypot(found, speed * gain * each)
        return np.asarray(found)

    def _period(self, roots: FloatArray) -> FloatArray:
        with np.errstate(divide="ignore"):
            return np.asarray(1.0 / (abs(self._moving.flux) ** 0.5 * roots))

    def _first(self, decay: Decay) -> FloatArray:
        """Return |b_k| at time 0, (size, modes)."""
        index = self.sample.modes.number
        power = np.exp(np.log((self.terms) / index) * decay.power[:, None])
        rate = np.exp(-decay.rate[:, None] * (index - self.terms))
        found = decay.level[:, None] * np.where(decay.rate[:, None] > 0.0, rate, power)
        if self._left is None or decay is not self._decay:
            return SAFETY * found
        square = np.sum(found**2 * self.sample.share, axis=1)
        with np.errstate(divide="ignore", invalid="ignore"):
            scale = np.where(square > 0.0, self._left / np.sqrt(square), 0.0)
        return found * scale[:, None]

    def squares(self, times: FloatArray, velocity: bool = False) -> FloatArray:
        """Return the sums of |b_k|^2 over the blocks, (times, size, blocks); the last has all beyond it, too."""
        squares = self.moduli(times, velocity) ** 2 * self.sample.share
        density = squares[..., [-12, -1]] / self.sample.share[[-12, -1]]
        with np.errstate(divide="ignore", invalid="ignore"):  # it goes on falling as the last blocks do
            ratio = np.log(self.sample.modes.number[-1] / self.sample.modes.number[-12])
            power = np.log(density[..., 0] / density[..., 1]) / ratio
            rest = np.where(power > 1.02, density[..., 1] * self.sample.last / (power - 1.0), np.inf)
        squares[..., -1] += np.where(density[..., 1] <= NOTHING * squares.sum(axis=-1), 0.0, rest)
        return np.asarray(squares)

    def l2(self, times: FloatArray, velocity: bool = False) -> FloatArray:
        """Return the L2 norm of the terms left out, (times, size); inf where it diverges."""
        size = self._decay.level.size
        result = np.empty((times.size, size))
        step = max(1, AT_ONCE // (size * self.sample.share.size))
        for low in range(0, times.size, step):
            result[low : low + step] = np.sqrt(self.squares(times[low : low + step], velocity).sum(axis=-1))
        return result

    def series(
        self,
        coefficients: Numeric,
        times: FloatArray,
        velocity: bool,
        closed_part: ClosedPart | None,
        error: FloatArray | None,
    ) -> Expansion:
        """Return the series of coefficients (*times.shape, *batch, terms) with what it rests on.

        Where something drives the modes the decay of their own coefficients tells what is left out. `error` (times,)
        is that of the integral of a source in time.
        """
        shape = coefficients.shape[:-1]
        flat = times.ravel()
        grown = self._grown(flat)[:, None]
        quadrature, table = (_times(part, grown) for part in self._errors)
        if error is not None:
            quadrature = quadrature + _times(error[:, None], grown)
        left = None if self.driven else self.l2(flat, velocity).reshape(shape)
        front = self.front or (velocity and self._velocity_jumps)
        origin = Origin(coefficients, None, quadrature.reshape(shape), table.reshape(shape), left, front=front)
        return Expansion._derive(self.basis, coefficients, (origin,), 0, closed_part)

    def _grown(self, times: FloatArray) -> FloatArray:
        """Return how much an error in the coefficients has grown at most, (times,)."""
        motion = self._moving
        if not self.basis.growing and (motion.is_complex or motion.equation):
            return np.ones(times.size)
        found = np.empty(times.size)
        first = self.law.motion(modes_of(self.basis, 1 if motion.equation else self.terms))
        step = max(1, AT_ONCE // first.terms)
        for low in range(0, times.size, step):
            found[low : low + step] = first.gain(times[low : low + step]).max(axis=1)
        return np.maximum(found, 1.0)

    @cached_property
    def falls_too_slowly(self) -> bool:
        """Whether the largest error does not settle with the number of terms: nothing damps a jump."""
        return self._keeps_fronts and has_front(self._decay)

    def needed(self, time: float, known: FloatArray, limit: FloatArray) -> FloatArray:
        """Return the least n whose L2 error at `time` stays below `limit` (size,); inf beyond the blocks looked at.

        `known` are the moduli of the orthonormal coefficients at hand at that time, (size, terms).
        """
        return least(*self.tails(time, known), self.sample, limit)

    def tails(self, time: float, known: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Return the L2 errors after 0, 1, ..., terms terms (size, terms + 1) and before each block (size, blocks)."""
        squares = self.squares(np.array([time]))[0]
        beyond = np.sqrt(np.cumsum(squares[:, ::-1], axis=1)[:, ::-1])
        total = np.zeros((known.shape[0], self.terms + 1))
        total[:, :-1] = np.cumsum(known[:, ::-1] ** 2, axis=1)[:, ::-1]
        return np.sqrt(total + beyond[:, :1] ** 2), beyond


def _times(error: FloatArray, growth: FloatArray) -> FloatArray:
    """Return error * growth; nothing grows to nothing, also where the growth is infinite."""
    with np.errstate(invalid="ignore", over="ignore"):
        return np.where(error == 0.0, 0.0, error * growth)


def has_front(decay: Decay, derivatives: float = 0.0) -> bool:
    """Whether coefficients, or those of a derivative of the field, fall no faster than those of a jump."""
    broken = decay.known & (decay.power - derivatives < JUMP_POWER) & ~decay.saturated & (decay.level > 0.0)
    return bool(np.any(broken))


def least(errors: FloatArray, beyond: FloatArray, sample: Sample, limit: FloatArray) -> FloatArray:
    """Return the least n from which on the error stays below `limit`, (size,); inf beyond the blocks of the sample.

    `errors` are those after 0, 1, ..., terms terms, (size, terms + 1), `beyond` those before each block (size, blocks).
    """
    terms = errors.shape[1] - 1
    answer = np.empty(errors.shape[0])
    starts = np.concatenate(([terms], np.cumsum(sample.share) + terms))
    for row in range(errors.shape[0]):
        if errors[row, -1] <= limit[row]:
            over = np.flatnonzero(errors[row, 1:] > limit[row])
            answer[row] = 1 if over.size == 0 else 2 + int(over[-1])
            continue
        reached = np.flatnonzero(beyond[row] <= limit[row])
        if not reached.size:
            answer[row] = math.inf
            continue
        place = int(reached[0])
        low, high = (starts[place - 1], starts[place]) if place else (terms, terms)
        above, below = beyond[row, place - 1] if place else errors[row, -1], beyond[row, place]
        share = 1.0  # within the block the tail falls about exponentially
        if 0.0 < below < above < math.inf:
            share = math.log(above / limit[row]) / math.log(above / below)
        answer[row] = math.ceil(low + max(min(share, 1.0), 0.0) * (high - low))
    return answer
