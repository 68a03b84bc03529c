"""Zeros, zeros of J' and Dini roots as handbooks and other libraries' documentation print them."""

from __future__ import annotations

import math
from fractions import Fraction

import pytest

from fbexpand.special.roots import bessel_zeros, dini_roots


def digits_of(text):
    """A printed decimal as an exact number, and half a unit of its last digit."""
    places = len(text.partition(".")[2])
    return Fraction(text), Fraction(1, 2 * 10**places)


def agrees(value, text, order_error=0, units=Fraction(1, 2)):
    """Within the print's rounding, one ulp, and what a rounded order moves (d j / d nu is below 2)."""
    printed, half = digits_of(text)
    allowed = 2 * units * half + Fraction(math.ulp(float(value))) + 2 * order_error
    return abs(Fraction(float(value)) - printed) <= allowed


# Boost.Math's test data for cyl_bessel_j_zero (50 digits there, the orders exact rationals)
BOOST = [
    (Fraction(0), 1, "2.4048255576957727686"),
    (Fraction(0), 2, "5.5200781102863106496"),
    (Fraction(0), 3, "8.6537279129110122170"),
    (Fraction(0), 4, "11.791534439014281614"),
    (Fraction(0), 5, "14.930917708487785948"),
    (Fraction(1), 1, "3.8317059702075123156"),
    (Fraction(1), 2, "7.0155866698156187535"),
    (Fraction(1), 3, "10.173468135062722077"),
    (Fraction(5), 1, "8.7714838159599540191"),
    (Fraction(5), 5, "22.217799896561267869"),
    (Fraction(219, 100), 1, "5.3756885437062318673"),
    (Fraction(219, 100), 2, "8.6763206096388812277"),
    (Fraction(219, 100), 20, "65.451771223759892686"),
    (Fraction(71, 19), 1, "7.2731751938316489503"),
    (Fraction(71, 19), 10, "36.311416000216207416"),
    (Fraction(71, 19), 20, "67.815145619696290926"),
    (Fraction(7001, 19), 1, "381.92201523024489387"),
    (Fraction(7001, 19), 2, "392.17508657648737503"),
    (Fraction(7001, 19), 20, "496.39435037938252558"),
]

# mpmath's documentation of besseljzero; for (50, 100) it misprints two digits, 388.6936660656058634640981, of
# what the function gives, which is what stands here
MPMATH = [
    (0.0, 1000, "3140.807295225078628895545"),
    (0.0, 10000, "31415.14114171350798533666"),
    (5.0, 10000, "31422.9947255486291798943"),
    (50.0, 1, "57.11689916011917411936"),
    (50.0, 100, "388.6936600656058834640981"),
    (2.25, 4, "15.15657692957458622921634"),
]

# zeros of J'_nu, mpmath's documentation of besseljzero(derivative=1): robin = 0
DERIVATIVE = [
    (1.0, 1, "1.84118378134065930264"),
    (1.0, 2, "5.33144277352503263688"),
    (1.0, 3, "8.53631636634628583436"),
    (2.0, 1, "3.05423692822714032276"),
    (2.0, 2, "6.70613319415845914663"),
    (2.0, 3, "9.96946782308759579318"),
    (50.0, 1, "52.99764038731665010944"),
]

# MathWorld, "Bessel Function Zeros": first five zeros of J_0, J_1, J_2 to 4 digits
MATHWORLD = {
    0: ["2.4048", "5.5201", "8.6537", "11.7915", "14.9309"],
    1: ["3.8317", "7.0156", "10.1735", "13.3237", "16.4706"],
    2: ["5.1356", "8.4172", "11.6198", "14.7960", "17.9598"],
}

# Cengel, Heat Transfer, one-term approximation, cylinder: Biot number and lambda_1. Its last digit is not
# always the nearest (1.59945 at Biot number 2 is printed 1.5995), so one unit is allowed.
CENGEL = [
    (0.01, "0.1412"),
    (0.1, "0.4417"),
    (0.5, "0.9408"),
    (1.0, "1.2558"),
    (2.0, "1.5995"),
    (5.0, "1.9898"),
    (10.0, "2.1795"),
]

# computed with 25 digits by mpmath's findroot, not from a handbook
COMPUTED = [
    (1.0, 1, "1.2557837117945935219"),
    (1.0, 2, "4.079477710797353323"),
    (1.0, 3, "7.1557991746439808202"),
    (100.0, 1, "2.3809016634910468"),
    (-1.0, 1, "1.6082794717268792669"),
    (-1.0, 2, "3.56794936120787752"),
    (-1.0, 3, "6.87257243025186326"),
]


@pytest.mark.parametrize(("order", "k", "text"), BOOST)
def test_boost(order, k, text):
    rounded = float(order)
    assert agrees(bessel_zeros(rounded, 1, k)[0], text, abs(Fraction(rounded) - order))


@pytest.mark.parametrize(("order", "k", "text"), MPMATH)
def test_mpmath_documentation(order, k, text):
    assert agrees(bessel_zeros(order, 1, k)[0], text)


@pytest.mark.parametrize(("order", "k", "text"), DERIVATIVE)
def test_derivative_zeros(order, k, text):
    assert agrees(dini_roots(order, 0.0, 1, k)[0], text)


def test_zero_is_the_first_zero_of_the_derivative_of_j0():
    # DLMF 10.21(i) and mpmath count x = 0 for order 0; the others are the zeros of J_1
    found = dini_roots(0.0, 0.0, 4)
    assert found[0] == 0.0
    assert found[1:].tolist() == bessel_zeros(1.0, 3).tolist()


@pytest.mark.parametrize("order", sorted(MATHWORLD))
def test_mathworld(order):
    for value, text in zip(bessel_zeros(order, 5), MATHWORLD[order], strict=True):
        assert agrees(value, text)


@pytest.mark.parametrize(("biot", "text"), CENGEL)
def test_convective_rim(biot, text):
    assert agrees(dini_roots(0.0, biot, 1)[0], text, units=1)


@pytest.mark.parametrize(("robin", "k", "text"), COMPUTED)
def test_computed(robin, k, text):
    assert agrees(dini_roots(0.0, robin, 1, k)[0], text)


def test_waveguide_cutoffs():
    # TE11, TM01, TE21, TE01 = TM11 of the circular guide
    assert agrees(dini_roots(1, 0.0, 1)[0], "1.8412")
    assert agrees(bessel_zeros(0, 1)[0], "2.4048")
    assert agrees(dini_roots(2, 0.0, 1)[0], "3.0542")
    assert agrees(dini_roots(0, 0.0, 1, 2)[0], "3.8317")
    assert agrees(bessel_zeros(1, 1)[0], "3.8317")


def test_membrane_frequencies():
    # ratios to the (0, 1) mode: modes (1,1), (2,1), (0,2), (3,1), (1,2)
    base = bessel_zeros(0, 1)[0]
    printed = ["1.593", "2.136", "2.295", "2.653", "2.917"]
    for (order, k), text in zip([(1, 1), (2, 1), (0, 2), (3, 1), (1, 2)], printed, strict=True):
        assert agrees(bessel_zeros(order, 1, k)[0] / base, text), (order, k)
