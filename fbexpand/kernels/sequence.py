"""J_nu, J_{nu+1}, ..., J_{nu+count-1} at many points, from J_nu and J_nu', by the three-term recurrence.

J_{n+1} = (2 (nu + n) / x) J_n - J_{n-1} (DLMF 10.6.1) is run in double-double, with nu + n and 2/x in two
parts.

Forward where nu + n <= x. There the recurrence is neutral, and an error of the start is carried along as a
multiple of the modulus. The start is the pair (J, J'), not (J_nu, J_{nu+1}): by the Wronskian 2 / (pi x) the
former pair fixes the solution to its own accuracy up to the turning point, the latter one is nearly parallel
there.

Backward where nu + n > x. There J is the falling solution, so the recurrence is started `t` orders above the
last one asked for with an arbitrary value (Miller's method), and its scale is taken from the forward value at
the order just below x, where J is positive and about as large as the modulus; for x < nu the scale is J_nu
itself.

The points are taken in blocks: the inner loops run over a block without branches, a point that has not begun
or has ended is selected away, so a value depends on its own point only.
"""

from __future__ import annotations

import math

import numpy as np

from fbexpand.kernels.dd import dd_div, dd_mul, dd_mul_d, quick_two_sum, two_prod, two_sum
from fbexpand.kernels.jit import callee, inline_kernel, kernel
from fbexpand.types import FloatArray

BLOCK = 32
TINY = 2.0**-30  # below, J_{n+1} / J_n is x / (2 (nu + n + 1)) to a relative 2^-62
_SEED = 2.0**-400
_HIGH = 2.0**450
_HALF_DOWN = 2.0**-450
_DOWN = 2.0**-900


@callee
def extra_orders(top: float, x: float) -> float:
    """Return how far above order `top` > x to start, so that the growing solution dies out below 2^-60 of J.

    A step at order n damps it by exp(-2 arccosh(n / x)); the sum of arccosh((top + k) / x), k <= t, must pass
    21. Bounded below by its first term, or, at the turning point, by (2/3) sqrt(2 / x) t^(3/2).
    """
    turning = 8.0 * x ** (1.0 / 3.0) + 8.0
    slope = math.acosh(top / x)
    if slope * turning > 21.0:
        turning = 21.0 / slope
    return float(math.ceil(min(turning, 1e6))) + 2.0  # the cap is reached at an order of 2e15 only


@inline_kernel
def _step(
    ch: float, cl: float, wh: float, wl: float, fh: float, fl: float, gh: float, gl: float
) -> tuple[float, float]:
    """Return c w f - g in double-double, relative to the larger of the two about 2^-101."""
    ah, e = two_prod(ch, wh)
    al = e + (ch * wl + cl * wh)
    ph, e = two_prod(ah, fh)
    pl = e + (ah * fl + al * fh)
    sh, e = two_sum(ph, -gh)
    return quick_two_sum(sh, e + (pl - gl))


@callee
def tiny_points(nu: float, x: float, j: float, out: FloatArray) -> None:
    """Fill out (count,) for 0 <= x < TINY from j = J_nu(x), which may be 0."""
    h, low = j, 0.0
    out[0] = j
    for n in range(1, out.shape[0]):
        ch, cl = two_sum(nu, float(n))
        qh, ql = dd_div(0.5 * x, 0.0, ch, cl)
        h, low = dd_mul(h, low, qh, ql)
        out[n] = h


@kernel
def sequence(nu: float, x: FloatArray, j: FloatArray, slope: FloatArray, out: FloatArray) -> None:
    """Fill out (m, count) with J_{nu+n}(x), 0 <= x < inf; `slope` is read where x >= max(nu, TINY) only."""
    points = x.shape[0]
    count = out.shape[1]
    top = nu + (count - 1.0)
    buffer = np.empty((count + 1, BLOCK))  # the last row takes what lies above the last order
    wh = np.empty(BLOCK)
    wl = np.empty(BLOCK)
    fh = np.empty(BLOCK)
    fl = np.empty(BLOCK)
    gh = np.empty(BLOCK)
    gl = np.empty(BLOCK)
    last = np.empty(BLOCK)  # the last order run forward, counted from nu
    begin = np.empty(BLOCK)  # the order at which the backward run begins
    anchor = np.empty(BLOCK)
    inverse = np.empty(BLOCK)
    level = np.empty(BLOCK)
    for first in range(0, points, BLOCK):
        lanes = min(BLOCK, points - first)
        forward = 0
        lowest = count
        highest = -1
        for i in range(BLOCK):
            t = x[first + min(i, lanes - 1)]
            s = j[first + min(i, lanes - 1)]
            last[i] = count - 1.0
            begin[i] = -1.0
            wh[i], wl[i] = 1.0, 0.0
            fh[i], fl[i] = s, 0.0
            gh[i], gl[i] = 0.0, 0.0
            anchor[i] = s
            if t >= TINY:
                wh[i], wl[i] = dd_div(2.0, 0.0, t, 0.0)
                if t >= nu:
                    last[i] = min(np.floor(t - nu), count - 1.0)
                    ph, pl = dd_mul_d(0.5 * wh[i], 0.5 * wl[i], nu)
                    ph, pl = dd_mul_d(ph, pl, s)
                    sh, e = two_sum(ph, -slope[first + min(i, lanes - 1)])
                    gh[i], gl[i] = quick_two_sum(sh, e + pl)
                    forward = max(forward, int(last[i]))
                else:
                    last[i] = 0.0
                if top > t and last[i] < count - 1.0:
                    begin[i] = count - 1.0 + extra_orders(top, t)
                    highest = max(highest, int(begin[i]))
                    lowest = min(lowest, int(last[i]))
            buffer[0, i] = s
        for n in range(1, forward + 1):  # g is J_{nu+n}, f the one before
            ch, cl = two_sum(nu, float(n))
            for i in range(BLOCK):
                buffer[n, i] = gh[i]
                anchor[i] = gh[i] if n == last[i] else anchor[i]
                ph, pl = _step(ch, cl, wh[i], wl[i], gh[i], gl[i], fh[i], fl[i])
                fh[i], fl[i] = gh[i], gl[i]
                gh[i], gl[i] = ph, pl
        if highest >= 0:
            for i in range(BLOCK):
                fh[i], fl[i], gh[i], gl[i] = 0.0, 0.0, 0.0, 0.0
                inverse[i] = 1.0
                level[i] = 1.0
            for n in range(highest, lowest - 1, -1):  # f is a multiple of J_{nu+n}, g the one above
                ch, cl = two_sum(nu, float(n))
                row = min(n, count)
                for i in range(BLOCK):
                    f = _SEED if n == begin[i] else fh[i]
                    buffer[row, i] = f if n > last[i] else buffer[row, i]
                    inverse[i] = f if n == last[i] else inverse[i]
                    ph, pl = _step(ch, cl, wh[i], wl[i], f, fl[i], gh[i], gl[i])
                    down = _DOWN if abs(ph) > _HIGH else 1.0
                    gh[i], gl[i] = f * down, fl[i] * down
                    fh[i], fl[i] = ph * down, pl * down
            for i in range(BLOCK):
                gh[i] = inverse[i]
                inverse[i] = 1.0 / inverse[i]
            for n in range(lowest + 1, count):  # a rise from one order to the next: scaled down there
                for i in range(BLOCK):
                    f = buffer[n, i]
                    level[i] = level[i] * (_HALF_DOWN if f > gh[i] and n > last[i] else 1.0)
                    v = (f * inverse[i]) * level[i] * level[i] * anchor[i]
                    gh[i] = f if n > last[i] else gh[i]
                    buffer[n, i] = v if n > last[i] else f
        for i in range(lanes):
            if x[first + i] < TINY:
                tiny_points(nu, x[first + i], j[first + i], out[first + i])
            else:
                for n in range(count):
                    out[first + i, n] = buffer[n, i]
