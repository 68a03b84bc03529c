"""x as a function of the phase beyond the panels, and the zeros of J_nu there.

With beta = theta + (nu/2 + 1/4) pi, x = beta + G(beta): McMahon's expansion (DLMF 10.21.19) is the series of
G in 1/beta. Here G = y P(y^2), y = b/beta, b the beta of the outermost panel's end, and P is interpolated on
[0, 1] at Chebyshev nodes, where the modulus series is inverted in double-double. So it holds for every beta
>= b and any order.

A piece is a row: its ends in y^2, its centre, 1/half-length, and the powers of the local variable in [-1, 1],
the first PAIRS in two parts.
"""

from __future__ import annotations

import math

import numpy as np

from fbexpand.kernels.dd import dd_add, dd_add_d, dd_div, dd_mul, dd_mul_d, fma, quick_two_sum, two_sum
from fbexpand.kernels.elementary import PI1
from fbexpand.kernels.jit import callee, kernel
from fbexpand.kernels.roots_mcmahon import mcmahon_coefficients, quarter_angle
from fbexpand.kernels.roots_phase import outer_end
from fbexpand.types import FloatArray

NODES = 28
PAIRS = 6  # powers 0 ... PAIRS - 1
WIDTH = 4 + 2 * PAIRS + (NODES - PAIRS)
SINGLES = 4 + PAIRS  # power n >= PAIRS stands at SINGLES + n
MAX_PIECES = 4
BLOCK = 256


def _nodes() -> FloatArray:
    """Return the Chebyshev nodes, each as far as possible from those before it (Leja's order)."""
    left = list(np.cos(np.pi * (np.arange(NODES) + 0.5) / NODES))
    order = [left.pop(0)]
    while left:
        gaps = [math.prod(abs(x - y) for y in order) for x in left]
        order.append(left.pop(gaps.index(max(gaps))))
    return np.array(order)


NODE = _nodes()


@callee
def _beta_to_x(end: float, b: FloatArray, terms: int, beta: float, guess: float) -> tuple[float, float]:
    """Return x - beta where x - X sum b_k (X/x)^(2k-1) = beta."""
    x = guess
    for _ in range(30):
        y = end / x
        z = y * y
        s = 0.0
        d = 0.0
        for k in range(terms - 1, 0, -1):
            d = d * z + (2.0 * k - 1.0) * b[k, 0]
            s = s * z + b[k, 0]
        step = (x - end * y * s - beta) / (1.0 + z * d)
        x -= step
        if abs(step) < 1e-13 * x:
            break
    yh, yl = dd_div(end, 0.0, x, 0.0)
    zh, zl = dd_mul(yh, yl, yh, yl)
    sh, sl = 0.0, 0.0
    s = 0.0
    d = 0.0
    k = terms - 1
    while k > 0 and abs(b[k, 0]) * zh**k < 1e-12:  # the far terms need one part only
        d = d * zh + (2.0 * k - 1.0) * b[k, 0]
        s = s * zh + b[k, 0]
        k -= 1
    sh = s
    while k > 0:
        d = d * zh + (2.0 * k - 1.0) * b[k, 0]
        sh, sl = dd_mul(sh, sl, zh, zl)
        sh, sl = dd_add(sh, sl, b[k, 0], b[k, 1])
        k -= 1
    sh, sl = dd_mul(sh, sl, yh, yl)
    sh, sl = dd_mul_d(sh, sl, -end)
    rh, rl = two_sum(x, -beta)
    sh, sl = dd_add(sh, sl, rh, rl)
    return dd_add_d(rh, rl, -(sh + sl) / (1.0 + zh * d))


@callee
def _fit(
    end: float, b: FloatArray, terms: int, scale: float, low: float, high: float, pieces: FloatArray, row: int
) -> float:
    """Interpolate P on low <= y^2 <= high by divided differences; return the size of the last terms."""
    centre = 0.5 * (low + high)
    half = 0.5 * (high - low)
    s = np.zeros((NODES, 2))
    v = np.zeros((NODES, 2))
    for i in range(NODES):
        beta = scale / math.sqrt(centre + half * NODE[i])  # rounded: the node is taken back from it
        yh, yl = dd_div(scale, 0.0, beta, 0.0)
        zh, zl = dd_mul(yh, yl, yh, yl)
        zh, zl = dd_add_d(zh, zl, -centre)
        s[i, 0], s[i, 1] = dd_div(zh, zl, half, 0.0)
        gh, gl = _beta_to_x(end, b, terms, beta, beta + yh * (end - scale))
        v[i, 0], v[i, 1] = dd_div(gh, gl, yh, yl)
    for k in range(1, NODES):
        for i in range(NODES - 1, k - 1, -1):
            ph, pl = dd_add(v[i, 0], v[i, 1], -v[i - 1, 0], -v[i - 1, 1])
            qh, ql = dd_add(s[i, 0], s[i, 1], -s[i - k, 0], -s[i - k, 1])
            v[i, 0], v[i, 1] = dd_div(ph, pl, qh, ql)
    for k in range(NODES - 2, -1, -1):  # to powers, in place
        for i in range(k, NODES - 1):
            ph, pl = dd_mul(v[i + 1, 0], v[i + 1, 1], -s[k, 0], -s[k, 1])
            v[i, 0], v[i, 1] = dd_add(v[i, 0], v[i, 1], ph, pl)
    pieces[row, 0] = low
    pieces[row, 1] = high
    pieces[row, 2] = centre
    pieces[row, 3] = 1.0 / half
    for n in range(NODES):
        if n < PAIRS:
            pieces[row, 4 + 2 * n] = v[n, 0]
            pieces[row, 5 + 2 * n] = v[n, 1]
        else:
            pieces[row, SINGLES + n] = v[n, 0]
    return float(max(abs(v[NODES - 1, 0]), abs(v[NODES - 2, 0])) * 0.5 ** (NODES - 2))


@kernel
def fit_far(nu: float, b: FloatArray, terms: int, scale: float, pieces: FloatArray) -> int:
    """Fill `pieces` (MAX_PIECES, WIDTH) for y^2 from 0 to 1 and return their number."""
    end = outer_end(nu)
    low = 0.0
    row = int(np.int64(0))
    split = False
    while row < MAX_PIECES:
        high = 0.5 * (1.0 + low) if split and row < MAX_PIECES - 1 else 1.0
        size = _fit(end, b, terms, scale, low, high, pieces, row)
        if split:
            low = high
            row += 1
        elif size <= 1e-22 * end:
            return 1
        split = True
    return MAX_PIECES


@kernel
def far_zeros(
    nu: float, scale: float, pieces: FloatArray, count: int, start: int, high: FloatArray, low: FloatArray
) -> None:
    """Fill the zeros `start` ... `start` + `high.size` - 1 of J_nu, all with beta >= `scale`, ascending."""
    total = high.size
    bh = np.empty(BLOCK)
    bl = np.empty(BLOCK)
    yh = np.empty(BLOCK)
    yl = np.empty(BLOCK)
    sh = np.empty(BLOCK)
    sl = np.empty(BLOCK)
    ph = np.empty(BLOCK)
    half = 0.5 * nu
    done = 0
    row = count - 1
    while done < total:
        while row > 0 and (scale / PI1) ** 2 < pieces[row, 0] * (start + done - 0.25 + half) ** 2:
            row -= 1
        m = min(BLOCK, total - done)
        if row > 0:
            last = int(scale / (PI1 * math.sqrt(pieces[row, 0])) + 0.25 - half) - (start + done) + 1
            m = max(1, min(m, last))
        centre = pieces[row, 2]
        inverse = pieces[row, 3]
        for i in range(m):
            p, q = quarter_angle((start + done + i) - 0.25, half)
            bh[i] = p
            bl[i] = q
            r = 1.0 / p
            rl = r * (fma(-r, p, 1.0) - r * q)
            y = scale * r
            z = fma(scale, r, -y) + scale * rl
            yh[i] = y
            yl[i] = z
            t = y * y
            tl = fma(y, y, -t) + 2.0 * y * z
            d, e = two_sum(t, -centre)
            sh[i], sl[i] = quick_two_sum(d * inverse, (e + tl) * inverse)
        c = pieces[row, SINGLES + NODES - 1]
        for i in range(m):
            ph[i] = c
        for n in range(NODES - 2, PAIRS - 1, -1):
            c = pieces[row, SINGLES + n]
            for i in range(m):
                ph[i] = fma(ph[i], sh[i], c)
        for i in range(m):
            gh, gl = ph[i], 0.0
            for n in range(PAIRS - 1, -1, -1):
                gh, gl = dd_mul(gh, gl, sh[i], sl[i])
                gh, e = two_sum(gh, pieces[row, 4 + 2 * n])
                gh, gl = quick_two_sum(gh, e + (gl + pieces[row, 5 + 2 * n]))
            gh, gl = dd_mul(gh, gl, yh[i], yl[i])
            high[done + i], low[done + i] = dd_add(bh[i], bl[i], gh, gl)
        done += m


@callee
def _row_of(pieces: FloatArray, count: int, t: float) -> int:
    row = count - 1
    while row > 0 and t < pieces[row, 0]:
        row -= 1
    return row


@callee
def far_point(nu: float, scale: float, pieces: FloatArray, count: int, beta: float) -> tuple[float, float, float]:
    """Return G and two derivatives with respect to beta; `count` = 0 means by McMahon's series."""
    if count == 0:
        c1, c3, c5, c7 = mcmahon_coefficients(nu)
        r = 1.0 / beta
        z = r * r
        g = -r * (c1 + z * (c3 + z * (c5 + z * c7)))
        g1 = z * (c1 + z * (3.0 * c3 + z * (5.0 * c5 + z * (7.0 * c7))))
        return g, g1, -r * z * (2.0 * c1 + z * (12.0 * c3 + z * (30.0 * c5 + z * (56.0 * c7))))
    y = scale / beta
    t = min(y * y, 1.0)
    row = _row_of(pieces, count, t)
    inverse = pieces[row, 3]
    s = (t - pieces[row, 2]) * inverse
    v, d, e = 0.0, 0.0, 0.0
    for n in range(NODES - 1, -1, -1):
        e = e * s + d
        d = d * s + v
        v = v * s + (pieces[row, SINGLES + n] if n >= PAIRS else pieces[row, 4 + 2 * n])
    d *= inverse
    e *= 2.0 * inverse * inverse
    g1 = -(t / scale) * (v + 2.0 * t * d)
    g2 = (2.0 * t * y / scale) / scale * (v + 5.0 * t * d + 2.0 * t * t * e)
    return y * v, g1, g2


@callee
def far_point_pair(
    nu: float, scale: float, pieces: FloatArray, count: int, bh: float, bl: float
) -> tuple[float, float, float, float, float, float]:
    """Return the same, each in two parts."""
    if count == 0:
        g, g1, g2 = far_point(nu, scale, pieces, count, bh)
        return g, 0.0, g1, 0.0, g2, 0.0
    yh, yl = dd_div(scale, 0.0, bh, bl)
    th, tl = dd_mul(yh, yl, yh, yl)
    row = _row_of(pieces, count, th)
    inverse = pieces[row, 3]
    sh, sl = dd_add_d(th, tl, -pieces[row, 2])
    sh *= inverse
    sl *= inverse
    v, d, e = 0.0, 0.0, 0.0
    for n in range(NODES - 1, PAIRS - 1, -1):
        e = e * sh + d
        d = d * sh + v
        v = v * sh + pieces[row, SINGLES + n]
    vh, vl, dh, dl, eh, el = v, 0.0, d, 0.0, e, 0.0
    for n in range(PAIRS - 1, -1, -1):
        eh, el = dd_mul(eh, el, sh, sl)
        eh, el = dd_add(eh, el, dh, dl)
        dh, dl = dd_mul(dh, dl, sh, sl)
        dh, dl = dd_add(dh, dl, vh, vl)
        vh, vl = dd_mul(vh, vl, sh, sl)
        vh, vl = dd_add(vh, vl, pieces[row, 4 + 2 * n], pieces[row, 5 + 2 * n])
    dh, dl = dd_mul_d(dh, dl, inverse)
    eh, el = dd_mul_d(eh, el, 2.0 * inverse * inverse)
    gh, gl = dd_mul(yh, yl, vh, vl)
    dh, dl = dd_mul(dh, dl, th, tl)
    ph, pl = dd_add(vh, vl, 2.0 * dh, 2.0 * dl)
    qh, ql = dd_div(-th, -tl, scale, 0.0)
    g1h, g1l = dd_mul(ph, pl, qh, ql)
    eh, el = dd_mul(eh, el, th, tl)
    eh, el = dd_mul(2.0 * eh, 2.0 * el, th, tl)
    ph, pl = dd_mul_d(dh, dl, 5.0)
    ph, pl = dd_add(ph, pl, vh, vl)
    ph, pl = dd_add(ph, pl, eh, el)
    qh, ql = dd_mul(-2.0 * qh, -2.0 * ql, yh, yl)
    qh, ql = dd_div(qh, ql, scale, 0.0)
    ph, pl = dd_mul(ph, pl, qh, ql)
    return gh, gl, g1h, g1l, ph, pl
