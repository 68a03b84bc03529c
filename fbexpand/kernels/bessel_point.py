"""J_nu at one point, for the user's own compiled loops; the same operations, so the same bits, as the array kernels."""

from __future__ import annotations

import math

from fbexpand.kernels.bessel_regions import (
    LARGE,
    TWO_OVER_PI,
    UNSCALE,
    huge_pair,
    near_pair,
    panel_parts,
    panel_value,
    reduced,
    sine_cosine,
    smooth_point,
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


@callee
def phase_point(where: int, x: float) -> float:
    """Return J_nu(x) for X <= x < 2^50."""
    first = int(load(where, PHASE_START))
    panels = load(where, PHASE_PANELS)
    start = load(where, X_PHASE)
    y = start / x
    e = 0.0
    p = 0.0
    if panels == 0.0:
        c, e = load(where, first), load(where, first + 1)
        d, g = smooth_point(where, y, first)
    else:
        c, e, p, d, g, _ = panel_parts(where, y, fma(-y, x, start) / x, panels, first)
    k, h, low = reduced(x)
    s, e1 = two_sum(h, c)
    if panels == 0.0:
        s, e2 = two_sum(s, d)
        low = low + e1 + e2 + e
    else:
        s, e2 = two_sum(s, p)
        s, e3 = two_sum(s, d)
        low = low + e1 + e2 + e3 + e
    _, cosine = sine_cosine(k, s, low)
    return g * cosine * math.sqrt(y * (TWO_OVER_PI / start))


@kernel
def evaluate_point(data: tuple[FloatArray], x: float) -> float:
    """Return J_nu(x), x >= 0, from `data`, a tuple that holds the table; NaN for x < 0."""
    where = address(data[0])
    x0 = load(where, X0)
    start = load(where, X_PHASE)
    if x >= start:
        if x < LARGE:
            return phase_point(where, x)
        return huge_pair(where, x, 0.0)[0]
    if x >= x0:
        width = load(where, WIDTH)
        value = panel_value(where, x, 0.0, x0, load(where, INVERSE_WIDTH), width)
        if x < x0 + load(where, SCALED) * width:
            value *= UNSCALE
        return value
    if x < 0.0:
        return math.nan
    return near_pair(where, x, 0.0, False)[0]
