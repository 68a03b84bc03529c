"""The radii that a transform chooses, and the weights by which products of modes are integrated on them.

Gauss-Jacobi in t = (r/R)^2: a product of two modes of order nu is t^nu times an entire function of t that a polynomial
of degree lambda - nu, and some margin that grows as its cube root, equals to rounding. From order 20 on, where few
terms leave most of the radius empty, that takes more radii than 1.7 terms + 20; there Gauss-Legendre serves, on the
part of the radius where modes are not negligible, in a variable that spreads the nodes more evenly (after Hale and
Trefethen 2008). Radii have a low part: rounded to doubles alone, they cost lambda eps.
"""

from __future__ import annotations

import itertools
import math
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from fbexpand.kernels.jacobi import jacobi_radii, panel_radii
from fbexpand.records import ReadOnlyArrays
from fbexpand.transform.modal import two_part_modes
from fbexpand.types import FloatArray

if TYPE_CHECKING:
    from fbexpand.bases import Basis

SLOPE, SPARE = 1.7, 20  # radii a transform of 16 terms or more may take: SLOPE terms + SPARE
NEGLIGIBLE = (3e-8, 1.5e-7, 8e-8)  # normalised modes where a grid may begin at high order: the square is rounding
SHARES = (0.84, 0.86, 0.88, 0.9, 0.83, 0.85, 0.87, 0.89, 0.91, 0.92)  # of the variable that spreads nodes
SHARP = 2e-14  # defect of orthogonality of a grid
FLAT = 8.0  # power of the variable that makes r^order smooth at the axis, on a panel of its own
DEPTH = 36.0  # natural logarithm: exp(-DEPTH) is nothing
LAYER = 28.0  # likewise, where a growing mode is left to the rule for the others, which still feels it a little


@dataclass(frozen=True, eq=False)
class Grid(ReadOnlyArrays):
    """Radii r + low, ascending, and weights of integral_0^R g r dr, each of shape (m,)."""

    r: FloatArray
    low: FloatArray
    weights: FloatArray


def chosen_grid(basis: Basis, terms: int, products: int = 2) -> Grid:
    """Return the grid on which products of 2, ..., `products` modes of the first `terms` are integrated."""
    order = float(basis.order)
    wave = largest_wave(basis, terms)
    steep = float(basis.roots(1)[0]) if basis.growing else 0.0
    degree = 0.5 * products * wave
    if products == 2:
        grid = _with_layer(basis, terms, order, degree, steep) if basis.growing else None
        count = nodes(degree, order) if grid is None else grid.r.size
        most = int(SLOPE * terms + SPARE)
        if terms >= 16 and count > most and order >= 1.0:
            grid = _high_order(basis, terms, most) or grid
        return grid or scaled(gauss_jacobi(order, count), basis.radius)
    return scaled(_in_radius(basis, terms, products, degree, steep), basis.radius)


def largest_wave(basis: Basis, terms: int) -> float:
    """Return the largest root that belongs to an oscillating mode, 0 if there is none."""
    if terms == 1 and basis.growing:
        return 0.0
    return float(basis.roots(1, terms)[0])


def nodes(degree: float, order: float = 0.0) -> int:
    """Return the Gauss points for t^order times functions that turn like a polynomial of `degree` in t."""
    return math.ceil(0.5 * max(degree - order, 0.0) + 4.0 * math.cbrt(0.5 * degree) + 2.5)


def gauss_jacobi(order: float, count: int, scale: float = 1.0) -> Grid:
    """Return the rule on [0, scale] for r^(2 order) times polynomials in r^2 of degree 2 count - 1."""
    r, low, weights = np.empty((3, count))
    jacobi_radii(order, scale, r, low, weights)
    return Grid(r, low, weights)


def panel(begin: float, end: float, count: int, power: float = 1.0, odd: FloatArray | None = None) -> Grid:
    """Return the rule between two values of u, r = u^power, in the variable of the odd polynomial."""
    r, low, weights = np.empty((3, count))
    panel_radii(begin, end, power, np.ones(1) if odd is None else odd, r, low, weights)
    return Grid(r, low, weights)


def spread(share: float) -> FloatArray:
    """Return the odd polynomial arcsin(share s), cut off."""
    j = np.arange(40)
    ratio = np.ones(40)
    ratio[1:] = (2.0 * j[1:] - 1.0) / (2.0 * j[1:])
    return np.asarray(np.cumprod(ratio) / (2.0 * j + 1.0) * share ** (2.0 * j))


def joined(*grids: Grid) -> Grid:
    """Return grids on neighbouring parts of the radius as one."""
    return Grid(*(np.concatenate([getattr(g, name) for g in grids]) for name in ("r", "low", "weights")))


def scaled(grid: Grid, radius: float) -> Grid:
    """Return a grid of the unit radius on another; a power of two costs nothing, others round the low part."""
    if radius == 1.0:
        return grid
    r = grid.r * radius
    # radius times r exactly, by splitting: what the product loses goes to the low part
    split = 134217729.0
    ah = split * grid.r
    ah = ah - (ah - grid.r)
    exponent = math.frexp(radius)[1]
    mantissa = math.ldexp(radius, -exponent)
    bh = split * mantissa
    bh = bh - (bh - mantissa)
    p = grid.r * mantissa
    e = ((ah * bh - p) + ah * (mantissa - bh) + (grid.r - ah) * bh) + (grid.r - ah) * (mantissa - bh)
    low = np.ldexp(e + grid.low * mantissa, exponent)
    return Grid(r, low, grid.weights * radius * radius)


def defect(basis: Basis, terms: int, grid: Grid) -> float:
    """Return how far from orthonormal the last mode, and a growing first one, are on the grid, in the worst product."""
    norms = np.sqrt(basis.norms(terms))
    columns = [terms - 1, 0] if basis.growing else [terms - 1]
    product = np.zeros((len(columns), terms))
    step = max(1, (1 << 20) // terms)
    for begin in range(0, grid.r.size, step):
        here = slice(begin, begin + step)
        modes = two_part_modes(basis, grid.r[here], grid.low[here], terms) / norms
        product += (modes[:, columns] * grid.weights[here, None]).T @ modes
    for row, k in enumerate(columns):
        product[row, k] -= 1.0
    return float(np.abs(product).max())


def _edges(basis: Basis, terms: int) -> list[float]:
    """Return the shares of the radius below which normalised modes are negligible."""
    share = np.linspace(0.0, 1.0, 4097)
    size = np.abs(basis.modes(share * basis.radius, 1, terms)[:, 0]) * basis.radius / np.sqrt(basis.norms(1, terms)[0])
    return [float(share[max(int(np.argmax(size > level)) - 1, 0)]) for level in NEGLIGIBLE]


def _high_order(basis: Basis, terms: int, count: int) -> Grid | None:
    """Return a grid of `count` radii for an order at which modes leave the axis empty, None if that is too few."""
    for edge, share, power in itertools.product(_edges(basis, terms), SHARES, (1.0, 0.5)):
        grid = scaled(panel(edge ** (1.0 / power), 1.0, count, power, spread(share)), basis.radius)
        if defect(basis, terms, grid) < SHARP:
            return grid
    return None


def _layer_nodes(turns: float) -> int:
    """Return the Gauss points for a layer that a growing mode falls in; products of waves turn by 2 `turns` there."""
    return max(26, nodes(turns) + 12)


def _with_layer(basis: Basis, terms: int, order: float, degree: float, steep: float) -> Grid:
    """Return a grid for a growing first mode: one rule, or with a panel at the rim where that takes fewer radii."""
    # in t the steepest product is about exp(steep (t - 1)), a polynomial of degree sqrt(2 DEPTH steep / 2)
    whole = max(nodes(degree, order), math.ceil(0.5 * math.sqrt(DEPTH * steep) + 4.0 + 0.02 * steep))
    layer = LAYER / steep
    inner = 1.0 - layer
    main, rim = nodes(degree * inner, order), _layer_nodes(degree * layer)
    for _ in range(12):
        if layer > 0.5 or whole <= main + rim:
            grid = gauss_jacobi(order, whole)
        else:
            grid = joined(gauss_jacobi(order, main, inner), panel(inner, 1.0, rim))
        grid = scaled(grid, basis.radius)
        if defect(basis, terms, grid) < SHARP:
            break
        whole, main, rim = whole + 2, main + 1, rim + 1
    return grid


def _in_radius(basis: Basis, terms: int, products: int, degree: float, steep: float) -> Grid:
    """Return a grid for products of several modes, by Gauss-Legendre in r.

    Powers r^(n order) at the axis are no trouble for a whole order. Otherwise the panel beside the axis is in the
    variable r^(1/8), in which they are smooth enough.
    """
    order = float(basis.order)
    extra = 0.5 * products * order if order < 40.0 else 0.0
    layer = LAYER / steep if steep > 2.0 * LAYER else 0.0
    outer = 1.0 - layer
    parts = []
    begin = 0.0
    if order >= 8.0:
        begin = _edges(basis, terms)[0]
    elif order % 1.0:
        begin = min(0.5, 3.0 / max(degree, 6.0))
        parts.append(panel(0.0, begin ** (1.0 / FLAT), 56, FLAT))
    parts.append(panel(begin, outer, nodes(degree * (outer - begin) + extra) + 6))
    if layer:
        parts.append(panel(outer, 1.0, _layer_nodes(degree * layer) + 8))
    return joined(*parts)
