"""Tables of the uniform expansion of J_m(m t) through its transition, made once with exact or 85-digit arithmetic.

    J_m(m t) ~ (4 zeta / (1 - t^2))^(1/4) [ m^(-1/3) Ai(m^(2/3) zeta) sum_k A_k(zeta) / m^(2k)
                                           + m^(-5/3) Ai'(m^(2/3) zeta) sum_k B_k(zeta) / m^(2k) ]

(DLMF 10.20.4), (2/3) zeta^(3/2) = xi = artanh(tau) - tau, tau = sqrt(1 - t^2). A_k and B_k are analytic on the real
axis, but their closed forms cancel like zeta^(-3k) at t = 1; so they are evaluated with many digits at Chebyshev's
points and interpolated. Ai becomes Taylor polynomials on panels half a unit wide.
"""

from __future__ import annotations

import math
from decimal import Context, Decimal, localcontext
from functools import cache

import numpy as np

from fbexpand.kernels.debye import DEBYE_TERMS, debye_polynomials
from fbexpand.kernels.kapteyn_sum import SWITCH
from fbexpand.types import FloatArray

FROM_ORDER = 20.0  # where the expansions begin
ZETA_MAX = 1.05 * (1.5 * SWITCH / FROM_ORDER) ** (2.0 / 3.0)
TERMS = 6
AIRY_PANELS = math.ceil(2.0 * (1.5 * SWITCH) ** (2.0 / 3.0) + 0.1)
AIRY_DEGREE = 19
_NODES = 26
_DIGITS = 85
_AI0 = Decimal("0.355028053887817239260063186004183176397979174199177940583326951")
_AI1 = Decimal("0.258819403792806798405183560189203963479091138354934582210001813856")  # -Ai'(0)


@cache
def debye_table() -> FloatArray:
    """Return (DEBYE_TERMS, DEBYE_TERMS): coefficients of u_k in s = 1/tau^2 - 1, U_k(1/tau) = u_k / tau^k.

    In powers of 1/tau^2 they alternate, and cancel for small t to what Stirling's series has there.
    """
    table = np.zeros((DEBYE_TERMS, DEBYE_TERMS))
    for k, row in enumerate(debye_polynomials(DEBYE_TERMS)[0]):
        for j in range(k + 1):
            table[k, j] = float(sum(a * math.comb(i, j) for i, a in enumerate(row) if i >= j))
    table.setflags(write=False)
    return table


@cache
def airy_panels() -> FloatArray:
    """Return (panels, degree + 1): Taylor coefficients of Ai at 1/4, 3/4, 5/4, ..."""
    table = np.zeros((AIRY_PANELS, AIRY_DEGREE + 1))
    with localcontext(Context(prec=60)):
        for i in range(AIRY_PANELS):
            c = Decimal(2 * i + 1) / 4
            value, slope = _airy(c)
            row = [value, slope, c * value / 2]
            for k in range(1, AIRY_DEGREE - 1):
                row.append((c * row[k] + row[k - 1]) / ((k + 2) * (k + 1)))
            table[i] = [float(a) for a in row]
    table.setflags(write=False)
    return table


def _airy(c: Decimal) -> tuple[Decimal, Decimal]:
    """Return Ai(c) and Ai'(c) by the Maclaurin series (DLMF 9.4.1, 9.4.2)."""
    total, slope = Decimal(0), Decimal(0)
    for start, sign_and_size in ((0, _AI0), (1, -_AI1)):
        term, k = sign_and_size * c**start, start
        while k < 12 or abs(term) > Decimal("1e-55"):
            total += term
            slope += term * k / c
            term *= c**3 / ((k + 2) * (k + 3))
            k += 3
    return total, slope


@cache
def coefficient_tables() -> tuple[FloatArray, FloatArray]:
    """Return Chebyshev coefficients (nodes, TERMS) of A_k and B_k on 0 <= zeta <= ZETA_MAX."""
    angles = [math.pi * (i + 0.5) / _NODES for i in range(_NODES)]
    values = np.zeros((2, _NODES, TERMS))
    points = [0.5 * ZETA_MAX * (1.0 + math.cos(angle)) for angle in angles]
    for i, zeta in enumerate(points):
        values[0, i], values[1, i] = _closed_forms(zeta)
    x = np.array(points) / (0.5 * ZETA_MAX) - 1.0
    waves = np.polynomial.chebyshev.chebvander(x, _NODES - 1)
    tables = (2.0 / _NODES) * np.einsum("ij,sik->sjk", waves, values)
    tables[:, 0] *= 0.5
    tables.setflags(write=False)
    return tables[0], tables[1]


def _closed_forms(zeta: float) -> tuple[list[float], list[float]]:
    """Return A_k and B_k at zeta > 0 (DLMF 10.20.10, 10.20.11)."""
    polynomials, _ = debye_polynomials(2 * TERMS)
    with localcontext(Context(prec=_DIGITS)):
        root = Decimal(zeta).sqrt()
        cube = root * Decimal(zeta)
        p = 1 / _tau(2 * cube / 3)
        debye = []
        for k, row in enumerate(polynomials):
            total = Decimal(0)
            for a in reversed(row):
                total = total * p * p + Decimal(a.numerator) / Decimal(a.denominator)
            debye.append(total * p**k)
        u = [Decimal(1)]
        for k in range(1, 2 * TERMS):
            u.append(u[-1] * (6 * k - 5) * (6 * k - 3) * (6 * k - 1) / (216 * k * (2 * k - 1)))
        v = [-a * (6 * k + 1) / (6 * k - 1) for k, a in enumerate(u)]
        step = Decimal(3) / (2 * cube)
        first = [sum(step**j * v[j] * debye[2 * k - j] for j in range(2 * k + 1)) for k in range(TERMS)]
        second = [-sum(step**j * u[j] * debye[2 * k + 1 - j] for j in range(2 * k + 2)) / root for k in range(TERMS)]
        return [float(a) for a in first], [float(b) for b in second]


def _tau(xi: Decimal) -> Decimal:
    """Return the solution 0 < tau < 1 of artanh(tau) - tau = xi, by Newton's method."""
    start = float(xi)
    tau = Decimal(min((3.0 * start) ** (1.0 / 3.0), 1.0 - math.exp(-2.0 * (start + 1.0))))
    for _ in range(60):
        artanh = ((1 + tau) / (1 - tau)).ln() / 2
        change = (artanh - tau - xi) * (1 - tau * tau) / (tau * tau)
        tau -= change
        if abs(change) < tau * Decimal(10) ** (-_DIGITS // 2 - 5):
            return tau
    raise ArithmeticError(f"no solution of artanh(tau) - tau = {start!r}")
