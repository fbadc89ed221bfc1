"""A laboratory's long table, one row per result, to one record per sample."""

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

from gley.columns import columns, constituents
from gley.findings import Findings, Place
from gley.settings import SurveySettings
from gley.survey import values
from gley.survey.assemble import Record
from gley.survey.cells import KINDS, add_amount, field_number, is_unit_of, weighed
from gley.survey.headers import counts_as, sample_type, understand
from gley.survey.rows import fraction_rank
from gley.survey.table import Table
from gley.units import Unit, recognise

_FIELD = (
    "ORP_mV", "Eh_given_mV", "pH", "pH_lab", "temperature_C", "SC_uS_cm", "EC_uS_cm", "O2_percent", "turbidity_NTU",
)  # fmt: skip
_NOT_DETECTED = ("not detected", "below", "present below", "*non-detect", "*present <", "not present")
_SAYS_NOTHING = ("", "=", "Y", "YES", "TRUE", "DETECTED")
_TOTAL = 2


@dataclass(frozen=True)
class _Result:
    """One result: what it is, as delivered, with the places of value and parameter."""

    target: str
    parameter: str
    rank: int
    cell: Any
    unit: Unit | None
    where: Place


def long_records(table: Table, settings: SurveySettings, findings: Findings) -> list[Record]:
    """Records of a long table; of several results of one constituent the filtered one is taken, then the first."""
    reader = _LongReader(table, settings, findings)
    found: dict[tuple, tuple[Record, dict[str, list[_Result]]]] = {}
    for row in table.rows:
        get = {target: table.grid.cell(row, c) for target, c in reader.at.items()}
        record = reader.row(row, get)
        name = record.cells.get("sample") or tuple(record.cells.get(part) for part in ("station", "date", "time"))
        record, results = found.setdefault((name,), (record, {}))
        result = reader.result(row, get)
        if result:
            results.setdefault(result.target, []).append(result)
    for record, results in found.values():
        for same in results.values():
            reader.enter(record, same)
    return [record for record, _ in found.values()]


class _LongReader:
    """Reads the rows of one long table; what concerns a whole parameter is said once."""

    def __init__(self, table: Table, settings: SurveySettings, findings: Findings) -> None:
        self.table, self.settings, self.findings = table, settings, findings
        self.at: dict[str, int] = {}
        for c, header, _ in table.columns:
            if header.target:
                self.at.setdefault(header.target, c)
        dated = [c for name, c in self.at.items() if name.startswith("date")]
        self.order = values.date_order(table.grid.cell(row, c) for c in dated for row in table.rows)
        self.said: set[tuple[str, str]] = set()

    def _once(self, rule: str, where: Place, value: str, **words: object) -> None:
        if (rule, value) not in self.said:
            self.said.add((rule, value))
            self.findings.add(rule, where, value, **words)

    def row(self, row: int, get: Mapping[str, Any]) -> Record:
        """What a row says of its sample: name, station, round, type, day and time."""
        at = next(self.at[name] for name in ("sample", "station") if name in self.at)
        record = Record(self.table.place(row, at))
        for name in ("sample", "station", "round", "sample_type"):
            text = values.words(get.get(name))
            if text:
                record.put(name, (sample_type(text) or text) if name == "sample_type" else text, self._place(row, name))
        for name in ("date", "date_time", "time"):
            cell, where = get.get(name), self._place(row, name)
            made, doubt = values.day(cell, self.order) if name != "time" else (None, "")
            if made is not None:
                record.put("date", made, where)
            if doubt:
                rule = "survey.not_a_date" if doubt == "not a date" else "survey.date_doubt"
                self._once(rule, where, values.words(cell), doubt=doubt)
            clock = values.clock(cell)
            if clock and (name != "date" or clock != "00:00"):
                record.put("time", clock, where)
        return record

    def _place(self, row: int, name: str) -> Place:
        return self.table.place(row, self.at[name]) if name in self.at else Place()

    def result(self, row: int, get: Mapping[str, Any]) -> _Result | None:
        """The result of a row, None (with a finding where there was one) when nothing can be made of it."""
        parameter, where = values.words(get.get("parameter")), self._place(row, "value")
        text = values.words(get.get("unit"))
        header = understand(parameter, "samples", self.settings.columns)
        if header.ignored:
            return None
        target = "SC_uS_cm" if header.target == "EC_or_SC" else header.target
        stated = self.settings.units.get(target) or self.settings.units.get(parameter)
        unit = recognise(text) or header.unit or recognise(stated)
        if target == "O2" and unit and unit.kind == "percent":
            target = "O2_percent"
        if target not in constituents() and target not in _FIELD:
            self._once("survey.parameter_unknown", self._place(row, "parameter"), parameter)
            return None
        cell = self._value(get, where, target)
        if values.number(cell, self.table.grid.decimal_comma).missing:
            return None
        if unit is None and (target in constituents() or columns("samples")[target].unit in KINDS):
            rule = "survey.unit_unknown" if text else "survey.unit_missing"
            self.findings.add(rule, where, text or parameter, column=parameter)
        rank = fraction_rank(target, f"{parameter} {values.words(get.get('fraction'))}")
        return _Result(target, parameter, rank, cell, unit, where)

    def _value(self, get: Mapping[str, Any], where: Place, target: str) -> Any:
        """The result of a row with its flag: `< limit` for what wasn't detected, nothing for what was rejected."""
        value, flag, limit = get.get("value"), values.words(get.get("flag")), values.words(get.get("limit"))
        text, comma = values.words(value), self.table.grid.decimal_comma
        reading = values.number(value, comma)
        if flag[:1] in ("<", ">", "≤", "≥") and text and text[0] not in "<>":
            return f"{flag[0]} {text}"
        if flag.upper() == "R":
            self.findings.add("survey.rejected", where, text, column=target)
            return None
        not_detected = flag.upper() in ("U", "UJ", "N", "NO", "ND") or flag.lower().startswith(_NOT_DETECTED)
        if not_detected or reading.problem.startswith("not detected"):
            own = text if not reading.missing and not reading.problem and not reading.limit else ""
            bound = limit or own
            return f"< {bound}" if bound and text[:1] != "<" else (value if text else "ND")
        if not text and limit:
            self._once("survey.limit_alone", where, target)
            return f"< {limit}"
        if flag.upper() not in _SAYS_NOTHING:
            self.findings.add("survey.flagged", where, text, column=target, flag=flag)
        return value

    def enter(self, record: Record, same: list[_Result]) -> None:
        """Enter one of the results of a constituent into its record; the others are said."""
        chosen = min(same, key=lambda result: result.rank)
        sample = record.cells.get("sample") or record.cells.get("station", "")
        for other in same:
            if other is not chosen:
                rule = "survey.result_twice" if other.rank == chosen.rank else "survey.fraction_left"
                shown = values.words(other.cell)
                self.findings.add(rule, other.where, shown, sample=sample, column=chosen.target)
        comma = self.table.grid.decimal_comma
        if chosen.target in _FIELD:
            self._enter_field(record, chosen, comma)
            return
        basis = counts_as(chosen.parameter, constituents()[chosen.target].element)
        if chosen.rank == _TOTAL:
            self._once("survey.total_taken", chosen.where, chosen.parameter)
        taken = weighed(chosen.target, chosen.unit, basis)
        if taken:
            self._once("survey.weighed_as", chosen.where, chosen.parameter, weighed=taken)
        add_amount(record, chosen.target, chosen.cell, chosen.unit, basis, chosen.where, comma, self.findings)

    def _enter_field(self, record: Record, chosen: _Result, comma: bool) -> None:
        column, unit = columns("samples")[chosen.target], chosen.unit
        if unit is None and column.unit in KINDS:
            return
        if unit is not None and not is_unit_of(unit, column):
            words = {"column": chosen.parameter, "wanted": column.unit}
            self.findings.add("survey.unit_wrong", chosen.where, unit.text, **words)
            return
        value = field_number(chosen.cell, comma, column, unit, chosen.where, self.findings)
        if value is not None:
            record.put(chosen.target, value, chosen.where)
