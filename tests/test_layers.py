"""Imports point downward only, and the kernels import next to nothing."""

from __future__ import annotations

import ast
import sys
from pathlib import Path

import pytest

import fbexpand

PACKAGE = Path(fbexpand.__file__).parent

# From the bottom up; parts of one layer may import each other. A part is the longest prefix that is named.
LAYERS = (
    ("types", "exceptions", "checks", "records", "_version"),
    ("kernels",),
    ("special",),
    ("bases", "profiles"),
    ("transform.direct", "transform"),  # direct sums of modes
    ("special.series",),  # profiles for their coefficients, fast sums
    ("estimates",),
    ("lifting", "analysis.growing", "analysis.layout", "analysis.quadrature", "analysis.rules"),
    ("expansion",),
    ("analysis",),
    ("crosscheck", "evolution", "warm_up"),
    ("command",),
    ("__init__", "__main__"),
)
HEIGHT = {part: height for height, layer in enumerate(LAYERS) for part in layer}
OPTIONAL = {"matplotlib", "mpmath", "tqdm", "finufft"}
REQUIRED = {"numpy", "scipy", "numba", "llvmlite"}
# A series is what `expand` makes and profiles are placed on bases, not the other way round.
FORBIDDEN = {("bases", "profiles")}


def files():
    return sorted(path for path in PACKAGE.rglob("*.py"))


def part_of(module):
    """Return the part that a dotted name below fbexpand belongs to."""
    words = module.split(".")
    for end in range(len(words), 0, -1):
        if ".".join(words[:end]) in HEIGHT:
            return ".".join(words[:end])
    raise AssertionError(f"fbexpand.{module} is in no layer: add it to LAYERS")


def is_type_checking(node):
    return isinstance(node, ast.If) and isinstance(node.test, ast.Name) and node.test.id == "TYPE_CHECKING"


def imports(path):
    """Yield (module, at import time) for every import of a file, those for type checkers left out."""
    waiting = [(node, True) for node in ast.parse(path.read_text(encoding="utf-8")).body]
    while waiting:
        node, at_import = waiting.pop()
        if is_type_checking(node):
            waiting += [(n, at_import) for n in node.orelse]
        elif isinstance(node, ast.Import):
            yield from ((alias.name, at_import) for alias in node.names)
        elif isinstance(node, ast.ImportFrom):
            assert node.level == 0, f"{path}: relative import"
            if node.module == "fbexpand":
                yield from ((f"fbexpand.{alias.name}", at_import) for alias in node.names)
            else:
                yield node.module, at_import
        else:
            inside = isinstance(node, (ast.FunctionDef, ast.AsyncFunctionDef, ast.Lambda))
            waiting += [(n, at_import and not inside) for n in ast.iter_child_nodes(node)]


def name_of(path):
    words = path.relative_to(PACKAGE).with_suffix("").parts
    return ".".join(words[:-1] if words[-1] == "__init__" and len(words) > 1 else words)


@pytest.mark.parametrize("path", files(), ids=name_of)
def test_imports_point_downward(path):
    here = part_of(name_of(path))
    for module, _ in imports(path):
        if module == "fbexpand" or not module.startswith("fbexpand."):
            assert module != "fbexpand", f"{path} imports the public door"
            continue
        there = part_of(module.removeprefix("fbexpand."))
        assert HEIGHT[there] <= HEIGHT[here], f"{name_of(path)} imports {module} from above"
        assert (here, there) not in FORBIDDEN, f"{name_of(path)} imports {module}"


@pytest.mark.parametrize("path", files(), ids=name_of)
def test_third_parties_are_the_dependencies_and_optional_ones_wait(path):
    for module, at_import in imports(path):
        top = module.partition(".")[0]
        if top in sys.stdlib_module_names or top in {"fbexpand", "__future__"}:
            continue
        assert top in REQUIRED | OPTIONAL, f"{name_of(path)} imports {module}"
        assert top in REQUIRED or not at_import, f"{name_of(path)} imports {module} when it is imported itself"


def test_kernels_import_numba_math_and_numpy_only():
    plumbing = {"kernels.jit", "kernels.code_cache", "kernels.memory"}  # decorator, cache on disk, intrinsics
    for path in files():
        name = name_of(path)
        if not name.startswith("kernels.") or name in plumbing:
            continue
        tops = {module for module, _ in imports(path) if not module.startswith("fbexpand.kernels.")}
        allowed = {"__future__", "math", "numba", "numpy", "fbexpand.types", "collections.abc", "typing"}
        allowed |= {"fractions", "decimal"}  # constants made once, at import
        if name == "kernels.dd":
            allowed |= {"numba.core", "numba.extending"}  # the fused multiply-add is an intrinsic
        assert tops <= allowed, f"{name} imports {sorted(tops - allowed)}"


def test_kernels_import_their_callees_so_that_the_stamp_sees_them():
    for path in (PACKAGE / "kernels").glob("*.py"):
        for module, at_import in imports(path):
            if module.startswith("fbexpand.kernels"):
                assert module.count(".") == 2, f"{path}: from fbexpand.kernels.X import name"
                assert at_import


def test_every_layer_exists():
    names = {name_of(path) for path in files()}
    for part in HEIGHT:
        assert part in names, part
