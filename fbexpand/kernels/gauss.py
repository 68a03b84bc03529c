"""Gauss-Jacobi rules on [0, 1], refined in double-double so that nodes and weights are right to rounding."""

from __future__ import annotations

import numpy as np

from fbexpand.kernels.dd import dd_add, dd_add_d, dd_div, dd_mul, dd_mul_d, quick_two_sum, two_prod, two_sum
from fbexpand.kernels.jit import kernel
from fbexpand.types import FloatArray

MOST_NODES = 220  # the monic polynomials fall as 4^-n: their squares must not underflow


@kernel
def refine_rule(power: float, t: FloatArray, weights: FloatArray) -> None:
    """Refine the nodes t in (0, 1), good to 1e-10, of the rule for integral_0^1 t^power g dt, and fill weights.

    Newton's method on the monic polynomial of degree t.size, p_{k+1} = (t - a_k) p_k - b_k p_{k-1}; the weight
    is the reciprocal of the sum of p_k^2 / h_k, h_k the integral of p_k^2 (a sum of positive numbers). power >=
    0; t.size from 1 to MOST_NODES.
    """
    n = t.size
    ah, al, bh, bl = np.empty(n), np.empty(n), np.zeros(n), np.zeros(n)
    for k in range(n):
        # a_k = (1 + c^2 / (m (m + 2))) / 2, b_k = (k (k + c))^2 / (m^2 (m + 1) (m - 1)), m = 2 k + c, c = power
        mh, ml = two_sum(2.0 * k, power)
        m2h, m2l = dd_add_d(mh, ml, 2.0)
        if k == 0:
            xh, xl = dd_div(power, 0.0, m2h, m2l)
        else:
            ch, cl = two_prod(power, power)
            yh, yl = dd_mul(mh, ml, m2h, m2l)
            xh, xl = dd_div(ch, cl, yh, yl)
        xh, xl = dd_add_d(xh, xl, 1.0)
        ah[k], al[k] = 0.5 * xh, 0.5 * xl
        if k > 0:
            xh, xl = two_sum(float(k), power)
            xh, xl = dd_mul_d(xh, xl, float(k))
            xh, xl = dd_div(xh, xl, mh, ml)
            xh, xl = dd_mul(xh, xl, xh, xl)
            uh, ul = dd_add_d(mh, ml, 1.0)
            vh, vl = dd_add_d(mh, ml, -1.0)
            uh, ul = dd_mul(uh, ul, vh, vl)
            bh[k], bl[k] = dd_div(xh, xl, uh, ul)
    for i in range(n):
        th, tl = t[i], 0.0
        total = 0.0
        for step in range(3):
            ph, pl, qh, ql = 1.0, 0.0, 0.0, 0.0
            d, e = 0.0, 0.0
            h = 1.0 / (power + 1.0)
            total = 1.0 / h
            for k in range(n):
                xh, xl = dd_add(th, tl, -ah[k], -al[k])
                yh, yl = dd_mul(xh, xl, ph, pl)
                zh, zl = dd_mul(bh[k], bl[k], qh, ql)
                d, e = ph + xh * d - bh[k] * e, d
                qh, ql = ph, pl
                ph, pl = dd_add(yh, yl, -zh, -zl)
                if k < n - 1:
                    h *= bh[k + 1]
                    total += ph * ph / h
            if step < 2:
                th, tl = dd_add_d(th, tl, -ph / d)
                th, tl = quick_two_sum(th, tl)
        t[i] = th
        weights[i] = 1.0 / total
