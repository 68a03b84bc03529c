"""How many terms a tolerance takes: against a search by hand, and by prediction against longer series."""

from __future__ import annotations

import warnings

import numpy as np
import pytest
from series_helpers import PROFILES, measured_series, true_errors

from fbexpand.analysis import expand
from fbexpand.bases import Dini, FourierBessel
from fbexpand.estimates.defects import defect_tail
from fbexpand.exceptions import TruncationWarning, UnreachableError
from fbexpand.expansion import Expansion, stack

BASIS = FourierBessel(0.0)
SMOOTH = ["parabola", "bump", "kink", "waves", "cubic"]


@pytest.mark.parametrize("name", SMOOTH)
@pytest.mark.parametrize("tol", [1e-1, 1e-2, 1e-3])
def test_l2_by_hand(name, tol):
    e = measured_series(name, BASIS, 60)
    whole = np.sqrt(e.norm() ** 2 + true_errors(name, e)[0] ** 2)
    n = int(e.terms_for(tol))
    if n > e.terms:
        assert true_errors(name, e)[0] > tol * whole * (1 - 1e-3)
        return
    assert true_errors(name, e, n)[0] <= tol * whole * (1 + 1e-6)
    assert n == 1 or true_errors(name, e, n - 1)[0] > tol * whole * (1 - 1e-3)
    assert e.terms_for(tol * whole, relative=False) == n


@pytest.mark.parametrize("name", SMOOTH)
@pytest.mark.parametrize("tol", [1e-1, 1e-2])
def test_sup_by_hand(name, tol):
    e = measured_series(name, BASIS, 60)
    n = int(e.terms_for(tol, norm="sup", relative=False))
    if n > e.terms:
        assert true_errors(name, e)[1] > 0.95 * tol
        return
    for later in range(n, min(n + 12, e.terms) + 1):
        assert true_errors(name, e, later)[1] <= tol
    assert n == 1 or true_errors(name, e, n - 1)[1] > 0.95 * tol
    profile, _ = PROFILES[name]
    largest = np.abs(profile(np.linspace(0, 1, 2001))).max()
    assert e.terms_for(tol / largest, norm="sup") == n


def test_at_a_radius_the_error_stays_below():
    e = measured_series("step", BASIS, 60)
    errors = np.array([abs(e.truncated(n)(0.7)) for n in range(1, 61)])  # f(0.7) = 0
    n = int(e.terms_for(0.02, norm="at", at=0.7, relative=False))
    assert errors[n - 1 :].max() <= 0.02
    assert errors[n - 2] > 0.02
    assert errors[: n - 1].min() < 0.02  # it dips below earlier, and comes back


def test_beyond_the_terms_at_hand_by_the_law():
    for name, lowest, highest in (
        ("parabola", 0.9, 1.1),
        ("kink", 0.6, 1.7),
        ("one", 0.99, 1.01),
        ("step", 0.98, 1.02),
    ):
        short, long = measured_series(name, BASIS, 40), measured_series(name, BASIS, 400)
        tol = float(long.error_estimate(300).truncation)
        for e in (short, Expansion(BASIS, short.coefficients)):
            n = int(e.terms_for(tol, relative=False))
            assert n > 40
            if e is short:
                assert lowest * 300 <= n <= highest * 300, (name, n)


def test_a_small_defect_under_a_smooth_part_is_foreseen():
    """exp(-20 r^2) is 2e-9 at the rim: the error falls as k^-1/2 long after what ten terms show."""
    short, long = measured_series("gaussian", BASIS, 12), measured_series("gaussian", BASIS, 300)
    tol = float(long.error_estimate(250).truncation)
    assert 240 <= short.terms_for(tol, relative=False) <= 260


@pytest.mark.parametrize(
    ("name", "order"),
    [(name, order) for name in ("one", "step", "two jumps") for order in (0.0, 0.3, 1.0, 2.5)]
    + [("parabola", 0.3), ("parabola", 1.0), ("parabola", 2.5)],  # at order 0 it has no defect
)
def test_known_tails_against_measured_ones(name, order):
    basis = FourierBessel(order, 1.5)
    e = measured_series(name, basis, 120)
    tail = defect_tail(basis, e._origins[0].panels, 40)
    for terms in (60, 120):
        assert tail(terms)[0] == pytest.approx(float(e.error_estimate(terms).truncation), rel=0.06)


@pytest.mark.parametrize("robin", [0.5, 3.0, 200.0])
def test_known_tails_of_a_broken_robin_condition(robin):
    basis = Dini(0.0, 1.5, robin=robin)
    e = measured_series("one", basis, 120)
    tail = defect_tail(basis, e._origins[0].panels, 40)
    for terms in (60, 120):
        assert tail(terms)[0] == pytest.approx(float(e.error_estimate(terms).truncation), rel=0.06)


def test_jumps_and_rims_that_do_not_vanish_are_out_of_reach():
    for name, floor in (("one", 1.0), ("step", 0.5), ("two jumps", 0.75)):
        e = measured_series(name, BASIS, 40)
        with pytest.raises(UnreachableError, match="sup"):
            e.terms_for(0.9 * floor, norm="sup", relative=False)
        with pytest.raises(UnreachableError):
            Expansion(BASIS, e.coefficients).terms_for(0.1, norm="sup")
        assert e.terms_for(1e-2) > 40  # in L2 it can be done
    assert issubclass(UnreachableError, ValueError)


def test_a_profile_that_does_not_vanish_on_the_axis_where_the_modes_do():
    e = measured_series("parabola", FourierBessel(1.0), 40)
    with pytest.raises(UnreachableError):
        e.terms_for(0.5, norm="sup")


def test_below_rounding_is_out_of_reach():
    e = measured_series("bump", BASIS, 200)
    with pytest.raises(UnreachableError):
        Expansion(BASIS, [*np.exp(-np.arange(60.0)), *np.zeros(3)]).terms_for(1e-25)
    with pytest.raises(UnreachableError):
        measured_series("waves", BASIS, 20).terms_for(1e-30)
    assert e.terms_for(1e-9) < 200


def test_a_batch_answers_for_every_profile():
    e = stack([measured_series(name, BASIS, 50) for name in ("bump", "kink", "cubic")])
    n = e.terms_for(1e-2)
    assert n.shape == (3,)
    assert n.dtype == np.int64
    for norm in ("l2", "sup"):
        together = e.terms_for(2e-2, norm=norm)
        for i in range(3):
            assert abs(int(e[i].terms_for(2e-2, norm=norm)) - int(together[i])) <= 1
    assert isinstance(e[0].terms_for(1e-2), np.integer)


def test_sums_of_series():
    a, b = measured_series("bump", BASIS, 50), measured_series("kink", BASIS, 30)
    n = int((a + b).terms_for(1e-2, relative=False))
    errors = [a.error_estimate(m).l2 + b.error_estimate(min(m, 30)).l2 for m in (n - 1, n)]
    assert errors[1] <= 1e-2 < errors[0] * (1 + 1e-9)


@pytest.mark.parametrize("basis", [FourierBessel(), FourierBessel(0.3), Dini(robin=1.0), Dini(1.0, robin=-4.0)])
@pytest.mark.parametrize("tol", [1e-1, 1e-2, 1e-3, 1e-5])
def test_expand_and_terms_for_agree(basis, tol):
    """The terms that `expand` takes for a tolerance are those that `terms_for` names, and the estimate is below it."""

    def profile(r):
        return np.stack((np.exp(-9 * r**2) * r, (1 - r**2) * np.cos(9 * r), 1e-3 * np.sqrt(r)))

    with warnings.catch_warnings():
        warnings.simplefilter("ignore", TruncationWarning)
        e = expand(profile, basis, tol=tol, max_terms=2000)
    left = e.error_estimate().truncation
    norm = np.hypot(e.norm(), left)
    done = left <= tol * norm * (1 + 1e-12)
    if e.terms < 2000:
        assert done.all()
    needed = np.array([int(one.terms_for(tol)) for one in e])
    assert np.all((needed <= e.terms) == done)
    assert needed.max() == e.terms or e.terms == 2000


@pytest.mark.parametrize("scale", [1e-250, 1e-160, 1e160, 1e250])
def test_estimates_neither_over_nor_underflow(scale):
    basis = Dini(robin=1.0)
    one = expand(lambda r: np.sqrt(r), basis, terms=30).error_estimate()
    other = expand(lambda r: scale * np.sqrt(r), basis, terms=30).error_estimate()
    for name in ("l2", "sup", "truncation"):
        assert getattr(other, name) == pytest.approx(scale * getattr(one, name), rel=1e-6)
    assert other.quadrature <= 1e-10 * other.l2


@pytest.mark.parametrize("basis", [FourierBessel(0.3), Dini(robin=1.0), Dini(1.0, robin=-4.0), Dini(0.3, robin=-2.0)])
@pytest.mark.parametrize("name", ["waves", "kink", "step", "batch"])
def test_they_agree_also_where_the_tolerance_is_next_to_an_error(basis, name):
    """Large errors count: there the norm of the sum and what it misses add up to the profile's norm."""
    breaks = {"kink": [0.5], "step": [0.4]}.get(name, [])

    def profile(r):
        return np.stack((1 - r**2, r**3, np.exp(-3 * r))) if name == "batch" else PROFILES[name][0](r)

    norm = expand(profile, basis, terms=1, breaks=breaks)._origins[0].panels.norm()
    errors = expand(profile, basis, terms=200, breaks=breaks).error_estimate([1, 2, 3, 9, 20, 64]).truncation
    for error in errors:
        for shift in (-1e-3, -1e-8, 1e-8, 1e-5, 1e-3):
            tol = float(np.max(error / norm)) * (1 + shift)
            e = expand(profile, basis, tol=tol, breaks=breaks, max_terms=1000)
            assert np.all(e.error_estimate().truncation <= tol * norm * (1 + 1e-14)), tol
            assert np.max(e.terms_for(tol)) == e.terms, tol
