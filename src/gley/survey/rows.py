"""Rows of a wide table to records: each cell read by the meaning and unit of its column, its place kept."""

from functools import cache
from statistics import median, stdev
from typing import Any

from gley.columns import Column, columns, constituents
from gley.findings import Findings, Place
from gley.settings import SurveySettings
from gley.survey import values
from gley.survey.assemble import Record
from gley.survey.cells import KINDS, add_amount, field_number, is_unit_of, weighed
from gley.survey.headers import Header, counts_as, fraction, is_scale_open, plain, sample_type
from gley.survey.table import Table
from gley.units import Unit, recognise

_VOLTS_BELOW = 2.0
_WITHOUT_UNIT = {"SC_uS_cm": "µS/cm", "EC_uS_cm": "µS/cm", "depth_cm": "cm or m"}
_SECOND_CHOICE = frozenset({"site", "siteid", "location", "locationid", "locid", "point", "id", "labsample"})
_FRACTION_RANK = {"dissolved": 0, "": 1, "total": 2}


def records(table: Table, settings: SurveySettings, findings: Findings) -> list[Record]:
    """All rows of a samples, stations or checks table."""
    reader = _RowReader(table, settings, findings)
    return [reader.read(row) for row in table.rows]


@cache
def fraction_rank(key: str, text: str) -> int:
    """Order in which results of one constituent are taken: filtered before unsaid before total; elements only."""
    return _FRACTION_RANK[fraction(text)] if key in constituents() and constituents()[key].element == key else 1


def _rank(header: Header) -> tuple[int, int]:
    """Order in which columns of the same meaning are taken: single electrodes before their mean, names before sites."""
    first = 0 if header.replicate else 2 if plain(header.text) in _SECOND_CHOICE else 1
    return first, fraction_rank(header.target, header.text)


class _RowReader:
    """Reads the rows of one table; what a whole column lacks (its unit) is said once."""

    def __init__(self, table: Table, settings: SurveySettings, findings: Findings) -> None:
        self.table, self.findings = table, findings
        self.vocabulary = columns(table.kind)
        self.units: dict[int, Unit | None] = {}
        self.orders: dict[int, str] = {}
        self.unusable: set[int] = set()
        self.said: set[tuple] = set()
        self.columns = sorted((pair[:2] for pair in table.columns if pair[1].target), key=lambda pair: _rank(pair[1]))
        for c, header, unit in table.columns:
            stated = settings.units.get(header.target) or settings.units.get(header.text)
            self.units[c] = unit or recognise(stated)
            if header.target:
                self._settle(c, header)
        numbered = [c for c, header in self.columns if header.replicate]
        if len(numbered) > 1:
            self._once("survey.replicates", numbered[0], len(numbered))

    def _once(self, rule: str, c: int, value: object = None, **words: object) -> None:
        """Say something about a column once, at its header."""
        if (rule, c) not in self.said:
            self.said.add((rule, c))
            header = self.table.grid.cell(self.table.header_row, c)
            where = self.table.place(self.table.header_row, c)
            self.findings.add(rule, where, values.words(header) if value is None else value, **words)

    def _settle(self, c: int, header: Header) -> None:
        """Settle a column before its rows are read: a missing or impossible unit and the order of dates."""
        if is_scale_open(header):
            self._once("survey.redox_as_ORP", c)
        if header.target in ("date", "date_time"):
            self._settle_dates(c)
        unit, odd = self.units[c], self.table.odd_units.get(c, "")
        if header.target in constituents():
            if unit is None:
                self.unusable.add(c)
                rule = "survey.unit_unknown" if odd else "survey.unit_missing"
                self._once(rule, c, odd or None, column=header.text)
            return
        column = self.vocabulary.get("SC_uS_cm" if header.target == "EC_or_SC" else header.target)
        if column is None or column.dtype != "number" or column.unit not in KINDS:
            return
        if unit is None and odd:
            self._once("survey.unit_unknown", c, odd, column=header.text)
            self.unusable.add(c)
        elif unit is None and column.name in _WITHOUT_UNIT:
            self._once("survey.unit_missing_field", c, unit=_WITHOUT_UNIT[column.name])
            self.unusable.add(c)
        elif unit is None:
            self._assume(c, column)
        elif not is_unit_of(unit, column):
            self._once("survey.unit_wrong", c, unit.text, column=header.text, wanted=column.unit)
            self.unusable.add(c)

    def _settle_dates(self, c: int) -> None:
        """The order of day and month that the column as a whole shows, said where single dates leave it open."""
        cells = [self.table.grid.cell(row, c) for row in self.table.rows]
        self.orders[c] = values.date_order(cells)
        if self.orders[c] and any(values.open_order(cell) for cell in cells):
            self._once("survey.date_order", c, order=self.orders[c])

    def _assume(self, c: int, column: Column) -> None:
        """The trade's unit for a field quantity without one; potentials small enough to be volts are refused."""
        comma = self.table.grid.decimal_comma
        found = [values.number(self.table.grid.cell(row, c), comma).value for row in self.table.rows]
        known = sorted(abs(value) for value in found if value == value)
        if column.unit == "mV" and known and median(known) < _VOLTS_BELOW:
            self._once("survey.unit_missing_field", c, unit="mV or V")
            self.unusable.add(c)
        elif known:
            self._once("survey.unit_assumed", c, unit=column.unit)

    def read(self, row: int) -> Record:
        """One row."""
        record = Record(self.table.place(row, self.table.columns[0][0]))
        electrodes: dict[str, list[tuple[float, Place]]] = {}
        for c, header in self.columns:
            where, cell = self._cell(row, c)
            if cell is None or (isinstance(cell, str) and not cell.strip()):
                continue
            if header.replicate:
                value = self._number(c, header.target, cell, where)
                electrodes.setdefault(header.target, []).extend([(value, where)] if value is not None else [])
                _replicated(record, header.target, electrodes[header.target])
            elif header.target in constituents():
                self._amount(record, c, header, cell, where)
            else:
                self._field(record, c, header.target, cell, where)
        return record

    def _cell(self, row: int, c: int) -> tuple[Place, Any]:
        """A cell and its place; of cells merged down the rows all hold what the uppermost does, and it's said."""
        cell = self.table.grid.cell(row, c)
        above, column = self.table.grid.merged.get((row, c), (-1, c))
        if cell is None and above > self.table.header_row:
            self._once("survey.merged_cells", c)
            return self.table.place(above, column), self.table.grid.cell(above, column)
        return self.table.place(row, c), cell

    def _put(self, record: Record, c: int, target: str, value: Any, where: Place) -> None:
        if not record.put(target, value, where):
            self._once("survey.column_twice", c, column=target, used=record.places[target].cell)

    def _field(self, record: Record, c: int, target: str, cell: Any, where: Place) -> None:
        """A value that isn't a concentration."""
        target = "SC_uS_cm" if target == "EC_or_SC" else target
        if target == "SC_uS_cm" and self._header(c).target == "EC_or_SC":
            self._once("survey.conductivity_at_25", c)
        column = self.vocabulary.get(target)
        if target == "date_time" or (column and column.dtype == "date"):
            self._date(record, c, cell, where)
        elif target == "time":
            if values.clock(cell):
                self._put(record, c, target, values.clock(cell), where)
            else:
                self.findings.add("survey.not_a_time", where, values.words(cell))
        elif column and column.dtype == "text":
            self._put(record, c, target, self._text(target, values.words(cell), where), where)
        else:
            value = self._number(c, target, cell, where)
            if value is not None:
                self._put(record, c, target, value, where)

    def _header(self, c: int) -> Header:
        return next(header for column, header in self.columns if column == c)

    def _text(self, target: str, text: str, where: Place) -> str:
        """A text; coded ones in the words of the house."""
        if target == "pH_where":
            return "laboratory" if text.lower().startswith("lab") else "field"
        if target == "sample_type":
            kind = sample_type(text)
            if not kind and ("type", text) not in self.said:
                self.said.add(("type", text))
                self.findings.add("survey.sample_type_unknown", where, text)
            return kind or text
        return text

    def _date(self, record: Record, c: int, cell: Any, where: Place) -> None:
        """A day, and the time of day where the cell holds one."""
        made, doubt = values.day(cell, self.orders.get(c, ""))
        if doubt == "not a date":
            self.findings.add("survey.not_a_date", where, values.words(cell))
        elif doubt:
            self.findings.add("survey.date_doubt", where, values.words(cell), doubt=doubt)
        if made is not None:
            self._put(record, c, "date", made, where)
        clock = values.clock(cell)
        if "time" in self.vocabulary and clock and (clock != "00:00" or self._header(c).target == "date_time"):
            record.put("time", clock, where)

    def _number(self, c: int, target: str, cell: Any, where: Place) -> float | None:
        if c in self.unusable:
            return None
        comma = self.table.grid.decimal_comma
        return field_number(cell, comma, self.vocabulary[target], self.units[c], where, self.findings)

    def _amount(self, record: Record, c: int, header: Header, cell: Any, where: Place) -> None:
        key = header.target
        if values.number(cell, self.table.grid.decimal_comma).missing:
            return
        if key in record.reported:
            if record.reported[key][1] != values.words(cell):
                self._once("survey.column_twice", c, column=key, used=record.places[key].cell)
            return
        if fraction_rank(key, header.text) == _FRACTION_RANK["total"]:
            self._once("survey.total_taken", c)
        basis = counts_as(header.text, constituents()[key].element)
        taken = weighed(key, self.units[c], basis)
        if taken:
            self._once("survey.weighed_as", c, weighed=taken)
        add_amount(record, key, cell, self.units[c], basis, where, self.table.grid.decimal_comma, self.findings)


def _replicated(record: Record, target: str, electrodes: list[tuple[float, Place]]) -> None:
    """Several electrodes side by side: their median, number and spread (sample standard deviation)."""
    read = [value for value, _ in electrodes]
    if not read:
        return
    record.cells[target], record.places[target] = float(median(read)), electrodes[0][1]
    record.cells["ORP_replicates"] = float(len(read))
    if len(read) > 1:
        record.cells["ORP_spread_mV"] = float(stdev(read))
