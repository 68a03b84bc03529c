"""Norms of the modes on the unit radius, and J_nu and J_nu' at the roots, without cancellation."""

from __future__ import annotations

import math

import numpy as np

from fbexpand.kernels.debye import DEBYE_FROM, debye_root
from fbexpand.kernels.first_mode import first_norm
from fbexpand.special.bessel import bessel_pair_at
from fbexpand.types import FloatArray

PLAIN, RATIO, SCALED_J = "plain", "ratio", "scaled J"
_SMALL = -46.0  # log J_nu below which the ratio of expansions is used: far from the turning point


def first_kind(order: float, robin: float, root: float) -> tuple[str, float]:
    """Return how the first Dini mode is evaluated, and sigma (1, 0, -1: I_nu, r^nu, J_nu).

    PLAIN: it is not scaled, robin >= 0. RATIO: by `modified.rim_scaled`. SCALED_J: as J_nu(lambda x) /
    J_nu(lambda).
    """
    if robin < -order:
        return RATIO, 1.0
    if robin == -order:
        return RATIO, 0.0
    if robin >= 0.0:
        return PLAIN, -1.0
    if order < DEBYE_FROM and root * root <= 2.0 * (order + 1.0) and robin <= -0.5 * order:
        return (
            RATIO,
            -1.0,
        )  # for smaller |robin| its slope nearly vanishes at the rim, where J's Taylor series serves
    if root < order:
        w, _ = debye_root(order, root, 0.0, -1.0)
        if w + order * math.log(root / (order + w)) < _SMALL:
            return RATIO, -1.0
    return SCALED_J, -1.0


def first_norm_at(order: float, robin: float, root: float, root_low: float, sigma: float, kind: str) -> float:
    """Return the norm of a first mode that is scaled to 1 at the rim."""
    asymptotic = False
    if sigma != 0.0 and kind == RATIO:
        w, _ = debye_root(order, root, root_low, sigma)
        asymptotic = w >= DEBYE_FROM
    return float(first_norm(order, robin, root, root_low, sigma, asymptotic))


def rim_values(
    order: float, robin: float, root: FloatArray, root_low: FloatArray
) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Return J_nu, J_nu' at the roots and the norm of J_nu(lambda x); robin = inf: the zeros of J_nu.

    lambda J' + robin J = 0 gives the smaller of the two from the other, so both are good to a few eps of
    themselves, and the norm is a sum of positive parts: (J'^2 + (1 - nu^2/lambda^2) J^2) / 2 with the other
    eliminated. Valid where lambda >= nu: for all roots but the first where robin < 0.
    """
    value, slope = bessel_pair_at(order, root, root_low)
    if math.isinf(robin):
        return np.zeros_like(slope), slope, 0.5 * slope * slope
    excess = ((root - order + root_low) / root) * ((root + order) / root)  # 1 - nu^2/lambda^2
    turn = np.sqrt(np.abs(excess) + 1.5 * (1.0 + order) ** (-2.0 / 3.0))
    by_slope = abs(robin) > turn * root
    with np.errstate(divide="ignore", invalid="ignore", over="ignore"):
        value = np.where(by_slope, -root * slope / robin, value)
        slope = np.where(by_slope, slope, -robin * value / root)
        from_slope = 1.0 + (root - order + root_low) / robin * ((root + order) / robin)
        from_value = excess + (robin / root) * (robin / root)
        norm = 0.5 * np.where(by_slope, slope * slope * from_slope, value * value * from_value)
    return value, slope, norm
