"""Laws of motion: diffusion, damped waves, paraxial beams, and a law of the user's own."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field
from typing import TYPE_CHECKING, Any

import numpy as np

from fbexpand import checks
from fbexpand.evolution.modal import Propagated
from fbexpand.evolution.motion import Beam, Decay, Motion
from fbexpand.evolution.requirement import terms_at_time
from fbexpand.evolution.spectrum import Modes, modes_of
from fbexpand.evolution.waves import Swing
from fbexpand.types import FloatArray, IntArray

if TYPE_CHECKING:
    from fbexpand.expansion import Expansion


class Law:
    """What `evolve` takes: it moves the modes of any basis."""

    def motion(self, modes: Modes) -> Motion:
        """Return how these modes move."""
        raise NotImplementedError

    def check_terms(self, terms: int) -> None:
        """Raise the ValueError about an argument of the law that does not fit so many terms."""

    def terms_for(
        self, series: Expansion, time: Any, tol: float, norm: str, at: float | None, relative: bool
    ) -> IntArray:
        """Return how many terms the field at `time` takes, shape (size,): `Expansion.terms_for` asks for it."""
        number = checks.finite("time", time)
        if number < 0.0 and not self.motion(modes_of(series.basis, series.terms)).reversible:
            raise checks.value_error("time", f"at least 0 for {self!r}", time)
        return terms_at_time(series, self, number, tol, norm, at, relative)


@dataclass(frozen=True, eq=False)
class Diffusion(Law):
    """Diffusion with first-order removal: u_t = D lap u - removal u.

    `diffusivity` D in length^2/time (heat: conductivity / (density * specific heat)), at least 0; `removal` in 1/time,
    at least 0 (reaction, decay, perfusion). Mode k falls as exp(-(D eigenvalue_k + removal) t); where the basis grows
    (robin + order < 0) its first mode may rise. Times are at least 0.

    Before you rely on it: D and the rim coefficient are constants here. Where they depend on temperature or
    concentration, where there is flow, phase change, or transport along the axis (a body shorter than about ten
    diameters), the answer is off by more than any error stated here, which is that of the series alone. A predicted
    temperature, concentration or dose that somebody's safety depends on needs a margin for the measured spread of D and
    of the transfer coefficient, and a comparison with a measurement.

    Raises TypeError for what is no real number, ValueError for a number that is negative or not finite.

    Carslaw and Jaeger, "Conduction of Heat in Solids" (1959), chapter 7; Crank, "The Mathematics of Diffusion" (1975),
    chapter 5.

    >>> from fbexpand.evolution import Diffusion
    >>> Diffusion(1.4e-7)
    Diffusion(diffusivity=1.4e-07, removal=0.0)
    """

    diffusivity: float
    removal: float = field(default=0.0, kw_only=True)

    def __post_init__(self) -> None:
        object.__setattr__(self, "diffusivity", checks.non_negative("diffusivity", self.diffusivity))
        object.__setattr__(self, "removal", checks.non_negative("removal", self.removal))

    def motion(self, modes: Modes) -> Motion:
        """Return how these modes move."""
        return Decay(modes, self.diffusivity, self.removal)


@dataclass(frozen=True, eq=False)
class Wave(Law):
    """Waves with damping proportional to the velocity: u_tt + damping u_t = c^2 lap u.

    `speed` c in length/time, at least 0; `damping` in 1/time, at least 0: one number, or an array `(terms,)` with
    an entry for each mode. Each mode is underdamped, critically damped or overdamped on its own, and the formulas pass
    smoothly through critical damping. Without damping times may be negative. Roots and phases are carried in two parts:
    the phase is right to 1e-24 of itself, so to 1e-12 up to 1e11 periods.

    Before you rely on it: displacements are small, the medium is uniform and the rim condition holds exactly. A
    membrane's air load and stiffness and the loss in its frame shift the pitch of real drums by percents; sound in a
    duct obeys this only below the level at which waves steepen, and where modes about the axis are not excited. A
    predicted pressure level or exposure needs a measured one beside it.

    Raises TypeError for what is no real number, ValueError for a number that is negative or not finite.

    Morse and Ingard, "Theoretical Acoustics" (1968), section 5.2.

    >>> from fbexpand.evolution import Wave
    >>> Wave(340.0, damping=2.0)
    Wave(speed=340.0, damping=2.0)
    """

    speed: float
    damping: Any = field(default=0.0, kw_only=True)

    def __post_init__(self) -> None:
        object.__setattr__(self, "speed", checks.non_negative("speed", self.speed))
        if np.ndim(self.damping) == 0:
            object.__setattr__(self, "damping", checks.non_negative("damping", self.damping))
            return
        damping = checks.real_array("damping", self.damping).copy()
        if damping.ndim != 1 or damping.size == 0:
            raise checks.value_error("damping", "a number or of shape (terms,)", self.damping)
        wrong = ~((damping >= 0.0) & np.isfinite(damping))
        if wrong.any():
            raise checks.value_error("damping", "at least 0 and finite", float(damping[wrong][0]))
        damping.setflags(write=False)
        object.__setattr__(self, "damping", damping)

    def check_terms(self, terms: int) -> None:
        """Raise ValueError where `damping` is an array with fewer entries."""
        if np.ndim(self.damping) and self.damping.size < terms:
            raise checks.value_error("damping", f"of shape ({terms},), one entry for each term", self.damping)

    def motion(self, modes: Modes) -> Motion:
        """Return how these modes move; beyond the last entry of `damping` that entry stays."""
        damping = np.atleast_1d(np.asarray(self.damping, dtype=np.float64))
        return Swing(modes, self.speed, damping[np.minimum(modes.number, damping.size) - 1])


@dataclass(frozen=True, eq=False)
class Paraxial(Law):
    """A beam along z in the paraxial approximation: u_z = (i / 2k) lap u, for the time dependence exp(-i w t).

    `wavenumber` k in 1/length, positive: 2 pi n / wavelength in a medium of index n. "Times" are distances z; they may
    be negative. Every mode keeps its modulus; one of eigenvalue 0 keeps its phase too.

    Before you rely on it: light must stay within some 15 degrees of the axis, and the rim acts as the basis says (a
    perfect mirror, say): for a beam in free space take a radius so wide that nothing reaches it up to the last z,
    otherwise what comes back from the rim is part of the answer.

    Raises TypeError for what is no real number, ValueError for one that is not positive and finite.

    Goodman, "Introduction to Fourier Optics" (1996), chapter 4.

    >>> from fbexpand.evolution import Paraxial
    >>> Paraxial(9.9e6)
    Paraxial(wavenumber=9900000.0)
    """

    wavenumber: float

    def __post_init__(self) -> None:
        object.__setattr__(self, "wavenumber", checks.positive("wavenumber", self.wavenumber))

    def motion(self, modes: Modes) -> Motion:
        """Return how these modes move."""
        return Beam(modes, self.wavenumber)


@dataclass(frozen=True, eq=False)
class ModalLaw(Law):
    """A law of the user's own: u_k(t) = propagator(eigenvalues, t)_k u_k(0).

    `propagator` is called with the eigenvalues, an array of shape `(terms,)` in 1/length^2, and one time, a float, once
    for every time; it returns `(terms,)` factors, real or complex. A `source` is integrated with
    propagator(eigenvalues, t - s), for a law that does not itself change in time; `rim` is refused, as the equation is
    not known.

    Raises TypeError for what cannot be called.

    >>> import numpy as np
    >>> from fbexpand import Expansion, FourierBessel
    >>> from fbexpand.evolution import ModalLaw, evolve
    >>> subdiffusion = ModalLaw(lambda eigenvalues, t: np.exp(-eigenvalues * np.sqrt(t)))
    >>> print(evolve(Expansion(FourierBessel(), [1.0, 1.0]), subdiffusion, 0.01).expansion.coefficients)
    [0.56084057 0.04749522]
    """

    propagator: Callable[[FloatArray, float], Any]

    def __post_init__(self) -> None:
        if not callable(self.propagator):
            raise checks.type_error("propagator", "a function of eigenvalues and time", self.propagator)

    def motion(self, modes: Modes) -> Motion:
        """Return how these modes move."""
        return Propagated(modes, self.propagator)
