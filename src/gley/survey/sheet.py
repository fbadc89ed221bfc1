"""The blank field workbook: what to write down on site, in the columns and units that the reader knows."""

import datetime as dt
import io
import os
import re
import tomllib
import zipfile
from collections.abc import Sequence
from dataclasses import dataclass
from importlib.resources import files
from pathlib import Path

import openpyxl
from openpyxl.comments import Comment
from openpyxl.styles import Alignment, Border, Font, PatternFill, Side
from openpyxl.utils import get_column_letter
from openpyxl.worksheet.datavalidation import DataValidation
from openpyxl.worksheet.worksheet import Worksheet

from gley.columns import columns, constituents
from gley.errors import GleyError, UsageError

ROWS = 200
"""Rows of a table that carry checks on what is typed."""
RULED = {"Samples": 27, "Stations": 23, "Checks": 15}
"""Rows ruled for writing by hand: one printed page of each table."""

FIELD = (
    "sample", "station", "round", "date", "time", "sample_type", "duplicate_of", "depth_cm", "water_level_m", "probe",
    "electrode", "ORP_mV", "temperature_C", "pH", "SC_uS_cm", "O2", "remarks",
)  # fmt: skip
LABORATORY = (
    "pH_lab", "alkalinity", "Fe_II", "sulfide", "Fe", "Mn", "NO3", "NO2", "NH4", "SO4", "Cl", "PO4", "F", "Ca", "Mg",
    "Na", "K", "DOC", "CH4", "As", "As_III", "U", "Cr", "Cr_VI", "Se", "Cu",
)  # fmt: skip
UNITS = {
    "alkalinity": "mg/L as CaCO3", "NO3": "mg/L as N", "NO2": "mg/L as N", "NH4": "mg/L as N", "PO4": "mg/L as P",
    "sulfide": "mg/L as S", "As_III": "µg/L as As", "Cr_VI": "µg/L as Cr",
} | dict.fromkeys(("As", "U", "Cr", "Se", "Cu"), "µg/L")  # fmt: skip
"""Unit of each constituent as laboratories usually give it, with what is weighed; mg/L where none is named here."""
STATIONS = (
    "station", "latitude_deg", "longitude_deg", "x_m", "y_m", "crs", "ground_elevation_m", "screen_top_m",
    "screen_bottom_m", "aquifer", "electrode", "remarks",
)  # fmt: skip
CHECKS = ("date", "time", "probe", "solution", "temperature_C", "reading_mV", "electrode", "remarks")
FACTS = {
    "Project": "",
    "Site": "",
    "Purpose": "",
    "Date": "day or period of the survey",
    "Sampled by": "",
    "ORP probe": "maker and number of the probe, the same name as in the column probe",
    "Electrode and filling solution": "as on its label, for example Ag/AgCl, 3 M KCl; holds for every row without one",
    "Coordinate reference system": "for example EPSG:25832; holds for every station without one",
    "Remarks": "weather, purging, anything unusual",
}
"""What holds for the whole survey: key and, where it needs one, a word on what to write."""
# a value that stands in the form already, so that an otherwise empty sheet is known for what it is
_FILLED = {"Purpose": "redox survey, ORP and pH with chemistry"}
LISTS = {
    "sample_type": ("normal", "duplicate", "blank", "spike"),
    "solution": ("ZoBell", "Light", "quinhydrone pH 4", "quinhydrone pH 7"),
}
"""Choices that are short enough to stand in the check itself."""

_WHO = PatternFill("solid", fgColor="EEDFBC")  # ochre: which sample, where, when
_READ = PatternFill("solid", fgColor="E6BFA6")  # rust: read on site
_LAB = PatternFill("solid", fgColor="C9D5DA")  # blue-grey: chemistry
_UNIT = PatternFill("solid", fgColor="F6F1E7")
_INK, _PALE = "33291F", "6B5F52"
_HAIR = Side(style="thin", color="B9AD9C")
_BOX = Border(left=_HAIR, right=_HAIR, top=_HAIR, bottom=_HAIR)
_WIDTHS = {
    "sample": 14,
    "station": 13,
    "date": 12,
    "electrode": 23,
    "solution": 18,
    "aquifer": 18,
    "remarks": 28,
    "crs": 13,
}
_READINGS = frozenset({"ORP_mV", "temperature_C", "pH", "SC_uS_cm", "O2", "reading_mV"})
_LAST_ROW = 1048576  # of any sheet
_MADE = (2026, 1, 1, 0, 0, 0)


def _font(**look) -> Font:
    return Font(**{"name": "Arial", "size": 10, "color": _INK, **look})


@dataclass(frozen=True)
class _Head:
    """One column of the form."""

    name: str
    unit: str
    meaning: str
    dtype: str
    low: float | None = None
    high: float | None = None


def write_sheet(path: str | Path, electrodes: Sequence[str] = (), overwrite: bool = False) -> Path:
    """Write the blank field workbook; the same arguments give the same bytes.

    Parameters
    ----------
    path : path
        An .xlsx file in a folder that exists.
    electrodes : sequence of str
        Names of reference electrodes, offered in the electrode cells.
    overwrite : bool
        Replace an existing file.

    Returns
    -------
    Path
        The file written.

    Raises
    ------
    UsageError
        When the suffix isn't .xlsx.
    GleyError
        When the file exists and `overwrite` isn't set, or can't be written.
    """
    path = Path(path)
    if path.suffix.lower() != ".xlsx":
        message = f"{path}: the field workbook is an .xlsx file."
        raise UsageError(message, f"Call it {path.stem or 'field'}.xlsx.")
    if path.exists() and not overwrite:
        message = f"{path} is there already; nothing was changed."
        raise GleyError(message, "Give another name, or --overwrite to replace it.")
    content = _bytes(_book((electrodes,) if isinstance(electrodes, str) else tuple(electrodes)))
    part = path.with_name(f".{path.name}.{os.getpid()}.part")
    try:
        part.write_bytes(content)
        part.replace(path)
    except OSError as error:
        message = f"{path}: can't be written ({error.strerror})."
        cure = "Check that the folder exists and may be written to, and that no other program has the file open."
        raise GleyError(message, cure) from None
    finally:
        if part.parent.is_dir():
            part.unlink(missing_ok=True)
    return path


def _bytes(book: openpyxl.Workbook) -> bytes:
    """The file's content, without the clock: same form, same bytes."""
    saved, made = io.BytesIO(), io.BytesIO()
    book.save(saved)
    stamp = dt.datetime(*_MADE).strftime("%Y-%m-%dT%H:%M:%SZ").encode()
    with zipfile.ZipFile(saved) as old, zipfile.ZipFile(made, "w") as new:
        for name in old.namelist():
            content = old.read(name)
            if name == "docProps/core.xml":  # openpyxl puts the hour of saving here
                content = re.sub(rb"(<dcterms:modified[^>]*>)[^<]*", rb"\g<1>" + stamp, content)
            new.writestr(zipfile.ZipInfo(name, _MADE), content, zipfile.ZIP_DEFLATED)
    return made.getvalue()


def _book(electrodes: tuple[str, ...]) -> openpyxl.Workbook:
    book = openpyxl.Workbook()
    book.properties.creator, book.properties.title = "gley", "Field workbook for a redox survey"
    book.properties.created = book.properties.modified = dt.datetime(*_MADE)
    book._named_styles["Normal"].font = _font()  # column widths are counted in its digits
    samples = book.active
    assert isinstance(samples, Worksheet)
    samples.title = "Samples"
    stations, checks, facts, how = (book.create_sheet(name) for name in ("Stations", "Checks", "Facts", "How to"))
    known = _how_to(how, electrodes)
    ranges = {"electrode": known} if electrodes else {}
    names = f"$A$3:$A${ROWS + 2}"
    offered = ranges | {"duplicate_of": names, "station": f"Stations!{names}"}
    _table(samples, [_head(name) for name in (*FIELD, *LABORATORY)], offered)
    _print_in_two(samples)
    _table(stations, [_head(name, "stations") for name in STATIONS], ranges)
    _table(checks, [_head(name, "checks") for name in CHECKS], ranges)
    _facts(facts, ranges)
    return book


def _head(name: str, table: str = "samples") -> _Head:
    """A column of the form from the vocabulary."""
    column = columns(table).get(name)
    if column is None:
        item = constituents()[name]
        return _Head(name, UNITS.get(name, "mg/L"), item.meaning, "amount")
    return _Head(name, column.unit, column.meaning, column.dtype, column.minimum, column.maximum)


def _table(sheet: Worksheet, heads: list[_Head], ranges: dict[str, str]) -> None:
    """Headings, units and checks of one table; printing and panes."""
    for c, head in enumerate(heads, start=1):
        _heading(sheet, c, head)
        _check(sheet, c, head, ranges)
    sheet.row_dimensions[1].height, sheet.row_dimensions[2].height = 22, 18
    for row in range(3, RULED[sheet.title] + 3):
        sheet.row_dimensions[row].height = 28
    sheet.freeze_panes = "C3" if heads[0].name == "sample" else "B3"
    sheet.print_title_rows = "1:2"
    _page(sheet, "landscape")


def _heading(sheet: Worksheet, c: int, head: _Head) -> None:
    top, below = sheet.cell(1, c, head.name), sheet.cell(2, c, head.unit or None)
    top.font, top.border, below.border = _font(bold=True), _BOX, _BOX
    top.fill = _LAB if head.name in LABORATORY else _READ if head.name in _READINGS else _WHO
    below.font, below.fill = _font(italic=True, color=_PALE), _UNIT
    top.alignment = below.alignment = Alignment(horizontal="center", vertical="center")
    note = Comment(_note(head), "gley")
    note.width, note.height = 280, 90
    top.comment = note
    width = _WIDTHS.get(head.name, max(len(head.name), len(head.unit), 6) + 3)
    sheet.column_dimensions[get_column_letter(c)].width = width


def _note(head: _Head) -> str:
    """Meaning, range and form of what is written in a column."""
    lines = [head.meaning]
    if head.dtype == "amount":
        lines.append(f"in {head.unit}; not detected: write <0.5 with the laboratory's limit")
    elif head.low is not None and head.high is not None:
        lines.append(f"{head.low:g} to {head.high:g} {head.unit}".strip())
    elif head.dtype == "date":
        lines.append("as 2031-04-28")
    elif head.dtype == "time":
        lines.append("as 14:05")
    return "\n".join(lines)


def _check(sheet: Worksheet, c: int, head: _Head, ranges: dict[str, str]) -> None:
    """The check on what is typed into a column, and how it is shown."""
    letter = get_column_letter(c)
    shown = {"date": "yyyy-mm-dd", "time": "hh:mm", "text": "@"}.get(head.dtype, "General")
    side = {"text": "left", "date": "center", "time": "center"}.get(head.dtype, "right")
    sheet.column_dimensions[letter].number_format = shown
    for row in range(3, RULED[sheet.title] + 3):
        cell = sheet.cell(row, c)
        cell.border, cell.number_format, cell.font = _BOX, shown, _font()
        cell.alignment = Alignment(vertical="center", horizontal=side, indent=int(side == "left"))
    rule = _rule(head, f"{letter}3", ranges)
    if rule is not None:
        rule.errorTitle, rule.allow_blank = head.name, True
        rule.showErrorMessage = rule.error is not None
        sheet.add_data_validation(rule)
        rule.add(f"{letter}3:{letter}{ROWS + 2}")


def _rule(head: _Head, first: str, ranges: dict[str, str]) -> DataValidation | None:
    """A list where there are choices, else what is possible. Where the reader takes more than the check knows (another
    electrode, a laboratory's flag) it warns and lets it pass.
    """
    if head.name in LISTS:
        choices = ",".join(LISTS[head.name])
        style = "warning" if head.name == "solution" else "stop"
        return DataValidation("list", formula1=f'"{choices}"', errorStyle=style, error=f"One of: {choices}.")
    if head.name in ranges:
        words = "Not in the list on the sheet How to. Keep it if it is what the label says."
        error = words if head.name == "electrode" else None
        return DataValidation("list", formula1=ranges[head.name], errorStyle="warning", error=error)
    if head.name == "sample":
        once = f"COUNTIF($A$3:$A${ROWS + 2},{first})=1"
        return DataValidation("custom", formula1=once, errorStyle="warning", error="This name is in use already.")
    if head.dtype == "amount":
        words = "A number, or a non-detect with its limit as <0.5. Leave the cell empty if nothing was measured."
        form = f'OR(AND(ISNUMBER({first}),{first}>=0),LEFT({first},1)="<",LEFT({first},1)=">")'
        return DataValidation("custom", formula1=form, errorStyle="warning", error=words)
    return _range(head, first)


def _range(head: _Head, first: str) -> DataValidation | None:
    """The range of a number, date or time."""
    if head.dtype == "date":
        return DataValidation("date", operator="greaterThan", formula1="36525", error="A date, as 2031-04-28.")
    if head.dtype == "time":
        return DataValidation("time", formula1="0", formula2="0.999999", error="A time of day, as 14:05.")
    if head.dtype != "number":
        return None
    if head.low is None or head.high is None:
        return DataValidation("custom", formula1=f"ISNUMBER({first})", error="A number.")
    low, high = f"{head.low:g}", f"{head.high:g}"
    error = f"{low} to {high} {head.unit}".strip() + " is possible."
    return DataValidation("decimal", operator="between", formula1=low, formula2=high, error=error)


def _page(sheet: Worksheet, orientation: str) -> None:
    sheet.page_setup.orientation, sheet.page_setup.paperSize = orientation, sheet.PAPERSIZE_A4
    sheet.page_setup.fitToWidth, sheet.page_setup.fitToHeight = 1, 0
    sheet.sheet_properties.pageSetUpPr.fitToPage = True
    for side in ("left", "right"):
        setattr(sheet.page_margins, side, 0.4)
    sheet.page_margins.top, sheet.page_margins.bottom, sheet.page_margins.footer = 0.5, 0.7, 0.35
    sheet.oddFooter.left.text, sheet.oddFooter.right.text = "&A", "page &P of &N"


def _print_in_two(sheet: Worksheet) -> None:
    """What is written on site on one page, the chemistry on the next, with the sample's name on both.

    All columns on one page are too narrow to write in. An area of whole columns ends with the last row in use.
    """
    last, end = get_column_letter(len(FIELD)), get_column_letter(len(FIELD) + len(LABORATORY))
    sheet.print_area = f"A1:{last}{_LAST_ROW},{get_column_letter(len(FIELD) + 1)}1:{end}{_LAST_ROW}"
    sheet.print_title_cols = "A:A"


def _facts(sheet: Worksheet, ranges: dict[str, str]) -> None:
    """Key and value, what to write as a note; lines below must hold no second cell, or they would read as facts."""
    below = len(FACTS) + 1
    for row, (key, words) in enumerate(FACTS.items(), start=1):
        name, value = sheet.cell(row, 1, key), sheet.cell(row, 2, _FILLED.get(key))
        name.font, name.fill, name.border, value.border = _font(bold=True), _WHO, _BOX, _BOX
        name.alignment, value.alignment = Alignment(vertical="center"), Alignment(vertical="center", wrap_text=True)
        value.font = _font()
        sheet.row_dimensions[row].height = 26
        if words:
            name.comment = Comment(words, "gley")
            below += 1
            sheet.cell(below, 1, f"{key} – {words}").font = _font(italic=True, color=_PALE)
        if "electrode" in ranges and key.startswith("Electrode"):
            rule = _rule(_head("electrode"), f"B{row}", ranges)
            assert rule is not None
            rule.allow_blank = rule.showErrorMessage = True
            sheet.add_data_validation(rule)
            rule.add(f"B{row}")
    sheet.column_dimensions["A"].width, sheet.column_dimensions["B"].width = 32, 62
    _page(sheet, "portrait")


def _how_to(sheet: Worksheet, electrodes: tuple[str, ...]) -> str:
    """The instructions, and below them the electrodes; returns the range of these."""
    sheet["A1"] = "How to fill this workbook"
    sheet["A2"] = f"Purpose: {_FILLED['Purpose']}"
    sheet["A1"].font, sheet["A2"].font = _font(bold=True, size=15), _font(italic=True, color=_PALE)
    parts = tomllib.loads((files("gley.survey") / "how_to.toml").read_text(encoding="utf-8"))
    if electrodes:
        parts["Reference electrodes to choose from"] = list(electrodes)
    row, first = 3, 0
    for heading, lines in parts.items():
        title = sheet.cell(row + 1, 1, heading)
        title.font, title.fill = _font(bold=True), _READ if heading == "Mind" else _WHO
        title.alignment = Alignment(vertical="center", indent=1)
        sheet.row_dimensions[row + 1].height = 17
        first, row = row + 2, row + 2
        for line in lines:
            cell = sheet.cell(row, 1, line)
            cell.alignment, cell.font = Alignment(wrap_text=True, vertical="top", indent=1), _font()
            sheet.row_dimensions[row].height = 14 * (1 + (len(line) - 1) // 105) + 2
            row += 1
    sheet.column_dimensions["A"].width = 92
    sheet.sheet_view.showGridLines = False
    _page(sheet, "portrait")
    sheet.page_setup.fitToHeight = 1
    return f"'{sheet.title}'!$A${first}:$A${row - 1}"
