"""The series as a record: what it holds and the questions it answers."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass, field
from typing import TYPE_CHECKING, Any

import numpy as np

from fbexpand import checks
from fbexpand.estimates.origin import Origin, spread_panels
from fbexpand.expansion import arguments, arithmetic, filters, laplacian, mapping, questions, text, whole
from fbexpand.types import ArrayLike, FloatArray, Numeric

if TYPE_CHECKING:
    from fbexpand.bases import Basis
    from fbexpand.estimates.records import ErrorEstimate, PartialSum
    from fbexpand.lifting.closed_part import ClosedPart
    from fbexpand.lifting.expected import LiftResidual
    from fbexpand.profiles.panels import Panels


@dataclass(frozen=True, eq=False, repr=False)
class Expansion:
    """A series f(r) = sum_{k>=1} c_k phi_k(r) on a basis, with its error.

    `coefficients` of shape `(*batch, terms)`, real or complex, are those of the modes as the basis scales
    them: c_k = (1/N_k) integral_0^R f phi_k r dr. Arithmetic works on series of one basis: `+` and `-`
    (shorter ones are continued with zeros, batches broadcast), `*` and `/` with numbers or arrays over the
    batch. `e[i]` selects from the batch axes; `e(r)` is the sum at radii r, shape `(*batch, *r.shape)`.
    `evaluations` counts the values of the profile that were asked for, 0 for a series made from coefficients;
    `closed_part`, None or a sum of powers r^(order + 2 j), is what `expand(..., lift_terms=...)` subtracted before the
    coefficients were taken; every operation includes it. Series are frozen, their
    arrays read-only; `==` is identity.

    Raises TypeError for what is no basis or no numbers, ValueError for coefficients that are empty or not
    finite.

    >>> from fbexpand import Expansion, FourierBessel
    >>> e = Expansion(FourierBessel(), [1.0, 0.5])
    >>> float(e(0.0))
    1.5
    """

    basis: Basis
    coefficients: Numeric
    evaluations: int = field(init=False, default=0)
    closed_part: ClosedPart | None = field(init=False, default=None)
    _origins: tuple[Origin, ...] = field(init=False, default=())
    _known: dict[Any, Any] = field(init=False, default_factory=dict)

    __array_ufunc__ = None  # array * series comes to the series, not to each element

    def __post_init__(self) -> None:
        basis = arguments.as_basis(self.basis)
        coefficients = arguments.as_coefficients(self.coefficients)
        zero = np.zeros(coefficients.shape[:-1])
        self._fill(basis, coefficients, (Origin(coefficients, None, zero, zero),), 0, None)

    def _fill(
        self,
        basis: Basis,
        coefficients: Numeric,
        origins: tuple[Origin, ...],
        evaluations: int,
        closed_part: ClosedPart | None,
    ) -> None:
        put = object.__setattr__
        put(self, "basis", basis)
        put(self, "coefficients", coefficients)
        put(self, "evaluations", evaluations)
        put(self, "closed_part", closed_part)
        put(self, "_origins", origins)
        put(self, "_known", {})

    @classmethod
    def _make(
        cls,
        basis: Basis,
        coefficients: Numeric,
        *,
        panels: Panels | None = None,
        evaluations: int = 0,
        quadrature: ArrayLike | None = None,
        table: ArrayLike | None = None,
        left: FloatArray | None = None,
        closed_part: ClosedPart | None = None,
    ) -> Expansion:
        """Make a series that knows its profile's panels and the (*batch,) L2 errors of its coefficients."""
        coefficients = arguments.as_coefficients(coefficients)
        zero = np.zeros(coefficients.shape[:-1])
        first, second = (
            zero if part is None else zero + np.asarray(part, dtype=np.float64) for part in (quadrature, table)
        )
        panels = spread_panels(panels, coefficients.shape[:-1])
        origins = (Origin(coefficients, panels, first, second, left),)
        return cls._derive(basis, coefficients, origins, evaluations, closed_part)

    @classmethod
    def _derive(
        cls,
        basis: Basis,
        coefficients: Numeric,
        origins: tuple[Origin, ...],
        evaluations: int = 0,
        closed_part: ClosedPart | None = None,
    ) -> Expansion:
        """Make a series of coefficients that are known to be in order."""
        self = object.__new__(cls)
        self._fill(basis, arguments.own(coefficients), origins, evaluations, closed_part)
        return self

    def __reduce__(self) -> tuple[Any, ...]:
        parts = (self.basis, self.coefficients, self._origins, self.evaluations, self.closed_part)
        return (type(self)._derive, parts)

    def __repr__(self) -> str:
        return text.describe(self)

    # -- shape
    # -------------------------------------------------------------------------------------------------

    @property
    def terms(self) -> int:
        """The number of terms."""
        return int(self.coefficients.shape[-1])

    @property
    def batch_shape(self) -> tuple[int, ...]:
        """The shape of the batch axes; () for one series."""
        return self.coefficients.shape[:-1]

    @property
    def orthonormal(self) -> Numeric:
        """The coefficients b_k = c_k sqrt(N_k) of the normalised modes, `(*batch, terms)`."""
        known: Numeric | None = self._known.get("orthonormal")
        if known is None:
            known = self._known["orthonormal"] = arguments.own(
                self.coefficients * np.sqrt(self.basis.norms(self.terms))
            )
        return known

    def __len__(self) -> int:
        if not self.batch_shape:
            raise TypeError("a series without batch axes has no length")
        return self.batch_shape[0]

    def __bool__(self) -> bool:
        return True

    def __getitem__(self, key: Any) -> Expansion:
        return arithmetic.select(self, key)

    def __iter__(self) -> Iterator[Expansion]:
        if not self.batch_shape:
            raise TypeError("a series without batch axes cannot be iterated over")
        return (self[i] for i in range(self.batch_shape[0]))

    @property
    def real(self) -> Expansion:
        """The series of the real part of the field."""
        return arithmetic.part(self, "real")

    @property
    def imag(self) -> Expansion:
        """The series of the imaginary part of the field."""
        return arithmetic.part(self, "imag")

    def conj(self) -> Expansion:
        """Return the series of the complex conjugate of the field."""
        return arithmetic.part(self, "conjugate")

    # -- values
    # ------------------------------------------------------------------------------------------------

    def __call__(self, r: ArrayLike) -> Any:
        """Return the sum at radii r, shape `(*batch, *r.shape)`; ValueError for radii outside [0, R]."""
        radii = self._radii("r", r)
        return _shaped(whole.values_of(self, radii.ravel()), radii)

    def derivative(self, r: ArrayLike, n: int = 1) -> Any:
        """Return the n-th derivative of the sum at r, shape `(*batch, *r.shape)`, in f / length^n.

        At the axis it is infinite where the sum starts as A r^nu with nu no integer and n > nu (n = 1 and 0 <
        nu < 1, say), with the sign of A nu (nu - 1) ... (nu - n + 1). A basis that cannot differentiate its
        modes is differentiated on Chebyshev panels, with an error near 1e-13 sup |f| (root / radius)^n for n
        = 1, fifty times that for each further n.

        Raises TypeError or ValueError for radii outside [0, R] and for n that is not an integer from 0 to 32.
        """
        count = checks.integer("n", n, 0, MOST_DERIVATIVES)
        radii = self._radii("r", r)
        return _shaped(whole.derivatives_of(self, radii.ravel(), count), radii)

    def integral(self, a: float = 0.0, b: float | None = None) -> Any:
        """Return the integral of f r dr from a to b (the rim by default), shape `(*batch,)`; no factor 2 pi.

        The sum is integrated by Gauss rules that are exact to rounding for it, near the axis too, where
        r^order is not smooth. From b to a the sign is the other one.
        """
        low, high = self._interval(a, b)
        return whole.integral_of(self, low, high)

    def mean(self, a: float = 0.0, b: float | None = None) -> Any:
        """Return the mean over the area of the ring between radii a and b, shape `(*batch,)`, in units of f.

        Raises ValueError where a = b.
        """
        low, high = self._interval(a, b)
        if low == high:
            raise checks.value_error("b", f"different from a = {low!r}", high)
        return whole.integral_of(self, low, high) / (0.5 * (high - low) * (high + low))

    def norm(self) -> Any:
        """Return sqrt(integral_0^R |S|^2 r dr) of the sum, shape `(*batch,)`, by Parseval's identity."""
        return whole.norm_of(self)

    def inner(self, other: Expansion) -> Any:
        """Return integral_0^R conj(f) g r dr with this series as f and `other` as g, batches broadcast."""
        if not isinstance(other, Expansion):
            raise checks.type_error("other", "an Expansion", other)
        arithmetic.require_same_basis(self, other)
        arithmetic.joint_shape(self.batch_shape, other.batch_shape, "other", other)
        return whole.inner_of(self, other)

    # -- arithmetic
    # --------------------------------------------------------------------------------------------

    def __add__(self, other: Any) -> Expansion:
        return arithmetic.add(self, other) if isinstance(other, Expansion) else NotImplemented

    def __sub__(self, other: Any) -> Expansion:
        return arithmetic.add(self, -other) if isinstance(other, Expansion) else NotImplemented

    def __neg__(self) -> Expansion:
        return arithmetic.scale(self, -1.0)

    def __pos__(self) -> Expansion:
        return self

    def __mul__(self, factor: Any) -> Expansion:
        return NotImplemented if isinstance(factor, Expansion) else arithmetic.scale(self, factor)

    __rmul__ = __mul__

    def __truediv__(self, divisor: Any) -> Expansion:
        if isinstance(divisor, Expansion):
            return NotImplemented
        return arithmetic.scale(self, divisor, "divisor", divide=True)

    def truncated(self, terms: int) -> Expansion:
        """Return the series of the first `terms` terms.

        Raises TypeError or ValueError for `terms` that is not an integer from 1 to the terms at hand.
        """
        return arithmetic.shorten(self, checks.integer("terms", terms, 1, self.terms))

    def filtered(self, name: str) -> Expansion:
        """Return the series with coefficients damped by a filter, which quiets the oscillation that a jump leaves.

        `name` is "fejer", "lanczos", "raised cosine", "exponential" (of order 8) or "vandeven" (of order 4): factors
        s(lambda_k / lambda_{n+1}). Away from jumps the sum is then far better, beside them smoother but not closer.
        The error is measured against the profile anew. Raises TypeError or ValueError for another name, ValueError
        for a series that does not know its profile.

        >>> from fbexpand import FourierBessel, expand
        >>> e = expand(lambda r: 1.0 * (r < 0.5), FourierBessel(), terms=60, breaks=[0.5])
        >>> print(abs(e([0.2, 0.8]) - [1, 0]).round(5), abs(e.filtered("vandeven")([0.2, 0.8]) - [1, 0]).round(5))
        [0.0114  0.00248] [0. 0.]
        """
        return filters.filtered(self, name)

    def map(self, function: Callable[[Numeric], Any], terms: int) -> Expansion:
        """Return the series, of `terms` terms, of a pointwise function of the field: function(f(r)).

        `function` takes values `(*batch, m)` and returns as many, real or complex. It is resolved as it needs to be,
        so that nothing is aliased. In the error estimate of the result the truncation is measured against function(S);
        what the error of S itself changes there is the part `quadrature`.

        Raises TypeError for what cannot be called, ValueError for a result of another shape, or not finite.

        >>> from fbexpand import Dini, expand
        >>> e = expand(lambda r: 1 - r**2 / 2, Dini(robin=2.0), terms=40)
        >>> square = e.map(lambda f: f**2, 40)
        >>> print(square(0.5).round(4), (e(0.5) ** 2).round(4))
        0.7657 0.7656
        """
        return mapping.mapped(self, function, terms)

    def laplacian(self) -> Expansion:
        """Return the series of lap f = f'' + f'/r - nu^2 f/r^2: coefficients -eigenvalue_k c_k.

        It is the Laplacian of the sum. Where the profile breaks the condition at the rim, or has a jump or a
        kink, the series does not converge: a TruncationWarning says so, and its error estimate is infinite.
        """
        return laplacian.laplacian_of(self)

    @property
    def lift_residual(self) -> LiftResidual | None:
        """How the profile (less what was lifted) breaks the rim condition, and the decay of coefficients to expect.

        None for a series made from coefficients alone, a sum of series, or a basis whose rim condition is not known.
        """
        return questions.lift_residual_of(self)

    # -- errors
    # ------------------------------------------------------------------------------------------------

    def partial_sum(self, r: ArrayLike, terms: int | None = None) -> PartialSum:
        """Return the sum of the first `terms` terms (all by default) at radii r, and its error there.

        `error`, of the shape of the values `(*batch, *r.shape)` and in units of f, is an envelope of |f - S|:
        the largest error within half a wave to either side, so that it does not vanish where the error
        changes sign. `source` is "residual" where f - S was measured on the profile and "law" where the decay
        of the coefficients was continued.
        """
        return questions.partial_sum(self, self._radii("r", r), arguments.as_terms(terms, self.terms))

    def error_estimate(self, terms: int | Sequence[int] | None = None) -> ErrorEstimate:
        """Return how far the sum of the first `terms` terms (all by default) is from the profile.

        Entries of shape `(*batch,)`; `terms` may be a sequence, which adds a leading axis. The L2 norm is
        sqrt(integral |f - S|^2 r dr). Where the profile is at hand, f - S itself is measured; else the decay
        of the coefficients is continued. The errors of series that were added up add.
        """
        return questions.error_estimate(self, terms)

    def terms_for(
        self,
        tol: float,
        *,
        norm: str = "l2",
        at: float | None = None,
        relative: bool = True,
        law: Any = None,
        time: float | None = None,
    ) -> Any:
        """Return the least number of terms whose error stays below `tol` from there on, shape `(*batch,)`.

        `norm` is "l2", "sup" or "at" (at the radius `at`). With `relative`, `tol` is relative to the norm of
        f: its L2 norm, or its largest modulus for "sup" and "at". It is the truncation error that counts:
        what quadrature, table and rounding add does not depend on the number of terms. Up to the terms at
        hand the errors are those of `error_estimate`; beyond, the answer is a prediction by the law of decay.

        With `law` (`Diffusion`, say) and `time` it is the field at that time that counts, and its norm: short times
        need many terms.

        Raises UnreachableError where, for some profile of the batch, no number of terms reaches `tol` (the
        sup norm beside a jump or at a rim where f does not vanish and the modes do, say).

        >>> from fbexpand import Expansion, FourierBessel
        >>> basis = FourierBessel()
        >>> k = range(1, 31)
        >>> e = Expansion(basis, [1.0 / n**5 for n in k])
        >>> int(e.terms_for(1e-3))
        3
        """
        return questions.terms_for(self, tol, norm, at, relative, law, time)

    def _radii(self, name: str, r: Any) -> FloatArray:
        return arguments.as_radii(name, r, float(self.basis.radius))

    def _interval(self, a: Any, b: Any) -> tuple[float, float]:
        rim = float(self.basis.radius)
        low = min(float(self._radii("a", checks.finite("a", a))), rim)
        high = rim if b is None else min(float(self._radii("b", checks.finite("b", b))), rim)
        return low, high


MOST_DERIVATIVES = 32


def _shaped(values: Numeric, r: FloatArray) -> Any:
    """Give values (*batch, m) the shape (*batch, *r.shape); a NumPy scalar where that is ()."""
    return values.reshape((*values.shape[:-1], *r.shape))[()]
