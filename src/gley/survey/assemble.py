"""Rows of tables to records of the house form: each cell read, checked against its range, converted, its place kept."""

from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field
from statistics import median, stdev
from typing import Any

import pandas as pd

from gley.columns import Column, amount_column, columns, constituents
from gley.findings import Findings, Place
from gley.settings import SurveySettings
from gley.survey import values
from gley.survey.amounts import slug, to_mol_L
from gley.survey.headers import Header, counts_as
from gley.survey.table import Table
from gley.units import Unit, celsius, recognise

_KINDS = {
    "mV": "potential",
    "°C": "temperature",
    "µS/cm": "conductivity",
    "cm": "length",
    "m": "length",
    "°": "angle",
    "%": "percent",
}
_ALSO = {"temperature": ("fahrenheit",)}
_WEIGHED_OTHERWISE = ("NO3", "NO2", "NH4", "PO4", "Si", "DIC", "sulfide", "alkalinity")
_MUST_NAME = ("µS/cm",)
_VOLTS_BELOW = 2.0


@dataclass
class Record:
    """One row on its way into a table: house values, amounts with limits, what was reported, and places by column."""

    home: Place
    cells: dict[str, Any] = field(default_factory=dict)
    amounts: dict[str, tuple[float, str]] = field(default_factory=dict)
    reported: dict[str, tuple[str, str, str]] = field(default_factory=dict)
    places: dict[str, Place] = field(default_factory=dict)


def records(table: Table, settings: SurveySettings, findings: Findings) -> list[Record]:
    """All rows of a samples, stations or checks table."""
    reader = _RowReader(table, settings, findings)
    return [reader.read(row) for row in table.rows]


class _RowReader:
    """Reads the rows of one table; what a whole column lacks (its unit) is said once."""

    def __init__(self, table: Table, settings: SurveySettings, findings: Findings) -> None:
        self.table, self.findings = table, findings
        self.vocabulary = columns(table.kind)
        self.units: dict[int, Unit | None] = {}
        self.unusable: set[int] = set()
        self.said: set[tuple] = set()
        for c, header, unit in table.columns:
            stated = settings.units.get(header.target) or settings.units.get(header.text)
            self.units[c] = unit or recognise(stated)
            if header.target:
                self._settle(c, header)

    def _settle(self, c: int, header: Header) -> None:
        """Settle a column's unit before its rows are read: missing or impossible ones are said here."""
        where, unit = self.table.place(self.table.header_row, c), self.units[c]
        if header.target in constituents():
            if unit is None:
                self.findings.add("survey.unit_missing", where, header.text)
                self.unusable.add(c)
            return
        column = self.vocabulary.get("SC_uS_cm" if header.target == "EC_or_SC" else header.target)
        if column is None or column.dtype != "number" or column.unit not in _KINDS:
            return
        kind = _KINDS[column.unit]
        if unit is None and column.unit in _MUST_NAME:
            self.findings.add("survey.unit_missing_field", where, header.text, unit=column.unit)
            self.unusable.add(c)
        elif unit is None:
            self._assume(c, header, column, where)
        elif unit.kind not in (kind, *_ALSO.get(kind, ()), *(("none",) if unit.text == "-" else ())):
            self.findings.add("survey.unit_wrong", where, unit.text, column=header.text, wanted=column.unit)
            self.unusable.add(c)

    def _assume(self, c: int, header: Header, column: Column, where: Place) -> None:
        """The trade's unit for a field quantity without one; potentials small enough to be volts are refused."""
        comma = self.table.grid.decimal_comma
        found = [values.number(self.table.grid.cell(row, c), comma).value for row in self.table.rows]
        known = sorted(abs(value) for value in found if value == value)
        if column.unit == "mV" and known and median(known) < _VOLTS_BELOW:
            self.findings.add("survey.unit_missing_field", where, header.text, unit="mV or V")
            self.unusable.add(c)
        elif known:
            self.findings.add("survey.unit_assumed", where, header.text, unit=column.unit)

    def read(self, row: int) -> Record:
        """One row."""
        first = self.table.columns[0][0]
        record = Record(self.table.place(row, first))
        replicates: list[tuple[float, Place]] = []
        for c, header, _ in self.table.columns:
            if not header.target:
                continue
            where, cell = self.table.place(row, c), self.table.grid.cell(row, c)
            if cell is None or (isinstance(cell, str) and not cell.strip()):
                continue
            if header.replicate:
                value = self._number(c, "ORP_mV", cell, where)
                replicates += [(value, where)] if value is not None else []
            elif header.target in constituents():
                self._amount(record, c, header, cell, where)
            else:
                self._field(record, c, header.target, cell, where)
        if replicates:
            _replicated(record, replicates)
        return record

    def _field(self, record: Record, c: int, target: str, cell: Any, where: Place) -> None:
        """A value that isn't a concentration."""
        if target == "date_time":
            self._date(record, cell, where)
            if values.clock(cell):
                record.cells["time"], record.places["time"] = values.clock(cell), where
            return
        target = self._conductivity(c) if target == "EC_or_SC" else target
        column = self.vocabulary[target]
        if column.dtype == "date":
            self._date(record, cell, where)
            if self.table.kind in ("samples", "checks") and values.clock(cell) not in ("", "00:00"):
                record.cells.setdefault("time", values.clock(cell))
        elif target == "time":
            record.cells["time"], record.places["time"] = values.clock(cell), where
            if not record.cells["time"]:
                self.findings.add("survey.not_a_time", where, values.words(cell))
        elif column.dtype == "text":
            text = values.words(cell)
            record.cells[target], record.places[target] = _where_read(text) if target == "pH_where" else text, where
        else:
            value = self._number(c, target, cell, where)
            if value is not None:
                record.cells[target], record.places[target] = value, where

    def _conductivity(self, c: int) -> str:
        """`EC` and `conductivity` are taken at 25 °C unless the header says otherwise, as meters show it."""
        where = self.table.place(self.table.header_row, c)
        if (where, "conductivity") not in self.said:
            self.said.add((where, "conductivity"))
            self.findings.add("survey.conductivity_at_25", where, str(self.table.grid.cell(self.table.header_row, c)))
        return "SC_uS_cm"

    def _date(self, record: Record, cell: Any, where: Place) -> None:
        made, doubt = values.day(cell)
        if doubt == "not a date":
            self.findings.add("survey.not_a_date", where, values.words(cell))
        elif doubt:
            self.findings.add("survey.date_doubt", where, values.words(cell), doubt=doubt)
        if made is not None:
            record.cells["date"], record.places["date"] = made, where

    def _number(self, c: int, target: str, cell: Any, where: Place) -> float | None:
        """A number in the house unit, None (with a finding) when it can't be used."""
        if c in self.unusable:
            return None
        column, reading = self.vocabulary[target], values.number(cell, self.table.grid.decimal_comma)
        if reading.missing:
            return None
        if reading.problem:
            self.findings.add("survey.not_a_number", where, values.words(cell), column=target, problem=reading.problem)
            return None
        if reading.limit:
            self.findings.add("survey.limit_not_used", where, values.words(cell), column=target)
            return None
        value = _house(reading.value, self.units[c], column)
        low, high = column.minimum, column.maximum
        if (low is not None and value < low) or (high is not None and value > high):
            allowed = f"{low:g} to {high:g}" if high is not None else f"at least {low:g}"
            words = {"column": target, "allowed": allowed, "unit": column.unit}
            self.findings.add("survey.out_of_range", where, values.words(cell), **words)
            return None
        return value

    def _amount(self, record: Record, c: int, header: Header, cell: Any, where: Place) -> None:
        item = constituents()[header.target]
        basis = counts_as(header.text, item.element)
        unit = self.units[c]
        if item.key in _WEIGHED_OTHERWISE and unit and unit.kind == "mass" and not unit.basis and not basis:
            head = self.table.place(self.table.header_row, c)
            if (head, item.key) not in self.said:
                weighed = "CaCO3" if item.key == "alkalinity" else item.weighed or item.formula.split("^")[0]
                self.findings.add("survey.weighed_as", head, header.text, weighed=weighed)
                self.said.add((head, item.key))
        add_amount(record, item.key, cell, self.units[c], basis, where, self.table.grid.decimal_comma, self.findings)


def add_amount(
    record: Record, key: str, cell: Any, unit: Unit | None, basis: str, where: Place, comma: bool, findings: Findings
) -> None:
    """Put one reported concentration into a record: as delivered, and in mol/L with its limit where it can be used."""
    item, reading = constituents()[key], values.number(cell, comma)
    if reading.missing:
        return
    shown, flag = values.words(cell), reading.limit
    problem = reading.problem
    if not problem and reading.value < 0:
        problem = "a concentration can't be negative"
    if problem:
        findings.add("survey.not_a_number", where, shown, column=key, problem=problem)
    amount = None
    if not problem and unit is not None:
        try:
            amount = to_mol_L(reading.value, unit, item, basis)
        except ValueError as error:
            problem = str(error)
            findings.add("survey.unit_impossible", where, shown, column=key, problem=problem)
    if amount is not None and amount > item.max_mol_L:
        problem = "too high"
        findings.add(
            "survey.too_high", where, shown, column=key, unit=unit.text if unit else "", most=f"{item.max_mol_L:g}"
        )
    if problem or amount is None:
        flag = "not used"
    else:
        record.amounts[key] = (amount, reading.limit)
        if reading.flag and not reading.limit:
            findings.add("survey.flagged", where, shown, column=key, flag=reading.flag)
    record.reported[key] = (f"{key}_{slug(unit, basis, item)}", shown, flag)
    record.places[key] = record.places[amount_column(key)] = where


def _where_read(text: str) -> str:
    """`lab`, `Labor`, `laboratory` as laboratory, all else as field."""
    return "laboratory" if text.lower().startswith("lab") else "field"


def _house(value: float, unit: Unit | None, column: Column) -> float:
    """A field value in the unit of its column."""
    if unit is None or unit.kind in ("none", "angle", "percent"):
        return value
    if column.unit == "°C":
        return celsius(value, unit)
    return value * unit.factor * (100.0 if column.unit == "cm" else 1.0)


def _replicated(record: Record, replicates: list[tuple[float, Place]]) -> None:
    """Several electrodes side by side: their median, number and spread."""
    read = [value for value, _ in replicates]
    record.cells["ORP_mV"], record.places["ORP_mV"] = float(median(read)), replicates[0][1]
    record.cells["ORP_replicates"] = float(len(read))
    if len(read) > 1:
        record.cells["ORP_spread_mV"] = float(stdev(read))


def long_records(table: Table, findings: Findings) -> list[Record]:
    """A laboratory's long table, one row per result, to one record per sample."""
    at = {header.target: c for c, header, _ in table.columns if header.target}
    names = _parameters()
    found: dict[str, Record] = {}
    for row in table.rows:
        get = {target: table.grid.cell(row, c) for target, c in at.items()}
        name = values.words(get.get("sample"))
        record = found.setdefault(name, Record(table.place(row, at["sample"]), {"sample": name}))
        record.places.setdefault("sample", record.home)
        where = table.place(row, at["value"])
        parameter = values.words(get.get("parameter"))
        key = names(parameter)
        if not key:
            findings.add("survey.parameter_unknown", table.place(row, at["parameter"]), parameter)
            continue
        unit = recognise(values.words(get.get("unit")))
        if unit is None:
            findings.add("survey.unit_missing", where, parameter)
        if key in record.reported:
            findings.add("survey.result_twice", where, values.words(get["value"]), sample=name, column=key)
            continue
        cell = _long_value(get)
        basis = counts_as(parameter, constituents()[key].element)
        add_amount(record, key, cell, unit, basis, where, table.grid.decimal_comma, findings)
    return list(found.values())


def _long_value(get: Mapping[str, Any]) -> Any:
    """The result of a row with its flag: `<` from a flag column, or the limit when the result is empty or `ND`."""
    value, flag, limit = get.get("value"), values.words(get.get("flag")), get.get("limit")
    text = values.words(value)
    if flag in ("<", ">", "≤", "≥") and text and text[0] not in "<>":
        return f"{flag} {text}"
    not_detected = flag.upper() in ("U", "N", "ND") or values.number(value).problem.startswith("not detected")
    if (not_detected or not text) and limit is not None:
        return f"< {values.words(limit)}"
    return value


def _parameters():
    """Function from a laboratory's parameter name to a constituent's key."""
    from gley.survey.headers import understand

    def key(text: str) -> str:
        target = understand(text, "samples").target
        return target if target in constituents() else ""

    return key


def merge(into: Record, other: Record, findings: Findings) -> None:
    """Add a laboratory record to the field record of the same sample; where both hold a value the first stays."""
    for name, value in other.cells.items():
        if name in ("sample", "station"):
            continue
        if name not in into.cells or into.cells[name] in ("", None):
            into.cells[name] = value
            into.places[name] = other.places.get(name, other.home)
    for key, reported in other.reported.items():
        if key in into.reported:
            if into.reported[key][1] != reported[1]:
                first, where = into.reported[key][1], other.places.get(key, other.home)
                findings.add("survey.value_twice", where, reported[1], column=key, first=first)
            continue
        into.reported[key] = reported
        into.places[key] = into.places[amount_column(key)] = other.places.get(key, other.home)
        if key in other.amounts:
            into.amounts[key] = other.amounts[key]


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
