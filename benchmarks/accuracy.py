"""Measure the errors of bessel_j and SciPy's jv by ball arithmetic; write ACCURACY.md and accuracy.png.

    python -m benchmarks.accuracy [--quick]

Needs python-flint and, for the picture, matplotlib. Errors are in eps = 2^-52: of the modulus sqrt(J^2 + Y^2)
for x >= order, of |J| for x < order (points where |J| < 1e-290 are left out). Points are drawn by the seeded
script in tests/reference, each order with several arguments; the values of ours are taken from calls with
thousands of points, so that they come from the order's table, and once more one by one.
"""

from __future__ import annotations

import argparse
import time
from pathlib import Path
from typing import Any

import numpy as np
from scipy.special import jv, jvp, yv, yvp

from benchmarks.measure import table, versions
from benchmarks.references import load
from fbexpand import bessel_j

HERE = Path(__file__).resolve().parent
SEED = 1822
FILLER = np.linspace(0.0, 1.0, 6000)
# seconds a reference takes decide how many points a cell gets
POINTS = {0: 1500, 1: 1500, 2: 1500, 3: 300}
EASY = {"far": 1500, "huge": 1500}
CLOSE = {"below": "x < 0.9 order", "near below": "0.9 order <= x < order", "tiny": "x < 0.01 order"}
BEYOND = {
    "near above": "order <= x < 1.1 order",
    "middle": "1.1 order <= x < 10 order",
    "far": "10 order <= x <= 1e6",
    "huge": "1e6 < x <= 1e15",
}


def modulus(order: np.ndarray, x: np.ndarray) -> np.ndarray:
    """Return sqrt(J^2 + Y^2) to three digits or more, x >= order."""
    out = np.sqrt((2.0 / np.pi) / x * (1.0 + 0.5 * np.maximum(4.0 * order**2 - 1.0, 0.0) / (2.0 * x) ** 2))
    near = x < 30.0 * np.maximum(order, 1.0)
    out[near] = np.hypot(jv(order[near], x[near]), yv(order[near], x[near]))
    return out


def from_table(order: np.ndarray, x: np.ndarray) -> np.ndarray:
    """Return our values, each order's points called together with enough others for a table."""
    out = np.empty_like(x)
    for nu in np.unique(order):
        mine = np.flatnonzero(order == nu)
        top = min(2.0 * float(x[mine].max()), 1e6)
        out[mine] = bessel_j(float(nu), np.concatenate([x[mine], top * FILLER]))[: mine.size]
    return out


def cell(script: Any, rng: np.random.Generator, band: int, region: str, size: int) -> dict[str, np.ndarray]:
    """Return orders, arguments and errors of one band and region."""
    few = script.orders(rng, script.BANDS[band], max(size // 12, 8))
    order = np.resize(few, size)
    x = script.arguments(rng, region, order)
    exact = [script.ball(nu, t, bits=80) for nu, t in zip(order.tolist(), x.tolist(), strict=True)]
    values = {"ours": from_table(order, x), "single": bessel_j(order, x), "scipy": jv(order, x)}
    magnitude = np.array([abs(float(e.mid())) for e in exact])
    keep = (x < order) & (magnitude > 1e-290) if region in CLOSE else x >= order
    size_of = magnitude if region in CLOSE else modulus(order, x)
    out = {"order": order[keep], "x": x[keep]}
    for name, v in values.items():
        gaps = np.array([script.difference(float(a), e) for a, e in zip(v, exact, strict=True)])
        out[name] = gaps[keep] / size_of[keep] / script.EPS
    return out


def row(script: Any, band: int, region: str, errors: dict[str, np.ndarray]) -> list[str]:
    low, high = script.BANDS[band]
    if region in CLOSE:
        near = region == "near below"
        bound = f"{20.0 if near else 4.0 + 2.0 * float(errors['order'].max()):.0f}"
        worst = np.max(errors["ours"] / (20.0 if near else 4.0 + 2.0 * errors["order"]), initial=0.0)
    else:
        limit = (3.0, 3.0, 4.0, 6.0)[band]
        bound = f"{limit:.0f}"
        worst = np.max(errors["ours"] / limit, initial=0.0)
    figures = []
    for name in ("ours", "single", "scipy"):
        e = errors[name]
        figures += [f"{np.max(e):.3g}", f"{np.median(e):.3g}"] if e.size else ["-", "-"]
    unit = "abs J" if region in CLOSE else "modulus"
    cells = [f"[{low:g}, {high:g})", {**CLOSE, **BEYOND}[region], unit, str(errors["x"].size), *figures]
    return [*cells, bound, f"{worst:.2f}"]


def envelope(order: float, x: np.ndarray) -> np.ndarray:
    """Return the error in eps that a rounding of x by half an ulp would make, in the units above."""
    with np.errstate(all="ignore"):
        beyond = np.hypot(jvp(order, x), yvp(order, x)) / np.hypot(jv(order, x), yv(order, x))
        below = np.abs(jvp(order, x) / jv(order, x))
    return 0.5 * x * np.where(x >= order, beyond, below)


def picture(cells: list[dict[str, np.ndarray]], path: Path) -> None:
    import matplotlib

    matplotlib.use("Agg")
    import matplotlib.pyplot as plt

    order = np.concatenate([c["order"] for c in cells])
    x = np.concatenate([c["x"] for c in cells])
    shown = (x > 1e-3) & (x < 1e9)
    figure, axes = plt.subplots(2, 2, figsize=(11, 8.5), layout="constrained")
    for axis, name, title in zip(
        axes[0], ("ours", "scipy"), ("fbexpand.bessel_j", "scipy.special.jv"), strict=True
    ):
        error = np.concatenate([c[name] for c in cells])
        dots = axis.scatter(
            np.maximum(order, 0.03)[shown],
            x[shown],
            c=np.log10(np.clip(error[shown], 0.03, 1e6)),
            s=3,
            vmin=-1.5,
            vmax=6.0,
            cmap="viridis",
        )
        line = np.array([0.03, 1e4])
        axis.plot(line, line, color="black", linewidth=0.8, label="x = order")
        axis.set(xscale="log", yscale="log", xlabel="order", ylabel="x", title=title)
        axis.legend(loc="lower right")
    figure.colorbar(dots, ax=axes[0], label="log10 of the error in eps")
    rng = np.random.default_rng(SEED + 1)
    script = load()
    for axis, nu in zip(axes[1], (7.3, 300.25), strict=True):
        t = nu * 10.0 ** rng.uniform(-1.5, 2.0, 350)
        exact = [script.ball(nu, s, bits=80) for s in t.tolist()]
        magnitude = np.array([abs(float(e.mid())) for e in exact])
        unit = np.where(t >= nu, modulus(np.full_like(t, nu), t), magnitude)
        keep = magnitude > 1e-290
        unit[~keep] = 1.0
        for name, v in (
            ("scipy.special.jv", jv(nu, t)),
            ("fbexpand.bessel_j", from_table(np.full_like(t, nu), t)),
        ):
            gaps = np.array([script.difference(float(a), e) for a, e in zip(v, exact, strict=True)])
            axis.plot(
                (t / nu)[keep],
                np.maximum(gaps / unit / script.EPS, 0.01)[keep],
                ".",
                markersize=4,
                label=name,
            )
        grid = nu * np.logspace(-1.5, 2.0, 400)
        curve = envelope(nu, grid)
        axis.plot(grid / nu, curve, color="black", linewidth=1.0, label="half an ulp of x")
        axis.set(xscale="log", yscale="log", xlabel="x / order", ylabel="error in eps", title=f"order {nu:g}")
        axis.legend(loc="upper left")
    figure.savefig(path, dpi=90)
    plt.close(figure)


def main(arguments: list[str] | None = None) -> None:
    parser = argparse.ArgumentParser(
        description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter
    )
    parser.add_argument("--quick", action="store_true", help="a twentieth of the points, printed only")
    quick = parser.parse_args(arguments).quick
    start = time.perf_counter()
    script = load()
    rng = np.random.default_rng(SEED)
    rows, cells = [], []
    for band in range(len(script.BANDS)):
        for region in script.REGIONS:
            size = EASY.get(region, POINTS[band])
            cells.append(cell(script, rng, band, region, max(size // 20, 10) if quick else size))
            if cells[-1]["x"].size:  # at large order all that is far below it underflows
                rows.append(row(script, band, region, cells[-1]))
    head = ["order", "x", "eps of", "points", "max", "median", "max, alone", "median, alone"]
    head += ["SciPy max", "SciPy median", "bound", "max / bound"]
    text = table(head, rows)
    print(text)
    print(versions())
    if not quick:
        picture(cells, HERE / "accuracy.png")
        (HERE / "ACCURACY.md").write_text(
            PAGE.format(table=text, versions=versions(), seed=SEED), encoding="utf-8"
        )
    print(f"{time.perf_counter() - start:.0f} s")


PAGE = """# Error of bessel_j and of scipy.special.jv

Written by `python -m benchmarks.accuracy` ({versions}); references by ball arithmetic (python-flint), points
drawn with seed {seed}. Errors in eps = 2^-52, of the modulus sqrt(J^2 + Y^2) for x >= order, of |J| below.
"max" and "median" are of values from the table of the order (thousands of points at once), "alone" of points
called one by one. The bound of a band is that of its largest order, the last column compares each point with
the bound at its own order.

{table}

![errors over order and x, and along x at two orders](accuracy.png)

The black curve is the conditioning envelope: the error that rounding x by half an ulp makes, whatever the
routine.
"""


if __name__ == "__main__":
    main()
