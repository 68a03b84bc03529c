"""Which method serves how many profiles: the one asked for, or by the cost model within the memory allowed."""

from __future__ import annotations

from fbexpand import checks
from fbexpand.exceptions import ArgumentValueError
from fbexpand.transform.blocks import DirectSums
from fbexpand.transform.cost import direct_cost, matrix_cost, shown_bytes, shown_time
from fbexpand.transform.matrix import MatrixSums

METHODS = ("auto", "matrix", "direct")
GRID = 24  # bytes a radius: itself, its low part, its weight
_BYTES = {"matrix": MatrixSums.bytes_needed, "direct": DirectSums.bytes_needed}
_COST = {"matrix": matrix_cost, "direct": direct_cost}


class Choice:
    """The method for each size of a batch, fixed by the arguments alone."""

    def __init__(self, asked: str, terms: int, size: int, max_bytes: int) -> None:
        self._terms, self._size = terms, size
        needed = {name: needs(terms, size) + GRID * size for name, needs in _BYTES.items()}
        if asked != "auto" and needed[asked] > max_bytes:
            what = f"at least {needed[asked]} for method {asked!r}"
            raise checks.value_error("max_bytes", what, max_bytes)
        self._names = [asked] if asked != "auto" else [name for name in needed if needed[name] <= max_bytes]
        if not self._names:
            least = min(needed.values())
            raise ArgumentValueError(f"'max_bytes' must be at least {least} (got {max_bytes})", "max_bytes", max_bytes)
        self._needed = needed
        self._for_rows: dict[int, str] = {}

    def method(self, rows: int) -> str:
        """Return the method for `rows` real profiles at once."""
        if len(self._names) == 1:
            return self._names[0]
        name = self._for_rows.get(rows)
        if name is None:
            name = min(self._names, key=lambda n: _COST[n](self._terms, self._size, rows))
            if len(self._for_rows) < 1024:
                self._for_rows[rows] = name
        return name

    @property
    def nbytes(self) -> int:
        """Bytes that the method for one profile holds."""
        return self._needed[self.method(1)]

    def described(self) -> str:
        """Return the expected cost and memory in words."""
        name = self.method(1)
        time = shown_time(_COST[name](self._terms, self._size, 1))
        return f"about {time} a profile, {shown_bytes(self._needed[name])}"
