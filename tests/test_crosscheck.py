"""The cross-check agrees where all is well, and finds what is not: coefficients, roots, norms that are off."""

from __future__ import annotations

import math
import pickle
import sys

import mpmath
import numpy as np
import pytest
from scipy.special import j1, jn_zeros
from third_basis import Sines

from fbexpand import CrossCheck, Dini, Expansion, FourierBessel, RadialTable, crosscheck, expand
from fbexpand.crosscheck.scipy_roots import ScipyRoots

ROBINS = [-1e-300, 0.0, 1e-12, 1.0, 2.5, 1e6, 1e17, -0.5, -3.0, -300.0]


def smooth(r):
    return np.exp(-2.0 * r) * (1.0 + r)


def altered(series, k, factor):
    values = series.coefficients.copy()
    values[..., k - 1] *= factor
    return Expansion._make(series.basis, values, panels=series._origins[0].panels)


class WrongRoot(Dini):
    """Says of its third root what is not quite so."""

    def roots(self, count, start=1):
        """Return the roots, the third off by 1e-9 of itself."""
        found = super().roots(count, start)
        k = np.arange(start, start + count)
        return np.where(k == 3, found * (1.0 + 1e-9), found)


class WrongNorm(Dini):
    """Takes its second norm for 1e-10 more than it is, so that c_2 is 1e-10 less."""

    def norms(self, count, start=1):
        """Return the norms."""
        found = super().norms(count, start)
        k = np.arange(start, start + count)
        return np.where(k == 2, found * (1.0 + 1e-10), found)


@pytest.mark.parametrize("order", [0.0, 0.3, 1.0, 7.5, 60.0])
def test_a_right_series_agrees(order):
    series = expand(lambda r: r**order * smooth(r), FourierBessel(order, 2.0), terms=40)
    check = crosscheck(series, lambda r: r**order * smooth(r), indices=[1, 2, 3, 17, 40])
    assert check.all_agree, check
    assert check.wrong == ()


@pytest.mark.parametrize("order", [0.0, 0.3, 3.0])
@pytest.mark.parametrize("robin", ROBINS)
def test_dini_modes_of_every_kind_agree(order, robin):
    series = expand(lambda r: r**order * smooth(r), Dini(order, 2.0, robin=robin), terms=20)
    check = crosscheck(series, lambda r: r**order * smooth(r), indices=[1, 2, 20])
    assert check.all_agree, check


@pytest.mark.parametrize("order", [0.0, 0.3, 1.0, 60.0])
@pytest.mark.parametrize("shift", [0.0, 1e-12, -1e-12, 1e-3, -1e-3])
def test_the_corner_of_the_first_mode(order, shift):
    robin = -order + shift
    series = expand(lambda r: r**order * smooth(r), Dini(order, robin=robin), terms=3)
    check = crosscheck(series, lambda r: r**order * smooth(r))
    assert check.all_agree, check
    wrong = crosscheck(altered(series, 1, 1.0 + 1e-10), lambda r: r**order * smooth(r))
    assert wrong.wrong == (1,)


@pytest.mark.parametrize(
    "basis", [FourierBessel(), FourierBessel(0.3), Dini(robin=2.0), Dini(2.0, robin=-9.0)], ids=str
)
@pytest.mark.parametrize("k", [1, 2, 15])
@pytest.mark.parametrize("digits", [None, 20])
def test_one_coefficient_off_by_1e_10_is_found(basis, k, digits):
    # the 15th is some 1e-3 of the largest: 1e-13 of that is what both sides claim
    def profile(r):
        return r**basis.order * (1.5 - r)

    series = altered(expand(profile, basis, terms=20), k, 1.0 + 1e-10)
    near = sorted({max(1, k - 1), k, k + 1})
    check = crosscheck(series, profile, indices=near, digits=digits)
    assert check.wrong == (k,)
    assert "differs" in repr(check)
    assert "DISAGREE" in repr(check)


def test_a_wrong_root_is_found():
    basis = WrongRoot(0.0, robin=2.0)
    series = expand(smooth, basis, terms=5)
    check = crosscheck(series, smooth)
    assert check.wrong == (3,)
    assert check.root_difference[2] == pytest.approx(1e-9 * series.basis.roots(1, 3)[0], rel=1e-3)
    assert "root off by" in repr(check)


def test_a_wrong_norm_is_found():
    good = expand(smooth, Dini(robin=2.0), terms=4)
    basis = WrongNorm(0.0, robin=2.0)
    values = good.coefficients * good.basis.norms(4) / basis.norms(4)
    assert crosscheck(Expansion(basis, values), smooth).wrong == (2,)


def test_every_index_shifted_by_one_root_is_found():
    good = expand(smooth, FourierBessel(), terms=6)
    shifted = Expansion(good.basis, good.coefficients[1:])
    assert crosscheck(shifted, smooth).wrong == (1, 2, 3, 4, 5)


def test_the_quadrature_is_right_where_plain_quad_is_not():
    # integral_0^1 r J_0(j_k r) dr = J_1(j_k) / j_k, so that c_k = 2 / (j_k J_1(j_k)): Watson 18.1
    k = [270, 500, 2000]
    j = jn_zeros(0, 2000)[np.array(k) - 1]
    series = expand(lambda r: np.ones_like(r), FourierBessel(), terms=2000)
    check = crosscheck(series, lambda r: np.ones_like(r), indices=k)
    assert check.all_agree, check
    np.testing.assert_allclose(check.quadrature, 2.0 / (j * j1(j)), rtol=1e-11)


def test_breaks_are_taken_from_the_series():
    def step(r):
        return np.where(r < 0.3, 1.0, 0.0)

    series = expand(step, FourierBessel(), terms=50, breaks=[0.3])
    check = crosscheck(series, step, indices=[1, 50])
    assert check.all_agree
    j = jn_zeros(0, 50)
    np.testing.assert_allclose(check.quadrature, (2 * 0.3 * j1(0.3 * j) / (j * j1(j) ** 2))[[0, 49]], rtol=1e-11)
    bare = Expansion(series.basis, series.coefficients)  # does not know its profile
    assert crosscheck(bare, step, indices=[1, 50], breaks=[0.3]).all_agree


def test_a_table_is_checked_as_what_it_stands_for():
    r = np.array([0.0, 0.1, 0.35, 0.5, 0.8, 1.0])
    for between in ("cubic", "linear", "monotone"):
        table = RadialTable(r, np.cos(r), between=between)
        series = expand(table, Dini(robin=0.7), terms=12)
        assert crosscheck(series, table).all_agree
        assert crosscheck(altered(series, 4, 1.0 + 1e-10), table).wrong == (4,)


def test_the_function_behind_a_table_is_within_what_the_table_claims():
    r = np.linspace(0.0, 1.0, 30)
    series = expand(RadialTable(r, np.cos(r)), Dini(robin=0.7), terms=4)
    check = crosscheck(series, np.cos)
    assert check.all_agree
    assert check.allowed.max() > 1e-9


def test_complex_batches():
    scale = np.array([[1.0], [2.0 - 1j], [0.0]])
    series = expand(lambda r: scale * smooth(r), FourierBessel(), terms=4)
    check = crosscheck(series, lambda r: scale * smooth(r))
    assert check.agrees.shape == check.ours.shape == check.quadrature.shape == (3, 4)
    assert check.all_agree
    values = series.coefficients.copy()
    values[1, 2] *= 1.0 + 1e-10j
    found = crosscheck(Expansion(series.basis, values), lambda r: scale * smooth(r))
    assert np.argwhere(~found.agrees).tolist() == [[1, 2]]
    assert "1,2" not in repr(found)
    assert "differs" in repr(found)


def test_a_basis_of_the_users_own():
    basis = Sines(2.0)

    def profile(r):
        return np.sqrt(r) * (2.0 - r)

    series = expand(profile, basis, terms=8)
    check = crosscheck(series, profile)
    assert check.all_agree, check
    assert check.source == "the basis"
    assert crosscheck(altered(series, 3, 1.0 + 1e-10), profile).wrong == (3,)

    class Off(Sines):
        def roots(self, count, start=1):
            found = super().roots(count, start)
            return np.where(np.arange(start, start + count) == 2, found * (1.0 + 1e-9), found)

    assert 2 in crosscheck(Expansion(Off(2.0), series.coefficients), profile).wrong


@pytest.mark.parametrize(
    ("order", "robin"), [(0.0, math.inf), (0.3, math.inf), (60.0, math.inf), (0.0, 1.0), (7.5, 1e6)]
)
def test_the_other_roots_are_right_by_mpmath(order, robin):
    roots = ScipyRoots(order, robin)
    for k in (1, 2, 30):
        root, rest, error = roots.root(k)
        with mpmath.workdps(30):
            x = mpmath.mpf(root) + mpmath.mpf(rest)
            if math.isinf(robin):
                exact = mpmath.findroot(lambda t: mpmath.besselj(order, t), x)
            else:
                exact = mpmath.findroot(
                    lambda t: t * mpmath.besselj(order, t, derivative=1) + robin * mpmath.besselj(order, t), x
                )
            assert abs(x - exact) <= error
        assert error <= 2e-12 * root


def test_digits_do_not_touch_the_global_precision():
    before = mpmath.mp.dps
    series = expand(smooth, Dini(robin=1.0), terms=2)
    check = crosscheck(series, smooth, digits=40)
    assert mpmath.mp.dps == before
    assert check.all_agree
    assert "mpmath (40 digits)" in check.source


def test_default_indices_thin_out():
    from fbexpand.crosscheck.check import default_indices

    assert default_indices(5).tolist() == [1, 2, 3, 4, 5]
    many = default_indices(5000)
    assert many[:32].tolist() == list(range(1, 33))
    assert many[-1] == 5000
    assert many.size <= 48


def test_the_record_is_frozen_pickled_and_prints_as_a_table():
    series = expand(smooth, FourierBessel(), terms=3)
    check = crosscheck(series, smooth)
    assert isinstance(check, CrossCheck)
    with pytest.raises(AttributeError):
        check.ours = 0
    with pytest.raises(ValueError, match="read-only"):
        check.ours[0] = 1.0
    again = pickle.loads(pickle.dumps(check))
    assert repr(again) == repr(check)
    assert not again.quadrature.flags.writeable
    lines = repr(check).splitlines()
    assert lines[0].startswith("Cross-check of 3 of 3 coefficients")
    assert lines[1].split() == ["k", "root", "ours", "quadrature", "difference", "allowed"]
    assert [line.split()[0] for line in lines[2:5]] == ["1", "2", "3"]
    assert check.seconds.ours > 0.0
    assert check.seconds.quadrature > 0.0


def test_progress_with_and_without_tqdm(monkeypatch, capfd):
    series = expand(smooth, FourierBessel(), terms=3)
    monkeypatch.setitem(sys.modules, "tqdm", None)
    monkeypatch.setitem(sys.modules, "tqdm.auto", None)
    assert crosscheck(series, smooth, progress=True).all_agree
    assert capfd.readouterr().err == ""
    monkeypatch.undo()
    pytest.importorskip("tqdm")
    assert crosscheck(series, smooth, progress=True).all_agree
    assert "cross-check" in capfd.readouterr().err


def test_bad_input_is_named():
    series = expand(smooth, FourierBessel(), terms=3)
    batch = expand(lambda r: np.array([[1.0], [2.0]]) * smooth(r), FourierBessel(), terms=3)
    for arguments, options, kind, said in (
        ((None, smooth), {}, TypeError, "'expansion'"),
        ((series, 3.0), {}, TypeError, "'profile'"),
        ((series, smooth), {"indices": [0]}, ValueError, "'indices' must be at least 1"),
        ((series, smooth), {"indices": [4]}, ValueError, "'indices' must be at most 3"),
        ((series, smooth), {"indices": [1, 1]}, ValueError, "without duplicates"),
        ((series, smooth), {"indices": []}, ValueError, "'indices'"),
        ((series, smooth), {"indices": [1.5]}, TypeError, "'indices'"),
        ((series, smooth), {"digits": 10}, ValueError, "'digits' must be at least 15"),
        ((series, smooth), {"digits": 20.0}, TypeError, "'digits'"),
        ((series, smooth), {"breaks": ["a"]}, TypeError, "'breaks'"),
        ((series, lambda r: r[:1].repeat(5)), {}, ValueError, "'profile' must return shape"),
        ((series, lambda r: r * math.nan), {}, ValueError, "'profile' must be finite"),
        ((batch, lambda r: np.stack((r, r, r))), {}, ValueError, "'profile' must return shape"),
    ):
        with pytest.raises(kind, match=said):
            crosscheck(*arguments, **options)


def test_mpmath_missing_is_said(monkeypatch):
    series = expand(smooth, FourierBessel(), terms=1)
    monkeypatch.setitem(sys.modules, "mpmath", None)
    with pytest.raises(ImportError, match="pip install mpmath"):
        crosscheck(series, smooth, digits=20)
