"""J_nu at a few points of an order without its table: the parts they need are made, bit for bit as there."""

from __future__ import annotations

import numpy as np

from fbexpand.kernels.bessel_eval import j_pairs, j_values
from fbexpand.kernels.bessel_table import (
    PANEL_START,
    PANEL_TERMS,
    PANELS,
    PHASE_START,
    PHASE_TERMS,
    SCALED,
    SMOOTH_ORDER,
    WIDTH,
    X0,
    high_part,
    layout,
    low_part,
    part_of,
    prepare,
    workspace,
)
from fbexpand.kernels.jit import kernel
from fbexpand.types import FloatArray


@kernel
def few_pairs(
    nh: float, nl: float, x: FloatArray, low: FloatArray, value: FloatArray, slope: FloatArray, both: bool
) -> None:
    """Fill `value` with J (and `slope` with J', if `both`) at x + low; an empty `low` means 0."""
    head = np.empty(PANEL_START)
    layout(nh, nl, head)
    prepare(head)
    work = workspace()
    small = np.zeros(PANEL_START + max(PANEL_TERMS, PHASE_TERMS))
    for n in range(x.size):
        i = part_of(head, x[n])
        small[:PANEL_START] = head
        panels = int(head[PANELS])
        if i >= 0:
            if nh < SMOOTH_ORDER:
                low_part(head, i, work, small[PANEL_START:])
            else:
                high_part(head, i, work, small[PANEL_START:])
        if 0 <= i < panels:  # the table of this panel alone
            small[X0] = head[X0] + i * head[WIDTH]
            small[SCALED] = 1.0 if i < head[SCALED] else 0.0
        elif i >= panels:
            small[PHASE_START] = PANEL_START - (i - panels) * PHASE_TERMS
        if both:
            j_pairs(small, x[n : n + 1], low[n : n + 1], value[n : n + 1], slope[n : n + 1])
        else:
            j_values(small, x[n : n + 1], low[n : n + 1], value[n : n + 1])
