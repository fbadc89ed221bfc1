"""Rows of several tables to sample rows: field tables stand, laboratory results join the field row of their sample."""

import math
from collections.abc import Callable, Sequence

from gley.columns import amount_column
from gley.findings import Findings, Place
from gley.survey.assemble import Record

_POTENTIALS = frozenset({"ORP_mV", "Eh_given_mV"})
_FIELD_VALUES = frozenset({"pH", "temperature_C", "depth_cm"})
_FIELD_AMOUNTS = frozenset({"O2", "alkalinity"})
_OWN = ("sample", "station", "remarks")
_SAME = 1e-3
"""Relative difference up to which two deliveries of a concentration are one value in two units."""

Part = list[Record]


def sample_rows(parts: Sequence[Part], findings: Findings) -> list[Record]:
    """Sample rows of all tables, in the order given.

    Tables with potentials are field tables: each row is a sample. Where there are none, the first table with pH,
    temperature or soil depth is, else the first of all. Rows of the other tables are joined to them.
    """
    field = [part for part in parts if _holds(part, _POTENTIALS)]
    field = field or [part for part in parts if _holds(part, _FIELD_VALUES)][:1] or list(parts[:1])
    rows = [row for part in field for row in part]
    for part in parts:
        if all(part is not other for other in field):
            _set_bench_values_aside(part, rows, findings)
            _join(rows, part, findings)
    return rows


def _holds(part: Part, names: frozenset[str]) -> bool:
    return any(names & row.cells.keys() for row in part)


def _set_bench_values_aside(part: Part, rows: list[Record], findings: Findings) -> None:
    """pH in a laboratory's table is the laboratory's, and its temperature isn't that of the sample.

    A table with results beyond what is read in the field is the laboratory's, unless it is all the pH there is and
    stands beside temperatures.
    """
    analysed = any(row.reported.keys() - _FIELD_AMOUNTS for row in part)
    if not analysed or (not _holds(rows, frozenset({"pH"})) and _holds(part, frozenset({"temperature_C"}))):
        return
    said: set[str] = set()
    for row in part:
        for name, rule in (("pH", "survey.pH_of_laboratory"), ("temperature_C", "survey.bench_temperature")):
            if row.cells.get(name) is None:
                continue
            value, where = row.cells.pop(name), row.places.pop(name)
            if name == "pH":
                row.put("pH_lab", value, where)
            if name not in said:
                findings.add(rule, where, f"{value:g}")
                said.add(name)


def _join(rows: list[Record], part: Part, findings: Findings) -> None:
    """Join records by sample name; those without a partner become rows of their own."""
    find = _finder(rows)
    joined, loosely = 0, 0
    for other in part:
        name = other.cells.get("sample") or other.cells.get("station", "")
        partners, exact = find(other)
        if len(partners) == 1:
            merge(partners[0], other, findings)
            joined, loosely = joined + 1, loosely + (not exact)
            continue
        rule = "survey.laboratory_ambiguous" if partners else "survey.laboratory_alone"
        findings.add(rule, other.home, name, count=len(partners))
        rows.append(other)
    if joined:
        where = Place(part[0].home.file, part[0].home.sheet)
        findings.add("survey.laboratory_joined", where, joined, count=len(part))
        if loosely:
            findings.add("survey.laboratory_loosely", where, loosely)


def _finder(rows: list[Record]) -> Callable[[Record], tuple[list[Record], bool]]:
    """Function from a record to the field rows it fits, and whether by the very name of a sample.

    In turn: the sample's name, the name but for upper and lower case, the station; where several rows fit, those of
    the same day and round.
    """
    by: dict[str, dict[str, list[Record]]] = {"exact": {}, "folded": {}, "station": {}}
    for row in rows:
        sample, station = _name(row, "sample"), _name(row, "station")
        by["exact"].setdefault(sample, []).append(row)
        by["folded"].setdefault(sample.casefold(), []).append(row)
        by["station"].setdefault(station.casefold(), []).append(row)

    def find(other: Record) -> tuple[list[Record], bool]:
        sample, station = _name(other, "sample"), _name(other, "station")
        if sample:
            for kind, name in (("exact", sample), ("folded", sample.casefold())):
                if by[kind].get(name):
                    return _of_same_day(by[kind][name], other), kind == "exact"
        name = (sample or station).casefold()
        unnamed = [row for row in by["station"].get(name, []) if name and not (sample and _name(row, "sample"))]
        return [row for row in _of_same_day(unnamed, other) if _agrees(row, other)], False

    return find


def _name(row: Record, column: str) -> str:
    return " ".join(str(row.cells.get(column, "")).split())


def _of_same_day(found: list[Record], other: Record) -> list[Record]:
    """Of several rows those that agree in day and round, where any does."""
    return found if len(found) < 2 else [row for row in found if _agrees(row, other)] or found


def _agrees(row: Record, other: Record) -> bool:
    pairs = [(row.cells.get(name), other.cells.get(name)) for name in ("date", "round")]
    return all(mine == its for mine, its in pairs if mine is not None and its is not None)


def merge(into: Record, other: Record, findings: Findings) -> None:
    """Add a record to the field record of the same sample; where both hold a value the first stays, and it's said."""
    for name, value in other.cells.items():
        where = other.places.get(name, other.home)
        if not into.put(name, value, where) and name not in _OWN:
            shown, first = (_shown(one) for one in (value, into.cells[name]))
            findings.add("survey.value_twice", where, shown, column=name, first=first)
    for key, reported in other.reported.items():
        where = other.places.get(key, other.home)
        if key not in into.reported:
            into.reported[key] = reported
            into.places[key] = into.places[amount_column(key)] = where
            if key in other.amounts:
                into.amounts[key] = other.amounts[key]
        elif not _same(into, other, key):
            first = into.reported[key][1]
            findings.add("survey.value_twice", where, reported[1], column=key, first=first)


def _shown(value: object) -> str:
    if hasattr(value, "date"):
        return str(value.date())
    return f"{value:g}" if isinstance(value, float) else str(value)


def _same(into: Record, other: Record, key: str) -> bool:
    """Whether both deliver the same, be it in different units."""
    if key in into.amounts and key in other.amounts:
        (mine, bound), (its, its_bound) = into.amounts[key], other.amounts[key]
        return bound == its_bound and math.isclose(mine, its, rel_tol=_SAME)
    return into.reported[key][1] == other.reported[key][1]
