"""`python -m fbexpand`: the scenario, files of the user's own, and what it says about bad ones."""

from __future__ import annotations

import re
import subprocess
import sys

import numpy as np
import pytest

from fbexpand import Dini, FourierBessel, RadialTable, expand
from fbexpand.command import scenario
from fbexpand.command.main import main
from fbexpand.command.table_file import TableFileError, parse_table, read_table

GOOD = "0 4\n0.5 3\n1.5 1\n2 0\n"


@pytest.fixture
def table_file(tmp_path):
    def write(content, name="table.csv"):
        path = tmp_path / name
        path.write_bytes(content if isinstance(content, bytes) else content.encode())
        return path

    return write


def run(capsys, *arguments):
    status = main([str(a) for a in arguments])
    out, err = capsys.readouterr()
    return status, out, err


def printed_coefficients(out):
    block = out.split("Coefficients c_k")[1].split("\n\n")[0]
    rows = re.findall(r"^ *(\d+) +(\S+) +(\S+) +(\S+) +(\S+)$", block, flags=re.MULTILINE)
    return {int(k): float(c) for k, _, _, c, _ in rows}


def test_the_scenario_runs_as_a_program():
    done = subprocess.run(
        [sys.executable, "-W", "error", "-m", "fbexpand"], capture_output=True, text=True, timeout=300, check=False
    )
    assert done.returncode == 0, done.stderr
    out = done.stdout
    assert "invented" in out
    assert "all agree" in out
    assert "do not certify" in out
    for part in ("truncation", "quadrature", "table", "rounding", "total, L2", "largest"):
        assert re.search(rf"^  {part} +\d\.\de[+-]\d\d ", out, flags=re.MULTILINE), part
    needed = re.findall(r"^  1e-0[234]  (\d+)", out, flags=re.MULTILINE)
    assert [int(n) for n in needed] == sorted(int(n) for n in needed)
    assert len(needed) == 3
    assert re.search(r"ours: all 24 in [\d.]+ m?s; adaptive quadrature .*: \d+ in [\d.]+ m?s", out)


def test_the_scenario_prints_the_coefficients_of_its_table(capsys):
    status, out, _ = run(capsys)
    assert status == 0
    r, values = scenario.cooled_rod()
    series = expand(RadialTable(r, values), Dini(radius=25.0, robin=1.2), terms=24)
    printed = printed_coefficients(out)
    assert set(printed) == {*range(1, 13), 24}
    for k, value in printed.items():
        assert value == pytest.approx(series.coefficients[k - 1], rel=1e-8)


def test_the_scenario_is_a_cooling_rod_to_the_tables_digits():
    r, values = scenario.cooled_rod()
    x = r / 25.0
    assert r[0] == 0.0
    assert r[-1] == 25.0
    np.testing.assert_allclose(values, 240.0 - 168.0 * x**2 + 48.0 * x**4, atol=0.0501)  # what it was made of


def test_a_file_gives_what_the_library_gives(capsys, table_file):
    status, out, err = run(capsys, table_file(GOOD), "--order", "1.5", "--robin", "-2e-1", "--terms", "7")
    assert (status, err) == (0, "")
    basis = Dini(1.5, 2.0, robin=-0.2)
    series = expand(RadialTable([0, 0.5, 1.5, 2.0], [4, 3, 1, 0]), basis, terms=7)
    assert printed_coefficients(out)[7] == pytest.approx(series.coefficients[6], rel=1e-8)
    assert repr(basis) in out


def test_radius_extend_and_between_reach_the_library(capsys, table_file):
    options = ("--radius", "2.5", "--extend", "rim", "--between", "linear", "--terms", "5")
    status, out, _ = run(capsys, table_file(GOOD), *options)
    assert status == 0
    table = RadialTable([0, 0.5, 1.5, 2.0], [4, 3, 1, 0], between="linear", extend="rim")
    series = expand(table, FourierBessel(0.0, 2.5), terms=5)
    assert printed_coefficients(out)[5] == pytest.approx(series.coefficients[4], rel=1e-8)


def test_tol_takes_the_terms_it_takes(capsys, table_file):
    status, out, _ = run(capsys, table_file(GOOD), "--tol", "0.01")
    assert status == 0
    series = expand(RadialTable([0, 0.5, 1.5, 2.0], [4, 3, 1, 0]), FourierBessel(0.0, 2.0), tol=0.01)
    assert f"{series.terms} terms" in out


def test_a_tolerance_out_of_reach_is_said(capsys, table_file):
    status, out, _ = run(capsys, table_file("0 1\n1 1\n"), "--tol", "1e-9")
    assert status == 0
    assert "Warning: the tolerance" in out


def test_a_picture_is_written(capsys, tmp_path):
    from matplotlib.image import imread

    path = tmp_path / "picture.png"
    status, out, _ = run(capsys, "--plot", path)
    assert status == 0
    assert str(path) in out
    pixels = imread(path)
    grey = pixels[..., :3].mean(axis=-1)
    assert min(grey.shape) > 800
    quarters = [g for half in np.array_split(grey, 2) for g in np.array_split(half, 2, axis=1)]
    assert all((g < 0.5).mean() > 0.005 for g in quarters)  # something is drawn in each


@pytest.mark.parametrize(
    "text",
    [
        "0,4\n0.5,3\n1.5,1\n2,0\n",
        "0, 4\n0.5 ,3\n1.5 , 1\n2,\t0",
        "0 4\r\n0.5\t3\r\n1.5   1\r\n2 0\r\n",
        "0 4\r0.5 3\r1.5 1\r2 0",
        "0;4\n0.5; 3\n1.5;1\n2;0\n",
        "# a comment\n\nradius, value\n0, 4  # at the axis\n\n0.5, 3\n   \n1.5, 1\n# more\n2, 0\n",
        "r (mm) T(K) of the rod\n0 4\n0.5 3\n1.5 1\n2 0",
        '"r","T"\n"0","4"\n"0.5","3"\n"1.5","1"\n"2","0"\n',
        "2e0 0\n0 4.\n1.5 +1\n.5 3e+00\n",
    ],
)
def test_ordinary_files_are_read(table_file, text):
    for content in (text, "\ufeff" + text, text.encode("utf-16")):
        r, values = read_table(table_file(content))
        assert r.tolist() == [0.0, 0.5, 1.5, 2.0]
        assert values.tolist() == [4.0, 3.0, 1.0, 0.0]


@pytest.mark.parametrize(
    ("text", "line", "content", "said"),
    [
        ("0 4\n0.5 x\n1 0\n", 2, "0.5 x", "'x' is not a number"),
        ("# c\n\nr T\n0 4\nr T\n1 0\n", 5, "r T", "'r' is not a number"),
        ("0 4\n0.5\n1 0\n", 2, "0.5", "found 1"),
        ("0 4 1\n1 0 1\n", 1, "0 4 1", "found 3"),
        ("0,4\n0.5,,3\n", 2, "0.5,,3", "found 3"),
        ("0,4\n0.5,\n", 2, "0.5,", "'' is not a number"),
        ("0 4\n0.5 nan\n1 0", 2, "0.5 nan", "'nan' is not finite"),
        ("0 4\n0.5 1e999\n1 0", 2, "0.5 1e999", "not finite"),
        ("0 4\n-0.5 1\n1 0", 2, "-0.5 1", "negative"),
        ("0 4\n0.5 1\n1 0\n\n0.50 2", 5, "0.50 2", "0.5 stands in line 2 already"),
        ("0;4\n0,5;3\n", 2, "0,5;3", "a comma for a decimal point"),
        ("0 4\n0,5 3\n", 2, "0,5 3", "a comma for a decimal point"),
        ("0 4\n1_0 3\n", 2, "1_0 3", "'1_0' is not a number"),
        ("0 4\nl.0 3\n", 2, "l.0 3", "'l.0' is not a number"),
        ("0 4\n0.5 3\0\n", 2, r"0.5 3\x00", "not a text file"),
        (b"0 4\n0.5 3 \xb0C\n", 2, "0.5 3 \xb0C", "not text in UTF-8"),
    ],
)
def test_bad_lines_are_named(capsys, table_file, text, line, content, said):
    path = table_file(text)
    status, out, err = run(capsys, path)
    assert status == 2
    assert out == ""
    assert f"{path}, line {line}: '{content}'" in err
    assert said in err


@pytest.mark.parametrize("text", ["", "# nothing\n", "r, T\n", "0 1\n"])
def test_too_few_lines(text):
    with pytest.raises(TableFileError, match="two or more"):
        parse_table(text, "x.csv")


def test_long_lines_are_cut_in_messages():
    with pytest.raises(TableFileError) as caught:
        parse_table("0 1\n" + "9" * 5000 + "x 1\n", "x.csv")
    assert len(str(caught.value)) < 300


def test_missing_files_and_folders(capsys, tmp_path):
    for path, said in ((tmp_path / "none.csv", "no such file"), (tmp_path, "a folder")):
        status, _, err = run(capsys, path)
        assert status == 2
        assert said in err


@pytest.mark.parametrize(
    ("options", "said"),
    [
        (("--radius", "3"), "'extend' must be 'rim' or 'both'"),
        (("--radius", "1"), "must lie within the basis' radius"),
        (("--radius", "-1"), "'radius' must be positive"),
        (("--order", "-1"), "'order' must be at least 0"),
        (("--terms", "0"), "'terms' must be at least 1"),
        (("--tol", "nan"), "'tol'"),
    ],
)
def test_wrong_options_for_a_file(capsys, table_file, options, said):
    status, out, err = run(capsys, table_file(GOOD), *options)
    assert status == 2
    assert out == ""
    assert said in err


@pytest.mark.parametrize(
    ("options", "said"),
    [
        (("--radius", "3"), "goes with a FILE"),
        (("x.csv", "--terms", "3", "--tol", "0.1"), "not allowed with"),
        (("x.csv", "--terms", "3.5"), "invalid int"),
        (("x.csv", "--extend", "left"), "invalid choice"),
        (("x.csv", "--plot", "picture.xyz"), "must end in .png"),
        (("x.csv", "--plot", "no-such-folder/picture.png"), "no such folder"),
        (("x.csv", "--robin", "-x"), "expected one argument"),
    ],
)
def test_wrong_usage_ends_with_status_2(capsys, options, said):
    with pytest.raises(SystemExit) as caught:
        main(list(options))
    assert caught.value.code == 2
    assert said in capsys.readouterr().err


def test_a_disagreement_is_the_exit_status(capsys, monkeypatch):
    from fbexpand.command import main as module

    def wrong(task, terms, tol):
        right = expand(task.table, task.basis, terms=3)
        values = right.coefficients.copy()
        values[1] *= 1.0 + 1e-10
        return type(right)._make(right.basis, values), []

    monkeypatch.setattr(module, "_expanded", wrong)
    status, out, _ = run(capsys)
    assert status == 1
    assert "DISAGREE" in out


def test_without_matplotlib_the_message_says_what_to_install(capsys, monkeypatch, tmp_path):
    monkeypatch.setitem(sys.modules, "matplotlib", None)
    status, out, err = run(capsys, "--plot", tmp_path / "p.png")
    assert status == 2
    assert out == ""
    assert "python -m pip install matplotlib" in err
