"""Names on a chart, placed when everything else is drawn: water's lines, fields, the second element's, the points."""

from typing import Any

import numpy as np
import shapely
from matplotlib.axes import Axes
from matplotlib.lines import Line2D
from matplotlib.text import Text
from shapely.affinity import scale

from gley.drawing.labels import beside_spot, field_spot, line_spot, name_variants, pole
from gley.drawing.layers import Z_LEADER, Z_WORDS, Ids, field_shape, mV, polygons_of, stable_water
from gley.drawing.pointlabels import MOST_LABELS, label_points
from gley.drawing.points import Points, bar_ends
from gley.drawing.room import Room, Spot, edge_towards
from gley.drawing.style import INK, LINE, OVER, SMALL_PT, WATER, shown_name
from gley.formula import typeset
from gley.stability import Chart

_SECOND_PART = 0.03
_SMALLEST_PT2 = 12.0
_BAR_LIMIT = 60


class Names:
    """All names of a chart. `left_out` counts points that found no place for theirs."""

    def __init__(self, ax: Axes, ids: Ids) -> None:
        self.ax, self.ids = ax, ids
        self.room = Room(ax)
        self.left_out = 0
        self.unnamed_fields: list[str] = []

    def place(
        self, chart: Chart, shapes: dict[str, shapely.Geometry], water: dict[str, np.ndarray], window,
        over: Chart | None, points: Points | None,
    ) -> None:  # fmt: skip
        """Place everything on the axes of `chart`, whose visible fields are `shapes` (pH, mV)."""
        room = self.room
        for line in water.values():
            room.lines.append(room.path(line))
        if points is not None:
            self._take_points(points)
        for item in over.boundaries if over else ():
            room.lines.append(room.path(mV(item.points)))
        own_lines = list(room.lines)
        for item in chart.boundaries:
            room.lines.append(room.path(mV(item.points)))
        self._water_names(water)
        band = stable_water(water, window)
        prefer = self._to_pixels(band) if band is not None else None
        fields = [(item, shapes[item.name]) for item in chart.fields]
        self._fields(fields, prefer, own_lines, over=False)
        if over is not None:
            frame = shapely.box(window[0], window[2], window[1], window[3])
            self._fields([(item, field_shape(item, frame)) for item in over.fields], prefer, room.lines, over=True)
        if points is not None and 0 < len(points.shown) <= MOST_LABELS:
            self._point_names(points)

    def _to_pixels(self, shape: shapely.Geometry) -> shapely.Geometry:
        return shapely.transform(shape, self.room.pixels)

    def _take_points(self, points: Points) -> None:
        if not len(points.shown):
            return
        centres = self.room.pixels(points.shown[["pH", "Eh_mV"]].to_numpy(float))
        reach = (points.radius_pt + 0.5) * self.room.pt
        self.room.markers.extend(shapely.box(*(centres - reach).T, *(centres + reach).T))
        if len(points.shown) <= _BAR_LIMIT:
            for bar in bar_ends(points.shown):
                self.room.bars.append(self.room.path(bar))

    def _water_names(self, water: dict[str, np.ndarray]) -> None:
        for name, side in (("O2/H2O", 1), ("H2O/H2", -1)):
            x0, y0, x1, y1 = self.room.frame
            seen = shapely.intersection(shapely.LineString(self.room.pixels(water[name])), shapely.box(x0, y0, x1, y1))
            ends = shapely.get_coordinates(seen)
            if len(ends) == 2:
                text = " / ".join(typeset(part) for part in name.split("/"))
                spot = line_spot(self.room, ends, text, side)
                if spot is not None:
                    self._write(spot, WATER, self.ids.new("name", "water", name))

    def _fields(self, fields, prefer, lines, *, over: bool) -> None:
        """Names of all fields: inside where they fit, the smallest first; then those that need a leader line."""
        parts = [
            (item, self._to_pixels(part), n) for item, shape in fields for n, part in enumerate(polygons_of(shape))
        ]
        parts.sort(key=lambda entry: (entry[1].area, entry[0].name))
        frame_area = float(np.prod(self.room.frame[2:] - self.room.frame[:2]))
        waiting = []
        for item, part, n in parts:
            if n and part.area < _SECOND_PART * frame_area:
                continue
            name, formula = shown_name(item.name, item.formula, item.kind)
            variants = name_variants(name, formula, style="italic" if over else "normal")
            spot = self._inside(part, variants, prefer, lines)
            if spot is not None:
                self._write_field(spot, item.name, over=over)
            elif n == 0 and part.area > _SMALLEST_PT2 * self.room.pt**2:
                waiting.append((item, part, variants))
        for item, part, variants in waiting:
            spot = self._beside(part, [words for words in variants if words.text.count("\n") < 2])
            if spot is None:
                self.unnamed_fields.append(item.name)
            else:
                self._write_field(spot, item.name, over=over)

    def _inside(self, part, variants, prefer, lines) -> Spot | None:
        """Clear of all lines that may cross the field; its own edges it can't touch anyway."""
        kept, self.room.lines = self.room.lines, list(lines)
        try:
            return field_spot(self.room, part, variants, prefer)
        finally:
            self.room.lines = kept

    def _beside(self, part: shapely.Polygon, variants) -> Spot | None:
        """The shortest clear leader line to the middle of the field or of either half of it."""
        x0, y0, x1, y1 = part.bounds
        x, y = ((x0 + x1) / 2, y1) if x1 - x0 > y1 - y0 else (x1, (y0 + y1) / 2)
        first = shapely.box(x0, y0, x, y)
        halves = [polygons_of(cut) for cut in (shapely.intersection(part, first), shapely.difference(part, first))]
        targets = [self._target(shape) for shape in (part, *(found[0] for found in halves if found))]
        spots = [beside_spot(self.room, target, variants) for target in targets]
        found = [(cost + 6.0 * rank, spot) for rank, (cost, spot) in enumerate(s for s in spots if s is not None)]
        return min(found, key=lambda entry: entry[0])[1] if found else None

    def _target(self, part: shapely.Polygon) -> tuple[float, float]:
        """Where a leader line ends: the middle of the field, or the nearest place to it that no marker covers."""
        middle = pole(part)
        if not self.room.blocked(np.array([shapely.Point(middle)]))[0]:
            return middle
        x0, y0, x1, y1 = part.bounds
        grid = np.column_stack([g.ravel() for g in np.meshgrid(np.linspace(x0, x1, 40), np.linspace(y0, y1, 40))])
        spots = shapely.points(grid)
        inner = scale(part, 0.92, 0.92, origin=shapely.centroid(part))
        free = shapely.contains(part, spots) & shapely.contains(inner, spots) & ~self.room.blocked(spots)
        if not free.any():
            return middle
        near = np.where(free, np.hypot(*(grid - middle).T), np.inf).argmin()
        return float(grid[near, 0]), float(grid[near, 1])

    def _point_names(self, points: Points) -> None:
        centres = self.room.pixels(points.shown[["pH", "Eh_mV"]].to_numpy(float))
        radius = points.radius_pt * self.room.pt
        spots = label_points(self.room, centres, list(points.shown["label"]), radius, SMALL_PT)
        for spot, sample in zip(spots, points.shown["sample"], strict=True):
            if spot is None:
                self.left_out += 1
            else:
                self._write(spot, INK, self.ids.new("name", "point", str(sample)), dot=False)

    def _write_field(self, spot: Spot, name: str, *, over: bool) -> None:
        gid = self.ids.new("name", "over" if over else "field", name)
        box = {"boxstyle": "round,pad=0.15", "fc": (1, 1, 1, 0.85), "ec": OVER, "lw": 0.6} if over else None
        self._write(spot, OVER if over else INK, gid, box=box)

    def _write(self, spot: Spot, colour: str, gid: str, *, box: dict | None = None, dot: bool = True) -> Text:
        x, y = self.room.data([spot.centre])[0]
        words = spot.words
        made = self.ax.text(
            x, y, words.text, fontsize=words.size, rotation=words.angle, style=words.style, color=colour, ha="center",
            va="center", multialignment="center", zorder=Z_WORDS, gid=gid, bbox=box,
            parse_math=words.math,
        )  # fmt: skip
        self.room.words.append(spot.shape)
        if spot.target is not None:
            self._leader(spot, colour if box else LINE, self.ids.new("leader", gid), dot=dot)
        return made

    def _leader(self, spot: Spot, colour: str, gid: str, *, dot: bool) -> None:
        """From the words to the target, ending in a dot within a field."""
        assert spot.target is not None
        ends = np.array([edge_towards(spot.centre, spot.shape, spot.target), spot.target])
        data = self.room.data(ends)
        look: dict[str, Any] = {"marker": "o", "markevery": [1], "ms": 2.2} if dot else {}
        self.ax.add_line(Line2D(*data.T, color=colour, lw=0.5, zorder=Z_LEADER, gid=gid, **look))
        self.room.words.append(shapely.LineString(ends))
