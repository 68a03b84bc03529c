"""Dini roots x J_nu' + robin J_nu = 0 from the second on, by their phase.

With J = M cos(theta), A = x theta', B = robin + x M'/M the condition is A sin(theta) = B cos(theta), and the
k-th root is where theta - a = (k - 1) pi, a = atan(B / A) between -pi/2 and pi/2. The left side rises with
slope theta' (x^2 - nu^2 + robin^2) / (A^2 + B^2) (from the equation alone), so every k has one root, between
j_{k-1} and j_k. A and B do not oscillate; a is small or next to +-pi/2 where robin is small or large, and
found as such.
"""

from __future__ import annotations

import math

from fbexpand.kernels.dd import dd_add, dd_add_d, dd_div, dd_mul, dd_mul_d, two_sum
from fbexpand.kernels.elementary import HALF_PI1, HALF_PI2, PI1, PI2, dd_sincos
from fbexpand.kernels.jit import callee, kernel
from fbexpand.kernels.roots_far import far_point, far_point_pair
from fbexpand.kernels.roots_mcmahon import quarter_angle
from fbexpand.kernels.roots_phase import phase_rise, phase_rise_double, phase_rise_pairs
from fbexpand.types import FloatArray


@callee
def angle_pair(ah: float, al: float, bh: float, bl: float) -> tuple[float, float]:
    """Return atan(B / A) in two parts, A > 0."""
    swap = abs(bh) > ah
    if swap:
        rh, rl = dd_div(ah, al, bh, bl)
    else:
        rh, rl = dd_div(bh, bl, ah, al)
    vh = math.atan(rh)
    if abs(vh) < 1e-5:  # atan(r) = r - r^3/3 + ...
        z = rh * rh
        vh, vl = two_sum(rh, rl - rh * z * (1.0 / 3.0 - 0.2 * z))
    else:
        sh, sl, ch, cl = dd_sincos(vh, 0.0)
        ph, pl = dd_mul(rh, rl, ch, cl)
        ph, pl = dd_add(ph, pl, -sh, -sl)
        vl = ph / (ch + rh * sh)
        vh, vl = two_sum(vh, vl)
    if not swap:
        return vh, vl
    side = 1.0 if bh > 0.0 else -1.0
    return dd_add(side * HALF_PI1, side * HALF_PI2, -vh, -vl)


@callee
def _stiffness(x: float, nu: float, robin: float, a: float, b: float) -> float:
    """Return (x^2 - nu^2 + robin^2) / (A^2 + B^2) without overflow."""
    scale = 1.0 / max(1.0, abs(robin))
    top = (x - nu) * scale * ((x + nu) * scale) + (robin * scale) ** 2
    return top / ((a * scale) ** 2 + (b * scale) ** 2)


@callee
def _at_end(nu: float, robin: float, panels: FloatArray, p: int) -> float:
    """Return theta - a at the outer end of panel p."""
    x = panels[p, 0]
    d = panels[p, 4]
    b = robin - 0.5 * (1.0 + x * 2.0 * panels[p, 6] / d)
    return float(panels[p, 2] - math.atan2(b, x * d))


@kernel
def dini_inside(nu: float, robin: float, panels: FloatArray) -> int:
    """Return the last k whose root is looked for in the panels."""
    return math.floor(_at_end(nu, robin, panels, 0) / PI1) + 1


@kernel
def near_dini(
    nu: float, robin: float, panels: FloatArray, count: int, start: int, high: FloatArray, low: FloatArray
) -> None:
    """Fill the roots `start` >= 2 ... `start` + `high.size` - 1, all inside the panels, ascending."""
    p = count - 1
    for i in range(high.size):
        turns = start + i - 1.0
        th, tl = dd_mul_d(PI1, PI2, turns)
        while p > 0 and _at_end(nu, robin, panels, p) < th:
            p -= 1
        c = panels[p, 0]
        rh, rl = dd_add(th, tl, -panels[p, 2], -panels[p, 3])
        s = -0.5 * panels[p, 1]
        for _ in range(30):
            v, d, e = phase_rise_double(panels, p, s)
            x = c + s
            a = x * d
            b = robin - 0.5 * (1.0 + x * e / d)
            slope = d * _stiffness(x, nu, robin, a, b)
            new = s - (v - rh - math.atan2(b, a)) / slope
            new = min(max(new, -1.01 * panels[p, 1]), 0.01 * panels[p, 1])
            step = new - s
            s = new
            if abs(step) < 1e-14 * x:
                break
        vh, vl = phase_rise(panels, p, s)
        dh, dl, eh, el = phase_rise_pairs(panels, p, s)
        xh, xl = two_sum(c, s)
        ah, al = dd_mul(xh, xl, dh, dl)
        bh, bl = dd_div(eh, el, dh, dl)
        bh, bl = dd_mul(bh, bl, xh, xl)
        bh, bl = dd_add_d(bh, bl, 1.0)
        bh, bl = dd_add_d(-0.5 * bh, -0.5 * bl, robin)
        slope = dh * _stiffness(xh, nu, robin, ah, bh)
        ah, al = angle_pair(ah, al, bh, bl)
        vh, vl = dd_add(vh, vl, -rh, -rl)
        vh, vl = dd_add(vh, vl, -ah, -al)
        high[i], low[i] = dd_add_d(xh, xl, -(vh + vl) / slope)


@kernel
def far_dini(
    nu: float,
    robin: float,
    scale: float,
    pieces: FloatArray,
    count: int,
    start: int,
    high: FloatArray,
    low: FloatArray,
) -> None:
    """Fill the roots `start` ... `start` + `high.size` - 1 beyond the panels; `count` = 0: by McMahon.

    In terms of beta, x = beta + G(beta), w = 1 + G' and x theta'' / theta' = -x G'' / w^2.
    """
    for i in range(high.size):
        th, tl = quarter_angle((start + i) - 0.75, 0.5 * nu)
        a = math.atan2(robin - 0.5, th)
        for _ in range(30):
            beta = th + a
            g, g1, g2 = far_point(nu, scale, pieces, count, beta)
            x = beta + g
            w = 1.0 + g1
            cosine = x / w
            sine = robin - 0.5 * (1.0 - x * g2 / (w * w))
            new = a - (a - math.atan2(sine, cosine)) / _stiffness(x, nu, robin, cosine, sine)
            step = new - a
            a = new
            if abs(step) < 1e-14:
                break
        bh, bl = dd_add_d(th, tl, a)
        gh, gl, g1h, g1l, g2h, g2l = far_point_pair(nu, scale, pieces, count, bh, bl)
        xh, xl = dd_add(bh, bl, gh, gl)
        wh, wl = dd_add_d(g1h, g1l, 1.0)
        ch, cl = dd_div(xh, xl, wh, wl)
        sh, sl = dd_mul(ch, cl, g2h, g2l)
        sh, sl = dd_div(sh, sl, wh, wl)
        sh, sl = dd_add_d(-sh, -sl, 1.0)
        sh, sl = dd_add_d(-0.5 * sh, -0.5 * sl, robin)
        slope = _stiffness(xh, nu, robin, ch, sh)
        eh, el = angle_pair(ch, cl, sh, sl)
        eh, el = dd_add_d(eh, el, -a)
        step = (eh + el) / slope
        # x moves by w times the step in beta; the step is of the order of rounding
        high[i], low[i] = dd_add_d(xh, xl, step * wh)
