"""Transforms: what they promise, by every method; values against direct sums and ball arithmetic elsewhere."""

from __future__ import annotations

import pickle
import threading
import tracemalloc

import numpy as np
import pytest
from third_basis import Sines

from fbexpand.bases import Dini, FourierBessel
from fbexpand.transform import Transform
from fbexpand.transform.direct import series_at
from fbexpand.transform.grid import chosen_grid, defect

METHODS = ("matrix", "direct")
BASES = [
    FourierBessel(),
    FourierBessel(0.3, radius=0.7),
    FourierBessel(50.0),
    FourierBessel(200.0, radius=3.0),
    Dini(1.0, robin=2.0),
    Dini.neumann(),
    Dini(robin=-3.0, radius=2.0),
    Dini(5.5, robin=-40.0),
    Sines(radius=1.5),
]


def series(terms, seed=1, batch=()):
    return np.random.default_rng(seed).standard_normal((*batch, terms))


def round_trip(basis, terms, **options):
    plan = Transform(basis, terms, **options)
    c = series(terms)
    return plan, np.max(np.abs(plan.analyze(plan.synthesize(c)) - c))


@pytest.mark.parametrize("basis", BASES, ids=repr)
@pytest.mark.parametrize("terms", [1, 2, 7, 16, 33, 150])
def test_round_trip_on_chosen_radii(basis, terms):
    plan, error = round_trip(basis, terms)
    assert error < 1e-13
    if terms >= 16 and not basis.growing:
        assert plan.r.size <= 1.7 * terms + 20
    assert np.all(np.diff(plan.r) > 0.0)
    n = 2.0 * basis.order  # the first mode squared is about r^n at the axis
    area = np.sum(plan.weights * (plan.r / basis.radius) ** n)
    assert area == pytest.approx(basis.radius**2 / (n + 2.0), rel=1e-6)


@pytest.mark.parametrize("order", [0.0, 0.25, 1.0, 3.7, 12.0, 19.5, 20.0, 33.0, 66.0, 80.0, 101.0, 150.5, 200.0])
def test_few_radii_and_orthogonal_modes_at_every_order(order):
    for basis in (FourierBessel(order), Dini(order, robin=0.5)):
        for terms in (16, 17, 18, 21, 24, 27, 31, 40, 64, 130, 300, 600):
            grid = chosen_grid(basis, terms)
            assert grid.r.size <= 1.7 * terms + 20, (basis, terms)
            assert defect(basis, terms, grid) < 3e-14, (basis, terms)


@pytest.mark.deep
def test_few_radii_and_orthogonal_modes_at_all_orders():
    for order in np.arange(0.0, 200.5, 0.5):
        for terms in [*range(1, 100), 128, 200, 300, 450, 600, 900]:
            grid = chosen_grid(FourierBessel(order), terms)
            assert terms < 16 or grid.r.size <= 1.7 * terms + 20, (order, terms)
            assert defect(FourierBessel(order), terms, grid) < 5e-14, (order, terms)


@pytest.mark.parametrize("basis", [FourierBessel(), Dini(200.0, robin=1.0)], ids=repr)
def test_round_trip_with_4096_terms(basis):
    plan, error = round_trip(basis, 4096)
    assert error < 1e-13
    assert plan.r.size <= 1.7 * 4096 + 20


@pytest.mark.parametrize("robin", [-0.5, -10.0, -300.0, -2e3, -1e5, -1e8])
@pytest.mark.parametrize("order", [0.0, 0.3, 50.0])
def test_round_trip_with_a_steep_first_mode(order, robin):
    for terms in (1, 2, 16, 64, 200):
        _, error = round_trip(Dini(order, robin=robin - order), terms)
        assert error < 1e-13, terms


@pytest.mark.parametrize("order", [0.0, 0.3, 1.0, 2.5, 7.5, 20.0, 100.0])
def test_products_of_two_series_are_analysed_without_aliasing(order):
    basis = FourierBessel(order) if order != 1.0 else Dini(order, robin=-6.0)
    terms = 24
    plan = Transform(basis, terms, exact_for=3)
    fine = Transform(basis, terms, exact_for=8)  # by far more radii
    a, b = series(terms, 2), series(terms, 3)
    product = plan.analyze(plan.synthesize(a) * plan.synthesize(b))
    true = fine.analyze(fine.synthesize(a) * fine.synthesize(b))
    assert fine.r.size > 1.5 * plan.r.size
    np.testing.assert_allclose(product, true, rtol=0.0, atol=1e-13 * np.abs(true).max())
    _, error = round_trip(basis, terms, exact_for=3)
    assert error < 1e-13
    aliased = Transform(basis, terms)
    wrong = aliased.analyze(aliased.synthesize(a) * aliased.synthesize(b))
    assert np.abs(wrong - true).max() > 1e-9 * np.abs(true).max()


@pytest.mark.parametrize("method", METHODS)
@pytest.mark.parametrize("basis", BASES, ids=repr)
def test_values_are_those_of_the_series_on_any_radii(basis, method):
    rng = np.random.default_rng(4)
    r = np.concatenate(([0.0, basis.radius], rng.random(60) * basis.radius))
    rng.shuffle(r)
    c = series(37, 5)
    plan = Transform(basis, 37, r, method=method)
    np.testing.assert_allclose(plan.synthesize(c), series_at(basis, c, r), rtol=0.0, atol=2e-15 * np.abs(c).sum())


@pytest.mark.parametrize("method", METHODS)
@pytest.mark.parametrize("given", [False, True])
@pytest.mark.parametrize("basis", BASES, ids=repr)
def test_analyze_is_the_adjoint_of_synthesize(basis, given, method):
    rng = np.random.default_rng(6)
    terms = 21
    r = rng.random(50) * basis.radius if given else None
    plan = Transform(basis, terms, r, method=method)
    for _ in range(3):
        c = rng.standard_normal(terms) + 1j * rng.standard_normal(terms)
        v = rng.standard_normal(plan.r.size) + 1j * rng.standard_normal(plan.r.size)
        here = plan.weights * v * np.conj(plan.synthesize(c))
        there = basis.norms(terms) * plan.analyze(v) * np.conj(c)
        size = np.abs(here).sum() + np.abs(there).sum()
        assert abs(here.sum() - there.sum()) < 1e-14 * size


@pytest.mark.parametrize("basis", [FourierBessel(), FourierBessel(0.3, 2.0), Dini(20.0, robin=1.0)], ids=repr)
def test_weights_on_radii_of_ones_own(basis):
    terms = 40
    chosen = Transform(basis, terms)
    order = np.random.default_rng(7).permutation(chosen.r.size)
    _, error = round_trip(basis, terms, r=chosen.r[order])
    assert error < 1e-8
    _, error = round_trip(basis, terms, r=np.linspace(0.0, basis.radius, 3 * terms + 20))
    assert error < 1e-8
    zeros = FourierBessel(basis.order).roots(terms + 1)
    _, error = round_trip(basis, terms, r=np.sort(zeros)[:-1] / zeros[-1] * basis.radius)
    assert error < 0.1


@pytest.mark.parametrize("method", METHODS)
def test_batches_complex_and_out(method):
    basis = Dini(0.5, robin=1.0)
    plan = Transform(basis, 18, method=method)
    m = plan.r.size
    for batch in ((), (1,), (5,), (2, 3), (0,), (2, 0, 3)):
        real = series(18, 8, batch)
        for c in (real, real + 1j * series(18, 9, batch)):
            v = plan.synthesize(c)
            assert v.shape == (*batch, m)
            assert v.dtype == c.dtype
            out = np.full((*batch, m), 7.0, dtype=c.dtype)
            assert plan.synthesize(c, out=out) is out
            np.testing.assert_array_equal(out, v)
            back = np.full((*batch, 18), 7.0, dtype=c.dtype)
            assert plan.analyze(v, out=back) is back
            np.testing.assert_allclose(back, c, rtol=0.0, atol=1e-13)
            one_by_one = [plan.synthesize(row) for row in c.reshape(-1, 18)]
            if one_by_one:
                np.testing.assert_allclose(v.reshape(-1, m), one_by_one, rtol=0.0, atol=1e-14)


@pytest.mark.parametrize("method", METHODS)
def test_other_numbers_and_layouts_are_widened(method):
    plan = Transform(FourierBessel(), 6, method=method)
    c = np.arange(12.0).reshape(2, 6)
    want = plan.synthesize(c)
    strided = np.repeat(c, 2, axis=1)[:, ::2]
    for given in (c.tolist(), c.astype(np.float32), c.astype(int), np.asfortranarray(c), strided):
        np.testing.assert_array_equal(plan.synthesize(given), want)
    assert plan.synthesize(np.arange(6, dtype=np.complex64)).dtype == np.complex128
    frozen = c.copy()
    frozen.setflags(write=False)
    np.testing.assert_array_equal(plan.synthesize(frozen), want)


def test_radii_of_any_shape():
    r = np.linspace(0.0, 1.0, 24).reshape(2, 3, 4)
    plan = Transform(FourierBessel(2.0), 5, r)
    v = plan.synthesize(series(5, batch=(7,)))
    assert v.shape == (7, 2, 3, 4)
    assert plan.weights.shape == r.shape
    assert plan.analyze(v).shape == (7, 5)
    single = Transform(FourierBessel(), 3, 0.25)
    assert single.synthesize([1.0, 2.0, 3.0]).shape == ()


@pytest.mark.parametrize("method", METHODS)
@pytest.mark.parametrize("threads", [1, 3])
def test_nan_stays_in_its_own_profile(method, threads):
    plan = Transform(FourierBessel(1.5), 40, method=method, threads=threads)
    c = series(40, 10, (9,))
    c[4, 7] = np.nan
    v = plan.synthesize(c)
    assert np.isnan(v[4]).all()
    assert np.isfinite(np.delete(v, 4, axis=0)).all()
    v = np.nan_to_num(v)
    v[2, 3] = np.nan
    back = plan.analyze(v)
    assert np.isnan(back[2]).any()
    assert np.isfinite(np.delete(back, 2, axis=0)).all()


@pytest.mark.parametrize("method", METHODS)
def test_threads_share_a_plan_and_a_batch(method):
    basis = FourierBessel(0.3)
    plan = Transform(basis, 50, method=method)
    split = Transform(basis, 50, method=method, threads=2)
    c = series(50, 11, (64,)) + 1j * series(50, 12, (64,))
    want = series_at(basis, c, plan.r)
    np.testing.assert_allclose(split.synthesize(c), want, rtol=0.0, atol=1e-12)
    results = {}

    def work(name):
        for _ in range(5):
            v = plan.synthesize(c)
            results[name] = (v, plan.analyze(v))

    threads = [threading.Thread(target=work, args=(i,)) for i in range(4)]
    for t in threads:
        t.start()
    for t in threads:
        t.join()
    for v, back in results.values():
        np.testing.assert_allclose(v, want, rtol=0.0, atol=1e-12)
        np.testing.assert_allclose(back, c, rtol=0.0, atol=1e-12)


def test_an_exception_in_one_thread_reaches_the_caller():
    class Broken(Sines):
        def modes(self, r, count, start=1):
            raise RuntimeError("no modes today")

    plan = Transform(Broken(), 4, np.linspace(0.1, 0.9, 6), method="direct", threads=2)
    with pytest.raises(RuntimeError, match="no modes today"):
        plan.synthesize(np.ones((4, 4)))


@pytest.mark.parametrize("method", [*METHODS, "auto"])
def test_pickle_rebuilds_and_gives_the_same_bits(method):
    for r in (None, np.array([0.5, 0.1, 1.0, 0.0, 0.7])):
        plan = Transform(Dini(0.3, robin=2.0), 5, r, method=method, threads=2)
        c = series(5, 13, (3,))
        v = plan.synthesize(c)
        a = plan.analyze(v)
        text = pickle.dumps(plan)
        assert len(text) < 2000
        again = pickle.loads(text)
        assert again.method == plan.method
        assert repr(again) == repr(plan)
        np.testing.assert_array_equal(again.synthesize(c), v)
        np.testing.assert_array_equal(again.analyze(v), a)


def test_a_matrix_does_not_travel():
    plan = Transform(FourierBessel(), 256)
    plan.synthesize(np.ones(256))
    assert len(pickle.dumps(plan)) < 2000
    assert plan.nbytes > 1 << 20


def test_nothing_is_allocated_where_out_is_given():
    plan = Transform(FourierBessel(), 200)
    c, v = np.ones((20, 200)), np.ones((20, plan.r.size))
    z, w = c * 1j, v * 1j
    for _ in range(2):
        plan.synthesize(c, out=v)
        plan.analyze(v, out=c)
        plan.synthesize(z, out=w)
        plan.analyze(w, out=z)
    tracemalloc.start()
    for _ in range(3):
        plan.synthesize(c, out=v)
        plan.analyze(v, out=c)
        plan.synthesize(z, out=w)
        plan.analyze(w, out=z)
    _, peak = tracemalloc.get_traced_memory()
    tracemalloc.stop()
    assert peak < 4000


def test_repr_and_bytes():
    plan = Transform(FourierBessel(), 64)
    assert repr(plan).startswith("Transform(FourierBessel(order=0.0, radius=1.0), terms=64, radii=")
    assert "method='matrix'" in repr(plan)
    assert "profile" in repr(plan)
    before = plan.nbytes
    plan.analyze(plan.synthesize(np.ones(64)))
    assert plan.nbytes == before >= 2 * 8 * 64 * plan.r.size


def test_auto_keeps_within_the_memory_allowed():
    basis = FourierBessel()
    assert Transform(basis, 300).method == "matrix"
    small = Transform(basis, 300, max_bytes=2_200_000)
    assert small.method == "direct"
    assert small.nbytes <= 2_200_000
    c = series(300)
    np.testing.assert_allclose(small.synthesize(c), Transform(basis, 300).synthesize(c), rtol=0.0, atol=1e-12)


def test_arrays_cannot_be_written():
    plan = Transform(FourierBessel(), 8)
    for array in (plan.r, plan.weights, Transform(FourierBessel(), 2, [0.0, 0.5, 1.0]).r):
        with pytest.raises(ValueError, match="read-only"):
            array[0] = 1.0


def raises(kind, name, function):
    with pytest.raises(kind, match=f"'{name}'") as caught:
        function()
    assert caught.value.name == name
    return str(caught.value)


def test_bad_arguments():
    basis = FourierBessel(radius=2.0)
    raises(TypeError, "basis", lambda: Transform(FourierBessel, 4))
    raises(TypeError, "basis", lambda: Transform(None, 4))
    raises(TypeError, "terms", lambda: Transform(basis, 4.0))
    raises(ValueError, "terms", lambda: Transform(basis, 0))
    raises(ValueError, "exact_for", lambda: Transform(basis, 4, exact_for=1))
    raises(ValueError, "threads", lambda: Transform(basis, 4, threads=0))
    raises(ValueError, "method", lambda: Transform(basis, 4, method="quick"))
    raises(TypeError, "method", lambda: Transform(basis, 4, method=None))
    for bad in ([0.5, 2.1], [-0.1, 1.0], [np.nan, 1.0], [np.inf], [0.5, 1.0, 0.5], [0.0, -0.0], []):
        raises(ValueError, "r", lambda bad=bad: Transform(basis, 1, bad))
    raises(TypeError, "r", lambda: Transform(basis, 1, [1j]))
    assert "162400" in raises(ValueError, "max_bytes", lambda: Transform(
        basis, 100, np.linspace(0.0, 2.0, 100), method="matrix", max_bytes=1000))
    raises(ValueError, "max_bytes", lambda: Transform(basis, 100, max_bytes=10))
    raises(TypeError, "max_bytes", lambda: Transform(basis, 100, max_bytes=1e9))


def test_bad_input():
    plan = Transform(FourierBessel(), 16)
    m = plan.r.size
    for bad in (np.ones(15), np.ones((16, 2)), 1.0):
        raises(ValueError, "coefficients", lambda bad=bad: plan.synthesize(bad))
    for bad in (np.ones(m - 1), np.ones((m, 1)), 1.0):
        raises(ValueError, "values", lambda bad=bad: plan.analyze(bad))
    raises(TypeError, "coefficients", lambda: plan.synthesize(["a"] * 16))
    few = Transform(FourierBessel(), 16, np.linspace(0.0, 1.0, 15))
    assert few.synthesize(np.ones(16)).shape == (15,)
    assert "fit" in raises(ValueError, "r", lambda: few.analyze(np.ones(15)))


def test_bad_out():
    plan = Transform(FourierBessel(), 16)
    m = plan.r.size
    c = np.ones((2, 16))
    frozen = np.ones((2, m))
    frozen.setflags(write=False)
    bad = [
        np.ones((2, m + 1)),
        np.ones(m),
        np.ones((2, m), dtype=np.float32),
        np.ones((2, m), dtype=complex),
        np.ones((m, 2)).T,
        np.ones((2, 2 * m))[:, ::2],
        frozen,
    ]
    for out in bad:
        raises(ValueError, "out", lambda out=out: plan.synthesize(c, out=out))
    raises(TypeError, "out", lambda: plan.synthesize(c, out=[[0.0] * m] * 2))
    raises(ValueError, "out", lambda: plan.synthesize(c + 1j, out=np.ones((2, m))))
    room = np.ones(m + 16)
    raises(ValueError, "out", lambda: plan.synthesize(room[:16], out=room[8 : 8 + m]))
    raises(ValueError, "out", lambda: plan.analyze(room[:m], out=room[4:20]))
    square = Transform(FourierBessel(), 16, np.linspace(0.0, 1.0, 16))
    x = np.ones(16)
    raises(ValueError, "out", lambda: square.synthesize(x, out=x))
    raises(ValueError, "out", lambda: square.synthesize(x.astype(np.float32), out=x[::-1]))
