"""Whether a profile is resolved on a panel: what its Chebyshev coefficients say, each profile on its own scale."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np

from fbexpand.profiles import chebyshev
from fbexpand.profiles.first_look import FirstLook
from fbexpand.types import FloatArray, Numeric

BoolArray = np.ndarray[tuple[int, ...], np.dtype[np.bool_]]

EPS = float(np.finfo(np.float64).eps)
LAST_EIGHTHS = np.array([0, 8, 12])  # of sixteen coefficients: where eight, four and the last four begin
TAIL = 2.0 * EPS  # of the profile on the panel: coefficients that have fallen this far are at rounding
SHARE = 1e-15  # of the profile's L2 norm: what one panel may lack
FLAT = 0.2  # coefficients that fall less than this over eight degrees have reached their noise
ROUNDING = 1e-13  # of the profile on the panel: a plateau below it is rounding in the profile
NOISE = 1e-6  # of the profile: a plateau below it that bisection does not lower is noise
STEADY = 0.3  # bisection lowers the noise by less than this
STEEP = 0.25  # of radius times slope: rounding of the radius shows in f
AGREES = 64.0 * EPS  # of the profile on the panel: rounding in the profile and the polynomial
AGREES_NOISE = 16.0  # times the last coefficients
MISSED = 2e-14  # of norm / radius: a feature this low between two points of the scan does no harm


class Verdict(NamedTuple):
    """Per profile and panel, (size, P)."""

    smooth: BoolArray
    flat: BoolArray  # False throughout where all coefficients have fallen to rounding
    height: FloatArray  # the largest modulus at the panel's points; more where f is steep
    level: FloatArray  # the largest of the last eight coefficients
    residual: FloatArray


class Judge:
    """The largest moduli of the profiles and their L2 norms, (size,), from the first look at them."""

    def __init__(self, scale: FloatArray, on_scan: Numeric, look: FirstLook) -> None:
        self.scale = scale
        squares = np.abs(on_scan)
        squares *= squares  # in range: a sampler's values are of ordinary size
        self.radius = float(look.edges[-1])
        self.norm = np.maximum(np.sqrt(squares @ look.weights), 1e-8 * self.radius * scale)

    def verdict(self, low: FloatArray, high: FloatArray, nodes: Numeric, coefficients: Numeric) -> Verdict:
        """Judge panels by values at their points and coefficients, both (size, P, degrees)."""
        height = np.abs(nodes).max(axis=2)
        end = np.maximum.reduceat(np.abs(coefficients[:, :, -16:]), LAST_EIGHTHS, axis=2)
        last = end[:, :, 2]
        level = np.maximum(end[:, :, 1], last)
        floor = (SHARE * self.norm)[:, None] / np.sqrt(0.5 * (high - low) * (high + low))
        fallen = last <= np.maximum(TAIL * height, floor)
        if fallen.all():
            return Verdict(fallen, ~fallen, height, level, 2.0 * last)
        flat = level >= FLAT * end[:, :, 0]
        height = np.maximum(height, STEEP * high * steepness(nodes, low, high))
        fallen = last <= np.maximum(TAIL * height, floor)
        smooth = fallen | (flat & (level <= ROUNDING * height))
        return Verdict(smooth, flat, height, level, np.where(fallen, 2.0 * last, 6.0 * level))

    def scale_of(self) -> FloatArray:
        """Return the largest modulus of every profile, 1 for a profile of zeros."""
        return np.where(self.scale > 0.0, self.scale, 1.0)

    def allowed(self, height: FloatArray, level: FloatArray) -> FloatArray:
        """Return by how much a resolved polynomial may differ from the profile between its points."""
        most = np.maximum(AGREES * height, AGREES_NOISE * level)
        least = (MISSED / self.radius) * self.norm
        return np.asarray(np.maximum(most, least if most.ndim == 1 else least[:, None]))

    def noise(self, verdict: Verdict, height: FloatArray, level: FloatArray) -> BoolArray:
        """Whether halves look like noise that their wholes had too, (size, P), given the wholes' values."""
        with np.errstate(divide="ignore", invalid="ignore"):
            smaller = np.where(height > 0.0, np.minimum(1.0, verdict.height / height), 1.0)
        low = verdict.level <= NOISE * self.scale[:, None]
        return np.asarray(verdict.flat & low & (verdict.level >= STEADY * level * smaller))


def steepness(nodes: Numeric, low: FloatArray, high: FloatArray) -> FloatArray:
    """Return the median slope |df/dr| from point to point, (size, P): a jump alone leaves it at 0."""
    steps = 0.5 * (high - low)[:, None] * np.diff(chebyshev.points(nodes.shape[2]))
    slopes = np.abs(np.diff(nodes, axis=2)) / steps
    return np.asarray(np.partition(slopes, slopes.shape[2] // 2, axis=2)[:, :, slopes.shape[2] // 2])
