"""What an estimate hands back."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

from fbexpand.records import PartialSum, ReadOnlyArrays

__all__ = ["ErrorEstimate", "PartialSum"]


@dataclass(frozen=True, eq=False)
class ErrorEstimate(ReadOnlyArrays):
    """How far a series is from its profile, each entry of shape (*batch,) or (*terms, *batch).

    `l2` is the total error in the norm sqrt(integral |f - S|^2 r dr), in units of f times length, `sup` the
    largest |f - S| on [0, R], in units of f, inf where f is unbounded. The total `l2` is the sum of four
    parts, each an L2 error: `truncation` (the terms left out), `quadrature` (coefficients that are not quite
    those of the profile), `table` (a table stands for the function it was sampled from) and `rounding`.
    `source` is "residual" where f - S was measured, "law" where the decay of the coefficients was continued.
    """

    l2: Any
    sup: Any
    truncation: Any
    quadrature: Any
    table: Any
    rounding: Any
    source: str
