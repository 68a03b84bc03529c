"""An expansion in time as a record: values at any radii and any of its times, computed as they are asked for."""

from __future__ import annotations

from collections.abc import Iterable, Iterator
from dataclasses import dataclass, field, replace
from typing import TYPE_CHECKING, Any

import numpy as np

from fbexpand.evolution.laws import Law
from fbexpand.evolution.motion import Motion, grown
from fbexpand.evolution.state import State
from fbexpand.expansion import Expansion
from fbexpand.expansion.arguments import as_radii
from fbexpand.types import ArrayLike, FloatArray, Numeric

if TYPE_CHECKING:
    from fbexpand.bases import Basis
    from fbexpand.evolution.drive import Drive
    from fbexpand.evolution.modal_source import ModalDrive
    from fbexpand.evolution.tails import Tail

ELEMENTS = 1 << 19  # coefficients in a block of times: four megabytes
MODES_HELD = 1 << 23  # entries of the matrix of modes at a time
LONG = 1 << 24  # values from which on `progress` is worth a bar


@dataclass(frozen=True, eq=False, repr=False)
class Evolution:
    """A field at the times asked for: what `evolve` returns.

    `ev(r)` gives values of shape `(*times.shape, *batch, *r.shape)`, computed in blocks of times; nothing of size times
    x terms is held. `.expansion` is the series with a leading axis of times (none for a scalar time), `.velocity` that
    of the time derivative for waves, None for other laws. `ev[i]` is the evolution at `times[i]`, `len(ev)` counts the
    times. With a driven rim `ev(r)` adds the part that the terms left out make, in closed form, so that it is right at
    the rim itself; the series alone converges slowly there.

    `.expansion.error_estimate()` continues the decay of the first series' coefficients and damps it by the law:
    `source` is "law"; its `quadrature` part holds the error of a source's integral in time.
    """

    law: Law
    times: FloatArray
    basis: Basis
    _state: State
    _drive: Drive | ModalDrive | None
    _tail: Tail
    _motion: Motion
    _known: dict[str, Any] = field(default_factory=dict)

    @property
    def terms(self) -> int:
        """The number of terms."""
        return self._state.terms

    @property
    def batch_shape(self) -> tuple[int, ...]:
        """The shape of the batch axes, times not counted."""
        return self._state.batch_shape

    @property
    def expansion(self) -> Expansion:
        """The series at every time, coefficients `(*times.shape, *batch, terms)`."""
        if "expansion" not in self._known:
            self._known["expansion"] = self._series(velocity=False)
        found: Expansion = self._known["expansion"]
        return found

    @property
    def velocity(self) -> Expansion | None:
        """The series of the time derivative at every time; None for a law that is not of second order in time."""
        if self._motion.order < 2:
            return None
        if "velocity" not in self._known:
            self._known["velocity"] = self._series(velocity=True)
        found: Expansion = self._known["velocity"]
        return found

    @property
    def coefficients(self) -> Numeric:
        """The coefficients of `.expansion`."""
        return self.expansion.coefficients

    def __len__(self) -> int:
        if self.times.ndim == 0:
            raise TypeError("an evolution at one time has no length")
        return self.times.size

    def __bool__(self) -> bool:
        return True

    def __getitem__(self, key: Any) -> Evolution:
        if self.times.ndim == 0:
            raise IndexError("this evolution has no axis of times to index")
        times = np.array(self.times[key])
        if times.ndim > 1 or times.size == 0:
            raise IndexError("an evolution is indexed by an integer, or by a slice or mask that keeps some time")
        times.setflags(write=False)
        return replace(self, times=times, _known={})

    def __iter__(self) -> Iterator[Evolution]:
        return (self[i] for i in range(len(self)))

    def __repr__(self) -> str:
        times = self.times
        which = f"{times.size} times {times.min():g} to {times.max():g}" if times.ndim else f"time {float(times):g}"
        batch = f", batch {self.batch_shape}" if self.batch_shape else ""
        return f"Evolution({self.law!r}, {which}, {self.basis!r}, {self.terms} terms{batch})"

    def __call__(self, r: ArrayLike, *, progress: bool = False) -> Any:
        """Return the field at radii r, shape `(*times.shape, *batch, *r.shape)`; ValueError outside [0, R].

        `progress` shows a bar where tqdm is installed.
        """
        radii = as_radii("r", r, float(self.basis.radius))
        flat = np.minimum(radii.ravel(), float(self.basis.radius))
        times = self.times.ravel()
        size = self._state.displacement.shape[0]
        values = np.empty((times.size, size, flat.size), dtype=np.complex128 if self._complex else np.float64)
        width = max(1, MODES_HELD // self.terms)
        for low in range(0, flat.size, width):
            self._fill(values[:, :, low : low + width], flat[low : low + width], progress)
        return values.reshape((*self.times.shape, *self.batch_shape, *radii.shape))[()]

    @property
    def _complex(self) -> bool:
        return self._state.is_complex or self._motion.is_complex or (self._drive is not None and self._drive.is_complex)

    def _fill(self, out: Numeric, r: FloatArray, progress: bool) -> None:
        """Fill values (times, size, radii)."""
        modes = np.ascontiguousarray(self.basis.modes(r, self.terms).T)
        rim = None if self._drive is None or self._drive.rim is None else self._drive.rim.beyond(r, modes)
        for rows in _watched(self._blocks(), progress):
            times = self.times.ravel()[rows]
            amplitudes, growth = self._amplitudes(times)
            if growth is not None and not np.isfinite(grown(amplitudes[..., 0], growth)).all():
                _product(amplitudes[..., 1:], modes[1:], out[rows])
                out[rows] += grown(amplitudes[..., :1] * modes[0], growth)
            else:
                if growth is not None:
                    amplitudes[..., 0] = grown(amplitudes[..., 0], growth)
                _product(amplitudes, modes, out[rows])
            if rim is not None and self._drive is not None:
                out[rows] += self._drive.closed(times, out.shape[1]) @ rim

    def _blocks(self) -> list[slice]:
        height = max(1, ELEMENTS // (self.terms * self._state.displacement.shape[0]))
        return [slice(low, low + height) for low in range(0, self.times.size, height)]

    def _amplitudes(self, times: FloatArray, velocity: bool = False) -> tuple[Numeric, FloatArray | None]:
        """Return amplitudes (m, size, terms), and the growth that the first mode's is still to be multiplied by.

        Modes beyond the last column are 0 at all of these times.
        """
        state = self._state
        parts = self._motion.parts(
            times, speed=state.velocity is not None, source=state.forcing is not None, velocity=velocity
        )
        alive = parts.state.shape[1]
        first = state.displacement[:, :alive]
        alone = state.velocity is None and state.forcing is None and self._drive is None
        if alone and first.shape[0] == 1:
            whole, kind = parts.state, np.result_type(parts.state, first)
            if whole.dtype != kind or not whole.flags.writeable:
                whole = whole.astype(kind)
            np.multiply(whole, first[0], out=whole)
            return whole[:, None, :], parts.growth
        total = parts.state[:, None, :] * first
        if alone:
            return total, parts.growth
        if alive < self.terms:
            total = np.concatenate((total, np.zeros((*total.shape[:2], self.terms - alive))), axis=-1)
        if state.velocity is not None and parts.speed is not None:
            total = total + parts.speed[:, None, :] * state.velocity
        if state.forcing is not None and parts.source is not None:
            total = total + parts.source[:, None, :] * state.forcing
        if self._drive is None:
            return total, parts.growth
        if parts.growth is not None:
            total[..., 0] = grown(total[..., 0], parts.growth)
        if self._drive.moving:
            total = total + self._drive.respond(times, velocity, total.shape[1])
        return total, None

    def _lifted(self, amplitudes: Numeric, times: FloatArray, velocity: bool) -> Numeric:
        """Take the closed part's coefficients from amplitudes (m, size, terms)."""
        if self._drive is None or self._drive.rim is None:
            return amplitudes
        kept = self._drive.rim.kept
        return (
            amplitudes
            - self._drive.closed(times, amplitudes.shape[1], velocity)[..., :kept] @ self._drive.rim.projected[:kept]
        )

    def _coefficients(self, time: float, velocity: bool = False) -> Numeric:
        """Return the coefficients (size, terms) at one time, those of the closed part left out."""
        amplitudes, growth = self._amplitudes(np.array([time]), velocity)
        if growth is not None:
            amplitudes[..., 0] = grown(amplitudes[..., 0], growth)
        amplitudes = self._lifted(amplitudes, np.array([time]), velocity)
        found = np.zeros((amplitudes.shape[1], self.terms), dtype=amplitudes.dtype)
        found[:, : amplitudes.shape[-1]] = amplitudes[0]
        return found

    def _series(self, velocity: bool) -> Expansion:
        times = self.times.ravel()
        shape = (times.size, self._state.displacement.shape[0], self.terms)
        coefficients = np.empty(shape, dtype=np.complex128 if self._complex else np.float64)
        for rows in self._blocks():
            amplitudes, growth = self._amplitudes(times[rows], velocity)
            if growth is not None:
                amplitudes[..., 0] = grown(amplitudes[..., 0], growth)
            amplitudes = self._lifted(amplitudes, times[rows], velocity)
            coefficients[rows, :, : amplitudes.shape[-1]] = amplitudes
            coefficients[rows, :, amplitudes.shape[-1] :] = 0.0
        lead = (*self.times.shape, *self.batch_shape)
        part, error = None, None
        if self._drive is not None:
            error = self._drive.error(times)
            terms = self._drive.closed(times, shape[1], velocity)
            part = self._drive.closed_part(terms.reshape(*lead, terms.shape[-1]))
        return self._tail.series(coefficients.reshape(*lead, -1), self.times, velocity, part, error)


def _product(amplitudes: Numeric, modes: FloatArray, out: Numeric) -> None:
    """Fill values (m, size, radii) with amplitudes (m, size, terms) times modes (terms, radii)."""
    if amplitudes.shape[-1] == 0:
        out[...] = 0.0  # a single term that was taken by itself
        return
    flat = amplitudes.reshape(-1, amplitudes.shape[-1])
    modes = modes[: flat.shape[1]]
    if np.iscomplexobj(flat):
        out.real = (np.ascontiguousarray(flat.real) @ modes).reshape(out.shape)
        out.imag = (np.ascontiguousarray(flat.imag) @ modes).reshape(out.shape)
    elif out.flags.c_contiguous and not np.iscomplexobj(out):
        np.matmul(flat, modes, out=out.reshape(flat.shape[0], modes.shape[1]))
    else:
        out[...] = (flat @ modes).reshape(out.shape)


def _watched(blocks: list[slice], progress: bool) -> Iterable[slice]:
    """Return the blocks, behind a bar where one is asked for and tqdm is installed."""
    if not progress:
        return blocks
    try:
        from tqdm.auto import tqdm
    except ImportError:
        return blocks
    return tqdm(blocks, desc="evolve", unit="block", leave=False)  # type: ignore[no-any-return]
