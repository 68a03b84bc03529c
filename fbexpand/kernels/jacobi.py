"""Gauss-Jacobi rules of any size for integrals of g r dr: from zero to zero by Taylor steps, in double-double.

With t = r^2 and p_n the polynomials orthogonal under t^a dt on [0, 1], v = t^(a/2) p_n obeys

    t^2 (1 - t) v'' + t (1 - 2 t) v' + ((n + a/2) (n + a/2 + 1) t - a^2/4) v = 0,   v(1) = 1,

whose Taylor coefficients about any point follow from a recurrence of four terms. The zeros are found one by one from
the rim inward (after Glaser, Liu and Rokhlin 2007), and the rule's weight at each, for the plain integral of g dt with
g = t^a times a polynomial, is 1 / (t (1 - t) v'^2): one formula for any n and a, with no Gamma function in it.
"""

from __future__ import annotations

import math

import numpy as np

from fbexpand.kernels.dd import dd_add, dd_add_d, dd_div, dd_mul, dd_mul_d, dd_sqrt, two_prod, two_sum
from fbexpand.kernels.jit import callee, inline_kernel, kernel
from fbexpand.types import FloatArray

_MOST_TERMS = 90  # of a Taylor step
_REACH = 0.4  # of the distance to 0 or 1, the longest step
_SMALL = 1e-29  # where the terms of a step are left out


@callee
def taylor_step(state: FloatArray, c0: FloatArray, h: float, h_low: float) -> None:
    """Move state = (t, t_low, v, v_low, v', v'_low) by h + h_low; c0 holds a^2/4 and (n + a/2)(n + a/2 + 1), two parts.

    At t = 1, where the equation is singular, v' is not an input.
    """
    t, tl = state[0], state[1]
    sh, sl = dd_add_d(-t, -tl, 1.0)
    rim = sh == 0.0
    th2, tl2 = dd_mul(t, tl, t, tl)
    a0h, a0l = dd_mul(th2, tl2, sh, sl)
    xh, xl = dd_mul_d(t, tl, 3.0)
    xh, xl = dd_add_d(-xh, -xl, 2.0)
    a1h, a1l = dd_mul(t, tl, xh, xl)
    xh, xl = dd_mul_d(t, tl, 3.0)
    a2h, a2l = dd_add_d(-xh, -xl, 1.0)
    xh, xl = dd_add_d(-2.0 * t, -2.0 * tl, 1.0)
    b0h, b0l = dd_mul(t, tl, xh, xl)
    b1h, b1l = dd_add_d(-4.0 * t, -4.0 * tl, 1.0)
    yh, yl = dd_mul(c0[2], c0[3], t, tl)
    gh, gl = dd_add(yh, yl, -c0[0], -c0[1])
    # u_k = c_k h^k: the recurrence with h multiplied in
    h2h, h2l = dd_mul(h, h_low, h, h_low)
    h3h, h3l = dd_mul(h2h, h2l, h, h_low)
    p2h, p2l = 0.0, 0.0  # u_{k-1}
    p1h, p1l = state[2], state[3]  # u_k
    qh, ql = 0.0, 0.0  # u_{k+1}
    if rim:
        xh, xl = dd_mul(gh, gl, h, h_low)
        qh, ql = dd_mul(p1h, p1l, xh, xl)
    else:
        qh, ql = dd_mul(state[4], state[5], h, h_low)
    vh, vl = dd_add(p1h, p1l, qh, ql)
    dh, dl = qh, ql  # h v'
    size = abs(p1h) + abs(qh)
    quiet = 0
    for k in range(_MOST_TERMS):
        kf = float(k)
        if rim:  # (k+2)^2 u_{k+2} = (g - (k+1)(2k+3)) h u_{k+1} + (c1 - k (k+1)) h^2 u_k
            xh, xl = dd_add_d(gh, gl, -(kf + 1.0) * (2.0 * kf + 3.0))
            xh, xl = dd_mul(xh, xl, h, h_low)
            xh, xl = dd_mul(xh, xl, qh, ql)
            yh, yl = dd_add_d(c0[2], c0[3], -kf * (kf + 1.0))
            yh, yl = dd_mul(yh, yl, h2h, h2l)
            yh, yl = dd_mul(yh, yl, p1h, p1l)
            xh, xl = dd_add(xh, xl, yh, yl)
            nh, nl = dd_div(xh, xl, (kf + 2.0) * (kf + 2.0), 0.0)
        else:
            xh, xl = dd_mul_d(a1h, a1l, kf)
            xh, xl = dd_add(xh, xl, b0h, b0l)
            xh, xl = dd_mul_d(xh, xl, kf + 1.0)
            xh, xl = dd_mul(xh, xl, h, h_low)
            xh, xl = dd_mul(xh, xl, qh, ql)
            yh, yl = dd_mul_d(a2h, a2l, kf * (kf - 1.0))
            zh, zl = dd_mul_d(b1h, b1l, kf)
            yh, yl = dd_add(yh, yl, zh, zl)
            yh, yl = dd_add(yh, yl, gh, gl)
            yh, yl = dd_mul(yh, yl, h2h, h2l)
            yh, yl = dd_mul(yh, yl, p1h, p1l)
            xh, xl = dd_add(xh, xl, yh, yl)
            yh, yl = dd_add_d(c0[2], c0[3], -(kf - 1.0) * kf)
            yh, yl = dd_mul(yh, yl, h3h, h3l)
            yh, yl = dd_mul(yh, yl, p2h, p2l)
            xh, xl = dd_add(xh, xl, yh, yl)
            yh, yl = dd_mul_d(a0h, a0l, -(kf + 2.0) * (kf + 1.0))
            nh, nl = dd_div(xh, xl, yh, yl)
        p2h, p2l, p1h, p1l, qh, ql = p1h, p1l, qh, ql, nh, nl
        vh, vl = dd_add(vh, vl, nh, nl)
        xh, xl = dd_mul_d(nh, nl, kf + 2.0)
        dh, dl = dd_add(dh, dl, xh, xl)
        size = max(size, abs(nh))
        quiet = quiet + 1 if (kf + 2.0) * abs(nh) < _SMALL * size else 0
        if quiet == 3:
            break
    state[0], state[1] = dd_add(t, tl, h, h_low)
    state[2], state[3] = vh, vl
    state[4], state[5] = dd_div(dh, dl, h, h_low)


@inline_kernel
def turning(n: float, a: float, angle: float) -> float:
    """Return q of u'' + q u = 0, u = sqrt(sin angle) v, t = cos(angle / 2)^2."""
    s, c = math.sin(angle), math.cos(0.5 * angle)
    b = 0.5 * a
    return (n + b + 0.5) ** 2 + 0.25 / (s * s) - b * b / (c * c)


@callee
def next_zero(n: float, a: float, c: FloatArray, state: FloatArray, angle: float, guess: float) -> float:
    """Move `state` from the angle to the zero of v near the guess; return the zero's angle."""
    half = math.cos(0.5 * guess)
    h = half * half - state[0]
    reach = _REACH * min(state[0], 1.0 - state[0])
    while abs(h) > reach:
        taylor_step(state, c, math.copysign(reach, h), 0.0)
        h = half * half - state[0]
        reach = _REACH * min(state[0], 1.0 - state[0])
    if h != 0.0:
        taylor_step(state, c, h, 0.0)
    for step in range(8):
        sh, _ = dd_add_d(-state[0], -state[1], 1.0)
        reach = _REACH * min(state[0], sh)
        xh, xl = dd_div(state[2], state[3], state[4], state[5])
        if abs(xh) < 1e-26 * reach:
            break
        if step < 2 and abs(xh) > 1e-6 * reach:  # as a wave, not as a straight line
            root = math.sqrt(state[0] * sh)  # dt = -root d(angle)
            here = 2.0 * math.atan2(math.sqrt(sh), math.sqrt(state[0]))
            w = math.sqrt(max(turning(n, a, here), 1.0))
            slope = -root / xh + (state[0] - sh) / (4.0 * root)  # u'/u
            after = here - math.atan(w / slope) / w
            after = min(max(after, 0.5 * here), 0.5 * (here + math.pi))
            xh, xl = math.sin(0.5 * (here + after)) * math.sin(0.5 * (after - here)), 0.0
            if abs(xh) > reach:
                xh = math.copysign(reach, xh)
        taylor_step(state, c, -xh, -xl)
    return 2.0 * math.atan2(math.sqrt(1.0 - state[0]), math.sqrt(state[0]))


@callee
def zeros_inward(a: float, t: FloatArray, t_low: FloatArray, weights: FloatArray) -> None:
    """Fill the nodes t + t_low in (0, 1), ascending, and the weights of the plain integral over t."""
    count = t.size
    n = float(count)
    c = np.empty(4)
    c[0], c[1] = two_prod(0.5 * a, 0.5 * a)
    xh, xl = two_sum(n, 0.5 * a)
    yh, yl = dd_add_d(xh, xl, 1.0)
    c[2], c[3] = dd_mul(xh, xl, yh, yl)
    state = np.zeros(6)
    state[0], state[2] = 1.0, 1.0
    lead = c[2] - c[0]
    taylor_step(state, c, -min(1.0 / lead, 0.25), 0.0)
    angle = 2.0 * math.acos(math.sqrt(state[0]))
    guess = 2.0 * math.asin(math.sqrt(min(1.4457964907366961 / (lead + 0.34), 0.9)))  # the first zero of J_0, halved
    guess = max(guess, angle)
    for found in range(count):
        if found > 0:
            q = turning(n, a, angle)
            step = math.pi / math.sqrt(max(q, 1.0))
            for _ in range(4):
                middle = min(angle + 0.5 * step, 0.5 * (angle + math.pi))
                q = max(turning(n, a, middle), 0.25 * q)
                step = math.pi / math.sqrt(max(q, 1.0))
            guess = min(angle + step, 0.5 * (angle + math.pi))
        angle = next_zero(n, a, c, state, angle, guess)
        at = count - 1 - found
        t[at], t_low[at] = state[0], state[1]
        sh, _ = dd_add_d(-state[0], -state[1], 1.0)
        weights[at] = 1.0 / (state[0] * sh * state[4] * state[4])


@kernel
def jacobi_radii(a: float, scale: float, r: FloatArray, low: FloatArray, weights: FloatArray) -> None:
    """Fill radii r + low in (0, scale), ascending, and the weights of the integral of g r dr from 0 to scale.

    Exact for g = r^(2 a) times polynomials in r^2 of degree 2 r.size - 1. a >= 0.
    """
    zeros_inward(a, r, low, weights)
    for i in range(r.size):
        h, l = dd_sqrt(r[i], low[i])
        r[i], low[i] = dd_mul_d(h, l, scale)
        weights[i] *= 0.5 * scale * scale


@kernel
def panel_radii(
    begin: float, end: float, power: float, odd: FloatArray, r: FloatArray, low: FloatArray, weights: FloatArray
) -> None:
    """Fill radii and weights of the integral of g r dr between two radii, by Gauss-Legendre in a mapped variable.

    r = u^power, power a whole number or 1/2; u is affine in the odd polynomial s (odd[0] + odd[1] s^2 + ...), which
    rises from s = -1 to 1; `begin` and `end` are values of u.
    """
    zeros_inward(0.0, r, low, weights)
    gh, gl = 0.0, 0.0
    for j in range(odd.size):
        gh, gl = dd_add_d(gh, gl, odd[j])
    ah, al = two_sum(end, -begin)
    ah, al = dd_mul_d(ah, al, 0.5)
    for i in range(r.size):
        th, tl = dd_mul_d(r[i], low[i], 2.0)
        th, tl = dd_add_d(th, tl, -1.0)
        zh, zl = dd_mul(th, tl, th, tl)
        ph, pl = 0.0, 0.0
        slope = 0.0
        for j in range(odd.size - 1, -1, -1):
            ph, pl = dd_mul(ph, pl, zh, zl)
            ph, pl = dd_add_d(ph, pl, odd[j])
            slope = slope * zh + (2.0 * j + 1.0) * odd[j]
        ph, pl = dd_mul(ph, pl, th, tl)
        ph, pl = dd_div(ph, pl, gh, gl)
        # from the nearer end, so that the distance to it keeps its digits
        if th < 0.0:
            xh, xl = dd_add_d(ph, pl, 1.0)
            xh, xl = dd_mul(xh, xl, ah, al)
            uh, ul = dd_add_d(xh, xl, begin)
        else:
            xh, xl = dd_add_d(ph, pl, -1.0)
            xh, xl = dd_mul(xh, xl, ah, al)
            uh, ul = dd_add_d(xh, xl, end)
        w = 2.0 * weights[i] * (slope / gh) * ah
        if power == 0.5:
            r[i], low[i] = dd_sqrt(uh, ul)
            weights[i] = 0.5 * w
        else:
            vh, vl = 1.0, 0.0
            for _ in range(int(power) - 1):
                vh, vl = dd_mul(vh, vl, uh, ul)
            r[i], low[i] = dd_mul(vh, vl, uh, ul)
            weights[i] = w * power * vh * r[i]
