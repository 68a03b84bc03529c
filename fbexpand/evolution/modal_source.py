"""A source under a law that is known by its propagator only: Duhamel's integral by adaptive quadrature.

u_k(t) = integral_0^t P_k(s) f_k(t - s) ds. The fast modes' propagators fall steeply at s = 0, where the intervals are
halved as often as it takes.
"""

from __future__ import annotations

from collections.abc import Callable
from functools import lru_cache

import numpy as np

from fbexpand.evolution.modal import Propagated
from fbexpand.types import FloatArray, Numeric

NODES = 16
TOLERANCE = 1e-14  # of the integral's size, for every interval in proportion to its length
NEGLIGIBLE = 1e-17
DEEPEST = 60
MOST = 1 << 16  # values of the integrand
Weigh = Callable[[Numeric], float]  # the size of an integral


@lru_cache(maxsize=1)
def _rule() -> tuple[FloatArray, FloatArray]:
    return np.polynomial.legendre.leggauss(NODES)


def integrate(function: Callable[[float], Numeric], a: float, b: float, weigh: Weigh) -> tuple[Numeric, float]:
    """Return the integral of function from a to b and an estimate of its error in the measure of `weigh`."""
    x, w = _rule()

    def panel(low: float, high: float) -> Numeric:
        half = 0.5 * (high - low)
        values = [function(float(s)) for s in 0.5 * (low + high) + half * x]
        return np.asarray(half * np.tensordot(w, np.stack(values), axes=1))

    whole = panel(a, b)
    size, total, error, evaluations = weigh(whole), np.zeros_like(whole), 0.0, NODES
    waiting = [(a, b, whole, 0)]
    while waiting:
        low, high, found, depth = waiting.pop()
        middle = 0.5 * (low + high)
        left, right = panel(low, middle), panel(middle, high)
        evaluations += 2 * NODES
        off = weigh(left + right - found)
        size = max(size, weigh(left + right))
        good = off <= TOLERANCE * size * abs(high - low) / abs(b - a) or off <= NEGLIGIBLE * size
        if good or depth >= DEEPEST or evaluations >= MOST:
            total = total + left + right
            error += off
        else:
            waiting += [(middle, high, right, depth + 1), (low, middle, left, depth + 1)]
    return total, error


class ModalDrive:
    """The answer to a source, integrated as it is asked for; nothing is known of the rim."""

    rim = None
    moving = True

    def __init__(
        self, motion: Propagated, source: Callable[[float], Numeric], steady: bool, norms: FloatArray, kind: type
    ) -> None:
        self._motion, self._source, self._steady = motion, source, steady
        self._root_norms = np.sqrt(norms)
        self.is_complex = kind is complex
        self._errors: dict[float, float] = {}

    def _weigh(self, rows: Numeric) -> float:
        return float(np.sqrt(np.sum(np.abs(rows * self._root_norms) ** 2, axis=-1)).max())

    def respond(self, times: FloatArray, velocity: bool, size: int) -> Numeric:
        """Return amplitudes (times, size, terms) from rest."""
        out = np.zeros((times.size, size, self._motion.terms), dtype=np.complex128 if self.is_complex else np.float64)
        if self._steady:
            self._cumulative(times, out)
            return out
        for i, t in enumerate(times.tolist()):
            if t != 0.0:
                out[i], self._errors[t] = integrate(self._integrand(t), 0.0, t, self._weigh)
        return out

    def _integrand(self, t: float) -> Callable[[float], Numeric]:
        return lambda s: self._motion.at(s) * self._source(t - s)

    def _cumulative(self, times: FloatArray, out: Numeric) -> None:
        """Fill in the answers to a steady source, from one time to the next away from 0."""
        source = self._source(0.0)
        for sign in (1.0, -1.0):
            here = np.flatnonzero(times * sign > 0.0)
            before, total, error = 0.0, np.zeros_like(out[0]) if here.size else 0.0, 0.0
            for i in here[np.argsort(np.abs(times[here]))]:
                t = float(times[i])
                if t != before:
                    part, off = integrate(lambda s: self._motion.at(s) * source, before, t, self._weigh)
                    total, error, before = total + part, error + off, t
                out[i] = total
                self._errors[t] = error

    def closed(self, times: FloatArray, size: int, velocity: bool = False) -> Numeric:
        """Return nothing: the equation is not known."""
        return np.zeros((times.size, size, 0))

    def closed_part(self, terms: Numeric) -> None:
        """Return None."""

    def error(self, times: FloatArray) -> FloatArray:
        """Return the L2 error (times,) of the integrals."""
        missing = [t for t in times.tolist() if t != 0.0 and t not in self._errors]
        if missing:
            size = self._source(0.0).shape[0]
            self.respond(np.array(missing), False, size)
        return np.array([self._errors.get(t, 0.0) for t in times.tolist()])
