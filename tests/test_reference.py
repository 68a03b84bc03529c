"""bessel_j against the references in tests/reference/bessel_j.csv, within its documented bounds."""

from __future__ import annotations

import csv
from decimal import Context, Decimal
from typing import NamedTuple

import numpy as np
import pytest
from reference.make_bessel import BANDS, EPS, FILE, ball, make

from fbexpand.special.bessel import bessel_j

TINY = 2.0**-1074
_DIGITS = Context(prec=60, Emin=-(10**6), Emax=10**6)


class Row(NamedTuple):
    order: float
    x: float
    j: Decimal
    modulus: float


@pytest.fixture(scope="module")
def rows() -> list[Row]:
    with FILE.open(newline="") as file:
        return [
            Row(float.fromhex(r["order"]), float.fromhex(r["x"]), Decimal(r["j"]), float(r["modulus"]))
            for r in csv.DictReader(file)
        ]


def error_in_eps(row: Row, value: float) -> float:
    """Return the error in eps of the modulus for x >= order, of |J| below; the last subnormal is forgiven."""
    assert np.isfinite(value)
    gap = float(abs(_DIGITS.subtract(Decimal(value), row.j)))
    size = row.modulus if row.x >= row.order else abs(float(row.j))
    gap = max(gap - TINY, 0.0)
    return gap / (EPS * size) if gap > 0.0 else 0.0


def allowed(order: float, x: float) -> float:
    """Return the bound in the same unit."""
    if x < order:
        return 20.0 if x >= 0.9 * order else 4.0 + 2.0 * order
    return 3.0 if order < 100.0 else (4.0 if order < 1000.0 else 6.0)


def region(row: Row) -> str:
    if row.x < 0.9 * row.order:
        return "x < 0.9 order"
    if row.x < row.order:
        return "0.9 order <= x < order"
    return "order <= x <= 1e6" if row.x <= 1e6 else "x > 1e6"


def report(rows: list[Row], errors: np.ndarray) -> None:
    print("\n order              region                    points   median      max  (eps)")
    for low, high in BANDS:
        names = {region(r) for r in rows if low <= r.order <= high}
        for name in sorted(names):
            cell = [
                e for r, e in zip(rows, errors, strict=True) if low <= r.order < high and region(r) == name
            ]
            if cell:
                print(
                    f"[{low:g}, {high:g})".ljust(20),
                    name.ljust(26),
                    f"{len(cell):6d} {np.median(cell):8.3f} {max(cell):8.3f}",
                )


def hold(rows: list[Row], values: np.ndarray) -> None:
    errors = np.array([error_in_eps(r, float(v)) for r, v in zip(rows, values, strict=True)])
    report(rows, errors)
    bad = [(r, e) for r, e in zip(rows, errors, strict=True) if not e <= allowed(r.order, r.x)]
    assert not bad, (
        f"{len(bad)} of {len(rows)}, the worst {max(bad, key=lambda b: b[1] / allowed(b[0].order, b[0].x))}"
    )


def test_points_one_by_one(rows: list[Row]) -> None:
    hold(rows, bessel_j([r.order for r in rows], [r.x for r in rows]))


def test_points_among_many(rows: list[Row]) -> None:
    """The same values where the order's table is built: every point amid thousands at its order."""
    some = [r for r in rows if r.x < 1e300][::6]
    filler = np.linspace(0.0, 1.0, 4000)
    values = [bessel_j(r.order, np.append(filler * min(2.0 * r.x, 1e6), r.x))[-1] for r in some]
    hold(some, np.array(values))


def test_references_are_what_the_script_makes(rows: list[Row]) -> None:
    points = make()
    assert [(r.order, r.x) for r in rows] == points
    for i in np.random.default_rng(7).choice(len(rows), 60, replace=False).tolist():
        row = rows[i]
        if row.order <= 1000.0:
            assert abs(float(ball(row.order, row.x)) - float(row.j)) <= EPS * abs(float(row.j))
