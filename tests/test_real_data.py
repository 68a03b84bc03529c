"""The main job on real data: the light of a bright source in the Hubble Deep Field, averaged over circles.

The image ships with scikit-image (NASA, public domain).
"""

from __future__ import annotations

import numpy as np
import pytest

from fbexpand import Dini, FourierBessel, RadialTable, crosscheck, expand

CUT = 24  # pixels from the brightest one


@pytest.fixture(scope="module")
def source():
    """Radii in pixels and mean brightness about the centre of light of the source whose surroundings are brightest."""
    data = pytest.importorskip("skimage.data")
    filters = pytest.importorskip("skimage.filters")
    image = data.hubble_deep_field().astype(float).mean(axis=-1)
    smooth = filters.gaussian(image, 2.0)
    inside = smooth[CUT:-CUT, CUT:-CUT]
    row, column = (int(i) + CUT for i in np.unravel_index(np.argmax(inside), inside.shape))
    piece = image[row - CUT : row + CUT + 1, column - CUT : column + CUT + 1]
    piece = piece - np.median(image)
    y, x = np.mgrid[-CUT : CUT + 1, -CUT : CUT + 1].astype(float)
    core = np.hypot(x, y) < 8.0
    light = piece * core
    distance = np.hypot(x - (x * light).sum() / light.sum(), y - (y * light).sum() / light.sum())
    ring = np.floor(distance).astype(int)
    r = np.array([distance[ring == k].mean() for k in range(20)])
    mean = np.array([piece[ring == k].mean() for k in range(20)])
    return r, mean


def test_the_profile_of_a_bright_source(source):
    r, brightness = source
    assert 0.0 < r[0] < 1.0
    assert brightness[0] > 5.0 * abs(brightness[-1])  # a bright source on a dark sky it is
    table = RadialTable(r, brightness, extend="both")
    basis = Dini.neumann(radius=20.0)
    series = expand(table, basis, terms=60)
    check = crosscheck(series, table, indices=[1, 2, 5, 20, 60])
    assert check.all_agree, check
    error = series.error_estimate()
    scale = brightness.max()
    inside = r[:-1]
    missed = np.abs(series(inside) - brightness[:-1])
    assert np.all(missed <= series.partial_sum(inside).error + 1e-12 * scale)
    assert missed.max() <= error.sup
    assert missed.max() < 0.02 * scale
    assert error.truncation < 0.01 * series.norm()
    assert error.table > error.rounding  # twenty rings know less than sixteen digits


def test_the_flux_is_that_of_the_table(source):
    r, brightness = source
    table = RadialTable(r, brightness, extend="both", between="linear")
    series = expand(table, Dini.neumann(radius=20.0), terms=40)
    # c_1 of the constant mode is the mean over the disk: the trapezium rule in the area is exact for r times linear
    edges = np.concatenate(([0.0], r, [20.0]))
    slope = (brightness[-1] - brightness[-2]) / (r[-1] - r[-2])
    values = np.concatenate(([brightness[0]], brightness, [brightness[-1] + slope * (20.0 - r[-1])]))
    a, b, u, v = edges[:-1], edges[1:], values[:-1], values[1:]
    pieces = (b - a) * (a * (2.0 * u + v) + b * (u + 2.0 * v)) / 6.0  # integral of a linear function times r
    assert series.coefficients[0] == pytest.approx(pieces.sum() / 200.0, rel=1e-13)
    assert series.mean() == pytest.approx(pieces.sum() / 200.0, rel=1e-12)


def test_terms_for_a_tolerance_are_enough(source):
    r, brightness = source
    table = RadialTable(r, brightness, extend="both")
    series = expand(table, FourierBessel(radius=20.0), tol=0.05)
    assert series.terms < 200
    assert series.error_estimate().truncation <= 0.05 * series.norm() * 1.01
    longer = expand(table, FourierBessel(radius=20.0), terms=2000)
    left_out = np.sqrt(np.sum(longer.orthonormal[series.terms :] ** 2))
    assert left_out <= 0.05 * longer.norm()
