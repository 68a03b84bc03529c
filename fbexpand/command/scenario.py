"""The invented table that `python -m fbexpand` works on when it is given no file."""

from __future__ import annotations

from importlib import resources

from fbexpand.command.table_file import parse_table
from fbexpand.types import FloatArray

FILE = "cooled_rod.csv"
ORDER, RADIUS, ROBIN, TERMS = 0.0, 25.0, 1.2, 24
TITLE = "A glass rod that cools by convection (invented numbers, for demonstration only)"
TEXT = """\
The temperature above the surroundings, in kelvin, was "measured" at 18 radii, in mm, across a rod of radius
25 mm. At the surface R f'(R) + 1.2 f(R) = 0: heat transfer coefficient 52.8 W/(m2 K), conductivity
1.1 W/(m K), so the Biot number is 1.2. The modes are J_0(lambda_k r / R)."""


def cooled_rod() -> tuple[FloatArray, FloatArray]:
    """Return radii (mm) and temperatures (K) of the table inside the package."""
    text = resources.files("fbexpand.command").joinpath(FILE).read_text(encoding="utf-8")
    return parse_table(text, FILE)
