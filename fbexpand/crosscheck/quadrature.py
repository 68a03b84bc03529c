"""One coefficient by scipy.integrate.quad, between the zeros of the mode and the breaks of the profile."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

import numpy as np
from scipy.integrate import quad

from fbexpand import checks
from fbexpand.crosscheck.modes import Mode
from fbexpand.crosscheck.scipy_roots import EPS
from fbexpand.exceptions import ArgumentValueError
from fbexpand.types import FloatArray, Numeric

RELATIVE = 1e-13
LIMIT = 100  # bisections between two cuts
GAUSS = 8  # nodes between two cuts, to weigh the errors with


@dataclass(frozen=True, eq=False)
class Integrals:
    """integral f phi r dr for the rows of a batch (size,), its error, and the norm of the mode with its own."""

    values: Numeric
    error: FloatArray
    norm: float
    norm_error: float


class Rows:
    """The profile as real rows: a batch flattened, the imaginary parts after the real ones."""

    def __init__(self, profile: Callable[[FloatArray], Any], batch_shape: tuple[int, ...], radius: float) -> None:
        self._profile = profile
        self._shape = batch_shape
        self.is_complex = bool(np.iscomplexobj(profile(radius * np.array([0.29, 0.71]))))
        self.size = int(np.prod(batch_shape, dtype=np.int64))
        self.count = self.size * (2 if self.is_complex else 1)

    def __call__(self, r: FloatArray) -> FloatArray:
        """Return the values (count, m) at one-dimensional radii."""
        found = np.asarray(self._profile(r))
        try:
            values = np.broadcast_to(found, (*self._shape, r.size))
        except ValueError:
            raise ArgumentValueError(
                f"'profile' must return shape {(*self._shape, r.size)} for {r.size} radii, as the expansion's "
                f"batch has it (got {found.shape})",
                "profile",
                self._profile,
            ) from None
        if found.dtype.kind not in "fiuc":
            raise checks.value_error("profile", "a function that returns numbers", found)
        values = values.reshape(-1, r.size)
        if not np.isfinite(values).all():
            column = int(np.argwhere(~np.isfinite(values))[0][1])
            raise ArgumentValueError(
                f"'profile' must be finite (got {values[~np.isfinite(values)][0]} at r = {float(r[column])!r})",
                "profile",
                self._profile,
            )
        if self.is_complex:
            return np.concatenate((values.real, values.imag)).astype(np.float64)
        return np.asarray(values, dtype=np.float64)


def integrate(rows: Rows, mode: Mode, breaks: FloatArray, radius: float) -> Integrals:
    """Return the integrals of every row against the mode."""
    cuts = np.concatenate((mode.cuts, breaks))
    edges = np.unique(np.concatenate(([0.0], cuts[(cuts > 0.0) & (cuts < radius)], [radius])))
    pieces, spread = _weigh(rows, mode, edges)
    size = pieces.sum(axis=1)
    total = np.zeros(rows.count)
    error = np.zeros(rows.count)
    norm = norm_error = 0.0
    share = (1e-16 * size).tolist()
    for i, (low, high) in enumerate(zip(edges[:-1].tolist(), edges[1:].tolist(), strict=True)):
        seen: dict[float, list[float]] = {}

        def term(r: float, row: int, seen: dict[float, list[float]] = seen) -> float:
            values = seen.get(r)
            if values is None:
                weight = mode.value(r) * r
                values = seen[r] = (rows(np.array([r]))[:, 0] * weight).tolist()
            return values[row]

        for row in range(rows.count):
            found = quad(
                term, low, high, args=(row,), epsabs=share[row], epsrel=RELATIVE, limit=LIMIT, full_output=1
            )
            total[row] += found[0]
            error[row] += _claimed(found[1], float(pieces[row, i]))
        if mode.norm is None:
            found = quad(
                lambda r: mode.value(r) ** 2 * r, low, high, epsabs=0.0, epsrel=RELATIVE, limit=LIMIT, full_output=1
            )
            norm += found[0]
            norm_error += found[1]
    return Integrals(
        total,
        error + spread,
        norm if mode.norm is None else mode.norm,
        norm_error + _norm_spread(mode, edges) if mode.norm is None else mode.norm_error,
    )


def _claimed(error: float, size: float) -> float:
    """Return quad's error; where it is the least that quad ever claims, what rounding can do to a sum of 21 values.

    That least is 50 eps integral |f phi| r dr (QUADPACK's qk21), ten times what is seen.
    """
    return 4.0 * EPS * size if error <= 51.0 * EPS * size else error


def _nodes(edges: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Return Gauss nodes and weights between all edges, (P, GAUSS) each."""
    x, w = np.polynomial.legendre.leggauss(GAUSS)
    half = 0.5 * np.diff(edges)[:, None]
    return edges[:-1, None] + half * (1.0 + x), half * w


def _weigh(rows: Rows, mode: Mode, edges: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Return integral |f phi| r dr of each row between all edges, roughly; and what errors of phi and of radii add."""
    r, w = _nodes(edges)
    flat = r.ravel()
    phi = mode.values(flat)
    f = rows(flat).reshape(rows.count, *r.shape)
    weight = w * r
    spread = mode.spread(flat, phi).reshape(r.shape)
    phi = np.abs(phi).reshape(r.shape)
    size = np.einsum("spi,pi->sp", np.abs(f), phi * weight)
    steep = np.abs(np.gradient(f, axis=2)) / np.maximum(np.gradient(r, axis=1), 1e-300) * r
    rounding = EPS * np.einsum("spi,pi->s", np.abs(f) + steep, phi * weight)
    return size, np.einsum("spi,pi->s", np.abs(f), spread * weight) + rounding


def _norm_spread(mode: Mode, edges: FloatArray) -> float:
    r, w = _nodes(edges)
    phi = mode.values(r.ravel())
    spread = mode.spread(r.ravel(), phi)
    return float(np.sum(2.0 * np.abs(phi) * spread * (w * r).ravel()))
