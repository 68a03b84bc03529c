"""What a cross-check hands back, and how it prints."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any, NamedTuple

import numpy as np

from fbexpand.records import ReadOnlyArrays
from fbexpand.types import FloatArray, IntArray, Numeric

MOST_LINES = 60


class Seconds(NamedTuple):
    """How long both took: `ours` for all coefficients of the series, `quadrature` for the chosen ones."""

    ours: float
    quadrature: float


@dataclass(frozen=True, eq=False, repr=False)
class CrossCheck(ReadOnlyArrays):
    """Chosen coefficients beside those found by adaptive quadrature; prints as a table.

    `indices` (n,) counts from 1. `ours`, `quadrature`, `difference`, `allowed` and `agrees` have shape
    `(*batch, n)`: the coefficients of the series, the other ones, |ours - quadrature|, the sum of what both claim
    their error to be, and whether the difference is within it and the root right. `roots`, `root_difference` and
    `root_allowed` (n,) are the basis' roots, |root - the other's|, and the most that rounding explains. `source` says
    whose roots, J_nu and norms were used, `evaluations` how often they were asked for. `seconds` are both times.
    """

    basis: Any
    terms: int
    indices: IntArray
    ours: Numeric
    quadrature: Numeric
    difference: FloatArray
    allowed: FloatArray
    agrees: Any
    roots: FloatArray
    root_difference: FloatArray
    root_allowed: FloatArray
    seconds: Seconds
    source: str

    @property
    def all_agree(self) -> bool:
        """Whether every coefficient and every root agrees."""
        return bool(np.all(self.agrees))

    @property
    def wrong(self) -> tuple[int, ...]:
        """The indices that do not agree, in some profile of the batch or by their root."""
        bad = ~self.agrees.reshape(-1, self.indices.size).all(axis=0)
        return tuple(int(k) for k in self.indices[bad])

    def __repr__(self) -> str:
        return "\n".join(_lines(self))


def _lines(check: CrossCheck) -> list[str]:
    n = check.indices.size
    shape = check.agrees.shape[:-1]
    bad = int(np.sum(~check.agrees))
    verdict = "all agree" if bad == 0 else f"{bad} of {check.agrees.size} DISAGREE"
    batch = f", batch {shape}" if shape else ""
    lines = [f"Cross-check of {n} of {check.terms} coefficients on {check.basis!r}{batch}: {verdict}"]
    head = ("k", *(("profile",) if shape else ()), "root", "ours", "quadrature", "difference", "allowed", "")
    rows = [head]
    for i, row in _order(check):
        where = tuple(int(w) for w in np.unravel_index(row, shape)) if shape else ()
        place = (*where, i)
        root_bad = not check.root_difference[i] <= check.root_allowed[i]
        rows.append(
            (
                str(check.indices[i]),
                *((",".join(str(w) for w in where),) if shape else ()),
                f"{check.roots[i]:.10g}",
                number(check.ours[place]),
                number(check.quadrature[place]),
                f"{check.difference[place]:.1e}",
                f"{check.allowed[place]:.1e}",
                "" if check.agrees[place] else f"root off by {check.root_difference[i]:.1e}" if root_bad else "differs",
            )
        )
    widths = [max(len(row[column]) for row in rows) for column in range(len(head))]
    lines += ["  ".join(cell.rjust(w) for cell, w in zip(row, widths, strict=True)).rstrip() for row in rows]
    hidden = check.agrees.size - (len(rows) - 1)
    if hidden:
        lines.append(f"({hidden} more, none of them worse)")
    ours = "not timed" if np.isnan(check.seconds.ours) else f"all {check.terms} in {duration(check.seconds.ours)}"
    lines.append(
        f"ours: {ours}; adaptive quadrature with roots, modes and norms by {check.source}: "
        f"{n} in {duration(check.seconds.quadrature)}"
    )
    return lines


def _order(check: CrossCheck) -> list[tuple[int, int]]:
    """Return (index, profile) pairs by index; of a large batch the worst only."""
    n = check.indices.size
    size = check.agrees.size // n
    pairs = [(i, row) for i in range(n) for row in range(size)]
    if len(pairs) > MOST_LINES:
        with np.errstate(divide="ignore", invalid="ignore"):
            ratio = (check.difference / check.allowed).reshape(size, n)
        ratio = np.where(check.agrees.reshape(size, n), np.nan_to_num(ratio), np.inf)
        pairs = sorted(sorted(pairs, key=lambda pair: -ratio[pair[1], pair[0]])[:MOST_LINES])
    return pairs


def number(value: Any) -> str:
    """Show a coefficient with as many digits as are at stake."""
    if np.iscomplexobj(value):
        return f"{value.real:.11e}{value.imag:+.11e}j"
    return f"{value:.14e}"


def duration(seconds: float) -> str:
    """Show a time with a fitting unit."""
    return f"{seconds:.2f} s" if seconds >= 1.0 else f"{1e3 * seconds:.3g} ms"
