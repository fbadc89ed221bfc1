"""The workbook of a run: samples, fields and findings as sheets that sort; the same bytes for the same run."""

import datetime as dt
import io
import re
import zipfile
from pathlib import Path

import openpyxl
import pandas as pd
from openpyxl.cell.cell import ILLEGAL_CHARACTERS_RE
from openpyxl.styles import Font, PatternFill
from openpyxl.utils import get_column_letter
from openpyxl.worksheet.worksheet import Worksheet

MOST_ROWS = 1_048_575
"""Rows that a sheet can hold below its header."""

_HEAD = PatternFill("solid", fgColor="E7D3B8")
_MOST_WIDE, _LEAST_WIDE, _LOOKED_AT = 46, 8, 200
_PLAIN_NUMBER = re.compile(r"-?(?:0|[1-9]\d*)(?:\.(\d+))?$")


def write_workbook(
    sheets: dict[str, pd.DataFrame], reported: tuple[str, ...], path: Path, made: dt.datetime
) -> tuple[str, ...]:
    """Write frames as sheets with frozen, coloured headers, filters and number formats.

    Parameters
    ----------
    sheets : dict
        Frames by sheet name, in order.
    reported : tuple of str
        Columns of values as delivered: plain numbers become numbers with the decimals they were written with; all
        else (`<0.5`) stays text.
    path : Path
        The .xlsx file.
    made : datetime
        Time noted in the file, UTC.

    Returns
    -------
    tuple of str
        Names of frames with more rows than a sheet holds; they aren't in the workbook.
    """
    book = openpyxl.Workbook()
    book.remove(book.worksheets[0])
    left_out = []
    for name, frame in sheets.items():
        if len(frame) > MOST_ROWS:
            left_out.append(name)
        else:
            _fill(book.create_sheet(name), frame, reported)
    book.properties.creator, book.properties.created = "gley", made
    path.write_bytes(_bytes(book, made))
    return tuple(left_out)


def _fill(sheet: Worksheet, frame: pd.DataFrame, reported: tuple[str, ...]) -> None:
    for c, column in enumerate(map(str, frame), start=1):
        head = sheet.cell(1, c, column)
        head.font, head.fill = Font(bold=True), _HEAD
        number_format = _number_format(column) if frame[column].dtype.kind == "f" else ""
        longest = max([_LEAST_WIDE, len(column), *(len(str(value)) for value in frame[column].head(_LOOKED_AT))])
        sheet.column_dimensions[get_column_letter(c)].width = min(longest + 2, _MOST_WIDE)
        for row, value in enumerate(frame[column].tolist(), start=2):
            if number_format:
                if value == value:
                    sheet.cell(row, c, value).number_format = number_format
            elif value not in ("", None):
                _text(sheet, row, c, str(value), column in reported)
    sheet.freeze_panes = "B2"
    sheet.auto_filter.ref = sheet.dimensions


def _text(sheet: Worksheet, row: int, column: int, text: str, reported: bool) -> None:
    """A text cell, never a formula; a reported plain number becomes one, with its own decimals."""
    number = _PLAIN_NUMBER.match(text) if reported else None
    if number:
        cell = sheet.cell(row, column, float(text))
        cell.number_format = "0." + "0" * len(number.group(1)) if number.group(1) else "0"
        return
    cell = sheet.cell(row, column, ILLEGAL_CHARACTERS_RE.sub("", text))
    cell.data_type = "s"  # a name from the survey such as =A1 is text


def _number_format(column: str) -> str:
    """Significant digits for amounts, whole mV, as many decimals as the quantity is read with."""
    if column.endswith(("_mol_L", "_eq_L")):
        return "0.00E+00"
    if column.endswith(("_mV", "_cm", "_uS_cm")):
        return "0"
    if column.endswith("_C"):
        return "0.0"
    return "0.000000" if column.endswith("_deg") else "0.00"


def _bytes(book: openpyxl.Workbook, made: dt.datetime) -> bytes:
    """The file's content with one time in it, instead of the clock's."""
    saved, clean = io.BytesIO(), io.BytesIO()
    book.save(saved)
    moment = max(made, dt.datetime(1980, 1, 1)).timetuple()[:6]  # zip knows no earlier time
    stamp = made.strftime("%Y-%m-%dT%H:%M:%SZ").encode()
    with zipfile.ZipFile(saved) as old, zipfile.ZipFile(clean, "w") as new:
        for name in old.namelist():
            part = old.read(name)
            if name == "docProps/core.xml":  # openpyxl puts the hour of saving here
                part = re.sub(rb"(<dcterms:modified[^>]*>)[^<]*", rb"\g<1>" + stamp, part)
            new.writestr(zipfile.ZipInfo(name, moment), part, zipfile.ZIP_DEFLATED)
    return clean.getvalue()
