"""The basis of profiles with a Robin condition at the rim."""

from __future__ import annotations

from dataclasses import dataclass, field
from fractions import Fraction
from typing import ClassVar

from fbexpand import checks
from fbexpand.bases.radial import RadialBasis


@dataclass(frozen=True, eq=False)
class Dini(RadialBasis):
    """The basis of R f'(R) + robin f(R) = 0: phi_k(r) = J_order(lambda_k r / R), and one exception.

    lambda_k are the roots of x J'_order(x) + robin J_order(x), ascending. Where robin < 0 the first mode is
    scaled to 1 at the rim, x = r/R: J_order(lambda x) / J_order(lambda), x^order or I_order(mu x) /
    I_order(mu), as its eigenvalue (lambda/R)^2, 0 or -(mu/R)^2 is positive, zero or negative, that is as
    robin + order is; decided by exact comparison. Weight r dr on [0, R]. `robin` is any finite real number,
    without unit (the Biot number h R / k of heat conduction). `.roots`, `.eigenvalues`, `.norms` have shape
    `(count,)`, `.modes` `(*r.shape, count)`; `.roots` gives mu for a negative eigenvalue. `==` is identity.

    Raises TypeError for what is no real number (a complex robin, say), ValueError for an order below 0, a
    radius that is not positive, and for any of them if not finite.

    DLMF 10.22.38 (norms), 10.23.19 (expansion), from memory.

    >>> from fbexpand.bases import Dini
    >>> basis = Dini(robin=1.0)
    >>> basis
    Dini(order=0.0, radius=1.0, robin=1.0)
    >>> print(basis.roots(3))
    [1.25578371 4.07947771 7.15579917]
    >>> steep = Dini(robin=-1.0)
    >>> print(steep.growing, steep.eigenvalues(2))
    True [-2.58656286 12.73026264]
    """

    order: float = 0.0
    radius: float = 1.0
    robin: float = field(kw_only=True)

    _names: ClassVar[tuple[str, ...]] = ("order", "radius", "robin")

    def __post_init__(self) -> None:
        self._check()
        object.__setattr__(self, "robin", checks.finite("robin", self.robin) + 0.0)

    @property
    def _condition(self) -> float:
        return self.robin

    @classmethod
    def neumann(cls, order: float = 0.0, radius: float = 1.0) -> Dini:
        """Return the basis of f'(R) = 0. At order 0 its first mode is the constant 1, with eigenvalue 0.

        >>> print(Dini.neumann().roots(2))
        [0.         3.83170597]
        """
        return cls(order, radius, robin=0.0)

    @classmethod
    def from_transfer(
        cls, coefficient: float, conductivity: float, radius: float, *, order: float = 0.0
    ) -> Dini:
        """Return the basis of conductivity f'(R) + coefficient f(R) = 0.

        robin = coefficient R / conductivity. Any units in which the three agree (W/(m^2 K), W/(m K) and m,
        say). Raises as `Dini`, ValueError for a conductivity that is not positive, and where robin overflows.

        >>> Dini.from_transfer(50.0, 0.5, 0.02)
        Dini(order=0.0, radius=0.02, robin=2.0)
        """
        coefficient = checks.finite("coefficient", coefficient)
        conductivity = checks.positive("conductivity", conductivity)
        radius = checks.positive("radius", radius)
        try:  # rounded once
            robin = float(Fraction(coefficient) * Fraction(radius) / Fraction(conductivity))
        except OverflowError:
            what = "small enough for a finite coefficient * radius / conductivity"
            raise checks.value_error("coefficient", what, coefficient) from None
        return cls(order, radius, robin=robin)
