"""A profile resolved: a Chebyshev polynomial on each of a row of panels."""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from numpy.polynomial import legendre

from fbexpand.profiles import chebyshev
from fbexpand.records import ReadOnlyArrays, read_only
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
        x, w, evaluation = _square_rule(self.degrees)
        low, high = self.edges[:-1, None], self.edges[1:, None]
        half = 0.5 * (high - low)
        weights = half * w * (low + half * (x + 1.0))  # (P, nodes)
        values = np.abs(rows @ evaluation).reshape(rows.shape[0], -1)
        unit = values.max(axis=1, initial=0.0)
        unit[unit == 0.0] = 1.0
        values /= unit[:, None]
        values *= values
        return np.asarray(unit * np.sqrt(values @ weights.ravel())).reshape(self.batch_shape)


@lru_cache(maxsize=16)
def _square_rule(degrees: int) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Return nodes and weights that integrate squares times r, and the matrix from coefficients to the nodes."""
    x, w = legendre.leggauss(degrees + 1)
    return read_only(x), read_only(w), read_only(chebyshev.evaluation(x, degrees))


def _clenshaw(rows: Numeric, panel: IntArray, t: FloatArray) -> Numeric:
    """Sum the panels' series at t, shape (size, m)."""
    ahead = after = np.zeros((rows.shape[0], t.size), dtype=rows.dtype)
    twice = 2.0 * t
    for j in range(rows.shape[-1] - 1, 0, -1):
        ahead, after = rows[:, panel, j] + twice * ahead - after, ahead
    return np.asarray(rows[:, panel, 0] + t * ahead - after)
