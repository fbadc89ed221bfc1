"""The blank field workbook: what to write down on site, in the columns and units that the reader knows."""

import datetime as dt
import os
import tempfile
from collections.abc import Sequence
from pathlib import Path

import openpyxl
from openpyxl.comments import Comment
from openpyxl.styles import Alignment, Border, Font, PatternFill, Side
from openpyxl.utils import get_column_letter
from openpyxl.worksheet.datavalidation import DataValidation
from openpyxl.worksheet.worksheet import Worksheet

from gley.columns import Column, columns, constituents
from gley.errors import GleyError, UsageError

ROWS = 200
"""Rows of a sheet that carry checks on what is typed."""

FIELD = (
    "sample", "station", "date", "time", "round", "sample_type", "duplicate_of", "depth_cm", "probe", "electrode",
    "ORP_mV", "pH", "temperature_C", "SC_uS_cm", "turbidity_NTU", "water_level_m", "remarks",
)  # fmt: skip
LABORATORY = {
    "O2": "mg/L", "alkalinity": "mg/L as CaCO3", "Ca": "mg/L", "Mg": "mg/L", "Na": "mg/L", "K": "mg/L", "Cl": "mg/L",
    "SO4": "mg/L", "NO3": "mg/L as N", "NH4": "mg/L as N", "sulfide": "mg/L as S", "Fe": "mg/L", "Mn": "mg/L",
    "As": "µg/L", "U": "µg/L", "Cr": "µg/L", "DOC": "mg/L as C",
}  # fmt: skip
STATIONS = (
    "station", "x_m", "y_m", "crs", "ground_elevation_m", "screen_top_m", "screen_bottom_m", "aquifer", "remarks",
)  # fmt: skip
CHECKS = ("date", "time", "probe", "solution", "temperature_C", "reading_mV", "electrode", "remarks")
FACTS = ("project", "site", "electrode", "probe", "crs", "operator", "remarks")
SOLUTIONS = ("ZoBell", "Light", "quinhydrone pH 4", "quinhydrone pH 7")
LISTS: dict[str, tuple[str, ...]] = {"sample_type": ("normal", "duplicate", "blank", "spike"), "solution": SOLUTIONS}

HOW_TO = (
    ("Before you go", "Clean the platinum, fill the reference electrode, note its filling solution on the sheet Facts."),
    ("Check the probe", "Read a check solution at the start and end of the day: solution, temperature, reading, time."),
    ("Read", "Flow cell without air, until ORP, pH and temperature hold still. Write ORP as shown, in mV."),
    ("Don't convert", "Leave the reference electrode in the number. If the meter shows Eh already, say so on Facts: Eh."),
    ("One row, one sample", "A field duplicate is a row of its own: type duplicate, and the sample it belongs to."),
    ("Not detected", "Write <0.5 with the laboratory's limit. Leave a cell empty only if nothing was measured."),
    ("Dissolved", "Iron, manganese and arsenic from filtered, acidified bottles; remark it if not filtered."),
    ("Mind", "Platinum shows a mixed potential and is blind to oxygen and nitrate: take O2 and nitrate too."),
)  # fmt: skip

_HEAD = PatternFill("solid", fgColor="E7D3B8")
_LAB = PatternFill("solid", fgColor="CFDAD8")
_UNITS = PatternFill("solid", fgColor="F4EFE6")
_LINE = Border(bottom=Side(style="thin", color="8A7A66"))
_MADE = dt.datetime(2026, 1, 1)


def write_sheet(path: str | Path, electrodes: Sequence[str] = (), overwrite: bool = False) -> Path:
    """Write the blank field workbook.

    Parameters
    ----------
    path : path
        An .xlsx file.
    electrodes : sequence of str
        Names offered in the electrode cells.
    overwrite : bool
        Replace an existing file.

    Raises
    ------
    UsageError
        When the suffix isn't .xlsx.
    GleyError
        When the file exists and `overwrite` isn't set, or the folder can't be written.
    """
    path = Path(path)
    if path.suffix.lower() != ".xlsx":
        message = f"{path}: the field workbook is an .xlsx file."
        raise UsageError(message, f"Call it {path.stem or 'field'}.xlsx.")
    if path.exists() and not overwrite:
        message = f"{path} is there already; nothing was changed."
        raise GleyError(message, "Give another name, or --overwrite to replace it.")
    book = _book(tuple(electrodes))
    try:
        handle, name = tempfile.mkstemp(suffix=".xlsx", dir=path.parent or Path())
        os.close(handle)
        book.save(name)
        os.replace(name, path)
    except OSError as error:
        message = f"{path}: can't be written ({error.strerror})."
        raise GleyError(message, "Check the folder and its permissions.") from None
    return path


def _book(electrodes: tuple[str, ...]) -> openpyxl.Workbook:
    book = openpyxl.Workbook()
    book.properties.creator = "gley"
    book.properties.created = book.properties.modified = _MADE
    how = book.active
    assert how is not None
    _how_to(how)
    lists = book.create_sheet("Lists")
    offered = {**LISTS, **({"electrode": electrodes} if electrodes else {})}
    ranges = _lists(lists, offered)
    _samples(book.create_sheet("Samples", 1), ranges)
    _table(book.create_sheet("Stations", 2), [columns("stations")[name] for name in STATIONS], ranges)
    _table(book.create_sheet("Checks", 3), [columns("checks")[name] for name in CHECKS], ranges)
    _facts(book.create_sheet("Facts", 4), ranges)
    lists.sheet_state = "hidden"
    return book


def _how_to(sheet: Worksheet) -> None:
    sheet.title = "How to"
    sheet["A1"] = "Field workbook for a redox survey"
    sheet["A1"].font = Font(bold=True, size=14)
    for row, (what, words) in enumerate(HOW_TO, start=3):
        sheet.cell(row, 1, what).font = Font(bold=True)
        sheet.cell(row, 2, words).alignment = Alignment(wrap_text=True, vertical="top")
        sheet.cell(row, 1).alignment = Alignment(vertical="top")
        sheet.row_dimensions[row].height = 32
    sheet.column_dimensions["A"].width = 22
    sheet.column_dimensions["B"].width = 90


def _lists(sheet: Worksheet, offered: dict[str, tuple[str, ...]]) -> dict[str, str]:
    """Choices on a sheet of their own, and the range of each."""
    ranges = {}
    for c, (name, choices) in enumerate(offered.items(), start=1):
        sheet.cell(1, c, f"choices: {name}")
        for r, choice in enumerate(choices, start=2):
            sheet.cell(r, c, choice)
        letter = get_column_letter(c)
        ranges[name] = f"Lists!${letter}$2:${letter}${len(choices) + 1}"
    return ranges


def _samples(sheet: Worksheet, ranges: dict[str, str]) -> None:
    field = [columns("samples")[name] for name in FIELD]
    _table(sheet, field, ranges)
    for c, (key, unit) in enumerate(LABORATORY.items(), start=len(field) + 1):
        item = constituents()[key]
        _head(sheet, c, key, unit, f"{item.meaning}, in {unit}; write <limit when not detected", _LAB)


def _table(sheet: Worksheet, wanted: list[Column], ranges: dict[str, str]) -> None:
    """Header, units and checks of one table; printing and panes."""
    for c, column in enumerate(wanted, start=1):
        _head(sheet, c, column.name, column.unit, column.meaning, _HEAD)
        _validate(sheet, c, column, ranges)
    sheet.freeze_panes = "C3"
    sheet.page_setup.orientation = "landscape"
    sheet.page_setup.fitToWidth, sheet.page_setup.fitToHeight = 1, 0
    sheet.sheet_properties.pageSetUpPr.fitToPage = True
    sheet.print_title_rows = "1:2"


def _head(sheet: Worksheet, c: int, name: str, unit: str, meaning: str, fill: PatternFill) -> None:
    top, below = sheet.cell(1, c, name), sheet.cell(2, c, unit or "-")
    top.font, top.fill, top.alignment = Font(bold=True), fill, Alignment(horizontal="center")
    below.font, below.fill, below.border = Font(italic=True, color="5A5148"), _UNITS, _LINE
    below.alignment = Alignment(horizontal="center")
    note = Comment(meaning, "gley")
    note.width, note.height = 260, 70
    top.comment = note
    sheet.column_dimensions[get_column_letter(c)].width = max(len(name), len(unit)) + 4


def _validate(sheet: Worksheet, c: int, column: Column, ranges: dict[str, str]) -> None:
    """A check on what is typed: a list where there is one, else the range that is physically possible."""
    letter = get_column_letter(c)
    cells = f"{letter}3:{letter}{ROWS + 2}"
    rule = None
    if column.name in ranges:
        # other words are allowed too: the probe may be one that the list doesn't know
        rule = DataValidation(type="list", formula1=f"={ranges[column.name]}", allow_blank=True, errorStyle="warning")
        rule.error = "Not in the list; keep it only if you are sure."
    elif column.minimum is not None and column.maximum is not None:
        low, high = f"{column.minimum:g}", f"{column.maximum:g}"
        rule = DataValidation(type="decimal", operator="between", formula1=low, formula2=high, allow_blank=True)
        rule.error = f"{column.meaning}: {low} to {high} {column.unit}".strip()
    elif column.dtype == "date":
        rule = DataValidation(type="date", operator="greaterThan", formula1="36526", allow_blank=True)
        rule.error = "A date is wanted."
        for row in range(3, ROWS + 3):
            sheet[f"{letter}{row}"].number_format = "yyyy-mm-dd"
    if rule is not None:
        rule.errorTitle, rule.showErrorMessage = column.name, True
        sheet.add_data_validation(rule)
        rule.add(cells)


def _facts(sheet: Worksheet, ranges: dict[str, str]) -> None:
    words = {
        "electrode": "reference electrode and filling solution of the ORP probe, e.g. Ag/AgCl, 3 M KCl",
        "crs": "coordinate reference system of the stations, e.g. EPSG:25832",
    }
    for row, key in enumerate(FACTS, start=1):
        cell = sheet.cell(row, 1, key)
        cell.font, cell.fill = Font(bold=True), _HEAD
        sheet.cell(row, 3, words.get(key, "")).font = Font(italic=True, color="5A5148")
        if key in ranges:
            rule = DataValidation(type="list", formula1=f"={ranges[key]}", allow_blank=True, errorStyle="warning")
            sheet.add_data_validation(rule)
            rule.add(f"B{row}")
    sheet.column_dimensions["A"].width = 16
    sheet.column_dimensions["B"].width = 40
    sheet.column_dimensions["C"].width = 70
