"""What the two bases share: arguments checked, radii in two parts, modes from the kernels."""

from __future__ import annotations

from dataclasses import replace
from typing import Any, ClassVar, Self

import numpy as np

from fbexpand import checks
from fbexpand.bases.spectrum import Spectrum, spectrum_of
from fbexpand.exceptions import ArgumentValueError
from fbexpand.kernels.modes import MAX_DERIVATIVE, plain_modes, radii_two_part, rim_modes
from fbexpand.special.bessel import table_of
from fbexpand.special.modified import rim_scaled
from fbexpand.special.norms import RATIO, SCALED_J
from fbexpand.special.roots import MAX_INDEX, MAX_ORDER
from fbexpand.types import ArrayLike, FloatArray

EDGE = 1.0 + 4.0 * float(np.finfo(np.float64).eps)  # radii up to this times the radius are inside
SMALLEST, LARGEST = 1e-150, 1e150  # radii whose square, and its inverse, are ordinary doubles


class RadialBasis:
    """Roots, eigenvalues, norms and modes of a basis whose rim condition the subclass names."""

    order: float
    radius: float
    _names: ClassVar[tuple[str, ...]] = ("order", "radius")

    def _check(self) -> None:
        """Check order and radius; the fields of a frozen dataclass are set once, here."""
        order = checks.non_negative("order", self.order)
        if order > MAX_ORDER:
            raise checks.value_error("order", f"at most {MAX_ORDER:g}", self.order)
        object.__setattr__(self, "order", order)
        radius = checks.positive("radius", self.radius)
        if not SMALLEST <= radius <= LARGEST:
            raise checks.value_error("radius", f"within [{SMALLEST:g}, {LARGEST:g}]", self.radius)
        object.__setattr__(self, "radius", radius)

    @property
    def _condition(self) -> float:
        """The Robin coefficient; inf for f(R) = 0."""
        raise NotImplementedError

    @property
    def _spectrum(self) -> Spectrum:
        return spectrum_of(self.order, self._condition)

    @property
    def key(self) -> tuple[Any, ...]:
        """Equal for equal bases: the class's name and the parameters."""
        return (type(self).__name__, *(getattr(self, name) for name in self._names))

    @property
    def unit(self) -> Self:
        """The same basis on the radius 1: modes at r / R and coefficients are the same."""
        return self if self.radius == 1.0 else replace(self, radius=1.0)  # type: ignore[type-var]

    @property
    def growing(self) -> bool:
        """Whether the first eigenvalue is negative."""
        return self._condition < -self.order

    def roots(self, count: int, start: int = 1) -> FloatArray:
        """Return lambda_k = R sqrt(|eigenvalue_k|), k = start, ..., start + count - 1, shape `(count,)`.

        No unit. `start` costs nothing: the roots before it are not computed. Raises TypeError for what is no
        integer, ValueError for `count` or `start` below 1, for an index beyond 2^50, and for more roots than
        fit in memory.
        """
        count, start = _indices(count, start, 6)
        return self._spectrum.roots(count, start)[0].copy()

    def eigenvalues(self, count: int, start: int = 1) -> FloatArray:
        """Return the eigenvalues (lambda_k / R)^2, ascending, shape `(count,)`, in 1/length^2.

        The first is -(mu / R)^2 where the first mode grows. Raises as `roots`.
        """
        count, start = _indices(count, start, 6)
        wave_number = self._spectrum.roots(count, start)[0] / self.radius
        values = np.asarray(wave_number * wave_number)
        if start == 1 and self.growing:
            values[0] = -values[0]
        return values

    def norms(self, count: int, start: int = 1) -> FloatArray:
        """Return N_k = integral_0^R phi_k(r)^2 r dr, shape `(count,)`, in length^2.

        Raises as `roots`.
        """
        count, start = _indices(count, start, 12)
        return np.asarray(self._spectrum.rim(count, start).norm * (self.radius * self.radius))

    def modes(self, r: ArrayLike, count: int, start: int = 1, *, derivative: int = 0) -> FloatArray:
        """Return phi_k(r), or d^n phi_k / dr^n with `derivative` = n, shape `(*r.shape, count)`.

        Radii in the unit of `radius`, derivatives in 1/length^n, n up to 12; at the axis a derivative is
        infinite where it is (order no integer and below n). Raises as `roots`, and ValueError for radii
        outside [0, radius (1 + 4 eps)], which NaN is, TypeError for radii that are no real numbers.
        """
        radii = checks.real_array("r", r)
        outside = ~((radii >= 0.0) & (radii <= self.radius * EDGE))
        if outside.any():
            first = float(radii[outside].flat[0])
            raise ArgumentValueError(
                f"'r' must be within [0, radius = {self.radius!r}] (got {first!r})", "r", r
            )
        count, start = _indices(count, start, 12 + 2 * radii.size)
        n = checks.integer("derivative", derivative, 0, MAX_DERIVATIVE)
        spectrum = self._spectrum
        high, low = spectrum.roots(count, start)
        rim = spectrum.rim(count, start)
        x = np.empty((4, radii.size))
        radii_two_part(np.ravel(radii), self.radius, x[0], x[1], x[2], x[3])
        out = np.empty(radii.size * count)
        scale = np.ones(count) if n == 0 else (high / self.radius) ** n
        skip = int(start == 1 and spectrum.kind == RATIO)
        if skip:
            scale[0] = 1.0  # its column is replaced below; at root 0 it would be 0 times infinity
        if start == 1 and spectrum.kind == SCALED_J:
            scale[0] /= rim.value[0]
        if skip < count:
            plain_modes(table_of(self.order), self.order, n, high, low, scale, x[0], x[1], out)
            condition = (rim.value, rim.slope, scale, x[2], x[3])
            rim_modes(self.order, self._condition, n, skip, high, low, *condition, out)
        modes = out.reshape(radii.size, count)
        if skip:
            column = rim_scaled(self.order, high[0], low[0], spectrum.sigma, x[0], x[1], derivative=n)
            modes[:, 0] = column if n == 0 else column / self.radius**n
        return modes.reshape(*radii.shape, count)


def _indices(count: Any, start: Any, numbers: int) -> tuple[int, int]:
    """Check `count` and `start`; `numbers` doubles are needed for each root."""
    start = checks.integer("start", start, 1, MAX_INDEX)
    count = checks.integer("count", count, 1, MAX_INDEX - start + 1)
    checks.storable("count", count, 8 * numbers * count)
    return count, start
