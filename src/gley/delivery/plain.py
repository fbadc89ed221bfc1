"""Charts without a survey: drawing, data and lines of each as files."""

from dataclasses import dataclass
from pathlib import Path
from typing import Any

import pandas as pd

from gley.delivery.stamp import data_version
from gley.delivery.tables import boundary_table
from gley.drawing import EphChart
from gley.errors import GleyError
from gley.jsonform import to_json
from gley.stability import Chart, Overlap, overlay


@dataclass(frozen=True)
class PlainChart:
    """A chart, with another element's laid over it or with the two conditions between which its lines move."""

    chart: Chart
    over: Chart | None = None
    fan: tuple[Chart, Chart] | None = None

    @property
    def overlaps(self) -> tuple[Overlap, ...]:
        """Regions that a field of each element shares; none without an overlay."""
        return overlay(self.chart, self.over) if self.over is not None else ()

    def as_dict(self) -> dict[str, Any]:
        """Plain values for JSON: the chart's own where nothing is laid over it."""
        if self.over is None and self.fan is None:
            return self.chart.as_dict()
        return {
            "chart": self.chart.as_dict(),
            "over": self.over.as_dict() if self.over else None,
            "fan": [item.as_dict() for item in self.fan] if self.fan else None,
            "overlaps": [item.as_dict() for item in self.overlaps],
        }


def write_charts(charts: list[PlainChart], folder: Path, overwrite: bool = False) -> list[Path]:
    """Write charts, named by element (and conditions, if several), with a table of the overlaps where there are any.

    Raises
    ------
    GleyError
        When one of the files exists and `overwrite` isn't set, or the folder can't be written.
    """
    names = _names(charts)
    wanted = [folder / f"{name}{suffix}" for name in names for suffix in (".svg", ".png", ".json", ".csv")]
    wanted += [folder / f"{name}_overlaps.csv" for name, item in zip(names, charts, strict=True) if item.over]
    there = [path for path in wanted if path.exists()]
    if there and not overwrite:
        message = f"{there[0]} is there already; nothing was changed."
        raise GleyError(message, "Name another folder with --out, or give --overwrite.")
    try:
        folder.mkdir(parents=True, exist_ok=True)
        for name, item in zip(names, charts, strict=True):
            _write(item, folder / name)
    except OSError as error:
        message = f"{folder}: can't be written ({error.strerror or error})."
        raise GleyError(message, "Check the path and its permissions.") from None
    return wanted


def _write(item: PlainChart, stem: Path) -> None:
    drawn = EphChart().draw(item.chart)
    if item.fan is not None:
        drawn = drawn.fan(*item.fan, percentiles=False)
    if item.over is not None:
        drawn = drawn.over(item.over)
        _csv(overlap_table(item.overlaps, item.over.element, item.chart.element), Path(f"{stem}_overlaps.csv"))
    drawn.caption([f"Data {data_version()}."]).save(stem)
    Path(f"{stem}.json").write_text(to_json(item.as_dict()) + "\n", encoding="utf-8", newline="\n")
    lines = [boundary_table(chart) for chart in (item.chart, item.over) if chart is not None]
    _csv(pd.concat(lines, ignore_index=True), Path(f"{stem}.csv"))


def overlap_table(found: tuple[Overlap, ...], over: str, under: str) -> pd.DataFrame:
    """One row per region: elements, their fields, share of the chart."""
    rows = [(over, item.over, under, item.under, item.share) for item in found]
    return pd.DataFrame(rows, columns=["over_element", "over_field", "under_element", "under_field", "share_of_chart"])


def _csv(frame: pd.DataFrame, path: Path) -> None:
    frame.to_csv(path, index=False, encoding="utf-8", lineterminator="\n")


def _names(charts: list[PlainChart]) -> list[str]:
    stems = [f"{item.over.element}_over_{item.chart.element}" if item.over else item.chart.element for item in charts]
    if len(charts) == 1:
        return stems
    stated = [item.chart.conditions for item in charts]
    return [
        f"{stem}_{where.total_mol_L:g}M_{where.temperature_C:g}C" for stem, where in zip(stems, stated, strict=True)
    ]
