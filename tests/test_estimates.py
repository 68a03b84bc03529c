"""Error estimates against true errors: never below, not far above, over a family of profiles."""

from __future__ import annotations

import numpy as np
import pytest
from series_helpers import PROFILES, coefficients_of, measured_series, resolve, true_errors

from fbexpand.bases import FourierBessel
from fbexpand.estimates.cells import MOST_CELLS, cells_of
from fbexpand.expansion import Expansion, stack

ORDERS = [0.0, 0.3, 1.0, 2.5]
CASES = [(n, order, terms) for n in PROFILES for order in ORDERS for terms in (8, 50) if n != "ripples"]


@pytest.mark.parametrize(("name", "order", "terms"), CASES)
def test_measured_errors_hold_and_are_close(name, order, terms):
    e = measured_series(name, FourierBessel(order, 1.5), terms)
    cuts = [1, terms // 2, terms]
    found = e.error_estimate(cuts)
    assert found.source == "residual"
    for i, cut in enumerate(cuts):
        l2, sup, _, _ = true_errors(name, e, cut)
        assert (1 - 1e-5) * l2 <= found.l2[i] <= 1.05 * l2 + 1e-14
        assert sup <= found.sup[i] <= 1.1 * sup + 1e-13
    np.testing.assert_array_equal(
        found.l2, found.truncation + found.quadrature + found.table + found.rounding
    )


@pytest.mark.parametrize(("name", "order", "terms"), CASES)
def test_measured_envelope_holds_and_does_not_vanish(name, order, terms):
    e = measured_series(name, FourierBessel(order, 1.5), terms)
    _, _, r, error = true_errors(name, e)
    for step in (1, max(1, r.size // 5)):  # many radii and few take different roads
        sums = e.partial_sum(r[::step])
        assert sums.source == "residual"
        np.testing.assert_array_equal(sums.values, e(r[::step]))
        assert np.all(error[::step] <= sums.error)
    # within half a wave of any radius some point comes near the envelope
    width = 1.5 * np.pi / e.basis.roots(1, terms)[0]
    envelope = e.partial_sum(r).error
    for i in range(0, r.size, max(1, r.size // 40)):
        near = np.abs(r - r[i]) <= 1.25 * width
        assert envelope[i] <= 1.2 * error[near].max() + 1e-13


def test_the_gaussian_at_the_level_of_rounding():
    """Far more terms than the smooth part needs: what is left is the defect at the rim, exp(-20) = 2e-9."""
    e = measured_series("gaussian", FourierBessel(0.0), 150)
    l2, sup, _, _ = true_errors("gaussian", e)
    found = e.error_estimate()
    assert l2 <= found.l2 <= 1.01 * l2
    assert sup <= found.sup <= 1.1 * sup


def test_a_profile_that_varies_faster_than_the_modes_at_hand():
    basis = FourierBessel(0.0)
    for terms in (1, 2, 5):
        c = coefficients_of(*PROFILES["ripples"], basis, max(terms, 60))[:terms]
        e = Expansion._make(basis, c, panels=resolve(*PROFILES["ripples"]))
        l2, sup, r, error = true_errors("ripples", e)
        found = e.error_estimate()
        assert (1 - 1e-5) * l2 <= found.l2 <= 1.02 * l2
        assert sup <= found.sup <= 1.1 * sup
        assert np.all(error[::9] <= e.partial_sum(r[::9]).error)


@pytest.mark.parametrize("name", ["step", "two jumps", "one", "spot"])
def test_sup_at_a_jump_is_at_least_half_of_it(name):
    half = {"step": 0.5, "two jumps": 0.75, "one": 1.0, "spot": 0.5}[name]
    for terms in (5, 33, 120):
        assert measured_series(name, FourierBessel(0.0), terms).error_estimate().sup >= half


def test_the_break_itself_counts_from_both_sides():
    e = measured_series("step", FourierBessel(0.0), 40)
    value = e(0.4)
    assert e.partial_sum(0.4).error >= max(abs(value), abs(1 - value))
    assert e.partial_sum([0.0, 0.4]).error[1] >= max(abs(value), abs(1 - value))


def test_batches_of_unlike_profiles_do_not_disturb_each_other():
    basis = FourierBessel(0.0)
    names = ["bump", "step", "gaussian"]
    alone = [measured_series(name, basis, 30) for name in names]
    together = stack(alone)
    ours, r = together.error_estimate([3, 30]), np.linspace(0, 1, 41)
    for i, e in enumerate(alone):
        theirs = e.error_estimate([3, 30])
        np.testing.assert_allclose(ours.l2[:, i], theirs.l2, rtol=1e-2, atol=1e-15)
        np.testing.assert_allclose(ours.sup[:, i], theirs.sup, rtol=5e-2, atol=1e-14)
        np.testing.assert_allclose(
            together.partial_sum(r).error[i], e.partial_sum(r).error, rtol=5e-2, atol=1e-14
        )
        np.testing.assert_allclose(together[i].error_estimate().l2, ours.l2[1, i], rtol=1e-9, atol=1e-16)
    assert ours.source == "residual"
    np.testing.assert_allclose(together[::-1].error_estimate().l2, ours.l2[1, ::-1], rtol=1e-9, atol=1e-16)


def test_zero_profiles_have_no_error_and_no_warnings():
    basis = FourierBessel(0.0)
    zero = Expansion._make(basis, [0.0], panels=resolve(np.zeros_like, [0, 1]))
    mixed = stack([zero, measured_series("bump", basis, 12)])
    for e in (zero, Expansion(basis, np.zeros(20)), mixed[0]):
        found = e.error_estimate()
        assert found.l2 == found.sup == found.truncation == 0.0
        assert np.all(e.partial_sum([0.0, 0.5]).error == 0.0)
        assert e.terms_for(1e-3) == 1
        assert e.terms_for(1e-3, norm="sup") == 1
        assert e.norm() == e.integral() == 0.0
        assert "zero" in repr(e)
    assert mixed.error_estimate().l2[0] == 0.0
    assert mixed.error_estimate().l2[1] > 0.0


def test_complex_profiles_by_modulus():
    basis = FourierBessel(0.3)
    first, second = measured_series("step", basis, 30), measured_series("kink", basis, 30)
    edges = [0, 0.4, 0.5, 1]

    def profile(x):
        return PROFILES["step"][0](x) + 1j * PROFILES["kink"][0](x)

    c = first.coefficients + 1j * second.coefficients
    e = Expansion._make(basis, c, panels=resolve(profile, edges))
    r = np.linspace(0, 1, 5003)
    error = np.abs(profile(r) - e(r))
    found = e.error_estimate()
    assert np.hypot(first.error_estimate().l2, second.error_estimate().l2) == pytest.approx(
        found.l2, rel=1e-3
    )
    assert error.max() <= found.sup <= 1.1 * error.max()
    assert np.all(error <= e.partial_sum(r).error)
    assert e.imag.error_estimate().l2 == pytest.approx(second.error_estimate().l2, rel=1e-3)
    assert e.conj().error_estimate().l2 == pytest.approx(found.l2, rel=1e-12)
    assert e.real.error_estimate().source == "residual"


def test_parts_and_what_came_with_the_coefficients():
    basis = FourierBessel(0.0)
    profile, edges = PROFILES["bump"]
    c = coefficients_of(profile, edges, basis, 30)
    e = Expansion._make(basis, c, panels=resolve(profile, edges), quadrature=3e-9, table=2e-6, evaluations=24)
    found = e.error_estimate()
    assert (found.quadrature, found.table, e.evaluations) == (3e-9, 2e-6, 24)
    assert found.l2 >= 2e-6 + 3e-9
    assert found.sup >= 2e-6 * np.sqrt(2.0)
    assert 0.0 < found.rounding < 1e-14
    scaled = (-2.0 * e).error_estimate()
    assert (scaled.quadrature, scaled.table) == (6e-9, 4e-6)
    assert scaled.truncation == pytest.approx(2 * found.truncation, rel=1e-9)
    blurred = Expansion._make(basis, c, panels=resolve(profile, edges, residual=1e-7)).error_estimate()
    assert blurred.quadrature == pytest.approx(1e-7 / np.sqrt(2.0), rel=1e-12)
    assert blurred.sup >= 1e-7


def test_errors_of_a_sum_add():
    basis = FourierBessel(0.0)
    a, b = measured_series("kink", basis, 30), measured_series("waves", basis, 20)
    total = (a - 2 * b).error_estimate()
    assert total.source == "residual"
    assert total.l2 == pytest.approx(a.error_estimate().l2 + 2 * b.error_estimate().l2, rel=1e-9)
    assert total.sup == pytest.approx(a.error_estimate().sup + 2 * b.error_estimate().sup, rel=1e-9)
    r = np.linspace(0, 1, 31)
    np.testing.assert_allclose(
        (a + b).partial_sum(r).error, a.partial_sum(r).error + b.partial_sum(r).error, rtol=1e-9
    )
    bare = Expansion(basis, b.coefficients)
    assert (a + bare).error_estimate().source == "law"
    assert (a + bare).partial_sum(r).source == "law"
    assert (a + b).truncated(10).error_estimate().source == "residual"
    many = a
    for _ in range(40):  # long sums are judged by their coefficients
        many = many + a
    assert many.error_estimate().source == "law"
    assert many.error_estimate().l2 >= 41 * true_errors("kink", a)[0]


@pytest.mark.parametrize("order", [0.0, 0.3, 1.0, 2.5])
@pytest.mark.parametrize("name", ["parabola", "one", "step", "kink", "bump", "two jumps", "cubic"])
def test_the_law_alone_is_near_the_truth(name, order):
    """With 60 coefficients and no profile: l2 within [1, 5], sup within [1, 40] times the truth."""
    basis = FourierBessel(order)
    e = Expansion(basis, coefficients_of(*PROFILES[name], basis, 60))
    l2, sup, r, error = true_errors(name, e)
    found = e.error_estimate()
    assert found.source == "law"
    assert l2 <= found.l2 <= 5.0 * l2
    assert sup <= found.sup <= 40.0 * sup
    sums = e.partial_sum(r[::7])
    assert sums.source == "law"
    assert np.mean(sums.error >= error[::7]) >= 0.95


def test_few_coefficients_have_no_law_but_an_estimate():
    found = Expansion(FourierBessel(0.0), [1.0, 0.5]).error_estimate()
    assert found.source == "law"
    assert 0.1 < found.l2 < 2.0
    assert 0.1 < found.sup < 10.0


def test_coefficients_that_do_not_fall_have_no_finite_error():
    basis = FourierBessel(0.0)
    e = Expansion(basis, 1.0 / np.sqrt(basis.norms(50)))
    found = e.error_estimate()
    assert found.l2 == np.inf
    assert found.sup == np.inf
    assert np.all(e.partial_sum([0.0, 0.3, 0.9]).error == np.inf)


def test_the_sup_alone_is_no_smaller_than_the_l2_error_allows():
    """Coefficients that still rise at order 20: the last of them show a thousandth of what is left."""
    basis = FourierBessel(20.0)
    b = np.exp(0.4 * np.arange(12))
    found = Expansion(basis, b / np.sqrt(basis.norms(12))).error_estimate([6, 12])
    assert np.all(found.sup >= np.sqrt(2.0) * found.l2)


def test_estimates_do_not_overflow():
    basis = FourierBessel(0.0)
    base = measured_series("step", basis, 30)
    for size in (1e-290, 1e290):
        found, plain = (size * base).error_estimate(), base.error_estimate()
        assert found.l2 == pytest.approx(size * plain.l2, rel=1e-9)
        assert found.sup == pytest.approx(size * plain.sup, rel=1e-9)
        law = Expansion(basis, size * base.coefficients).error_estimate().l2
        assert law == pytest.approx(size * Expansion(basis, base.coefficients).error_estimate().l2, rel=1e-9)


def test_sampled_cells_stand_for_all():
    basis = FourierBessel(0.0)
    edges = np.array([0.0, 0.4, 1.0])
    all_of_them, some = cells_of(basis, edges, 2000, 10**9), cells_of(basis, edges, 2000)
    assert some.sampled
    assert not all_of_them.sampled
    assert some.low.size < MOST_CELLS / 2
    assert some.share.sum() == all_of_them.low.size
    for cells in (some, all_of_them):
        assert cells.low.min() == 0.0
        assert cells.high.max() == 1.0
        assert np.all((cells.high <= 0.4) == (cells.panel == 0))
    smooth = 1.0 + some.radii() ** 2
    assert np.sum(some.weights() * smooth) == pytest.approx(0.75, rel=1e-2)


@pytest.mark.parametrize("panels", [True, False])
def test_many_numbers_of_terms_at_once(panels):
    """Few and many take different roads."""
    e = measured_series("kink", FourierBessel(0.3), 50)
    e = stack([e, -3.0 * e]) if panels else Expansion(e.basis, stack([e, -3.0 * e]).coefficients)
    every = e.error_estimate(range(1, 51))
    assert every.l2.shape == every.sup.shape == (50, 2)
    cuts = [50, 1, 17, 17]
    some = e.error_estimate(cuts)
    for name in ("l2", "sup", "truncation", "quadrature", "rounding"):
        picked = getattr(every, name)[np.array(cuts) - 1]
        np.testing.assert_allclose(picked, getattr(some, name), rtol=1e-9, atol=1e-16)


GRADED = np.concatenate(([0.0], 2.0 ** -np.arange(52.0, -1.0, -1.0)))


@pytest.mark.parametrize(
    ("profile", "unbounded"),
    [
        (lambda x: np.maximum(x, 1e-300) ** -0.5, True),
        (lambda x: np.log(np.maximum(x, 1e-300)), True),
        (lambda x: x**0.3, False),
        (lambda x: 1 - np.sqrt(x), False),
        (lambda x: np.ones_like(x), False),
    ],
)
def test_unbounded_profiles_have_no_finite_sup(profile, unbounded):
    for edges, turned in ((GRADED, profile), (1.0 - GRADED[::-1], lambda x: profile(1.0 - x))):
        basis = FourierBessel(0.0)
        c = np.stack([coefficients_of(turned, edges, basis, 20)] * 2)
        c[1] = 0.0
        panels = resolve(lambda x, f=turned: np.stack([f(x), 0.0 * x]), edges)
        found = Expansion._make(basis, c, panels=panels).error_estimate()
        assert np.isinf(found.sup[0]) == unbounded
        assert found.sup[1] == 0.0
        assert np.all(np.isfinite(found.l2))
