"""Profiles expanded by plain quadrature, and their true errors: the other road for the estimates."""

from __future__ import annotations

from itertools import pairwise

import numpy as np
from numpy.polynomial import chebyshev

from fbexpand.expansion import Expansion
from fbexpand.profiles.panels import Panels

DEGREES = 24

# name: (profile of r/R on [0, 1], edges that resolve it)
PROFILES = {
    "parabola": (lambda x: 1 - x**2, [0, 1]),
    "one": (lambda x: np.ones_like(x), [0, 1]),
    "step": (lambda x: np.where(x < 0.4, 1.0, 0.0), [0, 0.4, 1]),
    "gaussian": (lambda x: np.exp(-20 * x**2), [0, 0.25, 0.5, 1]),
    "kink": (lambda x: np.abs(x - 0.5) * (1 - x), [0, 0.5, 1]),
    "bump": (lambda x: (1 - x**2) ** 4, [0, 1]),
    "waves": (lambda x: np.cos(9 * x) * (1 - x), [0, 0.5, 1]),
    "two jumps": (lambda x: np.where(x < 0.2, 1.0, np.where(x < 0.7, -0.5, 2 * (1 - x))), [0, 0.2, 0.7, 1]),
    "spot": (lambda x: np.where(x < 0.05, 1.0, 0.0), [0, 0.05, 1]),
    "ripples": (lambda x: np.cos(40 * x) * (1 - x), np.linspace(0, 1, 5)),
    "cubic": (lambda x: x**3 * (1 - x), [0, 1]),
}


def resolve(profile, edges, radius=1.0, residual=0.0):
    """Chebyshev panels of a profile of r/R that is smooth between the edges."""
    edges = np.asarray(edges, dtype=float) * radius
    t = np.cos(np.pi * (np.arange(DEGREES) + 0.5) / DEGREES)
    middle, half = 0.5 * (edges[1:] + edges[:-1]), 0.5 * (edges[1:] - edges[:-1])
    values = np.asarray(profile((middle[:, None] + half[:, None] * t) / radius))
    back = chebyshev.chebvander(t, DEGREES - 1) * (2.0 / DEGREES)
    back[:, 0] *= 0.5
    coefficients = values @ back
    return Panels(edges, coefficients, np.full(coefficients.shape[:-1], residual), values.shape[-2] * DEGREES)


def coefficients_of(profile, edges, basis, terms):
    """c_k by Gauss-Legendre quadrature, 40 points for every five half waves."""
    x, w = np.polynomial.legendre.leggauss(40)
    total = 0.0
    for a, b in pairwise(edges):
        grid = np.linspace(a, b, max(1, int(terms * (b - a) / 5)) + 1) * basis.radius
        if a == 0:  # r^order is not smooth at the axis
            grid = np.concatenate(([0.0], grid[1] * 2.0 ** -np.arange(12, 0, -1), grid[1:]))
        half = 0.5 * np.diff(grid)[:, None]
        r = (grid[:-1, None] + half * (x + 1)).ravel()
        total = total + (profile(r / basis.radius) * r * (half * w).ravel()) @ basis.modes(r, terms)
    return total / basis.norms(terms)


def measured_series(name, basis, terms):
    """A named profile's series that knows its panels."""
    profile, edges = PROFILES[name]
    return Expansion._make(
        basis, coefficients_of(profile, edges, basis, terms), panels=resolve(profile, edges, basis.radius)
    )


def true_errors(name, series, terms=None):
    """(L2, sup, fine radii, |f - S| there), by a fine grid that has points at and just below every break."""
    profile, edges = PROFILES[name]
    series = series if terms is None else series.truncated(terms)
    x, w = np.polynomial.legendre.leggauss(30)
    square, radii, moduli = 0.0, [], []
    for a, b in pairwise(edges):
        grid = np.linspace(a, b, max(2, int(2 * series.terms * (b - a))) + 1) * series.basis.radius
        half = 0.5 * np.diff(grid)[:, None]
        r = grid[:-1, None] + half * (x + 1)
        ends = np.array([grid[0], np.nextafter(grid[-1], 0.0) if b < 1 else grid[-1]])
        points = np.concatenate((r.ravel(), ends))
        error = np.abs(profile(points / series.basis.radius) - series(points))
        square += np.sum(error[: r.size] ** 2 * (half * w * r).ravel())
        radii.append(points)
        moduli.append(error)
    moduli = np.concatenate(moduli)
    return np.sqrt(square), moduli.max(), np.concatenate(radii), moduli
