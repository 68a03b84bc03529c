"""Zeros of J_nu and Dini roots against ball arithmetic, and the structure they must have."""

from __future__ import annotations

import json
import math
import random
import threading
import time
from fractions import Fraction
from pathlib import Path

import mpmath
import numpy as np
import pytest
import scipy.special
from proven_roots import changes_sign, condition_of, nearest_zero_index

from fbexpand.kernels import roots_dini, roots_mcmahon
from fbexpand.special import roots
from fbexpand.special.roots import bessel_zeros, dini_roots, dini_two_part, zeros_two_part

REFERENCE = json.loads((Path(__file__).parent / "reference" / "roots.json").read_text())
LOW_PART = 1e-19  # what high + low is held to, relative


def ulps(value, high, low):
    """How many units in the last place of the true root `value` is off."""
    return float(abs(Fraction(value) - high - low) / Fraction(math.ulp(float(high))))


def relative(pair, high, low):
    return float(abs(Fraction(float(pair[0])) + Fraction(float(pair[1])) - high - low) / high)


@pytest.mark.parametrize("family", ["zeros", "dini"])
def test_reference_roots(family, capsys):
    allowed = 1.0 if family == "zeros" else 2.0
    bands = {}
    for row in REFERENCE[family]:
        order, k = float.fromhex(row[0]), row[-3]
        high, low = (Fraction(float.fromhex(text)) for text in row[-2:])
        if family == "zeros":
            value = bessel_zeros(order, 1, k)[0]
            pair = zeros_two_part(order, 1, k)
        else:
            robin = float.fromhex(row[1])
            value = dini_roots(order, robin, 1, k)[0]
            pair = dini_two_part(order, robin, 1, k)
        assert value == pair[0][0]
        band = next(top for top in (5.0, 100.0, 1000.0, 1e4) if order <= top)
        errors = ulps(value, high, low), relative((pair[0][0], pair[1][0]), high, low)
        bands.setdefault(band, []).append(errors)
    assert len(bands) == 4
    with capsys.disabled():
        for band, errors in sorted(bands.items()):
            worst, worst_pair = (max(column) for column in zip(*errors, strict=True))
            print(f"\n{family:5} order <= {band:7g}: {len(errors):4} roots, {worst:.3f} ulp, ", end="")
            print(f"with the low part {worst_pair:.1e}", end="")
            assert worst <= allowed
            assert worst_pair <= LOW_PART


def draw(rng, top):
    """An order, a Robin coefficient and an index, corners and the joints of the methods included."""
    order = rng.choice(
        [
            float(rng.randint(0, int(top))),
            rng.randint(0, int(top)) + 0.5,
            rng.uniform(0.0, top),
            10.0 ** rng.uniform(-300.0, 0.0),
            10.0 ** rng.uniform(-3.0, math.log10(top)),
        ]
    )
    sign = rng.choice([1.0, -1.0])
    robin = rng.choice(
        [
            10.0 ** rng.uniform(-300.0, 300.0),
            -(10.0 ** rng.uniform(-300.0, 6.0)),
            sign * 10.0 ** rng.uniform(-9.0, 6.0),
            math.nextafter(-order, sign * math.inf),
            -order + sign * rng.choice([1e-300, 1e-12]),
            -order + sign * 10.0 ** rng.uniform(-18.0, 3.0),
            order,
            0.0,
        ]
    )
    table = roots._phase(order)
    joint = rng.choice(
        [
            table.zeros_inside,
            int(roots_mcmahon.mcmahon_start(order)) - 1,
            roots_dini.dini_inside(order, robin, table.panels),
        ]
    )
    index = rng.choice([1, 1, 2, 3, rng.randint(1, 30), int(10.0 ** rng.uniform(0.0, 9.0)), joint, joint + 1])
    return order, robin, max(index, 1)


def sweep(seed, samples, top):
    rng = random.Random(seed)
    for _ in range(samples):
        order, robin, k = draw(rng, top)
        high, low = zeros_two_part(order, 2, max(k - 1, 1))
        at = 1 if k > 1 else 0
        case = f"order {order!r} robin {robin!r} k {k}"
        assert changes_sign(condition_of(order, None, k), high[at], low[at], "1e-19"), case
        found, off = nearest_zero_index(order, float(high[at]))
        assert found == k or k > 10**6, case
        assert off < 0.1 or k > 10**6, case
        root, root_low = dini_two_part(order, robin, 1, k)
        if k == 1 and robin + order == 0.0:
            assert root[0] == 0.0, case
            continue
        assert changes_sign(condition_of(order, robin, k), root[0], root_low[0], "1e-19"), case
        if k > 1:
            assert high[0] <= root[0] <= high[1], case
        elif robin + order > 0.0:
            assert 0.0 < root[0] <= high[0], case


@pytest.mark.parametrize(("seed", "samples", "top"), [(1, 1200, 60.0), (2, 150, 1000.0)])
def test_roots_lie_where_the_function_changes_sign(seed, samples, top):
    sweep(seed, samples, top)


@pytest.mark.deep
@pytest.mark.parametrize(
    ("seed", "samples", "top"), [(11, 6000, 5.0), (12, 6000, 100.0), (13, 1500, 1000.0), (14, 300, 1e4)]
)
def test_roots_lie_where_the_function_changes_sign_widely(seed, samples, top):
    sweep(seed, samples, top)


def test_order_one_half_is_a_multiple_of_pi():
    with mpmath.workprec(200):
        for k in [1, 2, 3, 9, 10, 11, 99, 1000, 12345, 10**6 + 1, 10**9]:
            assert bessel_zeros(0.5, 1, k)[0] == float(k * mpmath.pi)
        for k in [1, 5, 30, 4000]:  # x J' + J/2 is sqrt(2 x / pi) cos x
            assert dini_roots(0.5, 0.5, 1, k)[0] == float((k - mpmath.mpf(1) / 2) * mpmath.pi)


@pytest.mark.parametrize("order", [1.0, 1.5, 2.0, 7.0, 33.25, 60.0, 512.0])
def test_recurrences_turn_dini_roots_into_zeros(order):
    # x J' - nu J = -x J_{nu+1} and x J' + nu J = x J_{nu-1}
    assert dini_roots(order, -order, 1)[0] == 0.0
    high, low = dini_two_part(order, -order, 40, 2)
    above, above_low = zeros_two_part(order + 1.0, 40)
    np.testing.assert_array_equal(high, above)
    np.testing.assert_allclose(low, above_low, rtol=0, atol=1e-19 * above.max())
    high, low = dini_two_part(order, order, 40)
    below, below_low = zeros_two_part(order - 1.0, 40)
    np.testing.assert_array_equal(high, below)
    np.testing.assert_allclose(low, below_low, rtol=0, atol=1e-19 * below.max())


@pytest.mark.parametrize("order", [0.0, 0.3, 0.5, 3.0, 50.5, 700.0, 10000.0])
def test_spacing_is_monotone(order):
    high, low = zeros_two_part(order, 3000)
    gap = np.diff(high) + np.diff(low)
    rounding = 4.0 * np.spacing(high[1:])
    if order == 0.5:
        assert np.all(np.abs(gap - math.pi) <= rounding)
    elif order < 0.5:
        assert np.all(gap < math.pi + rounding)
        assert np.all(np.diff(gap) > -rounding[1:])
        assert gap[0] < math.pi - 1e-3
    else:
        assert np.all(gap > math.pi - rounding)
        assert np.all(np.diff(gap) < rounding[1:])
        assert gap[0] > math.pi + 1e-3


@pytest.mark.parametrize("order", [0.0, 0.3, 63.9, 1234.5])
@pytest.mark.parametrize("robin", [None, -1e6, -70.0, -1e-3, 0.0, 2.5, 1e5, 1e17, 1e300])
def test_arrays_increase_and_do_not_depend_on_their_length(order, robin):
    def compute(count, start):
        return bessel_zeros(order, count, start) if robin is None else dini_roots(order, robin, count, start)

    whole = compute(4000, 1)
    begin = 1 if robin is not None and robin + order < 0.0 else 0
    assert np.all(np.diff(whole[begin:]) > 0.0)
    rng = random.Random(5)
    for start in [1, 2, 3] + [rng.randint(1, 3900) for _ in range(12)]:
        count = rng.randint(1, 80)
        np.testing.assert_array_equal(compute(count, start), whole[start - 1 : start - 1 + count])


def test_chunks_join():
    zeros = bessel_zeros(2.25, 200_000)
    assert np.all(np.diff(zeros) > 0.0)
    for k in [65535, 65536, 65537, 131072, 131073, 200_000]:
        assert zeros[k - 1] == bessel_zeros(2.25, 1, k)[0]
    found = dini_roots(2.25, 3.0, 70_000, 2)
    assert np.all(np.diff(found) > 0.0)
    assert found[65536] == dini_roots(2.25, 3.0, 1, 65538)[0]


@pytest.mark.parametrize("order", [0.0, 1e-300, 0.7, 7.0, 60.0, 1e4])
def test_corner(order):
    assert dini_roots(order, -order, 1)[0] == 0.0
    for sign in (1.0, -1.0):
        steps = [1e-300, 1e-40, 1e-12] if order == 0.0 else [1e-12, math.ulp(order)]
        for step in steps:
            robin = -order + sign * step
            shift = Fraction(order) + Fraction(robin)
            if shift == 0:
                continue
            with mpmath.workprec(200):
                s = mpmath.mpf(shift.numerator) / mpmath.mpf(shift.denominator)
                nu = mpmath.mpf(order)
                # s = y / (2 (nu + 1)) (1 + y / (4 (nu + 1) (nu + 2)) + ...)
                square = 2 * (nu + 1) * s * (1 - s / (2 * (nu + 2)))
                expected = mpmath.sqrt(abs(square))
                high, low = dini_two_part(order, robin, 1)
                error = abs(mpmath.mpf(float(high[0])) + mpmath.mpf(float(low[0])) - expected) / expected
                assert error < max(1e-19, float(s) ** 2)
            assert dini_roots(order, robin, 1)[0] == high[0]


@pytest.mark.parametrize("order", [0.0, 2.0, 30.25])
@pytest.mark.parametrize("robin", [1e6, 1e9, 1e12, -1e6])
def test_large_robin_crowds_the_zero(order, robin):
    # near j, J = J'(j) (x - j): x - j = -j / robin to first order
    k = 1 if robin > 0.0 else 2
    high, low = dini_two_part(order, robin, 50, k)
    zero, zero_low = zeros_two_part(order, 50)
    difference = (high - zero) + (low - zero_low)
    np.testing.assert_allclose(difference, -zero / robin, rtol=3.0 / abs(robin) + 1e-18 * abs(robin))
    assert np.all(difference * robin < 0.0)


@pytest.mark.parametrize("order", [0.0, 0.3, 12.0, 300.5, 10000.0])
def test_first_zero_by_the_fraction_and_by_the_phase(order):
    # the continued fraction and the phase share nothing
    high, low = dini_two_part(order, 1e300, 1)
    zero, zero_low = zeros_two_part(order, 1)
    assert high[0] == zero[0]
    assert abs(low[0] - zero_low[0]) < 1e-21 * zero[0]


def test_growing_root_joins_its_expansion():
    for order in [0.0, 3.5, 80.0]:
        edge = -order - (60.0 + 5.0 * order)
        robins = edge + np.linspace(-2.0, 2.0, 41)
        mu = np.array([dini_roots(order, robin, 1)[0] for robin in robins])
        assert np.all(np.diff(mu) < 0.0)
        assert np.all(np.abs(np.diff(mu, 2)) < 1e-2)
    assert dini_roots(3.0, -1e308, 1)[0] == 1e308


def test_against_scipy():
    np.testing.assert_allclose(bessel_zeros(0, 5000), scipy.special.jn_zeros(0, 5000), rtol=1e-13)


def test_threads_agree():
    orders = [0.1 * i for i in range(60)]
    expected = [bessel_zeros(order, 30) for order in orders]
    roots._tables.clear()
    failures = []

    def work():
        for order, want in zip(orders, expected, strict=True):
            if not np.array_equal(bessel_zeros(order, 30), want):
                failures.append(order)

    threads = [threading.Thread(target=work) for _ in range(8)]
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join()
    assert failures == []
    assert len(roots._tables) <= 64


WRONG_TYPE = [
    ("order", (1j, 3)),
    ("order", ("1", 3)),
    ("order", (None, 3)),
    ("order", (True, 3)),
    ("order", ([1.0, 2.0], 3)),
    ("count", (1.0, 3.0)),
    ("count", (1.0, "3")),
    ("start", (1.0, 3, 1.0)),
    ("start", (1.0, 3, None)),
]
WRONG_VALUE = [
    ("order", (-1.0, 3)),
    ("order", (math.nan, 3)),
    ("order", (math.inf, 3)),
    ("order", (1e7, 3)),
    ("order", (10**400, 3)),
    ("count", (1.0, 0)),
    ("count", (1.0, -2)),
    ("count", (1.0, 10**14)),
    ("count", (1.0, 10**400)),
    ("count", (1.0, 3, 2**50)),
    ("start", (1.0, 3, 0)),
    ("start", (1.0, 3, 2**60)),
]


@pytest.mark.parametrize("exception", [TypeError, ValueError])
def test_bad_input(exception):
    for name, (order, *rest) in WRONG_TYPE if exception is TypeError else WRONG_VALUE:
        begin = time.process_time()
        with pytest.raises(exception, match=f"'{name}'"):
            bessel_zeros(order, *rest)
        with pytest.raises(exception, match=f"'{name}'"):
            dini_roots(order, 1.0, *rest)
        assert time.process_time() - begin < 1.0
    wrong_type = [1j, 1 + 0j, np.complex128(2.0), "1", None, [1.0]]
    for robin in wrong_type if exception is TypeError else [math.nan, math.inf, -math.inf]:
        with pytest.raises(exception, match="'robin'"):
            dini_roots(1.0, robin, 3)


def test_integers_and_numpy_scalars_are_numbers():
    want = bessel_zeros(2.0, 3, 4)
    np.testing.assert_array_equal(bessel_zeros(2, np.int32(3), np.int64(4)), want)
    np.testing.assert_array_equal(bessel_zeros(np.float32(2), 3, 4), want)
    np.testing.assert_array_equal(dini_roots(2, 1, 3), dini_roots(2.0, np.float64(1.0), 3))
    np.testing.assert_array_equal(bessel_zeros(-0.0, 3), bessel_zeros(0.0, 3))
    assert want.dtype == np.float64
    assert want.shape == (3,)
