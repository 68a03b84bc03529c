"""Notebooks run from top to bottom, say what their text twins say, and their stored outputs are what runs print."""

from __future__ import annotations

import contextlib
import io
import json
import re
from pathlib import Path

import pytest

NOTEBOOKS = Path(__file__).parents[1] / "notebooks"
NAMES = sorted(path.stem for path in NOTEBOOKS.glob("*.py"))
TIMES = re.compile(r"\d[\d.e+-]* m?s\b")  # seconds taken differ from run to run


def cells_of_text(text):
    body = text.split("# ---\n", 2)[2]
    cells = []
    for part in re.split(r"^# %%", body, flags=re.M)[1:]:
        first, rest = part.split("\n", 1)
        if "[markdown]" in first:
            rest = re.sub(r"^# ?", "", rest, flags=re.M)
        cells.append(("markdown" if "[markdown]" in first else "code", rest.strip()))
    return cells


def test_there_is_one():
    assert NAMES
    assert sorted(path.stem for path in NOTEBOOKS.glob("*.ipynb")) == NAMES


@pytest.mark.parametrize("name", NAMES)
def test_notebook_and_text_agree_and_run(name, monkeypatch):
    matplotlib = pytest.importorskip("matplotlib")
    matplotlib.use("Agg")
    text = (NOTEBOOKS / f"{name}.py").read_text(encoding="utf-8")
    stored = json.loads((NOTEBOOKS / f"{name}.ipynb").read_text(encoding="utf-8"))["cells"]
    cells = cells_of_text(text)
    assert [(c["cell_type"], "".join(c["source"]).strip()) for c in stored] == cells
    from matplotlib import pyplot

    monkeypatch.setattr(pyplot, "show", lambda: pyplot.close("all"))
    names = {"__name__": "__main__"}
    for cell, (kind, source) in zip(stored, cells, strict=True):
        if kind != "code":
            continue
        printed = io.StringIO()
        with contextlib.redirect_stdout(printed):
            exec(compile(source, f"{name}.py", "exec"), names)
        outputs = ["".join(o["text"]) for o in cell["outputs"] if o["output_type"] == "stream"]
        assert all(o["output_type"] != "error" for o in cell["outputs"])
        assert TIMES.sub("(time)", printed.getvalue()) == TIMES.sub("(time)", "".join(outputs))
