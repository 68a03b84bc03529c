"""The main job: coefficients, tolerance, batches, evaluations, any basis, and what is refused."""

from __future__ import annotations

import math
import time
import warnings
from concurrent.futures import ThreadPoolExecutor

import numpy as np
import pytest
from third_basis import Sines

from fbexpand.analysis import expand, quadrature
from fbexpand.bases import Dini, FourierBessel
from fbexpand.exceptions import ArgumentTypeError, ArgumentValueError, TruncationWarning
from fbexpand.profiles.resolve import resolve
from fbexpand.profiles.table import RadialTable

EPS = 2.0**-52
BASES = [
    FourierBessel(),
    FourierBessel(0.3, 2.0),
    FourierBessel(60.0),
    Dini(robin=1.0),
    Dini(2.5, 0.1, robin=-2.5),
    Dini(robin=-1e3),
]


def parabola(r):
    return 1.0 - r * r


def step(r):
    return np.where(r < 0.4321, 1.0, 0.0)


def quadrature_of(profile, edges, basis, terms):
    """c_k by Gauss rules of NumPy, cut into short pieces, toward the axis and the rim ever shorter ones."""
    x, w = np.polynomial.legendre.leggauss(30)
    pieces = np.linspace(0.0, 1.0, terms + 2)
    graded = 2.0 ** -np.arange(1.0, 45.0)
    cuts = np.union1d(np.union1d(pieces, graded), np.union1d(1.0 - graded[:40], np.asarray(edges) / basis.radius))
    cuts = np.concatenate(([0.0], cuts[cuts > 0.0])) * basis.radius
    half = 0.5 * np.diff(cuts)[:, None]
    r = (cuts[:-1, None] + half * (1.0 + x)).ravel()
    weights = (half * w).ravel() * r
    return (profile(r) * weights) @ basis.modes(r, terms) / basis.norms(terms)


@pytest.mark.parametrize("basis", BASES, ids=repr)
def test_against_plain_quadrature(basis):
    R = basis.radius
    for profile, edges in (
        (lambda r: np.cos(5 * r / R) + r / R, []),
        (lambda r: np.exp((2j - 1) * r / R), []),
        (lambda r: np.abs(r / R - 0.3), [0.3 * R]),
        (lambda r: np.where(r < 0.6 * R, np.sqrt(r / R), -1.0), [0.6 * R]),
    ):
        series = expand(profile, basis, terms=60, breaks=edges)
        expected = quadrature_of(profile, edges, basis, 60)
        difference = np.abs(series.coefficients - expected) * np.sqrt(basis.norms(60))
        assert difference.max() <= 5e-14 * np.abs(series.orthonormal).max()


def test_third_basis():
    """Everything on a basis with the protocol's members and nothing else; the sine series is known."""
    basis = Sines(2.0)
    series = expand(lambda r: np.sqrt(2.0 / r) * r * (2.0 - r), basis, terms=50)
    k = np.arange(1, 51)
    exact = np.where(k % 2 == 1, 32.0 / (k * np.pi) ** 3, 0.0)  # of x (2 - x) = sum c_k sin(k pi x / 2)
    np.testing.assert_allclose(series.coefficients, exact, rtol=0, atol=5e-14)
    assert expand(lambda r: np.sqrt(r) * (2.0 - r), basis, tol=1e-6).terms < 3000
    table = RadialTable(np.linspace(0, 2, 21), np.linspace(2, 0, 21))
    assert expand(table, basis, terms=10).error_estimate().table >= 0.0


@pytest.mark.parametrize("basis", [FourierBessel(0.3), Dini(robin=-50.0)], ids=repr)
def test_many_terms_agree_with_few(basis):
    """Terms come in blocks, modes are summed in blocks: the same digits all the same."""
    few, many = (expand(lambda r: np.cos(3 * r), basis, terms=n) for n in (40, 5000))
    scale = np.abs(few.orthonormal).max()
    np.testing.assert_allclose(many.orthonormal[:40], few.orthonormal, rtol=0, atol=1e-14 * scale)
    # the far end by two integrations by parts: the next term is smaller by lambda^-2
    assert many.evaluations == few.evaluations


def test_high_coefficients_of_a_constant():
    """2 / (j_k J_1(j_k)): relative accuracy where the coefficient is a thousandth of the first."""
    basis = FourierBessel()
    series = expand(lambda r: 1.0, basis, terms=20_000)
    roots, norms = basis.roots(20_000), basis.norms(20_000)
    exact = np.sqrt(2.0 * norms) / norms / roots  # |J_1(j_k)| = sqrt(2 N_k)
    error = np.abs(np.abs(series.coefficients) - exact) * np.sqrt(norms) / np.abs(series.orthonormal[0])
    assert error[:2000].max() <= 5e-14
    assert error.max() <= 5e-13  # the rounding of the nodes is a growing part of a wave
    assert np.all(np.sign(series.coefficients) == np.where(np.arange(20_000) % 2 == 0, 1.0, -1.0))


def test_band_limited_profiles_come_back():
    rng = np.random.default_rng(6)
    for basis in BASES:
        c = rng.standard_normal((2, 12)) / np.sqrt(basis.norms(12))
        series = expand(lambda r, b=basis, c=c: c @ b.modes(r, 12).T, basis, terms=20)
        size = np.abs(c * np.sqrt(basis.norms(12))).max()
        wanted = np.pad(c * np.sqrt(basis.norms(12)), ((0, 0), (0, 8)))
        np.testing.assert_allclose(series.orthonormal, wanted, rtol=0, atol=5e-14 * size)


def test_radius_only_scales():
    plain = expand(lambda r: np.exp(-3 * r * r), FourierBessel(0.5), terms=50)
    for radius in (1e-9, 0.02, 7e11):
        scaled = expand(lambda r, R=radius: np.exp(-3 * (r / R) ** 2), FourierBessel(0.5, radius), terms=50)
        np.testing.assert_allclose(scaled.coefficients, plain.coefficients, rtol=0, atol=1e-14)


class TestTolerance:
    @pytest.mark.parametrize("tol", [0.3, 1e-1, 1e-2, 1e-4, 1e-8, 1e-11])
    def test_it_is_kept_with_as_few_terms_as_possible(self, tol):
        """The true L2 error by Parseval's sum over many more terms, from the smallest up."""
        basis = FourierBessel()
        for profile in (lambda r: parabola(r) ** 3, lambda r: np.exp(-200 * (r - 0.3) ** 2) * (1 - r)):
            whole = np.abs(expand(profile, basis, terms=8000).orthonormal)
            tail = np.sqrt(np.cumsum((whole**2)[::-1])[::-1])
            norm = tail[0]
            series = expand(profile, basis, tol=tol)
            assert tail[series.terms] <= tol * norm
            assert series.terms <= 1 or tail[series.terms - 1] >= 0.95 * tol * norm

    @pytest.mark.parametrize("profile", [step, lambda r: 1.0 + 0.0 * r], ids=["step", "one"])
    def test_slow_decay(self, profile):
        basis = FourierBessel()
        norm = 0.4321 / math.sqrt(2) if profile is step else 1 / math.sqrt(2)
        for tol in (0.1, 0.02):
            series = expand(profile, basis, tol=tol)
            found = [math.sqrt(max(1 - np.sum(series.orthonormal[:n] ** 2) / norm**2, 0)) for n in (-1, None)]
            assert found[1] <= tol * (1 + 1e-9)
            assert found[0] >= 0.99 * tol

    def test_atol_will_do(self):
        basis = FourierBessel()
        absolute = expand(parabola, basis, tol=1e-9, atol=1e-3)
        relative = expand(parabola, basis, tol=1e-3 / float(resolve(parabola, (), 1.0).norm()))
        assert absolute.terms == relative.terms
        assert expand(parabola, basis, tol=0.0, atol=1e-3).terms == relative.terms

    def test_zero_takes_one_term(self):
        series = expand(lambda r: 0.0 * r, FourierBessel(), tol=1e-12)
        assert series.terms == 1
        assert series.coefficients.tolist() == [0.0]

    def test_each_profile_of_a_batch_on_its_own_scale(self):
        basis = FourierBessel()
        profiles = [lambda r: 1e-9 * parabola(r), lambda r: 1e9 * parabola(r) ** 3, lambda r: 0.0 * r]
        alone = [expand(profile, basis, tol=1e-5).terms for profile in profiles]
        together = expand(lambda r: np.stack([f(r) for f in profiles]), basis, tol=1e-5)
        assert together.terms == max(alone)

    def test_not_reached(self):
        with pytest.warns(TruncationWarning, match=r"0\.0.* of its norm.* [0-9.e+]+ terms would reach it"):
            series = expand(step, FourierBessel(), tol=1e-3, max_terms=200)
        assert series.terms == 200

    def test_not_reached_names_the_profile(self):
        with pytest.warns(TruncationWarning, match="profile 1 of the batch"):
            expand(lambda r: np.stack([parabola(r), step(r)]), FourierBessel(), tol=1e-3, max_terms=200)

    def test_prediction_holds(self):
        """The number of terms that the warning names reaches the tolerance, give or take a few per cent."""
        with pytest.warns(TruncationWarning) as caught:
            expand(lambda r: 1.0, FourierBessel(), tol=0.02, max_terms=100)
        predicted = float(str(caught[0].message).split(" terms would reach it")[0].split()[-1])
        assert expand(lambda r: 1.0, FourierBessel(), tol=0.02).terms == pytest.approx(predicted, rel=0.05)

    def test_rounding_is_told_from_truncation(self):
        basis = FourierBessel()
        with pytest.warns(TruncationWarning, match="rounding"):
            series = expand(lambda r: basis.modes(r, 9).sum(axis=1), basis, tol=1e-30)
        assert series.terms < 100
        with pytest.warns(TruncationWarning, match="more than"):
            expand(step, FourierBessel(), tol=1e-12, max_terms=100)

    def test_the_warning_points_at_the_caller(self):
        with pytest.warns(TruncationWarning) as caught:
            expand(step, FourierBessel(), tol=1e-3, max_terms=20)
        assert caught[0].filename == __file__


def test_evaluations_do_not_depend_on_terms():
    for profile in (parabola, step, np.sqrt):
        counts = {expand(profile, FourierBessel(), terms=n).evaluations for n in (1, 50, 900)}
        assert len(counts) == 1
    assert expand(parabola, FourierBessel(), terms=5).evaluations <= 1000


def test_one_hard_profile_does_not_spoil_the_others():
    profiles = [lambda r: np.exp(-r * r), lambda r: 1e-20 * np.cos(3 * r), lambda r: 1e6 * step(r), lambda r: r**0.3]
    basis = FourierBessel()
    together = expand(lambda r: np.stack([f(r) for f in profiles]), basis, terms=80)
    estimate = together.error_estimate()
    for i, profile in enumerate(profiles):
        alone = expand(profile, basis, terms=80)
        size = np.abs(alone.orthonormal).max()
        assert np.abs(alone.orthonormal - together.orthonormal[i]).max() <= 1e-14 * size
        single = alone.error_estimate()
        assert estimate.quadrature[i] <= 2e-14 * size
        assert estimate.truncation[i] == pytest.approx(single.truncation, rel=0.02)


def test_large_batches_agree_with_single_profiles():
    """More profiles than degrees go another way: through moments of the Chebyshev polynomials."""
    factors = np.linspace(0.0, 8.0, 300)[:, None]
    basis = Dini(0.3, robin=-5.0)
    series = expand(lambda r: np.exp(1j * factors * r), basis, terms=30)
    for i in (0, 17, 299):
        alone = expand(lambda r, i=i: np.exp(1j * factors[i] * r), basis, terms=30)
        difference = np.abs(series.orthonormal[i] - alone.orthonormal).max()
        assert difference <= 2e-14 * np.abs(alone.orthonormal).max()


def test_weights_are_kept_within_bounds():
    for order in range(60):
        expand(parabola, FourierBessel(order + 0.25), terms=300)
    assert quadrature._kept.nbytes <= quadrature.KEPT_BYTES
    assert len(quadrature._kept) >= 2


def test_threads_agree():
    def work(i):
        basis = FourierBessel((i % 5) * 0.3)
        return expand(lambda r: np.cos((1 + i % 3) * r), basis, terms=20 + i % 7).coefficients

    with ThreadPoolExecutor(4) as pool:
        found = list(pool.map(work, range(40)))
    quadrature._kept.clear()
    for i, coefficients in enumerate(found):
        assert np.array_equal(coefficients, work(i))


def refused(error, name, *args, **options):
    start = time.process_time()
    with pytest.raises(error, match=f"'{name}'") as info:
        expand(*args, **options)
    assert time.process_time() - start < 1.0
    assert info.value.name == name


BIG = 10**400


@pytest.mark.parametrize("terms", [0, -1, 10**12, BIG])
def test_wrong_terms(terms):
    refused(ArgumentValueError, "terms", parabola, FourierBessel(), terms=terms)


@pytest.mark.parametrize("terms", [1.5, True, "5", [5], math.nan, np.array([5])])
def test_terms_of_a_wrong_type(terms):
    refused(ArgumentTypeError, "terms", parabola, FourierBessel(), terms=terms)


@pytest.mark.parametrize("tol", [0.0, -1.0, math.nan, math.inf, BIG])
def test_wrong_tol(tol):
    refused(ArgumentValueError, "tol", parabola, FourierBessel(), tol=tol)


@pytest.mark.parametrize("tol", ["a", 1j, True, [1e-3]])
def test_tol_of_a_wrong_type(tol):
    refused(ArgumentTypeError, "tol", parabola, FourierBessel(), tol=tol)


@pytest.mark.parametrize("atol", [-1.0, math.nan, math.inf])
def test_wrong_atol(atol):
    refused(ArgumentValueError, "atol", parabola, FourierBessel(), tol=1e-3, atol=atol)


@pytest.mark.parametrize(
    "breaks",
    [[0.0], [1.0], [-0.5], [2.0], [math.nan], [math.inf], [0.5, 0.5], [[0.5]], [0.5, [0.6]]],
)
def test_wrong_breaks(breaks):
    refused(ArgumentValueError, "breaks", parabola, FourierBessel(), terms=3, breaks=breaks)


@pytest.mark.parametrize("breaks", [None, "a", ["a"], [1j], [True], {0.5}])
def test_breaks_of_a_wrong_type(breaks):
    refused(ArgumentTypeError, "breaks", parabola, FourierBessel(), terms=3, breaks=breaks)


def test_breaks_in_any_order_and_form():
    def profile(r):
        return np.floor(r / 0.3)

    first = expand(profile, FourierBessel(), terms=9, breaks=(0.3, 0.6, 0.9))
    second = expand(profile, FourierBessel(), terms=9, breaks=np.array([0.9, 0.3, 0.6]))
    assert np.array_equal(first.coefficients, second.coefficients)
    assert expand(step, FourierBessel(), terms=9, breaks=0.4321).evaluations < 1500
    assert expand(parabola, FourierBessel(), terms=9, breaks=[]).evaluations < 1500


@pytest.mark.parametrize("max_terms", [0, -3])
def test_wrong_max_terms(max_terms):
    refused(ArgumentValueError, "max_terms", parabola, FourierBessel(), tol=1e-3, max_terms=max_terms)


@pytest.mark.parametrize("basis", [None, 3, "FourierBessel", FourierBessel])
def test_no_basis(basis):
    refused(ArgumentTypeError, "basis", parabola, basis, terms=3)


@pytest.mark.parametrize("profile", [None, 3.0, "cos", np.ones(5)])
def test_no_profile(profile):
    refused(ArgumentTypeError, "profile", profile, FourierBessel(), terms=3)


@pytest.mark.parametrize("options", [{}, {"terms": 3, "tol": 1e-3}])
def test_exactly_one_of_terms_and_tol(options):
    with pytest.raises(TypeError, match="exactly one of 'terms' and 'tol'"):
        expand(parabola, FourierBessel(), **options)


def test_a_large_batch_of_many_terms_is_refused():
    with pytest.raises(ArgumentValueError, match="'terms'"):
        expand(lambda r: np.ones((10_000, 1)), FourierBessel(), terms=10**7)


def test_nothing_warns():
    with warnings.catch_warnings():
        warnings.simplefilter("error")
        for scale in (1e-300, 1.0, 1e300):
            for profile in (np.sqrt, step, parabola, lambda r: 0.0 * r):
                expand(lambda r, f=profile, s=scale: s * f(r), FourierBessel(0.3), terms=10)


@pytest.mark.parametrize("most", [88, 150, 400, 1000, 3000])
def test_evaluations_are_bounded_and_what_is_missing_is_stated(most):
    basis = Dini(robin=1.0)
    for profile, breaks in ((lambda r: np.abs(r - 0.3), 0.3), (lambda r: 1.0 * (r < 0.6), 0.6)):
        calls = []

        def counted(r, profile=profile, calls=calls):
            calls.append(r.size)
            return profile(r)

        e = expand(counted, basis, terms=30, max_evaluations=most)
        assert sum(calls) == e.evaluations <= most
        exact = expand(profile, basis, terms=30, breaks=[breaks])
        wrong = np.linalg.norm(e.orthonormal - exact.orthonormal)
        assert wrong <= 1.5 * e.error_estimate().quadrature + 1e-14


def test_a_denser_scan_finds_a_narrower_peak():
    def peak(r):
        return np.exp(-(((r - 0.4321) / 4e-5) ** 2))

    exact = expand(peak, FourierBessel(), terms=20, breaks=[0.4321]).orthonormal
    found = expand(peak, FourierBessel(), terms=20, scan=20_000)
    assert np.abs(found.orthonormal - exact).max() <= 1e-13 * np.abs(exact).max()


@pytest.mark.parametrize(("name", "bad"), [("scan", 0), ("scan", 10**9), ("max_evaluations", 87)])
def test_wrong_numbers_of_evaluations(name, bad):
    refused(ArgumentValueError, name, parabola, FourierBessel(), terms=3, **{name: bad})


@pytest.mark.parametrize(("name", "bad"), [("scan", 1.5), ("scan", None), ("max_evaluations", "9")])
def test_numbers_of_evaluations_of_a_wrong_type(name, bad):
    refused(ArgumentTypeError, name, parabola, FourierBessel(), terms=3, **{name: bad})
