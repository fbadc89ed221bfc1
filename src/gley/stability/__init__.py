"""Stability: which form of an element prevails at a sample's pH, Eh, temperature and composition. The engine.

Imports neither drawing nor file readers; takes tables and arrays and returns new ones.
"""

from gley.stability.assign import Assignment, assign, assignment, measured_elements, named_fields
from gley.stability.chart import chart, chart_at
from gley.stability.chart_types import Boundary, Chart, Conditions, Field
from gley.stability.couples import couple_potentials, couples
from gley.stability.data import CHART_ONLY, OFFERED, check_names, species
from gley.stability.overlay import Overlap, overlay
from gley.stability.reference import reference
from gley.stability.water import IMPLAUSIBLE_mV, beyond_water, water_lines
from gley.stability.working import working

__all__ = [
    "CHART_ONLY",
    "OFFERED",
    "Assignment",
    "Boundary",
    "Chart",
    "Conditions",
    "Field",
    "IMPLAUSIBLE_mV",
    "Overlap",
    "assign",
    "assignment",
    "beyond_water",
    "chart",
    "chart_at",
    "check_names",
    "couple_potentials",
    "couples",
    "measured_elements",
    "named_fields",
    "overlay",
    "reference",
    "species",
    "water_lines", "working",
]  # fmt: skip
