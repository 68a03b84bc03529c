"""The job of `python -m fbexpand`, from arguments to exit status."""

from __future__ import annotations

import os
import sys
import warnings
from collections.abc import Sequence
from dataclasses import dataclass

from fbexpand.analysis.expand import expand
from fbexpand.bases import Basis, Dini, FourierBessel
from fbexpand.command import scenario
from fbexpand.command.options import read_options
from fbexpand.command.report import report
from fbexpand.command.table_file import TableFileError, read_table
from fbexpand.exceptions import ArgumentTypeError, ArgumentValueError, TruncationWarning
from fbexpand.expansion import Expansion
from fbexpand.profiles.table import RadialTable

DISAGREES, WRONG_INPUT = 1, 2


@dataclass(frozen=True, eq=False)
class Task:
    """What is to be expanded, and how it is introduced."""

    title: str
    text: str
    table: RadialTable
    basis: Basis
    units: tuple[str, str]


def main(arguments: Sequence[str]) -> int:
    """Run the job; return 0, 1 where the cross-check disagrees, 2 for wrong input."""
    options = read_options(arguments)
    try:
        task = _scenario() if options.file is None else _from_file(options)
        series, notes = _expanded(task, options.terms, options.tol)
        if options.plot is not None:
            from fbexpand.command.picture import require_matplotlib

            require_matplotlib()
        agrees = report(task, series, notes)
        if options.plot is not None:
            from fbexpand.command.picture import draw

            draw(task, series, options.plot)
            print(f"\nPicture written to {options.plot}")
    except BrokenPipeError:  # whoever reads has read enough, as `head` does
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        return 0
    except (TableFileError, ArgumentValueError, ArgumentTypeError, ImportError, OSError) as error:
        print(f"python -m fbexpand: error: {_explained(error)}", file=sys.stderr)
        return WRONG_INPUT
    return 0 if agrees else DISAGREES


def _scenario() -> Task:
    basis = Dini(scenario.ORDER, scenario.RADIUS, robin=scenario.ROBIN)
    return Task(scenario.TITLE, scenario.TEXT, RadialTable(*scenario.cooled_rod()), basis, ("r in mm", "K"))


def _from_file(options: object) -> Task:
    file, order, radius, robin = (getattr(options, name) for name in ("file", "order", "radius", "robin"))
    r, values = read_table(file)
    between = getattr(options, "between", None) or "cubic"
    table = RadialTable(r, values, between=between, extend=getattr(options, "extend", None))
    radius = float(r[-1]) if radius is None else radius
    order = 0.0 if order is None else order
    basis: Basis = FourierBessel(order, radius) if robin is None else Dini(order, radius, robin=robin)
    rim = "f(R) = 0" if robin is None else f"R f'(R) + {robin:g} f(R) = 0"
    text = f"{r.size} radii from {r[0]:g} to {r[-1]:g}; at the rim, R = {radius:g}, {rim}."
    return Task(str(file), text, table, basis, ("r", "value"))


def _expanded(task: Task, terms: int | None, tol: float | None) -> tuple[Expansion, list[str]]:
    """Return the series, and what the library warned of."""
    with warnings.catch_warnings(record=True) as caught:
        warnings.simplefilter("always", TruncationWarning)
        if tol is not None:
            series = expand(task.table, task.basis, tol=tol)
        else:
            series = expand(task.table, task.basis, terms=scenario.TERMS if terms is None else terms)
    return series, [str(warning.message) for warning in caught]


def _explained(error: Exception) -> str:
    """Return the message, with the option's name where the library's argument has another."""
    text = str(error)
    name = getattr(error, "name", None)
    if isinstance(error, (ArgumentValueError, ArgumentTypeError)) and name in {"extend", "radius", "robin", "order"}:
        return f"{text} (option --{name})"
    return text
