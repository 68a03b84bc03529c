"""TEMPORARY stand-ins so that the upper layers can be written while the kernels are being built. To be deleted."""

from __future__ import annotations

import numpy as np
from scipy.special import jv, jvp

from fbexpand.types import FloatArray


def bessel_at(order: float, x: FloatArray, x_low: FloatArray | None = None, *, order_low: float = 0.0, derivative: int = 0) -> FloatArray:
    v = jvp(order, x, derivative) if derivative else jv(order, x)
    if x_low is not None:
        v = v + x_low * jvp(order, x, derivative + 1)
    return np.asarray(v)


def roots_two_part(order: float, robin: float, count: int, start: int = 1) -> tuple[FloatArray, FloatArray]:
    """|lambda_k|; robin=inf means the zeros of J (Fourier-Bessel)."""
    from scipy.optimize import brentq
    from scipy.special import iv, ivp

    if np.isinf(robin):
        g = lambda x: jv(order, x)
    else:
        g = lambda x: x * jvp(order, x) + robin * jv(order, x)
    out = []
    if robin + order == 0:
        out.append(0.0)
    elif robin + order < 0:
        out.append(brentq(lambda m: m * ivp(order, m) + robin * iv(order, m), 1e-12, 700))
    x = 1e-9 if robin + order > 0 else 0.05
    a, ga = x, g(x)
    while len(out) < start - 1 + count:
        b = a + 0.05
        gb = g(b)
        if ga * gb < 0:
            out.append(brentq(g, a, b, xtol=1e-15, rtol=1e-15))
        a, ga = b, gb
    hi = np.array(out[start - 1:])
    return hi, np.zeros_like(hi)
