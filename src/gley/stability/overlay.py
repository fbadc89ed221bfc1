"""One element's map laid over another's: where which field of the one lies over which field of the other."""

from dataclasses import dataclass
from typing import Any

import numpy as np
import shapely

from gley.errors import UsageError
from gley.stability.chart import SMALLEST
from gley.stability.chart_types import Chart, Field


@dataclass(frozen=True)
class Overlap:
    """A region of the plane that one field of each element shares: names, share of the window, polygons as in `Field`
    (rings of pH and E in V).
    """

    over: str
    under: str
    share: float
    polygons: tuple[tuple[np.ndarray, ...], ...]

    def as_dict(self) -> dict[str, Any]:
        """Plain values for JSON."""
        rings = [[ring.tolist() for ring in polygon] for polygon in self.polygons]
        return {"over": self.over, "under": self.under, "share": self.share, "polygons": rings}


def overlay(under: Chart, over: Chart) -> tuple[Overlap, ...]:
    """Every region that a field of `over` shares with one of `under`, the largest first; together they tile the window.

    Raises
    ------
    UsageError
        When the charts are of one element, or don't cover the same window.
    """
    if under.element == over.element:
        message = f"A chart of {over.element} can't be laid over itself."
        raise UsageError(message, "Name two elements.")
    if under.window != over.window:
        message = "The two charts don't cover the same range of pH and E."
        raise UsageError(message, "Draw both with one window.")
    pH_low, pH_high, E_low, E_high = under.window
    whole = (pH_high - pH_low) * (E_high - E_low)
    lower = [(item.name, _shape(item)) for item in under.fields]
    found = []
    for field in over.fields:
        upper = _shape(field)
        for name, shape in lower:
            parts = shapely.get_parts(shapely.intersection(upper, shape))
            kept = [part for part in parts if part.geom_type == "Polygon" and part.area > SMALLEST * whole]
            if kept:
                rings = tuple(_rings(part) for part in kept)
                found.append(Overlap(field.name, name, sum(part.area for part in kept) / whole, rings))
    return tuple(sorted(found, key=lambda item: -item.share))


def _shape(item: Field) -> shapely.Geometry:
    return shapely.union_all([shapely.Polygon(rings[0], rings[1:]) for rings in item.polygons])


def _rings(part: shapely.Polygon) -> tuple[np.ndarray, ...]:
    return tuple(shapely.get_coordinates(ring) for ring in (part.exterior, *part.interiors))
