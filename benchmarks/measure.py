"""Timing and tables shared by the speed benchmarks."""

from __future__ import annotations

import platform
import time
from collections.abc import Callable, Sequence
from importlib.metadata import version
from typing import Any

PACKAGES = ("numpy", "scipy", "numba")


def once(function: Callable[[], Any]) -> float:
    """Return the seconds of one call."""
    start = time.perf_counter()
    function()
    return time.perf_counter() - start


def best(function: Callable[[], Any], repeats: int = 5) -> float:
    """Return the least of the seconds of several calls."""
    return min(once(function) for _ in range(repeats))


def side_by_side(ours: Callable[[], Any], theirs: Callable[[], Any], repeats: int = 5) -> tuple[float, float]:
    """Return the least seconds of both, called in turn so that a slow spell of the machine meets both."""
    pairs = [(once(ours), once(theirs)) for _ in range(repeats)]
    return min(a for a, _ in pairs), min(b for _, b in pairs)


def versions() -> str:
    """Return a line on what was measured with."""
    parts = [f"fbexpand {_own_version()}", f"Python {platform.python_version()}"]
    parts += [f"{name} {version(name)}" for name in PACKAGES]
    return ", ".join([*parts, platform.machine()])


def _own_version() -> str:
    return version("fbexpand")


def seconds(value: float) -> str:
    """Show a time with a fitting unit."""
    for unit, size in (("s", 1.0), ("ms", 1e-3), ("µs", 1e-6)):
        if value >= size:
            return f"{value / size:.3g} {unit}"
    return f"{value / 1e-9:.3g} ns"


def table(head: Sequence[str], rows: Sequence[Sequence[str]]) -> str:
    """Lay out a table in Markdown, columns aligned."""
    widths = [max(len(str(row[i])) for row in [head, *rows]) for i in range(len(head))]
    lines = [
        "| " + " | ".join(str(c).ljust(w) for c, w in zip(row, widths, strict=True)) + " |" for row in rows
    ]
    top = "| " + " | ".join(c.ljust(w) for c, w in zip(head, widths, strict=True)) + " |"
    return "\n".join([top, "|" + "|".join("-" * (w + 2) for w in widths) + "|", *lines])


def verdict(good: bool) -> str:
    """Return the word for the last column."""
    return "met" if good else "MISSED"
