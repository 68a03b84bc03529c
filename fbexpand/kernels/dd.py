"""Double-double arithmetic: a value as an unevaluated sum of two doubles, about 32 digits.

Error-free transformations by Knuth (two_sum), Dekker (quick_two_sum) and the fused multiply-add (two_prod); see
Hida, Li and Bailey, "Library for double-double and quad-double arithmetic" (2007).
"""

from __future__ import annotations

import math
from fractions import Fraction
from typing import Any

from fbexpand.kernels.jit import JIT_DISABLED, inline_kernel

if JIT_DISABLED:

    def fma(a: float, b: float, c: float) -> float:
        """Return a * b + c with one rounding."""
        if not (math.isfinite(a) and math.isfinite(b) and math.isfinite(c)):
            return a * b + c
        exact = Fraction(a) * Fraction(b) + Fraction(c)
        if exact == 0:
            return a * b + c
        try:
            return float(exact)
        except OverflowError:
            return math.copysign(math.inf, exact)

else:
    from numba.core import types
    from numba.extending import intrinsic

    @intrinsic  # type: ignore[untyped-decorator, unused-ignore]
    def fma(typingctx: Any, a: Any, b: Any, c: Any) -> Any:
        """Return a * b + c with one rounding."""

        def codegen(context: Any, builder: Any, signature: Any, args: Any) -> Any:
            return builder.fma(*args)

        return types.float64(types.float64, types.float64, types.float64), codegen


@inline_kernel
def two_sum(a: float, b: float) -> tuple[float, float]:
    """Return s, e with s = fl(a + b) and s + e = a + b exactly."""
    s = a + b
    t = s - a
    return s, (a - (s - t)) + (b - t)


@inline_kernel
def quick_two_sum(a: float, b: float) -> tuple[float, float]:
    """Return s, e with s + e = a + b exactly, for |a| >= |b| or a = 0."""
    s = a + b
    return s, b - (s - a)


@inline_kernel
def two_prod(a: float, b: float) -> tuple[float, float]:
    """Return p, e with p = fl(a * b) and p + e = a * b exactly (no under- or overflow)."""
    p = a * b
    return p, fma(a, b, -p)


@inline_kernel
def dd_add(ah: float, al: float, bh: float, bl: float) -> tuple[float, float]:
    """Return a + b, relative error below 2^-103 even under cancellation of the leading parts."""
    sh, sl = two_sum(ah, bh)
    th, tl = two_sum(al, bl)
    sh, sl = quick_two_sum(sh, sl + th)
    return quick_two_sum(sh, sl + tl)


@inline_kernel
def dd_add_d(ah: float, al: float, b: float) -> tuple[float, float]:
    """Return a + b for a double b."""
    sh, sl = two_sum(ah, b)
    return quick_two_sum(sh, sl + al)


@inline_kernel
def dd_mul(ah: float, al: float, bh: float, bl: float) -> tuple[float, float]:
    """Return a * b, relative error below 2^-102."""
    p, e = two_prod(ah, bh)
    return quick_two_sum(p, e + (ah * bl + al * bh))


@inline_kernel
def dd_mul_d(ah: float, al: float, b: float) -> tuple[float, float]:
    """Return a * b for a double b."""
    p, e = two_prod(ah, b)
    return quick_two_sum(p, fma(al, b, e))


@inline_kernel
def dd_div(ah: float, al: float, bh: float, bl: float) -> tuple[float, float]:
    """Return a / b, relative error below 2^-100."""
    q1 = ah / bh
    ph, pl = dd_mul_d(bh, bl, q1)
    rh, rl = dd_add(ah, al, -ph, -pl)
    q2 = rh / bh
    ph, pl = dd_mul_d(bh, bl, q2)
    rh, rl = dd_add(rh, rl, -ph, -pl)
    q3 = rh / bh
    q1, q2 = quick_two_sum(q1, q2)
    return dd_add_d(q1, q2, q3)


@inline_kernel
def dd_sqrt(ah: float, al: float) -> tuple[float, float]:
    """Return sqrt(a) for a >= 0."""
    if ah <= 0.0:
        return 0.0, 0.0
    s = math.sqrt(ah)
    p, e = two_prod(s, s)
    rh, _ = dd_add(ah, al, -p, -e)
    s1, s2 = quick_two_sum(s, rh / (2.0 * s))
    ph, pl = dd_mul(s1, s2, s1, s2)
    rh, _ = dd_add(ah, al, -ph, -pl)
    return dd_add_d(s1, s2, rh / (2.0 * s))
