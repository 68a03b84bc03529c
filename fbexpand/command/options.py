"""The options of `python -m fbexpand`, read and checked."""

from __future__ import annotations

import argparse
from collections.abc import Sequence
from pathlib import Path

from fbexpand.profiles.table import BETWEEN, EXTEND

DESCRIPTION = """\
Expand a table of radii and values in a Fourier-Bessel or Dini series: coefficients, errors by their parts, terms
needed, and a cross-check by adaptive quadrature. Without FILE, on an invented table that comes with the package."""

EPILOG = """\
FILE holds two columns, radius and value, parted by a comma, a semicolon or blanks; empty lines, comments after '#'
and one header line are passed over. Results guide, they do not certify: verify independently."""

OF_FILE = ("order", "radius", "robin", "extend", "between")
SIGNED = ("--robin",)
PICTURES = (".png", ".pdf", ".svg")


def parser() -> argparse.ArgumentParser:
    """Return the parser."""
    found = argparse.ArgumentParser(prog="python -m fbexpand", description=DESCRIPTION, epilog=EPILOG)
    found.add_argument("file", metavar="FILE", nargs="?", help="the table; an invented one if left out")
    found.add_argument("--order", type=float, metavar="NU", help="order of the Bessel functions, at least 0 (0)")
    found.add_argument("--radius", type=float, metavar="R", help="radius of the rim (the last radius of the table)")
    found.add_argument(
        "--robin",
        type=float,
        metavar="BI",
        help="rim condition R f' + BI f = 0, BI the Biot number (without it: f = 0 at the rim)",
    )
    size = found.add_mutually_exclusive_group()
    size.add_argument("--terms", type=int, metavar="N", help="number of terms (24)")
    size.add_argument("--tol", type=float, metavar="TOL", help="or as many as a relative L2 error of TOL takes")
    found.add_argument("--extend", choices=EXTEND, help="continue a table that stops short of axis or rim")
    found.add_argument("--between", choices=BETWEEN, help="how to read between the radii (cubic)")
    found.add_argument("--plot", metavar="PICTURE", help="write a picture: PNG, PDF or SVG by its ending")
    return found


def read_options(arguments: Sequence[str]) -> argparse.Namespace:
    """Return the options; a wrong one ends the program with status 2 and a message."""
    known = parser()
    options = known.parse_args(_joined(arguments))
    if options.plot is not None:
        path = Path(options.plot)
        if path.suffix.lower() not in PICTURES:
            known.error(f"--plot: the file's name must end in {', '.join(PICTURES)} (got {options.plot!r})")
        if not path.parent.is_dir():
            known.error(f"--plot: no such folder: {str(path.parent)!r}")
    if options.file is None:
        given = [name for name in OF_FILE if getattr(options, name) is not None]
        if given:
            known.error(f"--{given[0]} goes with a FILE; the invented table brings its own")
    return options


def _joined(arguments: Sequence[str]) -> list[str]:
    """Return the arguments with `--robin -1e-3` written `--robin=-1e-3`, which argparse takes for an option else."""
    out: list[str] = []
    for word in arguments:
        if out and out[-1] in SIGNED and word.startswith("-"):
            try:
                float(word)
            except ValueError:
                pass
            else:
                out[-1] = f"{out[-1]}={word}"
                continue
        out.append(word)
    return out
