"""Tables in sheets: where headers stand, what kinds of table they make, which row holds units, where each ends."""

import re
from collections.abc import Iterator, Mapping
from dataclasses import dataclass, replace

from gley.findings import Findings, Place
from gley.survey.headers import Header, fact_keys, nearest, plain, soil_or_well, understand
from gley.survey.read import Grid, is_comment
from gley.units import Unit, recognise

_SEARCHED_ROWS = 60
_FOOTNOTE_MARKS = "*†‡¹²³"
_MOST_BESIDE = 2  # cells beside a fact's key; a row of more is a header
_GERMAN_SAMPLE = "probe"
_STATISTIC = r"mean|average|avg|median|total|sum|min(?:imum)?|max(?:imum)?|std|sd|standard deviation|count|mittelwert"
_CLOSING = re.compile(
    rf"(?i)^(?:(?:{_STATISTIC})(?:[\s:.]*|\s+(?:of|values?|all)\b.*|\s*\(.*\))"
    r"|(?:legend|notes?|source|remarks?)\s*(?::.*)?)$"
)
"""A closing line is one as a whole; a sample called `SD-1` or `Source Hill` is none."""
_FACT = re.compile(r"^#?\s*([^:=]{2,60}?)\s*[:=]\s*(\S.*)$")
_NUMBER = re.compile(r"[<>]?\s*[-−]?\d+([.,]\d+)?")
_NOT_MEASURED = frozenset(
    {
        "sample", "station", "remarks", "x_m", "y_m", "latitude_deg", "longitude_deg", "crs", "electrode", "date",
        "time", "date_time", "round", "depth_cm", "depth_top_m", "depth_bottom_m", "probe", "water_level_m",
        "sample_type", "duplicate_of",
    }
)  # fmt: skip

Headers = list[tuple[int, Header]]


@dataclass(frozen=True)
class Table:
    """One table of a sheet: its kind, the meaning and unit of each of its columns, and its data rows.

    `odd_units` holds, by column, what stands in the row of units and isn't one.
    """

    kind: str
    grid: Grid
    header_row: int
    columns: tuple[tuple[int, Header, Unit | None], ...]
    rows: tuple[int, ...]
    odd_units: Mapping[int, str]

    def place(self, row: int, column: int) -> Place:
        """Address of a cell."""
        return self.grid.place(row, column)


def find_tables(
    grid: Grid, stated: Mapping[str, str], findings: Findings
) -> tuple[list[Table], list[tuple[str, str, Place]]]:
    """The tables of a sheet and the facts written above them (key, value, place), in their order.

    A sheet that is neither is a finding.
    """
    found = _headers(grid, stated)
    facts = list(_facts(grid, found[0][1] if found else len(grid.rows)))
    if not found and not facts and any(cell is not None for row in grid.rows for cell in row):
        findings.add("survey.sheet_not_understood", Place(grid.file, grid.sheet))
    ends = [*(row for _, row, _ in found[1:]), len(grid.rows)]
    return [_table(grid, *one, ends[i], findings) for i, one in enumerate(found)], facts


def _table(grid: Grid, kind: str, header_row: int, headers: Headers, end: int, findings: Findings) -> Table:
    units, odd, first = _units(grid, header_row)
    while end < len(grid.rows) and first < end and _filled(grid, end - 1) == 1:
        end -= 1  # titles of the next table
    rows = _rows(grid, kind, headers, header_row, (first, end), findings)
    for c, header in headers:
        if header.target == "sample" and plain(header.text) == _GERMAN_SAMPLE:
            findings.add("survey.probe_is_sample", grid.place(header_row, c), header.text)
    columns = []
    for c, header in headers:
        unit = header.unit or units.get(c)
        columns.append((c, replace(header, target=soil_or_well(header.target, unit)), unit))
    _say_unknown(grid, kind, header_row, columns, rows, findings)
    return Table(kind, grid, header_row, tuple(columns), tuple(rows), odd)


def _headers(grid: Grid, stated: Mapping[str, str]) -> list[tuple[str, int, Headers]]:
    """Kind, row and headers of each row that reads as a header: the best of neighbours, one for each table."""
    found: list[tuple[str, int, Headers]] = []
    data_since = gap = False
    for r, row in enumerate(grid.rows):
        if _filled(grid, r) < 2:
            gap = True
            continue
        numbers = any(_is_number(cell) for cell in row)
        if (r < _SEARCHED_ROWS and not data_since) or (gap and not numbers):
            one = _header(row, stated)
            if one and (not found or data_since):
                found.append((one[0], r, one[1]))
                data_since = gap = False
                continue
            if one and len(_known(one[1])) > len(_known(found[-1][2])):
                found[-1] = (one[0], r, one[1])
                continue
        # remarks above the first header are no data of a table
        data_since = data_since or (bool(found) and (numbers or r > found[-1][1] + 1))
        gap = False
    return found


def _filled(grid: Grid, r: int) -> int:
    return sum(cell is not None and bool(str(cell).strip()) for cell in grid.rows[r])


def _is_number(cell: object) -> bool:
    if isinstance(cell, str):
        return bool(_NUMBER.fullmatch(cell.strip()))
    return cell is not None and not isinstance(cell, bool)


def _header(row: list, stated: Mapping[str, str]) -> tuple[str, Headers] | None:
    """Kind and headers of a row by what most of its cells say; None where they make no table."""
    cells = [(c, cell) for c, cell in enumerate(row) if isinstance(cell, str) and cell.strip()]
    best, most = None, 0
    if len(cells) < 2 or is_comment(cells[0][1]):
        return None
    for kind in ("checks", "long", "stations", "samples"):
        headers = [(c, understand(cell, kind, stated)) for c, cell in cells]
        headers = _named(headers) if kind == "samples" else headers
        known = _known(headers)
        if _is(kind, known) and len(known) > most:
            best, most = (kind, headers), len(known)
    return best


def _known(headers: Headers) -> set[str]:
    return {header.target for _, header in headers if header.target}


def _is(kind: str, known: set[str]) -> bool:
    """Whether these columns make a table of this kind."""
    if kind == "checks":
        return {"solution", "reading_mV"} <= known
    if kind == "long":
        return {"parameter", "value"} <= known and bool({"sample", "station"} & known)
    if kind == "stations":
        place = {"x_m", "latitude_deg", "screen_top_m", "ground_elevation_m", "electrode", "aquifer"}
        return "station" in known and bool(place & known)
    named = {"sample", "station"} & known or "depth_cm" in known
    # a list of samples without readings is one too, of places alone it isn't
    return bool(named) and (bool(known - _NOT_MEASURED) or ("sample" in known and len(known) > 1))


def _named(headers: Headers) -> Headers:
    """`Probe` as the sample, as in German, where nothing else names one."""
    if {"sample", "station"} & _known(headers):
        return headers
    return [(c, replace(h, target="sample") if plain(h.text) == _GERMAN_SAMPLE else h) for c, h in headers]


def _facts(grid: Grid, end: int) -> Iterator[tuple[str, str, Place]]:
    """Facts above a table, or in a sheet of their own: `key: value` in one cell, or key and value side by side."""
    for r, row in enumerate(grid.rows[:end]):
        filled = [(c, cell) for c, cell in enumerate(row) if cell is not None and str(cell).strip()]
        if not filled:
            continue
        c, first = filled[0]
        found = _FACT.match(str(first))
        key = fact_keys().get(plain(found.group(1))) if found else None
        rest = [str(cell).strip() for _, cell in filled[1:]]
        if found and key:
            # in a text file the separator may stand within the value: `electrode: Ag/AgCl, 3 M KCl`
            parts = [found.group(2).strip(), *(rest if grid.delimiter else ())]
            yield key, _joined(parts, grid.delimiter), grid.place(r, c)
        elif 0 < len(rest) <= _MOST_BESIDE and plain(str(first).lstrip("# ").rstrip(": ")) in fact_keys():
            value = _joined(rest, grid.delimiter) if grid.delimiter else rest[0]
            yield fact_keys()[plain(str(first).lstrip("# "))], value, grid.place(r, filled[1][0])


def _joined(parts: list[str], delimiter: str) -> str:
    return f"{delimiter.strip()} ".join(parts) if delimiter == "," else " ".join(parts)


def _units(grid: Grid, header_row: int) -> tuple[dict[int, Unit], dict[int, str], int]:
    """Units in the row below the header, what stands among them and isn't one, and the first row of data."""
    below = header_row + 1
    if below >= len(grid.rows):
        return {}, {}, below
    cells = {c: str(cell) for c, cell in enumerate(grid.rows[below]) if cell is not None and str(cell).strip()}
    units = {c: recognise(text) or recognise(text.strip(" []()")) for c, text in cells.items()}
    found = {c: unit for c, unit in units.items() if unit}
    numbers = sum(bool(_NUMBER.fullmatch(text.strip())) for text in cells.values())
    if found and len(found) >= 0.4 * len(cells) and not numbers:
        return found, {c: " ".join(text.split()) for c, text in cells.items() if c not in found}, below + 1
    return {}, {}, below


def _rows(
    grid: Grid, kind: str, headers: Headers, header_row: int, span: tuple[int, int], findings: Findings
) -> list[int]:
    """Data rows: empty ones skipped, repeated headers and closing lines (means, legends) left out with a finding."""
    head = [plain(str(cell)) for cell in grid.rows[header_row] if cell is not None]
    used = [c for c, _ in headers]
    names = [c for c, header in headers if header.target in ("sample", "station")]
    rows = []
    for r in range(*span):
        cells = [cell for cell in grid.rows[r] if cell is not None and str(cell).strip()]
        if not cells:
            continue
        if [plain(str(cell)) for cell in cells] == head:
            findings.add("survey.repeated_header", grid.place(r, used[0]))
            continue
        text = str(cells[0]).strip()
        # a lone cell that is long, or stands where no name does, is a footnote
        named = any(grid.cell(r, c) is not None for c in names)
        footnote = len(text) > 30 or text[0] in _FOOTNOTE_MARKS or not (named or _is_number(text))
        alone = len(cells) == 1 and len(used) > 2 and footnote
        closing = _CLOSING.match(text) and kind in ("samples", "long")
        if closing or is_comment(text) or alone:
            at = next(c for c, cell in enumerate(grid.rows[r]) if cell is not None and str(cell).strip())
            findings.add("survey.closing_row", grid.place(r, at), text[:60])
            continue
        rows.append(r)
    return rows


def _say_unknown(grid: Grid, kind: str, header_row: int, columns, rows, findings: Findings) -> None:
    """A finding for each column that holds something and isn't understood, or has no header."""
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
    headed = {c for c, _, _ in columns}
    width = max((len(grid.rows[r]) for r in rows), default=0)
    for c in range(width):
        first = next((r for r in rows if c not in headed and grid.cell(r, c) is not None), None)
        if first is not None:
            findings.add("survey.column_unheaded", grid.place(first, c), str(grid.cell(first, c)))
