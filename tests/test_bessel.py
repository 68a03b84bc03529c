"""bessel_j as its users call it; accuracy over wide sweeps is in test_reference.py."""

import math
import threading

import numba
import numpy as np
import pytest

from fbexpand import bessel_j, compiled_bessel_j
from fbexpand.kernels.bessel_table import PANELS, WIDTH, X0, X_PHASE
from fbexpand.special import bessel

EPS = 2.0**-52
ORDERS = [0.0, 0.3, 1.0, 6.5, 13.9, 14.0, 50.5, 200.25, 1000.0]


def points(order, seed):
    rng = np.random.default_rng(seed)
    return np.concatenate(
        [
            rng.uniform(0, 1.5 * order + 60, 60),
            10 ** rng.uniform(-8, 17, 60),
            [0.0, 1e-310, 1e300, np.inf, np.nan],
        ]
    )


@pytest.mark.parametrize("order", ORDERS)
def test_bits_do_not_depend_on_neighbours_or_length(order):
    x = points(order, 1)
    whole = bessel_j(order, x)
    np.testing.assert_array_equal(bessel_j(order, x[::-1])[::-1], whole)
    np.testing.assert_array_equal(bessel_j(order, np.tile(x, 40)).reshape(40, -1)[37], whole)
    np.testing.assert_array_equal([bessel_j(order, float(v)) for v in x], whole)
    np.testing.assert_array_equal(np.concatenate([bessel_j(order, x[i : i + 3]) for i in range(0, x.size, 3)]), whole)


def test_a_few_points_at_a_new_order_build_no_table_and_agree_with_it():
    rng = np.random.default_rng(2)
    draws = [*rng.uniform(0, 14, 6), *rng.uniform(14, 100, 6), *rng.uniform(100, 1e4, 6), 20.0, 999.5, 1e4]
    for order in map(float, draws):
        bessel._tables.pop((order, 0.0), None)  # another test may have asked for it
        bessel._asked.pop((order, 0.0), None)
        x = points(order, 3)[::2]
        few = [bessel_j(order, float(v)) for v in x[:40]]
        assert (order, 0.0) not in bessel._tables
        few += [bessel_j(order, float(v)) for v in x[40:]]
        slopes = [float(bessel_j(order + 0.0, x[i : i + 1], derivative=1)[0]) for i in range(20)]
        whole, both = bessel_j(order, x), bessel_j(order, x, derivative=1)
        assert (order, 0.0) in bessel._tables
        np.testing.assert_array_equal(whole, few)
        np.testing.assert_array_equal(both[:20], slopes)


def test_an_order_asked_for_again_and_again_gets_its_table():
    bessel._tables.pop((31.17, 0.0), None)
    for v in np.linspace(1.0, 60.0, bessel._PAYS + 1):
        bessel_j(31.17, float(v))
    assert (31.17, 0.0) in bessel._tables


@pytest.mark.parametrize("order", [14.0, 40.3, 99.9, 150.25, 1234.5, 9999.9])
def test_parts_of_a_table_agree_where_they_meet(order):
    """Neighbouring panels come from expansions at different places: two roads to the values between them."""
    table = bessel.table_of(order)
    start, width, panels, end = (table[i] for i in (X0, WIDTH, PANELS, X_PHASE))
    seams = start + width * np.arange(1, panels)
    low, high = bessel_j(order, np.nextafter(seams, 0.0)), bessel_j(order, seams)
    slopes = bessel_j(order, seams, derivative=1)
    modulus = np.where(seams < order, np.abs(high), np.sqrt(2 / np.pi / end))
    gap = np.abs(high - low - slopes * np.spacing(np.nextafter(seams, 0.0)))
    assert np.max(gap / np.maximum(modulus, 1e-290)) <= 4 * EPS
    before = np.nextafter(end, 0.0)
    at_end, slope = bessel_j(order, np.array([before, end])), bessel_j(order, np.array([end]), derivative=1)
    assert abs(at_end[1] - at_end[0] - slope[0] * (end - before)) <= 4 * EPS * np.sqrt(2 / np.pi / end)


def test_the_cache_is_bounded():
    for order in np.random.default_rng(4).uniform(2000, 4000, 200):
        bessel_j(order, np.full(9, order))
    assert sum(t.nbytes for t in bessel._tables.values()) <= bessel._KEPT_BYTES


@pytest.mark.parametrize("order", [0.0, 3.0, 0.3, 25.5])
@pytest.mark.parametrize("n", [1, 2, 3, 4])
def test_derivatives_against_ball_arithmetic(order, n):
    from flint import arb, ctx

    ctx.prec = 300
    rng = np.random.default_rng(5)
    x = np.concatenate([rng.uniform(0.01, 2 * order + 60, 60), 10 ** rng.uniform(-3, 6, 30)])
    ours = bessel_j(order, x, derivative=n)
    for v, value in zip(x, ours, strict=True):
        # 2^n J^(n) = sum (-1)^k C(n, k) J_{nu - n + 2k}, DLMF 10.6.7, and the same for Y
        terms = [(-1) ** k * math.comb(n, k) for k in range(n + 1)]
        j = sum(c * arb(v).bessel_j(arb(order) - n + 2 * k) for k, c in enumerate(terms)) / 2**n
        y = sum(c * arb(v).bessel_y(arb(order) - n + 2 * k) for k, c in enumerate(terms)) / 2**n
        scale = float((j * j + y * y).sqrt()) if v >= order else abs(float(j)) * (10 + 10 * order)
        assert abs(float(arb(float(value)) - j)) <= 8 * EPS * scale + 1e-320, (v, value)


def test_parity_at_integer_order():
    x = np.linspace(0.1, 90, 50)
    for order in (0, 1, 2, 7):
        for n in range(4):
            np.testing.assert_array_equal(
                bessel_j(order, -x, derivative=n), (-1) ** (order + n) * bessel_j(order, x, derivative=n)
            )


def test_shapes_and_orders_that_broadcast():
    x = np.linspace(0, 30, 7)
    table = bessel_j(np.array([[0.0], [2.5], [0.0]]), x)
    assert table.shape == (3, 7)
    for row, order in zip(table, (0.0, 2.5, 0.0), strict=True):
        np.testing.assert_array_equal(row, bessel_j(order, x))
    assert isinstance(bessel_j(0, 1), np.float64)
    assert bessel_j(0.5, np.zeros((0, 3))).shape == (0, 3)
    assert bessel_j([], []).shape == (0,)
    assert bessel_j(0, np.float32(1.5)) == bessel_j(0.0, 1.5)


def test_limits():
    np.testing.assert_array_equal(bessel_j(0.0, [0.0, np.inf, np.nan]), [1.0, 0.0, np.nan])
    np.testing.assert_array_equal(bessel_j(0.3, [0.0, np.inf, np.nan]), [0.0, 0.0, np.nan])
    np.testing.assert_array_equal(bessel_j([0, 1, 0.5, 2], 0.0, derivative=1), [0.0, 0.5, np.inf, 0.0])


@pytest.mark.parametrize(
    ("kind", "name", "call"),
    [
        (TypeError, "order", lambda: bessel_j("0", 1.0)),
        (TypeError, "order", lambda: bessel_j(None, 1.0)),
        (TypeError, "order", lambda: bessel_j(1j, 1.0)),
        (TypeError, "x", lambda: bessel_j(0, "one")),
        (TypeError, "x", lambda: bessel_j(0, 1j)),
        (TypeError, "derivative", lambda: bessel_j(0, 1.0, derivative=1.0)),
        (ValueError, "order", lambda: bessel_j(-1.0, 1.0)),
        (ValueError, "order", lambda: bessel_j(np.nan, 1.0)),
        (ValueError, "order", lambda: bessel_j(np.inf, 1.0)),
        (ValueError, "order", lambda: bessel_j(1.1e6, 1.0)),
        (ValueError, "x", lambda: bessel_j(0.5, -1.0)),
        (ValueError, "x", lambda: bessel_j([0.5, 1.5], [1.0, 2.0, 3.0])),
        (ValueError, "derivative", lambda: bessel_j(0, 1.0, derivative=5)),
        (ValueError, "derivative", lambda: bessel_j(0, 1.0, derivative=-1)),
        (TypeError, "order", lambda: compiled_bessel_j("a")),
        (ValueError, "order", lambda: compiled_bessel_j(-0.1)),
    ],
)
def test_bad_input_names_the_argument(kind, name, call):
    with pytest.raises(kind, match=repr(name)) as caught:
        call()
    assert caught.value.name == name


@pytest.mark.parametrize("order", ORDERS)
def test_compiled_function_has_the_same_bits(order):
    compiled = compiled_bessel_j(order)
    evaluate = compiled.evaluate

    @numba.njit
    def loop(data, x, out):
        for i in range(x.size):
            out[i] = evaluate(data, x[i])

    x = points(order, 6)
    out = np.empty_like(x)
    loop(compiled.data, x, out)
    np.testing.assert_array_equal(out, bessel_j(order, x))
    other = compiled_bessel_j(order + 0.5)
    assert other.evaluate is compiled.evaluate
    loop(other.data, x, out)
    np.testing.assert_array_equal(out, bessel_j(order + 0.5, x))
    assert not numba.extending.is_jitted(loop) or len(loop.signatures) == 1
    assert np.isnan(evaluate(compiled.data, -1.0))


def test_bound_function():
    bound = compiled_bessel_j(2.5).bind()
    assert bound(3.75) == bessel_j(2.5, 3.75)


def test_threads_share_tables():
    x = np.linspace(0, 200, 5000)
    orders = [0.1 * k + 0.01 for k in range(8)] + [20.0 + k for k in range(4)]
    results: dict[int, list[np.ndarray]] = {}

    def work(name):
        if name % 2:
            results[name] = [bessel_j(order, x) for order in orders]
        else:
            results[name] = [np.array([bessel_j(order, float(v)) for v in x[:50]]) for order in orders]

    threads = [threading.Thread(target=work, args=(i,)) for i in range(6)]
    for t in threads:
        t.start()
    for t in threads:
        t.join()
    for i in range(6):
        for mine, first in zip(results[i], results[1], strict=True):
            np.testing.assert_array_equal(mine, first[: mine.size])
