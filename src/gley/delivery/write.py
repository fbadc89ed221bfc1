"""Everything a run delivers, in order: tables, GIS layers, charts, maps, report, stamp."""

import datetime as dt
from dataclasses import replace
from pathlib import Path
from typing import Any

import pandas as pd

from gley.delivery.folder import STAMP, build, content
from gley.delivery.layers import write_layers
from gley.delivery.page import map_title, page
from gley.delivery.result import ChartSheet, Result
from gley.delivery.sheets import as_record, draw
from gley.delivery.stamp import made_at, stamp
from gley.delivery.tables import (
    boundary_table,
    by_sample,
    evidence_table,
    field_table,
    finding_table,
    printed,
    sample_table,
)
from gley.delivery.workbook import MOST_ROWS, write_workbook
from gley.drawing import SiteMap
from gley.findings import Findings
from gley.jsonform import to_json


def write(result: Result, folder: Path, overwrite: bool = False) -> list[Path]:
    """Write a run's folder.

    Parameters
    ----------
    result : Result
        What `pipeline.run` gave.
    folder : Path
        Where; made whole or not at all.
    overwrite : bool
        Replace the result of an earlier run.

    Returns
    -------
    list of Path
        The files, sorted.

    Raises
    ------
    GleyError
        When the folder mustn't or can't be written; nothing has changed then.
    """
    return build(folder, overwrite, lambda working, restored: _fill(result, working, restored, folder.name))


def _fill(result: Result, folder: Path, restored: bool, name: str) -> None:
    """All files; what concerns the writing itself is added to the findings of the copy that is written."""
    result = replace(result, findings=Findings(result.findings))
    if restored:
        result.findings.add("delivery.restored", value=name)
    samples = sample_table(result)
    _csv(samples, folder / "samples.csv")
    _csv(field_table(result), folder / "fields.csv")
    for key in ("rivals", "couples", "scenarios", "overlaps"):
        _csv(evidence_table(getattr(result, key), key), folder / f"{key}.csv")
    _workbook(result, samples, folder / "samples.xlsx")
    _csv(finding_table(result.findings), folder / "findings.csv")
    if result.places is not None:
        write_layers(result.places, samples, field_table(result), folder / "samples.gpkg", made_at())
    for sheet in result.charts:
        _chart(sheet, folder, result.settings.chart.dpi)
    if result.places is not None:
        _maps(result, folder / "maps")
    (folder / "report.html").write_text(page(result, folder), encoding="utf-8", newline="\n")
    _json({**stamp(result), "files": sorted([*content(folder), STAMP])}, folder / STAMP)


def _csv(frame: pd.DataFrame, path: Path) -> None:
    frame.to_csv(path, index=False, encoding="utf-8", lineterminator="\n")


def _json(record: Any, path: Path) -> None:
    path.write_text(to_json(record) + "\n", encoding="utf-8", newline="\n")


def _workbook(result: Result, samples: pd.DataFrame, path: Path) -> None:
    """Samples, fields and findings as sheets; what a sheet can't hold is said."""
    shown = {"samples": printed(samples), "fields": field_table(result), "findings": finding_table(result.findings)}
    reported = tuple(str(name) for name in result.survey.reported if not str(name).endswith("_flag"))
    made = dt.datetime.strptime(made_at(), "%Y-%m-%dT%H:%M:%SZ")
    for name in write_workbook(shown, reported, path, made):
        result.findings.add("delivery.sheet_too_long", value=len(shown[name]), sheet=name, most=MOST_ROWS)


def _chart(sheet: ChartSheet, folder: Path, dpi: int) -> None:
    """One chart as drawing, as data, and its lines as a table."""
    for part in ("charts", "boundaries"):
        (folder / part).mkdir(exist_ok=True)
    draw(sheet).save(folder / "charts" / sheet.key, dpi=dpi)
    _json(as_record(sheet), folder / "charts" / f"{sheet.key}.json")
    lines = [boundary_table(chart) for chart in (sheet.chart, sheet.over) if chart is not None]
    _csv(pd.concat(lines, ignore_index=True), folder / "boundaries" / f"{sheet.key}.csv")


def _maps(result: Result, folder: Path) -> None:
    """A plan map of the redox process, and one per element of its fields."""
    folder.mkdir(exist_ok=True)
    places = result.places
    assert places is not None
    layers = {"redox_process": (map_title("redox_process"), result.evidence["redox_process"].to_numpy())}
    for element in result.elements:
        layers[element] = (map_title(element), by_sample(result, element, "field"))
    for name, (title, values) in layers.items():
        frame = places.assign(category=values, round=result.survey.samples["round"].to_numpy())
        SiteMap().draw(frame, "category", title=title).save(folder / name, dpi=result.settings.chart.dpi)
