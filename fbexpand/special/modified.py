"""Modified Bessel functions where they do not overflow: scaled by exp(-x), or to 1 at the rim.

All unchecked and internal: real order >= 0, x >= 0. Relative errors of a few eps (2.3 at most in sweeps over
orders to 1e4 and arguments to 1e6 against ball arithmetic; 4 for second derivatives).
"""

from __future__ import annotations

import numpy as np

from fbexpand.kernels.first_mode import first_mode, scaled_i
from fbexpand.types import FloatArray


def bessel_i_scaled(order: float, x: FloatArray) -> FloatArray:
    """Return exp(-x) I_order(x), of the shape of x.

    >>> import numpy as np
    >>> bessel_i_scaled(0.5, np.array([2.0]))  # (1 - exp(-4)) / sqrt(4 pi)
    array([0.27692805])
    """
    flat = np.ascontiguousarray(np.ravel(x), dtype=np.float64)
    out = np.empty_like(flat)
    scaled_i(order, flat, out)
    return out.reshape(np.shape(x))


def rim_scaled(
    order: float,
    root: float,
    root_low: float,
    sigma: float,
    x: FloatArray,
    x_low: FloatArray,
    *,
    derivative: int = 0,
) -> FloatArray:
    """Return (d/dx)^derivative of C(mu x) / C(mu) at x + x_low, mu = root + root_low, for one-dimensional x.

    C is I_order for sigma = 1, r^order for sigma = 0 (mu = 0), and J_order for sigma = -1, which must be well
    below its turning point (see `norms.first_kind`). Infinite at x = 0 where it is.

    >>> import numpy as np
    >>> x = np.array([0.0, 0.5, 1.0])
    >>> rim_scaled(0.0, 1e6, 0.0, 1.0, x, np.zeros(3))  # I_0(1e6) would be 1e434291
    array([0., 0., 1.])
    """
    out = np.empty_like(x)
    first_mode(order, root, root_low, sigma, derivative, x, x_low, out)
    return out
