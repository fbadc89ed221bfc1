"""What reading a survey gives: tables in the house form, what was delivered, where each value stands in the files."""

from collections.abc import Mapping
from dataclasses import dataclass, field

import pandas as pd

from gley.findings import Findings, Place


@dataclass(frozen=True)
class Origin:
    """Where values stand: (table, row, column) → place; rows are the index of the table."""

    cells: Mapping[tuple[str, int, str], Place] = field(default_factory=dict)

    def place(self, row: int, column: str) -> Place:
        """Place of a value of the samples table (or of a constituent by its key); empty when it wasn't delivered."""
        return self.of("samples", row, column)

    def of(self, table: str, row: int, column: str) -> Place:
        """Place of a value of any table; the row's first known cell when this one wasn't delivered."""
        return self.cells.get((table, row, column)) or self.cells.get((table, row, "")) or Place()


def of_station(samples: pd.DataFrame, stations: pd.DataFrame, column: str) -> pd.Series:
    """What the stations table holds in a column for each sample (index as the samples; NaN or "" where nothing)."""
    known = dict(zip(stations["station"], stations[column], strict=True))
    empty = "" if stations[column].dtype == object else float("nan")
    return pd.Series([known.get(name, empty) for name in samples["station"]], index=samples.index)


@dataclass(frozen=True)
class Survey:
    """A survey read whole. All tables have every column of the vocabulary; nothing delivered is lost.

    `samples` has one row per delivered sample row; `amounts` (same index) holds mol/L (alkalinity eq/L) with
    `<key>_limit`; `reported` holds values as delivered with their flags; `stations` and `checks` may be empty.
    """

    samples: pd.DataFrame
    amounts: pd.DataFrame
    reported: pd.DataFrame
    stations: pd.DataFrame
    checks: pd.DataFrame
    facts: Mapping[str, str]
    origin: Origin
    findings: Findings
    inputs: tuple[Mapping[str, str], ...]
