"""Chemical formulas as plain text: parse, weigh, typeset.

A charge stands after a caret, as in chemical typesetting: ``Fe^2+``, ``HAsO4^2-``, ``UO2(CO3)3^4-``, ``H^+``.
"""

import csv
import re
from dataclasses import dataclass
from functools import cache
from importlib.resources import files
from types import MappingProxyType

from gley.errors import GleyError

_CHARGE = re.compile(r"\^(\d*)([+-])$")
_TOKEN = re.compile(r"([A-Z][a-z]?)(\d*)|(\()|(\))(\d*)")


@dataclass(frozen=True)
class Formula:
    """A parsed formula: atom counts and charge number."""

    text: str
    atoms: MappingProxyType
    charge: int


@cache
def atomic_weights() -> MappingProxyType:
    """Standard atomic weights in g/mol by symbol: abridged values, IUPAC 2021 (Prohaska et al. 2022)."""
    text = (files("gley") / "data" / "atomic_weights.csv").read_text(encoding="utf-8")
    rows = csv.DictReader(text.splitlines())
    return MappingProxyType({row["symbol"]: float(row["weight_g_mol"]) for row in rows})


@cache
def parse(text: str) -> Formula:
    """Atoms and charge of a plain-text formula such as ``Ca2UO2(CO3)3`` or ``HS^-``; ``e^-`` is the electron.

    Raises
    ------
    GleyError
        When the text isn't a formula; the message names the place in it.
    """
    body, charge = text, 0
    found = _CHARGE.search(text)
    if found:
        body = text[: found.start()]
        charge = int(found.group(1) or 1) * (1 if found.group(2) == "+" else -1)
    if body == "e":
        return Formula(text, MappingProxyType({}), charge)
    stack: list[dict[str, int]] = [{}]
    position = 0
    while position < len(body):
        token = _TOKEN.match(body, position)
        if not token or (token.group(4) and len(stack) == 1):
            raise _not_a_formula(text, position)
        if token.group(1):
            _add(stack[-1], token.group(1), int(token.group(2) or 1))
        elif token.group(3):
            stack.append({})
        else:
            group = stack.pop()
            for symbol, count in group.items():
                _add(stack[-1], symbol, count * int(token.group(5) or 1))
        position = token.end()
    if len(stack) != 1 or not stack[0]:
        raise _not_a_formula(text, len(body))
    return Formula(text, MappingProxyType(stack[0]), charge)


def _add(atoms: dict[str, int], symbol: str, count: int) -> None:
    atoms[symbol] = atoms.get(symbol, 0) + count


def _not_a_formula(text: str, position: int) -> GleyError:
    message = f"'{text}' isn't a chemical formula (character {position + 1})."
    return GleyError(message, "Write it like Fe(OH)3, HAsO4^2- or Fe^2+.")


def molar_mass(text: str) -> float:
    """Molar mass in g/mol of a plain-text formula.

    Raises
    ------
    GleyError
        For an element without a standard atomic weight in the table.
    """
    weights = atomic_weights()
    total = 0.0
    for symbol, count in parse(text).atoms.items():
        if symbol not in weights:
            message = f"'{symbol}' in '{text}' has no standard atomic weight in the table."
            raise GleyError(message, "Check the symbol.")
        total += count * weights[symbol]
    return total


def charge_text(charge: int) -> str:
    """``2+``, ``-``, ```` for +2, −1, 0: the part after the caret."""
    if charge == 0:
        return ""
    size = "" if abs(charge) == 1 else str(abs(charge))
    return size + ("+" if charge > 0 else "-")


def typeset(text: str) -> str:
    """A plain-text formula as matplotlib mathtext with upright letters, subscripts and superscripts."""
    body, _, charge = text.partition("^")
    body = re.sub(r"(?<=[A-Za-z)])(\d+)", r"_{\1}", body)
    # braces round the sign: bare, mathtext sets it off like an operator, "2 +"
    charge = re.sub(r"[+-]", lambda sign: "{" + sign.group().replace("-", "−") + "}", charge)
    return rf"$\mathregular{{{body}{'^{' + charge + '}' if charge else ''}}}$"


def markup(text: str) -> str:
    """A plain-text formula as HTML with ``<sub>`` and ``<sup>``; the caller has escaped nothing, formulas are safe."""
    body, _, charge = text.partition("^")
    body = re.sub(r"(?<=[A-Za-z)])(\d+)", r"<sub>\1</sub>", body)
    return body + (f"<sup>{charge.replace('-', '−')}</sup>" if charge else "")
