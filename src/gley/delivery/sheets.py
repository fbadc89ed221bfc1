"""A chart of a survey as a drawing and as a record that suffices to draw it again."""

from collections.abc import Mapping
from typing import Any

import pandas as pd

from gley.delivery.result import ChartSheet
from gley.delivery.stamp import data_version
from gley.drawing import EphChart
from gley.stability import Chart


def draw(sheet: ChartSheet) -> EphChart:
    """The chart with its fan, what lies over it, its samples and its caption."""
    drawn = EphChart().draw(sheet.chart, title=sheet.title)
    if sheet.fan is not None:
        drawn = drawn.fan(*sheet.fan)
    if sheet.over is not None:
        drawn = drawn.over(sheet.over)
    drawn = drawn.points(sheet.points)
    return drawn.caption([*sheet.notes, f"Drawn at {sheet.reference}. Data {data_version()}."])


def as_record(sheet: ChartSheet) -> dict[str, Any]:
    """Plain values for JSON."""
    return {
        "key": sheet.key,
        "title": sheet.title,
        "reference": sheet.reference,
        "notes": list(sheet.notes),
        "chart": sheet.chart.as_dict(),
        "over": sheet.over.as_dict() if sheet.over else None,
        "fan": [item.as_dict() for item in sheet.fan] if sheet.fan else None,
        "points": sheet.points.to_dict("records"),
    }


def from_record(record: Mapping[str, Any]) -> ChartSheet:
    """A sheet from what `as_record` gave, read back from JSON."""
    fan = [Chart.from_dict(item) for item in record["fan"] or ()]
    return ChartSheet(
        key=record["key"],
        title=record["title"],
        chart=Chart.from_dict(record["chart"]),
        over=Chart.from_dict(record["over"]) if record["over"] else None,
        fan=(fan[0], fan[1]) if fan else None,
        points=pd.DataFrame(record["points"]),
        reference=record["reference"],
        notes=tuple(record["notes"]),
    )
