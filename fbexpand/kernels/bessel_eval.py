"""J_nu and J_nu' from the table of an order: one scalar function, looped by the array kernels.

The argument may have a low part (x + low, |low| about an ulp of x), so that lambda_k r / R keeps its phase.
"""

from __future__ import annotations

import math

from fbexpand.kernels.bessel_table import (
    INVERSE_WIDTH,
    LOG_C,
    LOG_C_LOW,
    NU,
    NU_LOW,
    PANEL_START,
    PANEL_TERMS,
    PHASE_PANELS,
    PHASE_START,
    PHASE_TERMS,
    SCALE,
    SCALED,
    SERIES_START,
    WIDTH,
    X0,
    X_PHASE,
    X_SERIES,
)
from fbexpand.kernels.dd import fma, quick_two_sum, two_prod, two_sum
from fbexpand.kernels.elementary import HALF_PI1, HALF_PI2, HALF_PI3
from fbexpand.kernels.jit import inline_kernel, kernel
from fbexpand.kernels.memory import address, load
from fbexpand.kernels.power import power_factor
from fbexpand.kernels.reduction import reduce_large
from fbexpand.types import FloatArray

_TWO_OVER_PI = 0.6366197723675814
_UNSCALE = 1.0 / SCALE
_LARGE = 2.0**50  # beyond this the two-constant reduction loses digits


@inline_kernel
def sine_cosine(quadrant: int, a: float, b: float) -> tuple[float, float]:
    """Return sin and cos of quadrant pi/2 + a + b, |a| <= pi/4 + tiny, b of the order of eps."""
    z = a * a
    s = z * (-1 / 6.0 + z * (1 / 120.0 + z * (-1 / 5040.0 + z * (1 / 362880.0 + z * (-1 / 39916800.0
        + z * (1 / 6227020800.0 + z * (-1 / 1307674368000.0 + z * (1 / 355687428096000.0))))))))
    sine = a + (b + a * s)
    half = 0.5 * z
    w = 1.0 - half
    c = z * z * (1 / 24.0 + z * (-1 / 720.0 + z * (1 / 40320.0 + z * (-1 / 3628800.0 + z * (1 / 479001600.0
        + z * (-1 / 87178291200.0 + z * (1 / 20922789888000.0)))))))
    cosine = w + (((1.0 - w) - half) + (c - a * b))
    if quadrant & 1:
        sine, cosine = cosine, -sine
    if quadrant & 2:
        sine, cosine = -sine, -cosine
    return sine, cosine


@inline_kernel
def reduce_angle(x: float) -> tuple[int, float, float]:
    """Return k mod 4 and x - k pi/2 in two parts, 0 <= x <= 2^50: x - k fl(pi/2) is exact with a fused multiply-add."""
    k = math.floor(x * _TWO_OVER_PI + 0.5)
    r = fma(-k, HALF_PI1, x)
    p, q = two_prod(k, HALF_PI2)
    h, l = two_sum(r, -p)
    return int(k) & 3, h, l - q - k * HALF_PI3


@kernel
def j_point(data: int, x: float, low: float) -> float:
    """Return J_nu(x + low) for x >= 0 (NaN gives NaN); `data` is the address of the table."""
    value = 0.0
    if x >= load(data, X0):
        if x < load(data, X_PHASE):
            i = int((x - load(data, X0)) * load(data, INVERSE_WIDTH))
            t = (x - (load(data, X0) + (i + 0.5) * load(data, WIDTH))) + low
            o = PANEL_START + i * PANEL_TERMS
            value = load(data, o + 15)
            for k in range(14, -1, -1):
                value = fma(value, t, load(data, o + k))
            if i < load(data, SCALED):
                value *= _UNSCALE
        elif x < math.inf:
            y = load(data, X_PHASE) / x
            ylow = (fma(-y, x, load(data, X_PHASE)) - y * low) / x
            panels = load(data, PHASE_PANELS)
            i = int(min(y * panels, panels - 1.0))
            t = y - (i + 0.5) / panels
            tt = t + ylow
            o = int(load(data, PHASE_START)) + i * PHASE_TERMS
            g = load(data, o + 19)
            for k in range(18, 10, -1):
                g = fma(g, tt, load(data, o + k))
            d = load(data, o + 10)
            for k in range(9, 3, -1):
                d = fma(d, tt, load(data, o + k))
            p, q = two_prod(load(data, o + 2), t)
            q += load(data, o + 2) * ylow + load(data, o + 3) * t
            if x < _LARGE:
                quadrant, r, e = reduce_angle(x)
            else:
                quadrant, r, e = reduce_large(x)
            s, e1 = two_sum(r, load(data, o))
            s, e2 = two_sum(s, p)
            s, e3 = two_sum(s, d * tt * tt)
            e += e1 + e2 + e3 + (load(data, o + 1) + q + low)
            turn = math.floor(s * _TWO_OVER_PI + 0.5)
            s = fma(-turn, HALF_PI1, s)
            s, e = quick_two_sum(s, e - turn * HALF_PI2)
            _, cosine = sine_cosine((quadrant + int(turn)) & 3, s, e)
            value = g * cosine * math.sqrt(_TWO_OVER_PI / x)
    elif x < load(data, X_SERIES):
        z = 0.25 * x * x
        s = 1.0
        for k in range(13, -1, -1):
            s = fma(-z * load(data, SERIES_START + k), s, 1.0)
        if load(data, NU) == 0.0 and load(data, NU_LOW) == 0.0:
            value = s - 0.5 * x * low
        elif x > 0.0:
            value = s * power_factor(load(data, NU), load(data, NU_LOW), x, low / x, load(data, LOG_C), load(data, LOG_C_LOW))
    elif not x >= 0.0:
        value = math.nan
    return value


@kernel
def j_pair(data: int, x: float, low: float) -> tuple[float, float]:
    """Return J_nu(x + low) and J_nu'(x + low) for x >= 0."""
    value = 0.0
    slope = 0.0
    if x >= load(data, X0):
        if x < load(data, X_PHASE):
            i = int((x - load(data, X0)) * load(data, INVERSE_WIDTH))
            t = (x - (load(data, X0) + (i + 0.5) * load(data, WIDTH))) + low
            o = PANEL_START + i * PANEL_TERMS
            value = load(data, o + 15)
            for k in range(14, -1, -1):
                value = fma(value, t, load(data, o + k))
            slope = 15.0 * load(data, o + 15)
            for k in range(14, 0, -1):
                slope = fma(slope, t, k * load(data, o + k))
            if i < load(data, SCALED):
                value *= _UNSCALE
                slope *= _UNSCALE
        elif x < math.inf:
            y = load(data, X_PHASE) / x
            ylow = (fma(-y, x, load(data, X_PHASE)) - y * low) / x
            panels = load(data, PHASE_PANELS)
            i = int(min(y * panels, panels - 1.0))
            t = y - (i + 0.5) / panels
            tt = t + ylow
            o = int(load(data, PHASE_START)) + i * PHASE_TERMS
            g = load(data, o + 19)
            for k in range(18, 10, -1):
                g = fma(g, tt, load(data, o + k))
            gy = 8.0 * load(data, o + 19)
            for k in range(18, 11, -1):
                gy = fma(gy, tt, (k - 11.0) * load(data, o + k))
            d = load(data, o + 10)
            for k in range(9, 3, -1):
                d = fma(d, tt, load(data, o + k))
            p, q = two_prod(load(data, o + 2), t)
            q += load(data, o + 2) * ylow + load(data, o + 3) * t
            if x < _LARGE:
                quadrant, r, e = reduce_angle(x)
            else:
                quadrant, r, e = reduce_large(x)
            s, e1 = two_sum(r, load(data, o))
            s, e2 = two_sum(s, p)
            s, e3 = two_sum(s, d * tt * tt)
            e += e1 + e2 + e3 + (load(data, o + 1) + q + low)
            turn = math.floor(s * _TWO_OVER_PI + 0.5)
            s = fma(-turn, HALF_PI1, s)
            s, e = quick_two_sum(s, e - turn * HALF_PI2)
            sine, cosine = sine_cosine((quadrant + int(turn)) & 3, s, e)
            root = math.sqrt(_TWO_OVER_PI / x)
            value = g * cosine * root
            slope = -(sine / g) * root - value * ((0.5 + y * gy / g) / x)
    elif x < load(data, X_SERIES):
        z = 0.25 * x * x
        s = 1.0
        u = 0.0  # d s / d z
        for k in range(13, -1, -1):
            u = -load(data, SERIES_START + k) * fma(z, u, s)
            s = fma(-z * load(data, SERIES_START + k), s, 1.0)
        if load(data, NU) == 0.0 and load(data, NU_LOW) == 0.0:
            value = s - 0.5 * x * low
            slope = 0.5 * x * u + 0.5 * low * u
        elif x > 0.0:
            relative = low / x
            inner = (load(data, NU) * s + 2.0 * z * u) + load(data, NU_LOW) * s
            power = power_factor(load(data, NU), load(data, NU_LOW), x, relative, load(data, LOG_C), load(data, LOG_C_LOW))
            value = s * power
            if x < 1.0:
                power = power_factor(load(data, NU) - 1.0, load(data, NU_LOW), x, relative, load(data, LOG_C), load(data, LOG_C_LOW))
                slope = inner * power
            else:
                slope = inner * power / x
        elif load(data, NU) == 1.0 and load(data, NU_LOW) == 0.0:
            slope = 0.5
        elif load(data, NU) < 1.0:
            slope = math.inf
    elif not x >= 0.0:
        value = math.nan
        slope = math.nan
    return value, slope


@kernel
def j_values(data: FloatArray, x: FloatArray, low: FloatArray, out: FloatArray) -> None:
    """out[i] = J_nu(x[i] + low[i]); an empty `low` stands for zeros."""
    where = address(data)
    if low.size == 0:
        for i in range(x.size):
            out[i] = j_point(where, x[i], 0.0)
    else:
        for i in range(x.size):
            out[i] = j_point(where, x[i], low[i])


@kernel
def j_pairs(data: FloatArray, x: FloatArray, low: FloatArray, out: FloatArray, slope: FloatArray) -> None:
    """out[i], slope[i] = J_nu, J_nu' at x[i] + low[i]; an empty `low` stands for zeros."""
    where = address(data)
    if low.size == 0:
        for i in range(x.size):
            out[i], slope[i] = j_pair(where, x[i], 0.0)
    else:
        for i in range(x.size):
            out[i], slope[i] = j_pair(where, x[i], low[i])
