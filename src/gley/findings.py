"""Findings: everything the tool repaired, assumed, left out or doubts, each with its place and its cure.

The catalogue of all rules is `findings.toml`, one section per room; a rule is raised in the room where its
quantity first exists. `Findings.add` is the only way to make one: a rule that isn't in the catalogue can't be
raised.
"""

import tomllib
from collections.abc import Iterable, Iterator
from dataclasses import dataclass
from functools import cache
from importlib.resources import files
from types import MappingProxyType
from typing import Any

SEVERITIES = ("note", "warning", "error")


def some(names: Iterable[Any], most: int = 6) -> str:
    """The first of several names, with dots where there are more."""
    found = [str(name) for name in names]
    return ", ".join(found[:most]) + (" …" if len(found) > most else "")


@dataclass(frozen=True)
class Place:
    """Where a value stands: file, sheet and cell of the input, or the sample it concerns. Empty parts are unknown."""

    file: str = ""
    sheet: str = ""
    cell: str = ""
    sample: str = ""

    def __str__(self) -> str:
        """`wells.xlsx > Samples > D7` or `sample MW-3`."""
        parts = [part for part in (self.file, self.sheet, self.cell) if part]
        if self.sample:
            parts.append(f"sample {self.sample}")
        return " > ".join(parts)


@dataclass(frozen=True)
class Rule:
    """One entry of the catalogue: message and cure are templates with the words that `add` fills in."""

    name: str
    severity: str
    message: str
    cure: str


@dataclass(frozen=True)
class Finding:
    """One thing the user should know, with what to do about it."""

    rule: str
    severity: str
    place: Place
    value: str
    message: str
    cure: str

    def as_dict(self) -> dict[str, str]:
        """Flat form for findings.csv and JSON."""
        return {
            "severity": self.severity, "rule": self.rule, "file": self.place.file, "sheet": self.place.sheet,
            "cell": self.place.cell, "sample": self.place.sample, "value": self.value,
            "message": self.message, "cure": self.cure,
        }  # fmt: skip

    def __str__(self) -> str:
        """One line: severity, place, message, cure."""
        place = str(self.place)
        return f"{self.severity}: {place + ': ' if place else ''}{self.message} {self.cure}".rstrip()


@cache
def catalogue() -> MappingProxyType:
    """All rules by name, read from `findings.toml` (sections are rooms)."""
    tables = tomllib.loads((files("gley") / "data" / "findings.toml").read_text(encoding="utf-8"))
    rules = {}
    for room, entries in tables.items():
        for name, entry in entries.items():
            full = f"{room}.{name}"
            rules[full] = Rule(full, entry["severity"], entry["message"], entry.get("cure", ""))
    return MappingProxyType(rules)


class Findings:
    """An ordered collection of findings; rooms add to the one they are handed or return one of their own."""

    def __init__(self, items: Iterable[Finding] = ()) -> None:
        self._items = list(items)

    def add(self, rule: str, place: Place | None = None, value: Any = "", **words: Any) -> None:
        """Raise a rule of the catalogue at a place; `value` and `words` fill the templates.

        Raises
        ------
        KeyError
            When the rule isn't in the catalogue or a word of its template is missing: a fault of the program.
        """
        entry = catalogue()[rule]
        shown = "" if value is None else str(value)
        words = {"value": shown, "place": str(place or ""), **words}
        message, cure = entry.message.format(**words), entry.cure.format(**words)
        self._items.append(Finding(rule, entry.severity, place or Place(), shown, message, cure))

    def extend(self, other: Iterable[Finding]) -> None:
        """Append all of another collection."""
        self._items.extend(other)

    def __iter__(self) -> Iterator[Finding]:
        return iter(self._items)

    def __len__(self) -> int:
        return len(self._items)

    def of(self, severity: str) -> list[Finding]:
        """Those of one severity, in order."""
        return [item for item in self._items if item.severity == severity]

    def rules(self) -> list[str]:
        """The rule names in order: what tests compare."""
        return [item.rule for item in self._items]

    def counts(self) -> dict[str, int]:
        """How many of each severity."""
        return {severity: len(self.of(severity)) for severity in SEVERITIES}
