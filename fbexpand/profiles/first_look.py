"""Where a profile is looked at first: one panel between breaks, and a scan that finds narrow features."""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache

import numpy as np

from fbexpand.profiles import chebyshev
from fbexpand.records import ReadOnlyArrays, read_only
from fbexpand.types import FloatArray, IntArray, Numeric

DEGREES = 32  # coefficients on a divided panel: they resolve [h/4, h] beside a singularity at 0 to rounding
FIRST = 64  # coefficients at the first look: most smooth profiles need no division
SCAN = 736  # points over the whole radius: no two neighbours further apart than 1.6e-3 R
FEWEST = 24  # of them between two breaks


@dataclass(frozen=True, eq=False)
class FirstLook(ReadOnlyArrays):
    """Radii to sample at: Chebyshev points of every panel, then the scan, in ascending order."""

    edges: FloatArray
    radii: FloatArray
    scan: FloatArray
    weights: FloatArray  # integral f r dr is near the sum of weights times f on the scan
    starts: IntArray  # the scan's points of panel p are those from scan[starts[p]] on
    matrices: tuple[FloatArray, ...]  # values on a panel's scan points = coefficients @ matrix

    def on_scan(self, coefficients: Numeric) -> Numeric:
        """Return polynomials of up to FIRST coefficients, (size, P, degrees), at the scan's points, (size, m)."""
        degrees = coefficients.shape[2]
        parts = [coefficients[:, p] @ matrix[:degrees] for p, matrix in enumerate(self.matrices)]
        return parts[0] if len(parts) == 1 else np.concatenate(parts, axis=1)


@lru_cache(maxsize=64)
def first_look(edges: tuple[float, ...], density: int = SCAN) -> FirstLook:
    """Return where to look first between the given edges; the scan has about `density` points over the radius."""
    cuts = np.array(edges)
    lengths = np.diff(cuts)
    nodes = panel_nodes(cuts[:-1], cuts[1:], FIRST)
    scans, weights, counts, matrices = [], [], [], []
    for low, length in zip(cuts[:-1], lengths, strict=True):
        count = max(FEWEST, int(np.ceil(density * length / cuts[-1])))
        share, matrix = _scan(count)
        r = low + length * share
        scans.append(r)
        weights.append(r * (length / count))
        counts.append(count)
        matrices.append(matrix)
    scan = np.concatenate(scans)
    return FirstLook(
        cuts,
        np.concatenate((nodes.ravel(), scan)),
        scan,
        np.concatenate(weights),
        np.cumsum([0, *counts[:-1]], dtype=np.int64),
        tuple(matrices),
    )


@lru_cache(maxsize=32)
def _scan(count: int) -> tuple[FloatArray, FloatArray]:
    """Return `count` points in (0, 1), and the matrix from coefficients to values there."""
    share = scan_points(count)
    return read_only(share), read_only(chebyshev.evaluation(2.0 * share - 1.0, FIRST))


def scan_points(count: int) -> FloatArray:
    """Return ascending points in (0, 1), a jittered grid: nothing periodic agrees with it by chance."""
    i = np.arange(count)
    golden = np.modf((i + 1) * 0.6180339887498949)[0]
    return np.asarray((i + 0.375 + 0.25 * golden) / count)


def panel_nodes(low: FloatArray, high: FloatArray, degrees: int) -> FloatArray:
    """Return the Chebyshev points of panels, (P, degrees), never on an end however narrow the panel is."""
    x = chebyshev.points(degrees)
    half = 0.5 * (high - low)[:, None]
    r = low[:, None] + half * (1.0 + x)
    below, above = np.nextafter(high, low)[:, None], np.nextafter(low, high)[:, None]
    return np.clip(r, np.minimum(above, below), np.maximum(above, below))
