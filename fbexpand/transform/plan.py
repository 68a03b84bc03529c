"""Transform: fields to coefficients and back, the costly work done once."""

from __future__ import annotations

import threading
from typing import TYPE_CHECKING, Any

import numpy as np

from fbexpand import checks
from fbexpand.exceptions import ArgumentValueError
from fbexpand.records import read_only
from fbexpand.transform.arguments import REAL, as_basis, as_numbers, as_radii, fitting
from fbexpand.transform.blocks import DirectSums
from fbexpand.transform.choice import METHODS, Choice
from fbexpand.transform.grid import chosen_grid
from fbexpand.transform.matrix import MatrixSums
from fbexpand.transform.pool import in_threads
from fbexpand.transform.weights import fitted_weights
from fbexpand.types import ArrayLike, FloatArray, Numeric

if TYPE_CHECKING:
    from fbexpand.bases import Basis

MAX_TERMS = 1 << 26
MAX_THREADS = 1024
_SUMS = {"matrix": MatrixSums, "direct": DirectSums}


class Transform:
    """A plan for the inner loop: series to values on given radii, and back.

    With modes phi_k, norms N_k and weights w_i of integral_0^R g r dr,

        synthesize:  (S c)_i = sum_k c_k phi_k(r_i),
        analyze:     (A v)_k = (1/N_k) sum_i w_i phi_k(r_i) v_i,

    each the other's adjoint: sum_i w_i v_i conj(S c)_i = sum_k N_k (A v)_k conj(c_k). Threads may share it; a pickle
    holds the arguments only, and the choice of method.

    Parameters
    ----------
    basis
        FourierBessel, Dini, or any `Basis`.
    terms
        Number of modes, from the first on.
    r
        Distinct radii in [0, R], in any order, of any shape, in the unit of the basis's radius. Without them the
        transform chooses radii on which analyze(synthesize(c)) is c to 1e-13, at most 1.7 terms + 20 of them from 16
        terms on (a steep growing first mode may take some more). Those have a digit or two more than doubles show:
        `.r` is rounded, what `synthesize` returns belongs to the exact ones. On radii of your own the weights make
        the modes as orthogonal as least squares can; evenly spaced, three times as many as terms, that is to 1e-8 and
        better. Samples that are noisy, or fewer than terms, belong to `fit`.
    method
        "matrix" stores the modes; "direct" computes them each time; "auto" takes what costs least by a fixed model,
        within `max_bytes`.
    exact_for
        How many modes may be multiplied: with 3, the product of two series is analysed without aliasing, on more radii.
    max_bytes
        Bound on the memory held.
    threads
        Profiles of a batch are shared out over so many threads.

    Raises
    ------
    TypeError
        If an argument is of the wrong type.
    ValueError
        If radii repeat or lie outside [0, R (1 + 4 eps)], the method is unknown, or `max_bytes` too small for it.

    Examples
    --------
    >>> import numpy as np
    >>> from fbexpand.bases import FourierBessel
    >>> from fbexpand.transform import Transform
    >>> plan = Transform(FourierBessel(), terms=32)
    >>> c = 0.5 ** np.arange(32)
    >>> field = plan.synthesize(c)
    >>> bool(np.max(np.abs(plan.analyze(field) - c)) < 1e-14)
    True
    """

    def __init__(
        self,
        basis: Basis,
        terms: int,
        r: ArrayLike | None = None,
        *,
        method: str = "auto",
        exact_for: int = 2,
        max_bytes: int = 1 << 30,
        threads: int = 1,
    ) -> None:
        self._basis: Basis = as_basis(basis)
        self._terms = checks.integer("terms", terms, 1, MAX_TERMS)
        self._exact_for = checks.integer("exact_for", exact_for, 2, 8)
        self._threads = checks.integer("threads", threads, 1, MAX_THREADS)
        self._max_bytes = checks.integer("max_bytes", max_bytes, 1)
        self._asked = checks.choice("method", method, METHODS)
        self._given = r is not None
        self._lock = threading.Lock()
        self._low: FloatArray | None = None
        self._weights: FloatArray | None = None
        if r is None:
            grid = chosen_grid(basis, self._terms, self._exact_for)
            self._r, self._low, self._weights = grid.r, grid.low, grid.weights
        else:
            self._r = as_radii(r, float(basis.radius))
        self._flat = self._r.reshape(-1)
        self._shape = self._r.shape
        self._size = self._flat.size
        self._choice = Choice(self._asked, self._terms, self._size, self._max_bytes)
        self._sums: dict[str, Any] = {}
        self._scratch = threading.local()
        self._single: Any = None  # what serves one profile, once it has been made

    @property
    def basis(self) -> Basis:
        """The basis."""
        return self._basis

    @property
    def terms(self) -> int:
        """The number of modes."""
        return self._terms

    @property
    def r(self) -> FloatArray:
        """The radii, read-only."""
        return self._r

    @property
    def weights(self) -> FloatArray:
        """The weights w_i of integral_0^R g r dr, of the shape of `.r`, read-only."""
        return self._flat_weights().reshape(self._shape)

    @property
    def method(self) -> str:
        """The method that serves one profile; "auto" may take another for a large batch."""
        return self._choice.method(1)

    @property
    def nbytes(self) -> int:
        """Bytes held, or to be held after the first calls in both directions."""
        return self._choice.nbytes

    def synthesize(self, coefficients: ArrayLike, *, out: Numeric | None = None) -> Numeric:
        """Return the sums at the radii: (*batch, terms) -> (*batch, *r.shape).

        Complex coefficients give complex values. With `out` (C-contiguous, of that shape and of dtype float64, or
        complex128 where the coefficients are complex) nothing is allocated, and `out` is returned.

        Raises TypeError for what holds no numbers and for an `out` that is no array, ValueError for a wrong number of
        terms and an `out` that does not fit.
        """
        given = as_numbers("coefficients", coefficients)
        shape = given.shape
        if not shape or shape[-1] != self._terms:
            what = f"of shape (*batch, {self._terms})"
            raise checks.value_error("coefficients", what, coefficients)
        target = shape[:-1] + self._shape
        if out is None:
            out = np.empty(target, given.dtype)
        else:
            fitting(out, target, given, coefficients, "coefficients")
        self._run("synthesize", given, self._terms, out, self._size)
        return out

    def analyze(self, values: ArrayLike, *, out: Numeric | None = None) -> Numeric:
        """Return the coefficients of values at the radii: (*batch, *r.shape) -> (*batch, terms).

        Raises as `synthesize`, and ValueError where there are fewer radii than terms.
        """
        if self._size < self._terms:
            raise ArgumentValueError(
                f"'r' must hold at least as many radii as terms for analyze, {self._terms} (got {self._size}); "
                "scattered samples are a case for fit",
                "r",
                self._r,
            )
        given = as_numbers("values", values)
        shape = given.shape
        places = len(self._shape)
        if len(shape) < places or shape[len(shape) - places :] != self._shape:
            what = "of shape (*batch, " + ", ".join(str(n) for n in self._shape) + ")"
            raise checks.value_error("values", what, values)
        target = (*shape[: len(shape) - places], self._terms)
        if out is None:
            out = np.empty(target, given.dtype)
        else:
            fitting(out, target, given, values, "values")
        self._run("analyze", given, self._size, out, self._terms)
        return out

    def __repr__(self) -> str:
        return (
            f"Transform({self._basis!r}, terms={self._terms}, radii={self._size}, method={self.method!r}; "
            f"{self._choice.described()})"
        )

    def __reduce__(self) -> tuple[Any, ...]:
        r = np.array(self._r) if self._given else None
        options = (self._asked, self._exact_for, self._max_bytes, self._threads)
        return _rebuild, (self._basis, self._terms, r, *options)

    def _flat_weights(self) -> FloatArray:
        weights = self._weights
        if weights is None:
            with self._lock:
                if self._weights is None:
                    fitted = fitted_weights(self._basis, self._terms, self._flat, self._exact_for)
                    self._weights = read_only(fitted)
                weights = self._weights
        return weights

    def _method(self, rows: int) -> Any:
        name = self._choice.method(rows)
        sums = self._sums.get(name)
        if sums is None:
            with self._lock:
                if name not in self._sums:
                    self._sums[name] = _SUMS[name](
                        self._basis, self._terms, self._flat, self._low, self._flat_weights_later
                    )
                sums = self._sums[name]
        if rows == 1:
            self._single = sums
        return sums

    def _flat_weights_later(self) -> FloatArray:
        return self._flat_weights()

    def _run(self, direction: str, given: Numeric, width: int, out: Numeric, wide: int) -> None:
        """Apply a direction to all profiles: real ones as rows, complex ones as rows of two kinds."""
        if given.ndim == 1 and out.ndim == 1:
            getattr(self._single or self._method(1), direction)(given, out)
            return
        if given.dtype == REAL:
            if out.size:
                self._rows(direction, given.reshape(-1, width), out.reshape(-1, wide))
            return
        if out.size == 0:
            return
        planes, target = self._planes(given.size // width, width, wide)
        half = len(planes) // 2
        flat, result = given.reshape(-1, width), out.reshape(-1, wide)
        planes[:half] = flat.real
        planes[half:] = flat.imag
        self._rows(direction, planes, target)
        result.real = target[:half]
        result.imag = target[half:]

    def _rows(self, direction: str, rows: FloatArray, out: FloatArray) -> None:
        run = getattr(self._method(len(rows)), direction)
        if self._threads == 1 or len(rows) == 1:
            run(rows, out)
        else:
            in_threads(run, rows, out, self._threads)

    def _planes(self, size: int, width: int, wide: int) -> tuple[FloatArray, FloatArray]:
        """Return room for the real and imaginary parts of a batch, kept for the thread's next call."""
        name = "out" if width == self._terms else "back"
        kept: tuple[FloatArray, FloatArray] | None = getattr(self._scratch, name, None)
        if kept is None or kept[0].shape != (2 * size, width) or kept[1].shape != (2 * size, wide):
            kept = (np.empty((2 * size, width)), np.empty((2 * size, wide)))
            setattr(self._scratch, name, kept)
        return kept


def _rebuild(
    basis: Basis, terms: int, r: FloatArray | None, method: str, exact_for: int, max_bytes: int, threads: int
) -> Transform:
    return Transform(basis, terms, r, method=method, exact_for=exact_for, max_bytes=max_bytes, threads=threads)
