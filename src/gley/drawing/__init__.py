"""Drawing: E-pH charts and site maps. Draws what it is given, computes no field."""

from gley.drawing.chart import EphChart
from gley.drawing.map import SiteMap
from gley.drawing.style import element_name, field_colour

__all__ = ["EphChart", "SiteMap", "element_name", "field_colour"]
