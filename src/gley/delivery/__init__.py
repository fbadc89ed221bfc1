"""Delivery: a run written as tables, GIS layers, charts, maps, a report and a stamp; whole or not at all."""

from gley.delivery.folder import refuse, restore
from gley.delivery.result import ChartSheet, Result
from gley.delivery.sheets import draw, from_record
from gley.delivery.write import write, write_charts

__all__ = ["ChartSheet", "Result", "draw", "from_record", "refuse", "restore", "write", "write_charts"]
