"""Compiling ahead of the first use."""

from __future__ import annotations

import math

import numpy as np

from fbexpand.analysis.expand import expand
from fbexpand.bases import Basis, Dini, FourierBessel
from fbexpand.evolution import Diffusion, Paraxial, Wave, evolve
from fbexpand.expansion import Expansion
from fbexpand.profiles.table import RadialTable
from fbexpand.special.bessel import bessel_j
from fbexpand.special.roots import bessel_zeros, dini_roots


def warm_up() -> None:
    """Compile what the main job needs, and keep it on disk for the processes to come.

    Without it the first call of each kind pays for its own compilation, half a minute in all. Call it once after
    installing (where the package's folder is writable, it then serves every user), or before timing anything. Where
    the code is on disk already it takes a fraction of a second.

    >>> from fbexpand import warm_up
    >>> warm_up()
    """
    r = np.linspace(0.0, 1.0, 9)
    points = np.linspace(0.0, 1.0, 40)
    for basis in _bases():
        series = expand(_profile, basis, terms=40)
        series(points)
        series.derivative(points)
        series.integral(0.0, 0.5)
        series.partial_sum(points, terms=20)
        series.error_estimate()
        series.terms_for(0.5)
    basis = Dini(robin=2.0)
    expand(RadialTable(r, _profile(r)), basis, tol=1e-3)
    expand(lambda r: np.stack((r, 1j * r * r)), basis, terms=4)(points)
    growing = Expansion(Dini(robin=-2.0), np.ones(4))
    for law in (Diffusion(1.0), Wave(1.0, damping=1.0), Paraxial(1.0)):
        for time in (1.0, 1e17):
            evolve(growing, law, time)(points)
    for order in (0.0, 0.3, 7.5, 60.0, 500.0):
        bessel_zeros(order, 400)
        bessel_zeros(order, 2, start=10**9)
        dini_roots(order, 1.0, 2, start=10**9)
        bessel_j(order, np.concatenate((np.geomspace(1e-3, 1e6, 60), order + points)))
        bessel_j(order, 1.5)
        bessel_j(order, np.array([1.5]), derivative=1)


def _profile(r: np.ndarray) -> np.ndarray:
    return np.asarray(np.exp(-(r**2)))


def _bases() -> list[Basis]:
    """Return bases of every kind: low, real and high orders; a first mode that is a wave, a power and a growing one."""
    kinds: list[Basis] = [FourierBessel(order) for order in (0.0, 0.3, 7.5, 60.0)]
    kinds += [Dini(order, robin=2.0) for order in (0.0, 0.3, 60.0)]
    kinds += [Dini(order, robin=1e9) for order in (0.0, 0.3)]
    kinds += [Dini.neumann(), Dini(0.3, robin=-0.3), Dini(0.3, robin=-0.2), Dini(robin=-2.0), Dini(1.5, robin=-900.0)]
    kinds += [Dini(1.0, robin=-math.nextafter(1.0, 2.0)), Dini(1.0, robin=-math.nextafter(1.0, 0.0))]
    return kinds
