"""The room on an axes, in pixels: what is taken by markers and words, which lines words better not cross."""

from dataclasses import dataclass

import numpy as np
import shapely
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.text import Text
from shapely import STRtree

GAP_PT = 1.5
"""Air kept around words, points (pt)."""


@dataclass(frozen=True)
class Words:
    """A text as it may be set: string, size in pt, angle in degrees, font style; `math` = `$…$` is a formula."""

    text: str
    size: float
    angle: float = 0.0
    style: str = "normal"
    math: bool = True


@dataclass(frozen=True)
class Spot:
    """Words with their centre in pixels; `target` is what a leader line points to, None when they stand at it."""

    words: Words
    centre: tuple[float, float]
    shape: shapely.Polygon
    target: tuple[float, float] | None = None


def figure_of(ax: Axes) -> Figure:
    """The whole figure an axes is on."""
    figure = ax.get_figure(root=True)
    assert figure is not None, "axes without a figure"
    return figure


class Room:
    """Keeps the shapes on one axes and measures words there. All lengths are pixels of the figure's own dpi."""

    def __init__(self, ax: Axes) -> None:
        self.ax = ax
        self.figure = figure_of(ax)
        self.pt = self.figure.dpi / 72.0
        x0, y0, x1, y1 = ax.get_window_extent().extents
        inset = GAP_PT * self.pt
        self.frame = np.array([x0 + inset, y0 + inset, x1 - inset, y1 - inset])
        self.markers: list[shapely.Geometry] = []
        self.words: list[shapely.Geometry] = []
        self.lines: list[shapely.Geometry] = []
        self.bars: list[shapely.Geometry] = []
        self._sizes: dict[Words, tuple[float, float]] = {}

    def pixels(self, points) -> np.ndarray:
        """Data coordinates (n, 2) to pixels."""
        return self.ax.transData.transform(np.asarray(points, float))

    def data(self, pixels) -> np.ndarray:
        """Pixels (n, 2) to data coordinates."""
        return self.ax.transData.inverted().transform(np.asarray(pixels, float))

    def size(self, words: Words) -> tuple[float, float]:
        """Width and height of upright words with the air around them."""
        if words not in self._sizes:
            made = Text(0, 0, words.text, fontsize=words.size, style=words.style, parse_math=words.math)
            made.set_figure(self.figure)
            extent = made.get_window_extent()
            air = 2 * GAP_PT * self.pt
            self._sizes[words] = (extent.width + air, extent.height + air)
        return self._sizes[words]

    def shapes(self, words: Words, centres: np.ndarray) -> np.ndarray:
        """The rectangles (n,) that words take at centres (n, 2), turned by their angle."""
        width, height = self.size(words)
        corners = np.array([[-1, -1], [1, -1], [1, 1], [-1, 1]]) * [width / 2, height / 2]
        turn = np.deg2rad(words.angle)
        corners = corners @ np.array([[np.cos(turn), np.sin(turn)], [-np.sin(turn), np.cos(turn)]])
        return shapely.polygons(np.asarray(centres)[:, None, :] + corners)

    def within(self, shapes: np.ndarray) -> np.ndarray:
        """Which shapes (n,) lie wholly on the axes."""
        bounds = shapely.bounds(shapes)
        return (bounds[:, :2] >= self.frame[:2]).all(1) & (bounds[:, 2:] <= self.frame[2:]).all(1)

    def blocked(self, shapes: np.ndarray) -> np.ndarray:
        """Which shapes (n,) meet something taken."""
        return _meets(shapes, self.taken)

    def block(self, x0: float, y0: float, x1: float, y1: float) -> None:
        """Mark a rectangle in pixels as taken."""
        self.words.append(shapely.box(x0, y0, x1, y1))

    def over_words(self, shapes: np.ndarray) -> np.ndarray:
        """Which shapes (n,) meet words or their leader lines."""
        return _meets(shapes, self.words)

    def crossed(self, shapes: np.ndarray) -> np.ndarray:
        """Which shapes (n,) meet a line or a bar."""
        return _meets(shapes, [*self.lines, *self.bars])

    def air(self, shapes: np.ndarray) -> np.ndarray:
        """Distance (n,) from each shape to the nearest taken thing or line; infinite where there is none."""
        far = np.full(len(shapes), np.inf)
        others = [*self.taken, *self.lines, *self.bars]
        if others and len(shapes):
            found, distance = STRtree(others).query_nearest(shapes, return_distance=True, all_matches=False)
            far[found[0]] = distance
        return far

    @property
    def taken(self) -> list[shapely.Geometry]:
        """Markers, words and leader lines: what no words may cover."""
        return [*self.markers, *self.words]

    def path(self, points: np.ndarray) -> shapely.LineString:
        """A line given in data coordinates (n, 2), in pixels."""
        return shapely.LineString(self.pixels(points))


def _meets(shapes: np.ndarray, others: list) -> np.ndarray:
    met = np.zeros(len(shapes), bool)
    if others and len(shapes):
        met[STRtree(others).query(shapes, predicate="intersects")[0]] = True
    return met


def edge_towards(spot_centre, shape: shapely.Polygon, target) -> tuple[float, float]:
    """Where a leader line leaves the words: the point of their rectangle nearest to the target."""
    ring = shapely.get_exterior_ring(shape)
    near = shapely.line_interpolate_point(ring, shapely.line_locate_point(ring, shapely.Point(target)))
    return float(near.x), float(near.y)


def segments_meet_boxes(start: np.ndarray, end: np.ndarray, boxes: np.ndarray) -> np.ndarray:
    """Which of n segments cross which of m boxes (x0, y0, x1, y1): bool (n, m), by slabs."""
    direction = (end - start)[:, None, :]
    direction = np.where(direction == 0, 1e-12, direction)
    low = (boxes[None, :, :2] - start[:, None, :]) / direction
    high = (boxes[None, :, 2:] - start[:, None, :]) / direction
    enter = np.minimum(low, high).max(2)
    leave = np.maximum(low, high).min(2)
    return np.asarray((np.maximum(enter, 0.0) <= np.minimum(leave, 1.0)) & (leave >= 0))


def boxes_meet(a: np.ndarray, b: np.ndarray) -> np.ndarray:
    """Which of n boxes overlap which of m boxes (x0, y0, x1, y1): bool (n, m)."""
    apart = (a[:, None, :2] >= b[None, :, 2:]) | (a[:, None, 2:] <= b[None, :, :2])
    return ~np.any(np.asarray(apart), axis=2)


def segments_cross(a: np.ndarray, b: np.ndarray, c: np.ndarray, d: np.ndarray) -> np.ndarray:
    """Which of n segments a-b cross which of m segments c-d: bool (n, m)."""

    def side(p, q, r):
        return (q[..., 0] - p[..., 0]) * (r[..., 1] - p[..., 1]) - (q[..., 1] - p[..., 1]) * (r[..., 0] - p[..., 0])

    a, b, c, d = a[:, None], b[:, None], c[None], d[None]
    return np.asarray((side(a, b, c) * side(a, b, d) < 0) & (side(c, d, a) * side(c, d, b) < 0))
