"""Weights of integral_0^R g r dr on given radii: they make modes orthonormal, as far as the radii allow.

They start as those of straight lines between neighbouring radii (positive, whatever the spacing). Least squares then
correct them: the sum of squared defects of orthogonality, sum_i w_i phi_j phi_k - N_k delta_jk, is made least by LSQR
(Paige and Saunders 1982), each correction counted in units of the weight's square root. On the nodes of a Gauss rule,
or on evenly spaced radii three times as many as terms, the defect falls to rounding.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from fbexpand.types import FloatArray

if TYPE_CHECKING:
    from fbexpand.bases import Basis

WORK = 2e10  # multiplications spent on the correction
MOST_STEPS = 1000
NUMBERS = 1 << 25  # modes held for it; beyond, the straight weights stay
AGAINST = 16  # modes that are tested against all: their products span those of all pairs


def straight(x: FloatArray) -> FloatArray:
    """Return the weights of straight lines between radii 0 <= x <= 1, ascending, level beyond the outermost ones.

    >>> straight(np.array([0.0, 1.0])) * 6.0
    array([1., 2.])
    """
    edges = np.diff(x)
    left, right = x[:-1], x[1:]
    weights = np.zeros_like(x)
    weights[:-1] += edges * (2.0 * left + right) / 6.0
    weights[1:] += edges * (left + 2.0 * right) / 6.0
    weights[0] += 0.5 * x[0] * x[0]
    weights[-1] += 0.5 * (1.0 - x[-1]) * (1.0 + x[-1])
    return weights


def fitted_weights(basis: Basis, terms: int, r: FloatArray, products: int = 2) -> FloatArray:
    """Return the weights for distinct radii in any order, shape (m,), in length^2.

    With `products` above 2 they are fitted to as many more terms.
    """
    rank = np.argsort(r)
    radii = r[rank]
    weights = straight(np.minimum(radii / basis.radius, 1.0))
    count = terms if products == 2 else min(terms * products // 2, r.size)
    if r.size >= terms and r.size * count <= NUMBERS:
        modes = basis.modes(radii, count) / (np.sqrt(basis.norms(count)) / basis.radius)
        weights = _corrected(modes, weights)
    out = np.empty_like(weights)
    out[rank] = weights
    return out * (basis.radius * basis.radius)


def _corrected(modes: FloatArray, weights: FloatArray) -> FloatArray:
    """Return the weights (m,) that make the columns of `modes` (m, count) orthonormal in the mean."""
    from scipy.sparse.linalg import LinearOperator, lsqr

    m, count = modes.shape
    some = np.unique(np.round(np.linspace(0, count - 1, min(count, AGAINST))).astype(np.int64))
    few = np.ascontiguousarray(modes[:, some])
    root = np.sqrt(weights)

    def forward(y: FloatArray) -> FloatArray:
        return np.asarray(((few * (root * y.ravel())[:, None]).T @ modes).ravel())

    def backward(defects: FloatArray) -> FloatArray:
        return np.asarray(root * np.einsum("ij,ij->i", modes @ defects.reshape(some.size, count).T, few))

    operator = LinearOperator((some.size * count, m), matvec=forward, rmatvec=backward, dtype=np.float64)
    wanted = np.zeros((some.size, count))
    wanted[np.arange(some.size), some] = 1.0
    steps = int(min(MOST_STEPS, max(10.0, WORK / (2.0 * m * count * some.size))))
    step = lsqr(operator, wanted.ravel() - forward(root), atol=1e-15, btol=1e-15, conlim=0.0, iter_lim=steps)[0]
    return np.asarray(weights + root * step)
