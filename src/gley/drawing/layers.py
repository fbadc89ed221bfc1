"""What a chart is made of: filled fields, lines, water's limits, veil and fan as artists with ids of their own."""

import re
from collections.abc import Iterable, Sequence

import numpy as np
import shapely
from matplotlib.axes import Axes
from matplotlib.colors import to_rgba
from matplotlib.lines import Line2D
from matplotlib.patches import PathPatch
from matplotlib.path import Path
from shapely.geometry.polygon import orient

from gley.drawing.style import INK, LINE, OVER, WATER, tint
from gley.stability import Boundary, Chart, Field

Z_FIELD, Z_FAN, Z_LINE, Z_VEIL, Z_WATER, Z_OVER, Z_BAR, Z_LEADER, Z_POINT, Z_WORDS = range(1, 11)

_LOOKS: dict[str, dict] = {
    "vertical": {"lw": 0.7, "ls": (0, (6.0, 1.4))},
    "horizontal": {"lw": 0.9, "ls": "solid"},
    "sloped": {"lw": 0.9, "ls": "solid"},
}


class Ids:
    """Ids for the parts of a drawing, none given twice."""

    def __init__(self) -> None:
        self._given: dict[str, int] = {}

    def new(self, *words: str) -> str:
        """`field`, `Fe^2+` → `field-Fe-2plus`; a second one ends in `-2`."""
        made = "-".join(slug(word) for word in words if word)
        self._given[made] = self._given.get(made, 0) + 1
        if self._given[made] == 1:
            return made
        return self.new(f"{made}-{self._given[made]}")


def slug(text: str) -> str:
    """A name as an id: letters, digits and hyphens; the sign of a charge in words."""
    found = re.search(r"\^(\d*)([+-])$", text)
    if found:
        text = f"{text[: found.start()]}-{found.group(1)}{'plus' if found.group(2) == '+' else 'minus'}"
    return re.sub(r"[^A-Za-z0-9]+", "-", text).strip("-") or "unnamed"


def mV(points: np.ndarray) -> np.ndarray:
    """pH and V (n, 2) to pH and mV."""
    return np.asarray(points, float) * [1.0, 1000.0]


def field_shape(item: Field, window: shapely.Polygon) -> shapely.Geometry:
    """The visible part of a field in pH and mV."""
    parts = [shapely.Polygon(mV(rings[0]), [mV(ring) for ring in rings[1:]]) for rings in item.polygons]
    return shapely.intersection(shapely.union_all(parts), window)


def polygons_of(shape: shapely.Geometry) -> list[shapely.Polygon]:
    """The polygons of any geometry, largest first; lines and points left out."""
    parts = [part for part in shapely.get_parts(shape) if part.geom_type == "Polygon" and part.area > 0]
    return sorted(parts, key=lambda part: (-part.area, part.bounds))


def path_of(shapes: Sequence[shapely.Polygon]) -> Path:
    """One path of several polygons; holes turn the other way round, so they stay empty."""
    rings = []
    for shape in shapes:
        whole = orient(shape)
        rings += [np.asarray(ring.coords) for ring in (whole.exterior, *whole.interiors)]
    return Path.make_compound_path(*(Path(ring, closed=True) for ring in rings))


def draw_field(ax: Axes, element: str, item: Field, shape: shapely.Geometry, gid: str) -> PathPatch | None:
    """One field as one patch; its edge has the colour of the fill, so that no gap shows between neighbours."""
    parts = polygons_of(shape)
    if not parts:
        return None
    colour = tint(element, item.oxidation_state, item.kind)
    patch = PathPatch(path_of(parts), fc=colour, ec=colour, lw=0.5, zorder=Z_FIELD, gid=gid, label="_")
    ax.add_patch(patch)
    return patch


def draw_lines(ax: Axes, boundaries: Iterable[Boundary], ids: Ids, *, over: bool = False) -> list[Line2D]:
    """Boundaries by kind: a line without electrons is thinner and broken; a second element's lines are heavier plum."""
    made = []
    for item in boundaries:
        look = dict(_LOOKS[item.kind])
        points = mV(item.points)
        if over:
            look = {"lw": 1.5 if item.electrons else 1.1, "ls": look["ls"]}
        gid = ids.new("over" if over else "boundary", "--".join(item.between))
        line = Line2D(
            *points.T, color=OVER if over else LINE, zorder=Z_OVER if over else Z_LINE, gid=gid,
            solid_capstyle="round", **look,
        )  # fmt: skip
        made.append(ax.add_line(line))
    return made


def draw_water(ax: Axes, chart: Chart, window: tuple[float, float, float, float], ids: Ids) -> dict[str, np.ndarray]:
    """Water's two limits, dashed, and a light veil beyond them; returns the lines in pH and mV over the window."""
    pH = np.array(window[:2])
    lines = {}
    for name, edge in (("O2/H2O", window[3]), ("H2O/H2", window[2])):
        given = mV(chart.water[name])
        # limits are straight; the window may be wider than the chart
        slope = (given[-1, 1] - given[0, 1]) / (given[-1, 0] - given[0, 0])
        E = given[0, 1] + slope * (pH - given[0, 0])
        lines[name] = np.column_stack([pH, E])
        ring = [*lines[name], (pH[1], edge), (pH[0], edge)]
        ends = np.clip(np.array(ring)[:, 1], *window[2:])
        if np.ptp(ends) > 0:
            veil = _beyond(lines[name], window, above=name == "O2/H2O")
            for part in polygons_of(veil):
                patch = PathPatch(path_of([part]), fc="white", ec="none", alpha=0.42, zorder=Z_VEIL)
                patch.set_gid(ids.new("veil", name))
                ax.add_patch(patch)
        ax.add_line(Line2D(pH, E, color=WATER, lw=1.0, ls=(0, (5, 2.5)), zorder=Z_WATER, gid=ids.new("water", name)))
    return lines


def _beyond(line: np.ndarray, window, *, above: bool) -> shapely.Geometry:
    """The part of the window above or below a line, pH and mV."""
    far = 1e5 if above else -1e5
    half = shapely.Polygon([*line, (line[1, 0], far), (line[0, 0], far)])
    return shapely.intersection(half, shapely.box(window[0], window[2], window[1], window[3]))


def stable_water(lines: dict[str, np.ndarray], window) -> shapely.Polygon | None:
    """The part of the window where water is stable, pH and mV; None where there is none."""
    band = shapely.Polygon([*lines["O2/H2O"], *lines["H2O/H2"][::-1]])
    parts = polygons_of(shapely.intersection(band, shapely.box(window[0], window[2], window[1], window[3])))
    return parts[0] if parts else None


def draw_fan(ax: Axes, low: Chart, high: Chart, window: shapely.Polygon, ids: Ids) -> bool:
    """Shade where the field is another one at the high total than at the low; False when no line moves visibly."""
    before = {item.name: field_shape(item, window) for item in low.fields}
    after = {item.name: field_shape(item, window) for item in high.fields}
    moved = [
        shapely.difference(shape, after[name], grid_size=1e-6) if name in after else shape
        for name, shape in before.items()
    ]
    least = 2e-5 * window.area
    parts = [
        # where two regions meet rounding leaves holes without an area
        shapely.Polygon(part.exterior, [hole for hole in part.interiors if shapely.Polygon(hole).area > least])
        for part in polygons_of(shapely.union_all(moved))
        if part.area > least
    ]
    if not parts:
        return False
    fill, edge = to_rgba(INK, 0.10), to_rgba(INK, 0.45)
    ax.add_patch(PathPatch(path_of(parts), fc=fill, ec=edge, lw=0.4, zorder=Z_FAN, gid=ids.new("fan")))
    return True
