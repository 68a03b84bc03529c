"""Debye's expansions, uniform in the order: I_nu everywhere and J_nu well below its turning point.

With w = sqrt(nu^2 + sigma z^2) and q = (nu/w)^2, sigma = 1 for I and -1 for J (DLMF 10.41.3 and 10.19.3),

    I_nu(z), J_nu(z) ~ exp(w + nu log(z / (nu + w))) / sqrt(2 pi w) sum_k u_k(q) / w^k,
    z (d/dz) log     = w - sigma z^2 / w^2 T,    T = w sum_k d_k(q) / w^k / sum_k u_k(q) / w^k,

where p^k u_k(p^2) is the handbook's U_k(p), and d_k = (k - 1/2) u_{k-1} + 2 q u_{k-1}' comes from U_k - V_k,
whose factor 1 - q = sigma (z/w)^2 is taken out by hand: the difference w - z I'/I loses no digits. T tends to
1/2.
"""

from __future__ import annotations

from fractions import Fraction

import numpy as np

from fbexpand.kernels.dd import dd_add_d, dd_div, dd_mul, dd_mul_d, dd_sqrt
from fbexpand.kernels.jit import callee, kernel

DEBYE_TERMS = 30
DEBYE_FROM = 25.0  # w from which the terms fall below an eps before they grow


def debye_polynomials(terms: int) -> tuple[list[list[Fraction]], list[list[Fraction]]]:
    """Return the coefficients in q, ascending, of u_0 ... and d_0 = 0, d_1 ... (from DLMF 10.41.9)."""
    u = [[Fraction(1)]]
    d = [[Fraction(0)]]
    for k in range(terms - 1):
        old = u[-1]
        d.append([(k + Fraction(1, 2) + 2 * j) * a for j, a in enumerate(old)])
        new = [Fraction(0)] * (k + 2)
        for j, a in enumerate(old):  # the power p^(k + 2 j) of U_k
            power = k + 2 * j
            new[j] += a * (Fraction(power, 2) + Fraction(1, 8 * (power + 1)))
            new[j + 1] -= a * (Fraction(power, 2) + Fraction(5, 8 * (power + 3)))
        u.append(new)
    return u, d


def _table(rows: list[list[Fraction]]) -> np.ndarray:
    table = np.zeros((DEBYE_TERMS, DEBYE_TERMS))
    for k, row in enumerate(rows):
        table[k, : len(row)] = [float(a) for a in row]
    return table


_U, _D = (_table(rows) for rows in debye_polynomials(DEBYE_TERMS))


@kernel
def debye_root(nu: float, zh: float, zl: float, sigma: float) -> tuple[float, float]:
    """Return w = sqrt(nu^2 + sigma z^2) in two parts, for any z if sigma = 1, z < nu if sigma = -1."""
    if zh == 0.0:
        return nu, 0.0
    if zh > nu:
        qh, ql = dd_div(nu, 0.0, zh, zl)
        sh, sl = dd_mul(qh, ql, qh, ql)
        sh, sl = dd_add_d(sh, sl, 1.0)
        sh, sl = dd_sqrt(sh, sl)
        return dd_mul(sh, sl, zh, zl)
    if sigma < 0.0:
        ah, al = dd_add_d(-zh, -zl, nu)
        bh, bl = dd_add_d(zh, zl, nu)
        ah, al = dd_mul(ah, al, bh, bl)
        return dd_sqrt(ah, al)
    qh, ql = dd_div(zh, zl, nu, 0.0)
    sh, sl = dd_mul(qh, ql, qh, ql)
    sh, sl = dd_add_d(sh, sl, 1.0)
    sh, sl = dd_sqrt(sh, sl)
    return dd_mul_d(sh, sl, nu)


@callee
def debye_sums(nu: float, w: float) -> tuple[float, float]:
    """Return sum_k u_k / w^k and T."""
    p = nu / w
    q = p * p
    inverse = 1.0 / w
    power = inverse
    u = (_U[1, 1] * q + _U[1, 0]) * inverse  # what is left of the sums beyond 1 and 1/2: small, so rounding is too
    d = 0.0
    for k in range(2, DEBYE_TERMS):
        a = _U[k, k]
        for j in range(k - 1, -1, -1):
            a = a * q + _U[k, j]
        b = _D[k, k - 1]
        for j in range(k - 2, -1, -1):
            b = b * q + _D[k, j]
        d += b * power
        power *= inverse
        u += a * power
        if abs(a * power) < 1e-18 and abs(b * power) < 1e-17:
            break
    return 1.0 + u, (0.5 + d) / (1.0 + u)
