"""Checks of what a transform is given: the basis, radii, numbers, and a place for the results."""

from __future__ import annotations

from typing import Any

import numpy as np

from fbexpand import checks
from fbexpand.exceptions import ArgumentValueError
from fbexpand.records import read_only
from fbexpand.types import ArrayLike, FloatArray, Numeric

EDGE = 1.0 + 4.0 * float(np.finfo(np.float64).eps)  # radii up to this times the radius are inside
NEEDED = ("order", "radius", "growing", "roots", "eigenvalues", "norms", "modes")
REAL, COMPLEX = np.dtype(np.float64), np.dtype(np.complex128)
_PLAIN = (REAL, COMPLEX)


def as_basis(basis: Any) -> Any:
    """Return `basis` if it has what a basis needs."""
    if isinstance(basis, type) or not all(hasattr(basis, name) for name in NEEDED):
        raise checks.type_error("basis", "a basis such as FourierBessel() or Dini(robin=1.0)", basis)
    return basis


def as_radii(r: ArrayLike, radius: float) -> FloatArray:
    """Return an own read-only copy of distinct radii inside the radius."""
    radii = np.array(checks.real_array("r", r), order="C")
    if radii.size == 0:
        raise checks.value_error("r", "at least one radius", radii)
    outside = ~((radii >= 0.0) & (radii <= radius * EDGE))  # NaN is outside
    if outside.any():
        first = float(radii[outside].flat[0])
        raise ArgumentValueError(f"'r' must be within [0, radius = {radius!r}] (got {first!r})", "r", r)
    ordered = np.sort(radii, axis=None)
    twice = ordered[1:] == ordered[:-1]
    if twice.any():
        first = float(ordered[1:][twice][0])
        raise ArgumentValueError(f"'r' must hold distinct radii (got {first!r} more than once)", "r", r)
    return read_only(radii)


def as_numbers(name: str, value: Any) -> Numeric:
    """Return float64 or complex128, C-contiguous; what already is so is passed on."""
    if type(value) is np.ndarray and value.flags.c_contiguous and value.dtype in _PLAIN and value.flags.aligned:
        return value
    return np.ascontiguousarray(checks.numeric_array(name, value)).reshape(np.shape(value))


def fitting(out: Any, shape: tuple[int, ...], given: Numeric, original: Any, name: str) -> None:
    """Raise unless `out` can take results of this shape and of the input's dtype."""
    if not isinstance(out, np.ndarray):
        raise checks.type_error("out", "a NumPy array", out)
    if out.shape != shape:
        raise checks.value_error("out", f"of shape {shape}", out)
    if out.dtype != given.dtype:
        raise checks.value_error("out", f"of dtype {given.dtype}", out)
    flags = out.flags
    if not flags.carray:
        if not flags.c_contiguous:
            raise ArgumentValueError(f"'out' must be C-contiguous (got strides {out.strides})", "out", out)
        what = "writable (got a read-only array)" if not flags.writeable else "aligned (got one that is not)"
        raise ArgumentValueError(f"'out' must be {what}", "out", out)
    if np.may_share_memory(out, original if isinstance(original, np.ndarray) else given):
        raise ArgumentValueError(f"'out' must not overlap {name!r} in memory (got one that does)", "out", out)
