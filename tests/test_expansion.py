"""The series as a record: shapes, batches, arithmetic, copies, words, refusals."""

from __future__ import annotations

import copy
import dataclasses
import pickle
import threading

import numpy as np
import pytest

from fbexpand.bases import Dini, FourierBessel
from fbexpand.expansion import Expansion, stack

BASIS = FourierBessel(0.0, 2.0)
RNG = np.random.default_rng(20)
BATCH = RNG.normal(size=(2, 3, 5))


def test_shapes_follow_batch_then_radii():
    single, many = Expansion(BASIS, BATCH[0, 0]), Expansion(BASIS, BATCH)
    assert (single.terms, single.batch_shape, many.batch_shape) == (5, (), (2, 3))
    assert isinstance(single(0.3), np.float64)
    assert single([0.3]).shape == (1,)
    assert single(np.full((4, 2), 0.3)).shape == (4, 2)
    assert single(np.empty((0, 2))).shape == (0, 2)
    assert many(0.3).shape == (2, 3)
    assert many(np.full((4, 2), 0.3)).shape == (2, 3, 4, 2)
    assert many.norm().shape == many.integral().shape == many.mean(0.1, 0.4).shape == (2, 3)
    assert many.derivative(np.ones(7), 2).shape == (2, 3, 7)
    assert many.error_estimate().l2.shape == (2, 3)
    assert many.error_estimate([1, 5]).sup.shape == (2, 2, 3)
    sums = many.partial_sum(np.ones((4, 2)), 3)
    assert sums.values.shape == sums.error.shape == (2, 3, 4, 2)
    assert isinstance(single.norm(), np.float64)
    assert isinstance(single.inner(single), np.float64)
    assert single.closed_part is None
    assert single.evaluations == 0


def test_every_entry_of_a_batch_is_the_series_on_its_own():
    many = Expansion(BASIS, BATCH + 1j * BATCH[::-1])
    r = np.linspace(0.0, 2.0, 17)
    for i in range(2):
        for j in range(3):
            alone = Expansion(BASIS, many.coefficients[i, j])
            np.testing.assert_allclose(many(r)[i, j], alone(r), rtol=0, atol=1e-14)
            np.testing.assert_array_equal(many[i][j].coefficients, alone.coefficients)


def test_widened_and_copied_coefficients():
    assert Expansion(BASIS, [1, 2]).coefficients.dtype == np.float64
    assert Expansion(BASIS, np.ones(2, np.float32)).coefficients.dtype == np.float64
    assert Expansion(BASIS, np.ones(2, np.complex64)).coefficients.dtype == np.complex128
    mine = np.ones(3)
    e = Expansion(BASIS, mine)
    mine[0] = 7.0
    assert e.coefficients[0] == 1.0


def test_frozen_read_only_and_equal_only_to_itself():
    e = Expansion(BASIS, BATCH)
    with pytest.raises(dataclasses.FrozenInstanceError):
        e.coefficients = BATCH
    for array in (
        e.coefficients,
        e.orthonormal,
        e[0].coefficients,
        (e + e).coefficients,
        e.error_estimate().l2,
    ):
        with pytest.raises(ValueError, match="read-only"):
            array[0] = 1.0
    assert e == e
    assert e != Expansion(BASIS, BATCH)
    assert len({e, Expansion(BASIS, BATCH)}) == 2


@pytest.mark.parametrize("duplicate", [lambda e: pickle.loads(pickle.dumps(e)), copy.copy, copy.deepcopy])
def test_copies(duplicate):
    e = Expansion(Dini(0.5, 2.0, robin=1.0), BATCH)
    twin = duplicate(e)
    np.testing.assert_array_equal(twin.coefficients, e.coefficients)
    np.testing.assert_array_equal(twin(0.3), e(0.3))
    assert not twin.coefficients.flags.writeable
    assert (e + twin).terms == 5  # the bases are the same
    estimate = duplicate(e.error_estimate())
    np.testing.assert_array_equal(estimate.l2, e.error_estimate().l2)
    assert not estimate.l2.flags.writeable


def test_indexing_as_an_array_of_series():
    e = Expansion(BASIS, BATCH)
    assert len(e) == 2
    assert [part.batch_shape for part in e] == [(3,), (3,)]
    np.testing.assert_array_equal(e[-1, 2].coefficients, BATCH[-1, 2])
    np.testing.assert_array_equal(e[:, ::2].coefficients, BATCH[:, ::2])
    np.testing.assert_array_equal(e[..., 1].coefficients, BATCH[:, 1])
    np.testing.assert_array_equal(e[BATCH[..., 0] > 0].coefficients, BATCH[BATCH[..., 0] > 0])
    np.testing.assert_array_equal(e[[1, 0]].coefficients, BATCH[[1, 0]])
    assert e[None].batch_shape == (1, 2, 3)
    with pytest.raises(IndexError):
        e[2]
    with pytest.raises(IndexError):
        e[0, 0, 0]
    with pytest.raises(IndexError):
        e[0, 0][0]
    with pytest.raises(TypeError):
        len(e[0, 0])
    with pytest.raises(TypeError):
        iter(e[0, 0])
    assert bool(e[0, 0])


def test_stack_pads_and_broadcasts():
    a, b = Expansion(BASIS, [1.0]), Expansion(BASIS, np.ones((2, 3)))
    s = stack([a, b])
    assert s.batch_shape == (2, 2)
    np.testing.assert_array_equal(s.coefficients[0], [[1, 0, 0], [1, 0, 0]])
    np.testing.assert_array_equal(stack(Expansion(BASIS, BATCH)).coefficients, BATCH)
    with pytest.raises(ValueError, match="'expansions'"):
        stack([])
    with pytest.raises(ValueError, match=r"'expansions'.*basis"):
        stack([a, Expansion(FourierBessel(1.0, 2.0), [1.0])])
    with pytest.raises(ValueError, match="'expansions'"):
        stack([b, Expansion(BASIS, np.ones((5, 3)))])
    for bad in (3, [a, 1.0], None):
        with pytest.raises(TypeError, match="'expansions'"):
            stack(bad)


def test_real_imag_conj():
    c = BATCH + 1j * BATCH[::-1]
    e = Expansion(BASIS, c)
    np.testing.assert_array_equal(e.real.coefficients, c.real)
    np.testing.assert_array_equal(e.imag.coefficients, c.imag)
    np.testing.assert_array_equal(e.conj().coefficients, c.conj())
    plain = Expansion(BASIS, BATCH)
    assert plain.real.coefficients.dtype == plain.imag.coefficients.dtype == np.float64
    assert not plain.imag.coefficients.any()


def test_arithmetic():
    a, b = Expansion(BASIS, [1.0, 2.0]), Expansion(BASIS, BATCH)
    np.testing.assert_array_equal((a + a).coefficients, [2.0, 4.0])
    np.testing.assert_array_equal((b - a).coefficients, BATCH - np.array([1, 2, 0, 0, 0]))
    np.testing.assert_array_equal((-a).coefficients, [-1.0, -2.0])
    assert +a is a
    np.testing.assert_array_equal((a / 3).coefficients, np.array([1.0, 2.0]) / 3)
    weights = np.arange(1.0, 7.0).reshape(2, 3)
    for product in (a * weights, weights * a):
        np.testing.assert_array_equal(product.coefficients, weights[..., None] * np.array([1.0, 2.0]))
    np.testing.assert_array_equal((b * [1.0, 2.0, 3.0]).coefficients, BATCH * np.array([1, 2, 3])[:, None])
    for factor in (2, 2.0, np.float32(2), np.float64(2), 2 + 0j):
        np.testing.assert_array_equal((factor * a).coefficients, [2.0, 4.0])
    assert (1j * a).coefficients.dtype == np.complex128
    np.testing.assert_array_equal(b.truncated(2).coefficients, BATCH[..., :2])
    np.testing.assert_allclose((a + b)(0.3), a(0.3) + b(0.3), atol=1e-14)


def test_arithmetic_refused():
    a = Expansion(BASIS, [1.0, 2.0])
    for other in (FourierBessel(1.0, 2.0), FourierBessel(0.0, 1.0), Dini(0.0, 2.0, robin=1.0)):
        for operation in (lambda x, y: x + y, lambda x, y: x - y, lambda x, y: x.inner(y)):
            with pytest.raises(ValueError, match=r"'other'.*basis"):
                operation(a, Expansion(other, [1.0]))
    assert (a + Expansion(FourierBessel(0.0, 2.0), [1.0])).terms == 2  # an equal basis made anew
    for bad in (1.0, "x", None, np.ones(2)):
        with pytest.raises(TypeError):
            a + bad
    for bad in ("x", None, a, [True]):
        with pytest.raises(TypeError):
            a * bad
        with pytest.raises(TypeError):
            a / bad
    with pytest.raises(TypeError, match="'other'"):
        a.inner(3.0)
    for bad in (np.nan, np.inf, [1.0, np.nan]):
        with pytest.raises(ValueError, match="'factor'"):
            a * bad
    for bad in (0.0, np.nan):
        with pytest.raises(ValueError, match="'divisor'"):
            a / bad
    with pytest.raises(ValueError, match="'coefficients'"):
        a * 1e200 * 1e200
    many = Expansion(BASIS, np.ones((3, 2)))
    with pytest.raises(ValueError, match="'factor'"):
        many * [1.0, 2.0]
    with pytest.raises(ValueError, match="'other'"):
        many + Expansion(BASIS, np.ones((2, 2)))


@pytest.mark.parametrize(
    ("value", "error"),
    [
        ([], ValueError),
        (1.0, ValueError),
        (np.empty((0, 3)), ValueError),
        ([1.0, np.nan], ValueError),
        ([np.inf], ValueError),
        ([[1.0], [1.0, 2.0]], ValueError),
        ("abc", TypeError),
        (None, TypeError),
        ([True], TypeError),
        ([None], TypeError),
        ({1.0}, TypeError),
    ],
)
def test_bad_coefficients(value, error):
    with pytest.raises(error, match="'coefficients'"):
        Expansion(BASIS, value)


@pytest.mark.parametrize("basis", [None, 1.0, "FourierBessel", FourierBessel, np.ones(3)])
def test_bad_basis(basis):
    with pytest.raises(TypeError, match="'basis'"):
        Expansion(basis, [1.0])


@pytest.mark.parametrize(
    "method", [lambda e, r: e(r), lambda e, r: e.derivative(r), lambda e, r: e.partial_sum(r)]
)
def test_bad_radii(method):
    e = Expansion(BASIS, [1.0, 2.0])
    for bad in (-1e-300, 2.0 * (1 + 1e-15), np.nan, np.inf, [0.1, 3.0]):
        with pytest.raises(ValueError, match="'r'"):
            method(e, bad)
    for bad in ("x", None, 1j, [None], True):
        with pytest.raises(TypeError, match="'r'"):
            method(e, bad)
    method(e, 2.0 * (1 + 4 * np.finfo(float).eps))  # a rim that was computed


def test_bad_numbers():
    e = Expansion(BASIS, np.ones(6))
    for name, call in {
        "n": lambda v: e.derivative(0.5, v),
        "terms": lambda v: e.truncated(v),
        " terms": lambda v: e.error_estimate(v),
        "terms ": lambda v: e.partial_sum(0.5, v),
    }.items():
        for bad in (-1, 10**9):
            with pytest.raises(ValueError, match=f"'{name.strip()}'"):
                call(bad)
        for bad in (1.0, True, "1", 1j):
            with pytest.raises(TypeError, match=f"'{name.strip()}'"):
                call(bad)
    for bad in (0, 7, [0], [], [7], range(0)):
        with pytest.raises(ValueError, match="'terms'"):
            e.error_estimate(bad)
    for bad in ([1.0], [[1]], [[1], [1, 2]], np.ones((2, 2), int), "3", {1}, True, [True]):
        with pytest.raises(TypeError, match="'terms'"):
            e.error_estimate(bad)
    for call, name in (
        (lambda v: e.integral(v), "a"),
        (lambda v: e.integral(0.0, v), "b"),
        (lambda v: e.mean(v), "a"),
    ):
        for bad in (-0.1, 2.1, np.nan, np.inf):
            with pytest.raises(ValueError, match=f"'{name}'"):
                call(bad)
        for bad in ("x", [0.1, 0.2], 1j):
            with pytest.raises(TypeError, match=f"'{name}'"):
                call(bad)
    with pytest.raises(ValueError, match="'b'"):
        e.mean(0.5, 0.5)


def test_bad_questions():
    e = Expansion(BASIS, np.ones(6) / np.arange(1, 7) ** 4)
    for bad in (0.0, -1.0, np.nan, np.inf):
        with pytest.raises(ValueError, match="'tol'"):
            e.terms_for(bad)
    for bad in ("x", None, 1j):
        with pytest.raises(TypeError, match="'tol'"):
            e.terms_for(bad)
    with pytest.raises(ValueError, match="'norm'"):
        e.terms_for(0.1, norm="l1")
    with pytest.raises(TypeError, match="'norm'"):
        e.terms_for(0.1, norm=2)
    with pytest.raises(TypeError, match="'at'"):
        e.terms_for(0.1, norm="at")
    with pytest.raises(TypeError, match="'at'"):
        e.terms_for(0.1, norm="at", at="x")
    with pytest.raises(ValueError, match="'at'"):
        e.terms_for(0.1, norm="at", at=3.0)
    with pytest.raises(ValueError, match="'at'"):
        e.terms_for(0.1, at=0.5)
    with pytest.raises(TypeError, match="'relative'"):
        e.terms_for(0.1, relative=1)


def test_words():
    k = np.arange(1, 41)
    single = Expansion(BASIS, (-1.0) ** k / k**2.5)
    words = repr(single)
    assert repr(BASIS) in words
    assert "40 terms" in words
    assert "decay about k^-3.0" in words  # of the orthonormal coefficients
    assert "law" in words
    assert len(words) < 200
    assert "batch (2, 3)" in repr(Expansion(BASIS, BATCH))
    assert "complex" in repr(Expansion(BASIS, [1j, 0.0]))
    assert "1 term," in repr(Expansion(BASIS, [0.0]))
    single.error_estimate()
    assert "L2 error" in repr(single)


def test_threads_may_share_a_series():
    e = Expansion(BASIS, np.ones(50) / np.arange(1, 51) ** 3)
    r = np.linspace(0, 2, 101)
    answers = []

    def ask():
        answers.append((e(r), e.orthonormal.copy(), e.error_estimate().l2, e.partial_sum(r).error))

    threads = [threading.Thread(target=ask) for _ in range(8)]
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join()
    assert len(answers) == 8
    for answer in answers[1:]:
        for ours, first in zip(answer, answers[0], strict=True):
            np.testing.assert_array_equal(ours, first)
