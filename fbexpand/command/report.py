"""What `python -m fbexpand` prints."""

from __future__ import annotations

import sys
from typing import TYPE_CHECKING

import numpy as np

from fbexpand._version import __version__
from fbexpand.crosscheck import crosscheck
from fbexpand.exceptions import UnreachableError
from fbexpand.expansion import Expansion

if TYPE_CHECKING:
    from fbexpand.command.main import Task

TOLERANCES = (1e-2, 1e-3, 1e-4)
SHOWN = 12
MOST_CHECKED = 500  # adaptive quadrature takes seconds for one coefficient beyond
CAUTION = """\
These numbers guide, they do not certify. Verify independently whatever depends on them; where safety is at stake,
local codes and licensed practice decide."""


def report(task: Task, series: Expansion, notes: list[str]) -> bool:
    """Print the report; return whether the cross-check agrees."""
    print(f"fbexpand {__version__}\n\n{task.title}\n\n{task.text}\n\n{series!r}")
    for note in notes:
        print(f"Warning: {note}")
    _coefficients(series)
    _field(task, series)
    _errors(series)
    _terms(series)
    print()
    check = crosscheck(series, task.table, indices=_checked(series.terms), progress=sys.stderr.isatty())
    print(check)
    print(f"\n{CAUTION}")
    return check.all_agree


def _coefficients(series: Expansion) -> None:
    terms = series.terms
    shown = [*range(min(terms, SHOWN)), *([terms - 1] if terms > SHOWN else [])]
    roots, eigenvalues = series.basis.roots(terms), series.basis.eigenvalues(terms)
    print(f"\nCoefficients c_k, and b_k = c_k sqrt(N_k) of the normalised modes\n{'k':>5}{'root':>15}", end="")
    print(f"{'eigenvalue':>15}{'c_k':>18}{'b_k':>18}")
    for i in shown:
        if i == terms - 1 and terms > SHOWN + 1:
            print(f"{'...':>5}")
        print(f"{i + 1:5d}{roots[i]:15.9g}{eigenvalues[i]:15.6g}", end="")
        print(f"{series.coefficients[i]:18.9g}{series.orthonormal[i]:18.9g}")


def _field(task: Task, series: Expansion) -> None:
    radius = float(series.basis.radius)
    axis, rim = series(np.array([0.0, radius]))
    at, unit = task.units[0], task.units[1]
    print(f"\nThe sum ({unit}; {at}): axis {axis:.6g}, rim {rim:.6g}, mean over the cross-section {series.mean():.6g}")


def _errors(series: Expansion) -> None:
    error = series.error_estimate()
    norm = float(series.norm())
    scale = 1.0 / norm if norm > 0.0 else float("nan")
    print(f"\nError of the sum of {series.terms} terms, by its parts (measured on the table's interpolant)")
    for name, what in (
        ("truncation", "terms left out"),
        ("quadrature", "integrals"),
        ("table", "between its radii"),
        ("rounding", "floating point"),
    ):
        value = float(getattr(error, name))
        print(f"  {name:<11}{value * scale:10.1e} of the norm   ({what})")
    print(f"  {'total, L2':<11}{float(error.l2) * scale:10.1e} of the norm, {float(error.l2):.3g} in the table's units")
    print(f"  {'largest':<11}{float(error.sup):10.1e} anywhere, in the table's units")


def _terms(series: Expansion) -> None:
    print("\nTerms needed for a relative L2 truncation error of")
    for tol in TOLERANCES:
        try:
            needed = int(series.terms_for(tol))
        except UnreachableError:
            answer = "not reached by any number of terms"
        else:
            answer = f"{needed}" + (" (predicted from the decay)" if needed > series.terms else "")
        print(f"  {tol:.0e}  {answer}")


def _checked(terms: int) -> list[int]:
    """Return the indices that are cross-checked: the first three, and ever sparser ones up to the last or the 500th."""
    return sorted({min(k, terms) for k in (1, 2, 3, 5, 8, 12, 24, 50, 100, 200, min(terms, MOST_CHECKED))})
