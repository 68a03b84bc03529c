"""J_nu and J_nu' from the table of an order: points are sorted by region, then each region is one branch-free loop.

The argument may have a low part (x + low, |low| about an ulp of x), so that lambda_k r / R keeps its phase. Every
value comes from the same operations on its own point alone, whatever its neighbours.
"""

from __future__ import annotations

import math

import numpy as np

from fbexpand.kernels.bessel_regions import (
    LARGE,
    TWO_OVER_PI,
    UNSCALE,
    huge_pair,
    near_pair,
    nine,
    nine_at,
    panel_parts,
    panel_slope,
    panel_value,
    reduced,
    sine_cosine,
)
from fbexpand.kernels.bessel_table import (
    INVERSE_WIDTH,
    PHASE_PANELS,
    PHASE_START,
    SCALED,
    WIDTH,
    X0,
    X_PHASE,
)
from fbexpand.kernels.dd import fma, two_sum
from fbexpand.kernels.jit import callee, kernel
from fbexpand.kernels.memory import address, load
from fbexpand.types import FloatArray

BLOCK = 512
ROWS = 12


@callee
def smooth_values(
    where: int, size: int, x: FloatArray, low: FloatArray, y: FloatArray, d: FloatArray, out: FloatArray
) -> None:
    """Fill out where the phase has no panels: three loops, so that each keeps its coefficients in registers."""
    first = int(load(where, PHASE_START))
    start = load(where, X_PHASE)
    ch, cl = load(where, first), load(where, first + 1)
    scale = TWO_OVER_PI / start
    c0, c1, c2, c3, c4, c5, c6, c7, c8 = nine_at(where, first + 2)
    g0, g1, g2, g3, g4, g5, g6, g7, g8 = nine_at(where, first + 11)
    for n in range(size):
        v = start / x[n]
        y[n] = v
        d[n] = v * nine(v * v, c0, c1, c2, c3, c4, c5, c6, c7, c8)
    for n in range(size):
        k, h, l = reduced(x[n])
        s, e1 = two_sum(h, ch)
        s, e2 = two_sum(s, d[n])
        _, d[n] = sine_cosine(k, s, l + e1 + e2 + (cl + low[n]))
    for n in range(size):
        v = y[n]
        out[n] = nine(v * v, g0, g1, g2, g3, g4, g5, g6, g7, g8) * d[n] * math.sqrt(v * scale)


@callee
def smooth_parts(where: int, size: int, first: int, y: FloatArray, d: FloatArray, g: FloatArray, u: FloatArray) -> None:
    """Fill delta, g and dg/dy from the polynomials in y^2 whose coefficients begin at `first`."""
    c0, c1, c2, c3, c4, c5, c6, c7, c8 = nine_at(where, first + 2)
    g0, g1, g2, g3, g4, g5, g6, g7, g8 = nine_at(where, first + 11)
    for n in range(size):
        z = y[n] * y[n]
        d[n] = y[n] * nine(z, c0, c1, c2, c3, c4, c5, c6, c7, c8)
    for n in range(size):
        g[n] = nine(y[n] * y[n], g0, g1, g2, g3, g4, g5, g6, g7, g8)
    for n in range(size):
        z = y[n] * y[n]
        v = nine(z, g1, 2.0 * g2, 3.0 * g3, 4.0 * g4, 5.0 * g5, 6.0 * g6, 7.0 * g7, 8.0 * g8, 0.0)
        u[n] = 2.0 * y[n] * v


@callee
def phase_block(
    where: int,
    size: int,
    x: FloatArray,
    low: FloatArray,
    work: FloatArray,
    want_slope: bool,
    out: FloatArray,
    slope: FloatArray,
) -> None:
    """Fill out and slope for X <= x < 2^50, size <= BLOCK points."""
    first = int(load(where, PHASE_START))
    panels = load(where, PHASE_PANELS)
    start = load(where, X_PHASE)
    y, c, e, p, d = work[0], work[1], work[2], work[3], work[4]
    if panels == 0.0 and not want_slope:
        smooth_values(where, size, x, low, y, d, out)
        return
    g, u, sines = work[5], work[6], work[7]
    if panels == 0.0:
        ch, cl = load(where, first), load(where, first + 1)
        for n in range(size):
            y[n] = start / x[n]
        smooth_parts(where, size, first, y, d, g, u)
        for n in range(size):
            k, h, l = reduced(x[n])
            s, e1 = two_sum(h, ch)
            s, e2 = two_sum(s, d[n])
            sines[n], out[n] = sine_cosine(k, s, l + e1 + e2 + (cl + low[n]))
    else:
        for n in range(size):
            v = start / x[n]
            y[n] = v
            e[n] = (fma(-v, x[n], start) - v * low[n]) / x[n]
        for n in range(size):
            c[n], e[n], p[n], d[n], g[n], u[n] = panel_parts(where, y[n], e[n], panels, first)
        for n in range(size):
            k, h, l = reduced(x[n])
            s, e1 = two_sum(h, c[n])
            s, e2 = two_sum(s, p[n])
            s, e3 = two_sum(s, d[n])
            sines[n], out[n] = sine_cosine(k, s, l + e1 + e2 + e3 + (e[n] + low[n]))
    scale = TWO_OVER_PI / start  # 2/(pi x) = y scale
    if want_slope:
        for n in range(size):
            root = math.sqrt(y[n] * scale)
            out[n] = g[n] * out[n] * root
            slope[n] = -(sines[n] / g[n]) * root - out[n] * ((0.5 + y[n] * u[n] / g[n]) / x[n])
    else:
        for n in range(size):
            out[n] = g[n] * out[n] * math.sqrt(y[n] * scale)


@callee
def panel_block(
    where: int, size: int, x: FloatArray, low: FloatArray, want_slope: bool, out: FloatArray, slope: FloatArray
) -> None:
    """Fill out and slope at x0 <= x < X."""
    x0, inverse, width = load(where, X0), load(where, INVERSE_WIDTH), load(where, WIDTH)
    for n in range(size):
        out[n] = panel_value(where, x[n], low[n], x0, inverse, width)
    if want_slope:
        for n in range(size):
            slope[n] = panel_slope(where, x[n], low[n], x0, inverse, width)
    scaled = load(where, SCALED)
    if scaled > 0.0:
        end = x0 + scaled * width
        for n in range(size):
            if x[n] < end:
                out[n] *= UNSCALE
                if want_slope:
                    slope[n] *= UNSCALE


@callee
def point(where: int, x: float, low: float, want_slope: bool) -> tuple[float, float]:
    """Return J and, if wanted, J' at x < x0, x >= 2^50 or NaN."""
    if x >= LARGE:
        return huge_pair(where, x, low)
    return near_pair(where, x, low, want_slope)


@callee
def evaluate(data: FloatArray, x: FloatArray, low: FloatArray, out: FloatArray, slope: FloatArray) -> None:
    """out[i], slope[i] = J_nu, J_nu' at x[i] + low[i]; an empty `low` stands for zeros, an empty `slope` is not wanted.

    A block of which 7 in 8 points lie in one region runs through that region's loop whole, the strangers moved to its
    edge, and these are then done again; otherwise the points are sorted first.
    """
    where = address(data)
    want_slope = slope.size > 0
    x0, start = data[X0], data[X_PHASE]
    block = min(BLOCK, max(x.size, 1))
    work = np.empty((ROWS, block))
    zero = np.zeros(block)
    index = np.empty(block + 1, np.int64)
    px, pl, po, ps = work[8], work[9], work[10], work[11]
    for begin in range(0, x.size, block):
        size = min(block, x.size - begin)
        xs = x[begin : begin + size]
        ls = low[begin : begin + size] if low.size > 0 else zero[:size]
        here = out[begin : begin + size]
        there = slope[begin : begin + size] if want_slope else here
        panels, phases = count_regions(xs, x0, start)
        others = size - panels - phases
        many = size - (size >> 3)
        if phases >= many:
            if phases == size:
                phase_block(where, size, xs, ls, work, want_slope, here, there)
            else:
                for n in range(size):
                    px[n] = xs[n] if (xs[n] >= start) & (xs[n] < LARGE) else start
                phase_block(where, size, px, ls, work, want_slope, here, there)
            phases = size
        elif panels >= many:
            if panels == size:
                panel_block(where, size, xs, ls, want_slope, here, there)
            else:
                for n in range(size):
                    px[n] = xs[n] if (xs[n] >= x0) & (xs[n] < start) else x0
                panel_block(where, size, px, ls, want_slope, here, there)
            panels = size
        # what is left: panels unless they are done, phases likewise, and the others
        if phases > 0 and phases < size:
            b = int(np.int64(0))  # a plain 0 would be a type of its own: the callees compiled once more for it
            for n in range(size):
                index[b] = n
                b += (xs[n] >= start) & (xs[n] < LARGE)
            for j in range(b):
                px[j], pl[j] = xs[index[j]], ls[index[j]]
            phase_block(where, b, px, pl, work, want_slope, po, ps)
            for j in range(b):
                here[index[j]] = po[j]
                if want_slope:
                    there[index[j]] = ps[j]
        if panels > 0 and panels < size:
            b = int(np.int64(0))
            for n in range(size):
                index[b] = n
                b += (xs[n] >= x0) & (xs[n] < start)
            for j in range(b):
                px[j], pl[j] = xs[index[j]], ls[index[j]]
            panel_block(where, b, px, pl, want_slope, po, ps)
            for j in range(b):
                here[index[j]] = po[j]
                if want_slope:
                    there[index[j]] = ps[j]
        if others > 0:
            for n in range(size):
                if not ((xs[n] >= x0) & (xs[n] < LARGE)):
                    v, s = point(where, xs[n], ls[n], want_slope)
                    here[n] = v
                    if want_slope:
                        there[n] = s


@callee
def count_regions(x: FloatArray, x0: float, start: float) -> tuple[int, int]:
    """Return how many points lie in panels, and how many where modulus and phase serve."""
    inside = 0
    beyond = 0
    for n in range(x.size):
        inside += (x[n] >= x0) & (x[n] < start)
        beyond += (x[n] >= start) & (x[n] < LARGE)
    return inside, beyond


@kernel
def j_values(data: FloatArray, x: FloatArray, low: FloatArray, out: FloatArray) -> None:
    """out[i] = J_nu(x[i] + low[i]); an empty `low` stands for zeros."""
    evaluate(data, x, low, out, out[:0])


@kernel
def j_pairs(data: FloatArray, x: FloatArray, low: FloatArray, out: FloatArray, slope: FloatArray) -> None:
    """out[i], slope[i] = J_nu, J_nu' at x[i] + low[i]; an empty `low` stands for zeros."""
    evaluate(data, x, low, out, slope)
