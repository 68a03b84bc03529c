"""Interpolants of a table, as polynomials on the cells between its radii and on what is continued."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from fbexpand.types import FloatArray, Numeric

MIRRORED = 24  # radii repeated on the other side of the axis: a spline hardly feels more than those

# powers 1, s, s^2, s^3 of s in [0, 1] in Chebyshev polynomials of t = 2 s - 1
POWERS = np.array([[1.0, 0.0, 0.0, 0.0], [0.5, 0.5, 0.0, 0.0], [0.375, 0.5, 0.125, 0.0], [10.0, 15.0, 6.0, 1.0]])
POWERS[3] /= 32.0
STRAIGHT = np.array([1.0, 1.0, 0.0, 0.0])  # leaves value and slope


@dataclass(frozen=True, eq=False)
class Knots:
    """A table placed on a radius: values (size, m) at r (m,).

    `parity` is 1 for an even order, -1 for an odd one, 0 for one that is no integer; `to_axis` and `to_rim` say
    where the table is continued.
    """

    r: FloatArray
    values: Numeric
    parity: int
    to_axis: bool
    to_rim: bool
    radius: float

    @property
    def edges(self) -> FloatArray:
        """The edges of the cells, from 0 to the radius."""
        first = [0.0] if self.to_axis else []
        last = [self.radius] if self.to_rim else []
        return np.concatenate((first, self.r, last))

    def across(self, most: int) -> tuple[FloatArray, Numeric, int]:
        """Return radii and values continued across the axis by parity, and how many lie before the table's.

        An odd profile gets the value 0 on the axis where the table does not reach it. Where it does, and its
        value there is not 0, there is no odd continuation; f'' = 0 is asked for instead, which the mirror image
        in the point (0, f(0)) has.
        """
        if self.parity == 0:
            return self.r, self.values, 0
        skip = 0 if self.to_axis else 1
        count = min(most, self.r.size - skip)
        r = [-self.r[skip : skip + count][::-1]]
        values = [self.parity * self.values[:, skip : skip + count][:, ::-1]]
        if self.parity < 0 and self.to_axis:
            r.append(np.zeros(1))
            values.append(np.zeros((self.values.shape[0], 1)))
        if self.parity < 0 and not self.to_axis:
            values[0] = values[0] + 2.0 * self.values[:, :1]
        before = sum(part.size for part in r)
        return np.concatenate((*r, self.r)), np.concatenate((*values, self.values), axis=1), before


def interpolate(between: str, knots: Knots) -> Numeric:
    """Return Chebyshev coefficients on the cells, (size, cells, 4), or 2 of them for "linear"."""
    return {"cubic": cubic, "linear": linear, "monotone": monotone}[between](knots)


def cubic(knots: Knots) -> Numeric:
    """Return the spline."""
    from scipy.interpolate import CubicSpline  # slow to import, and only tables need it

    if knots.parity and not knots.to_axis and knots.r.size > MIRRORED:
        at_axis = (1 if knots.parity > 0 else 2, np.zeros(knots.values.shape[0]))
        spline = CubicSpline(knots.r, knots.values, axis=1, bc_type=(at_axis, "not-a-knot"))
        return _cells(knots, knots.r, 0, spline.c, continued=True)
    r, values, before = knots.across(MIRRORED)
    spline = CubicSpline(r, values, axis=1)
    return _cells(knots, r, before, spline.c, continued=True)


def monotone(knots: Knots) -> Numeric:
    """Return the piecewise cubic without overshoot."""
    from scipy.interpolate import PchipInterpolator

    r, values, before = knots.across(2)
    if np.iscomplexobj(values):
        c: Numeric = PchipInterpolator(r, values.real, axis=1).c + 1j * PchipInterpolator(r, values.imag, axis=1).c
    else:
        c = PchipInterpolator(r, values, axis=1).c
    return _cells(knots, r, before, c, continued=False)


def linear(knots: Knots) -> Numeric:
    """Return the broken line."""
    r, values, before = knots.across(1)
    slopes = np.diff(values, axis=1) / np.diff(r)
    c = np.stack((0.0 * slopes, 0.0 * slopes, slopes, values[:, :-1]))  # as in SciPy: highest power first
    return np.ascontiguousarray(_cells(knots, r, before, np.moveaxis(c, 1, 2), continued=False)[..., :2])


def _cells(knots: Knots, r: FloatArray, before: int, c: Numeric, *, continued: bool) -> Numeric:
    """Return Chebyshev coefficients on the cells from powers of r - r_i on [r_i, r_{i+1}], c (4, cells, size).

    Toward the rim, and toward the axis without parity, a polynomial is continued, or only its value and slope.
    """
    powers = np.moveaxis(c[::-1], 0, 2)  # (cells, size, 4), lowest power first
    edges = knots.edges
    first = before
    origins, picked = [], []
    if knots.to_axis:
        first_cell = before - 1 if before else 0
        origins.append(r[first_cell : first_cell + 1])
        nearest = powers[first_cell : first_cell + 1]
        picked.append(nearest if continued or before else nearest * STRAIGHT)
    origins.append(r[first:-1])
    picked.append(powers[first:])
    if knots.to_rim:
        h = r[-1] - r[-2]
        last = powers[-1:]
        origins.append(r[-1:])
        moved = _shifted(last, np.array([h]))
        if not continued:
            moved = moved * STRAIGHT
        picked.append(moved)
    at, power = np.concatenate(origins), np.concatenate(picked)
    power = _shifted(power, edges[:-1] - at)  # where a cell continues a polynomial from elsewhere
    scaled = power * (np.diff(edges)[:, None] ** np.arange(4))[:, None, :]
    return np.ascontiguousarray(np.moveaxis(scaled @ POWERS, 0, 1))


def _shifted(power: Numeric, by: FloatArray) -> Numeric:
    """Return powers of u from powers of u + by, (cells, size, 4)."""
    if not by.any():
        return power
    a, b, c, d = (power[..., i] for i in range(4))
    x = by[:, None]
    return np.stack((a + x * (b + x * (c + x * d)), b + x * (2.0 * c + 3.0 * x * d), c + 3.0 * x * d, d), axis=-1)
