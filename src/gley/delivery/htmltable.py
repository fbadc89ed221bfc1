"""Frames as HTML tables, chemical names set as formulas, numbers to the digits they are worth."""

import re
from html import escape

import pandas as pd

from gley.formula import markup
from gley.stability import species

MOST_ROWS = 2000
"""Rows shown of a table; the rest is said and stands in the CSV."""

_PLAIN_FORMULA = re.compile(r"\b(?:O2|NO3|NO2|NH4|SO4|HCO3|H2S|CH4|H2O|CO2)\b")
_HEADS = {
    "sample": "Sample", "station": "Station", "date": "Date", "round": "Round", "temperature_C": "T (°C)",
    "ORP_mV": "ORP (mV)", "Eh_mV": "Eh (mV)", "Eh_sd_mV": "± (mV)", "redox_category": "Category",
    "redox_process": "Redox process", "process_basis": "Basis", "process_missing": "Missing",
}  # fmt: skip
_DECIMALS = {"pH": 2, "pe": 1, "temperature_C": 1}
_KEPT_WHOLE = ("sample", "Sample", "station", "date", "Date")


def table(frame: pd.DataFrame, whole: str = "", small: bool = False) -> str:
    """A frame as an HTML table; `whole` names the file that holds all rows of one too long to show."""
    heads = "".join(f"<th>{escape(_HEADS.get(str(name), str(name).removeprefix('field_')))}</th>" for name in frame)
    rows = []
    for record in frame.head(MOST_ROWS).to_dict("records"):
        named = [(str(name), value) for name, value in record.items()]
        cells = "".join(f"<td{_style(name, value)}>{_cell(name, value)}</td>" for name, value in named)
        rows.append(f"<tr>{cells}</tr>")
    body = f"<thead><tr>{heads}</tr></thead><tbody>{''.join(rows)}</tbody>"
    more = f"<p class=small>The first {MOST_ROWS} of {len(frame)} rows; {escape(whole)} holds all.</p>"
    kind = ' class="small"' if small else ""
    return f'<div class="wide"><table{kind}>{body}</table></div>{more if len(frame) > MOST_ROWS else ""}'


def _style(name: str, value: object) -> str:
    if isinstance(value, (int, float)):
        return ' class="n"'
    return ' class="k"' if name in _KEPT_WHOLE else ""


def _cell(name: str, value: object) -> str:
    if isinstance(value, float):
        return "" if value != value else number(value, f".{_DECIMALS.get(name, 0)}f")
    return chemical(str(value))


def number(value: float, form: str) -> str:
    """A number in a format, with a true minus sign and no negative zero."""
    text = format(value, form)
    if text.startswith("-") and not text.strip("-0."):
        text = text[1:]
    return text.replace("-", "−")


def chemical(text: str) -> str:
    """Text with the names of species set as formulas; markup in it is harmless."""
    words = [_word(word) for word in text.split(" ")]
    return _PLAIN_FORMULA.sub(lambda found: markup(found.group(0)), " ".join(words))


def _word(word: str) -> str:
    """A word set as a formula when it is a dissolved form's name, with what stands behind it."""
    name = word.rstrip(",;.:")
    if name in species() and species()[name].dissolved:
        return markup(species()[name].formula) + escape(word[len(name) :])
    return markup(escape(word)) if "^" in word else escape(word)
