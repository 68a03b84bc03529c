"""Frozen records that several layers hand out: a partial sum with its error."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

from fbexpand.types import Numeric


def read_only(array: Numeric) -> Numeric:
    """Mark `array` as read-only and return it."""
    array.setflags(write=False)
    return array


class ReadOnlyArrays:
    """Marks the arrays of a frozen dataclass read-only, at birth and after a round of pickle or copy."""

    __slots__ = ()

    def __post_init__(self) -> None:
        for value in vars(self).values():
            if hasattr(value, "setflags"):
                read_only(value)

    def __setstate__(self, state: dict[str, Any]) -> None:
        for name, value in state.items():
            object.__setattr__(self, name, value)
        self.__post_init__()


@dataclass(frozen=True, eq=False)
class PartialSum(ReadOnlyArrays):
    """A partial sum and how wrong it is.

    `values` are the sums, `error` bounds or estimates their distance from the function, of the same shape.
    `source` says where `error` comes from: "residual" (measured against the profile), "law" (from the decay
    of the coefficients) or "bound" (proven).
    """

    values: Any
    error: Any
    source: str
