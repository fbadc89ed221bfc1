"""Files to grids of cells: Excel workbooks and delimited text, with the address of every cell."""

import csv
import hashlib
import io
import re
import zipfile
from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field
from itertools import chain
from pathlib import Path
from typing import Any

from gley.errors import GleyError, UsageError
from gley.findings import Findings, Place

SUFFIXES = (".xlsx", ".xlsm", ".csv", ".tsv", ".txt")
_DELIMITERS = (";", "\t", ",", "|")
_COMMENT = re.compile(r"\s*#+\s*([^\W\d]|$)")
_WITH_COMMA = re.compile(r"[<>]?\s*[-−]?(\d+),(\d+)")
_WITH_POINT = re.compile(r"[<>]?\s*[-−]?\d+\.\d+")


@dataclass(frozen=True)
class Grid:
    """A sheet as it stands: rows of cells.

    `decimal_comma` says how its text writes numbers, `delimiter` is that of a text file ('' in a workbook), `merged`
    leads from a cell that is merged with cells above it to the uppermost, as (row, column).
    """

    file: str
    sheet: str
    rows: list[list[Any]]
    decimal_comma: bool = False
    delimiter: str = ""
    merged: Mapping[tuple[int, int], tuple[int, int]] = field(default_factory=dict)

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


def is_comment(text: object) -> bool:
    """Whether a line or cell is a comment: `# electrode: …`; `#12` and a header `#` are not."""
    return isinstance(text, str) and bool(_COMMENT.match(text.rstrip())) and text.strip() != "#"


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
    if content[:4] == b"\xd0\xcf\x11\xe0":
        message = f"{path}: the workbook is protected by a password, or an old .xls under a new name."
        raise GleyError(message, "Save it without a password as .xlsx.")
    book = _open(path, content, data_only=True)
    _say_unstored(path, content, book, findings)
    for sheet in book.worksheets:
        if sheet.sheet_state != "visible":
            findings.add("survey.hidden_sheet", Place(path.name, sheet.title))
        rows = [list(row) for row in sheet.iter_rows(min_row=1, min_col=1, values_only=True)]
        merged = {
            (row - 1, area.min_col - 1): (area.min_row - 1, area.min_col - 1)
            for area in sheet.merged_cells.ranges
            for row in range(area.min_row + 1, area.max_row + 1)
        }
        texts = (cell for row in rows for cell in row if isinstance(cell, str))
        yield Grid(path.name, sheet.title, rows, _writes_commas(texts, only_certain=True), merged=merged)


def _open(path: Path, content: bytes, data_only: bool):
    import warnings

    import openpyxl

    try:
        with warnings.catch_warnings():
            warnings.simplefilter("ignore")  # notes on styles and validations that don't touch values
            return openpyxl.load_workbook(io.BytesIO(content), data_only=data_only)
    except Exception as error:  # a damaged workbook makes the parser stumble in many ways
        shown = " ".join(str(error).split())[:120]
        message = f"{path}: not a readable .xlsx workbook ({shown or type(error).__name__})."
        raise GleyError(message, "Open it in a spreadsheet program and save it again.") from None


def _say_unstored(path: Path, content: bytes, book, findings: Findings) -> None:
    """Say which formulas hold no stored result: they read as empty cells otherwise."""
    with zipfile.ZipFile(io.BytesIO(content)) as archive:
        sheets = [name for name in archive.namelist() if re.match(r"xl/worksheets/[^/]+\.xml$", name)]
        if not any(re.search(rb"<f[\s>/]", archive.read(name)) for name in sheets):
            return
    for sheet in _open(path, content, data_only=False).worksheets:
        stored = book[sheet.title]
        for row in sheet.iter_rows():
            for cell in row:
                # a formula whose result is empty text is stored as text
                kept = stored[cell.coordinate] if cell.data_type == "f" else None
                if kept is not None and kept.value is None and kept.data_type == "n":
                    findings.add("survey.formula_unstored", Place(path.name, sheet.title, cell.coordinate), cell.value)


def _text(path: Path, content: bytes, encoding: str) -> Grid:
    lines = _decode(path, content, encoding).replace("\r\n", "\n").replace("\r", "\n").split("\n")
    delimiter = _delimiter([line for line in lines if line.strip() and not is_comment(line)])
    rows = _rows(path, lines, delimiter)
    texts = (cell for row in rows for cell in row if cell is not None and not is_comment(cell))
    return Grid(path.name, "", rows, _writes_commas(texts, only_certain=delimiter == ","), delimiter)


def _rows(path: Path, lines: list[str], delimiter: str) -> list[list[Any]]:
    """Cells of each row; a comment line is one cell, whatever separators it holds."""
    left = iter(lines)
    rows: list[list[Any]] = []
    for line in left:
        if is_comment(line):
            rows.append([line])
            continue
        try:
            cells = next(csv.reader(chain([line + "\n"], _continued(left)), delimiter=delimiter), [])
        except csv.Error as error:
            message = f"{path}: row {len(rows) + 1} can't be read ({error})."
            raise GleyError(message, "Correct this row, or export the table again.") from None
        rows.append([cell if cell.strip() else None for cell in cells])
    return rows


def _continued(left: Iterator[str]) -> Iterator[str]:
    """The lines that a quoted cell goes on in; asked for more than there are, the quotation is open."""
    for line in left:
        yield line + "\n"
    message = "a quotation mark is opened and never closed"
    raise csv.Error(message)


def _decode(path: Path, content: bytes, encoding: str) -> str:
    """Text of a file: the stated encoding, else by its mark, else UTF-8, else Windows-1252."""
    if b"\x00" in content and not content.startswith((b"\xff\xfe", b"\xfe\xff")) and not encoding:
        message = f"{path}: binary content, not text."
        raise GleyError(message, "Export the table as .csv or .xlsx.")
    marked = content.startswith((b"\xff\xfe", b"\xfe\xff"))
    tried = ["utf-16"] if marked else [encoding] if encoding else ["utf-8-sig", "cp1252"]
    for name in tried:
        try:
            return content.decode(name)
        except (UnicodeError, LookupError):
            continue
    message = f"{path}: can't be read as {' or '.join(tried)} text."
    raise GleyError(message, "Name the encoding under [survey] in the settings, or save the file as UTF-8.")


def _delimiter(body: list[str]) -> str:
    """The separator that splits most lines into the same, largest number of cells."""

    def score(mark: str) -> tuple[int, int]:
        counts = [len(next(csv.reader([line[:10_000]], delimiter=mark))) for line in body[:50]]
        usual = max(set(counts), key=counts.count, default=1)
        return (counts.count(usual) * (usual > 1), usual)

    return max(_DELIMITERS, key=score) if body else ","


def _writes_commas(texts: Iterator[str], only_certain: bool) -> bool:
    """Whether the numbers among these texts are written with decimal commas.

    `only_certain` counts commas alone that can't be thousands marks: where commas separate cells, or in a workbook,
    whose own numbers carry no mark.
    """
    commas = points = 0
    for text in texts:
        cell = text.strip()
        found = _WITH_COMMA.fullmatch(cell)
        if found:
            commas += not only_certain or len(found[2]) != 3 or len(found[1]) > 3 or found[1].startswith("0")
        elif _WITH_POINT.fullmatch(cell):
            points += 1
    return commas > points
