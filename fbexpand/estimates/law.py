"""The error of partial sums from the coefficients alone: their decay, continued.

The orthonormal coefficients b_k of a profile fall in the end as a power of the root: lambda^-1 beside a jump
or where the profile breaks a rim condition on its value, one power faster for every derivative that is
continuous. The envelope of the last half of the coefficients and its slope give the level and the power; the
L2 norm of the terms left out is the sum of the continued squares. Exponential decay looks like a high power
that grows with the window, which errs on the safe side; decay that flattens out (a small defect under a large
smooth part) is read off the last quarters.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from fbexpand.types import FloatArray, Numeric

if TYPE_CHECKING:
    from fbexpand.bases import Basis

BoolArray = np.ndarray[tuple[int, ...], np.dtype[np.bool_]]

EPS = float(np.finfo(np.float64).eps)
NOISE = 64.0 * EPS  # of the largest coefficient: what is below it carries no law
STEEPEST = 60.0
FEWEST = 8  # coefficients from which a slope can be read
FLATTENED = 0.6  # the last quarters fall this much slower than the halves: another law has taken over
JUMP_POWER = 1.25  # coefficients that fall no faster than this belong to a jump: the sup error does not fall
WHOLE = 0.12  # a power this close to a whole number is that number: jumps and rim defects give no others


@dataclass(frozen=True, eq=False)
class Decay:
    """|b_k| is near level (lambda_k / lambda_n)^-power beyond the n coefficients at hand; all (size,).

    Where the fall gets steeper from window to window, `rate` is that of an exponential, |b_k| ~ exp(-rate k),
    else 0. `saturated` marks profiles whose last coefficients are rounding noise, `flattened` those whose
    last quarter follows another law than the rest. `known` is False where there are too few coefficients to
    tell.
    """

    power: FloatArray
    level: FloatArray
    rate: FloatArray
    saturated: BoolArray
    flattened: BoolArray
    terms: int
    known: bool

    def tail(self, terms: float) -> FloatArray:
        """Return the L2 norm of the terms beyond `terms` >= those at hand, (size,); inf where it diverges."""
        n = float(self.terms)
        excess = 2.0 * self.power - 1.0
        with np.errstate(divide="ignore", invalid="ignore", over="ignore", under="ignore"):
            value = self.level * np.sqrt(n / excess) * (n / (terms + 0.5)) ** (0.5 * excess)
        return np.where(self.level == 0.0, 0.0, np.where(excess > 1e-3, value, np.inf))


def decay_of(basis: Basis, coefficients: Numeric) -> Decay:
    """Fit the decay of coefficients (size, terms)."""
    size, terms = coefficients.shape
    b = np.abs(coefficients) * np.sqrt(basis.norms(terms))
    largest = b.max(axis=1)
    noise = NOISE * largest
    if terms < FEWEST:
        level = b[:, -max(1, terms // 2) :].max(axis=1)
        none = np.zeros(size, dtype=bool)
        return Decay(np.ones(size), level, np.zeros(size), level <= noise, none, terms, False)
    roots = np.maximum(basis.roots(terms), 1e-3)
    octaves = [slice(terms // 8, terms // 4), slice(terms // 4, terms // 2), slice(terms // 2, terms)]
    first, early, late = (_rms(b, window) for window in octaves)
    power = _slope(roots, octaves[1:], early, late)
    before = _slope(roots, octaves[:2], first, early)
    saturated = late <= noise
    quarters = [slice(terms // 2, 3 * terms // 4), slice(3 * terms // 4, terms)]
    recent = _slope(roots, quarters, *(_rms(b, window) for window in quarters))
    flattened = (terms >= 16) & ~saturated & (power > 2.0) & (recent < FLATTENED * power)
    power = np.where(flattened, np.maximum(recent, 1.0), power)
    near = np.rint(power)
    power = np.where((np.abs(power - near) < WHOLE) & (near >= 1.0), near, power)
    steepens = (power > 4.0) & (power > 1.4 * before)
    k = np.arange(1.0, terms + 1.0)
    distance = np.mean(k[octaves[2]]) - np.mean(k[octaves[1]])
    with np.errstate(divide="ignore", invalid="ignore"):
        rate = np.where(
            steepens, np.nan_to_num(np.log(early / late), nan=0.0, posinf=STEEPEST) / distance, 0.0
        )
    shape = roots / roots[-1]
    with np.errstate(under="ignore"):
        half = (b[:, octaves[2]] * shape[octaves[2]] ** power[:, None]).max(axis=1)
        quarter = (b[:, quarters[1]] * shape[quarters[1]] ** power[:, None]).max(axis=1)
    level = np.where(saturated, late, np.where(flattened, quarter, half))
    return Decay(np.where(saturated, STEEPEST, power), level, rate, saturated, flattened, terms, True)


def _rms(b: FloatArray, window: slice) -> FloatArray:
    part = b[:, window]
    unit = part.max(axis=1, keepdims=True)
    unit = np.where(unit > 0.0, unit, 1.0)
    return np.asarray(unit[:, 0] * np.sqrt(np.mean((part / unit) ** 2, axis=1)))


def _slope(roots: FloatArray, windows: list[slice], first: FloatArray, second: FloatArray) -> FloatArray:
    """Return the power of lambda by which the level falls from the first window to the second."""
    distance = np.mean(np.log(roots[windows[1]])) - np.mean(np.log(roots[windows[0]]))
    with np.errstate(divide="ignore", invalid="ignore"):
        drop = np.log(first / second)
    # nothing left in the second window: as steep as can be; nothing in the first: no fall at all
    fall = np.nan_to_num(drop, nan=0.0, posinf=np.inf, neginf=0.0) / distance
    return np.asarray(np.clip(fall, 0.0, STEEPEST))
