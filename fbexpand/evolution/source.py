"""Sources and rims as `evolve` is given them: checked, told apart into steady and moving, resolved in time."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np

from fbexpand import checks
from fbexpand.evolution.drive import Drive, Side, rim_terms_of
from fbexpand.evolution.modal import Propagated
from fbexpand.evolution.modal_source import ModalDrive
from fbexpand.evolution.motion import Motion
from fbexpand.evolution.panels import COUNT, TimePanels, resolve_in_time
from fbexpand.evolution.response import SLOW
from fbexpand.evolution.rim import MOST, Rim
from fbexpand.evolution.state import closed_of, on_basis, rows_of
from fbexpand.exceptions import ArgumentTypeError, ArgumentValueError
from fbexpand.expansion import Expansion
from fbexpand.types import FloatArray, Numeric

if TYPE_CHECKING:
    from fbexpand.bases import Basis

MARKS = 64  # times asked for, up to which each ends a panel


class Source:
    """A source: nothing, an Expansion, or a function of time that returns one."""

    def __init__(self, value: Any, basis: Basis) -> None:
        self._basis = basis
        self._function: Callable[[float], Any] | None = None
        self.first: Expansion | None = None
        if value is None:
            return
        if isinstance(value, Expansion):
            self.first = on_basis("source", value, basis)
        elif callable(value):
            self._function = value
            self.first = self.at(0.0)
        else:
            raise checks.type_error("source", "an Expansion or a function of time that returns one", value)

    @property
    def moving(self) -> bool:
        """Whether it changes in time."""
        return self._function is not None

    def at(self, time: float) -> Expansion:
        """Return the source at one time, checked."""
        if self._function is None:
            raise ValueError("'source' must be a function of time (got none)")
        found = self._function(time)
        if not isinstance(found, Expansion):
            raise ArgumentTypeError(
                f"'source' must return an Expansion (got {checks.shown(found)} at time {time!r})", "source", found
            )
        return on_basis("source", found, self._basis)


class RimValue:
    """A rim value: nothing, numbers over the batch, or a function of time that returns them."""

    def __init__(self, value: Any) -> None:
        self._function: Callable[[float], Any] | None = None
        self.first: Numeric | None = None
        if value is None:
            return
        if callable(value):
            self._function = value
            self.first = self.at(0.0)
        else:
            self.first = checks.all_finite("rim", checks.numeric_array("rim", value))

    @property
    def moving(self) -> bool:
        """Whether it changes in time."""
        return self._function is not None

    def at(self, time: float) -> Numeric:
        """Return the value at one time, checked."""
        if self._function is None:
            raise ValueError("'rim' must be a function of time (got none)")
        found = self._function(time)
        array = checks.all_finite("rim", checks.numeric_array("rim", found))
        if self.first is not None and array.shape != self.first.shape:
            raise ArgumentValueError(
                f"'rim' must return values of one shape {self.first.shape} (got {array.shape} at time {time!r})",
                "rim",
                found,
            )
        return array


@dataclass(frozen=True, eq=False)
class Driven:
    """What drives the modes: a steady forcing (size, terms) or None, and the rest; whether all of it was resolved."""

    forcing: Numeric | None
    drive: Drive | ModalDrive | None
    settled: bool


def driven(
    motion: Motion,
    basis: Basis,
    shape: tuple[int, ...],
    times: FloatArray,
    source: Source,
    value: RimValue,
) -> Driven:
    """Tell what is steady from what moves and resolve the latter over all times."""
    if isinstance(motion, Propagated):
        if value.first is not None:
            raise ArgumentValueError(
                "'rim' must be None for a ModalLaw, whose equation is not known (got a value)", "rim", value.first
            )
        return Driven(None, _modal_drive(motion, basis, shape, source), True)
    held = value.first is not None
    lifted = source.first is not None and closed_of(source.first) is not None
    rim = Rim(basis, motion.terms) if held or lifted else None
    if held and motion.flux == 0.0:
        raise ArgumentValueError("'rim' must be None for a law that does not spread (got a value)", "rim", value.first)
    sampler = _Sampler(motion, basis, shape, source, value, rim)
    forcing = sampler.steady_force()
    steady = sampler.steady_terms()
    sides: list[Side] = []
    settled = True
    if sampler.moving:
        for sign in (1.0, -1.0):
            here = np.unique(times[times * sign > 0.0] * sign)
            if not here.size and (sign < 0.0 or sides or np.any(times < 0.0)):
                continue
            panels = sampler.panels(sign, here)
            settled = settled and panels.settled
            sides.append(sampler.side(panels, sign))
    drive = Drive(motion, rim, steady, sides) if rim is not None or sides else None
    return Driven(forcing, drive, settled)


def _modal_drive(motion: Propagated, basis: Basis, shape: tuple[int, ...], source: Source) -> ModalDrive | None:
    if source.first is None:
        return None
    steady = rows_of(source.first, motion.terms, shape)

    def rows(time: float) -> Numeric:
        return rows_of(source.at(time), motion.terms, shape) if source.moving else steady

    complex_ = np.iscomplexobj(steady) or np.iscomplexobj(motion.at(0.0))
    return ModalDrive(motion, rows, not source.moving, basis.norms(motion.terms), complex if complex_ else float)


class _Sampler:
    """Values of what moves, as one long row: amplitudes (size, terms), the rim value (size), rim terms (size, MOST)."""

    def __init__(
        self,
        motion: Motion,
        basis: Basis,
        shape: tuple[int, ...],
        source: Source,
        value: RimValue,
        rim: Rim | None,
    ) -> None:
        self._motion, self._shape, self._source, self._value, self._rim = motion, shape, source, value, rim
        self._size, self._terms = int(np.prod(shape)), motion.terms
        self._radius = float(basis.radius)
        self._root_norms = np.sqrt(basis.norms(motion.terms))
        self.moving = source.moving or value.moving

    def _source_rows(self, series: Expansion) -> Numeric:
        return rows_of(series, self._terms, self._shape)

    def _source_terms(self, series: Expansion) -> Numeric:
        closed = closed_of(series)
        if closed is None or self._rim is None:
            return np.zeros((self._size, MOST))
        found = closed.coefficients @ self._rim.terms_of(closed.exponents).T
        return np.broadcast_to(found, (*self._shape, MOST)).reshape(self._size, MOST)

    def _rim_row(self, value: Numeric) -> Numeric:
        return np.broadcast_to(value, self._shape).reshape(self._size)

    def steady_force(self) -> Numeric | None:
        """Return the forcing by what is steady, (size, terms)."""
        total: Numeric | None = None
        if self._source.first is not None and not self._source.moving:
            total = self._source_rows(self._source.first)
        if self._value.first is not None and not self._value.moving and self._rim is not None:
            flux = self._motion.flux * self._rim.flux
            part = self._rim_row(self._value.first)[:, None] * flux
            total = part if total is None else total + part
        return total

    def steady_terms(self) -> Numeric | None:
        """Return the rim terms of what is steady, (size, MOST)."""
        if self._rim is None:
            return None
        value = np.zeros((COUNT, self._size), dtype=np.complex128 if self._motion.is_complex else np.float64)
        terms: Numeric = np.zeros((COUNT, self._size, MOST))
        if self._value.first is not None and not self._value.moving:
            row = self._rim_row(self._value.first)
            value = value.astype(np.result_type(value, row))
            value[0] = row
        if self._source.first is not None and not self._source.moving:
            found = self._source_terms(self._source.first)
            terms = terms.astype(found.dtype)
            terms[0] = found
        steady: Numeric = rim_terms_of(self._motion, self._radius, value, terms, 1.0)[0]
        return steady

    def __call__(self, time: float) -> Numeric:
        """Return the long row at one time."""
        parts: list[Numeric] = [np.zeros(self._size * self._terms), np.zeros(self._size), np.zeros(self._size * MOST)]
        if self._source.moving:
            series = self._source.at(time)
            parts[0] = self._source_rows(series).ravel()
            parts[2] = self._source_terms(series).ravel()
        if self._value.moving:
            parts[1] = self._rim_row(self._value.at(time))
        return np.concatenate(parts)

    def _unpacked(self, rows: Numeric) -> tuple[Numeric, Numeric, Numeric]:
        cut = self._size * self._terms
        force = rows[..., :cut].reshape(*rows.shape[:-1], self._size, self._terms)
        value = rows[..., cut : cut + self._size]
        terms = rows[..., cut + self._size :].reshape(*rows.shape[:-1], self._size, MOST)
        return force, value, terms

    def _measure(self, rows: Numeric) -> FloatArray:
        force, value, terms = self._unpacked(rows)
        l2 = np.sqrt(np.sum(np.abs(force * self._root_norms) ** 2, axis=-1)).max(axis=-1)
        return np.stack([l2, np.abs(value).max(axis=-1), np.abs(terms[..., 0]).max(axis=-1)], axis=-1)

    def panels(self, sign: float, times: FloatArray) -> TimePanels:
        """Resolve what moves from 0 to the last of `times`, ascending and positive; time runs as sign * t."""
        stop = float(times[-1]) if times.size else 1.0
        marks = times if times.size <= MARKS else times[:: times.size // MARKS]
        if not times.size:  # only time 0: a panel of no length
            row = self(0.0)
            coefficients = np.zeros((1, COUNT, row.size), dtype=row.dtype)
            coefficients[0, 0] = row
            return TimePanels(np.array([0.0, 1.0]), coefficients, np.zeros((1, 3)), True)
        return resolve_in_time(lambda t: self(sign * t), 0.0, stop, marks, self._measure, SLOW)

    def side(self, panels: TimePanels, sign: float) -> Side:
        """Return the modes' answer to resolved panels."""
        force, value, terms = self._unpacked(panels.coefficients)
        halves = 0.5 * sign * np.diff(panels.edges)
        rim_terms = None
        if self._rim is not None:
            rim_terms = np.stack(
                [rim_terms_of(self._motion, self._radius, value[i], terms[i], h) for i, h in enumerate(halves)]
            )
            force = force + value[..., None] * (self._motion.flux * self._rim.flux)
        return Side(self._motion, panels, self._size, sign, self._rim, np.ascontiguousarray(force), rim_terms)
