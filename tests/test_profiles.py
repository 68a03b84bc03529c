"""Profiles resolved into panels: how often they are sampled, how well they are known, what is refused."""

from __future__ import annotations

import math
import pickle
from concurrent.futures import ThreadPoolExecutor

import numpy as np
import pytest
from numpy.polynomial import chebyshev, legendre

from fbexpand.exceptions import ArgumentValueError
from fbexpand.profiles.panels import Panels
from fbexpand.profiles.resolve import resolve

EPS = 2.0**-52

# name: (profile, where it is not smooth)
SMOOTH = {
    "constant": lambda r: 2.0,
    "parabola": lambda r: 1.0 - r * r,
    "gaussian": lambda r: np.exp(-3.0 * r * r),
    "cos 5r": lambda r: np.cos(5.0 * r),
    "complex": lambda r: np.exp((2.0j - 1.0) * r),
}
HARD = {
    "jump": lambda r: np.where(r < 0.4321, 1.0, 0.0),
    "kink": lambda r: np.abs(r - 0.4321),
    "spike": lambda r: np.exp(-0.5 * ((r - 0.4321) / 2e-4) ** 2),
    "root at the rim": lambda r: np.sqrt(1.0 - r),
    "r^0.3": lambda r: r**0.3,
    "cos 500 r": lambda r: np.cos(500.0 * r),
    "layer": lambda r: np.tanh((r - 0.5) / 1e-4),
    "pole beside": lambda r: 1.0 / (1e-6 + (r - 0.3) ** 2),
    "bump": lambda r: np.where(r < 0.7, np.exp(-1.0 / np.maximum(0.49 - r * r, 1e-300)), 0.0),
    "log": np.log,
}


def radii(count=4001, seed=3):
    """Random radii in (0, 1), and some close to either end."""
    inside = np.random.default_rng(seed).random(count)
    near = 2.0 ** -np.arange(2.0, 50.0)
    return np.concatenate((inside, near, 1.0 - near))


@pytest.mark.parametrize("name", sorted(SMOOTH))
def test_smooth_profiles_take_one_panel(name):
    panels = resolve(SMOOTH[name], (), 1.0)
    assert panels.edges.tolist() == [0.0, 1.0]
    assert panels.evaluations <= 1000
    r = radii()
    exact = SMOOTH[name](r)
    assert np.abs(panels(r) - exact).max() <= 40 * EPS * np.abs(exact).max()


@pytest.mark.parametrize("name", sorted(HARD))
def test_hard_profiles_are_known_to_rounding_in_l2(name):
    """The L2 error is within the residual's, and small; points beside a jump count as little as they should."""
    panels = resolve(HARD[name], (), 1.0)
    assert panels.evaluations <= 12_000
    x, w = legendre.leggauss(40)
    half = 0.5 * np.diff(panels.edges)[:, None]
    r = panels.edges[:-1, None] + half * (1.0 + x)
    wide = half[:, 0] > 1e-12  # what lies between two neighbouring doubles is nobody's
    weights = (half * w * r)[wide].ravel()
    r = r[wide].ravel()
    difference = np.abs(panels(r) - HARD[name](r))
    error = math.sqrt(np.sum(difference**2 * weights))
    norm = math.sqrt(np.sum(np.abs(HARD[name](r)) ** 2 * weights))
    rings = 0.5 * np.diff(panels.edges) * (panels.edges[1:] + panels.edges[:-1])
    claimed = math.sqrt(np.sum(panels.residual**2 * rings))
    # rounding of the radius shows where f is steep
    derivative = chebyshev.chebval(x, chebyshev.chebder(panels.coefficients, axis=-1).T) / half
    steep = EPS * math.sqrt(np.sum(np.abs(r * derivative[wide].ravel()) ** 2 * weights))
    assert error <= claimed + 1e-14 * norm + steep
    assert claimed <= 1e-12 * norm
    assert panels.norm() == pytest.approx(norm, rel=1e-11)


def test_breaks_need_no_search():
    free = resolve(HARD["jump"], (), 1.0)
    given = resolve(HARD["jump"], (0.4321,), 1.0)
    assert given.edges.tolist() == [0.0, 0.4321, 1.0]
    assert given.evaluations < free.evaluations / 3
    assert given(np.array([np.nextafter(0.4321, 0.0), 0.4321])).tolist() == pytest.approx([1.0, 0.0], abs=1e-14)


def test_axis_rim_and_breaks_are_never_sampled():
    seen = []

    def profile(r):
        seen.append(r.copy())
        return np.where(r < 0.3, np.sqrt(r), 2.0 - np.abs(r - 0.6) ** 0.5)

    resolve(profile, (0.3, 0.6), 2.0)
    seen = np.concatenate(seen)
    assert seen.min() > 0.0
    assert seen.max() < 2.0
    assert not np.isin(seen, [0.3, 0.6]).any()


def test_evaluations_are_counted():
    count = 0

    def profile(r):
        nonlocal count
        count += r.size
        return np.abs(r - 0.2)

    assert resolve(profile, (), 1.0).evaluations == count


def test_noise_is_not_chased():
    """Noise far below the profile ends the division, and its level is the residual."""
    noise = np.random.default_rng(5).standard_normal(1 << 16)

    def profile(r):
        return np.cos(r) + 1e-9 * noise[(r * 65_521).astype(int)]

    panels = resolve(profile, (), 1.0)
    assert panels.evaluations < 5000
    assert 1e-10 < panels.residual.max() < 1e-7


def test_single_precision_profile():
    panels = resolve(lambda r: np.exp(-(r.astype(np.float32) ** 2)), (), 1.0)
    assert panels.evaluations < 5000
    r = radii()
    error = np.abs(panels(r) - np.exp(-r * r)).max()
    assert error <= 3e-7
    assert 1e-8 < panels.residual.max() < 1e-5


def test_batch_shapes_broadcast():
    r = radii(50)
    for shape in ((), (3,), (2, 3)):
        factors = np.arange(1.0, 1.0 + math.prod(shape)).reshape(shape)
        panels = resolve(lambda r, f=factors: f[..., None] * np.cos(r), (), 1.0)
        assert panels.batch_shape == shape
        assert panels(r).shape == (*shape, r.size)
        np.testing.assert_allclose(panels(r), factors[..., None] * np.cos(r), rtol=0, atol=1e-13)
    assert resolve(lambda r: np.ones((4, 1)), (), 1.0)(r).shape == (4, r.size)
    np.testing.assert_allclose(resolve(lambda r: 3, (), 1.0)(r), np.full(r.size, 3.0), rtol=1e-14)


def test_one_hard_profile_does_not_spoil_the_others():
    """Sizes apart by 1e26: every profile has its own scale and its own residual."""
    profiles = [lambda r: 1e-20 * np.cos(3 * r), lambda r: np.where(r < 0.4321, 1e6, 0.0), lambda r: np.exp(-r)]
    together = resolve(lambda r: np.stack([f(r) for f in profiles]), (), 1.0)
    r = radii()
    for i, profile in enumerate(profiles):
        if i != 1:
            exact = profile(r)
            scale = np.abs(exact).max()
            assert np.abs(together(r)[i] - exact).max() <= 1e-13 * scale
            assert together.residual[i].max() <= 1e-13 * scale


@pytest.mark.parametrize("scale", [1e-300, 1e-150, 1e150, 1e300])
def test_scale_does_not_matter(scale):
    plain = resolve(lambda r: np.cos(3 * r), (), 1.0)
    scaled = resolve(lambda r: scale * np.cos(3 * r), (), 1.0)
    assert scaled.evaluations == plain.evaluations
    r = radii(200)
    np.testing.assert_allclose(scaled(r) / scale, plain(r), rtol=0, atol=12 * EPS)


def test_zero_profile():
    panels = resolve(lambda r: 0.0 * r, (0.5,), 1.0)
    assert not panels.coefficients.any()
    assert not panels.residual.any()
    assert panels.norm() == 0.0


def test_a_profile_may_write_into_its_argument():
    panels = resolve(lambda r: np.multiply(r, r, out=r), (), 1.0)
    np.testing.assert_allclose(panels(np.array([0.5])), [0.25], rtol=1e-14)


def test_panels_are_values():
    """The record against Chebyshev sums by NumPy; edges belong to the right; frozen, read-only, picklable."""
    rng = np.random.default_rng(1)
    panels = Panels(np.array([0.0, 0.25, 1.0]), rng.standard_normal((3, 2, 5)), np.zeros((3, 2)), 7)
    r = np.linspace(0.0, 1.0, 33)
    expected = np.empty((3, 33))
    for j, x in enumerate(r):
        p = 0 if x < 0.25 else 1
        t = 2.0 * (x - panels.edges[p]) / (panels.edges[p + 1] - panels.edges[p]) - 1.0
        expected[:, j] = chebyshev.chebval(t, panels.coefficients[:, p].T)
    np.testing.assert_allclose(panels(r), expected, rtol=0, atol=1e-14)
    again = pickle.loads(pickle.dumps(panels))
    assert np.array_equal(again(r), panels(r))
    assert panels != again
    for array in (panels.edges, panels.coefficients, again.coefficients):
        assert not array.flags.writeable
    with pytest.raises(AttributeError):
        panels.evaluations = 3


def test_threads_agree():
    def work(i):
        return resolve(lambda r: np.cos((3 + i % 4) * r), (0.3 + 0.1 * (i % 3),), 1.0).coefficients

    with ThreadPoolExecutor(4) as pool:
        found = list(pool.map(work, range(24)))
    for i, coefficients in enumerate(found):
        assert np.array_equal(coefficients, work(i))


class TestRefusals:
    @pytest.mark.parametrize(
        "profile",
        [
            lambda r: np.ones(7),
            lambda r: np.ones((r.size, 2)),
            lambda r: np.ones(0),
            lambda r: np.ones((0, r.size)),
            lambda r: "text",
            lambda r: None,
            lambda r: r < 0.5,
            lambda r: np.array([object()] * r.size),
            lambda r: [[1.0], [1.0, 2.0]],
        ],
    )
    def test_wrong_shape_or_no_numbers(self, profile):
        with pytest.raises(ValueError, match="'profile'"):
            resolve(profile, (), 1.0)

    def test_shape_that_changes(self):
        def profile(r):
            return np.stack([np.abs(r - 0.2)] * (2 if r.size > 700 else 3))

        with pytest.raises(ValueError, match="'profile'"):
            resolve(profile, (), 1.0)

    @pytest.mark.parametrize("bad", [np.nan, np.inf, -np.inf])
    def test_not_finite_names_the_radius(self, bad):
        message = r"'profile' must be finite \(got -?(nan|inf).* at r = 0\.5"
        with pytest.raises(ArgumentValueError, match=message) as info:
            resolve(lambda r: np.where((r > 0.5) & (r < 0.6), bad, 1.0), (), 1.0)
        assert info.value.name == "profile"

    @pytest.mark.parametrize(
        "profile", [lambda r: math.exp(-r), lambda r: 1.0 if r < 0.5 else 0.0, lambda r: max(0.0, 1.0 - r)]
    )
    def test_not_vectorised(self, profile):
        with pytest.raises(ValueError, match="'profile' must accept an array"):
            resolve(profile, (), 1.0)

    @pytest.mark.parametrize("error", [KeyError("mine"), ValueError("mine"), TypeError("mine"), OSError(3, "mine")])
    def test_own_exceptions_pass_through(self, error):
        def profile(r):
            raise error

        with pytest.raises(type(error)) as info:
            resolve(profile, (), 1.0)
        assert info.value is error


def test_masked_values_of_a_profile_are_refused():
    def profile(r):
        return np.ma.masked_where(np.abs(r - 0.5) < 0.1, r)

    with pytest.raises(ValueError, match="'profile' must be finite"):
        resolve(profile, (), 1.0)
