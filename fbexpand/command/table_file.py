"""Reading a two-column file of radii and values; what is wrong with one is said with its line number and content."""

from __future__ import annotations

import codecs
import math
from pathlib import Path

import numpy as np

from fbexpand.types import FloatArray

MOST_SHOWN = 60
_MARKS = (
    (codecs.BOM_UTF8, "utf-8-sig"),
    (codecs.BOM_UTF16_LE, "utf-16"),
    (codecs.BOM_UTF16_BE, "utf-16"),
)


class TableFileError(ValueError):
    """A file that cannot be read as a table; the message says where and why."""


def read_table(path: str | Path) -> tuple[FloatArray, FloatArray]:
    """Return radii and values of a two-column text file, sorted by radius.

    Columns are parted by a comma, a semicolon or blanks. Empty lines, whatever follows a `#`, a byte-order mark and
    one header line before the numbers are passed over.

    Raises TableFileError with line number and content for a line that is not two finite numbers, a negative or
    repeated radius; and for files that are missing, empty, not text, or hold fewer than two lines of numbers.
    """
    return parse_table(_text_of(Path(path)), str(path))


def parse_table(text: str, name: str) -> tuple[FloatArray, FloatArray]:
    """Return radii and values of the text of a table; `name` is for messages."""
    found: dict[float, tuple[int, float]] = {}
    header_allowed = True
    for number, raw in enumerate(_lines(text), start=1):
        line = raw.split("#", 1)[0].strip()
        if not line:
            continue
        cells = _cells(line)
        numbers = [_number(cell) for cell in cells]
        if header_allowed and all(value is None for value in numbers):
            header_allowed = False
            continue
        header_allowed = False
        where = f"{name}, line {number}: {_shown(raw)}"
        if len(cells) != 2:
            raise TableFileError(f"{where}\nexpected 2 columns, radius and value, and found {len(cells)}{_hint(line)}")
        for cell, value in zip(cells, numbers, strict=True):
            if value is None:
                raise TableFileError(f"{where}\n{_shown(cell)} is not a number{_hint(line)}")
            if not math.isfinite(value):
                raise TableFileError(f"{where}\n{_shown(cell)} is not finite; leave out radii without a value")
        r, value = (float(v) for v in numbers if v is not None)
        if r < 0.0:
            raise TableFileError(f"{where}\nthe radius is negative")
        if r in found:
            raise TableFileError(f"{where}\nthe radius {r!r} stands in line {found[r][0]} already")
        found[r] = number, value
    if len(found) < 2:
        lines = "no line" if not found else "one line"
        raise TableFileError(f"{name}: {lines} of two numbers found; a table needs two or more")
    radii = sorted(found)
    return np.array(radii), np.array([found[r][1] for r in radii])


def _text_of(path: Path) -> str:
    try:
        content = path.read_bytes()
    except FileNotFoundError:
        raise TableFileError(f"{path}: no such file") from None
    except IsADirectoryError:
        raise TableFileError(f"{path}: a folder, not a file") from None
    except OSError as error:
        raise TableFileError(f"{path}: cannot be read ({error.strerror or error})") from None
    encoding = next((name for mark, name in _MARKS if content.startswith(mark)), "utf-8")
    try:
        text = content.decode(encoding)
    except UnicodeDecodeError as error:
        line = content.count(b"\n", 0, error.start) + 1
        shown = _shown(content.split(b"\n")[line - 1].decode("latin-1"))
        raise TableFileError(
            f"{path}, line {line}: {shown}\nnot text in UTF-8 (byte {error.start})"
        ) from None
    if "\0" in text:
        line = next(number for number, content in enumerate(_lines(text), start=1) if "\0" in content)
        raise TableFileError(f"{path}, line {line}: {_shown(_lines(text)[line - 1])}\nnot a text file")
    return text


def _lines(text: str) -> list[str]:
    return text.replace("\r\n", "\n").replace("\r", "\n").split("\n")


def _cells(line: str) -> list[str]:
    for mark in (";", ","):
        if mark in line:
            return [cell.strip().strip("\"'").strip() for cell in line.split(mark)]
    return [cell.strip("\"'") for cell in line.split()]


def _number(cell: str) -> float | None:
    if "_" in cell or not cell.isascii():  # Python reads 1_000 and digits of any script; tables do not mean it
        return None
    try:
        return float(cell)
    except ValueError:
        return None


def _hint(line: str) -> str:
    decimal = [cell for cell in line.replace(";", " ").split() if "," in cell.strip(",")]
    if decimal and _number(decimal[0].replace(",", ".")) is not None and len(line.replace(";", " ").split()) == 2:
        return " (a comma for a decimal point? write 0.5, not 0,5)"
    return ""


def _shown(text: str) -> str:
    quoted = repr(text.strip())
    return quoted if len(quoted) <= MOST_SHOWN else quoted[: MOST_SHOWN - 4] + "..." + quoted[0]
