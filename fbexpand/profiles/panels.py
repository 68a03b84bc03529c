"""A profile resolved: a Chebyshev polynomial on each of a row of panels."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.polynomial import legendre

from fbexpand.profiles import chebyshev
from fbexpand.records import ReadOnlyArrays
from fbexpand.types import ArrayLike, FloatArray, IntArray, Numeric

POINTS_AT_ONCE = 1 << 20  # numbers held at once while evaluating


@dataclass(frozen=True, eq=False)
class Panels(ReadOnlyArrays):
    """A piecewise polynomial: f(r) = sum_j coefficients[..., p, j] T_j(t) on panel p, t from -1 to 1.

    `edges` (P + 1,) ascend from 0 to the radius; `coefficients` have shape (*batch, P, degrees); `residual`
    (*batch, P) estimates the largest error on each panel, in units of f. `evaluations` counts the values of
    the profile that it took. On an edge the panel to the right is meant; the last edge belongs to the last.
    """

    edges: FloatArray
    coefficients: Numeric
    residual: FloatArray
    evaluations: int

    @property
    def batch_shape(self) -> tuple[int, ...]:
        """Shape of the batch axes."""
        return self.coefficients.shape[:-2]

    @property
    def degrees(self) -> int:
        """Number of coefficients on a panel."""
        return int(self.coefficients.shape[-1])

    def rows(self) -> Numeric:
        """Return the coefficients with the batch axes flattened, (size, P, degrees)."""
        return self.coefficients.reshape(-1, *self.coefficients.shape[-2:])

    def __call__(self, r: ArrayLike) -> Numeric:
        """Return the values at one-dimensional radii r, shape (*batch, m)."""
        radii = np.asarray(r, dtype=np.float64)
        rows = self.rows()
        panel: IntArray = np.clip(np.searchsorted(self.edges, radii, side="right") - 1, 0, self.edges.size - 2)
        t = chebyshev.local(radii, self.edges[panel], self.edges[panel + 1])
        out = np.empty((rows.shape[0], radii.size), dtype=rows.dtype)
        step = max(1, POINTS_AT_ONCE // max(1, rows.shape[0]))
        for start in range(0, radii.size, step):
            here = slice(start, start + step)
            out[:, here] = _clenshaw(rows, panel[here], t[here])
        return out.reshape(*self.batch_shape, radii.size)

    def norm(self) -> FloatArray:
        """Return sqrt(integral |f|^2 r dr), shape (*batch,)."""
        rows = self.rows()
        x, w = legendre.leggauss(self.degrees + 1)
        half = 0.5 * np.diff(self.edges)[:, None]
        weights = half * w * (self.edges[:-1, None] + half * (x + 1.0))  # (P, nodes)
        values = np.abs(rows @ chebyshev.evaluation(x, self.degrees))
        unit = values.max(axis=(1, 2), initial=0.0)
        unit = np.where(unit > 0.0, unit, 1.0)
        square = np.einsum("spi,pi->s", (values / unit[:, None, None]) ** 2, weights)
        return np.asarray(unit * np.sqrt(square)).reshape(self.batch_shape)


def _clenshaw(rows: Numeric, panel: IntArray, t: FloatArray) -> Numeric:
    """Sum the panels' series at t, shape (size, m)."""
    ahead = after = np.zeros((rows.shape[0], t.size), dtype=rows.dtype)
    twice = 2.0 * t
    for j in range(rows.shape[-1] - 1, 0, -1):
        ahead, after = rows[:, panel, j] + twice * ahead - after, ahead
    return np.asarray(rows[:, panel, 0] + t * ahead - after)
