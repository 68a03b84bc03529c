"""The cross-check: indices chosen, both sides computed and compared."""

from __future__ import annotations

import time
import warnings
from collections.abc import Callable, Iterable, Sequence
from typing import Any

import numpy as np

from fbexpand import checks
from fbexpand.crosscheck.record import CrossCheck, Seconds
from fbexpand.exceptions import TruncationWarning
from fbexpand.expansion import Expansion
from fbexpand.profiles.table import RadialTable
from fbexpand.types import FloatArray, IntArray

ALL = 32  # so many terms are all checked unless told which
MOST_DIGITS = 1000


def crosscheck(
    expansion: Expansion,
    profile: Any,
    *,
    indices: int | Sequence[int] | None = None,
    digits: int | None = None,
    progress: bool = False,
    breaks: Sequence[float] = (),
) -> CrossCheck:
    """Compare chosen coefficients with adaptive quadrature that owes nothing to this library.

    c_k = (1/N_k) integral_0^R f(r) phi_k(r) r dr is integrated by scipy.integrate.quad between the zeros of the mode
    and the breaks of the profile. Roots are found again, from SciPy's J_nu; J_nu, I_nu and the norms are SciPy's, or
    mpmath's to `digits` digits. A basis of the user's own supplies its modes itself; its root is then held against
    J_nu and against the orthogonality of the modes.

    `indices` counts from 1; by default all of the first 32 and ever sparser ones up to the last. `profile` is the
    callable or the RadialTable that the expansion was made of. For a series that does not know its profile, `breaks`
    names radii where it jumps or has a kink. `progress` shows a bar where tqdm is installed. Every profile of a batch
    is compared: take `e[i]` to compare less.

    A coefficient agrees where |ours - theirs| <= allowed = what the series claims (`error_estimate`: quadrature and
    rounding, and table where `profile` is not the table) + what SciPy claims (quad's own estimate and the error of
    its J_nu as measured against ball arithmetic) and its root does.

    Raises TypeError for what is no expansion, profile or integer; ValueError for indices outside 1 ... terms,
    duplicates, digits outside 15 ... 1000, and a profile whose values do not fit the batch; ImportError for `digits`
    without mpmath.

    >>> import numpy as np
    >>> from fbexpand import Expansion, FourierBessel, bessel_j, bessel_zeros, crosscheck
    >>> j = bessel_zeros(0, 5)
    >>> e = Expansion(FourierBessel(), 8 / (j**3 * bessel_j(1, j)))
    >>> check = crosscheck(e, lambda r: 1 - r**2)
    >>> check.all_agree
    True
    >>> check.quadrature[0].round(12)
    np.float64(1.108022261219)
    """
    from fbexpand.crosscheck.quadrature import Rows, integrate

    if not isinstance(expansion, Expansion):
        raise checks.type_error("expansion", "an Expansion", expansion)
    function, radii, is_table = _as_function(profile, expansion)
    chosen = _as_indices(indices, expansion.terms)
    precision = None if digits is None else checks.integer("digits", digits, 15, MOST_DIGITS)
    basis, radius, shape = expansion.basis, float(expansion.basis.radius), expansion.batch_shape
    modes = _modes_of(basis, precision)
    inner = _breaks(expansion, radii, breaks, radius)
    rows = Rows(function, shape, radius)
    size = rows.size
    theirs = np.zeros((size, chosen.size), dtype=np.complex128 if rows.is_complex else np.float64)
    allowed = np.zeros((size, chosen.size))
    roots, off, within = np.zeros((3, chosen.size))
    claim = _our_claim(expansion, is_table).reshape(size)
    ours = expansion.coefficients[..., chosen - 1]
    start = time.perf_counter()
    for i, k in _watched(chosen.tolist(), progress):
        mode = modes.mode(k)
        found = integrate(rows, mode, inner, radius)
        error = found.error
        theirs[:, i] = found.values[:size] / found.norm
        if rows.is_complex:
            theirs[:, i].imag = found.values[size:] / found.norm
            error = np.hypot(error[:size], error[size:])
        allowed[:, i] = (error + np.abs(theirs[:, i]) * found.norm_error) / found.norm
        allowed[:, i] += claim / np.sqrt(found.norm)
        roots[i] = float(basis.roots(1, k)[0])
        off[i], within[i] = _compare_root(modes, k, roots[i], mode, expansion.terms)
    seconds = time.perf_counter() - start
    quadrature = theirs.reshape(*shape, chosen.size)
    bound = allowed.reshape(quadrature.shape)
    difference = np.abs(ours - quadrature)
    agrees = (difference <= bound) & (off <= within)
    return CrossCheck(
        basis=basis,
        terms=expansion.terms,
        indices=chosen,
        ours=ours.copy(),
        quadrature=quadrature,
        difference=difference,
        allowed=bound,
        agrees=agrees,
        roots=roots,
        root_difference=off,
        root_allowed=within,
        seconds=Seconds(_our_seconds(expansion, profile, inner), seconds),
        source=modes.name if precision is None else f"{modes.name} ({precision} digits)",
    )


def _as_function(profile: Any, expansion: Expansion) -> tuple[Callable[[FloatArray], Any], FloatArray, bool]:
    """Return the profile as a function, the radii where it is not smooth, and whether it is a table."""
    if isinstance(profile, RadialTable):
        from fbexpand.crosscheck.table import table_function

        return (*table_function(profile, expansion.basis), True)
    if not callable(profile):
        raise checks.type_error("profile", "a function of radii or a RadialTable", profile)
    return profile, np.zeros(0), False


def _as_indices(indices: Any, terms: int) -> IntArray:
    if indices is None:
        return default_indices(terms)
    array = np.atleast_1d(np.asarray(indices))
    if array.dtype.kind not in "iu":
        if array.size == 0:
            raise checks.value_error("indices", "non-empty", indices)
        raise checks.type_error("indices", "integers", indices)
    if array.ndim != 1 or array.size == 0:
        raise checks.value_error("indices", "a non-empty list of integers", indices)
    for k in array.tolist():
        checks.integer("indices", k, 1, terms)
    if np.unique(array).size < array.size:
        raise checks.value_error("indices", "without duplicates", indices)
    return array.astype(np.int64)


def default_indices(terms: int) -> IntArray:
    """Return all indices up to 32, then 16 more in geometric steps, the last included."""
    first = np.arange(1, min(terms, ALL) + 1)
    rest = np.geomspace(ALL, terms, 17)[1:].round().astype(np.int64) if terms > ALL else first[:0]
    return np.unique(np.concatenate((first, rest)))


def _modes_of(basis: Any, digits: int | None) -> Any:
    from fbexpand.crosscheck.modes import OwnModes, ScipyModes, rim_condition
    from fbexpand.crosscheck.mpmath_modes import MpmathModes

    robin = rim_condition(basis)
    if robin is None:
        return OwnModes(basis)
    if digits is None:
        return ScipyModes(basis.order, robin, basis.radius)
    return MpmathModes(basis.order, robin, basis.radius, digits)


def _breaks(expansion: Expansion, radii: FloatArray, breaks: Any, radius: float) -> FloatArray:
    """Return every radius inside where the profile may not be smooth: its panels' edges, a table's radii, `breaks`."""
    own = checks.all_finite("breaks", checks.real_array("breaks", breaks)).ravel()
    known = [origin.panels.edges for origin in expansion._origins if origin.panels is not None]
    edges = np.unique(np.concatenate((own, radii, *known)))
    return edges[(edges > 0.0) & (edges < radius)]


def _our_claim(expansion: Expansion, is_table: bool) -> FloatArray:
    """Return the L2 error that the series claims for its coefficients, shape (*batch,)."""
    claim = expansion.error_estimate()
    return np.asarray(claim.quadrature + claim.rounding + (0.0 if is_table else claim.table))


def _compare_root(modes: Any, k: int, root: float, mode: Any, terms: int) -> tuple[float, float]:
    """Return how far the basis' root is from the other one, and the most that rounding explains."""
    eps = float(np.finfo(np.float64).eps)
    if not hasattr(modes, "mismatch"):
        return abs(root - mode.root), mode.root_error + 2.0 * eps * root
    neighbour = k + 1 if k == 1 else k - 1
    # a mode that belongs to another root is not orthogonal: the overlap is about the root's relative error
    return root * modes.mismatch(k, neighbour), root * eps * (1000.0 + 4.0 * root)


def _our_seconds(expansion: Expansion, profile: Any, inner: FloatArray) -> float:
    """Return the seconds of expanding the profile again, NaN where that is not possible."""
    from fbexpand.analysis import expand

    breaks = tuple(inner.tolist()) if callable(profile) and inner.size <= 64 else ()
    try:
        with warnings.catch_warnings():
            warnings.simplefilter("ignore", TruncationWarning)
            start = time.perf_counter()
            expand(profile, expansion.basis, terms=expansion.terms, breaks=breaks)
            return time.perf_counter() - start
    except Exception:
        return float("nan")


def _watched(indices: list[int], progress: bool) -> Iterable[tuple[int, int]]:
    """Return numbered indices, behind a bar where one is asked for and tqdm is installed."""
    pairs = list(enumerate(indices))
    if not progress:
        return pairs
    try:
        from tqdm.auto import tqdm
    except ImportError:
        return pairs
    return tqdm(pairs, desc="cross-check", unit="coefficient", leave=False)  # type: ignore[no-any-return]
