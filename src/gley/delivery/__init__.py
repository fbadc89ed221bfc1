"""Delivery: a run written as tables, GIS layers, charts, maps, a report and a stamp; whole or not at all."""

from gley.delivery.folder import refuse, restore
from gley.delivery.plain import PlainChart, overlap_table, write_charts
from gley.delivery.result import ChartSheet, Result
from gley.delivery.sheets import draw, from_record
from gley.delivery.write import write

__all__ = [
    "ChartSheet",
    "PlainChart",
    "Result",
    "draw",
    "from_record",
    "overlap_table",
    "refuse",
    "restore",
    "write",
    "write_charts",
]
