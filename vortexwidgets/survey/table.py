"""Table: the bytes of a text file as headings, rows of cells and comments; every refusal says where."""

from __future__ import annotations

import codecs
import csv
import hashlib
import re
from dataclasses import dataclass
from pathlib import Path

import numpy as np

from vortexwidgets.survey.columns import is_unit, understand
from vortexwidgets.survey.samples import FloatArray, SurveyError

LARGEST_FILE = 64_000_000
"""[bytes] About two million rows; a survey that large is averaged before it is appraised."""

MOST_COLUMNS = 200
LONGEST_LINE = 20_000

MISSING = {"", "nan", "na", "n/a", "#n/a", "none", "null", "-", "--", "---", "–", "—", "*", ".", "nan(ind)", "-nan"}
_NUMBER = re.compile(r"[+-]?(?:\d+\.?\d*|\.\d+)(?:[eEdD][+-]?\d+)?")
_COMMA_NUMBER = re.compile(r"[+-]?(?:\d+,\d*|,\d+)(?:[eEdD][+-]?\d+)?")
_TYPED = (  # how files begin that are often given by mistake
    (b"PK\x03\x04", "a zip archive or an Excel workbook; save the sheet as CSV"),
    (b"\xd0\xcf\x11\xe0", "an old Excel workbook; save the sheet as CSV"),
    (b"%PDF", "a PDF; give the numbers as CSV"),
    (b"\x1f\x8b", "a gzip archive; unpack it first"),
    (b"\x93NUMPY", "a NumPy array; write it as CSV, or use Survey.traverse, Survey.radial or Survey.plane"),
    (b"\x89PNG", "a picture; give the numbers as CSV"),
    (b"MATLAB", "a MATLAB file; export the table as CSV"),
    (b"<", "HTML or XML; give the numbers as CSV"),
    (b"{", "JSON; give the numbers as CSV, or open a record with load_appraisal"),
)


@dataclass(frozen=True)
class Table:
    """Headings, rows of cells with their line in the file, comments, and what was noticed on the way."""

    file: str
    sha256: str
    headings: tuple[str, ...]
    units: tuple[str, ...] | None
    rows: tuple[tuple[int, tuple[str, ...]], ...]
    comments: tuple[tuple[int, str], ...]
    notes: tuple[str, ...]


def read_bytes(path: Path) -> bytes:
    """Read a file that exists, is a file, and is of a reasonable size.

    Raises
    ------
    SurveyError
        If it is none of these.
    """
    if path.is_dir():
        raise SurveyError(f"{path} is a folder, not a survey file; give the path of a CSV or NetCDF file.")
    if not path.exists():
        raise SurveyError(f"there is no file {path}; check the path and the spelling.")
    if not path.is_file():
        raise SurveyError(f"{path} is not an ordinary file; give the path of a CSV or NetCDF file.")
    try:
        size = path.stat().st_size
        if size > LARGEST_FILE:
            raise SurveyError(
                f"{path.name} has {size / 1e6:.0f} MB, the limit is {LARGEST_FILE / 1e6:.0f} MB; average the survey, "
                "or give a part of it."
            )
        content = path.read_bytes()
    except OSError as error:
        raise SurveyError(f"{path} cannot be read ({error.strerror}); check the permissions.") from error
    if not content.strip():
        raise SurveyError(f"{path.name} is empty; give a header row with units and at least three rows of numbers.")
    return content


def parse_table(content: bytes, file: str) -> Table:
    """Split the content of a text file into headings, cells and comments.

    Parameters
    ----------
    content : bytes
        The file; UTF-8, UTF-16 with a byte order mark, or Latin-1.
    file : str
        Name for the messages.

    Returns
    -------
    Table

    Raises
    ------
    SurveyError
        If the file is no text, has no header row, or a row does not fit it.
    """
    text, notes = _decode(content, file)
    comments: list[tuple[int, str]] = []
    lines: list[tuple[int, str]] = []
    for number, line in enumerate(text.split("\n"), start=1):
        if len(line) > LONGEST_LINE:
            raise SurveyError(f"{file}, row {number}: the line has {len(line)} characters; give one row per line.")
        if line.lstrip().startswith(("#", "%", "//")):
            comments.append((number, line.strip().lstrip("#%/").strip()))
        elif line.strip():
            lines.append((number, line))
    if not lines:
        raise SurveyError(f"{file} holds comments only; add a header row with units and rows of numbers.")
    separator = _separator([line for _, line in lines[:60]])
    rows = [(number, _cells(line, separator, file, number)) for number, line in lines]
    rows = [(number, cells) for number, cells in rows if any(cells)]
    start, headings = _header(rows, comments, separator, file)
    comments += [(number, ": ".join(filter(None, cells))) for number, cells in rows[: max(start, 0)]]
    rows = rows[start + 1 :]
    units = None
    if rows and not any(_looks_numeric(cell) for cell in rows[0][1]) and all(is_unit(cell) for cell in rows[0][1]):
        units = tuple(rows[0][1]) + ("",) * (len(headings) - len(rows[0][1]))
        rows = rows[1:]
    if not rows:
        raise SurveyError(f"{file} has a header row but no numbers below it; add the rows of the survey.")
    fitted = tuple((number, _fitted(cells, headings, separator, file, number)) for number, cells in rows)
    digest = hashlib.sha256(content).hexdigest()
    return Table(file, digest, headings, units, fitted, tuple(sorted(comments)), tuple(notes))


def numbers(table: Table, column: int) -> FloatArray:
    """Read one column as numbers, NaN where a cell is empty; decimal points and decimal commas are both read.

    Raises
    ------
    SurveyError
        If a cell holds anything else, with row, column, value and remedy.
    """
    values = np.empty(len(table.rows))
    commas = points = None
    for index, (row, cells) in enumerate(table.rows):
        cell = cells[column]
        if _NUMBER.fullmatch(cell):
            points = row if points is None and "." in cell else points
            values[index] = float(cell.replace("d", "e").replace("D", "e"))
        elif _COMMA_NUMBER.fullmatch(cell):
            commas = row if commas is None else commas
            values[index] = float(cell.replace(",", ".").replace("d", "e").replace("D", "e"))
        elif cell.lower() in MISSING:
            values[index] = np.nan
        else:
            raise SurveyError(f"{table.file}, row {row}, column '{table.headings[column]}': {_complaint(cell)}")
    if commas is not None and points is not None:
        raise SurveyError(
            f"{table.file}, column '{table.headings[column]}': row {commas} has a decimal comma and row {points} a "
            "decimal point; write the numbers one way, without separators of thousands."
        )
    return values


def _complaint(cell: str) -> str:
    shown = cell if len(cell) <= 40 else cell[:37] + "..."
    if cell.lower().lstrip("+-") in ("inf", "infinity", "1.#inf", "∞"):
        return f"'{shown}' is not finite; leave the cell empty if there is no value."
    if cell[:1] in "=@" or "(" in cell:
        return f"'{shown}' looks like a formula, and formulas are not evaluated; write its value."
    if re.fullmatch(r"[+-]?\d{1,3}(?:[ ,.']\d{3})+(?:[.,]\d+)?", cell):
        return f"'{shown}' has separators of thousands; write the number without them."
    return f"'{shown}' is not a number; correct it, or leave the cell empty if there is no value."


def _decode(content: bytes, file: str) -> tuple[str, list[str]]:
    if content.startswith((codecs.BOM_UTF16_LE, codecs.BOM_UTF16_BE)):
        try:
            return _lines(content.decode("utf-16")), ["read as UTF-16"]
        except UnicodeDecodeError as error:
            raise SurveyError(f"{file} begins like UTF-16 text but is not; save it as UTF-8 CSV.") from error
    begin = content.removeprefix(codecs.BOM_UTF8).lstrip()
    for signature, remedy in _TYPED:
        if begin.startswith(signature):
            raise SurveyError(f"{file} is {remedy}.")
    control = sum(content.count(bytes([code])) for code in range(32) if code not in (9, 10, 11, 12, 13))
    if control:
        raise SurveyError(f"{file} is not a text file ({control} control characters); give a CSV or NetCDF file.")
    try:
        return _lines(content.decode("utf-8-sig")), []
    except UnicodeDecodeError:
        return _lines(content.decode("cp1252", errors="replace")), ["not UTF-8; read as Latin-1 (Windows-1252)"]


def _lines(text: str) -> str:
    return text.replace("\r\n", "\n").replace("\r", "\n").replace("\u00a0", " ").replace("\u2212", "-")


def _separator(lines: list[str]) -> str:
    """Find the separator that most lines have, outside brackets and quotation marks."""
    bare = [re.sub(r'"[^"]*"|\[[^\]]*\]|\([^)]*\)', "", line) for line in lines]
    for separator in "\t;":
        if sum(separator in line for line in bare) > len(bare) / 2:
            return separator
    with_comma = [line for line in bare if "," in line]
    # "-119,48 4,773" has commas too, but they are inside the numbers that blanks separate
    decimal = [line for line in with_comma if re.fullmatch(r"\s*[-+\d,eE]+(?:\s+[-+\d,eE]*\d)+\s*", line)]
    if len(with_comma) > len(bare) / 2 and len(decimal) <= len(with_comma) / 2:
        return ","
    return " "


def _cells(line: str, separator: str, file: str, row: int) -> list[str]:
    if line.count('"') % 2:
        raise SurveyError(f'{file}, row {row}: the quotation marks (") are not balanced; close or remove them.')
    if separator == " ":
        if _looks_numeric(line.split()[0]) or not re.search(r"[\[({]|\S {2,}\S", line):
            return line.split()
        if re.search(r"[\[({]", line):  # a header: each column ends with its bracket
            found = re.findall(r"[^\[({\])}]+[\[({][^\])}]*[\])}]|\S+", line)
            return [cell.strip() for cell in found]
        return [cell.strip() for cell in re.split(r"\s{2,}", line.strip())]
    return [cell.strip() for cell in next(csv.reader([line.strip(" ")], delimiter=separator, skipinitialspace=True))]


def _looks_numeric(cell: str) -> bool:
    return bool(_NUMBER.fullmatch(cell) or _COMMA_NUMBER.fullmatch(cell))


def _header(
    rows: list[tuple[int, list[str]]], comments: list[tuple[int, str]], separator: str, file: str
) -> tuple[int, tuple[str, ...]]:
    """Find the header row; -1 when it stands in a comment, as numpy.savetxt writes it."""
    first = next((index for index, (_, cells) in enumerate(rows) if _is_data(cells)), len(rows))
    candidates = rows[:first]
    for index in sorted(range(len(candidates)), key=lambda i: (-_known(candidates[i][1]), i)):
        headings = _merged(candidates[index][1], rows, first) if separator == " " else candidates[index][1]
        while headings and not headings[-1]:
            headings = headings[:-1]
        if _known(headings) or (len(headings) > 1 and first < len(rows)):
            if len(headings) > MOST_COLUMNS:
                raise SurveyError(f"{file} has {len(headings)} columns, the limit is {MOST_COLUMNS}; leave some out.")
            return index, tuple(headings)
    width = len(rows[first][1]) if first < len(rows) else 0
    before = [text for number, text in comments if first < len(rows) and number < rows[first][0]]
    for text in reversed(before):
        for cut in (separator, " ", ",", "\t"):
            cells = text.split(cut) if cut != " " else _cells(text.replace('"', ""), " ", file, 0)
            if len(cells) == width and _known([cell.strip() for cell in cells]) >= 2:
                return -1, tuple(cell.strip() for cell in cells)
    if first < len(rows):
        raise SurveyError(
            f"{file}, row {rows[first][0]}: the numbers have no header row above them; add one that names each column "
            "with its unit, for example 'position [mm],velocity [m/s]'."
        )
    raise SurveyError(
        f"{file} has no header row and no rows of numbers; a survey is a header such as 'position [mm],velocity [m/s]' "
        "and numbers below it."
    )


def _is_data(cells: list[str]) -> bool:
    numeric = sum(_looks_numeric(cell) for cell in cells)
    return numeric >= 2 or (numeric == 1 and sum(cell.lower() not in MISSING for cell in cells) == 1)


def _known(cells: list[str]) -> int:
    return sum(understand(cell).role != "" for cell in cells if cell)


def _merged(cells: list[str], rows: list[tuple[int, list[str]]], first: int) -> list[str]:
    """Join 'position mm velocity m/s' to as many headings as the numbers have columns."""
    width = len(rows[first][1]) if first < len(rows) else len(cells)
    if len(cells) <= width:
        return cells
    merged: list[str] = []
    for cell in cells:
        if merged and not understand(cell).role and understand(f"{merged[-1]} {cell}").unit is not None:
            merged[-1] += f" {cell}"
        else:
            merged.append(cell)
    return merged


def _fitted(cells: list[str], headings: tuple[str, ...], separator: str, file: str, row: int) -> tuple[str, ...]:
    while len(cells) > len(headings) and not cells[-1]:
        cells = cells[:-1]
    if len(cells) == len(headings):
        return tuple(cells)
    remedy = "correct the row, or leave a cell empty where there is no value"
    if separator == "," and len(cells) == 2 * len(headings):
        remedy = "if these are decimal commas, separate the columns by ';' or a tab"
    elif any(mark in cell for cell in cells for mark in (";", "\t", ",") if mark != separator):
        remedy = "separate all columns of the file by the same sign"
    raise SurveyError(
        f"{file}, row {row}: {len(cells)} cells under {len(headings)} headings ('{_shortened(cells)}'); {remedy}."
    )


def _shortened(cells: list[str]) -> str:
    text = " | ".join(cells)
    return text if len(text) <= 60 else text[:57] + "..."
