"""The house vocabulary: every column of every table with unit, range and meaning, and every constituent.

Held as two plain tables (`data/columns.csv`, `data/constituents.csv`) from which templates and the documentation are
made, so that nothing can drift apart. Concentrations are columns `<key>_mol_L`; alkalinity is `alkalinity_eq_L`.
"""

import csv
from dataclasses import dataclass
from functools import cache
from importlib.resources import files
from types import MappingProxyType

from gley.formula import parse


@dataclass(frozen=True)
class Column:
    """One column of one table. `minimum` and `maximum` bound what is physically possible, None = no bound."""

    table: str
    name: str
    dtype: str
    unit: str
    minimum: float | None
    maximum: float | None
    meaning: str


@dataclass(frozen=True)
class Constituent:
    """Something a laboratory reports: one mole is one of its formula; mass per litre weighs `weighed` (formula if
    empty) unless the header or unit says otherwise; `element` is what bases are counted by.
    """

    key: str
    formula: str
    weighed: str
    element: str
    oxidation_state: int | None
    meaning: str
    max_mol_L: float

    @property
    def charge(self) -> int:
        """Charge number of the formula (0 where the form isn't an ion)."""
        return parse(self.formula).charge

    @property
    def column(self) -> str:
        """Name of its column in the amounts table."""
        return amount_column(self.key)


def amount_column(key: str) -> str:
    """`As` → `As_mol_L`; alkalinity counts equivalents: `alkalinity_eq_L`."""
    return "alkalinity_eq_L" if key == "alkalinity" else f"{key}_mol_L"


@cache
def columns(table: str) -> MappingProxyType:
    """The columns of one table (`samples`, `stations`, `checks`, `eh`, `fields`) by name, in order."""
    found = {}
    for row in _rows("columns.csv"):
        if row["table"] == table:
            low, high = (float(row[side]) if row[side] else None for side in ("min", "max"))
            found[row["column"]] = Column(table, row["column"], row["dtype"], row["unit"], low, high, row["meaning"])
    if not found:
        message = f"no table '{table}' in the vocabulary"
        raise KeyError(message)
    return MappingProxyType(found)


@cache
def constituents() -> MappingProxyType:
    """All constituents by key, in order."""
    found = {}
    for row in _rows("constituents.csv"):
        state = int(row["oxidation_state"]) if row["oxidation_state"] else None
        found[row["key"]] = Constituent(
            row["key"], row["formula"], row["weighed"], row["element"], state, row["meaning"], float(row["max_mol_L"])
        )
    return MappingProxyType(found)


def _rows(name: str) -> csv.DictReader:
    return csv.DictReader((files("gley") / "data" / name).read_text(encoding="utf-8").splitlines())
