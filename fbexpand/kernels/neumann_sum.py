"""Sums of a_n J_{nu+n}(x) over n, the orders made by recurrence and used up at once: nothing is stored per order.

The recurrence and its two directions are those of `kernels/sequence.py`: upward in double-double where nu + n <= x,
downward (Miller's method) beyond. The downward sum of a_n f_n, f a multiple of J whose scale is known at the end only,
is kept beside f; when f passes 2^200 both are multiplied by 2^-200. So neither a J far below the smallest double nor
an f above the largest one does harm: a_n J_n comes out right wherever it is a double itself. The caller sees to it that
|a_n| <= 2^700.

All sums are compensated by two_sum: what rounding leaves is half an eps of every |a_n J_n|, not n times that.
"""

from __future__ import annotations

import math

import numpy as np

from fbexpand.kernels.dd import dd_div, dd_mul_d, quick_two_sum, two_prod, two_sum
from fbexpand.kernels.jit import callee, inline_kernel, kernel
from fbexpand.kernels.sequence import TINY, extra_orders
from fbexpand.types import FloatArray

BLOCK = 32
_HIGH = 2.0**200
_DOWN = 2.0**-200
_NOTHING = 2200.0  # J_m(x) <= (e x / 2 m)^m is below 2^-2200 for m >= this and m >= e x


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
def tiny_sum(nu: float, x: float, j: float, coefficients: FloatArray, i: int, out: FloatArray) -> None:
    """Fill out[:, i] for 0 <= x < TINY, where J_{n+1} / J_n is x / (2 (nu + n + 1))."""
    terms = min(coefficients.shape[0], 80)  # J_{nu+80} < 2^-2400
    for b in range(out.shape[0]):
        s = 0.0
        for n in range(terms - 1, 0, -1):
            s = (s + coefficients[n, b]) * (0.5 * x / (nu + n))
        out[b, i] = j * (coefficients[0, b] + s)


@kernel
def neumann_sum(
    nu: float, x: FloatArray, j: FloatArray, slope: FloatArray, coefficients: FloatArray, out: FloatArray
) -> None:
    """Fill out (batch, m) with sum_n coefficients[n, b] J_{nu+n}(x), 0 <= x < inf, from j = J_nu, slope = J_nu'.

    `slope` is read where x >= max(nu, TINY) only. Neighbours in x should be close, as a block of points
    goes through the orders of all of them.
    """
    points = x.shape[0]
    count = coefficients.shape[0]
    batch = coefficients.shape[1]
    wh = np.empty(BLOCK)
    wl = np.empty(BLOCK)
    fh = np.empty(BLOCK)
    fl = np.empty(BLOCK)
    gh = np.empty(BLOCK)
    gl = np.empty(BLOCK)
    last = np.empty(BLOCK)  # the last order run forward, counted from nu
    stop = np.empty(BLOCK)  # the last order that matters
    begin = np.empty(BLOCK)  # the order at which the backward run begins
    anchor = np.empty(BLOCK)
    scale = np.empty(BLOCK)  # f at the order of the anchor
    used = np.empty(BLOCK)
    down = np.empty(BLOCK)
    up_h = np.empty((batch, BLOCK))
    up_l = np.empty((batch, BLOCK))
    back_h = np.empty((batch, BLOCK))
    back_l = np.empty((batch, BLOCK))
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
            stop[i] = -1.0
            wh[i], wl[i] = 1.0, 0.0
            fh[i], fl[i] = s, 0.0
            gh[i], gl[i] = 0.0, 0.0
            anchor[i] = s
            scale[i] = 1.0
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
                top = min(count - 1.0, math.ceil(max(2.72 * t, _NOTHING) - nu))
                if top > last[i]:
                    stop[i] = top
                    begin[i] = top + extra_orders(nu + top, t)
                    highest = max(highest, int(begin[i]))
                    lowest = min(lowest, int(last[i]))
        for b in range(batch):
            for i in range(BLOCK):
                up_h[b, i] = coefficients[0, b] * fh[i]
                up_l[b, i], back_h[b, i], back_l[b, i] = 0.0, 0.0, 0.0
        for n in range(1, forward + 1):  # g is J_{nu+n}, f the one before
            ch, cl = two_sum(nu, float(n))
            for i in range(BLOCK):
                used[i] = gh[i] if n <= last[i] else 0.0
                anchor[i] = gh[i] if n == last[i] else anchor[i]
                ph, pl = _step(ch, cl, wh[i], wl[i], gh[i], gl[i], fh[i], fl[i])
                fh[i], fl[i] = gh[i], gl[i]
                gh[i], gl[i] = ph, pl
            for b in range(batch):
                a = coefficients[n, b]
                for i in range(BLOCK):
                    up_h[b, i], e = two_sum(up_h[b, i], a * used[i])
                    up_l[b, i] += e
        if highest >= 0:
            for i in range(BLOCK):
                fh[i], fl[i], gh[i], gl[i] = 0.0, 0.0, 0.0, 0.0
            for n in range(highest, lowest - 1, -1):  # f is a multiple of J_{nu+n}, g the one above
                ch, cl = two_sum(nu, float(n))
                scaled = False
                for i in range(BLOCK):
                    f = 1.0 if n == begin[i] else fh[i]
                    used[i] = f if last[i] < n <= stop[i] else 0.0
                    scale[i] = f if n == last[i] else scale[i]
                    ph, pl = _step(ch, cl, wh[i], wl[i], f, fl[i], gh[i], gl[i])
                    down[i] = _DOWN if abs(ph) > _HIGH and n > last[i] else 1.0
                    scaled = scaled or down[i] != 1.0
                    gh[i], gl[i] = f * down[i], fl[i] * down[i]
                    fh[i], fl[i] = ph * down[i], pl * down[i]
                if n < count:
                    for b in range(batch):
                        a = coefficients[n, b]
                        for i in range(BLOCK):
                            back_h[b, i], e = two_sum(back_h[b, i], a * used[i])
                            back_l[b, i] += e
                if scaled:
                    for b in range(batch):
                        for i in range(BLOCK):
                            back_h[b, i] *= down[i]
                            back_l[b, i] *= down[i]
        for i in range(lanes):
            if x[first + i] < TINY:
                tiny_sum(nu, x[first + i], j[first + i], coefficients, first + i, out)
                continue
            ratio = anchor[i] / scale[i] if stop[i] >= 0.0 else 0.0
            for b in range(batch):
                sh, e = two_sum(up_h[b, i], (back_h[b, i] + back_l[b, i]) * ratio)
                out[b, first + i] = sh + (up_l[b, i] + e)
