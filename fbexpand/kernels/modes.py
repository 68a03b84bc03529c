"""The matrix of modes J_nu(lambda_k x) and their derivatives: arguments in two parts, zeros at the rim kept."""

from __future__ import annotations

import math

import numpy as np

from fbexpand.kernels.bessel_eval import j_pairs, j_values
from fbexpand.kernels.bessel_table import LOG_C, LOG_C_LOW, X0, X_PHASE
from fbexpand.kernels.dd import fma, two_sum
from fbexpand.kernels.first_mode import (
    SERIES_TERMS,
    compensated_sum,
    power_series,
    quarter_square,
    series_terms,
)
from fbexpand.kernels.jit import callee, inline_kernel, kernel
from fbexpand.kernels.memory import address, load
from fbexpand.kernels.power import power_factor
from fbexpand.kernels.rim import DEEPEST, rim_columns, wave_number
from fbexpand.types import FloatArray, IntArray

MAX_DERIVATIVE = 12
COLUMNS = 128  # series about the rim summed side by side
CHUNK = 2048  # points evaluated in one go


@callee
def near_axis(where: int, nu: float, n: int, z: float, zl: float, a: FloatArray, first: int) -> float:
    """Return the n-th derivative of J_nu at z + zl < sqrt(2 nu + 2); `a`, `first` as in `power_series`."""
    ph, pl = two_sum(nu, 2.0 * first - n)
    yh, yl = quarter_square(z, zl, -1.0)
    s = compensated_sum(a, first, max(series_terms(z), first + 2), yh, yl)
    for _ in range(first):
        s *= -0.25
    if z > 0.0:
        return s * power_factor(ph, pl, z, zl / z, load(where, LOG_C), load(where, LOG_C_LOW))
    if ph == 0.0:
        for _ in range(n - 2 * first):  # 2^-nu / Gamma(nu + 1), nu = n - 2 first a whole number
            s *= 0.5
        for j in range(2, n - 2 * first + 1):
            s /= j
        return s
    return 0.0 if ph > 0.0 else math.copysign(math.inf, s)


@inline_kernel
def in_series(nu: float, z: float) -> bool:
    """Whether the second and higher derivatives of J_nu at z are summed as powers of z."""
    return z < 1.5 or (z < 25.0 and z * z < 2.0 * (nu + 1.0))


@inline_kernel
def by_recurrence(nu: float, n: int, z: float, zl: float, value: float, slope: float) -> float:
    """Return the n-th derivative, n >= 2, of J_nu at z + zl from the value and the first, by Bessel's equation.

    nu - z is taken with zl: near the turning point it is small beside both.
    """
    i = 1.0 / z
    i += i * (fma(-z, i, 1.0) - zl * i)
    turn = (((nu - z) - zl) * i if z < 2.0 * nu else fma(nu, i, -1.0)) * fma(nu, i, 1.0)  # (nu/z)^2 - 1
    older, old = 0.0, 0.0
    for k in range(n - 1):
        new = fma(turn - (k * i) * (k * i), value, -(2.0 * k + 1.0) * i * slope)
        new -= k * i * (2.0 * old + (k - 1.0) * i * older)
        older, old, value, slope = old, value, slope, new
    return slope


@inline_kernel
def first_beyond(hi: FloatArray, x: float, limit: float) -> int:
    """Return the first k with lambda_k x >= limit; lambda ascends, but for the first."""
    low, high = int(np.int64(0)), hi.size
    while low < high:
        middle = (low + high) >> 1
        if hi[middle] * x >= limit:
            high = middle
        else:
            low = middle + 1
    return low


@inline_kernel
def products(hi: FloatArray, lo: FloatArray, x: float, xl: float, z: FloatArray, zl: FloatArray) -> None:
    """Fill z + zl = (hi + lo)(x + xl)."""
    for j in range(z.size):
        p = hi[j] * x
        z[j] = p
        zl[j] = fma(hi[j], x, -p) + fma(hi[j], xl, lo[j] * x)


@inline_kernel
def scaled(values: FloatArray, scale: FloatArray, out: FloatArray) -> None:
    """Fill out with values times scale."""
    for j in range(out.size):
        out[j] = values[j] * scale[j]


@callee
def evaluate_pieces(
    data: FloatArray,
    nu: float,
    n: int,
    z: FloatArray,
    zl: FloatArray,
    work: FloatArray,
    series: FloatArray,
    first: int,
    pieces: IntArray,
    scale: FloatArray,
    out: FloatArray,
) -> None:
    """Write the n-th derivative of J_nu at z + zl, scaled, into the pieces of `out`: (begin, size) pairs."""
    target = work[0, : z.size]
    if n == 0:
        j_values(data, z, zl, target)
    else:
        value = work[1, : z.size]
        j_pairs(data, z, zl, value, target)
        if n > 1:
            where = address(data)
            for j in range(z.size):
                if in_series(nu, z[j]):
                    target[j] = near_axis(where, nu, n, z[j], zl[j], series, first)
                else:
                    target[j] = by_recurrence(nu, n, z[j], zl[j], value[j], target[j])
    done = 0
    for p in range(pieces.shape[0]):
        begin, size = pieces[p]
        column = begin % scale.size
        scaled(target[done : done + size], scale[column : column + size], out[begin : begin + size])
        done += size


@kernel
def plain_modes(
    data: FloatArray,
    nu: float,
    n: int,
    hi: FloatArray,
    lo: FloatArray,
    scale: FloatArray,
    x: FloatArray,
    xl: FloatArray,
    out: FloatArray,
) -> None:
    """out[i count + k] = scale[k] J_nu^(n)(lambda_k x_i).

    Rows are cut where lambda_k x_i passes from one region of the table of J_nu to the next, and the pieces that lie
    in one region are strung together into long vectors.
    """
    count = hi.size
    room = max(1, min(CHUNK, x.size * count))
    z = np.empty(room)
    zl = np.empty(room)
    work = np.empty((2, room))
    pieces = np.empty((room, 2), np.int64)
    series = np.zeros(SERIES_TERMS)
    first = power_series(nu, n, series) if n > 1 else 0
    for region in range(3):
        filled, last = 0, 0
        for i in range(x.size):
            k, stop = 0, count
            if region > 0:
                k = first_beyond(hi, x[i], data[X0] if region == 1 else data[X_PHASE])
            if region < 2:
                stop = first_beyond(hi, x[i], data[X0] if region == 0 else data[X_PHASE])
            while k < stop:
                here = min(stop - k, room - filled)
                end, after = filled + here, k + here
                products(hi[k:after], lo[k:after], x[i], xl[i], z[filled:end], zl[filled:end])
                pieces[last, 0], pieces[last, 1] = i * count + k, here
                k, filled, last = after, end, last + 1
                if filled == room:
                    evaluate_pieces(data, nu, n, z, zl, work, series, first, pieces[:last], scale, out)
                    filled, last = 0, 0
        if filled > 0:
            evaluate_pieces(data, nu, n, z[:filled], zl[:filled], work, series, first, pieces[:last], scale, out)


@kernel
def rim_modes(
    nu: float,
    robin: float,
    n: int,
    skip: int,
    hi: FloatArray,
    lo: FloatArray,
    value: FloatArray,
    slope: FloatArray,
    scale: FloatArray,
    d: FloatArray,
    dl: FloatArray,
    out: FloatArray,
) -> None:
    """Write what is better summed about lambda into the columns k >= skip of `out`; x = 1 - (d + dl).

    lambda_k = hi + lo; `value` and `slope` are J_nu and J_nu' there.
    """
    count = hi.size
    near = np.empty(d.size, np.int64)
    nears = 0
    for i in range(d.size):
        if d[i] <= DEEPEST:
            near[nears] = i
            nears += 1
    columns = np.empty(count, np.int64)
    small = 0
    for k in range(skip, count if nears > 0 else 0):
        turn = wave_number(nu, hi[k])
        if n == 0:
            wanted = abs(value[k]) * turn < 0.5 * abs(slope[k])
        elif n == 1:
            wanted = abs(slope[k]) < 0.5 * abs(value[k]) * turn
        else:
            wanted = not in_series(nu, hi[k])
        if wanted:
            columns[small] = k
            small += 1
    for low in range(0, small, COLUMNS):
        chosen = columns[low : min(low + COLUMNS, small)]
        rim_columns(nu, robin, n, hi, lo, value, slope, scale, d, dl, near[:nears], chosen, out)


@kernel
def radii_two_part(r: FloatArray, radius: float, x: FloatArray, xl: FloatArray, d: FloatArray, dl: FloatArray) -> None:
    """Fill x + xl = r / radius and d + dl = 1 - r / radius, with all its digits where r > radius / 2."""
    for i in range(r.size):
        q = r[i] / radius
        x[i] = q
        xl[i] = fma(-q, radius, r[i]) / radius
        p = radius - r[i]
        q = p / radius
        d[i] = q
        dl[i] = fma(-q, radius, p) / radius
