"""Reading a survey: files in, one `Survey` out; tables told by content, laboratory rows joined, samples named."""

from collections.abc import Sequence
from dataclasses import dataclass, field
from pathlib import Path

from gley.errors import GleyError, UsageError
from gley.findings import Findings
from gley.settings import Settings, SurveySettings
from gley.survey import values
from gley.survey.assemble import Record, amount_frames, frame, places_of
from gley.survey.declared import Fact, electrodes_in_headers, facts_of_survey, give_to_rows
from gley.survey.join import sample_rows
from gley.survey.long import long_records
from gley.survey.model import Origin, Survey
from gley.survey.naming import name_samples
from gley.survey.read import read_grids
from gley.survey.rows import records
from gley.survey.stated import check_stated
from gley.survey.table import Table, find_tables


@dataclass
class _Delivered:
    """What the files hold: tables and facts in their order, and the files with their hashes."""

    tables: list[Table] = field(default_factory=list)
    facts: list[Fact] = field(default_factory=list)
    inputs: list[dict[str, str]] = field(default_factory=list)


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
        When a file can't be read, or no table of samples is in any of them; UsageError when no file, the same file
        twice or a file of another kind is given.
    """
    stated = (settings or Settings()).survey
    check_stated(stated)
    findings = Findings()
    files = [Path(path) for path in ([paths] if isinstance(paths, (str, Path)) else paths)]
    delivered = _deliver(files, stated, findings)
    parts, stations, checks = _read(delivered.tables, files, stated, findings)
    _say_unused(delivered.tables, stated, findings)
    facts = facts_of_survey(delivered.facts, findings)
    for rows in (*parts, checks):
        give_to_rows(rows, delivered.facts, facts)
    samples = sample_rows(parts, findings)
    _say_station_twice(stations, findings)
    name_samples(samples, findings)
    _say_lacking(samples, findings)
    amounts, reported = amount_frames(samples)
    tables = {"samples": samples, "stations": stations, "checks": checks}
    return Survey(
        samples=frame("samples", samples),
        amounts=amounts,
        reported=reported,
        stations=frame("stations", stations),
        checks=frame("checks", checks),
        facts=facts,
        origin=Origin(dict(entry for kind, rows in tables.items() for entry in places_of(kind, rows))),
        findings=findings,
        inputs=tuple(delivered.inputs),
    )


def _say_unused(tables: Sequence[Table], stated: SurveySettings, findings: Findings) -> None:
    """Headers that the settings map and no file has."""
    there = {header.text.casefold() for table in tables for _, header, _ in table.columns}
    for table in tables:
        if table.kind == "long":
            at = next(c for c, header, _ in table.columns if header.target == "parameter")
            there |= {values.words(table.grid.cell(row, at)).casefold() for row in table.rows}
    for name in stated.columns:
        if " ".join(name.split()).casefold() not in there:
            findings.add("survey.mapping_unused", value=name)


def _deliver(files: Sequence[Path], stated: SurveySettings, findings: Findings) -> _Delivered:
    """Tables and facts of all files."""
    if not files:
        message = "No survey file is given."
        raise UsageError(message, "Name one or more .xlsx or .csv files.")
    found = _Delivered()
    for path in files:
        grids, record = read_grids(path, stated.encoding, findings)
        if record["sha256"] in [other["sha256"] for other in found.inputs]:
            message = f"{path}: the same content is given twice."
            raise UsageError(message, "Give every file once.")
        found.inputs.append(record)
        for grid in grids:
            tables, written = find_tables(grid, stated.columns, findings)
            found.tables += tables
            reach = "sheet" if tables else "file"
            found.facts += [Fact(key, value, place, reach) for key, value, place in written]
    found.facts += electrodes_in_headers(found.tables, found.facts, findings)
    return found


def _read(
    tables: Sequence[Table], files: Sequence[Path], stated: SurveySettings, findings: Findings
) -> tuple[list[list[Record]], list[Record], list[Record]]:
    """Records of all tables: those of samples table by table, of stations and of checks."""
    if not any(table.kind in ("samples", "long") for table in tables):
        names = ", ".join(str(path) for path in files)
        message = f"{names}: no table of samples found."
        cure = "A header row with a sample or station name and columns such as ORP (mV), pH or Fe (mg/L) is wanted;"
        raise GleyError(message, f"{cure} templates/ holds a workbook.")
    parts: list[list[Record]] = []
    own: dict[str, list[Record]] = {"stations": [], "checks": []}
    for table in tables:
        rows = long_records(table, stated, findings) if table.kind == "long" else records(table, stated, findings)
        if table.kind in own:
            own[table.kind] += rows
        else:
            parts.append(rows)
    return parts, own["stations"], own["checks"]


def _say_station_twice(stations: list[Record], findings: Findings) -> None:
    """A station that stands in two rows with different values: which is right can't be told, the last is used."""
    first: dict[str, Record] = {}
    for row in stations:
        name = row.cells.get("station", "")
        before = first.setdefault(name, row)
        differs = [key for key in row.cells if before.cells.get(key) not in (None, "", row.cells[key])]
        if before is not row and differs:
            findings.add("survey.station_twice", row.home, name, columns=", ".join(differs))


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
