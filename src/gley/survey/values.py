"""One cell to one value: numbers as people write them, non-detects with their limit, dates, times; never a guess."""

import datetime as dt
import math
import re
from collections.abc import Iterable
from dataclasses import dataclass
from typing import Any

import pandas as pd

_MISSING = frozenset({"", "-", "--", "–", "—", "na", "n/a", "nan", "nm", "ns", "null", "none", "n.a.", "k.a.", "."})
_NOT_DETECTED = frozenset(
    {"nd", "n.d.", "bdl", "bql", "<dl", "<lod", "<mdl", "<rl", "<loq", "u", "n.n.", "b.b.", "notdetected"}
)
_EXCEL_ERRORS = frozenset({"#n/a", "#ref!", "#div/0!", "#value!", "#name?", "#num!", "#null!"})
_NUMBER = re.compile(r"^([<>≤≥]?)\s*([-+]?(?:\d+(?:\.\d*)?|\.\d+)(?:e[-+]?\d+)?)\s*([a-z*]{0,2})$", re.IGNORECASE)
_THOUSANDS_COMMA = re.compile(r"[<>≤≥]?\s*[-+]?[1-9]\d{0,2}(,\d{3})+(\.\d+)?")
_THOUSANDS_POINT = re.compile(r"[<>≤≥]?\s*[-+]?[1-9]\d{0,2}(\.\d{3})+")
_DIMENSIONLESS_FLAGS = {"u": "<"}
_MONTHS = ("jan", "feb", "mar", "apr", "may", "jun", "jul", "aug", "sep", "oct", "nov", "dec")
DAY_FIRST, MONTH_FIRST = "day/month", "month/day"


@dataclass(frozen=True)
class Reading:
    """A cell as a number: `limit` is `<` or `>` for a bound; `problem` says why there is none; `flag` trails it;
    `mark` is a decimal mark other than the file's.
    """

    value: float
    limit: str = ""
    problem: str = ""
    flag: str = ""
    mark: str = ""

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
        return Reading(math.nan, problem="too large a number") if math.isinf(cell) else Reading(float(cell))
    if isinstance(cell, (dt.datetime, dt.date, dt.time)):
        return Reading(
            math.nan, problem="a date or time where a number is wanted (the spreadsheet may have changed it)"
        )
    text = str(cell).strip().replace("−", "-").replace("\u00a0", " ")
    plain = text.lower().replace(" ", "")
    if plain in _MISSING:
        return NOTHING
    if plain in _EXCEL_ERRORS:
        return Reading(math.nan, problem="a spreadsheet error")
    if plain in _NOT_DETECTED:
        return Reading(math.nan, problem="not detected, but without its limit")
    return _written(text, decimal_comma)


def _written(text: str, decimal_comma: bool) -> Reading:
    plain, problem, mark = _with_point(text, decimal_comma)
    found = _NUMBER.match(plain)
    if problem or not found:
        return Reading(math.nan, problem=problem or "not a number")
    sign, digits, flag = found.groups()
    value = float(digits)
    if not math.isfinite(value):
        return Reading(math.nan, problem="too large a number")
    limit = {"≤": "<", "≥": ">"}.get(sign, sign) or _DIMENSIONLESS_FLAGS.get(flag.lower(), "")
    if limit == "<" and value == 0:
        return Reading(math.nan, problem="a limit of zero says nothing")
    return Reading(value, limit, flag=flag, mark=mark)


def _with_point(text: str, decimal_comma: bool) -> tuple[str, str, str]:
    """The text with a decimal point, a problem with its marks, and the mark where it isn't the file's own."""
    if decimal_comma:
        if "," in text:
            return text.replace(".", "").replace(",", "."), "", ""
        if _THOUSANDS_POINT.fullmatch(text):
            if text.count(".") == 1:
                return text, "the point can mean thousands or decimals", ""
            return text.replace(".", ""), "", ""
        return text, "", "point" if re.search(r"\d\.\d", text) else ""
    if "," not in text:
        return text, "", ""
    if _THOUSANDS_COMMA.fullmatch(text):
        if text.count(",") == 1 and "." not in text:
            return text, "the comma can mean thousands or decimals", ""
        return text.replace(",", ""), "", ""
    # a comma among decimal points that can't be a thousands mark
    return (text.replace(",", "."), "", "comma") if text.count(",") == 1 else (text, "", "")


def date_order(cells: Iterable[Any]) -> str:
    """Which order the dates of a column show by a day beyond 12; '' when none does or both do."""
    orders = set()
    for cell in cells:
        parts = _three_numbers(cell)
        if parts and max(parts[0], parts[1]) > 12:
            orders.add(DAY_FIRST if parts[0] > 12 else MONTH_FIRST)
    return orders.pop() if len(orders) == 1 else ""


def open_order(cell: Any) -> bool:
    """Whether a date alone leaves open which of its numbers is the day."""
    parts = _three_numbers(cell)
    return parts is not None and max(parts[0], parts[1]) <= 12 and parts[0] != parts[1]


def _three_numbers(cell: Any) -> tuple[int, int, int] | None:
    """Numbers of a date written 3/4/2031 or 3-4-31; None for all else."""
    text = cell.strip() if isinstance(cell, str) else ""
    found = re.match(r"^(\d{1,2})([/-])(\d{1,2})\2(\d{4}|\d{2})\b", text)
    return (int(found[1]), int(found[3]), _year(found[4])) if found else None


def _year(text: str) -> int:
    """Two digits are of 1969 to 2068, as POSIX has it."""
    year = int(text)
    return year if len(text) == 4 else year + (2000 if year < 69 else 1900)


def day(cell: Any, order: str = "") -> tuple[pd.Timestamp | None, str]:
    """A cell as a day, and a doubt about it ('' none): spreadsheet dates, ISO, 28.04.2031, 28/04/2031, 28 Apr 2031.

    `order` is what the other dates of the column show (`date_order`).
    """
    if cell is None or (isinstance(cell, str) and cell.strip().lower() in _MISSING):
        return None, ""
    if isinstance(cell, (dt.datetime, dt.date)):
        return pd.Timestamp(cell).normalize(), ""
    text = str(cell).strip()
    iso = re.match(r"^(\d{4})([-/.])(\d{1,2})\2(\d{1,2})(?!\d)", text)
    if iso:
        return _made(int(iso[1]), int(iso[3]), int(iso[4]))
    dotted = re.match(r"^(\d{1,2})\.(\d{1,2})\.(\d{4}|\d{2})\b", text)
    if dotted:
        return _made(_year(dotted[3]), int(dotted[2]), int(dotted[1]))
    named = re.match(r"^(\d{1,2})[\s.-]*([A-Za-z]{3})[a-z]*\.?[\s,-]*(\d{4}|\d{2})\b", text)
    if named and named[2].lower() in _MONTHS:
        return _made(_year(named[3]), _MONTHS.index(named[2].lower()) + 1, int(named[1]))
    parts = _three_numbers(cell)
    if not parts:
        return None, "not a date"
    first, second, year = parts
    if second > 12 or (order == MONTH_FIRST and first <= 12):
        return _made(year, first, second)
    made, doubt = _made(year, second, first)
    if open_order(cell) and not order and not doubt:
        doubt = "day/month taken; month/day is possible too"
    return made, doubt


def _made(year: int, month: int, date: int) -> tuple[pd.Timestamp | None, str]:
    try:
        return pd.Timestamp(year, month, date), ""
    except ValueError:
        return None, "not a date"


def clock(cell: Any) -> str:
    """A cell as a time of day `HH:MM`; '' when it holds none. Knows `2:30 PM`."""
    if isinstance(cell, (dt.datetime, dt.time)):
        return f"{cell.hour:02d}:{cell.minute:02d}"
    if isinstance(cell, (int, float)) and not isinstance(cell, bool) and 0 <= cell < 1:
        minutes = min(round(cell * 1440), 1439)
        return f"{minutes // 60:02d}:{minutes % 60:02d}"
    found = re.search(r"(?:^|[T\s])(\d{1,2}):(\d{2})(?::\d{2})?(?:\.\d+)?\s*([ap]\.?m\b)?", str(cell or ""), re.I)
    if not found:
        return ""
    hour, half = int(found[1]), (found[3] or "")[:1].lower()
    if half and 1 <= hour <= 12:
        hour = hour % 12 + (12 if half == "p" else 0)
    return f"{hour:02d}:{found[2]}" if hour < 24 and int(found[2]) < 60 else ""


def words(cell: Any) -> str:
    """A cell as text: whole numbers without a decimal point, spaces tidied."""
    if cell is None or cell is pd.NaT:
        return ""
    if isinstance(cell, float) and cell.is_integer():
        return str(int(cell))
    if isinstance(cell, (dt.datetime, dt.date)):
        return pd.Timestamp(cell).date().isoformat()
    return " ".join(str(cell).split())
