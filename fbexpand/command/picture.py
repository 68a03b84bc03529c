"""The picture of `python -m fbexpand --plot`: four panels, legible without colour."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np

from fbexpand.expansion import Expansion
from fbexpand.profiles.table import place

if TYPE_CHECKING:
    from fbexpand.command.main import Task

POINTS = 801
CUTS = 120  # numbers of terms whose error is drawn
INKS = ("#10243e", "#a8461f", "#3f8f86", "#a58ac2")  # dark to light: told apart in grey too
LINES: tuple[Any, ...] = ("-", (0, (6, 2)), (0, (1.2, 1.2)), (0, (6, 2, 1.2, 2)))
STYLE: Any = {
    "font.family": "DejaVu Sans",
    "font.size": 9.0,
    "axes.titlesize": 10.0,
    "axes.titlelocation": "left",
    "axes.titleweight": "bold",
    "axes.spines.top": False,
    "axes.spines.right": False,
    "axes.edgecolor": "#444444",
    "axes.linewidth": 0.7,
    "axes.grid": True,
    "grid.color": "#dddddd",
    "grid.linewidth": 0.5,
    "legend.frameon": False,
    "legend.fontsize": 8.0,
    "lines.linewidth": 1.5,
    "savefig.dpi": 150.0,
    "svg.hashsalt": "fbexpand",
}


def require_matplotlib() -> None:
    """Raise the ImportError that says how to get matplotlib, if it is missing."""
    try:
        import matplotlib  # noqa: F401
    except ImportError:
        raise ImportError("--plot needs matplotlib: python -m pip install matplotlib") from None


def draw(task: Task, series: Expansion, path: str | Path) -> None:
    """Write the picture: table and partial sums, error at every radius, coefficients, error against terms."""
    import matplotlib
    from matplotlib.figure import Figure

    with matplotlib.rc_context():
        matplotlib.rcdefaults()
        matplotlib.rcParams.update(STYLE)
        figure = Figure(figsize=(10.0, 7.4), layout="constrained")
        axes = figure.subplots(2, 2)
        counts = _counts(series.terms)
        _sums(axes[0, 0], task, series, counts)
        _pointwise(axes[0, 1], task, series, counts)
        _decay(axes[1, 0], series)
        _against_terms(axes[1, 1], series)
        figure.suptitle(task.title, x=0.01, ha="left", fontsize=11.0)
        figure.savefig(path)


def _counts(terms: int) -> list[int]:
    """Return the numbers of terms whose sums are drawn: a few, ascending, all terms last."""
    return sorted({1, min(2, terms), min(4, terms), terms})


def _sums(axes: Any, task: Task, series: Expansion, counts: list[int]) -> None:
    r = np.linspace(0.0, float(series.basis.radius), POINTS)
    axes.plot(task.table.r, task.table.values, "o", mfc="white", mec="black", ms=5.0, mew=1.0, zorder=5, label="table")
    for n, ink, line in zip(counts, INKS, LINES, strict=False):
        axes.plot(r, series.truncated(n)(r), color=ink, linestyle=line, label=_named(n))
    axes.set(title="Table and partial sums", xlabel=task.units[0], ylabel=task.units[1])
    axes.margins(x=0.02)
    axes.legend()


def _pointwise(axes: Any, task: Task, series: Expansion, counts: list[int]) -> None:
    basis = series.basis
    r = np.linspace(0.0, float(basis.radius), POINTS)
    panels, _ = place(task.table, float(basis.order), float(basis.radius))
    floor = 1e-16 * max(float(np.abs(task.table.values).max()), 1e-300)
    for n, ink, line in zip(counts, INKS, LINES, strict=False):
        found = series.partial_sum(r, terms=n)
        axes.semilogy(r, np.maximum(np.abs(panels(r) - found.values), floor), color=ink, linewidth=0.6)
        axes.semilogy(r, np.maximum(found.error, floor), color=ink, linestyle=line, label=_named(n))
    axes.set(title="Error at every radius (thin), its envelope (thick)", xlabel=task.units[0])
    axes.set_ylabel(f"|f \N{MINUS SIGN} S| ({task.units[1]})")
    top = axes.get_ylim()[1]
    axes.set_ylim(max(floor, 1e-4 * _smallest(axes)), top)
    axes.margins(x=0.02)
    axes.legend(ncols=2)


def _smallest(axes: Any) -> float:
    """Return the smallest envelope drawn."""
    return float(min(np.min(line.get_ydata()) for line in axes.get_lines()[1::2]))


def _decay(axes: Any, series: Expansion) -> None:
    size = np.abs(series.orthonormal)
    k = np.arange(1, series.terms + 1)
    seen = size > 0.0
    axes.loglog(k[seen], size[seen], "o-", color=INKS[0], ms=3.5, linewidth=0.7)
    axes.set(title="Decay of the coefficients", xlabel="k", ylabel="|b_k| of the normalised modes")


def _against_terms(axes: Any, series: Expansion) -> None:
    n = np.unique(np.geomspace(1, series.terms, min(series.terms, CUTS)).round().astype(np.int64))
    if series.terms <= CUTS:
        n = np.arange(1, series.terms + 1)
    error = series.error_estimate(n.tolist())
    norm = float(series.norm()) or 1.0
    parts = (("truncation", "o-"), ("table", None), ("rounding", None))
    for (name, marks), ink, line in zip(parts, INKS, LINES, strict=False):
        value = np.broadcast_to(getattr(error, name) / norm, n.shape)
        if not np.any(value > 0.0):
            continue
        if marks is None:
            axes.semilogy(n, value, color=ink, linestyle=line, label=name)
        else:
            axes.semilogy(n, value, marks, color=ink, ms=3.5, linewidth=0.7, label=name)
    axes.set(title="Error by its parts (L2, relative)", xlabel="terms", ylabel="share of the norm")
    axes.legend()


def _named(n: int) -> str:
    return f"{n} term{'s' if n > 1 else ''}"
