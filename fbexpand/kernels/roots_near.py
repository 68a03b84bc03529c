"""Zeros of J_nu inside the panels of the phase: Newton on a panel's polynomial, a last step in two parts."""

from __future__ import annotations

import math

from fbexpand.kernels.dd import dd_add, dd_add_d, dd_div, dd_mul_d, two_sum
from fbexpand.kernels.elementary import PI1, PI2
from fbexpand.kernels.jit import callee, kernel
from fbexpand.kernels.roots_phase import phase_rise, phase_rise_double
from fbexpand.types import FloatArray


@callee
def solve_panel(panels: FloatArray, p: int, th: float, tl: float) -> tuple[float, float]:
    """Return the x of panel p where theta has the two-part value th + tl."""
    rh, rl = dd_add(th, tl, -panels[p, 2], -panels[p, 3])
    s = max(rh / panels[p, 4], -panels[p, 1])
    for _ in range(20):
        v, d, _e = phase_rise_double(panels, p, s)
        step = (v - rh) / d
        s -= step
        if abs(step) < 1e-13 * abs(s):
            break
    vh, vl = phase_rise(panels, p, s)
    _, d, _e = phase_rise_double(panels, p, s)
    vh, vl = dd_add(vh, vl, -rh, -rl)
    xh, xl = two_sum(panels[p, 0], s)
    return dd_add_d(xh, xl, -(vh + vl) / d)


@kernel
def near_zeros(panels: FloatArray, count: int, start: int, high: FloatArray, low: FloatArray) -> None:
    """Fill the zeros `start` ... `start` + `high.size` - 1 of J_nu, all inside the panels, ascending."""
    p = count - 1
    for i in range(high.size):
        th, tl = dd_mul_d(PI1, PI2, (start + i) - 0.5)
        while p > 0 and panels[p, 2] < th:
            p -= 1
        high[i], low[i] = solve_panel(panels, p, th, tl)


@kernel
def zeros_inside(panels: FloatArray) -> int:
    """Return how many zeros lie at or below the outermost panel's end: floor(theta / pi + 1/2)."""
    qh, ql = dd_div(panels[0, 2], panels[0, 3], PI1, PI2)
    qh, ql = dd_add_d(qh, ql, 0.5)
    whole = math.floor(qh)
    return whole - 1 if whole == qh and ql < 0.0 else whole
