"""The table of one order: a flat array of doubles from which `bessel_eval` computes J_nu anywhere.

Three regions. x < x0: the ascending series times a power in two parts. x0 <= x < X: panels of uniform width, a
polynomial of degree 15 about the centre of each. x >= X: modulus and phase, J = sqrt(2/(pi x)) g(y) cos(theta),
theta = x - c + delta(y), y = X/x: one polynomial in y^2 where X is far beyond the turning point (order < 14),
else polynomials of degree 8 in panels uniform in y. A solution is marched from x0 to X
in double-double (upward, where J is the growing or a neutral solution) and normalised at X by the modulus series, or
at x0 by the ascending series; what the two say is compared.
"""

from __future__ import annotations

import math

import numpy as np

from fbexpand.kernels.bessel_direct import (
    TAYLOR_TERMS,
    ascending_pair,
    log_derivative,
    modulus_series,
    series_pair,
    taylor,
    taylor_step,
)
from fbexpand.kernels.bessel_phase import phase_panels, smooth_phase
from fbexpand.kernels.dd import dd_add, dd_add_d, dd_div, dd_mul, dd_mul_d, two_prod
from fbexpand.kernels.elementary import LN2_1, LN2_2, dd_log_gamma1
from fbexpand.kernels.jit import kernel
from fbexpand.types import FloatArray

# the header: index -> meaning
NU, NU_LOW, X0, INVERSE_WIDTH, WIDTH, PANELS, SCALED, X_PHASE = 0, 1, 2, 3, 4, 5, 6, 7
PHASE_PANELS, X_SERIES, LOG_C, LOG_C_LOW, PHASE_START, MISMATCH = 8, 9, 10, 11, 12, 13
SERIES_START, SERIES_TERMS = 16, 16
PANEL_START, PANEL_TERMS = 32, 16
PHASE_TERMS = 20  # a panel: constant (2), linear (2), delta_2..8 (7), g_0..8 (9)
# where there are no panels: constant (2), delta/y in powers of y^2 (9), g likewise (9)
SMOOTH_ORDER = 14.0
_SMOOTH_SERIES = 26
SCALE = 2.0**640  # panels where J is near underflow are kept multiplied by this


@kernel
def layout(nh: float, nl: float, head: FloatArray) -> int:
    """Fill the header with the regions of order nu and return the table's size in doubles."""
    series_end = math.sqrt(2.0 * (nh + 1.0)) if nh >= 2.0 else 1.5
    underflow = 0.0  # where log J is about -738, by Debye's leading exponent
    if nh > 60.0:  # below, the ascending series reaches further down than underflow
        low, high = 0.0, 700.0
        for _ in range(60):
            mid = 0.5 * (low + high)
            if nh * (mid - math.tanh(mid)) > 738.0:
                high = mid
            else:
                low = mid
        if high < 700.0:
            underflow = nh / math.cosh(high)
    start = max(series_end, underflow)
    slope = nh / start
    slope = math.sqrt(slope * slope - 1.0) if slope > 1.0 else 0.0
    width = 1.0 if nh >= 300.0 else (0.5 if nh >= 2.0 else 0.25)
    while 0.5 * width * slope > 0.66 or 0.5 * width > start / 9.0:
        width *= 0.5
    start = math.ceil(start / width) * width
    if series_end > underflow:
        series_end = start
    end = max(50.0, 8.5 * nh) if nh < SMOOTH_ORDER else 1.25 * nh + 20.0
    panels = math.ceil((end - start) / width)
    phase_panels = 0 if nh < SMOOTH_ORDER else (256 if nh < 100.0 else 512)
    head[:] = 0.0
    head[NU] = nh
    head[NU_LOW] = nl
    head[X0] = start
    head[INVERSE_WIDTH] = 1.0 / width
    head[WIDTH] = width
    head[PANELS] = panels
    head[X_PHASE] = start + panels * width
    head[PHASE_PANELS] = phase_panels
    head[X_SERIES] = series_end
    head[PHASE_START] = PANEL_START + panels * PANEL_TERMS
    return PANEL_START + panels * PANEL_TERMS + max(phase_panels, 1) * PHASE_TERMS


@kernel
def _march(data: FloatArray, gh: float, gl: float, at_end: FloatArray) -> None:
    """Fill the panels with Taylor coefficients, normalised at the far end to the J, J' in `at_end`."""
    nh, nl, start, width = data[NU], data[NU_LOW], data[X0], data[WIDTH]
    panels = int(data[PANELS])
    t = np.zeros((TAYLOR_TERMS, 2))
    exponents = np.zeros(panels, np.int64)
    exponent = 0
    c = start + 0.5 * width
    if start <= max(24.0, math.sqrt(44.0 * (nh + 1.0))):
        jh, jl, dh, dl, exponent = ascending_pair(nh, nl, c, gh, gl)
    else:
        jh, jl = 1.0, 0.0
        dh, dl = log_derivative(nh, nl, c)
    for i in range(panels):
        c = start + (i + 0.5) * width
        taylor(nh, nl, c, jh, jl, dh, dl, t)
        for k in range(PANEL_TERMS):
            data[PANEL_START + i * PANEL_TERMS + k] = t[k, 0]
        exponents[i] = exponent
        jh, jl, dh, dl = taylor_step(t, width if i < panels - 1 else 0.5 * width)
        if abs(jh) > 1e60 or abs(dh) > 1e60:
            f = 2.0**-200
            jh, jl, dh, dl = jh * f, jl * f, dh * f, dl * f
            exponent += 200
    # least squares in (J, J') for the factor from the marched solution to J
    ph, pl = dd_mul(at_end[0], at_end[1], at_end[0], at_end[1])
    qh, ql = dd_mul(at_end[2], at_end[3], at_end[2], at_end[3])
    nnh, nnl = dd_add(ph, pl, qh, ql)
    ph, pl = dd_mul(at_end[0], at_end[1], jh, jl)
    qh, ql = dd_mul(at_end[2], at_end[3], dh, dl)
    mmh, mml = dd_add(ph, pl, qh, ql)
    fh, fl = dd_div(nnh, nnl, mmh, mml)
    ph, pl = dd_mul(at_end[0], at_end[1], dh, dl)
    qh, ql = dd_mul(at_end[2], at_end[3], jh, jl)
    ph, pl = dd_add(ph, pl, -qh, -ql)
    data[MISMATCH] = ph / nnh * fh
    scaled = 0
    for i in range(panels):
        o = PANEL_START + i * PANEL_TERMS
        shift = exponents[i] - exponent
        size = (abs(data[o]) + 0.5 * width * abs(data[o + 1])) * abs(fh)
        if math.log2(size) + shift < -940.0:
            scaled = i + 1
            shift += 640
        half = shift // 2
        f1 = math.ldexp(1.0, int(half))
        f2 = math.ldexp(1.0, int(shift - half))
        for k in range(PANEL_TERMS):
            p, q = two_prod(data[o + k], fh)
            data[o + k] = (p + (q + data[o + k] * fl)) * f1 * f2
    data[SCALED] = scaled


@kernel
def _prepare(data: FloatArray) -> tuple[float, float]:
    """Fill what the ascending series needs; return log Gamma(nu + 1)."""
    nh, nl = data[NU], data[NU_LOW]
    gh, gl = dd_log_gamma1(nh, nl)
    ph, pl = dd_mul(nh, nl, LN2_1, LN2_2)
    data[LOG_C], data[LOG_C_LOW] = dd_add(ph, pl, gh, gl)  # x^nu / (2^nu Gamma(nu + 1))
    qh, ql = 1.0, 0.0
    for k in range(SERIES_TERMS):  # (-1)^k / (k! (nu + 1)_k), k from 1
        dh, dl = dd_add_d(nh, nl, k + 1.0)
        dh, dl = dd_mul_d(dh, dl, -(k + 1.0))
        qh, ql = dd_div(qh, ql, dh, dl)
        data[SERIES_START + k] = qh
    return gh, gl


@kernel
def _integrate(end: float, terms: int, b: FloatArray) -> None:
    """Turn theta' into delta: integrate termwise from infinity."""
    for k in range(1, terms):
        ph, pl = dd_mul_d(b[k, 0], b[k, 1], -end)
        b[k, 0], b[k, 1] = dd_div(ph, pl, 2.0 * k - 1.0, 0.0)


@kernel
def _panel_alone(
    data: FloatArray, i: int, gh: float, gl: float, a: FloatArray, b: FloatArray, terms: int, t: FloatArray
) -> None:
    """Fill panel i of an order below SMOOTH_ORDER from one expansion at its centre, not from its neighbours."""
    nh, nl = data[NU], data[NU_LOW]
    c = data[X0] + (i + 0.5) * data[WIDTH]
    if c < _series_from(nh):
        jh, jl, dh, dl, e = ascending_pair(nh, nl, c, gh, gl)
        f = math.ldexp(1.0, e)
        jh, jl, dh, dl = jh * f, jl * f, dh * f, dl * f
    else:
        jh, jl, dh, dl = series_pair(nh, nl, c, data[X_PHASE], a, b, terms)
    taylor(nh, nl, c, jh, jl, dh, dl, t)
    o = PANEL_START + i * PANEL_TERMS
    for k in range(PANEL_TERMS):
        data[o + k] = t[k, 0]


@kernel
def _series_from(nu: float) -> float:
    """Return where the modulus series takes over: below, it is cut too early; above, the ascending one cancels."""
    return max(24.0, 1.25 * nu + 20.0)


@kernel
def fill(data: FloatArray, x: FloatArray) -> None:
    """Fill what the points `x` need of a table below SMOOTH_ORDER; all of it if `x` is empty.

    A panel depends on the order and its place alone, so that it does not matter which are filled first.
    """
    nh, nl, start, end = data[NU], data[NU_LOW], data[X0], data[X_PHASE]
    gh, gl = _prepare(data)
    panels = int(data[PANELS])
    everything = x.size == 0
    terms = 0
    a = np.zeros((_SMOOTH_SERIES, 2))
    b = np.zeros((_SMOOTH_SERIES, 2))
    t = np.zeros((TAYLOR_TERMS, 2))
    for n in range(panels + 1 if everything else x.size):
        if everything:
            i = n
        elif x[n] >= start:
            i = int((x[n] - start) * data[INVERSE_WIDTH]) if x[n] < end else panels
        else:
            i = -1
        if i < 0:
            continue
        if terms == 0 and start + (i + 0.5) * data[WIDTH] >= _series_from(nh):
            terms = modulus_series(nh, nl, end, a, b)
        if i < panels:
            if math.isnan(data[PANEL_START + i * PANEL_TERMS]):
                _panel_alone(data, i, gh, gl, a, b, terms, t)
        else:
            first = int(data[PHASE_START])
            if math.isnan(data[first]):
                d = b.copy()
                _integrate(end, terms, d)
                smooth_phase(nh, nl, a, d, terms, data[first:])


@kernel
def build(data: FloatArray) -> None:
    """Fill the table of an order from SMOOTH_ORDER on, whose header `layout` has written."""
    nh, nl, end = data[NU], data[NU_LOW], data[X_PHASE]
    gh, gl = _prepare(data)
    ratio = max((nh / end) ** 2, 0.3)
    terms = int(55.0 / -math.log(ratio)) + 6
    a = np.zeros((terms, 2))
    b = np.zeros((terms, 2))
    terms = modulus_series(nh, nl, end, a, b)
    at_end = np.zeros(4)
    at_end[0], at_end[1], at_end[2], at_end[3] = series_pair(nh, nl, end, end, a, b, terms)
    _march(data, gh, gl, at_end)
    _integrate(end, terms, b)
    first = int(data[PHASE_START])
    phase_panels(nh, nl, a, b, terms, int(data[PHASE_PANELS]), data[first:])
