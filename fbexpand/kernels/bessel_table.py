"""The table of one order: a flat array of doubles from which `bessel_eval` computes J_nu anywhere.

Three regions. x < x0: the ascending series times a power in two parts. x0 <= x < X: panels of uniform width, a
polynomial of degree 15 about the centre of each. x >= X: modulus and phase, J = sqrt(2/(pi x)) g(y) cos(theta),
theta = x - c + delta(y), y = X/x: one polynomial in y^2 where X is far beyond the turning point (order < 14),
else polynomials of degree 8 in panels uniform in y. Every panel is made from the order and its place alone, in
double-double, so that a few points pay for a few panels and get the same bits.
"""

from __future__ import annotations

import math
from typing import TypeAlias

import numpy as np

from fbexpand.kernels.bessel_direct import (
    EXACT_TERMS,
    TAYLOR_TERMS,
    ascending_pair,
    modulus_series,
    series_pair,
    taylor,
)
from fbexpand.kernels.bessel_phase import MODULUS_TERMS, phase_panel, plain_series, smooth_phase
from fbexpand.kernels.bessel_station import CHAIN, CHAIN_TERMS, debye_from, station
from fbexpand.kernels.dd import dd_add, dd_add_d, dd_div, dd_mul, dd_mul_d
from fbexpand.kernels.elementary import LN2_1, LN2_2, dd_log_gamma1
from fbexpand.kernels.jit import callee, kernel
from fbexpand.types import FloatArray

# the header: index -> meaning
NU, NU_LOW, X0, INVERSE_WIDTH, WIDTH, PANELS, SCALED, X_PHASE = 0, 1, 2, 3, 4, 5, 6, 7
PHASE_PANELS, X_SERIES, LOG_C, LOG_C_LOW, PHASE_START = 8, 9, 10, 11, 12
MODULUS_USED, LOG_GAMMA, LOG_GAMMA_LOW = 13, 14, 15
SERIES_START, SERIES_TERMS = 16, 16
PANEL_START, PANEL_TERMS = 32, 16
PHASE_TERMS = 20  # a panel: constant (2), linear (2), delta_2..8 (7), g_0..8 (9)
# where there are no panels: constant (2), delta/y in powers of y^2 (9), g likewise (9)
SMOOTH_ORDER = 14.0
_SMOOTH_SERIES = 26
Work: TypeAlias = tuple[FloatArray, FloatArray, FloatArray, FloatArray, FloatArray, FloatArray]
SCALE = 2.0**640  # panels where J is near underflow are kept multiplied by this


@callee
def _place_of(nu: float, exponent: float) -> float:
    """Return where log J_nu is about -`exponent`, by Debye's leading term, for nu > 60."""
    q = exponent / nu  # = alpha - tanh(alpha), x = nu / cosh(alpha), by Newton's method
    alpha = q + 1.0 if q > 1.0 else np.cbrt(3.0 * q)
    for _ in range(6):
        t = math.tanh(alpha)
        alpha -= (alpha - t - q) / (t * t)
    return nu / math.cosh(alpha)


@kernel
def layout(nh: float, nl: float, head: FloatArray) -> int:
    """Fill the header with the regions of order nu and return the table's size in doubles."""
    series_end = math.sqrt(2.0 * (nh + 1.0)) if nh >= 2.0 else 1.5
    underflow = _place_of(nh, 738.0) if nh > 60.0 else 0.0  # below, the ascending series reaches further down
    start = max(series_end, underflow)
    slope = nh / start
    slope = math.sqrt(slope * slope - 1.0) if slope > 1.0 else 0.0
    width = 1.0 if nh >= 300.0 else (0.5 if nh >= 2.0 else 0.25)
    while 0.5 * width * slope > 0.66 or 0.5 * width > start / 9.0:
        width *= 0.5
    start = math.ceil(start / width) * width
    if series_end > underflow:
        series_end = start
    end = max(50.0, 8.5 * nh) if nh < SMOOTH_ORDER else max(1.25 * nh + 20.0, debye_from(nh))
    panels = math.ceil((end - start) / width)
    phase_panels = 0 if nh < SMOOTH_ORDER else (256 if nh < 100.0 else 512)
    head[:] = 0.0
    head[NU] = nh
    head[NU_LOW] = nl
    head[X0] = start
    head[INVERSE_WIDTH] = 1.0 / width
    head[WIDTH] = width
    head[PANELS] = panels
    if nh > 60.0:
        head[SCALED] = max(0.0, math.ceil((_place_of(nh, 652.0) - start) / width))
    head[X_PHASE] = start + panels * width
    head[PHASE_PANELS] = phase_panels
    head[X_SERIES] = series_end
    head[PHASE_START] = PANEL_START + panels * PANEL_TERMS
    return PANEL_START + panels * PANEL_TERMS + max(phase_panels, 1) * PHASE_TERMS


@callee
def prepare(data: FloatArray) -> None:
    """Fill what the ascending series needs."""
    nh, nl = data[NU], data[NU_LOW]
    gh, gl = dd_log_gamma1(nh, nl)
    data[LOG_GAMMA], data[LOG_GAMMA_LOW] = gh, gl
    ph, pl = dd_mul(nh, nl, LN2_1, LN2_2)
    data[LOG_C], data[LOG_C_LOW] = dd_add(ph, pl, gh, gl)  # x^nu / (2^nu Gamma(nu + 1))
    qh, ql = 1.0, 0.0
    for k in range(SERIES_TERMS):  # (-1)^k / (k! (nu + 1)_k), k from 1
        dh, dl = dd_add_d(nh, nl, k + 1.0)
        dh, dl = dd_mul_d(dh, dl, -(k + 1.0))
        qh, ql = dd_div(qh, ql, dh, dl)
        data[SERIES_START + k] = qh


@callee
def _integrate(end: float, terms: int, b: FloatArray) -> None:
    """Turn theta' into delta: integrate termwise from infinity."""
    for k in range(1, terms):
        ph, pl = dd_mul_d(b[k, 0], b[k, 1], -end)
        b[k, 0], b[k, 1] = dd_div(ph, pl, 2.0 * k - 1.0, 0.0)


@callee
def workspace() -> Work:
    """Return what the parts of one order share while they are made: all zeros at first."""
    return (
        np.zeros((_SMOOTH_SERIES, 2)),
        np.zeros((_SMOOTH_SERIES, 2)),
        np.zeros((2, MODULUS_TERMS)),
        np.empty((TAYLOR_TERMS, 2)),
        np.zeros((2, CHAIN, 6)),
        np.empty((CHAIN_TERMS, 2)),
    )


@callee
def part_of(head: FloatArray, x: float) -> int:
    """Return the part of the table that x >= 0 needs: a panel, the panels' number and a piece of the phase, or -1."""
    if x >= head[X_PHASE]:
        pieces = head[PHASE_PANELS]
        return int(head[PANELS]) + max(0, min(int(head[X_PHASE] / x * pieces), int(pieces) - 1))
    if x >= head[X0]:
        return int((x - head[X0]) * head[INVERSE_WIDTH])
    return int(np.int64(-1))


@callee
def low_part(head: FloatArray, i: int, work: Work, out: FloatArray) -> None:
    """Fill part i of an order below SMOOTH_ORDER, from the order and its place alone; `prepare` comes first."""
    a, b, t = work[0], work[1], work[3]
    nh, nl, start = head[NU], head[NU_LOW], head[X_PHASE]
    c = head[X0] + (i + 0.5) * head[WIDTH]
    far = c >= max(24.0, 1.25 * nh + 20.0)  # there the modulus series takes over from the ascending one
    if far and a[0, 0] == 0.0:
        head[MODULUS_USED] = modulus_series(nh, nl, start, a, b)
    terms = int(head[MODULUS_USED])
    if i >= int(head[PANELS]):
        d = b.copy()
        _integrate(start, terms, d)
        smooth_phase(nh, nl, a, d, terms, out)
        return
    e = int(np.int64(0))
    if far:
        jh, jl, dh, dl = series_pair(nh, nl, c, start, a, b, terms)
    else:
        jh, jl, dh, dl, e = ascending_pair(nh, nl, c, head[LOG_GAMMA], head[LOG_GAMMA_LOW])
    taylor(nh, nl, c, jh, jl, dh, dl, t, EXACT_TERMS)
    _scaled_copy(t, e, out)


@callee
def high_part(head: FloatArray, i: int, work: Work, out: FloatArray) -> None:
    """Fill part i of an order from SMOOTH_ORDER on, likewise."""
    series, t, chains, wide = work[2], work[3], work[4], work[5]
    nh, nl, start = head[NU], head[NU_LOW], head[X_PHASE]
    panels = int(head[PANELS])
    if i >= panels:
        if series[0, 0] == 0.0:
            plain_series(nh, start, series)
        phase_panel(nh, nl, start, (i - panels + 0.5) / head[PHASE_PANELS], series, out)
        return
    c = head[X0] + (i + 0.5) * head[WIDTH]
    jh, jl, dh, dl, e = station(nh, nl, c, head[LOG_GAMMA], head[LOG_GAMMA_LOW], chains, wide)
    taylor(nh, nl, c, jh, jl, dh, dl, t, EXACT_TERMS)
    _scaled_copy(t, e + 640 if i < head[SCALED] else e, out)


@callee
def _scaled_copy(t: FloatArray, e: int, out: FloatArray) -> None:
    """Copy the panel's coefficients times 2^e."""
    half = e // 2
    f, g = math.ldexp(1.0, int(half)), math.ldexp(1.0, int(e - half))
    for k in range(PANEL_TERMS):
        out[k] = t[k, 0] * f * g


@callee
def _place(data: FloatArray, i: int) -> FloatArray:
    """Return where part i of the table lies."""
    panels = int(data[PANELS])
    if i < panels:
        o = PANEL_START + i * PANEL_TERMS
        return data[o : o + PANEL_TERMS]
    o = int(data[PHASE_START]) + (i - panels) * PHASE_TERMS
    return data[o : o + PHASE_TERMS]


@kernel
def fill_low(data: FloatArray) -> None:
    """Fill a table below SMOOTH_ORDER, whose header `layout` has written."""
    prepare(data)
    work = workspace()
    for i in range(int(data[PANELS]) + 1):
        low_part(data, i, work, _place(data, i))


@kernel
def fill_high(data: FloatArray) -> None:
    """Fill a table from SMOOTH_ORDER on; apart from `fill_low`, as who needs one seldom needs the other compiled."""
    prepare(data)
    work = workspace()
    for i in range(int(data[PANELS]) + int(data[PHASE_PANELS])):
        high_part(data, i, work, _place(data, i))
