"""How far a table's interpolant may be from the function it was sampled from.

The cubic spline is compared with a spline of degree five, cell by cell: where the function is smooth on the
scale of the table their difference is the cubic's error. Where it is not (a kink, a jump, too few radii) the
two differ by about as much as the cubic and the broken line do, and fall short of the error; there the
difference is raised. The other interpolants are compared with the cubic, whose own error is added.
"""

from __future__ import annotations

import numpy as np

from fbexpand.profiles import chebyshev
from fbexpand.profiles.interpolants import MIRRORED, Knots, cubic, linear
from fbexpand.types import FloatArray, Numeric

NODES = 4  # Gauss points in a cell
RAISED = 25.0  # times what the two differences have in common
ALIKE = 0.6  # their ratio, at most
MOST = 12.0  # times the difference from the broken line: the error is not more
FEWEST = 6  # radii for a degree of five
KNOWN = 4  # radii from which a difference of interpolants says something
COLUMNS = 1 << 20  # numbers held at once


def table_error(between: str, knots: Knots, coefficients: Numeric) -> FloatArray:
    """Return the L2 error (size,) of an interpolant given by its Chebyshev coefficients on the cells."""
    size = knots.values.shape[0]
    step = max(1, COLUMNS // (NODES * knots.edges.size))
    parts = [
        _error(between, _columns(knots, slice(low, low + step)), coefficients[low : low + step])
        for low in range(0, size, step)
    ]
    return np.concatenate(parts)


def _columns(knots: Knots, chosen: slice) -> Knots:
    return Knots(knots.r, knots.values[chosen], knots.parity, knots.to_axis, knots.to_rim, knots.radius)


def _error(between: str, knots: Knots, coefficients: Numeric) -> FloatArray:
    from scipy.interpolate import make_interp_spline

    unit = np.abs(knots.values).max(axis=1)
    unit = np.where(unit > 0.0, unit, 1.0)[:, None, None]
    spline = coefficients if between == "cubic" else cubic(knots)
    straight = linear(knots)
    line = _values(straight, knots) / unit
    values = _values(spline, knots) / unit
    broken = _norms(values - line, knots)  # of every cell
    r, table, _ = knots.across(MIRRORED)
    if knots.r.size < KNOWN:  # curvature is not known: as much may be wrong as the table rises
        found = broken = np.maximum(broken, _norms(line - straight[:, :, :1] / unit, knots))
    elif r.size < FEWEST:
        found = broken
    else:
        smooth = make_interp_spline(r, table, k=5, axis=1)(_radii(knots).ravel()).reshape(values.shape) / unit
        difference = _norms(values - smooth, knots)
        with np.errstate(divide="ignore", invalid="ignore"):
            alike = np.where(broken > 0.0, np.minimum(difference / broken, ALIKE), ALIKE)
        found = difference * (1.0 + RAISED * alike)
        if knots.to_axis:
            found[:, 0] = np.maximum(found[:, 0], broken[:, 0])
        if knots.to_rim:
            found[:, -1] = np.maximum(found[:, -1], broken[:, -1])
    total = np.minimum(_total(found), MOST * _total(broken))
    if between != "cubic":
        total = total + _total(_norms(_values(coefficients, knots) / unit - values, knots))
    return np.asarray(total * unit[:, 0, 0])


_x, _w = np.polynomial.legendre.leggauss(NODES)


def _radii(knots: Knots) -> FloatArray:
    edges = knots.edges
    return np.asarray(edges[:-1, None] + 0.5 * np.diff(edges)[:, None] * (1.0 + _x))


def _values(coefficients: Numeric, knots: Knots) -> Numeric:
    """Return values at the Gauss points of the cells, (size, cells, NODES)."""
    return np.asarray(coefficients @ chebyshev.evaluation(_x, coefficients.shape[2]))


def _norms(values: Numeric, knots: Knots) -> FloatArray:
    """Return the L2 norm on every cell, (size, cells)."""
    weights = 0.5 * np.diff(knots.edges)[:, None] * _w * _radii(knots)
    return np.asarray(np.sqrt(np.sum(np.abs(values) ** 2 * weights, axis=2)))


def _total(norms: FloatArray) -> FloatArray:
    return np.asarray(np.sqrt(np.sum(norms**2, axis=1)))
