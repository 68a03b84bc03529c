"""A profile given as a table of radii and values."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Any

import numpy as np

from fbexpand import checks
from fbexpand.exceptions import ArgumentValueError
from fbexpand.profiles.interpolants import Knots, interpolate
from fbexpand.profiles.panels import Panels
from fbexpand.profiles.resolution import table_error
from fbexpand.records import ReadOnlyArrays
from fbexpand.types import FloatArray, Numeric

BETWEEN = ("cubic", "linear", "monotone")
EXTEND = ("axis", "rim", "both")
REACHES = 1e-12  # of the radius: a table that ends this close to the rim, or begins this close to the axis, reaches it


@dataclass(frozen=True, eq=False, repr=False)
class RadialTable(ReadOnlyArrays):
    """A profile known at some radii, and how to read between them.

    `r` (m,) are at least two distinct radii >= 0, of any spacing and in any order (they are sorted); `values`
    of shape `(*batch, m)` are real or complex. `between` names the interpolant, whose integrals against the
    modes are exact to rounding at any number of terms:

    - "cubic", a spline. At the axis it has the parity of the basis' order: f' = 0 where the order is even
      (0, 2, ...), f'' = 0 where it is odd; an order that is no integer has no parity, and the spline is
      not-a-knot there, as it always is at the rim;
    - "linear";
    - "monotone", piecewise cubic without overshoot (Fritsch and Butland 1984, as in SciPy's
      PchipInterpolator), even or odd across the axis as above.

    A table need not know the radius: `expand` places it on a basis. There it must reach the axis and the rim,
    to 1e-12 of the radius, unless `extend` says which side to continue ("axis", "rim" or "both"). Toward the
    rim "cubic" continues its last polynomial, the others their last slope. Toward the axis an even order
    continues evenly ("linear" and "monotone": as a constant), an odd one through f(0) = 0; at an order that
    is no integer the first polynomial, or slope, is continued.

    Raises TypeError for what is no numbers, ValueError for radii that are negative, not finite, fewer than
    two or not distinct, for values that are not finite or do not match, and for unknown options.

    >>> import numpy as np
    >>> from fbexpand import FourierBessel, RadialTable, expand
    >>> r = np.linspace(0.0, 1.0, 11)
    >>> expand(RadialTable(r, 1 - r**2), FourierBessel(), terms=2).coefficients.round(6)
    array([ 1.108022, -0.139778])
    """

    r: FloatArray
    values: Numeric
    between: str = field(default="cubic", kw_only=True)
    extend: str | None = field(default=None, kw_only=True)

    def __post_init__(self) -> None:
        r, values = _checked(self.r, self.values)
        checks.choice("between", self.between, BETWEEN)
        if self.extend is not None:
            checks.choice("extend", self.extend, EXTEND)
        object.__setattr__(self, "r", r)
        object.__setattr__(self, "values", values)
        super().__post_init__()

    def __repr__(self) -> str:
        low, high = float(self.r[0]), float(self.r[-1])
        extend = "" if self.extend is None else f", extend={self.extend!r}"
        return (
            f"RadialTable({self.r.size} radii from {low!r} to {high!r}, values of shape {self.values.shape}, "
            f"between={self.between!r}{extend})"
        )


def _checked(r: Any, values: Any) -> tuple[FloatArray, Numeric]:
    """Return sorted copies of radii and values that go together."""
    radii = checks.all_finite("r", checks.real_array("r", r))
    if radii.ndim != 1 or radii.size < 2:
        raise checks.value_error("r", "one-dimensional, with at least 2 radii", r)
    if radii.min() < 0.0:
        raise checks.value_error("r", "at least 0", float(radii.min()))
    numbers = checks.all_finite("values", checks.numeric_array("values", values))
    if numbers.ndim == 0 or numbers.shape[-1] != radii.size:
        raise ArgumentValueError(
            f"'values' must have shape (*batch, {radii.size}) to match 'r' (got shape {numbers.shape})",
            "values",
            values,
        )
    if numbers.size == 0:
        raise checks.value_error("values", "non-empty", numbers)
    order = np.argsort(radii, kind="stable")
    radii, numbers = radii[order], np.ascontiguousarray(numbers[..., order])
    again = np.flatnonzero(np.diff(radii) == 0.0)
    if again.size:
        raise ArgumentValueError(
            f"'r' must hold distinct radii (got {float(radii[again[0]])!r} more than once)", "r", r
        )
    return radii, numbers


def place(table: RadialTable, order: float, radius: float) -> tuple[Panels, FloatArray]:
    """Return the interpolant on [0, radius] as panels, and the (*batch,) L2 error of the table's resolution."""
    knots = _knots(table, order, radius)
    batch = table.values.shape[:-1]
    coefficients = interpolate(table.between, knots)
    error = table_error(table.between, knots, coefficients)
    panels = Panels(
        knots.edges,
        coefficients.reshape(*batch, *coefficients.shape[1:]),
        np.zeros((*batch, knots.edges.size - 1)),
        table.r.size,
    )
    return panels, error.reshape(batch)


def _knots(table: RadialTable, order: float, radius: float) -> Knots:
    """Check that the table reaches, or may be continued to, both ends; snap its ends to them."""
    r = table.r.copy()
    if r[-1] > radius * (1.0 + REACHES):
        raise ArgumentValueError(
            f"'r' of the table must lie within the basis' radius {radius!r} (got {float(r[-1])!r})", "r", table.r
        )
    to_axis, to_rim = r[0] > REACHES * radius, r[-1] < radius * (1.0 - REACHES)
    for short, side, end in ((to_axis, "axis", r[0]), (to_rim, "rim", r[-1])):
        if short and table.extend not in (side, "both"):
            first = "begins" if side == "axis" else "ends"
            raise ArgumentValueError(
                f"'extend' must be {side!r} or 'both' for a table that {first} at r = {float(end)!r}, "
                f"short of the {side} of a basis of radius {radius!r} (got {table.extend!r})",
                "extend",
                table.extend,
            )
    if not to_axis:
        r[0] = 0.0
    if not to_rim:
        r[-1] = radius
    if r[0] >= r[1] or r[-2] >= r[-1]:
        raise checks.value_error("r", f"distinct on the radius {radius!r}", table.r)
    parity = (1 if order % 2.0 == 0.0 else -1) if order % 1.0 == 0.0 else 0
    return Knots(r, table.values.reshape(-1, r.size), parity, to_axis, to_rim, radius)
