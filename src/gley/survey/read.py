"""Files to grids of cells: Excel workbooks and delimited text, with the address of every cell."""

import csv
import hashlib
import io
import re
import warnings
import zipfile
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from gley.errors import GleyError, UsageError
from gley.findings import Findings, Place

SUFFIXES = (".xlsx", ".xlsm", ".csv", ".tsv", ".txt")
_DELIMITERS = (";", "\t", ",", "|")


@dataclass(frozen=True)
class Grid:
    """A sheet as it stands: rows of cells; `decimal_comma` says how its text writes numbers."""

    file: str
    sheet: str
    rows: list[list[Any]]
    decimal_comma: bool = False

    def place(self, row: int, column: int) -> Place:
        """Address of a cell in spreadsheet notation (rows count from 1)."""
        return Place(self.file, self.sheet, f"{column_letters(column)}{row + 1}")

    def cell(self, row: int, column: int) -> Any:
        """A cell's content, None outside the row."""
        cells = self.rows[row]
        return cells[column] if column < len(cells) else None


def column_letters(column: int) -> str:
    """0 → A, 25 → Z, 26 → AA."""
    letters = ""
    column += 1
    while column:
        column, rest = divmod(column - 1, 26)
        letters = chr(65 + rest) + letters
    return letters


def read_grids(path: Path, encoding: str, findings: Findings) -> tuple[list[Grid], dict[str, str]]:
    """All sheets of a file, and its name with the sha256 of its bytes.

    Raises
    ------
    GleyError
        When the file isn't there, can't be read, or isn't what its suffix says; UsageError for an unknown suffix.
    """
    suffix = path.suffix.lower()
    if suffix not in SUFFIXES:
        message = f"{path}: '{suffix or 'no suffix'}' isn't a survey file."
        raise UsageError(message, f"Save it as .xlsx or .csv; {', '.join(SUFFIXES)} can be read.")
    try:
        content = path.read_bytes()
    except OSError as error:
        message = f"{path}: can't be read ({error.strerror})."
        raise GleyError(message, "Check the path.") from None
    if not content.strip():
        message = f"{path}: the file is empty."
        raise GleyError(message, "Export it again.")
    record = {"path": path.name, "sha256": hashlib.sha256(content).hexdigest()}
    if suffix in (".xlsx", ".xlsm"):
        return list(_workbook(path, content, findings)), record
    return [_text(path, content, encoding)], record


def _workbook(path: Path, content: bytes, findings: Findings) -> Iterator[Grid]:
    import openpyxl

    if content[:4] == b"\xd0\xcf\x11\xe0":
        message = f"{path}: the workbook is protected by a password, or an old .xls under a new name."
        raise GleyError(message, "Save it without a password as .xlsx.")
    try:
        with warnings.catch_warnings():
            warnings.simplefilter("ignore")  # notes on styles and validations that don't touch values
            book = openpyxl.load_workbook(io.BytesIO(content), data_only=True)
    except (zipfile.BadZipFile, KeyError, ValueError, OSError, EOFError) as error:
        message = f"{path}: not a readable .xlsx workbook ({error})."
        raise GleyError(message, "Open it in a spreadsheet program and save it again.") from None
    for sheet in book.worksheets:
        if sheet.sheet_state != "visible":
            findings.add("survey.hidden_sheet", Place(path.name, sheet.title))
        rows = [list(row) for row in sheet.iter_rows(values_only=True)]
        yield Grid(path.name, sheet.title, rows)


def _text(path: Path, content: bytes, encoding: str) -> Grid:
    text = _decode(path, content, encoding).replace("\r\n", "\n").replace("\r", "\n")
    lines = text.splitlines()
    body = [line for line in lines if line.strip() and not line.lstrip().startswith("#")]
    delimiter = _delimiter(body)
    rows: list[list[Any]] = []
    for line in csv.reader(io.StringIO(text), delimiter=delimiter):
        rows.append([cell if cell.strip() else None for cell in line])
    # a comment line is one cell, whatever separators it holds
    if len(rows) == len(lines):
        rows = [[line] if line.lstrip().startswith("#") else row for line, row in zip(lines, rows, strict=True)]
    return Grid(path.name, "", rows, decimal_comma=delimiter != "," and _has_decimal_commas(body, delimiter))


def _decode(path: Path, content: bytes, encoding: str) -> str:
    """Text of a file: the stated encoding, else by its mark, else UTF-8, else Windows-1252."""
    if b"\x00" in content and not content.startswith((b"\xff\xfe", b"\xfe\xff")):
        message = f"{path}: binary content, not text."
        raise GleyError(message, "Export the table as .csv or .xlsx.")
    marked = content.startswith((b"\xff\xfe", b"\xfe\xff"))
    tried = ["utf-16"] if marked else [encoding] if encoding else ["utf-8-sig", "cp1252"]
    for name in tried:
        try:
            return content.decode(name)
        except (UnicodeDecodeError, LookupError):
            continue
    message = f"{path}: can't be read as {' or '.join(tried)} text."
    raise GleyError(message, "Name the encoding under [survey] in the settings, or save the file as UTF-8.")


def _delimiter(body: list[str]) -> str:
    """The separator that splits most lines into the same, largest number of cells."""

    def score(mark: str) -> tuple[int, int]:
        counts = [len(next(csv.reader([line], delimiter=mark))) for line in body[:50]]
        usual = max(set(counts), key=counts.count, default=1)
        return (counts.count(usual) * (usual > 1), usual)

    return max(_DELIMITERS, key=score) if body else ","


def _has_decimal_commas(body: list[str], delimiter: str) -> bool:
    cells = [cell.strip() for line in body for cell in line.split(delimiter)]
    commas = sum(bool(re.fullmatch(r"[<>]?\s*[-−]?\d+,\d+", cell)) for cell in cells)
    points = sum(bool(re.fullmatch(r"[<>]?\s*[-−]?\d+\.\d+", cell)) for cell in cells)
    return commas > points
