"""The motion of a law that is known by its propagator only."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np

from fbexpand import checks
from fbexpand.evolution.motion import Motion, Parts
from fbexpand.evolution.spectrum import Modes
from fbexpand.exceptions import ArgumentTypeError, ArgumentValueError
from fbexpand.types import FloatArray, Numeric


class Propagated(Motion):
    """u_k(t) = propagator(eigenvalues, t)_k u_k(0)."""

    reversible = True

    def __init__(self, modes: Modes, propagator: Callable[[FloatArray, float], Any]) -> None:
        super().__init__(modes)
        self._propagator = propagator
        self._eigenvalues = modes.eigenvalues
        self._eigenvalues.setflags(write=False)

    def look(self, time: float) -> None:
        """Find out at one of the times whether the factors are complex, and whether they are factors at all."""
        self.is_complex = np.iscomplexobj(self.at(time))

    @property
    def equation(self) -> list[Numeric]:
        """Nothing is known of it."""
        return []

    @property
    def flux(self) -> float:
        """Nothing is known of it."""
        raise ArgumentValueError("'rim' must be None for a ModalLaw: its equation is not known", "rim", None)

    def parts(self, times: FloatArray, *, speed: bool = False, source: bool = False, velocity: bool = False) -> Parts:
        """Ask the propagator, once for each time."""
        rows = [self.at(float(t)) for t in times]
        if not rows:
            return Parts(np.empty((0, self.terms)), None, None, None)
        return Parts(np.stack(rows), None, None, None)

    def at(self, time: float) -> Numeric:
        """Return the factors at one time, checked."""
        found = self._propagator(self._eigenvalues, time)
        if found is NotImplemented or found is None:
            raise ArgumentTypeError(f"'propagator' must return numbers (got {found!r})", "propagator", found)
        array = checks.numeric_array("propagator", found)
        if array.shape not in ((), (self.terms,)):
            raise ArgumentValueError(
                f"'propagator' must return shape ({self.terms},), one factor for each eigenvalue "
                f"(got shape {array.shape})",
                "propagator",
                found,
            )
        if np.isnan(array).any():
            raise ArgumentValueError(
                f"'propagator' must return numbers (got nan at time {time!r})", "propagator", found
            )
        return np.broadcast_to(array, (self.terms,))
