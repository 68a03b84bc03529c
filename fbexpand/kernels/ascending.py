"""Partial sums of the ascending series of J_nu with a proven bound of their distance from J_nu.

S_n = sum_{k<n} (-1)^k t_k, t_k = (x/2)^(2k+nu) / (k! Gamma(k+nu+1)).

Remainder. For nu > -1/2, by Poisson (DLMF 10.9.4),
    J_nu(x) = (x/2)^nu / (sqrt(pi) Gamma(nu+1/2)) int_{-1}^{1} (1-s^2)^(nu-1/2) cos(x s) ds,
and the Taylor sum of a cosine to n terms is off by at most the first term left out. Hence |J_nu - S_n| <= t_n
for every x >= 0 and every n, whether the terms fall already or not. With n = 0, |J_nu| <= t_0; for nu >= 0
also |J_nu| <= 1. So, whatever number v is returned, |J_nu - v| <= |v| + min(t_0, 1) (t_0 for nu < 0), which
is the smaller bound where terms still grow.

Rounding, D = 2^-100 an operation (see `bounded`). q = (x/2)^2 and nu + k are exact in two parts.
t_k = t_{k-1} q / (k (nu + k)) costs three operations, so t_k is off by 3 k D t_k apart from the first factor,
whose relative error (bound p) is common to all terms; n sums cost D times the sum of the t_k each. In all
    p |S| + D (3 sum k t_k + n sum t_k),
evaluated upward (by 2^-16, which covers p in t_n and t_0 as well), and an eps of the value for its rounding
to a double (half of that is needed).

The sum may stop early, at j < n with t_j below 2^-140 of the sum of the terms: S_j serves as S_n then, and
|J_nu - S_j| <= t_j. A power of two common to the sum and the current term is carried apart.
"""

from __future__ import annotations

import math

from fbexpand.kernels.bounded import OPERATION, log_gamma_bounded, power_bounded
from fbexpand.kernels.dd import dd_add, dd_div, dd_mul, dd_mul_d, two_prod, two_sum
from fbexpand.kernels.jit import callee, kernel
from fbexpand.types import FloatArray

_ROUND_UP = 1.0 + 2.0**-16
_TINIEST = 2.0**-1073
_NEGLIGIBLE = 2.0**-140
_SHIFT = 300
_DOWN = 2.0**-300


@callee
def scaled(value: float, exponent: int) -> float:
    """Return value 2^exponent."""
    exponent = max(min(exponent, 3000), -3000)
    half = exponent // 4
    f = math.ldexp(1.0, half)
    return value * f * f * f * math.ldexp(1.0, exponent - 3 * half)


@callee
def ascending_point(nu: float, x: float, terms: int, gh: float, gl: float, g_error: float) -> tuple[float, float]:
    """Return the partial sum at x >= 0 and the bound of |J_nu(x) - sum|."""
    if math.isnan(x):
        return math.nan, math.nan
    if x == 0.0:
        if nu < 0.0:
            return math.inf, math.inf
        return (1.0 if nu == 0.0 else 0.0), 0.0
    if x == math.inf:
        return (math.inf if terms % 2 == 1 else -math.inf), math.inf
    th, tl, exponent, relative = power_bounded(nu, x, gh, gl, g_error)
    if relative == math.inf:
        return 0.0, math.inf
    first, first_exponent = th, exponent
    m, e = math.frexp(x)
    step = 0  # the power of two by which q is too large to be one number
    if e > 200:
        step = 2 * e - 2
        qh, ql = two_prod(m, m)
    elif e < -200:
        qh, ql = 2.0**-400, 0.0  # not less than q, and below every threshold that follows
    else:
        qh, ql = two_prod(0.5 * x, 0.5 * x)
    sh, sl = 0.0, 0.0
    total = 0.0  # sum of the t_k
    weighted = 0.0  # sum of k t_k
    k = 0
    while True:
        if k % 2 == 0:
            sh, sl = dd_add(sh, sl, th, tl)
        else:
            sh, sl = dd_add(sh, sl, -th, -tl)
        total += th
        weighted += k * th
        if scaled(th, exponent) == math.inf:
            return (math.inf if k % 2 == 0 else -math.inf), math.inf
        k += 1
        ch, cl = two_sum(nu, float(k))
        ch, cl = dd_mul_d(ch, cl, float(k))
        th, tl = dd_mul(th, tl, qh, ql)
        th, tl = dd_div(th, tl, ch, cl)
        if step > 0:
            f = math.ldexp(1.0, -step)
            sh, sl, total, weighted = sh * f, sl * f, total * f, weighted * f
            exponent += step
        if th > 2.0**_SHIFT:
            th, tl, sh, sl = th * _DOWN, tl * _DOWN, sh * _DOWN, sl * _DOWN
            total, weighted = total * _DOWN, weighted * _DOWN
            exponent += _SHIFT
        if k >= terms or th < _NEGLIGIBLE * total:
            break
    rounding = relative * abs(sh) + OPERATION * (3.0 * weighted + k * total)
    value = scaled(sh, exponent)
    one = min(scaled(first, first_exponent), 1.0) if nu >= 0.0 else scaled(first, first_exponent)
    error = (scaled(rounding, exponent) + scaled(th, exponent)) * _ROUND_UP + 2.0**-52 * abs(value)
    return value, min(error, (abs(value) + one) * _ROUND_UP) + _TINIEST


@kernel
def ascending(nu: float, x: FloatArray, terms: int, values: FloatArray, errors: FloatArray) -> None:
    """Fill values and errors with the sum of `terms` terms at each x >= 0 and its bound; nu > -1/2."""
    gh, gl, g_error = log_gamma_bounded(nu)
    for i in range(x.size):
        values[i], errors[i] = ascending_point(nu, x[i], terms, gh, gl, g_error)
