"""Reading a survey: files in, one `Survey` out; tables told by content, laboratory rows joined, samples named."""

from collections.abc import Iterable, Sequence
from pathlib import Path

from gley.errors import GleyError
from gley.findings import Findings, Place
from gley.settings import Settings
from gley.survey.assemble import Record, amount_frames, frame, long_records, merge, places_of, records
from gley.survey.model import Origin, Survey
from gley.survey.read import read_grids
from gley.survey.stated import check_stated
from gley.survey.table import Table, find_tables

_FIELD_VALUES = frozenset({"ORP_mV", "Eh_given_mV", "pH", "temperature_C", "depth_cm"})


def read_survey(paths: str | Path | Sequence[str | Path], settings: Settings | None = None) -> Survey:
    """Read survey files: field sheets and laboratory deliveries, workbooks and text, together.

    Parameters
    ----------
    paths : path or sequence of paths
        Files; what stands in the first wins over the later ones, and is said.
    settings : Settings, optional
        Group `survey`: headers and units the files don't tell, encoding.

    Returns
    -------
    Survey
        Every row kept, every value with its place, everything not understood as a finding.

    Raises
    ------
    GleyError
        When a file can't be read, or no table of samples is in any of them.
    """
    stated = (settings or Settings()).survey
    check_stated(stated)
    findings = Findings()
    files = [Path(path) for path in ([paths] if isinstance(paths, (str, Path)) else paths)]
    tables: list[Table] = []
    facts: dict[str, str] = {}
    inputs = []
    for path in files:
        grids, record = read_grids(path, stated.encoding, findings)
        inputs.append(record)
        for grid in grids:
            found, written = find_tables(grid, stated.columns, findings)
            tables += found
            for key, (value, _) in written.items():
                facts.setdefault(key, value)
    of_kind = {
        kind: [table for table in tables if table.kind == kind] for kind in ("samples", "stations", "checks", "long")
    }
    if not of_kind["samples"] and not of_kind["long"]:
        names = ", ".join(str(path) for path in files)
        message = f"{names}: no table of samples found."
        cure = "A header row with a sample or station name and columns such as ORP (mV), pH or Fe (mg/L) is wanted;"
        raise GleyError(message, f"{cure} templates/ holds a workbook.")
    rows = _samples(of_kind["samples"], of_kind["long"], stated, findings)
    stations = [row for table in of_kind["stations"] for row in records(table, stated, findings)]
    checks = [row for table in of_kind["checks"] for row in records(table, stated, findings)]
    name_samples(rows, findings)
    amounts, reported = amount_frames(rows)
    origin = Origin(
        {
            key: place
            for kind, own in (("samples", rows), ("stations", stations), ("checks", checks))
            for key, place in places_of(kind, own)
        }
    )
    _say_lacking(rows, findings)
    return Survey(
        samples=frame("samples", rows),
        amounts=amounts,
        reported=reported,
        stations=frame("stations", stations),
        checks=frame("checks", checks),
        facts=facts,
        origin=origin,
        findings=findings,
        inputs=tuple(inputs),
    )


def _samples(wide: list[Table], long: list[Table], stated, findings: Findings) -> list[Record]:
    """Sample rows of all tables; laboratory tables are joined to field rows of the same name."""
    read = [records(table, stated, findings) for table in wide]
    field = [rows for rows in read if _is_field(rows)] or read[:1]
    rows = [row for part in field for row in part]
    laboratory = [part for part in read if all(part is not other for other in field)]
    laboratory += [long_records(table, findings) for table in long]
    for part in laboratory:
        _join(rows, part, bool(field), findings)
    return rows


def _is_field(rows: list[Record]) -> bool:
    return any(_FIELD_VALUES & row.cells.keys() for row in rows)


def _join(rows: list[Record], part: list[Record], said: bool, findings: Findings) -> None:
    """Join laboratory records by exact sample name; those without a partner become rows of their own."""
    by_name: dict[str, list[Record]] = {}
    for row in rows:
        by_name.setdefault(_key(row), []).append(row)
    joined = 0
    for other in part:
        partners = by_name.get(_key(other), []) if _key(other) else []
        if len(partners) == 1:
            merge(partners[0], other, findings)
            joined += 1
            continue
        if said:
            rule = "survey.laboratory_ambiguous" if partners else "survey.laboratory_alone"
            findings.add(rule, other.home, other.cells.get("sample", ""), count=len(partners))
        rows.append(other)
    if joined and part:
        findings.add("survey.laboratory_joined", Place(part[0].home.file, part[0].home.sheet), joined, count=len(part))


def _key(row: Record) -> str:
    return str(row.cells.get("sample", "")).strip().casefold()


def name_samples(rows: list[Record], findings: Findings) -> None:
    """Give every row its own name: its sample name, else station with round, date or depth; repeats are numbered."""
    for row in rows:
        if not row.cells.get("sample"):
            name = _composed(row)
            row.cells["sample"] = name
            if not row.cells.get("station"):
                findings.add("survey.sample_unnamed", row.home, name)
        if not row.cells.get("station"):
            row.cells["station"] = row.cells["sample"]
    _number_repeats(rows, findings)
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
    if len(parts) == 1 and row.cells.get("date") is not None:
        parts.append(row.cells["date"].date().isoformat())
    parts = [part for part in parts if part]
    return " ".join(parts) or f"row {row.home.cell.lstrip('ABCDEFGHIJKLMNOPQRSTUVWXYZ')}"


def _number_repeats(rows: list[Record], findings: Findings) -> None:
    """Names that come twice get the round or date, then a number."""
    for name, group in _groups(rows):
        if len(group) == 1:
            continue
        for row in group:
            extra = row.cells.get("round") or (
                row.cells["date"].date().isoformat() if row.cells.get("date") is not None else ""
            )
            row.cells["sample"] = f"{name} {extra}".strip()
        findings.add("survey.name_repeated", group[1].home, name, count=len(group))
    for name, group in _groups(rows):
        for number, row in enumerate(group[1:], start=2):
            row.cells["sample"] = f"{name} #{number}"


def _groups(rows: Iterable[Record]) -> list[tuple[str, list[Record]]]:
    found: dict[str, list[Record]] = {}
    for row in rows:
        found.setdefault(row.cells["sample"], []).append(row)
    return list(found.items())


def _is_duplicate_name(name: str) -> bool:
    plain = name.casefold().replace(" ", "-").replace("_", "-")
    return plain.endswith(("-dup", "-fd", "-duplicate", "-dup1"))


def _say_lacking(rows: list[Record], findings: Findings) -> None:
    """What the survey as a whole doesn't hold."""
    held = {name for row in rows for name in row.cells}
    if not {"ORP_mV", "Eh_given_mV"} & held:
        findings.add("survey.no_ORP")
    if not {"pH", "pH_lab"} & held:
        findings.add("survey.no_pH")
    elif "pH" not in held:
        findings.add("survey.pH_laboratory")
    for row in rows:
        if "pH" in held and row.cells.get("pH") is None and row.cells.get("pH_lab") is None:
            findings.add("survey.pH_missing", row.places.get("pH", row.home), sample=row.cells["sample"])
        if row.cells.get("pH") is not None:
            row.cells["pH_where"] = row.cells.get("pH_where") or "field"
        elif row.cells.get("pH_lab") is not None:
            row.cells["pH"], row.cells["pH_where"] = row.cells["pH_lab"], "laboratory"
