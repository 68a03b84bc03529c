"""The public door: what is behind it, and nothing else."""

from __future__ import annotations

import ast
import inspect
import types
from pathlib import Path

import pytest

import fbexpand

NAMES = [
    "Basis",
    "CrossCheck",
    "Diffusion",
    "Dini",
    "ErrorEstimate",
    "Evolution",
    "Expansion",
    "FourierBessel",
    "ModalLaw",
    "Paraxial",
    "PartialSum",
    "RadialTable",
    "Transform",
    "TruncationWarning",
    "UnreachableError",
    "Wave",
    "__version__",
    "ascending_series",
    "bessel_j",
    "bessel_j_sequence",
    "bessel_zeros",
    "compiled_bessel_j",
    "crosscheck",
    "dini_roots",
    "evolve",
    "expand",
    "solve_steady",
    "stack",
    "warm_up",
]


def statements():
    return ast.parse(Path(fbexpand.__file__).read_text(encoding="utf-8")).body


def test_the_public_names_are_these():
    imported = [alias.asname for node in statements()[1:] for alias in node.names]
    assert sorted(imported) == sorted(NAMES)
    assert sorted(NAMES) == NAMES


def test_the_door_holds_imports_as_themselves_and_nothing_else():
    docstring, *rest = statements()
    assert isinstance(docstring.value.value, str)
    for node in rest:
        assert isinstance(node, ast.ImportFrom)
        assert node.module.startswith("fbexpand.")
        assert all(alias.name == alias.asname for alias in node.names)


def test_no_name_is_a_module():
    assert not [name for name in NAMES if isinstance(getattr(fbexpand, name), types.ModuleType)]


@pytest.mark.parametrize("name", [name for name in NAMES if name != "__version__"])
def test_public_things_say_what_they_are(name):
    thing = getattr(fbexpand, name)
    first = inspect.getdoc(thing).splitlines()[0]
    assert first.endswith((".", ":"))
    if inspect.isclass(thing):
        members = [m for m in vars(thing) if not m.startswith("_") and callable(getattr(thing, m))]
        assert all(inspect.getdoc(getattr(thing, m)) for m in members)


@pytest.mark.parametrize("name", ["crosscheck", "expand", "dini_roots", "bessel_zeros", "bessel_j"])
def test_defaults_are_keyword_only(name):
    for parameter in inspect.signature(getattr(fbexpand, name)).parameters.values():
        if parameter.default is not parameter.empty and parameter.name != "start":
            assert parameter.kind is parameter.KEYWORD_ONLY, parameter.name


def test_one_version():
    from importlib.metadata import version

    assert fbexpand.__version__ == version("fbexpand")
