"""The two bases: what they are, what they refuse, how they behave as records."""

from __future__ import annotations

import copy
import math
import pickle
import threading
import time

import numpy as np
import pytest
from third_basis import Sines

from fbexpand.bases import Basis, Dini, FourierBessel, same_basis

EPS = 2.0**-52
BASES = [
    FourierBessel(),
    FourierBessel(2.5, 3.0),
    Dini(robin=2.0),
    Dini(1.5, 0.1, robin=-1.0),
    Dini(3.0, 2.0, robin=-3.0),
    Dini(1.0, 5.0, robin=-4.0),
    Dini.neumann(),
    Dini.neumann(7.0, 1e3),
]


@pytest.mark.parametrize("basis", [*BASES, Sines(2.0)], ids=repr)
def test_protocol(basis):
    assert isinstance(basis, Basis)
    assert basis.roots(4).shape == basis.eigenvalues(4).shape == basis.norms(4).shape == (4,)
    r = np.linspace(0.0, basis.radius, 6).reshape(2, 3)
    modes = basis.modes(r, 4)
    assert modes.shape == (2, 3, 4)
    assert modes.dtype == np.float64
    np.testing.assert_array_equal(basis.modes(r, 2, 3), modes[..., 2:])
    np.testing.assert_array_equal(basis.modes(r[0, 1], 4), modes[0, 1])
    np.testing.assert_array_equal(basis.norms(2, start=2), basis.norms(3)[1:])
    eigenvalues = basis.eigenvalues(5)
    assert np.all(np.diff(eigenvalues) > 0)
    assert (eigenvalues[0] < 0) == basis.growing
    np.testing.assert_allclose(np.abs(eigenvalues), (basis.roots(5) / basis.radius) ** 2, rtol=1e-14)
    assert np.all(basis.norms(5) > 0)


def test_what_is_no_basis():
    assert not isinstance(object(), Basis)
    assert not isinstance(np.zeros(3), Basis)


@pytest.mark.parametrize("basis", BASES, ids=repr)
def test_records(basis):
    for twin in (
        pickle.loads(pickle.dumps(basis)),
        copy.copy(basis),
        copy.deepcopy(basis),
        eval(repr(basis)),
    ):
        assert type(twin) is type(basis)
        assert twin.key == basis.key
        assert hash(twin.key) == hash(basis.key)
        assert same_basis(twin, basis)
        assert repr(twin) == repr(basis)
        np.testing.assert_array_equal(
            twin.modes([0.0, basis.radius / 3], 3), basis.modes([0.0, basis.radius / 3], 3)
        )
    assert copy.copy(basis) != basis  # identity
    for name in ("order", "radius"):
        with pytest.raises(AttributeError):
            setattr(basis, name, 2.0)


def test_same_basis():
    assert same_basis(FourierBessel(1, 2), FourierBessel(1.0, 2.0))
    assert not same_basis(FourierBessel(1.0), FourierBessel(2.0))
    assert not same_basis(FourierBessel(), Dini(robin=0.0))
    assert not same_basis(Dini(robin=1.0), Dini(robin=1.0 + EPS))
    assert same_basis(Dini(robin=-0.0), Dini.neumann())
    sines = Sines()
    assert same_basis(sines, sines)
    assert not same_basis(sines, Sines())


def test_parameters():
    basis = Dini(np.float32(0.5), np.int64(3), robin=2)
    assert (basis.order, basis.radius, basis.robin) == (0.5, 3.0, 2.0)
    assert all(type(v) is float for v in (basis.order, basis.radius, basis.robin))
    assert repr(basis) == "Dini(order=0.5, radius=3.0, robin=2.0)"
    assert repr(FourierBessel(-0.0)) == "FourierBessel(order=0.0, radius=1.0)"
    assert not FourierBessel().growing


@pytest.mark.parametrize(
    ("order", "robin", "growing"),
    [
        (0.0, 1e-300, False),
        (0.0, 0.0, False),
        (0.0, -5e-324, True),
        (1.0, -1.0, False),
        (1.0, np.nextafter(-1.0, 0.0), False),
        (1.0, np.nextafter(-1.0, -2.0), True),
        (60.0, -60.0, False),
        (0.1, -0.30000000000000004 + 0.2, True),  # -0.10000000000000003
        (60.0, -1e6, True),
    ],
)
def test_the_corner_is_decided_exactly(order, robin, growing):
    basis = Dini(order, robin=robin)
    first = basis.eigenvalues(1)[0]
    assert basis.growing is growing
    assert np.sign(first) == (-1.0 if growing else (0.0 if robin == -order else 1.0))


def test_from_transfer():
    basis = Dini.from_transfer(25.0, 0.4, 0.03)
    assert basis.radius == 0.03
    assert basis.order == 0.0
    assert basis.robin == pytest.approx(25.0 * 0.03 / 0.4, rel=2 * EPS)
    assert Dini.from_transfer(0.0, 1.0, 2.0, order=1.5).key == Dini(1.5, 2.0, robin=0.0).key
    assert Dini.from_transfer(1e200, 1e200, 1e120).robin == 1e120  # no overflow on the way
    for arguments, name in [
        ((math.nan, 1.0, 1.0), "coefficient"),
        ((1.0, 0.0, 1.0), "conductivity"),
        ((1.0, -2.0, 1.0), "conductivity"),
        ((1.0, 1.0, math.inf), "radius"),
        ((1e300, 1e-300, 1.0), "coefficient"),
    ]:
        with pytest.raises(ValueError, match=f"'{name}'"):
            Dini.from_transfer(*arguments)
    with pytest.raises(TypeError, match="'conductivity'"):
        Dini.from_transfer(1.0, "steel", 1.0)
    with pytest.raises(ValueError, match="'order'"):
        Dini.from_transfer(1.0, 1.0, 1.0, order=-1.0)


BAD_REAL = [None, "1", True, 1j, [1.0], np.array([1.0, 2.0]), object()]


@pytest.mark.parametrize("value", BAD_REAL, ids=repr)
def test_wrong_types(value):
    for name, make in [
        ("order", lambda v: FourierBessel(v)),
        ("radius", lambda v: FourierBessel(0.0, v)),
        ("order", lambda v: Dini(v, robin=1.0)),
        ("radius", lambda v: Dini(0.0, v, robin=1.0)),
        ("robin", lambda v: Dini(robin=v)),
    ]:
        with pytest.raises(TypeError, match=f"'{name}'"):
            make(value)


def test_wrong_values():
    for order in (-1.0, -1e-300, math.nan, math.inf, 1e9, 10**400):
        with pytest.raises(ValueError, match="'order'"):
            FourierBessel(order)
    for radius in (0.0, -1.0, math.nan, math.inf, 1e-200, 1e200):
        with pytest.raises(ValueError, match="'radius'"):
            FourierBessel(0.0, radius)
    for robin in (math.nan, math.inf, -math.inf):
        with pytest.raises(ValueError, match="'robin'"):
            Dini(robin=robin)
    with pytest.raises(TypeError):
        Dini()  # robin has no default
    with pytest.raises(ValueError, match=r"-1\.0"):
        FourierBessel(-1.0)


@pytest.mark.parametrize("method", ["roots", "eigenvalues", "norms", "modes"])
def test_wrong_indices(method):
    basis = Dini(robin=1.0)
    call = getattr(basis, method) if method != "modes" else lambda *a: basis.modes([0.5], *a)
    for bad in (0, -1, 10**30):
        with pytest.raises(ValueError, match="'count'"):
            call(bad)
        with pytest.raises(ValueError, match="'start'"):
            call(1, bad)
    for bad in (1.5, "3", None, True, [1]):
        with pytest.raises(TypeError, match="'count'"):
            call(bad)
        with pytest.raises(TypeError, match="'start'"):
            call(1, bad)
    begun = time.process_time()
    with pytest.raises(ValueError, match="'count'"):
        call(10**13)
    assert time.process_time() - begun < 1.0


def test_too_many_radii_for_the_memory():
    with pytest.raises(ValueError, match="'count'"):
        FourierBessel().modes(np.linspace(0, 1, 10**6), 10**8)


def test_wrong_radii():
    basis = FourierBessel(0.0, 2.0)
    inside = 2.0 * (1.0 + 4.0 * EPS)
    assert np.isfinite(basis.modes([0.0, inside], 2)).all()
    for bad in (-1e-300, np.nextafter(inside, 3.0), math.nan, math.inf, -1.0, 2.1):
        with pytest.raises(ValueError, match=r"'r' .*2\.0.*" + str(float(bad)).replace("+", r"\+")):
            basis.modes([0.5, bad], 2)
    for bad in ("x", None, [1j], [True], [object()]):
        with pytest.raises(TypeError, match="'r'"):
            basis.modes(bad, 2)
    with pytest.raises(ValueError, match="'r'"):
        basis.modes([[1.0], [1.0, 2.0]], 2)
    for bad, kind in ((-1, ValueError), (13, ValueError), (1.0, TypeError), (None, TypeError)):
        with pytest.raises(kind, match="'derivative'"):
            basis.modes(0.5, 2, derivative=bad)


def test_shapes_and_types_of_radii():
    basis = Dini(0.3, robin=-2.0)
    assert basis.modes([], 3).shape == (0, 3)
    assert basis.modes(np.zeros((2, 0)), 3).shape == (2, 0, 3)
    assert basis.modes(0, 3).shape == (3,)
    r = np.linspace(0.0, 1.0, 9)
    np.testing.assert_array_equal(basis.modes(r[::2], 3), basis.modes(r, 3)[::2])
    np.testing.assert_array_equal(basis.modes(np.array([0, 1]), 3), basis.modes([0.0, 1.0], 3))
    np.testing.assert_array_equal(basis.modes(np.float32(0.25), 3), basis.modes(0.25, 3))
    frozen = r.copy()
    frozen.setflags(write=False)
    np.testing.assert_array_equal(basis.modes(frozen, 3), basis.modes(r, 3))


def test_results_belong_to_the_caller():
    basis = Dini(robin=1.0)
    for method in ("roots", "eigenvalues", "norms"):
        first = getattr(basis, method)(3)
        kept = first.copy()
        first[:] = 0.0
        np.testing.assert_array_equal(getattr(basis, method)(3), kept)


def test_start_jumps():
    basis = Dini(0.3, robin=2.0)
    begun = time.process_time()
    root = basis.roots(1, 10**9)[0]
    assert time.process_time() - begun < 0.5
    assert abs(root - np.pi * (10**9 + 0.15 - 0.75)) < 1e-5
    assert basis.norms(1, 10**9)[0] == pytest.approx(1.0 / (np.pi * root), rel=1e-8)
    np.testing.assert_array_equal(basis.roots(5, 40_000), basis.roots(40_004)[-5:])
    np.testing.assert_array_equal(basis.modes(0.3, 4, 32_767), basis.modes(0.3, 32_770)[32_766:])


def test_dilation():
    """Lengths scale: the modes are functions of r/R, the norms go as R^2."""
    for unit in (Dini(1.5, robin=3.0), FourierBessel(0.2), Dini(2.0, robin=-2.5)):
        big = type(unit)(unit.order, 8.0, **({"robin": unit.robin} if isinstance(unit, Dini) else {}))
        x = np.linspace(0.0, 1.0, 23)
        np.testing.assert_array_equal(big.modes(8.0 * x, 5), unit.modes(x, 5))
        np.testing.assert_array_equal(big.norms(5), 64.0 * unit.norms(5))
        np.testing.assert_array_equal(big.eigenvalues(5), unit.eigenvalues(5) / 64.0)
        with np.errstate(invalid="ignore"):
            np.testing.assert_array_equal(
                big.modes(8.0 * x, 5, derivative=2) * 64.0, unit.modes(x, 5, derivative=2)
            )


@pytest.mark.parametrize("basis", BASES, ids=repr)
def test_rim_condition(basis):
    value, slope = (basis.modes(basis.radius, 30, derivative=n) for n in (0, 1))
    if isinstance(basis, FourierBessel):
        np.testing.assert_array_equal(value, np.zeros(30))
        return
    size = np.abs(slope * basis.radius) + np.abs(basis.robin * value)
    assert np.all(np.abs(basis.radius * slope + basis.robin * value) <= 4 * EPS * size)
    if basis.robin < 0:
        assert value[0] == pytest.approx(1.0, abs=2 * EPS)


@pytest.mark.parametrize("robin", [1e6, 1e12, 1e17, 1e300])
def test_large_robin_keeps_the_small_value_at_the_rim(robin):
    """J at a rounded root is noise there; -lambda J' / robin is the value."""
    dini, plain = Dini(1.0, robin=robin), FourierBessel(1.0)
    value, slope = (dini.modes(1.0, 20, derivative=n) for n in (0, 1))
    np.testing.assert_allclose(value, -slope / robin, rtol=4 * EPS)
    np.testing.assert_allclose(slope, plain.modes(1.0, 20, derivative=1), rtol=40 / robin)
    np.testing.assert_allclose(dini.norms(20), plain.norms(20), rtol=40 / robin + 4 * EPS)


def test_axis():
    inf = np.inf
    modes = FourierBessel().modes
    np.testing.assert_array_equal(modes(0.0, 2), [1.0, 1.0])
    np.testing.assert_array_equal(modes(0.0, 2, derivative=1), [0.0, 0.0])
    roots = FourierBessel().roots(2)
    np.testing.assert_allclose(modes(0.0, 2, derivative=2), -0.5 * roots**2, rtol=4 * EPS)
    np.testing.assert_allclose(modes(0.0, 2, derivative=4), 0.375 * roots**4, rtol=8 * EPS)
    roots = FourierBessel(1.0).roots(2)
    np.testing.assert_allclose(FourierBessel(1.0).modes(0.0, 2, derivative=1), 0.5 * roots, rtol=4 * EPS)
    np.testing.assert_allclose(
        FourierBessel(1.0).modes(0.0, 2, derivative=3), -0.375 * roots**3, rtol=8 * EPS
    )
    roots = FourierBessel(3.0).roots(2)
    np.testing.assert_allclose(FourierBessel(3.0).modes(0.0, 2, derivative=3), roots**3 / 8, rtol=8 * EPS)
    for basis in (FourierBessel(0.5), Dini(0.5, robin=-0.5), Dini(0.5, robin=-3.0), Dini(0.5, robin=-0.4)):
        np.testing.assert_array_equal(basis.modes(0.0, 2), [0.0, 0.0])
        np.testing.assert_array_equal(basis.modes(0.0, 2, derivative=1), [inf, inf])
        np.testing.assert_array_equal(basis.modes(0.0, 2, derivative=2), [-inf, -inf])
        np.testing.assert_array_equal(basis.modes(0.0, 2, derivative=3), [inf, inf])
    np.testing.assert_array_equal(FourierBessel(1.5).modes(0.0, 2, derivative=1), [0.0, 0.0])
    np.testing.assert_array_equal(FourierBessel(1.5).modes(0.0, 2, derivative=2), [inf, inf])


def test_half_order_is_sines():
    """phi_k of FourierBessel(1/2) = sqrt(2 / (k pi^2)) times the sine basis's."""
    ours, sines = FourierBessel(0.5, 2.0), Sines(2.0)
    scale = np.sqrt(2.0 / (np.arange(1, 31) * np.pi**2))
    r = np.linspace(0.0, 2.0, 57)
    np.testing.assert_allclose(ours.roots(30), sines.roots(30), rtol=2 * EPS)
    np.testing.assert_allclose(ours.norms(30), scale**2 * sines.norms(30), rtol=8 * EPS)
    np.testing.assert_allclose(ours.modes(r, 30), scale * sines.modes(r, 30), atol=2e-14)


def test_threads_agree():
    expected = Dini(0.77, robin=0.3).modes(np.linspace(0, 1, 50), 900)
    found = []

    def work(count):
        basis = Dini(0.78, robin=0.3)
        for terms in (10, count, 900):
            result = basis.modes(np.linspace(0, 1, 50), terms)
        found.append(result)

    threads = [threading.Thread(target=work, args=(100 * i + 1,)) for i in range(6)]
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join()
    assert len(found) == 6
    assert all(np.array_equal(found[0], other) for other in found)
    assert not np.array_equal(found[0], expected)
