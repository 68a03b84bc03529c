"""A table as a function: what lies between its radii is the table's own definition, its integrals are checked."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

from fbexpand.profiles.table import RadialTable, place
from fbexpand.types import FloatArray


def table_function(table: RadialTable, basis: Any) -> tuple[Callable[[FloatArray], Any], FloatArray]:
    """Return the interpolant of a table placed on a basis, and the radii where its pieces meet."""
    panels, _ = place(table, float(basis.order), float(basis.radius))
    return panels, panels.edges
