"""The functions of the seeded script that made the test data: references by ball arithmetic."""

from __future__ import annotations

import importlib.util
from pathlib import Path
from types import ModuleType

_SCRIPT = Path(__file__).resolve().parents[1] / "tests" / "reference" / "make_bessel.py"


def load() -> ModuleType:
    """Return the script as a module."""
    spec = importlib.util.spec_from_file_location("make_bessel", _SCRIPT)
    assert spec is not None
    assert spec.loader is not None
    module = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(module)
    return module
