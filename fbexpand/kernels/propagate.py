"""Rates of waves and beams in two parts, and cosine and sine of rate times time at any time.

The phase lambda c t / R of a mode grows without bound, and a root that is off by half an eps turns it by lambda t eps:
so the rate is carried in double-double, its product with the time is exact to 2^-100 and is reduced modulo pi/2 in two
parts. Square roots of differences of squares are products of square roots: nothing overflows, nothing cancels.
"""

from __future__ import annotations

from fbexpand.kernels.bessel_regions import reduced, sine_cosine
from fbexpand.kernels.dd import dd_add, dd_add_d, dd_div, dd_mul, dd_mul_d, dd_sqrt, two_prod, two_sum
from fbexpand.kernels.jit import inline_kernel, kernel
from fbexpand.kernels.reduction import reduce_large
from fbexpand.types import FloatArray

REDUCED_TO = 2.0**50  # `reduced` is good up to here


@inline_kernel
def phase(rate: float, rate_low: float, t: float) -> tuple[float, float]:
    """Return rate * t in two parts."""
    return dd_mul_d(rate, rate_low, t)


@kernel
def turns(times: FloatArray, rate: FloatArray, rate_low: FloatArray, cosine: FloatArray, sine: FloatArray) -> None:
    """Fill cos and sin of rate * t, each (times, rates), |rate * t| <= 2^50."""
    for i in range(times.size):
        t = times[i]
        for j in range(rate.size):
            h, l = phase(rate[j], rate_low[j], t)
            k, s, e = reduced(h)
            s, e1 = two_sum(s, l)
            sine[i, j], cosine[i, j] = sine_cosine(k, s, e + e1)


@inline_kernel
def reduced_any(x: float) -> tuple[float, float, float]:
    """Return k and x - k pi/2 in two parts for finite x of any size; k counts modulo 4 where x is large."""
    if abs(x) <= REDUCED_TO:
        return reduced(x)
    k, h, l = reduce_large(abs(x))
    return (float(k), h, l) if x > 0.0 else (-float(k), -h, -l)


@kernel
def huge_turns(times: FloatArray, rate: FloatArray, rate_low: FloatArray, cosine: FloatArray, sine: FloatArray) -> None:
    """Fill cos and sin of rate * t as `turns` does, for phases of any size: both parts are reduced."""
    for i in range(times.size):
        t = times[i]
        for j in range(rate.size):
            h, l = phase(rate[j], rate_low[j], t)
            k, s, e = reduced_any(h)
            k_low, s_low, e_low = reduced_any(l)
            s, e1 = two_sum(s, s_low)
            sine[i, j], cosine[i, j] = sine_cosine(k + k_low, s, e + e_low + e1)


@kernel
def wave_rates(
    speed: float, radius: float, high: FloatArray, low: FloatArray, growing: int, half: FloatArray, out: FloatArray
) -> None:
    """Fill out (6, modes) with w = c lambda / R and, for the damping 2g in `half` = g, what the motion turns on.

    Rows: w; kind (0: w > g, oscillates; 1: w <= g; 2: the mode grows); omega = sqrt(w^2 - g^2) or sigma = sqrt(g^2 -+
    w^2) in two parts; the slower exponent sigma - g in two parts, as -+w^2 / (g + sigma), which does not cancel. The
    first `growing` modes grow: their w^2 counts as negative.
    """
    for j in range(high.size):
        g = half[j]
        wh, wl = dd_mul_d(high[j], low[j], speed)
        wh, wl = dd_div(wh, wl, radius, 0.0)
        ph, pl = dd_add_d(wh, wl, g)
        out[0, j] = wh
        out[4, j] = 0.0
        out[5, j] = 0.0
        if j < growing:
            out[1, j] = 2.0
            ah, al, bh, bl = (wh, wl, g, 0.0) if wh >= g else (g, 0.0, wh, wl)
            qh, ql = dd_div(bh, bl, ah, al)
            qh, ql = dd_mul(qh, ql, qh, ql)
            qh, ql = dd_add_d(qh, ql, 1.0)
            qh, ql = dd_sqrt(qh, ql)
            sh, sl = dd_mul(ah, al, qh, ql)
        else:
            dh, dl = dd_add_d(wh, wl, -g)
            out[1, j] = 0.0 if dh > 0.0 else 1.0
            if dh < 0.0:
                dh, dl = -dh, -dl
            ah, al = dd_sqrt(dh, dl)
            bh, bl = dd_sqrt(ph, pl)
            sh, sl = dd_mul(ah, al, bh, bl)
        out[2, j] = sh
        out[3, j] = sl
        if out[1, j] != 0.0:
            bh, bl = dd_add_d(sh, sl, g)
            if bh > 0.0:
                qh, ql = dd_div(wh, wl, bh, bl)
                qh, ql = dd_mul(wh, wl, qh, ql)
                sign = 1.0 if j < growing else -1.0
                out[4, j] = sign * qh
                out[5, j] = sign * ql


@kernel
def beam_rates(
    wavenumber: float, radius: float, high: FloatArray, low: FloatArray, growing: int, out: FloatArray
) -> None:
    """Fill out (2, modes) with eigenvalue / (2 wavenumber) in two parts."""
    for j in range(high.size):
        h, l = dd_div(high[j], low[j], radius, 0.0)
        qh, ql = dd_div(h, l, 2.0 * wavenumber, 0.0)
        h, l = dd_mul(h, l, qh, ql)
        sign = -1.0 if j < growing else 1.0
        out[0, j] = sign * h
        out[1, j] = sign * l


@kernel
def decay_rates(
    diffusivity: float,
    removal: float,
    radius: float,
    high: FloatArray,
    low: FloatArray,
    growing: int,
    out: FloatArray,
) -> None:
    """Fill out (2, modes) with diffusivity * eigenvalue + removal in two parts."""
    for j in range(high.size):
        h, l = dd_div(high[j], low[j], radius, 0.0)
        qh, ql = dd_mul_d(h, l, diffusivity)
        h, l = dd_mul(h, l, qh, ql)
        sign = -1.0 if j < growing else 1.0
        h, l = dd_add_d(sign * h, sign * l, removal)
        out[0, j] = h
        out[1, j] = l


@kernel
def products(times: FloatArray, rate: float, rate_low: float, out: FloatArray) -> None:
    """Fill out (2, times) with rate * t in two parts."""
    for i in range(times.size):
        p, e = two_prod(rate, times[i])
        out[0, i], out[1, i] = dd_add(p, e, rate_low * times[i], 0.0)
