"""J_nu and J_nu' in double-double at one place, from the order and the place alone, for orders from 14 on.

Away from the turning point Debye's expansions (DLMF 10.19.3 and 10.19.6) hold to 1e-19; at low order the ascending
series covers what lies below. Between them, some cube roots of nu about the turning point, the solution is carried in
by a few wide Taylor steps from the nearer side.

With w^2 = |x^2 - nu^2| and q = +-(nu/w)^2, + below the turning point, U_k(p)/nu^k of the handbook is u_k(q)/w^k there,
and i^k u_k(q)/w^k beyond it; likewise V_k.
"""

from __future__ import annotations

import math
from fractions import Fraction

import numpy as np

from fbexpand.kernels.bessel_direct import ascending_pair, taylor, taylor_step
from fbexpand.kernels.dd import dd_add, dd_add_d, dd_div, dd_mul, dd_mul_d, dd_sqrt
from fbexpand.kernels.debye import debye_polynomials
from fbexpand.kernels.elementary import PI1, PI2, dd_exp, dd_log, dd_sincos
from fbexpand.kernels.jit import callee
from fbexpand.types import FloatArray

DEBYE_REACH = 8.7  # cube roots of nu below the turning point, from where Debye's expansions hold; beyond it
DEBYE_PHASE = 24.0  # they do from this phase w - nu acos(nu/x) on
CHAIN = 32  # places of a chain at most: 9 are needed
CHAIN_TERMS = 44
CHAIN_EXACT = 20  # terms in two parts of a wide step
_TERMS = 30
_SMALL = 1e-21


def _rows() -> tuple[np.ndarray, np.ndarray]:
    """Return the coefficients of u_k and v_k = u_k - (1 - q) d_k in q, ascending."""
    u, d = debye_polynomials(_TERMS)
    first, second = np.zeros((_TERMS, _TERMS)), np.zeros((_TERMS, _TERMS))
    for k in range(_TERMS):
        row = [*u[k], *[Fraction(0)] * (_TERMS - len(u[k]))]
        first[k] = [float(a) for a in row]
        for j, a in enumerate(d[k]):
            row[j] -= a
            row[j + 1] += a
        second[k] = [float(a) for a in row]
    return first, second


_U, _V = _rows()


@callee
def root_of(nh: float, nl: float, xh: float, xl: float) -> tuple[float, float]:
    """Return w = sqrt(|x^2 - nu^2|)."""
    ah, al = dd_add(xh, xl, -nh, -nl)
    bh, bl = dd_add(xh, xl, nh, nl)
    ah, al = dd_mul(ah, al, bh, bl)
    if ah < 0.0:
        ah, al = -ah, -al
    return dd_sqrt(ah, al)


@callee
def debye_below(nh: float, nl: float, x: float) -> tuple[float, float, float, float, int]:
    """Return J and J' at x < nu as (jh, jl, dh, dl, e), scaled by 2^-e."""
    wh, wl = root_of(nh, nl, x, 0.0)
    ih, il = dd_div(1.0, 0.0, wh, wl)
    ph, pl = dd_mul(nh, nl, ih, il)
    qh, ql = dd_mul(ph, pl, ph, pl)
    # u_1 = (3 - 5 q)/24, v_1 = (7 q - 9)/24 in two parts; the rest is below 1e-4
    ah, al = dd_mul_d(qh, ql, -5.0)
    ah, al = dd_add_d(ah, al, 3.0)
    bh, bl = dd_mul_d(qh, ql, 7.0)
    bh, bl = dd_add_d(bh, bl, -9.0)
    gh, gl = dd_div(ih, il, 24.0, 0.0)
    ah, al = dd_mul(ah, al, gh, gl)
    bh, bl = dd_mul(bh, bl, gh, gl)
    u = 0.0
    v = 0.0
    power = ih
    for k in range(2, _TERMS):
        power *= ih
        s = _U[k, k]
        t = _V[k, k]
        for j in range(k - 1, -1, -1):
            s = s * qh + _U[k, j]
            t = t * qh + _V[k, j]
        u += s * power
        v += t * power
        if abs(s * power) + abs(t * power) < _SMALL:
            break
    ah, al = dd_add_d(ah, al, u)
    ah, al = dd_add_d(ah, al, 1.0)
    bh, bl = dd_add_d(bh, bl, v)
    bh, bl = dd_add_d(bh, bl, 1.0)
    # exp(w - nu log((nu + w)/x)) / sqrt(2 pi w)
    sh, sl = dd_add(nh, nl, wh, wl)
    sh, sl = dd_div(sh, sl, x, 0.0)
    sh, sl = dd_log(sh, sl)
    sh, sl = dd_mul(sh, sl, nh, nl)
    sh, sl = dd_add(wh, wl, -sh, -sl)
    fh, fl, e = dd_exp(sh, sl)
    gh, gl = dd_mul(wh, wl, 2.0 * PI1, 2.0 * PI2)
    gh, gl = dd_sqrt(gh, gl)
    fh, fl = dd_div(fh, fl, gh, gl)
    jh, jl = dd_mul(fh, fl, ah, al)
    fh, fl = dd_mul(fh, fl, wh, wl)
    fh, fl = dd_div(fh, fl, x, 0.0)
    dh, dl = dd_mul(fh, fl, bh, bl)
    return jh, jl, dh, dl, e


@callee
def debye_sums_above(
    nh: float, nl: float, wh: float, wl: float
) -> tuple[float, float, float, float, float, float, float, float]:
    """Return A - 1, B, C - 1 and D beyond the turning point: J = sqrt(2/(pi w)) (A cos xi + B sin xi).

    J' = sqrt(2/(pi w)) (w/x) (D cos xi - C sin xi), xi = w - nu acos(nu/x) - pi/4.
    """
    ih, il = dd_div(1.0, 0.0, wh, wl)
    ph, pl = dd_mul(nh, nl, ih, il)
    qh, ql = dd_mul(ph, pl, ph, pl)
    bh, bl = dd_mul_d(qh, ql, 5.0)
    bh, bl = dd_add_d(bh, bl, 3.0)
    dh, dl = dd_mul_d(qh, ql, -7.0)
    dh, dl = dd_add_d(dh, dl, -9.0)
    gh, gl = dd_div(ih, il, 24.0, 0.0)
    bh, bl = dd_mul(bh, bl, gh, gl)
    dh, dl = dd_mul(dh, dl, gh, gl)
    a = 0.0
    b = 0.0
    c = 0.0
    d = 0.0
    power = ih
    for k in range(2, _TERMS):
        power *= ih
        s = _U[k, k]
        t = _V[k, k]
        for j in range(k - 1, -1, -1):
            s = _U[k, j] - s * qh
            t = _V[k, j] - t * qh
        s *= power if k & 2 == 0 else -power
        t *= power if k & 2 == 0 else -power
        if k & 1 == 0:
            a += s
            c += t
        else:
            b += s
            d += t
        if abs(s) + abs(t) < _SMALL:
            break
    bh, bl = dd_add_d(bh, bl, b)
    dh, dl = dd_add_d(dh, dl, d)
    return a, 0.0, bh, bl, c, 0.0, dh, dl


@callee
def debye_phase(nh: float, nl: float, xh: float, xl: float, wh: float, wl: float) -> tuple[float, float]:
    """Return nu acos(nu/x) + pi/4."""
    guess = math.atan2(wh, nh)
    sh, sl, ch, cl = dd_sincos(guess, 0.0)
    ph, pl = dd_mul(wh, wl, ch, cl)
    qh, ql = dd_mul(nh, nl, sh, sl)
    ph, pl = dd_add(ph, pl, -qh, -ql)
    ph, pl = dd_div(ph, pl, xh, xl)  # the sine of what is missing, below 1e-15
    ph, pl = dd_add_d(ph, pl, guess)
    ph, pl = dd_mul(ph, pl, nh, nl)
    return dd_add(ph, pl, 0.25 * PI1, 0.25 * PI2)


@callee
def debye_above(nh: float, nl: float, x: float) -> tuple[float, float, float, float]:
    """Return J and J' at x > nu."""
    wh, wl = root_of(nh, nl, x, 0.0)
    ah, al, bh, bl, ch, cl, dh, dl = debye_sums_above(nh, nl, wh, wl)
    ah, al = dd_add_d(ah, al, 1.0)
    ch, cl = dd_add_d(ch, cl, 1.0)
    ph, pl = debye_phase(nh, nl, x, 0.0, wh, wl)
    ph, pl = dd_add(wh, wl, -ph, -pl)
    snh, snl, csh, csl = dd_sincos(ph, pl)
    gh, gl = dd_mul(wh, wl, 0.5 * PI1, 0.5 * PI2)
    gh, gl = dd_div(1.0, 0.0, gh, gl)
    gh, gl = dd_sqrt(gh, gl)
    ph, pl = dd_mul(ah, al, csh, csl)
    qh, ql = dd_mul(bh, bl, snh, snl)
    ph, pl = dd_add(ph, pl, qh, ql)
    jh, jl = dd_mul(ph, pl, gh, gl)
    ph, pl = dd_mul(dh, dl, csh, csl)
    qh, ql = dd_mul(ch, cl, snh, snl)
    ph, pl = dd_add(ph, pl, -qh, -ql)
    gh, gl = dd_mul(gh, gl, wh, wl)
    gh, gl = dd_div(gh, gl, x, 0.0)
    dh, dl = dd_mul(ph, pl, gh, gl)
    return jh, jl, dh, dl


@callee
def debye_from(nu: float) -> float:
    """Return a whole number from which on Debye's expansions hold beyond the turning point."""
    x = nu + DEBYE_REACH * np.cbrt(nu)
    for _ in range(4):
        w = math.sqrt((x - nu) * (x + nu))
        x += (DEBYE_PHASE - (w - nu * math.atan2(w, nu))) * x / w
    return float(math.ceil(x))


@callee
def ascending_reach(nu: float) -> float:
    """Return up to where the ascending series keeps 20 digits in double-double."""
    return max(24.0, math.sqrt(44.0 * (nu + 1.0)))


@callee
def _towards(nh: float, nl: float, x: float, up: bool, chain: FloatArray, wide: FloatArray) -> int:
    """Extend a chain of places (c, J, J' in two parts each) toward x; return the last that lies before x.

    The places do not depend on x. Between them the function turns by up to 4.7, or they are 2.2 cube roots of nu apart.
    """
    i = int(np.int64(0))
    while True:
        c = chain[i, 0]
        step = 2.2 * np.cbrt(nh)
        if c != nh:
            step = min(step, 4.7 * c / math.sqrt(abs(c - nh) * (c + nh)))
        step = math.floor(16.0 * step) / 16.0  # so that c + step is exact
        after = c + step if up else c - step
        if (after > x) if up else (after < x):
            return i
        if chain[i + 1, 0] != after:
            taylor(nh, nl, c, chain[i, 1], chain[i, 2], chain[i, 3], chain[i, 4], wide, CHAIN_EXACT)
            jh, jl, dh, dl = taylor_step(wide, after - c, CHAIN_EXACT)
            chain[i + 1, 0] = after
            chain[i + 1, 1], chain[i + 1, 2], chain[i + 1, 3], chain[i + 1, 4] = jh, jl, dh, dl
        i += 1


@callee
def station(
    nh: float, nl: float, x: float, gh: float, gl: float, chains: FloatArray, wide: FloatArray
) -> tuple[float, float, float, float, int]:
    """Return J and J' at x as (jh, jl, dh, dl, e), scaled by 2^-e; g = log Gamma(nu + 1).

    `chains` (2, CHAIN, 6), zeros at first, keeps what is shared by places about the turning point of one order.
    """
    low = nh - DEBYE_REACH * np.cbrt(nh)
    if x <= low:
        return debye_below(nh, nl, x)
    reach = ascending_reach(nh)
    if x <= reach:
        return ascending_pair(nh, nl, x, gh, gl)
    high = debye_from(nh)
    e = int(np.int64(0))
    if x >= high:
        jh, jl, dh, dl = debye_above(nh, nl, x)
        return jh, jl, dh, dl, e
    start = float(math.floor(max(low, reach)))
    up = x - start <= high - x
    chain = chains[0] if up else chains[1]
    if chain[0, 0] == 0.0:
        if not up:
            chain[0, 0] = high
            chain[0, 1], chain[0, 2], chain[0, 3], chain[0, 4] = debye_above(nh, nl, high)
        else:
            if low >= reach:
                jh, jl, dh, dl, e = debye_below(nh, nl, start)
            else:
                jh, jl, dh, dl, e = ascending_pair(nh, nl, start, gh, gl)
            chain[0, 0] = start
            chain[0, 1], chain[0, 2], chain[0, 3], chain[0, 4] = jh, jl, dh, dl
            chain[0, 5] = e
    i = _towards(nh, nl, x, up, chain, wide)
    taylor(nh, nl, chain[i, 0], chain[i, 1], chain[i, 2], chain[i, 3], chain[i, 4], wide, CHAIN_EXACT)
    jh, jl, dh, dl = taylor_step(wide, x - chain[i, 0], CHAIN_EXACT)
    return jh, jl, dh, dl, int(chain[0, 5])
