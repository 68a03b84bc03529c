"""Whether a profile is resolved on a panel: what its Chebyshev coefficients say, each profile on its own scale."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np

from fbexpand.profiles import chebyshev
from fbexpand.profiles.first_look import FirstLook
from fbexpand.types import FloatArray, Numeric

BoolArray = np.ndarray[tuple[int, ...], np.dtype[np.bool_]]

EPS = float(np.finfo(np.float64).eps)
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
    flat: BoolArray
    height: FloatArray  # the largest modulus at the panel's points; more where f is steep
    level: FloatArray  # the largest of the last eight coefficients
    residual: FloatArray


class Judge:
    """Scales of the profiles, (size,), from the first look at them."""

    def __init__(self, values: Numeric, on_scan: Numeric, look: FirstLook) -> None:
        moduli = np.abs(on_scan)
        self.scale = np.abs(values).max(axis=1)
        unit = np.where(self.scale > 0.0, self.scale, 1.0)
        square = (moduli / unit[:, None]) ** 2 @ look.weights
        self.radius = float(look.edges[-1])
        self.norm = np.maximum(unit * np.sqrt(square), 1e-8 * self.scale * self.radius)

    def verdict(self, low: FloatArray, high: FloatArray, nodes: Numeric, coefficients: Numeric) -> Verdict:
        """Judge panels by values at their points and coefficients, both (size, P, degrees)."""
        height = np.abs(nodes).max(axis=2)
        eighths = np.abs(coefficients[:, :, -16:]).reshape(*height.shape, 4, 4).max(axis=3)
        last = eighths[:, :, 3]
        level = np.maximum(eighths[:, :, 2], last)
        floor = (SHARE * self.norm)[:, None] / np.sqrt(0.5 * (high - low) * (high + low))
        smooth = fallen = last <= np.maximum(TAIL * height, floor)
        flat = level >= FLAT * np.maximum(eighths[:, :, 0], eighths[:, :, 1])
        if not fallen.all():
            height = np.maximum(height, STEEP * high * steepness(nodes, low, high))
            fallen = last <= np.maximum(TAIL * height, floor)
            smooth = fallen | (flat & (level <= ROUNDING * height))
        return Verdict(smooth, flat, height, level, np.where(fallen, 2.0 * last, 6.0 * level))

    def allowed(self, height: FloatArray, level: FloatArray) -> FloatArray:
        """Return by how much a resolved polynomial may differ from the profile between its points."""
        most = np.maximum(AGREES * height, AGREES_NOISE * level)
        return np.asarray(np.maximum(most, (MISSED / self.radius) * self.norm.reshape(-1, *([1] * (most.ndim - 1)))))

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
