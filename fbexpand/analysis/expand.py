"""A profile in, its series out."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from typing import TYPE_CHECKING, Any

import numpy as np

from fbexpand import checks
from fbexpand.analysis.quadrature import coefficients_of
from fbexpand.analysis.tolerance import series_to_tolerance
from fbexpand.exceptions import ArgumentTypeError, ArgumentValueError
from fbexpand.expansion import Expansion
from fbexpand.expansion.arguments import as_basis
from fbexpand.lifting.remainder import remainder
from fbexpand.lifting.rim_terms import closed_part_of, condition_of
from fbexpand.profiles.division import MOST_EVALUATIONS
from fbexpand.profiles.first_look import FEWEST, FIRST, SCAN
from fbexpand.profiles.panels import Panels
from fbexpand.profiles.resolve import resolve
from fbexpand.profiles.table import RadialTable, place
from fbexpand.types import ArrayLike, FloatArray

if TYPE_CHECKING:
    from fbexpand.bases import Basis

MOST_LIFTED = 8  # more derivatives at the rim than that are rounding
BYTES_PER_COEFFICIENT = 48  # of a profile: the coefficient and what is made of it; roots and norms besides


def expand(
    profile: Callable[[FloatArray], Any] | RadialTable,
    basis: Basis,
    *,
    terms: int | None = None,
    tol: float | None = None,
    atol: float = 0.0,
    breaks: ArrayLike = (),
    lift_terms: int = 0,
    max_terms: int = 10_000,
    max_evaluations: int | None = None,
    scan: int = SCAN,
) -> Expansion:
    """Expand a radial profile in a basis: f(r) = sum_k c_k phi_k(r).

    c_k = (1/N_k) integral_0^R f(r) phi_k(r) r dr, N_k = integral_0^R phi_k^2 r dr. The profile is sampled as
    densely as it needs, whatever the number of terms, and resolved into panels of Chebyshev polynomials;
    these are integrated against the modes by Gauss rules that are exact to rounding.

    Parameters
    ----------
    profile
        A vectorised function of radii, `(m,)` -> `(*batch, m)`, real or complex, where `(*batch, 1)` or `()`
        broadcasts; or a `RadialTable`. A function is never called at the axis, the rim or a break.
    basis
        A basis, `FourierBessel` or `Dini` or any other that satisfies the `Basis` protocol.
    terms
        The number of terms.
    tol
        Instead of `terms`: the L2 truncation error, sqrt(integral |f - S|^2 r dr), relative to the norm of f.
        It is measured on the panels, for every profile of a batch; all get the terms that the worst of them
        needs. A profile that is 0 takes one term.
    atol
        With `tol`: an L2 error, in units of f times length, that will do whatever the norm of f.
    breaks
        Radii inside (0, R) at which the profile, or a derivative of it, jumps; one that is smooth in between
        is resolved to rounding.
    lift_terms
        How many terms of the profile's expansion at the rim are subtracted in closed form before the coefficients
        are taken, as a sum of powers r^(order + 2 j), `.closed_part`. The coefficients left fall two powers of k
        faster for each, as far as axis and breaks allow, and the sum converges at the rim itself.
    max_terms
        With `tol`: the largest number of terms tried.

    max_evaluations
        The largest number of radii the profile is called for, for an expensive one; 65536 by default. What is not
        resolved with them is stated by the error estimate.
    scan
        How many points the first scan over the radius has: 736 by default, no two of them further apart than 1.6e-3 R,
        so that no peak as wide as that is missed. Narrower ones need a denser scan, or `breaks`.

    Returns
    -------
    Expansion with coefficients of shape `(*batch, terms)`; `.evaluations` counts the radii the profile was
    called for (a table's radii).

    Raises
    ------
    TypeError
        If an argument is of the wrong type, or not exactly one of `terms` and `tol` is given.
    ValueError
        If an argument has a wrong value, a table stops short of axis or rim, or the profile returns a wrong
        shape, numbers that are not finite, or no numbers. What the profile itself raises passes through.

    Warns
    -----
    TruncationWarning
        If `tol` is not reached with `max_terms` terms, or cannot be reached because of rounding. The best
        series is returned.

    Examples
    --------
    >>> import numpy as np
    >>> from fbexpand import FourierBessel, expand
    >>> series = expand(lambda r: 1 - r**2, FourierBessel(), terms=3)
    >>> print(series.coefficients.round(6))
    [ 1.108022 -0.139778  0.045476]
    >>> expand(lambda r: np.exp(-9 * r**2), FourierBessel(), tol=1e-3).terms
    5
    """
    as_basis(basis)
    if (terms is None) == (tol is None):
        given = "both" if terms is not None else "neither"
        raise ArgumentTypeError(f"exactly one of 'terms' and 'tol' must be given (got {given})", "terms", terms)
    if terms is not None:
        terms = checks.integer("terms", terms, 1)
        checks.storable("terms", terms, 2 * BYTES_PER_COEFFICIENT * terms)
    limit = checks.non_negative("atol", atol)
    share = _tolerance(tol, limit)
    most = checks.integer("max_terms", max_terms, 1)
    checks.storable("max_terms", most, 2 * BYTES_PER_COEFFICIENT * most)
    lifted = checks.integer("lift_terms", lift_terms, 0, MOST_LIFTED)
    if lifted:
        condition_of(basis)
    panels, table = _panels(profile, basis, breaks, max_evaluations, scan)
    # a tolerance is relative to the profile, not to what is left of it
    limits = np.maximum(share * panels.norm().reshape(-1), limit) if terms is None else np.zeros(0)
    part = None
    if lifted:
        part = closed_part_of(basis, panels, lifted)
        panels = remainder(panels, part)
    size = int(np.prod(panels.batch_shape))
    if terms is None:
        return series_to_tolerance(panels, basis, limits, most, table, part)
    checks.storable("terms", terms, BYTES_PER_COEFFICIENT * terms * (size + 1))
    coefficients = coefficients_of(panels, basis, terms)
    return Expansion._make(
        basis, coefficients, panels=panels, evaluations=panels.evaluations, table=table, closed_part=part
    )


def _tolerance(tol: Any, atol: float) -> float:
    if tol is None:
        if atol:
            raise checks.value_error("atol", "left out where 'terms' is given", atol)
        return 0.0
    share = checks.non_negative("tol", tol)
    if share == 0.0 and atol == 0.0:
        raise checks.value_error("tol", "positive where 'atol' is 0", tol)
    return share


def _panels(
    profile: Any, basis: Basis, breaks: Any, max_evaluations: Any, scan: Any
) -> tuple[Panels, FloatArray | None]:
    """Return the profile resolved on the basis' radius, and the L2 error of a table's resolution."""
    radius = float(basis.radius)
    cuts = _as_breaks(breaks, radius)
    density = checks.integer("scan", scan, FEWEST, MOST_EVALUATIONS)
    most = max(MOST_EVALUATIONS, 2 * density)
    if max_evaluations is not None:
        most = checks.integer("max_evaluations", max_evaluations, (FIRST + FEWEST) * (len(cuts) + 1))
    if isinstance(profile, RadialTable):
        if cuts:
            raise checks.value_error("breaks", "left out where the profile is a table", breaks)
        return place(profile, float(basis.order), radius)
    if not callable(profile):
        raise checks.type_error("profile", "a function of radii or a RadialTable", profile)
    return resolve(profile, cuts, radius, scan=density, most=most), None


def _as_breaks(breaks: Any, radius: float) -> tuple[float, ...]:
    """Return the breaks ascending; ValueError unless all are distinct and inside (0, radius)."""
    if isinstance(breaks, tuple) and not breaks:
        return ()
    if breaks is None:
        raise checks.type_error("breaks", "radii", breaks)
    if isinstance(breaks, Sequence) and not isinstance(breaks, str) and not len(breaks):
        return ()
    array = np.atleast_1d(checks.real_array("breaks", breaks))
    if array.ndim != 1:
        raise checks.value_error("breaks", "one-dimensional", breaks)
    outside = ~((array > 0.0) & (array < radius))  # NaN is outside
    if outside.any():
        bad = float(array[outside][0])
        raise ArgumentValueError(f"'breaks' must lie inside (0, radius = {radius!r}) (got {bad!r})", "breaks", breaks)
    array = np.sort(array)
    again = np.flatnonzero(np.diff(array) == 0.0)
    if again.size:
        bad = float(array[again[0]])
        raise ArgumentValueError(f"'breaks' must be distinct (got {bad!r} twice)", "breaks", breaks)
    return tuple(array.tolist())
