"""Everything a run delivers, in order: tables, GIS layers, charts, maps, report, stamp."""

from pathlib import Path
from typing import Any

import geopandas
import pandas as pd
from openpyxl.styles import Font, PatternFill
from openpyxl.utils import get_column_letter

from gley.delivery.folder import build
from gley.delivery.page import page
from gley.delivery.result import ChartSheet, Result
from gley.delivery.sheets import as_record, draw
from gley.delivery.stamp import data_version, made_at, stamp
from gley.delivery.tables import boundary_table, finding_table, printed, sample_table
from gley.drawing import EphChart, SiteMap
from gley.errors import GleyError
from gley.jsonform import to_json
from gley.stability import Chart


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
    return build(folder, overwrite, lambda working: _fill(result, working))


def _fill(result: Result, folder: Path) -> None:
    samples = sample_table(result)
    _csv(samples, folder / "samples.csv")
    _csv(result.fields, folder / "fields.csv")
    _csv(finding_table(result.findings), folder / "findings.csv")
    _workbook(result, printed(samples), folder / "samples.xlsx")
    if result.places is not None:
        _layers(result, samples, folder / "samples.gpkg")
    for sheet in result.charts:
        _chart(sheet, folder, result.settings.chart.dpi)
    if result.places is not None:
        _maps(result, folder / "maps")
    (folder / "report.html").write_text(page(result, folder), encoding="utf-8")
    _json(stamp(result), folder / "run.json")


def _csv(frame: pd.DataFrame, path: Path) -> None:
    frame.to_csv(path, index=False, encoding="utf-8", lineterminator="\n")


def _json(record: Any, path: Path) -> None:
    path.write_text(to_json(record) + "\n", encoding="utf-8")


def _workbook(result: Result, samples: pd.DataFrame, path: Path) -> None:
    """Samples, fields and findings as sheets with frozen, coloured headers; reported values stay as delivered."""
    sheets = {"samples": samples, "fields": result.fields, "findings": finding_table(result.findings)}
    with pd.ExcelWriter(path, engine="openpyxl") as book:
        for name, frame in sheets.items():
            frame.to_excel(book, sheet_name=name, index=False)
            sheet = book.sheets[name]
            for row in sheet.iter_rows():
                for cell in row:
                    if cell.data_type == "f":  # a name from the survey such as =A1 is text, not a formula
                        cell.data_type = "s"
            sheet.freeze_panes = "B2"
            sheet.auto_filter.ref = sheet.dimensions
            for c, column in enumerate(frame, start=1):
                head = sheet.cell(1, c)
                head.font, head.fill = Font(bold=True), PatternFill("solid", fgColor="E7D3B8")
                longest = max([len(str(column)), *(len(str(value)) for value in frame[column].head(200))], default=8)
                sheet.column_dimensions[get_column_letter(c)].width = min(longest + 2, 46)
                if frame[column].dtype == float:
                    form = _number_format(str(column))
                    for row in range(2, len(frame) + 2):
                        sheet.cell(row, c).number_format = form


def _number_format(column: str) -> str:
    if column.endswith(("_mol_L", "_eq_L")):
        return "0.00E+00"
    if column.endswith("_mV"):
        return "0"
    return "0.00####" if column.endswith("_deg") else "0.00"


def _layers(result: Result, samples: pd.DataFrame, path: Path) -> None:
    """GIS layers in the survey's own reference system: one point per sample, and one per sample and element."""
    import pyogrio

    # the container notes when it was changed: the same moment as the stamp
    pyogrio.set_gdal_config_options({"OGR_CURRENT_DATE": made_at().replace("Z", ".000Z")})
    places = result.places
    assert places is not None
    layer = geopandas.GeoDataFrame(samples.copy(), geometry=places.geometry.to_numpy(), crs=places.crs)
    layer.to_file(path, layer="samples", driver="GPKG", engine="pyogrio", geometry_type="Point")
    if not len(result.fields):
        return
    by_name = dict(zip(places["sample"], places.geometry, strict=True))
    points = [by_name[name] for name in result.fields["sample"]]
    fields = geopandas.GeoDataFrame(result.fields.copy(), geometry=points, crs=places.crs)
    fields.to_file(path, layer="fields", driver="GPKG", engine="pyogrio", geometry_type="Point")


def _chart(sheet: ChartSheet, folder: Path, dpi: int) -> None:
    """One chart as drawing, as data, and its lines as a table."""
    for part in ("charts", "boundaries"):
        (folder / part).mkdir(exist_ok=True)
    draw(sheet).save(folder / "charts" / sheet.key, dpi=dpi)
    _json(as_record(sheet), folder / "charts" / f"{sheet.key}.json")
    if sheet.over is None:
        _csv(boundary_table(sheet.chart), folder / "boundaries" / f"{sheet.key}.csv")


def _maps(result: Result, folder: Path) -> None:
    """A plan map of the redox process, and one per element of its fields."""
    folder.mkdir(exist_ok=True)
    places = result.places
    assert places is not None
    layers = {"redox_process": ("Redox process from chemistry", result.evidence["redox_process"].to_numpy())}
    for element in result.elements:
        own = result.fields[result.fields["element"] == element]
        layers[element] = (f"{element}: stability field", own["field"].to_numpy())
    for name, (title, values) in layers.items():
        frame = places.assign(category=values, round=result.survey.samples["round"].to_numpy())
        SiteMap().draw(frame, "category", title=title).save(folder / name, dpi=result.settings.chart.dpi)


def write_charts(charts: list[Chart], folder: Path, overwrite: bool = False) -> list[Path]:
    """Write charts without a survey: drawing, data and lines of each, named by element (and conditions, if several).

    Raises
    ------
    GleyError
        When one of the files exists and `overwrite` isn't set, or the folder can't be written.
    """
    names = _names(charts)
    wanted = [folder / f"{name}{suffix}" for name in names for suffix in (".svg", ".png", ".json", ".csv")]
    there = [path for path in wanted if path.exists()]
    if there and not overwrite:
        message = f"{there[0]} is there already; nothing was changed."
        raise GleyError(message, "Name another folder with --out, or give --overwrite.")
    try:
        folder.mkdir(parents=True, exist_ok=True)
        for name, chart in zip(names, charts, strict=True):
            EphChart().draw(chart).caption([f"Data {data_version()}."]).save(folder / name)
            _json(chart.as_dict(), folder / f"{name}.json")
            _csv(boundary_table(chart), folder / f"{name}.csv")
    except OSError as error:
        message = f"{folder}: can't be written ({error.strerror or error})."
        raise GleyError(message, "Check the path and its permissions.") from None
    return wanted


def _names(charts: list[Chart]) -> list[str]:
    if len(charts) == 1:
        return [charts[0].element]
    return [f"{item.element}_{item.conditions.total_mol_L:g}M_{item.conditions.temperature_C:g}C" for item in charts]
