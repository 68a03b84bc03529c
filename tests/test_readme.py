"""The README's commands, example and links are what they say."""

from __future__ import annotations

import ast
import contextlib
import io
import re
import tomllib
from pathlib import Path

import pytest

import fbexpand

ROOT = Path(__file__).parent.parent
README = ROOT / "README.md"

pytestmark = pytest.mark.skipif(not README.exists(), reason="the checkout is not at hand")


def blocks(language):
    return re.findall(rf"^```{language}\n(.*?)^```$", README.read_text(encoding="utf-8"), re.MULTILINE | re.DOTALL)


def test_two_commands_of_one_line_each():
    found = blocks("bash")
    assert len(found) == 2
    for command in found:
        assert command.count("\n") == 1
        assert re.match(r"python3 -m venv (\S+) && \1/bin/python -m pip install ", command)
    demonstration, tests = found
    assert "[fast,plot]" in demonstration
    assert demonstration.rstrip().endswith("-m fbexpand")
    assert "[test]" in tests
    assert tests.rstrip().endswith("-m pytest")


def test_the_extras_of_the_commands_exist():
    extras = tomllib.loads((ROOT / "pyproject.toml").read_text())["project"]["optional-dependencies"]
    assert set(extras) == {"fast", "plot", "test", "dev"}
    for command in blocks("bash"):
        assert set(re.search(r"\[([\w,]+)\]", command)[1].split(",")) <= set(extras)


def test_the_venvs_are_ignored():
    ignored = (ROOT / ".gitignore").read_text().split()
    assert ".venv*/" in ignored


def test_the_example_prints_what_stands_below_it():
    (code,) = blocks("python")
    assert sum(bool(line.strip()) for line in code.splitlines()) <= 10
    ast.parse(code)
    out = io.StringIO()
    with contextlib.redirect_stdout(out):
        exec(compile(code, "README.md", "exec"), {"__name__": "readme"})
    assert out.getvalue() == blocks("text")[0]


def test_the_command_line_shown_is_understood():
    from fbexpand.command.options import parser

    words = blocks("text")[1].split()
    assert words[:3] == ["python", "-m", "fbexpand"]
    options = parser().parse_args(words[3:])
    assert (options.file, options.extend, options.robin, options.tol) == ("profile.csv", "rim", 1.2, 1e-3)


def test_links_and_pictures_exist():
    text = README.read_text(encoding="utf-8")
    for target in re.findall(r"\]\(([^)#]+)\)", text):
        assert target.startswith("https://") or (ROOT / target).is_file(), target
    assert (ROOT / "DEVELOPERS.md").is_file()


def test_every_public_name_is_mentioned():
    text = README.read_text(encoding="utf-8")
    special = {"TruncationWarning", "UnreachableError", "stack"}
    for name in vars(fbexpand):
        if not name.startswith("_") and hasattr(fbexpand, name) and name not in special:
            thing = getattr(fbexpand, name)
            if getattr(thing, "__module__", "").startswith("fbexpand") and not isinstance(thing, type(fbexpand)):
                assert name in text, name


def test_cautions_stand_in_the_readme():
    text = " ".join(README.read_text(encoding="utf-8").split())
    assert "do not certify" in text
    assert "local codes and licensed practice decide" in text
