"""Stability: which form of an element prevails at a sample's pH, Eh, temperature and composition. The engine.

Imports neither drawing nor file readers; takes tables and arrays and returns new ones.
"""

from gley.stability.assign import assign, measured_elements
from gley.stability.chart import chart
from gley.stability.chart_types import Boundary, Chart, Conditions, Field
from gley.stability.data import CHART_ONLY, OFFERED, check_names, species
from gley.stability.water import water_lines

__all__ = [
    "CHART_ONLY", "OFFERED", "Boundary", "Chart", "Conditions", "Field", "assign", "chart", "check_names",
    "measured_elements", "species", "water_lines",
]  # fmt: skip
