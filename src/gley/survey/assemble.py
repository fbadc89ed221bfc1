"""Records on their way into a table of the house form, and the tables made from them."""

from collections.abc import Iterator
from dataclasses import dataclass, field
from typing import Any

import pandas as pd

from gley.columns import amount_column, columns, constituents
from gley.findings import Place


@dataclass
class Record:
    """One row on its way into a table: house values, amounts with limits, what was reported, and places by column."""

    home: Place
    cells: dict[str, Any] = field(default_factory=dict)
    amounts: dict[str, tuple[float, str]] = field(default_factory=dict)
    reported: dict[str, tuple[str, str, str]] = field(default_factory=dict)
    places: dict[str, Place] = field(default_factory=dict)

    def put(self, column: str, value: Any, where: Place) -> bool:
        """Enter a value where there is none yet; False when another stands there. Remarks are strung together."""
        held = self.cells.get(column)
        if held in (None, ""):
            self.cells[column], self.places[column] = value, where
        elif column == "remarks" and value not in ("", held):
            self.cells[column] = f"{held}; {value}"
        elif value != held and value not in (None, ""):
            return False
        return True


def frame(kind: str, rows: list[Record]) -> pd.DataFrame:
    """Records as a table with all columns of the vocabulary."""
    made = {}
    for name, column in columns(kind).items():
        found = [row.cells.get(name) for row in rows]
        if column.dtype == "number":
            made[name] = pd.Series([float("nan") if value is None else value for value in found], dtype="float64")
        elif column.dtype == "date":
            made[name] = pd.Series(pd.to_datetime(pd.Series(found, dtype="object")), dtype="datetime64[ns]")
        else:
            made[name] = pd.Series(["" if value is None else str(value) for value in found], dtype="object")
    return pd.DataFrame(made)


def amount_frames(rows: list[Record]) -> tuple[pd.DataFrame, pd.DataFrame]:
    """Amounts in mol/L with their limits, and values as reported with their flags, in the order of the vocabulary."""
    amounts: dict[str, list] = {}
    reported: dict[str, list] = {}
    for key in constituents():
        if any(key in row.amounts for row in rows):
            found = [row.amounts.get(key, (float("nan"), "")) for row in rows]
            amounts[amount_column(key)] = [value for value, _ in found]
            amounts[f"{key}_limit"] = [limit for _, limit in found]
        named = list(dict.fromkeys(row.reported[key][0] for row in rows if key in row.reported))
        for name in named:
            reported[name] = [_shown(row, key, name) for row in rows]
        if named:
            reported[f"{key}_flag"] = [row.reported[key][2] if key in row.reported else "" for row in rows]
    index = pd.RangeIndex(len(rows))
    return pd.DataFrame(amounts, index=index), pd.DataFrame(reported, index=index, dtype=object)


def _shown(row: Record, key: str, name: str) -> str:
    return row.reported[key][1] if key in row.reported and row.reported[key][0] == name else ""


def places_of(table: str, rows: list[Record]) -> Iterator[tuple[tuple[str, int, str], Place]]:
    """Origin entries of a table's rows."""
    for index, row in enumerate(rows):
        yield (table, index, ""), row.home
        for column, place in row.places.items():
            yield (table, index, column), place
