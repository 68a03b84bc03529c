"""McMahon's expansion (DLMF 10.21.19): x = beta - c1/beta - c3/beta^3 - c5/beta^5 - c7/beta^7 for large beta.

With beta >= 300 (nu + 10) the first term left out is below 1e-24 of x and the doubles' rounding below 1e-21.
"""

from __future__ import annotations

from fbexpand.kernels.dd import fma, quick_two_sum, two_sum
from fbexpand.kernels.elementary import PI1, PI2
from fbexpand.kernels.jit import inline_kernel, kernel
from fbexpand.types import FloatArray


@kernel
def mcmahon_start(nu: float) -> float:
    """Return a k from which on beta >= 300 (nu + 10), for zeros and Dini roots alike."""
    return float(int(300.0 * (nu + 10.0) / PI1) + 4)


@inline_kernel
def mcmahon_coefficients(nu: float) -> tuple[float, float, float, float]:
    """Return c1, c3, c5, c7."""
    mu = 4.0 * nu * nu
    first = (2.0 * nu - 1.0) * (2.0 * nu + 1.0)
    c1 = first / 8.0
    c3 = first * (7.0 * mu - 31.0) / 384.0
    c5 = first * ((83.0 * mu - 982.0) * mu + 3779.0) / 15360.0
    c7 = first * (((6949.0 * mu - 153855.0) * mu + 1585743.0) * mu - 6277237.0) / 3440640.0
    return c1, c3, c5, c7


@inline_kernel
def quarter_angle(k: float, half: float) -> tuple[float, float]:
    """Return (k + half) pi in two parts."""
    s, e = two_sum(k, half)
    p = s * PI1
    return quick_two_sum(p, fma(s, PI1, -p) + (s * PI2 + e * PI1))


@kernel
def mcmahon_zeros(nu: float, start: int, high: FloatArray, low: FloatArray) -> None:
    """Fill the zeros `start` ... `start` + `high.size` - 1 of J_nu, `start` >= `mcmahon_start`."""
    c1, c3, c5, c7 = mcmahon_coefficients(nu)
    half = 0.5 * nu
    for i in range(high.size):
        b, e = quarter_angle((start + i) - 0.25, half)
        r = 1.0 / b
        z = r * r
        s, t = two_sum(b, -r * (c1 + z * (c3 + z * (c5 + z * c7))))
        high[i], low[i] = quick_two_sum(s, t + e)
