"""The state that an evolution starts from: coefficients of displacement, velocity and steady source as rows."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np

from fbexpand import checks
from fbexpand.exceptions import ArgumentValueError
from fbexpand.expansion import Expansion
from fbexpand.expansion.arguments import same_basis
from fbexpand.expansion.arithmetic import joint_shape, padded
from fbexpand.types import Numeric

if TYPE_CHECKING:
    from fbexpand.bases import Basis
    from fbexpand.lifting.closed_part import ClosedPart


@dataclass(frozen=True, eq=False)
class State:
    """Rows (size, terms) of one batch shape; velocity and steady forcing are None where there is none."""

    displacement: Numeric
    velocity: Numeric | None
    forcing: Numeric | None
    batch_shape: tuple[int, ...]

    @property
    def terms(self) -> int:
        """The number of terms."""
        return int(self.displacement.shape[-1])

    @property
    def is_complex(self) -> bool:
        """Whether any of the rows is complex."""
        parts = (self.displacement, self.velocity, self.forcing)
        return any(part is not None and np.iscomplexobj(part) for part in parts)


def as_expansion(name: str, value: Any) -> Expansion:
    """Return `value` if it is an Expansion."""
    if not isinstance(value, Expansion):
        raise checks.type_error(name, "an Expansion", value)
    return value


def on_basis(name: str, value: Any, basis: Basis) -> Expansion:
    """Return `value` if it is an Expansion on `basis`."""
    series = as_expansion(name, value)
    if not same_basis(series.basis, basis):
        raise ArgumentValueError(f"{name!r} must be on the basis {basis!r} (got {series.basis!r})", name, value)
    return series


def closed_of(series: Expansion) -> ClosedPart | None:
    """Return what was subtracted from the profile before its coefficients were taken."""
    return series.closed_part


def rows_of(series: Expansion, terms: int, shape: tuple[int, ...]) -> Numeric:
    """Return coefficients as rows (size, terms), continued with zeros and repeated over the batch.

    A closed part is turned into coefficients.
    """
    closed = closed_of(series)
    rows = padded(series.coefficients, terms, shape)
    if closed is not None:
        rows = rows + closed.projected(series.basis, terms)
    return np.ascontiguousarray(np.broadcast_to(rows, (*shape, terms)).reshape(-1, terms))


def shared_shape(named: list[tuple[str, tuple[int, ...]]]) -> tuple[int, ...]:
    """Return the batch shape that several broadcast to; the message names the one that does not fit."""
    shape: tuple[int, ...] = ()
    for name, other in named:
        shape = joint_shape(shape, other, name, other)
    return shape
