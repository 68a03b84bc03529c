"""Time Bessel functions, zeros and sequences beside SciPy's in one run: required and measured.

    python -m benchmarks.bessel_speed

Points are in random order. Both sides are called in turn; a ratio is that of the least times.
"""

from __future__ import annotations

import numpy as np
from scipy.special import j0, jn_zeros, jv

from benchmarks.measure import best, once, seconds, side_by_side, table, verdict, versions
from fbexpand import bessel_j, bessel_j_sequence, bessel_zeros, dini_roots

POINTS = 200_000
SEED = 5


def evaluation(rows: list[list[str]]) -> None:
    """Many points at one order against jv and j0."""
    rng = np.random.default_rng(SEED)
    cases = [(0.3, 50.0, 40.0), (0.3, 5000.0, 20.0), (7.0, 50.0, 20.0), (7.0, 5000.0, 20.0)]
    cases += [(50.5, 50.0, 20.0), (50.5, 5000.0, 20.0), (0.0, 50.0, 3.0), (0.0, 5000.0, 3.0)]
    for order, top, required in cases:
        x = rng.uniform(0.0, top, POINTS)
        part = x[: POINTS // 4]  # jv is slow: a quarter of the points
        bessel_j(order, x)
        if order == 0.0:
            ours, theirs = side_by_side(lambda x=x: bessel_j(0.0, x), lambda x=x: j0(x), 9)
            theirs_each, name = theirs / POINTS, "j0"
        else:
            ours, theirs = side_by_side(
                lambda o=order, x=x: bessel_j(o, x), lambda o=order, x=part: jv(o, x), 5
            )
            theirs_each, name = theirs / part.size, "jv"
        ratio = theirs_each / (ours / POINTS)
        what = f"bessel_j, order {order:g}, x < {top:g}, against {name}"
        rows.append(ratio_row(what, ours / POINTS, theirs_each, required, ratio))


def ratio_row(what: str, ours: float, theirs: float, required: float, ratio: float) -> list[str]:
    return [
        what,
        seconds(ours),
        seconds(theirs),
        f">= {required:g}x",
        f"{ratio:.1f}x",
        verdict(ratio >= required),
    ]


def limit_row(what: str, ours: float, limit: float) -> list[str]:
    return [what, seconds(ours), "", f"< {seconds(limit)}", seconds(ours), verdict(ours < limit)]


def zeros(rows: list[list[str]]) -> None:
    bessel_zeros(0.0, 5000)
    ours, theirs = side_by_side(lambda: bessel_zeros(0.0, 5000), lambda: jn_zeros(0, 5000), 7)
    rows.append(ratio_row("5000 zeros of order 0, against jn_zeros", ours, theirs, 20.0, theirs / ours))
    bessel_zeros(0.3, 10)
    rows.append(limit_row("1e6 zeros of order 0.3", best(lambda: bessel_zeros(0.3, 1_000_000)), 0.1))
    far = best(lambda: bessel_zeros(0.3, 1, 10**9), 50)
    rows.append(limit_row("one zero, start = 10**9", far, 100e-6))
    dini_roots(0.3, 1.0, 10)
    far = best(lambda: dini_roots(0.3, 1.0, 1, 10**9), 50)
    rows.append(limit_row("one Dini root, start = 10**9", far, 100e-6))


def first_calls(rows: list[list[str]]) -> None:
    """Time what a new order costs: its table, and a single point without one."""
    rng = np.random.default_rng(SEED + 1)
    for low, high, limit in ((0.0, 100.0, 5e-3), (100.0, 1000.0, 20e-3), (1000.0, 10000.0, 20e-3)):
        worst = 0.0
        for order in [*rng.uniform(low, high, 5).tolist(), high - 1.0 / 3.0]:
            x = rng.uniform(0.0, 2.0 * order + 50.0, 20_000)
            first = once(lambda o=order, x=x: bessel_j(o, x))
            worst = max(worst, first - best(lambda o=order, x=x: bessel_j(o, x), 3))
        rows.append(
            limit_row(
                f"first large call less a later one, order in [{low:g}, {high:g}), worst of 6", worst, limit
            )
        )
    for low, high in ((0.0, 5.0), (5.0, 100.0), (100.0, 1000.0), (1000.0, 10000.0)):
        for name, reach in (("x < order", (0.3, 1.0)), ("x > order", (1.0, 4.0))):
            times = []
            for order in rng.uniform(low, high, 150).tolist():
                x = order * float(rng.uniform(*reach))
                times.append(once(lambda o=order, x=x: bessel_j(o, x)))
            what = f"one point at a new order in [{low:g}, {high:g}), {name}, median of 150"
            rows.append(limit_row(what, float(np.median(times)), 20e-6))


def sequences(rows: list[list[str]]) -> None:
    rng = np.random.default_rng(SEED + 2)
    for order in (0.0, 0.3):
        for top in (50.0, 5000.0):
            x = rng.uniform(0.0, top, POINTS)
            part = x[: POINTS // 100]
            orders = order + np.arange(51.0)
            bessel_j_sequence(order, 51, x)
            ours, theirs = side_by_side(
                lambda o=order, x=x: bessel_j_sequence(o, 51, x),
                lambda o=orders, x=part: jv(o, x[:, None]),
                4,
            )
            theirs *= POINTS / part.size
            what = f"51 orders from {order:g} at {POINTS} points, x < {top:g}, against jv"
            rows.append(ratio_row(what, ours, theirs, 20.0, theirs / ours))


def main() -> None:
    rows: list[list[str]] = []
    for part in (evaluation, zeros, first_calls, sequences):
        part(rows)
    print(table(["what", "ours", "SciPy", "required", "measured", ""], rows))
    print(versions())


if __name__ == "__main__":
    main()
