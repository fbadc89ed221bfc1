"""Tables in sheets: where the header stands, what kind of table it is, which row holds units, where it ends."""

import re
from collections.abc import Iterator, Mapping
from dataclasses import dataclass

from gley.findings import Findings, Place
from gley.survey.headers import Header, fact_keys, nearest, plain, understand
from gley.survey.read import Grid
from gley.units import Unit, recognise

_SEARCHED_ROWS = 60
_CLOSING = re.compile(
    r"^(mean|average|median|total|sum|min|max|minimum|maximum|std|sd|count|legend|notes?|source|remarks?)\b[\s:.]*",
    re.I,
)
_FACT = re.compile(r"^#?\s*([^:=]{2,60}?)\s*[:=]\s*(\S.*)$")


@dataclass(frozen=True)
class Table:
    """One table of a sheet: its kind, the meaning and unit of each of its columns, and its data rows."""

    kind: str
    grid: Grid
    header_row: int
    columns: tuple[tuple[int, Header, Unit | None], ...]
    rows: tuple[int, ...]

    def place(self, row: int, column: int) -> Place:
        """Address of a cell."""
        return self.grid.place(row, column)


def find_tables(
    grid: Grid, stated: Mapping[str, str], findings: Findings
) -> tuple[list[Table], dict[str, tuple[str, Place]]]:
    """The tables of a sheet and the facts written around them (key → value and place).

    A sheet that is neither is a finding.
    """
    best = _header(grid, stated)
    facts = dict(_facts(grid, best[1] if best else len(grid.rows)))
    if best is None:
        if not facts and any(cell is not None for row in grid.rows for cell in row):
            findings.add("survey.sheet_not_understood", Place(grid.file, grid.sheet))
        return [], facts
    kind, header_row, headers = best
    units, first = _units(grid, header_row)
    rows = _rows(grid, kind, headers, header_row, first, findings)
    columns = tuple((c, header, header.unit or units.get(c)) for c, header in headers)
    _say_unknown(grid, kind, header_row, columns, rows, findings)
    return [Table(kind, grid, header_row, columns, tuple(rows))], facts


def _header(grid: Grid, stated: Mapping[str, str]) -> tuple[str, int, list[tuple[int, Header]]] | None:
    """Kind, row and headers of the row that reads best as a header; None where none does."""
    best, most = None, 0
    for r, row in enumerate(grid.rows[:_SEARCHED_ROWS]):
        cells = [(c, cell) for c, cell in enumerate(row) if isinstance(cell, str) and cell.strip()]
        if len(cells) < 2 or cells[0][1].lstrip().startswith("#"):
            continue
        for kind in ("checks", "long", "samples", "stations"):
            headers = [(c, understand(cell, kind, stated)) for c, cell in cells]
            known = {header.target for _, header in headers if header.target}
            if _is(kind, known) and len(known) > most:
                best, most = (kind, r, headers), len(known)
    return best


def _is(kind: str, known: set[str]) -> bool:
    """Whether these columns make a table of this kind."""
    if kind == "checks":
        return {"solution", "reading_mV"} <= known
    if kind == "long":
        return {"sample", "parameter", "value"} <= known
    if kind == "stations":
        place = {"x_m", "latitude_deg", "screen_top_m", "ground_elevation_m"}
        return "station" in known and bool(place & known)
    named = {"sample", "station"} & known or "depth_cm" in known
    sampled = known - {
        "sample",
        "station",
        "remarks",
        "x_m",
        "y_m",
        "latitude_deg",
        "longitude_deg",
        "crs",
        "electrode",
    }
    return bool(named) and bool(sampled)


def _facts(grid: Grid, end: int) -> Iterator[tuple[str, tuple[str, Place]]]:
    """Facts above a table, or in a sheet of their own: `key: value` in one cell, or key and value side by side."""
    for r, row in enumerate(grid.rows[:end]):
        filled = [(c, cell) for c, cell in enumerate(row) if cell is not None and str(cell).strip()]
        if not filled:
            continue
        c, first = filled[0]
        found = _FACT.match(str(first))
        key = fact_keys().get(plain(found.group(1))) if found else None
        if found and key:
            yield key, (found.group(2).strip(), grid.place(r, c))
        elif len(filled) >= 2 and plain(str(first).lstrip("# ")) in fact_keys():
            yield fact_keys()[plain(str(first).lstrip("# "))], (str(filled[1][1]).strip(), grid.place(r, filled[1][0]))


def _units(grid: Grid, header_row: int) -> tuple[dict[int, Unit], int]:
    """Units in the row below the header, and the first row of data."""
    below = header_row + 1
    if below >= len(grid.rows):
        return {}, below
    cells = {c: str(cell) for c, cell in enumerate(grid.rows[below]) if cell is not None and str(cell).strip()}
    units = {c: recognise(text.strip().strip("[]()")) for c, text in cells.items()}
    found = {c: unit for c, unit in units.items() if unit}
    numbers = sum(bool(re.fullmatch(r"[<>]?\s*[-−]?\d+([.,]\d+)?", text.strip())) for text in cells.values())
    if found and len(found) >= 0.4 * len(cells) and not numbers:
        return found, below + 1
    return {}, below


def _rows(grid: Grid, kind: str, headers, header_row: int, first: int, findings: Findings) -> list[int]:
    """Data rows: empty ones skipped, repeated headers and closing lines (means, legends) left out with a finding."""
    head = [plain(str(cell)) for cell in grid.rows[header_row] if cell is not None]
    used = [c for c, _ in headers]
    rows = []
    for r in range(first, len(grid.rows)):
        cells = [cell for cell in grid.rows[r] if cell is not None and str(cell).strip()]
        if not cells:
            continue
        if [plain(str(cell)) for cell in cells] == head:
            findings.add("survey.repeated_header", grid.place(r, used[0]))
            continue
        text = str(cells[0])
        alone = len(cells) == 1 and len(used) > 2 and grid.cell(r, used[0]) is not None
        closing = _CLOSING.match(text) and kind in ("samples", "long")
        if closing or text.lstrip().startswith("#") or (alone and len(text) > 30):
            findings.add("survey.closing_row", grid.place(r, used[0]), text[:60])
            continue
        rows.append(r)
    return rows


def _say_unknown(grid: Grid, kind: str, header_row: int, columns, rows, findings: Findings) -> None:
    """A finding for each column that holds something and isn't understood."""
    for c, header, _ in columns:
        if header.target:
            continue
        where = grid.place(header_row, c)
        if header.ignored:
            findings.add("survey.column_ignored", where, header.text)
        elif any(grid.cell(r, c) is not None for r in rows):
            near = nearest(header.text, kind)
            hint = f"Did you mean {near}? " if near else ""
            findings.add("survey.column_unknown", where, header.text, hint=hint)
