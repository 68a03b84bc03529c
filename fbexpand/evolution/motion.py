"""How the modes of a law move: what a motion answers, and the laws of first order in time."""

from __future__ import annotations

from abc import ABC, abstractmethod
from typing import NamedTuple

import numpy as np

from fbexpand.evolution.spectrum import Modes
from fbexpand.kernels.propagate import REDUCED_TO, beam_rates, decay_rates, huge_turns, products, turns
from fbexpand.types import FloatArray, Numeric

UNDERFLOW = 746.0  # exp(-x) is 0 beyond


class Parts(NamedTuple):
    """What a mode is multiplied by after each time, each (times, modes).

    The amplitude is `state` u0 + `speed` v0 + `source` f with a steady source f; what is not asked for or not of the
    law is None. `state` may have fewer columns: the modes beyond are 0 at all of these times. Where the first mode
    grows its column is to be multiplied by exp(growth), `growth` in two parts (2, times): the product with
    the amplitude may be finite where the exponential alone is not.
    """

    state: Numeric
    speed: Numeric | None
    source: Numeric | None
    growth: FloatArray | None


class Motion(ABC):
    """The modes' motion under one law.

    `equation` is that of one mode, `flux` and `operator` are those of the field.
    """

    order = 1  # of the equation in time
    is_complex = False
    reversible = False  # whether negative times make sense

    def __init__(self, modes: Modes) -> None:
        self.modes = modes
        self.terms = modes.high.size

    @property
    @abstractmethod
    def equation(self) -> list[Numeric]:
        """The coefficients a_0, ..., a_order of sum_i a_i D^i u_k = f_k, each (modes,) or a number."""

    @property
    def exponents(self) -> tuple[Numeric, Numeric]:
        """The exponents e of the motions exp(e t), the smaller and the larger in size; of a swing their modulus."""
        rate = -np.asarray(self.equation[0])
        return rate, rate

    @property
    @abstractmethod
    def flux(self) -> complex | float:
        """What multiplies lap u on the right-hand side."""

    @property
    def operator(self) -> list[float] | None:
        """b_i in flux * lap u = sum_i b_i D^i u - f; None where the modes differ in them."""
        return [0.0, 1.0]

    @abstractmethod
    def parts(self, times: FloatArray, *, speed: bool = False, source: bool = False, velocity: bool = False) -> Parts:
        """Return the factors at `times` (m,), or with `velocity` those of the time derivative."""

    def gain(self, times: FloatArray) -> FloatArray:
        """Return what the modulus of a unit amplitude may have become at most, (times, modes)."""
        parts = self.parts(times)
        gain = np.zeros((times.size, self.terms))
        np.abs(parts.state, out=gain[:, : parts.state.shape[1]])
        if parts.growth is not None:
            gain[:, 0] = grown(gain[:, 0], parts.growth)
        return np.asarray(gain)


def grown(values: Numeric, growth: FloatArray) -> Numeric:
    """Return values (times, ...) times exp(growth), infinite only where the product is."""
    shape = (-1, *[1] * (values.ndim - 1))
    with np.errstate(over="ignore", invalid="ignore"):
        quarter = np.exp(0.25 * growth[0]).reshape(shape)
        result = values * (1.0 + growth[1].reshape(shape))
        for _ in range(4):
            result = np.where(result == 0.0, 0.0, result * quarter)
    return np.asarray(result)


def growth_of(times: FloatArray, rate: float, rate_low: float) -> FloatArray:
    """Return rate * t in two parts, (2, times)."""
    out = np.empty((2, times.size))
    products(np.ascontiguousarray(times), rate, rate_low, out)
    return out


class Decay(Motion):
    """u' = -rate u, rate = diffusivity * eigenvalue + removal."""

    def __init__(self, modes: Modes, diffusivity: float, removal: float) -> None:
        super().__init__(modes)
        self._diffusivity = diffusivity
        self._removal = removal
        self._rates = np.empty((2, self.terms))
        decay_rates(diffusivity, removal, modes.radius, modes.high, modes.low, modes.growing, self._rates)
        self._rate = self._rates[0]
        self._grows = bool(self._rate[0] < 0.0)

    @property
    def equation(self) -> list[Numeric]:
        """The rates and 1."""
        return [self._rate, np.ones(self.terms)]

    @property
    def flux(self) -> float:
        """The diffusivity."""
        return self._diffusivity

    @property
    def operator(self) -> list[float]:
        """The removal and 1."""
        return [self._removal, 1.0]

    def parts(self, times: FloatArray, *, speed: bool = False, source: bool = False, velocity: bool = False) -> Parts:
        """Return exp(-rate t) and (1 - exp(-rate t)) / rate."""
        growth = growth_of(times, -self._rate[0], -self._rates[1, 0]) if self._grows else None
        earliest = float(times.min()) if times.size else 0.0
        alive = self.terms
        if earliest > 0.0:  # the modes beyond are 0 at all of these times
            alive = max(1, int(np.searchsorted(self._rate, UNDERFLOW / earliest)))
        with np.errstate(under="ignore", over="ignore"):
            state = np.multiply.outer(times, -self._rate[:alive])
            exponent = state.copy() if source else None
            if growth is not None:
                state[:, 0] = 0.0
            np.exp(state, out=state)
        if exponent is None:
            return Parts(state, None, None, growth)
        settled = np.empty((times.size, self.terms))
        with np.errstate(divide="ignore", invalid="ignore", under="ignore"):
            lost = -np.expm1(np.minimum(exponent, 0.0)) / self._rate[:alive]
            settled[:, :alive] = np.where(exponent == 0.0, times[:, None], lost)
            settled[:, alive:] = 1.0 / self._rate[alive:]
        if growth is not None:
            settled[:, 0] = -np.expm1(-growth[0]) / -self._rate[0]
        return Parts(state, None, settled, growth)


class Beam(Motion):
    """u' = -i rate u, rate = eigenvalue / (2 wavenumber)."""

    is_complex = True
    reversible = True

    def __init__(self, modes: Modes, wavenumber: float) -> None:
        super().__init__(modes)
        self._wavenumber = wavenumber
        self._rates = np.empty((2, self.terms))
        beam_rates(wavenumber, modes.radius, modes.high, modes.low, modes.growing, self._rates)

    @property
    def equation(self) -> list[Numeric]:
        """The rates times i, and 1."""
        return [1j * self._rates[0], np.ones(self.terms)]

    @property
    def flux(self) -> complex:
        """Return i / (2 wavenumber)."""
        return 0.5j / self._wavenumber

    def parts(self, times: FloatArray, *, speed: bool = False, source: bool = False, velocity: bool = False) -> Parts:
        """Return exp(-i rate t) and its integral t exp(-i rate t / 2) sinc(rate t / 2)."""
        state = np.empty((times.size, self.terms), dtype=np.complex128)
        cosine, sine = circle(times, self._rates)
        state.real = cosine
        np.negative(sine, out=state.imag)
        if not source:
            return Parts(state, None, None, None)
        settled = np.empty_like(state)
        cosine, sine = circle(0.5 * times, self._rates)
        half = 0.5 * self._rates[0]
        with np.errstate(divide="ignore", invalid="ignore"):
            length = np.where(half == 0.0, times[:, None], sine / half)
        settled.real = length * cosine
        settled.imag = -length * sine
        return Parts(state, None, settled, None)

    def gain(self, times: FloatArray) -> FloatArray:
        """Return ones: a beam keeps the modulus of every mode."""
        return np.ones((times.size, self.terms))


def circle(times: FloatArray, rates: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Return cos and sin of rate * t, each (times, rates), for rates in two parts (2, rates)."""
    cosine = np.empty((times.size, rates.shape[1]))
    sine = np.empty_like(cosine)
    if cosine.size:
        rate, rate_low, t = rates[0].copy(), rates[1].copy(), np.ascontiguousarray(times)
        farthest = float(np.abs(rate).max()) * float(np.abs(t).max())
        (turns if farthest <= REDUCED_TO else huge_turns)(t, rate, rate_low, cosine, sine)
    return cosine, sine
