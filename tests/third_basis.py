"""A basis written outside the library, with the protocol's members and nothing else: sines, order 1/2."""

from __future__ import annotations

import numpy as np


class Sines:
    """phi_k = sin(k pi r / R) / sqrt(r / R), zero at the rim; lap phi_k = -(k pi / R)^2 phi_k at order 1/2.

    phi_k = sqrt(k pi^2 / 2) J_{1/2}(k pi r / R), N_k = R^2 / 2.
    """

    order = 0.5
    growing = False

    def __init__(self, radius=1.0):
        self.radius = float(radius)

    def __repr__(self):
        return f"Sines(radius={self.radius})"

    def roots(self, count, start=1):
        return np.pi * np.arange(start, start + count)

    def eigenvalues(self, count, start=1):
        return (self.roots(count, start) / self.radius) ** 2

    def norms(self, count, start=1):
        return np.full(count, 0.5 * self.radius**2)

    def modes(self, r, count, start=1):
        x = np.asarray(r, dtype=float)[..., None] / self.radius
        k = np.arange(start, start + count)
        near_rim = np.where(k % 2 == 1, 1.0, -1.0) * np.sin(np.pi * k * (1.0 - x))
        sine = np.where(x > 0.5, near_rim, np.sin(np.pi * k * x))
        return np.where(x > 0.0, sine / np.sqrt(np.where(x > 0.0, x, 1.0)), 0.0)
