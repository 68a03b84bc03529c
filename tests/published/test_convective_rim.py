"""The convective rim, order 0: x J_1(x) = Bi J_0(x).

Çengel, Heat Transfer, table of the one-term approximation, column of the cylinder: lambda_1 and A_1 to four
digits, A_1 the first coefficient of f = 1. The longer values were computed in ball arithmetic.
"""

from __future__ import annotations

import numpy as np
import pytest
from flint import arb, ctx
from scipy.special import j1

from fbexpand.bases import Dini

ONE_TERM = {
    0.01: (0.1412, 1.0025),
    0.1: (0.4417, 1.0246),
    0.5: (0.9408, 1.1143),
    1.0: (1.2558, 1.2071),
    2.0: (1.5995, 1.3384),
    5.0: (1.9898, 1.5029),
    10.0: (2.1795, 1.5677),
}
COMPUTED = {
    1.0: (1.2557837117945935219, 1.20709205839185988),
    100.0: (2.3809016634910468, 1.60152387405746796),
}
EPS = 2.0**-52


def first_coefficient(basis):
    """Of f = 1: the integral of J_0(lambda r) r dr is J_1(lambda) / lambda."""
    root = basis.roots(1)[0]
    return j1(root) / root / basis.norms(1)[0]


@pytest.mark.parametrize("biot", sorted(ONE_TERM))
def test_one_term_table(biot):
    basis = Dini(robin=biot)
    root, coefficient = ONE_TERM[biot]
    # the table prints 1.5995 for 1.59945 - 0.8e-6: rounded twice, it seems
    assert abs(basis.roots(1)[0] - root) <= (0.51e-4 if biot == 2.0 else 0.5001e-4)
    assert abs(first_coefficient(basis) - coefficient) <= 0.5001e-4


@pytest.mark.parametrize("biot", sorted(COMPUTED))
def test_computed(biot):
    basis = Dini(robin=biot)
    root, coefficient = COMPUTED[biot]
    assert abs(basis.roots(1)[0] - root) <= 2 * EPS * root
    assert abs(first_coefficient(basis) - coefficient) <= 8 * EPS * coefficient


def test_computed_anew():
    """The same two numbers from ball arithmetic: the root enclosed by a change of sign."""
    ctx.prec = 120
    for biot, (root, coefficient) in COMPUTED.items():
        digits = 1e-15 * root

        def residual(x, biot=biot):
            return x * x.bessel_j(arb(1)) - arb(biot) * x.bessel_j(arb(0))

        assert residual(arb(root) - digits) < 0
        assert residual(arb(root) + digits) > 0
        x = arb(root)
        exact = 2 * x.bessel_j(arb(1)) / (x * (x.bessel_j(arb(0)) ** 2 + x.bessel_j(arb(1)) ** 2))
        assert abs(float(exact) - coefficient) < 2e-15


def test_roots_of_biot_one():
    expected = [1.2557837117945935219, 4.079477710797353323, 7.1557991746439808202]
    np.testing.assert_allclose(Dini(robin=1.0).roots(3), expected, rtol=2 * EPS)


def test_growing_mode_of_biot_minus_one():
    """mu I_1(mu) = I_0(mu), then real roots (computed)."""
    basis = Dini(robin=-1.0)
    expected = [1.6082794717268792669, 3.56794936120787752, 6.87257243025186326]
    np.testing.assert_allclose(basis.roots(3), expected, rtol=2 * EPS)
    assert basis.growing
    assert basis.eigenvalues(1)[0] == pytest.approx(-(expected[0] ** 2), rel=4 * EPS)
