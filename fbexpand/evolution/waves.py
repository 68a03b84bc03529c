"""The motion of damped waves, exact through critical damping and free of overflow.

With w = c lambda / R, damping 2g, S = exp(-g t) sin(omega t) / omega and C = exp(-g t) cos(omega t), omega^2 = w^2 -
g^2 (sigma^2 = -omega^2 where that is negative): u = (C + g S) u0 + S v0, u' = -w^2 S u0 + (C - g S) v0. A steady
source f adds Q f, Q the integral of S. Overdamped, C and S are written with the slower exponent a = sigma - g, which is
-w^2 / (g + sigma), and exp(-2 sigma t), so that they neither overflow nor cancel; where the mode grows, exp(a t) is
kept apart.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from fbexpand.evolution.motion import Motion, Parts, circle, growth_of
from fbexpand.evolution.spectrum import Modes
from fbexpand.kernels.propagate import wave_rates
from fbexpand.types import FloatArray, IntArray, Numeric

SMALL = 2.0  # (damping + w) t up to which the source's factor is summed as a Taylor series
TAYLOR = 36


@dataclass
class _Factors:
    """S, C + g S and C - g S, each (times, modes); those of the first mode without its growth."""

    swing: FloatArray
    state: FloatArray
    speed: FloatArray


class Swing(Motion):
    """u'' + damping u' = -w^2 u."""

    order = 2

    def __init__(self, modes: Modes, speed: float, damping: FloatArray) -> None:
        super().__init__(modes)
        self._speed = speed
        self._g = np.ascontiguousarray(0.5 * damping)
        self._rates = np.empty((6, self.terms))
        wave_rates(speed, modes.radius, modes.high, modes.low, modes.growing, self._g, self._rates)
        self._swinging = np.flatnonzero(self._rates[1] == 0.0)
        self._others = np.flatnonzero(self._rates[1] != 0.0)
        self._grows = bool(modes.growing and self._rates[4, 0] > 0.0)
        sign = np.ones(self.terms)
        sign[: modes.growing] = -1.0
        with np.errstate(over="ignore", under="ignore"):
            self._square = sign * self._rates[0] ** 2
        self.reversible = not np.any(self._g)
        self._common = bool(np.all(self._g == self._g[0]))

    @property
    def equation(self) -> list[Numeric]:
        """Return w^2, the damping and 1."""
        return [self._square, 2.0 * self._g, np.ones(self.terms)]

    @property
    def exponents(self) -> tuple[Numeric, Numeric]:
        """The slower and the faster exponent; w for both where they are complex."""
        swings = self._rates[1] == 0.0
        low = np.where(swings, self._rates[0], self._rates[4])
        return low, np.where(swings, self._rates[0], -(self._g + self._rates[2]))

    @property
    def flux(self) -> float:
        """The square of the speed."""
        return self._speed**2

    @property
    def operator(self) -> list[float] | None:
        """Return 0, the damping and 1; None where the damping differs from mode to mode."""
        return [0.0, 2.0 * float(self._g[0]), 1.0] if self._common else None

    def parts(self, times: FloatArray, *, speed: bool = False, source: bool = False, velocity: bool = False) -> Parts:
        """Return the factors of displacement, or of velocity; see `Motion`."""
        growth = growth_of(np.abs(times), self._rates[4, 0], self._rates[5, 0]) if self._grows else None
        if self._swinging.size == self.terms and not (np.any(self._g) or speed or source or velocity):
            return Parts(circle(times, self._rates[2:4])[0], None, None, growth)
        found = self._factors(times)
        if velocity:
            return Parts(-self._square * found.swing, found.speed, found.swing, growth)
        return Parts(found.state, found.swing, self._settled(times, found) if source else None, growth)

    def gain(self, times: FloatArray) -> FloatArray:
        """Return the envelope of what a unit displacement may have become, its phase left out."""
        gain = np.empty((times.size, self.terms))
        i = self._swinging
        t, g = np.abs(times)[:, None], self._g[i]
        with np.errstate(under="ignore"):
            gain[:, i] = np.exp(-g * t) * np.minimum(np.hypot(1.0, g / self._rates[2, i]), 1.0 + g * t)
        if self._others.size:
            gain[:, self._others] = super().gain(times)[:, self._others]
        return gain

    def _factors(self, times: FloatArray) -> _Factors:
        shape = (times.size, self.terms)
        found = _Factors(np.empty(shape), np.empty(shape), np.empty(shape))
        if self._swinging.size == self.terms:
            found.swing, found.state, found.speed = self._swinging_factors(times, np.arange(self.terms))
            return found
        if self._swinging.size:
            i = self._swinging
            found.swing[:, i], found.state[:, i], found.speed[:, i] = self._swinging_factors(times, i)
        i = self._others
        found.swing[:, i], found.state[:, i], found.speed[:, i] = self._damped_factors(times, i)
        return found

    def _swinging_factors(self, times: FloatArray, i: IntArray) -> tuple[FloatArray, FloatArray, FloatArray]:
        whole = i.size == self.terms
        rates = self._rates[2:4] if whole else np.ascontiguousarray(self._rates[2:4, i])
        cosine, sine = circle(times, rates)
        g = self._g[i]
        np.divide(sine, rates[0], out=sine)
        if not g.any():
            return sine, cosine, cosine
        with np.errstate(under="ignore"):
            fall = np.exp(-g[0] * times)[:, None] if self._common else np.exp(np.multiply.outer(times, -g))
            sine *= fall
            cosine *= fall
            part = g * sine
        return sine, cosine + part, cosine - part

    def _damped_factors(self, times: FloatArray, i: IntArray) -> tuple[FloatArray, FloatArray, FloatArray]:
        t = np.abs(times)[:, None]
        g, sigma, slow = self._g[i], self._rates[2, i], self._rates[4, i]
        fast = -(g + sigma)
        grows = np.zeros(i.size, dtype=bool)
        if self._grows:
            grows[i == 0] = True
        with np.errstate(under="ignore", over="ignore", divide="ignore", invalid="ignore"):
            slower = np.exp(np.where(grows, 0.0, slow) * t)
            z = 2.0 * sigma * t
            rest = np.exp(-z)
            lost = -np.expm1(-z)
            swing = slower * np.where(z < 1e-8, t * (1.0 - 0.5 * z), lost / (2.0 * sigma))
            middle = slower * (1.0 - 0.5 * lost)
            state = middle + g * swing
            speed = np.where(z < 2.0, middle - g * swing, slower * (slow - fast * rest) / (2.0 * sigma))
        return np.where(times[:, None] < 0.0, -swing, swing), state, speed

    def _settled(self, times: FloatArray, found: _Factors) -> FloatArray:
        """Return Q, the integral of S from 0 to t; the first mode's without its growth."""
        t = np.abs(times)[:, None]
        g, w, square = self._g, self._rates[0], self._square
        with np.errstate(divide="ignore", invalid="ignore", over="ignore", under="ignore"):
            result = (1.0 - found.state) / square
            small = (2.0 * g + w) * t <= SMALL
            i = self._others
            if i.size:
                sigma, slow = self._rates[2, i], self._rates[4, i]
                fast = -(g[i] + sigma)
                apart = np.where(slow == 0.0, t, np.expm1(np.minimum(slow * t, 0.0)) / slow)
                other = np.where(fast == 0.0, t, np.expm1(fast * t) / fast)
                if self._grows:
                    fall = np.exp(-slow[0] * t[:, 0])
                    apart[:, 0] = -np.expm1(-slow[0] * t[:, 0]) / slow[0]
                    other[:, 0] *= fall
                early = (2.0 * sigma * t >= 0.5) & (slow * t > -1.0)  # the state is still near 1, or grows
                result[:, i] = np.where(early, (apart - other) / (2.0 * sigma), result[:, i])
        if small.any():
            row, column = np.nonzero(small)
            near = self._taylor(t[row, 0], column)
            if self._grows:
                first = column == 0
                near[first] *= np.exp(-self._rates[4, 0] * t[row[first], 0])
            result[row, column] = near
        return np.asarray(result)

    def _taylor(self, t: FloatArray, j: IntArray) -> FloatArray:
        """Sum Q'' + damping Q' + w^2 Q = 1 as a Taylor series for pairs (t, mode)."""
        a, b = 2.0 * self._g[j] * t, self._square[j] * t * t
        before, last = np.zeros_like(t), 0.5 * np.ones_like(t)
        total = last.copy()
        for n in range(3, TAYLOR):
            before, last = last, -(a * (n - 1) * last + b * before) / (n * (n - 1))
            total += last
        return np.asarray(total * t * t)
