"""Tables: what lies between their radii, exact integrals of it, how far it may be from the truth, refusals."""

from __future__ import annotations

import pickle
from itertools import pairwise

import numpy as np
import pytest
from scipy.integrate import quad
from scipy.interpolate import CubicSpline, PchipInterpolator
from scipy.special import jv

from fbexpand.analysis import expand
from fbexpand.bases import Dini, FourierBessel
from fbexpand.exceptions import ArgumentTypeError, ArgumentValueError
from fbexpand.profiles.table import RadialTable, place

EPS = 2.0**-52
KINDS = ("cubic", "linear", "monotone")


def grids(seed=4):
    """Uniform, random, dense at either end, and short ones."""
    rng = np.random.default_rng(seed)
    yield "uniform", np.linspace(0.0, 1.0, 41)
    yield "random", np.sort(np.concatenate(([0.0, 1.0], rng.random(60))))
    yield "dense at the axis", np.concatenate(([0.0], 1.5 ** -np.arange(40.0, -1.0, -1.0)))
    yield "dense at the rim", np.concatenate((1.0 - 1.3 ** -np.arange(60.0), [1.0]))
    for m in (4, 5, 7):
        yield f"{m} radii", np.linspace(0.0, 1.0, m) ** 1.5


def resolved(r, values, order=0.0, radius=1.0, **options):
    return place(RadialTable(r, values, **options), order, radius)[0]


def inside(r, seed=9):
    """Radii in every cell."""
    share = np.random.default_rng(seed).random((7, r.size - 1))
    return np.sort((r[:-1] + np.diff(r) * share).ravel())


@pytest.mark.parametrize("order", [0.0, 1.0, 2.0, 7.0, 0.3, 2.5])
def test_cubic_is_the_spline_with_these_ends(order):
    ends = {0: ((1, 0.0), "not-a-knot"), 1: ((2, 0.0), "not-a-knot")}
    for name, r in grids():
        values = np.random.default_rng(r.size).standard_normal(r.size)
        if order % 2 == 1:
            values[0] = 0.0
        spline = CubicSpline(r, values, bc_type=ends[int(order) % 2] if order % 1 == 0 else "not-a-knot")
        at = inside(r)
        assert np.abs(resolved(r, values, order)(at) - spline(at)).max() <= 1e-13 * np.abs(spline(at)).max(), name


def test_odd_order_with_a_value_on_the_axis():
    r = np.linspace(0.0, 1.0, 31)
    values = np.exp(r)
    spline = CubicSpline(r, values, bc_type=((2, 0.0), "not-a-knot"))
    at = inside(r)
    np.testing.assert_allclose(resolved(r, values, 1.0)(at), spline(at), rtol=0, atol=1e-14)


@pytest.mark.parametrize("order", [0.0, 1.0])
def test_monotone_is_that_of_the_mirrored_table(order):
    sign = 1.0 if order == 0.0 else -1.0
    for name, r in grids():
        values = np.random.default_rng(r.size).standard_normal(r.size).cumsum()
        if order == 1.0:
            values[0] = 0.0
        whole = PchipInterpolator(np.concatenate((-r[:0:-1], r)), np.concatenate((sign * values[:0:-1], values)))
        at = inside(r)
        found = resolved(r, values, order, between="monotone")(at)
        assert np.abs(found - whole(at)).max() <= 1e-13 * np.abs(values).max(), name


@pytest.mark.parametrize("order", [0.0, 1.0, 0.3])
def test_monotone_does_not_overshoot(order):
    rng = np.random.default_rng(8)
    r = np.sort(np.concatenate(([0.0, 1.0], rng.random(50))))
    values = np.sort(rng.random(r.size))
    at = inside(r)
    found = resolved(r, values, order, between="monotone")(at)
    assert np.diff(found).min() >= -4 * EPS
    cell = np.searchsorted(r, at, side="right") - 1
    assert np.all(found >= values[cell] - 4 * EPS)
    assert np.all(found <= values[cell + 1] + 4 * EPS)


def test_linear():
    r = np.array([0.0, 0.1, 0.7, 1.0])
    values = np.array([1.0, -2.0, 0.5, 3.0])
    at = inside(r)
    np.testing.assert_allclose(resolved(r, values, between="linear")(at), np.interp(at, r, values), rtol=0, atol=1e-15)


@pytest.mark.parametrize("between", KINDS)
def test_knots_are_met(between):
    for name, r in grids():
        values = np.random.default_rng(1).standard_normal((2, 3, r.size)) + 1j
        panels = resolved(r, values, between=between)
        assert panels(r).shape == (2, 3, r.size)
        assert np.abs(panels(r) - values).max() <= 8 * EPS * np.abs(panels.coefficients).max(), name
        assert panels.evaluations == r.size


@pytest.mark.parametrize("between", KINDS)
@pytest.mark.parametrize(
    "basis", [FourierBessel(0.0), FourierBessel(0.3, 2.0), FourierBessel(7.5), Dini(1.0, 0.5, robin=2.0)], ids=repr
)
def test_integrated_exactly(between, basis):
    """Coefficients far beyond the table's own scale, by SciPy's adaptive quadrature of SciPy's Bessel functions."""
    radius = basis.radius
    r = radius * np.array([0.0, 0.11, 0.24, 0.5, 0.52, 0.83, 1.0])
    values = np.array([0.3, 1.2, -0.7, 0.4, 0.9, -0.2, 0.6])
    if basis.order == 1.0:
        values[0] = 0.0
    panels = resolved(r, values, basis.order, radius, between=between)
    series = expand(RadialTable(r, values, between=between), basis, terms=120)
    bound = 1e-12 * np.abs(series.orthonormal).max()
    roots, norms = basis.roots(120), basis.norms(120)
    for k in (1, 2, 9, 40, 120):
        root = roots[k - 1]
        cuts = np.union1d(r, np.linspace(0.0, radius, int(root / 6) + 2))
        total = sum(
            quad(
                lambda x, root=root: float(panels(np.array([x]))[0]) * jv(basis.order, root * x / radius) * x,
                *pair, epsabs=1e-15, epsrel=1e-12,
            )[0]
            for pair in pairwise(cuts)
        )  # fmt: skip
        assert abs(total / norms[k - 1] - series.coefficients[k - 1]) * np.sqrt(norms[k - 1]) <= bound, k


def test_decay_follows_the_interpolant():
    """k^-2 for a linear table, k^-3 for a monotone one, k^-4 for a cubic one, of orthonormal coefficients."""
    r = np.linspace(0.0, 1.0, 8)
    values = (1.0 - r * r) * np.cos(7.0 * r)  # zero at the rim, else that would decide
    values[-1] = 0.0
    for between, power in (("linear", 2), ("monotone", 3), ("cubic", 4)):
        b = np.abs(expand(RadialTable(r, values, between=between), FourierBessel(), terms=3000).orthonormal)
        # the rim leaves k^-3 from its broken second condition
        seen = np.log(b[200:500].max() / b[2000:3000].max()) / np.log(2000 / 200)
        assert seen == pytest.approx(min(power, 3), abs=0.35), between


class TestExtend:
    """What is continued, and what is refused."""

    r = np.linspace(0.1, 0.8, 15)

    @pytest.mark.parametrize("extend", [None, "axis", "rim"])
    def test_a_short_table_is_refused(self, extend):
        with pytest.raises(ArgumentValueError, match="'extend'") as info:
            expand(RadialTable(self.r, np.cos(self.r), extend=extend), FourierBessel(), terms=3)
        assert info.value.name == "extend"

    @pytest.mark.parametrize("order", [0.0, 1.0, 2.0, 3.0])
    def test_cubics_of_the_right_parity_are_continued_exactly(self, order):
        for f in ((lambda x: 2.0 - 3.0 * x * x),) if order % 2 == 0 else ((lambda x: x - 4.0 * x**3),):
            panels = resolved(self.r, f(self.r), order, extend="both")
            at = np.linspace(0.0, 1.0, 101)
            assert np.abs(panels(at) - f(at)).max() <= 2e-13

    def test_any_cubic_is_continued_where_there_is_no_parity(self):
        def f(x):
            return 1.0 - 2.0 * x + x * x + 3.0 * x**3

        at = np.linspace(0.0, 1.0, 101)
        assert np.abs(resolved(self.r, f(self.r), 0.3, extend="both")(at) - f(at)).max() <= 2e-13

    @pytest.mark.parametrize("between", ["linear", "monotone"])
    def test_toward_the_axis_by_parity(self, between):
        values = np.exp(self.r)
        at = np.array([0.0, 0.04, 0.1])
        even = resolved(self.r, values, 0.0, extend="both", between=between)(at)
        np.testing.assert_allclose(even, values[0], rtol=1e-14)
        odd = resolved(self.r, values, 1.0, extend="both", between=between)(at)
        assert abs(odd[0]) <= 1e-14
        assert 0.0 < odd[1] < values[0]

    def test_linear_toward_the_rim(self):
        panels = resolved(self.r, 2.0 - 3.0 * self.r, 0.5, extend="both", between="linear")
        at = np.linspace(0.0, 1.0, 11)
        np.testing.assert_allclose(panels(at), 2.0 - 3.0 * at, rtol=0, atol=1e-14)

    def test_what_is_continued_counts_as_uncertain(self):
        whole, short = np.linspace(0.0, 1.0, 41), np.linspace(0.0, 0.7, 29)
        errors = [place(RadialTable(r, np.cos(4.0 * r), extend="both"), 0.0, 1.0)[1] for r in (whole, short)]
        panels = resolved(short, np.cos(4.0 * short), extend="both")
        at = np.linspace(0.7, 1.0, 401)
        missed = np.sqrt(np.mean((panels(at) - np.cos(4.0 * at)) ** 2 * at) * 0.3)
        assert errors[1] >= missed > 10 * errors[0]

    @pytest.mark.parametrize("off", [-9e-13, 9e-13])
    def test_reaching_the_rim_but_for_rounding(self, off):
        r = 3.0 * np.linspace(0.0, 1.0, 21)
        exact = expand(RadialTable(r, np.cos(r)), FourierBessel(radius=3.0), terms=5)
        r[-1] *= 1.0 + off
        near = expand(RadialTable(r, np.cos(r)), FourierBessel(radius=3.0), terms=5)
        np.testing.assert_allclose(near.coefficients, exact.coefficients, rtol=0, atol=1e-11)

    @pytest.mark.parametrize("off", [-2e-12, 2e-12])
    def test_not_reaching_it(self, off):
        r = np.linspace(0.0, 1.0 + off, 21)
        with pytest.raises(ArgumentValueError, match="'extend'" if off < 0 else "'r'"):
            expand(RadialTable(r, np.cos(r)), FourierBessel(), terms=5)


FUNCTIONS = {
    "cos 3r": lambda r: np.cos(3 * r),
    "cos 20r": lambda r: np.cos(20 * r),
    "gaussian": lambda r: np.exp(-30 * r * r),
    "runge": lambda r: 1 / (1 + 100 * r * r),
    "kink": lambda r: np.abs(r - 0.437),
    "jump": lambda r: np.where(r < 0.437, 1.0, 0.0),
    "root": lambda r: np.sqrt(1 - r),
    "spike": lambda r: np.exp(-0.5 * ((r - 0.437) / 0.05) ** 2),
}


@pytest.mark.parametrize("between", KINDS)
@pytest.mark.parametrize("name", sorted(FUNCTIONS))
def test_table_error(between, name):
    """The part of the estimate that the table is to blame for, against the truth, where the table sees the function.

    Between its radii a table knows nothing: a jump may be anywhere in its cell. Such estimates may fall short
    by a factor of three; they are not absurdly large either.
    """
    f = FUNCTIONS[name]
    rough = name in ("jump", "kink", "root")
    x, w = np.polynomial.legendre.leggauss(20)
    rng = np.random.default_rng(12)
    for m in (40, 100, 200):
        for r in (np.linspace(0, 1, m), 0.5 - 0.5 * np.cos(np.pi * np.arange(m) / (m - 1)),
                  np.linspace(0, 1, m) + np.concatenate(([0], 0.3 * (rng.random(m - 2) - 0.5), [0])) / m):  # fmt: skip
            panels, claimed = place(RadialTable(r, f(r), between=between), 0.0, 1.0)
            cuts = np.union1d(np.union1d(r, [0.437]), 1 - 2.0 ** -np.arange(2.0, 40.0))
            half = 0.5 * np.diff(cuts)[:, None]
            at = (cuts[:-1, None] + half * (1 + x)).ravel()
            weights = (half * w).ravel() * at
            true = np.sqrt(np.sum((panels(at) - f(at)) ** 2 * weights))
            assert true <= (3.0 if rough else 1.2) * claimed, (m, true, claimed)
            assert claimed <= 40.0 * true + 1e-15, (m, true, claimed)


def test_table_error_reaches_the_estimate():
    r = np.linspace(0.0, 1.0, 21)
    scale = np.array([1.0, 1e-6])
    series = expand(RadialTable(r, scale[:, None] * np.cos(9 * r)), FourierBessel(), terms=30)
    estimate = series.error_estimate()
    assert estimate.table.shape == (2,)
    assert estimate.table[1] == pytest.approx(1e-6 * estimate.table[0], rel=1e-6)
    assert np.all(estimate.l2 >= estimate.table)
    assert estimate.table[0] > 0.0
    assert series.evaluations == 21


@pytest.mark.parametrize("between", KINDS)
def test_few_radii_do_not_claim_much(between):
    """Two or three values of a straight line say nothing about what lies between."""
    for m in (2, 3):
        r = np.linspace(0.0, 1.0, m)
        for order in (0.0, 1.0, 0.3):
            assert place(RadialTable(r, r, between=between), order, 1.0)[1] > 0.01


def test_order_of_radii_does_not_matter():
    r = np.linspace(0.0, 1.0, 21)
    shuffled = np.random.default_rng(0).permutation(21)
    values = np.stack([np.cos(r), np.sin(r)])
    first = expand(RadialTable(r, values), FourierBessel(), terms=8)
    second = expand(RadialTable(r[shuffled], values[:, shuffled]), FourierBessel(), terms=8)
    assert np.array_equal(first.coefficients, second.coefficients)


def test_complex_is_two_real_tables():
    r = np.linspace(0.0, 1.0, 21) ** 2
    a, b = np.cos(5 * r), np.exp(-r)
    for between in KINDS:
        whole = resolved(r, a + 1j * b, between=between)
        at = inside(r)
        parts = resolved(r, a, between=between)(at) + 1j * resolved(r, b, between=between)(at)
        np.testing.assert_allclose(whole(at), parts, rtol=0, atol=1e-15)


def test_tables_are_values():
    r, values = np.linspace(0.0, 1.0, 5), np.arange(5)
    table = RadialTable(r, values, between="linear")
    r[0] = 7.0  # a copy was taken
    assert table.r[0] == 0.0
    assert table.values.dtype == np.float64
    for array in (table.r, table.values):
        assert not array.flags.writeable
    with pytest.raises(AttributeError):
        table.between = "cubic"
    again = pickle.loads(pickle.dumps(table))
    assert again != table
    assert again.between == "linear"
    assert np.array_equal(again.values, table.values)
    assert not again.values.flags.writeable
    assert "5 radii" in repr(table)


@pytest.mark.parametrize(
    ("r", "values", "options", "name", "error"),
    [
        ([0, 0.5, 0.5, 1], [1, 2, 3, 4], {}, "r", ArgumentValueError),
        ([-0.1, 1], [1, 2], {}, "r", ArgumentValueError),
        ([0, np.nan], [1, 2], {}, "r", ArgumentValueError),
        ([0, np.inf], [1, 2], {}, "r", ArgumentValueError),
        ([], [], {}, "r", ArgumentValueError),
        ([0.0], [1.0], {}, "r", ArgumentValueError),
        ([[0, 1]], [1, 2], {}, "r", ArgumentValueError),
        ("text", [1, 2], {}, "r", ArgumentTypeError),
        (None, [1, 2], {}, "r", ArgumentTypeError),
        ([0j, 1], [1, 2], {}, "r", ArgumentTypeError),
        ([0, 1], [1, 2, 3], {}, "values", ArgumentValueError),
        ([0, 1], 3.0, {}, "values", ArgumentValueError),
        ([0, 1], [1, np.nan], {}, "values", ArgumentValueError),
        ([0, 1], [1, np.inf], {}, "values", ArgumentValueError),
        ([0, 1], np.ones((0, 2)), {}, "values", ArgumentValueError),
        ([0, 1], [True, False], {}, "values", ArgumentTypeError),
        ([0, 1], ["a", "b"], {}, "values", ArgumentTypeError),
        ([0, 1], [1, 2], {"between": "quadratic"}, "between", ArgumentValueError),
        ([0, 1], [1, 2], {"between": None}, "between", ArgumentTypeError),
        ([0, 1], [1, 2], {"extend": "sideways"}, "extend", ArgumentValueError),
        ([0, 1], [1, 2], {"extend": True}, "extend", ArgumentTypeError),
    ],
)
def test_bad_input(r, values, options, name, error):
    with pytest.raises(error, match=f"'{name}'") as info:
        RadialTable(r, values, **options)
    assert info.value.name == name


def test_masked_values_are_refused_not_used():
    values = np.ma.masked_array(np.ones(5), mask=[0, 1, 0, 0, 0])
    with pytest.raises(ValueError, match="'values' must be free of masked entries"):
        RadialTable(np.linspace(0, 1, 5), values)
    RadialTable(np.linspace(0, 1, 5), np.ma.masked_array(np.ones(5)))
