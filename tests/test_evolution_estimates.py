"""What evolutions say of their own error and of the terms they need, their warnings, and bad input."""

from __future__ import annotations

import pickle
import warnings

import numpy as np
import pytest
from third_basis import Sines

from fbexpand import Dini, Expansion, FourierBessel, TruncationWarning, UnreachableError, expand
from fbexpand.evolution import Diffusion, ModalLaw, Paraxial, Wave, evolve

BASIS = FourierBessel()
FOURIER = [0.2, 1e-2, 1e-3, 1e-4, 1e-5]


def ones(r):
    return np.ones_like(r)


def test_terms_for_the_disk_that_starts_at_one():
    # published counts, computed twice: L2 tail below 1e-10, and the error at the axis
    series = expand(ones, BASIS, terms=600)

    def needed(**kwargs):
        return [int(series.terms_for(1e-10, law=Diffusion(1.0), time=t, relative=False, **kwargs)) for t in FOURIER]

    assert needed() == [3, 14, 43, 134, 416]
    assert needed(norm="at", at=0.0) == [3, 15, 46, 143, 446]
    assert needed(norm="sup") == [3, 15, 46, 143, 446]


@pytest.mark.parametrize("terms", [8, 20, 100])
def test_terms_for_is_predicted_from_few_terms(terms):
    series = expand(ones, BASIS, terms=terms)
    for t, exact, at_axis in zip(FOURIER, [3, 14, 43, 134, 416], [3, 15, 46, 143, 446], strict=True):
        found = series.terms_for(1e-10, law=Diffusion(1.0), time=t, relative=False)
        assert abs(int(found) - exact) <= 1 + 0.01 * exact
        at = series.terms_for(1e-10, law=Diffusion(1.0), time=t, relative=False, norm="at", at=0.0)
        assert at_axis - 1 <= int(at) <= 1 + 1.1 * at_axis


def test_the_terms_that_are_asked_for_do():
    whole = expand(lambda r: np.where(r < 0.4, 1.0, 0.2), BASIS, terms=400, breaks=[0.4])
    for law, time in ((Diffusion(0.5), 1e-3), (Diffusion(0.5, removal=30.0), 1e-2), (Paraxial(2.0), 3.0)):
        tol = 1e-6 if isinstance(law, Diffusion) else 0.1
        n = int(whole.terms_for(tol, law=law, time=time))
        exact = np.abs(whole.orthonormal) * np.abs(evolve(Expansion(BASIS, np.ones(400)), law, time).coefficients)
        size = np.sqrt(np.sum(exact**2))
        assert np.sqrt(np.sum(exact[n:] ** 2)) <= tol * size
        assert np.sqrt(np.sum(exact[n - 1 :] ** 2)) > 0.8 * tol * size
    with pytest.raises(UnreachableError, match="at time 1"):
        whole.terms_for(1e-3, norm="sup", law=Wave(1.0), time=1.0)


@pytest.mark.parametrize("terms", [10, 20, 40])
@pytest.mark.parametrize("law", [Diffusion(1.0), Diffusion(0.3, removal=2.0), Wave(1.0, damping=3.0)], ids=repr)
def test_the_error_stated_covers_the_true_one(terms, law):
    def profile(r):
        return np.abs(r - 0.5) * (1 - r)

    exact = expand(profile, BASIS, terms=4000, breaks=[0.5])
    short = exact.truncated(terms)
    times = np.array([1e-4, 1e-3, 1e-2, 0.1])
    with warnings.catch_warnings():
        warnings.simplefilter("ignore", TruncationWarning)  # some are too short
        ev = evolve(short, law, times)
    r = np.linspace(0.0, 1.0, 801)
    off = np.sqrt(np.sum((evolve(exact, law, times).expansion.orthonormal[:, terms:]) ** 2, axis=1))
    stated = ev.expansion.error_estimate()
    assert stated.source == "law"
    assert np.all(off <= stated.l2)
    worth = off > 1e-13
    assert np.all(stated.truncation[worth] <= 12.0 * off[worth])
    sup = np.abs(evolve(exact, law, times)(r) - ev(r)).max(axis=1)
    if terms >= 20:  # the largest error of a wave that meets itself at the axis is not told by blocks of five terms
        assert np.all(sup <= stated.sup)


def test_a_series_that_is_too_short_for_the_earliest_time_says_how_many_terms_would_do():
    series = expand(ones, BASIS, terms=20)
    with pytest.warns(TruncationWarning, match=r"too short: at time 0.0001 .* (8\d|9\d|1[0-3]\d) terms would bring"):
        evolve(series, Diffusion(1.0), [0.1, 1e-4, 1e-2])
    with warnings.catch_warnings():
        warnings.simplefilter("error")
        evolve(series, Diffusion(1.0), [0.0, 0.1, 1e-2])
        evolve(Expansion(BASIS, np.ones(20)), Wave(1.0), 1.0)  # coefficients are taken at their word
        evolve(expand(lambda r: (1 - r**2) ** 2, BASIS, terms=20), Wave(1.0), 1.0)


@pytest.mark.parametrize("law", [Wave(1.0), Paraxial(3.0)], ids=repr)
def test_fronts_warn_with_the_l2_error_and_state_no_largest_one(law):
    series = expand(ones, BASIS, terms=50)
    with pytest.warns(TruncationWarning, match=r"fronts move .* L2 error is near 0.0[89]\d*"):
        ev = evolve(series, law, [0.0, 0.5])
    stated = ev.expansion.error_estimate()
    assert np.all(np.isposinf(stated.sup))
    assert np.all(np.abs(stated.l2 / series.error_estimate().l2 - 1.0) < 1.0)
    again = Wave(1.0) if isinstance(law, Wave) else law
    with pytest.warns(TruncationWarning, match="fronts"):
        evolve(ev.expansion[1], again, 0.3)
    rest = Expansion(BASIS, np.zeros(50))
    with pytest.warns(TruncationWarning, match="fronts"):
        evolve(rest, law, 0.3, rim=1.0)


def test_errors_of_the_first_coefficients_go_along_and_grow_with_a_growing_mode():
    basis = Dini(robin=-1.0)
    table_like = Expansion._make(basis, np.array([1.0, 0.5, 0.1]), quadrature=1e-6, table=2e-6)
    ev = evolve(table_like, Diffusion(1.0), [0.0, 2.0])
    growth = np.exp(-2.0 * basis.eigenvalues(1)[0])
    stated = ev.expansion.error_estimate()
    np.testing.assert_allclose(stated.quadrature, [1e-6, 1e-6 * growth], rtol=1e-12)
    np.testing.assert_allclose(stated.table, [2e-6, 2e-6 * growth], rtol=1e-12)


def test_evolutions_and_laws_survive_pickling():
    series = expand(lambda r: 1 - r**2, BASIS, terms=10)
    law = Wave(1.0, damping=np.linspace(0, 1, 10))
    ev = evolve(series, law, [0.1, 0.2], source=lambda t: series * t, rim=lambda t: t**2)
    back = pickle.loads(pickle.dumps(ev))
    np.testing.assert_array_equal(back(0.3), ev(0.3))


GOOD = Expansion(BASIS, [1.0, 0.5])
GOOD_BATCH = Expansion(BASIS, np.ones((2, 3)))


@pytest.mark.parametrize(
    ("call", "error", "match"),
    [
        (lambda: Diffusion(-1.0), ValueError, "'diffusivity' must be at least 0"),
        (lambda: Diffusion(np.nan), ValueError, "'diffusivity' must be"),
        (lambda: Diffusion("1"), TypeError, "'diffusivity' must be a real number"),
        (lambda: Diffusion(1.0, removal=-1.0), ValueError, "'removal' must be at least 0"),
        (lambda: Diffusion(1.0, removal=np.nan), ValueError, "'removal'"),
        (lambda: Wave(-2.0), ValueError, "'speed' must be at least 0"),
        (lambda: Wave(np.inf), ValueError, "'speed'"),
        (lambda: Wave(1.0, damping=-1.0), ValueError, "'damping' must be at least 0"),
        (lambda: Wave(1.0, damping=[0.0, np.nan]), ValueError, "'damping' must be at least 0"),
        (lambda: Wave(1.0, damping=[[0.0]]), ValueError, "'damping' must be a number or of shape"),
        (lambda: Wave(1.0, damping=1j), TypeError, "'damping'"),
        (lambda: Paraxial(0.0), ValueError, "'wavenumber' must be positive"),
        (lambda: Paraxial(-1.0), ValueError, "'wavenumber' must be positive"),
        (lambda: Paraxial(np.nan), ValueError, "'wavenumber'"),
        (lambda: ModalLaw(3.0), TypeError, "'propagator' must be a function"),
        (lambda: evolve([1.0], Diffusion(1.0), 1.0), TypeError, "'expansion' must be an Expansion"),
        (lambda: evolve(GOOD, "diffusion", 1.0), TypeError, "'law' must be a law"),
        (lambda: evolve(GOOD, Diffusion, 1.0), TypeError, "'law' must be a law"),
        (lambda: evolve(GOOD, Diffusion(1.0), -1.0), ValueError, "'times' must be at least 0"),
        (lambda: evolve(GOOD, Wave(1.0, damping=0.1), [-1.0]), ValueError, "'times' must be at least 0"),
        (lambda: evolve(GOOD, Diffusion(1.0), np.nan), ValueError, "'times' must be finite"),
        (lambda: evolve(GOOD, Diffusion(1.0), []), ValueError, "'times' must be a number or a non-empty"),
        (lambda: evolve(GOOD, Diffusion(1.0), [[1.0]]), ValueError, "'times' must be a number or a non-empty"),
        (lambda: evolve(GOOD, Diffusion(1.0), 1j), TypeError, "'times' must be real"),
        (lambda: evolve(GOOD, Diffusion(1.0), 1.0, velocity=GOOD), ValueError, "'velocity' must be None"),
        (lambda: evolve(GOOD, Wave(1.0), 1.0, velocity=1.0), TypeError, "'velocity' must be an Expansion"),
        (
            lambda: evolve(GOOD, Wave(1.0), 1.0, velocity=Expansion(FourierBessel(1.0), [1.0])),
            ValueError,
            "'velocity' must be on the basis",
        ),
        (lambda: evolve(GOOD, Wave(1.0), 1.0, source=3.0), TypeError, "'source' must be an Expansion or a function"),
        (lambda: evolve(GOOD, Wave(1.0), 1.0, source=lambda t: t), TypeError, "'source' must return an Expansion"),
        (
            lambda: evolve(GOOD, Wave(1.0), 1.0, source=Expansion(Dini.neumann(), [1.0])),
            ValueError,
            "'source' must be on the basis",
        ),
        (
            lambda: evolve(
                Expansion(BASIS, np.ones((2, 3))), Wave(1.0), 1.0, velocity=Expansion(BASIS, np.ones((3, 3)))
            ),
            ValueError,
            "'velocity' must broadcast",
        ),
        (lambda: evolve(GOOD, Wave(1.0, damping=[1.0]), 1.0), ValueError, r"'damping' must be .*2"),
        (lambda: evolve(GOOD, Diffusion(1.0), 1.0, rim="hot"), TypeError, "'rim' must be numbers"),
        (lambda: evolve(GOOD, Diffusion(1.0), 1.0, rim=np.nan), ValueError, "'rim' must be finite"),
        (lambda: evolve(GOOD, Diffusion(1.0), 1.0, rim=lambda t: None), TypeError, "'rim' must be numbers"),
        (lambda: evolve(GOOD, Diffusion(0.0), 1.0, rim=1.0), ValueError, "'rim' must be None"),
        (
            lambda: evolve(Expansion(Sines(), [1.0]), Diffusion(1.0), 1.0, rim=1.0),
            ValueError,
            "'rim' must be None on a basis",
        ),
        (
            lambda: evolve(GOOD, ModalLaw(lambda e, t: np.exp(-e * t)), 1.0, rim=1.0),
            ValueError,
            "'rim' must be None for a ModalLaw",
        ),
        (lambda: evolve(GOOD, ModalLaw(lambda e, t: None), 1.0), TypeError, "'propagator' must return numbers"),
        (lambda: evolve(GOOD, ModalLaw(lambda e, t: e[:1]), 1.0), ValueError, "'propagator' must return shape"),
        (lambda: evolve(GOOD, ModalLaw(lambda e, t: e * np.nan), 1.0), ValueError, "'propagator' must return numbers"),
        (lambda: GOOD.terms_for(0.1, law=Diffusion(1.0)), TypeError, "'time' must be given"),
        (lambda: GOOD.terms_for(0.1, time=1.0), TypeError, "'law' must be given"),
        (lambda: GOOD.terms_for(0.1, law=1.0, time=1.0), TypeError, "'law' must be a law"),
        (lambda: GOOD.terms_for(0.1, law=Diffusion(1.0), time=-1.0), ValueError, "'time' must be at least 0"),
        (lambda: GOOD.terms_for(0.1, law=Diffusion(1.0), time=np.nan), ValueError, "'time' must be finite"),
    ],
)
def test_bad_input(call, error, match):
    with pytest.raises(error, match=match) as caught:
        call()
    assert caught.value.name in str(caught.value)


def test_a_kink_of_a_wave_is_a_front_of_its_velocity():
    series = expand(lambda r: np.abs(r - 0.5) * (1 - r), BASIS, terms=200, breaks=[0.5])
    ev = evolve(series, Wave(1.0), 0.2)
    assert np.isfinite(ev.expansion.error_estimate().sup)
    assert np.isposinf(ev.velocity.error_estimate().sup)
    smooth = evolve(expand(lambda r: (1 - r**2) ** 3, BASIS, terms=40), Wave(1.0), 0.2)
    assert np.isfinite(smooth.velocity.error_estimate().sup)


def test_a_closed_part_is_turned_into_coefficients():
    lifted, plain = expand(ones, BASIS, terms=60, lift_terms=2), expand(ones, BASIS, terms=60)
    assert lifted.closed_part is not None
    first, second = (evolve(series, Diffusion(1.0), [0.01, 0.1]) for series in (lifted, plain))
    r = np.linspace(0.0, 1.0, 21)
    assert np.abs(first(r) - second(r)).max() < 1e-14
    assert np.all(first.expansion.error_estimate().truncation < 1e-10)
    with pytest.warns(TruncationWarning, match="fronts"):
        evolve(lifted, Wave(1.0), 0.1)
