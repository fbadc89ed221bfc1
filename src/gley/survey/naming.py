"""Every sample row gets a name of its own: its sample's, else station with round, depth or date; repeats told apart."""

from collections.abc import Iterable

from gley.findings import Findings
from gley.survey.assemble import Record

_DUPLICATE_ENDS = ("-dup", "-fd", "-duplicate", "-dup1")


def name_samples(rows: list[Record], findings: Findings) -> None:
    """Fill `sample` and `station` of all rows; samples end up unique, and duplicates by name are marked as such."""
    for row in rows:
        if not row.cells.get("sample"):
            name = _composed(row)
            row.cells["sample"] = name
            if not row.cells.get("station"):
                findings.add("survey.sample_unnamed", row.home, name)
        if not row.cells.get("station"):
            row.cells["station"] = row.cells["sample"]
    _tell_apart(rows, findings)
    for row in rows:
        kind = str(row.cells.get("sample_type", "")).casefold()
        if not kind and (_is_duplicate_name(row.cells["sample"]) or row.cells.get("duplicate_of")):
            row.cells["sample_type"] = "duplicate"
            findings.add("survey.duplicate_by_name", row.home, row.cells["sample"])


def _composed(row: Record) -> str:
    """A name from what else the row tells."""
    parts = [str(row.cells.get("station", ""))]
    if row.cells.get("round"):
        parts.append(str(row.cells["round"]))
    if row.cells.get("depth_cm") is not None:
        parts.append(f"{row.cells['depth_cm']:g} cm")
    if len(parts) == 1:
        parts.append(_day(row))
    parts = [part for part in parts if part]
    return " ".join(parts) or f"row {row.home.cell.lstrip('ABCDEFGHIJKLMNOPQRSTUVWXYZ')}"


def _day(row: Record) -> str:
    return row.cells["date"].date().isoformat() if row.cells.get("date") is not None else ""


def _tell_apart(rows: list[Record], findings: Findings) -> None:
    """Names that come twice get the round or date, then a number that no other name ends in."""
    for name, group in _groups(rows):
        if len(group) == 1:
            continue
        for row in group:
            row.cells["sample"] = f"{name} {row.cells.get('round') or _day(row)}".strip()
        findings.add("survey.name_repeated", group[1].home, name, count=len(group))
    taken = {row.cells["sample"] for row in rows}
    for name, group in _groups(rows):
        number = 1
        for row in group[1:]:
            while f"{name} #{number + 1}" in taken:
                number += 1
            row.cells["sample"] = f"{name} #{number + 1}"
            taken.add(row.cells["sample"])


def _groups(rows: Iterable[Record]) -> list[tuple[str, list[Record]]]:
    found: dict[str, list[Record]] = {}
    for row in rows:
        found.setdefault(row.cells["sample"], []).append(row)
    return list(found.items())


def _is_duplicate_name(name: str) -> bool:
    return name.casefold().replace(" ", "-").replace("_", "-").endswith(_DUPLICATE_ENDS)
