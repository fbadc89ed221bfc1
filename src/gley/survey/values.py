"""One cell to one value: numbers as people write them, non-detects with their limit, dates, times; never a guess."""

import datetime as dt
import math
import re
from dataclasses import dataclass
from typing import Any

import pandas as pd

_MISSING = frozenset(
    {"", "-", "--", "–", "—", "na", "n/a", "nan", "nm", "ns", "null", "none", "n.a.", "k.a.", "#n/a", "."}
)
_NOT_DETECTED = frozenset(
    {"nd", "n.d.", "bdl", "bql", "<dl", "<lod", "<mdl", "<rl", "<loq", "u", "n.n.", "b.b.", "not detected"}
)
_EXCEL_ERRORS = frozenset({"#ref!", "#div/0!", "#value!", "#name?", "#num!", "#null!"})
_NUMBER = re.compile(r"^([<>≤≥]?)\s*([-+]?(?:\d+(?:\.\d*)?|\.\d+)(?:e[-+]?\d+)?)\s*([a-z*]{0,2})$", re.IGNORECASE)
_DIMENSIONLESS_FLAGS = {"u": "<"}


@dataclass(frozen=True)
class Reading:
    """A cell as a number: `limit` is `<` or `>` for a bound; `problem` says why there is none; `flag` trails it."""

    value: float
    limit: str = ""
    problem: str = ""
    flag: str = ""

    @property
    def missing(self) -> bool:
        """Whether the cell holds nothing at all."""
        return math.isnan(self.value) and not self.problem


NOTHING = Reading(math.nan)


def number(cell: Any, decimal_comma: bool = False) -> Reading:
    """A cell as a number with its limit.

    Knows `<0.5`, `< 0,5` (where the file writes decimal commas), `>200`, `1.2E-3`, `0.5 U`, `12 J`, and the words for
    nothing measured and nothing detected.
    """
    if cell is None or cell is pd.NaT:
        return NOTHING
    if isinstance(cell, bool):
        return Reading(math.nan, problem="a yes/no value, not a number")
    if isinstance(cell, (int, float)):
        return Reading(float(cell))
    if isinstance(cell, (dt.datetime, dt.date, dt.time)):
        return Reading(
            math.nan, problem="a date or time where a number is wanted (the spreadsheet may have changed it)"
        )
    text = str(cell).strip().replace("−", "-").replace("\u00a0", " ")
    plain = text.lower()
    if plain in _MISSING:
        return NOTHING
    if plain in _EXCEL_ERRORS:
        return Reading(math.nan, problem="a spreadsheet error")
    if plain in _NOT_DETECTED:
        return Reading(math.nan, problem="not detected, but without its limit")
    return _written(text, decimal_comma)


def _written(text: str, decimal_comma: bool) -> Reading:
    if "," in text:
        if decimal_comma:
            text = text.replace(".", "").replace(",", ".")
        elif re.fullmatch(r"[<>]?\s*[-+]?[1-9]\d{0,2}(,\d{3})+(\.\d+)?", text):
            if text.count(",") == 1 and "." not in text:
                return Reading(math.nan, problem="the comma can mean thousands or decimals")
            text = text.replace(",", "")
        elif re.fullmatch(r"[<>]?\s*[-+]?\d+,\d+", text):
            # a text cell among decimal points: a comma that can't be a thousands mark
            text = text.replace(",", ".")
    found = _NUMBER.match(text)
    if not found:
        return Reading(math.nan, problem="not a number")
    sign, digits, flag = found.groups()
    limit = {"≤": "<", "≥": ">"}.get(sign, sign) or _DIMENSIONLESS_FLAGS.get(flag.lower(), "")
    return Reading(float(digits), limit, flag=flag)


def day(cell: Any) -> tuple[pd.Timestamp | None, str]:
    """A cell as a day, and a doubt about it ('' none): spreadsheet dates, ISO, day.month.year, day/month/year."""
    if cell is None or (isinstance(cell, str) and cell.strip().lower() in _MISSING):
        return None, ""
    if isinstance(cell, (dt.datetime, dt.date)):
        return pd.Timestamp(cell).normalize(), ""
    text = str(cell).strip()
    iso = re.match(r"^(\d{4})-(\d{1,2})-(\d{1,2})", text)
    if iso:
        return _made(*(int(part) for part in iso.groups()))
    parts = re.match(r"^(\d{1,2})([./-])(\d{1,2})[./-](\d{4}|\d{2})\b", text)
    if not parts:
        return None, "not a date"
    first, mark, second, year = int(parts[1]), parts[2], int(parts[3]), int(parts[4])
    year += 2000 if year < 100 else 0
    if mark == "/" and second > 12 >= first:
        return _made(year, first, second)
    made, doubt = _made(year, second, first)
    if mark == "/" and first <= 12 and first != second and not doubt:
        doubt = "day/month taken; month/day is possible too"
    return made, doubt


def _made(year: int, month: int, date: int) -> tuple[pd.Timestamp | None, str]:
    try:
        return pd.Timestamp(year, month, date), ""
    except ValueError:
        return None, "not a date"


def clock(cell: Any) -> str:
    """A cell as a time of day `HH:MM`; '' when it holds none."""
    if isinstance(cell, (dt.datetime, dt.time)):
        return f"{cell.hour:02d}:{cell.minute:02d}"
    if isinstance(cell, (int, float)) and not isinstance(cell, bool) and 0 <= cell < 1:
        minutes = round(cell * 1440)
        return f"{minutes // 60:02d}:{minutes % 60:02d}"
    found = re.search(r"(?:^|[T\s])(\d{1,2}):(\d{2})", str(cell or ""))
    return f"{int(found[1]):02d}:{found[2]}" if found and int(found[1]) < 24 and int(found[2]) < 60 else ""


def words(cell: Any) -> str:
    """A cell as text: whole numbers without a decimal point, spaces tidied."""
    if cell is None or cell is pd.NaT:
        return ""
    if isinstance(cell, float) and cell == int(cell):
        return str(int(cell))
    if isinstance(cell, (dt.datetime, dt.date)):
        return pd.Timestamp(cell).date().isoformat()
    return " ".join(str(cell).split())
