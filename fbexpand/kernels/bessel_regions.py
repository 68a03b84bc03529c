"""J_nu at one point of each region of a table: the formulas that `bessel_eval` runs in blocks, `bessel_point` singly.

The argument may have a low part (x + low, |low| about an ulp of x), so that lambda_k r / R keeps its phase.
"""

from __future__ import annotations

import math

import numpy as np

from fbexpand.kernels.bessel_table import (
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
    SERIES_START,
    X_PHASE,
    X_SERIES,
)
from fbexpand.kernels.dd import fma, quick_two_sum, two_prod, two_sum
from fbexpand.kernels.elementary import HALF_PI1, HALF_PI2, HALF_PI3
from fbexpand.kernels.jit import callee, inline_kernel
from fbexpand.kernels.memory import load
from fbexpand.kernels.power import power_factor
from fbexpand.kernels.reduction import reduce_large

TWO_OVER_PI = 0.6366197723675814
UNSCALE = 1.0 / SCALE
LARGE = 2.0**50  # beyond this the reduction with three constants loses digits


@inline_kernel
def panel_value(where: int, x: float, low: float, x0: float, inverse: float, width: float) -> float:
    """Return the panel polynomial at x + low."""
    i = np.int32((x - x0) * inverse)
    t = (x - (x0 + (float(i) + 0.5) * width)) + low
    o = np.int64(PANEL_START + i * PANEL_TERMS)
    t2 = t * t  # odd and even powers apart: half as long a chain of additions to wait for
    s = load(where, o + 14)
    u = load(where, o + 15)
    for k in range(12, -1, -2):
        s = fma(s, t2, load(where, o + k))
        u = fma(u, t2, load(where, o + k + 1))
    return fma(u, t, s)


@inline_kernel
def panel_slope(where: int, x: float, low: float, x0: float, inverse: float, width: float) -> float:
    """Return the derivative of the panel polynomial at x + low."""
    i = np.int32((x - x0) * inverse)
    t = (x - (x0 + (float(i) + 0.5) * width)) + low
    o = np.int64(PANEL_START + i * PANEL_TERMS)
    t2 = t * t
    s = 15.0 * load(where, o + 15)
    u = 14.0 * load(where, o + 14)
    for k in range(12, 0, -2):
        s = fma(s, t2, (k + 1.0) * load(where, o + k + 1))
        u = fma(u, t2, float(k) * load(where, o + k))
    return fma(u, t, fma(s, t2, load(where, o + 1)))


@inline_kernel
def nine(
    z: float,
    c0: float,
    c1: float,
    c2: float,
    c3: float,
    c4: float,
    c5: float,
    c6: float,
    c7: float,
    c8: float,
) -> float:
    """Return c0 + c1 z + ... + c8 z^8; coefficients as scalars, so that a loop over points keeps them in registers."""
    s = fma(c8, z, c7)
    s = fma(s, z, c6)
    s = fma(s, z, c5)
    s = fma(s, z, c4)
    s = fma(s, z, c3)
    s = fma(s, z, c2)
    s = fma(s, z, c1)
    return fma(s, z, c0)


@inline_kernel
def nine_at(where: int, first: int) -> tuple[float, float, float, float, float, float, float, float, float]:
    """Return nine consecutive doubles."""
    return (
        load(where, first),
        load(where, first + 1),
        load(where, first + 2),
        load(where, first + 3),
        load(where, first + 4),
        load(where, first + 5),
        load(where, first + 6),
        load(where, first + 7),
        load(where, first + 8),
    )


@inline_kernel
def smooth_point(where: int, y: float, first: int) -> tuple[float, float]:
    """Return delta and g at one point."""
    z = y * y
    c0, c1, c2, c3, c4, c5, c6, c7, c8 = nine_at(where, first + 2)
    g0, g1, g2, g3, g4, g5, g6, g7, g8 = nine_at(where, first + 11)
    d = y * nine(z, c0, c1, c2, c3, c4, c5, c6, c7, c8)
    return d, nine(z, g0, g1, g2, g3, g4, g5, g6, g7, g8)


@inline_kernel
def panel_parts(
    where: int, y: float, y_low: float, panels: float, first: int
) -> tuple[float, float, float, float, float, float]:
    """Return the constant of the phase in two parts, delta's linear term, its rest, g and dg/dy."""
    i = np.int64(min(y * panels, panels - 1.0))
    t = y - (float(i) + 0.5) / panels
    tt = t + y_low
    o = first + i * PHASE_TERMS
    g = load(where, o + 19)
    u = 0.0
    for k in range(18, 10, -1):
        u = fma(u, tt, g)
        g = fma(g, tt, load(where, o + k))
    d = load(where, o + 10)
    for k in range(9, 3, -1):
        d = fma(d, tt, load(where, o + k))
    slope = load(where, o + 2)
    p, q = two_prod(slope, t)
    q += slope * y_low + load(where, o + 3) * t
    return load(where, o), load(where, o + 1) + q, p, d * tt * tt, g, u


@inline_kernel
def reduced(x: float) -> tuple[float, float, float]:
    """Return k and x - k pi/2 in two parts, 0 <= x <= 2^50; x - k fl(pi/2) is exact with a fused multiply-add."""
    k = np.floor(x * TWO_OVER_PI + 0.5)
    p, q = two_prod(k, HALF_PI2)
    h, l = two_sum(fma(-k, HALF_PI1, x), -p)
    return k, h, l - q - k * HALF_PI3


@inline_kernel
def sine_cosine(k: float, s: float, e: float) -> tuple[float, float]:
    """Return sin and cos of k pi/2 + s + e, |s| up to a few turns, e small; no branches."""
    turn = np.floor(s * TWO_OVER_PI + 0.5)
    a, b = quick_two_sum(fma(-turn, HALF_PI1, s), e - turn * HALF_PI2)
    k += turn
    z = a * a
    p = fma(z, 1 / 355687428096000.0, -1 / 1307674368000.0)
    p = fma(z, p, 1 / 6227020800.0)
    p = fma(z, p, -1 / 39916800.0)
    p = fma(z, p, 1 / 362880.0)
    p = fma(z, p, -1 / 5040.0)
    p = fma(z, p, 1 / 120.0)
    p = z * fma(z, p, -1 / 6.0)
    sine = a + (b + a * p)
    half = 0.5 * z
    w = 1.0 - half
    p = fma(z, 1 / 20922789888000.0, -1 / 87178291200.0)
    p = fma(z, p, 1 / 479001600.0)
    p = fma(z, p, -1 / 3628800.0)
    p = fma(z, p, 1 / 40320.0)
    p = fma(z, p, -1 / 720.0)
    p = z * z * fma(z, p, 1 / 24.0)
    cosine = w + (((1.0 - w) - half) + (p - a * b))
    quadrant = k - 4.0 * np.floor(0.25 * k)
    high = np.floor(0.5 * quadrant)  # 0 0 1 1
    odd = quadrant - 2.0 * high  # 0 1 0 1
    even = 1.0 - odd
    sine_out = (odd * cosine + even * sine) * (1.0 - 2.0 * high)
    mixed = high + odd - 2.0 * high * odd  # 0 1 1 0
    return sine_out, (odd * sine + even * cosine) * (1.0 - 2.0 * mixed)


@callee
def near_pair(where: int, x: float, low: float, want_slope: bool) -> tuple[float, float]:
    """Return J and J' by the ascending series below the panels; 0 between it and where J underflows."""
    nu, nu_low = load(where, NU), load(where, NU_LOW)
    value = 0.0
    slope = 0.0
    if x < load(where, X_SERIES):
        z = 0.25 * x * x
        z2 = z * z
        even = load(where, SERIES_START + 13)
        odd = load(where, SERIES_START + 12)
        for k in range(10, -1, -2):
            even = fma(even, z2, load(where, SERIES_START + k + 1))
            odd = fma(odd, z2, load(where, SERIES_START + k))
        s = 1.0 + z * fma(even, z, odd)
        u = 0.0  # d s / d z
        if want_slope:
            u = 14.0 * load(where, SERIES_START + 13)
            for k in range(12, -1, -1):
                u = fma(u, z, (k + 1.0) * load(where, SERIES_START + k))
        if nu == 0.0 and nu_low == 0.0:
            value = s - 0.5 * x * low
            slope = 0.5 * x * u + 0.5 * low * u
        elif x > 0.0:
            ch, cl = load(where, LOG_C), load(where, LOG_C_LOW)
            power = power_factor(nu, nu_low, x, low / x, ch, cl)
            value = s * power
            if want_slope:
                inner = (nu * s + 2.0 * z * u) + nu_low * s
                if x < 1.0:
                    h, l = two_sum(nu, -1.0)
                    slope = inner * power_factor(h, l + nu_low, x, low / x, ch, cl)
                else:
                    slope = inner * power / x
        elif nu == 1.0 and nu_low == 0.0:
            slope = 0.5
        elif nu < 1.0:
            slope = math.inf
    elif not x >= 0.0:
        value = math.nan
        slope = math.nan
    return value, slope


@callee
def huge_pair(where: int, x: float, low: float) -> tuple[float, float]:
    """Return J and J' beyond 2^50, where delta and g - 1 are constants to rounding."""
    if not x < math.inf:
        return 0.0, 0.0
    first = int(load(where, PHASE_START))
    panels = load(where, PHASE_PANELS)
    y = load(where, X_PHASE) / x
    if panels == 0.0:
        d, g = smooth_point(where, y, first)
        c, c_low, p = load(where, first), load(where, first + 1), 0.0
    else:
        c, c_low, p, d, g, _ = panel_parts(where, y, 0.0, panels, first)
    k, r, e = reduce_large(x)
    s, e1 = two_sum(r, c)
    s, e2 = two_sum(s, p)
    s, e3 = two_sum(s, d)
    sine, cosine = sine_cosine(float(k), s, e + e1 + e2 + e3 + (c_low + low))
    root = math.sqrt(TWO_OVER_PI / x)
    return g * cosine * root, -(sine / g) * root
