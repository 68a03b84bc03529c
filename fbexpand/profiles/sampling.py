"""Calling the user's profile: what it returns is checked, what it raises passes through."""

from __future__ import annotations

import numbers
from collections.abc import Callable
from typing import Any, NoReturn

import numpy as np

from fbexpand import checks
from fbexpand.exceptions import ArgumentValueError
from fbexpand.types import FloatArray, Numeric

TINY, HUGE = 1e-100, 1e100  # profiles between these are taken as they are
PROBES = 33  # single radii on which a profile that failed on an array is tried


class Sampler:
    """A profile with its batch shape, found at the first call, and a count of the radii asked for.

    Values near the ends of the range of doubles come divided by a power of two, `unit`, so that slopes and
    squares of them are ordinary numbers. `scale` (size,) are the largest moduli of the first call.
    """

    def __init__(self, profile: Callable[[FloatArray], Any]) -> None:
        self._profile = profile
        self.batch_shape: tuple[int, ...] = ()
        self.evaluations = 0
        self.unit: FloatArray | None = None
        self.scale = np.zeros(1)
        self._called = False

    def __call__(self, r: FloatArray) -> Numeric:
        """Return the values at one-dimensional r, at least two radii, as float64 or complex128 (size, m)."""
        try:
            found = self._profile(r.copy())  # a profile may write into its argument
        except Exception as error:
            if not self._called and _one_at_a_time(self._profile, r, error):
                raise ArgumentValueError(
                    "'profile' must accept an array of radii (it works on single numbers only: write it with "
                    "NumPy's functions, or wrap it in numpy.vectorize)",
                    "profile",
                    self._profile,
                ) from error
            raise
        values = self._as_numbers(found)
        shape = values.shape[:-1] if values.ndim else ()
        if values.ndim and values.shape[-1] not in (1, r.size):
            raise self._wrong_shape(values.shape, r.size)
        if self._called and shape != self.batch_shape:
            raise self._wrong_shape(values.shape, r.size)
        if values.size == 0:
            raise self._wrong_shape(values.shape, r.size)
        first = not self._called
        self._called = True
        self.batch_shape = shape
        self.evaluations += r.size
        values = values.reshape(-1, values.shape[-1] if values.ndim else 1)
        if values.shape[-1] != r.size:
            values = np.broadcast_to(values, (values.shape[0], r.size))
        size = np.abs(values).max(axis=1)
        ordinary = float(size.min()) > TINY and float(size.max()) < HUGE
        if not ordinary and not np.isfinite(values).all():  # NaN and inf are the largest moduli
            self._refuse(values, r)
        if first:
            self.scale = size
            if not ordinary:
                self.unit = _unit(values, size)
                self.scale = np.abs(values / self.unit).max(axis=1)
        return values if self.unit is None else values / self.unit

    def _as_numbers(self, found: Any) -> Numeric:
        if type(found) is np.ndarray and found.dtype == np.float64:
            return found
        if isinstance(found, np.ma.MaskedArray) and np.ma.is_masked(found) and found.dtype.kind in "fiuc":
            found = np.ma.filled(found.astype(np.result_type(found.dtype, np.float64)), np.nan)  # refused below
        try:
            values = np.asarray(found)
        except ValueError:
            raise checks.value_error("profile", "a function that returns a regular array", found) from None
        if values.dtype.kind not in "fiuc":
            raise ArgumentValueError(
                f"'profile' must return numbers (got {checks.shown(found)})", "profile", self._profile
            )
        return np.asarray(values, dtype=np.complex128 if values.dtype.kind == "c" else np.float64)

    def _wrong_shape(self, shape: tuple[int, ...], m: int) -> ArgumentValueError:
        batch = f"{self.batch_shape} and then " if self._called else ""
        wanted = f"'profile' must return shape (*batch, {m}), (*batch, 1) or () for {m} radii"
        return ArgumentValueError(f"{wanted} (got {batch}{shape})", "profile", self._profile)

    def _refuse(self, values: Numeric, r: FloatArray) -> NoReturn:
        row, column = (int(i) for i in np.argwhere(~np.isfinite(values))[0])
        raise ArgumentValueError(
            f"'profile' must be finite (got {values[row, column]} at r = {float(r[column])!r})",
            "profile",
            self._profile,
        )


def _unit(values: Numeric, size: FloatArray) -> FloatArray:
    """Return a power of two for every profile (size, 1), 1 for those of ordinary size."""
    ordinary = (size == 0.0) | ((size > TINY) & (size < HUGE))
    size = np.maximum(np.abs(values.real), np.abs(values.imag)).max(axis=1)  # no overflow
    return np.asarray(np.ldexp(1.0, np.where(ordinary, 0, np.frexp(size)[1] - 1)))[:, None]


def _one_at_a_time(profile: Callable[..., Any], r: FloatArray, error: Exception) -> bool:
    """Whether a profile that raised `error` on an array works on single radii all over the place.

    Only the errors that scalar code raises on an array are looked into; numba has one of its own.
    """
    if not (isinstance(error, (TypeError, ValueError)) or type(error).__name__ == "TypingError"):
        return False
    places = np.unique(np.linspace(0, r.size - 1, PROBES).astype(np.int64))
    try:
        return all(isinstance(profile(float(r[i])), numbers.Number) for i in places)
    except Exception:
        return False
