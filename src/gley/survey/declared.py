"""Facts that files declare: which hold for the survey, and which only for the rows of their own file or sheet."""

from collections.abc import Iterable, Sequence
from dataclasses import dataclass

from gley.findings import Findings, Place
from gley.survey.assemble import Record
from gley.survey.table import Table

_OF_ROWS = ("electrode", "crs")
"""Facts that a row can hold itself: where files differ, each holds for its own rows."""
_NEAREST = ("header", "sheet", "file")
_FREE_TEXT = ("remarks", "date")


@dataclass(frozen=True)
class Fact:
    """A fact with its place, and how far it reaches: a table's `header`, its `sheet`, or the whole `file`."""

    key: str
    value: str
    place: Place
    reach: str


def electrodes_in_headers(tables: Iterable[Table], declared: Sequence[Fact], findings: Findings) -> list[Fact]:
    """References named in headers, `ORP (mV vs Ag/AgCl)`, where no fact tells the same couple with its filling."""
    found = []
    told = [_tight(fact.value) for fact in declared if fact.key == "electrode"]
    for table in tables:
        for c, header, _ in table.columns:
            if header.electrode:
                where = table.place(table.header_row, c)
                findings.add("survey.electrode_in_header", where, header.text, electrode=header.electrode)
                if not any(text.startswith(_tight(header.electrode)) for text in told):
                    found.append(Fact("electrode", header.electrode, where, "header"))
    return found


def _tight(text: str) -> str:
    return text.casefold().replace(" ", "")


def facts_of_survey(declared: Sequence[Fact], findings: Findings) -> dict[str, str]:
    """The first of each fact; another that differs is said. Of free text in one sheet the last holds."""
    found: dict[str, Fact] = {}
    for fact in declared:
        first = found.setdefault(fact.key, fact)
        together = _origin(fact) == _origin(first)
        if fact.key in _FREE_TEXT:
            found[fact.key] = fact if together else first
        elif first.value != fact.value:
            rule = "survey.fact_twice" if together or fact.key not in _OF_ROWS else "survey.fact_of_its_rows"
            findings.add(rule, fact.place, fact.value, fact=fact.key, first=first.value, where=str(first.place))
    return {key: fact.value for key, fact in found.items()}


def give_to_rows(rows: Iterable[Record], declared: Sequence[Fact], facts: dict[str, str]) -> None:
    """Write a sheet's or file's own electrode and reference system into its rows, where the survey's is another."""
    for row in rows:
        for key in _OF_ROWS:
            own = [fact for fact in declared if fact.key == key and _covers(fact, row.home)]
            own.sort(key=lambda fact: _NEAREST.index(fact.reach))
            if own and own[0].value != facts[key]:
                row.put(key, own[0].value, own[0].place)


def _origin(fact: Fact) -> tuple[str, str, str]:
    return fact.reach, fact.place.file, fact.place.sheet


def _covers(fact: Fact, home: Place) -> bool:
    return fact.place.file == home.file and (fact.reach == "file" or fact.place.sheet == home.sheet)
