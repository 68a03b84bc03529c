"""Modes near the rim, where the condition there makes all of them, or their slopes, small.

An error of an eps of the modulus of J_nu would be a large part of them. There J_nu(lambda (1 - d)) is summed as
a Taylor series about lambda, whose first two coefficients the condition fixes to a few eps of themselves; the
others follow from Bessel's equation. The series of many roots are summed side by side.
"""

from __future__ import annotations

import math

import numpy as np

from fbexpand.kernels.dd import fma, two_prod
from fbexpand.kernels.jit import callee, inline_kernel
from fbexpand.types import FloatArray, IntArray

TAYLOR_TERMS = 26  # about the turning point, where the coefficients fall as (j!)^(-2/3)
FAR_TERMS = 20  # far beyond it, where they do as 1/j!
DEEPEST = 0.2  # of the radius: the Taylor series about lambda converges for d < 1
_INVERSE = np.array([1.0 / ((j + 1) * (j + 2)) for j in range(2 * TAYLOR_TERMS)])  # derivatives take more of them


@inline_kernel
def wave_number(nu: float, x: float) -> float:
    """Return about M'/M, how fast J_nu turns at x >= nu: 1 far out, nu^(-1/3) at the turning point."""
    return math.sqrt(abs((x - nu) * (x + nu)) / (x * x) + 1.5 * (1.0 + nu) ** (-2.0 / 3.0))


@inline_kernel
def next_coefficients(
    j: int,
    b: FloatArray,
    q: FloatArray,
    h2b: FloatArray,
    older: FloatArray,
    old: FloatArray,
    last: FloatArray,
    new: FloatArray,
    out: FloatArray,
) -> None:
    """Fill out with t_{j+2} from t_{j-2}, ..., t_{j+1}."""
    first, second, inverse = (j + 1.0) * (2.0 * j + 1.0), float(j * j), -_INVERSE[j]
    for m in range(out.size):
        s = first * b[m] * new[m] + (second + q[m]) * (b[m] * b[m]) * last[m]
        out[m] = (s + h2b[m] * (2.0 * old[m] + b[m] * older[m])) * inverse


@callee
def rim_series(nu: float, robin: float, c: FloatArray, cl: FloatArray, h: FloatArray, t: FloatArray) -> None:
    """Fill rows 2, 3, ... of `t` with t_j h^j, J_nu(c + cl + z) = sum t_j z^j, from t_0 = J_nu and t_1 h = h J_nu'.

    One column for each root c + cl. Rows 0 and 1 stand for t_{-2} and t_{-1}, which are 0; rows 2 and 3 are given.

    c^2 (j+2)(j+1) t_{j+2} + c (j+1)(2j+1) t_{j+1} + (j^2 + c^2 - nu^2) t_j + 2 c t_{j-1} + t_{j-2} = 0.
    """
    square, rest = two_prod(nu, nu)
    b, q, h2b = np.empty(c.size), np.empty(c.size), np.empty(c.size)
    for m in range(c.size):
        b[m] = h[m] / c[m]
        q[m] = ((c[m] - nu) + cl[m]) * (c[m] + nu)
        h2b[m] = h[m] * h[m] * b[m]
    for j in range(t.shape[0] - 4):
        next_coefficients(j, b, q, h2b, t[j], t[j + 1], t[j + 2], t[j + 3], t[j + 4])
        for m in range(c.size if j == 1 else 0):
            if abs(robin) < c[m]:  # the same from c J' + robin J = 0, free of cancellation near robin = -1
                s = (1.0 + robin) * q[m] - 2.0 * ((square + robin) + rest)
                t[5, m] = t[2, m] * b[m] * (b[m] * b[m]) * s / 6.0


@callee
def rim_columns(
    nu: float,
    robin: float,
    n: int,
    hi: FloatArray,
    lo: FloatArray,
    value: FloatArray,
    slope: FloatArray,
    scale: FloatArray,
    d: FloatArray,
    dl: FloatArray,
    near: IntArray,
    columns: IntArray,
    out: FloatArray,
) -> None:
    """Do the work of `rim_modes` for some columns, at the radii `near` the rim."""
    many = columns.size
    c, cl, h, reach = np.empty(many), np.empty(many), np.empty(many), np.empty(many)
    v, s = np.empty(many), np.empty(many)
    terms = FAR_TERMS if hi[columns[0]] > 2.0 * nu + 10.0 else TAYLOR_TERMS
    t = np.empty((2 + terms + n, many))
    deepest = 0.0
    for m in range(many):
        k = columns[m]
        c[m], cl[m] = hi[k], lo[k]
        reach[m] = min(1.0 / (wave_number(nu, c[m]) * c[m]), DEEPEST)  # the d below which the series serves
        deepest = max(deepest, reach[m])
        h[m] = reach[m] * c[m]
        t[0, m], t[1, m], t[2, m], t[3, m] = 0.0, 0.0, value[k], slope[k] * h[m]
    rim_series(nu, robin, c, cl, h, t)
    for j in range(terms):
        for m in range(many):
            f = t[j + n + 2, m]
            for p in range(n):
                f *= (j + n - p) / h[m]
            t[j + 2, m] = f * scale[columns[m]]
    for i in near:
        reached = many if d[i] <= deepest else 0
        while reached > 0 and d[i] > reach[reached - 1]:
            reached -= 1
        for m in range(reached):
            v[m] = -(d[i] + dl[i]) / reach[m]
            s[m] = t[terms + 1, m]
        for j in range(terms, 1, -1):
            for m in range(reached):
                s[m] = fma(s[m], v[m], t[j, m])
        for m in range(reached):
            if d[i] <= reach[m]:
                out[i * hi.size + columns[m]] = s[m]
