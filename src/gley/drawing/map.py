"""The plan map: where the samples lie, with their field or redox process by colour, shape and legend."""

from collections.abc import Sequence
from pathlib import Path
from typing import Any

import geopandas
import numpy as np
import pandas as pd
import shapely
from matplotlib.axes import Axes
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.figure import Figure
from matplotlib.lines import Line2D

from gley.drawing import style
from gley.drawing.captions import Under, names_text, plural
from gley.drawing.ground import Ground, draw_north, draw_scale_bar, draw_true_places
from gley.drawing.layers import Z_LEADER, Z_POINT, Z_WORDS, Ids
from gley.drawing.pointlabels import label_points
from gley.drawing.room import Room, edge_towards, figure_of
from gley.drawing.save import save_figure
from gley.drawing.spread import side_by_side
from gley.drawing.symbols import Symbol, symbols

_LEFT, _RIGHT, _TOP = 0.5, 0.14, 0.34
_UNDER_PT = 33.0
_CAPTION_PT = 72.0 * (style.WIDTH_MM / 25.4 - _LEFT - _RIGHT)
_LAYOUT_DPI = 144
_MOST_LABELS = 60
_MARKER_PT, _EDGE_PT = 5.6, 0.8
_LEADER_FROM_PT = 4.0
_SIZES = {
    "^": 1.1, "v": 1.1, "<": 1.1, ">": 1.1, "p": 1.12, "h": 1.1, "8": 1.05, "s": 0.92, "D": 0.82, "*": 1.45, "P": 1.12,
    "X": 1.12,
}  # fmt: skip
"""Sizes that make shapes look equally large."""
_GROUND_TINT, _GRID_TINT = "#fbfaf7", "#dcd7cf"


class SiteMap:
    """A plan map in the reference system of the places.

    Parameters
    ----------
    ax : Axes, optional
        Where to draw; a figure of report width is made without it.
    """

    def __init__(self, ax: Axes | None = None) -> None:
        self._own = ax is None
        if ax is None:
            with style.look():
                figure = Figure(figsize=(style.WIDTH_MM / 25.4, 9.0), dpi=_LAYOUT_DPI)
                FigureCanvasAgg(figure)
                ax = figure.add_axes((0.1, 0.3, 0.8, 0.6))
        self.ax: Axes = ax
        self.ids = Ids()
        self.left_out = 0
        self._title, self._words = "", ""
        self._drawn = False

    @property
    def figure(self) -> Figure:
        """The figure the map is on."""
        return figure_of(self.ax)

    def draw(
        self, places: geopandas.GeoDataFrame, category: str, title: str = "", labels: str | None = "station",
        lines: Sequence[str] = (),
    ) -> "SiteMap":  # fmt: skip
        """Draw all samples that have a place; those whose markers would overlap stand side by side.

        Parameters
        ----------
        places : GeoDataFrame
            One row per sample: `sample`, point geometry (None where unknown), and the columns named below.
        category : str
            Column that colour and shape follow: fields or redox processes; empty ones are drawn white.
        title : str
            Heading.
        labels : str or None
            Column to name the places by; the sample stands in for an empty one. None = no names.
        lines : sequence of str
            Further lines of the caption.
        """
        if self._drawn:
            message = "the map is already drawn"
            raise RuntimeError(message)
        self._drawn, self._title = True, title
        located = ~(places.geometry.isna() | places.geometry.is_empty).to_numpy()
        points = places.geometry[located]
        xy = np.column_stack([points.x, points.y]).reshape(-1, 2)
        table = pd.DataFrame(places.drop(columns=places.geometry.name)).reset_index(drop=True)
        table["category"] = table[category].fillna("").astype(str)
        shown = table[located].reset_index(drop=True)
        ground = Ground(places.crs, xy)
        marks = symbols(shown["category"])
        with style.look():
            self._axes(ground, title)
            if self._own:
                # size of the plot first: which markers move depends on it, and the strip below says so
                self._place(ground.shape(), 0.0)
            room = Room(self.ax)
            _, moved, _ = side_by_side(room.pixels(xy), (_MARKER_PT + _EDGE_PT) * room.pt)
            words = [*self._sentences(shown, table[~located], moved), *lines]
            self._words = " ".join(words)
            under = Under(self.ax, _UNDER_PT, width_pt=_CAPTION_PT if self._own else None)
            under.legend(_handles(shown, marks))
            under.caption(words)
            if self._own:
                self._place(ground.shape(), under.depth)
            self._content(ground, shown, xy, marks, labels)
        return self

    def save(self, stem: str | Path, dpi: int = 300) -> list[Path]:
        """Write `<stem>.svg` and `<stem>.png`, the same bytes for the same input; returns the two paths."""
        title = self._title or "Site map"
        return save_figure(self.figure, stem, title, self._words, dpi, tight=not self._own)

    def _place(self, shape: float, under_pt: float) -> None:
        """Give the figure its size and the plot its own inside it, for a plot of that height by width."""
        width = style.WIDTH_MM / 25.4
        across = width - _LEFT - _RIGHT
        up = across * shape
        height = _TOP + up + under_pt / 72.0 + 0.04
        self.figure.set_size_inches(width, height)
        self.ax.set_position((_LEFT / width, (height - _TOP - up) / height, across / width, up / height))

    def _axes(self, ground: Ground, title: str) -> None:
        ax = self.ax
        extent = ax.get_window_extent()
        x0, y0, x1, y1 = ground.window(ground.shape() if self._own else extent.height / extent.width)
        ax.set(xlim=(x0, x1), ylim=(y0, y1), xlabel=ground.names[0], ylabel=ground.names[1])
        ax.set_xticks(*ground.ticks(0, x0, x1))
        ax.set_yticks(*ground.ticks(1, y0, y1), rotation=90, va="center")
        ax.tick_params(length=3.0, width=0.7)
        ax.set_facecolor(_GROUND_TINT)
        ax.grid(color=_GRID_TINT, lw=0.4)
        ax.set_axisbelow(True)
        ax.set_aspect(ground.aspect, adjustable="box")
        ax.set_title(title, loc="left", fontsize=style.TITLE_PT, fontweight="bold", pad=5.0)

    def _sentences(self, shown: pd.DataFrame, without: pd.DataFrame, moved: np.ndarray) -> list[str]:
        first = f"{plural(len(shown), 'sample')} shown"
        if len(without):
            first += f", {len(without)} without a place{names_text(list(without['sample'].astype(str)))}"
        first += "."
        if moved.any():
            first += " Where markers would overlap they stand side by side, in the order of the samples."
        return [first]

    def _content(self, ground: Ground, shown: pd.DataFrame, xy: np.ndarray, marks: dict[str, Symbol], labels) -> None:
        """Scale, north, markers and names, on axes of final size."""
        self.figure.canvas.draw()
        room = Room(self.ax)
        if ground.crs is not None and len(xy):
            draw_scale_bar(room, ground)
        draw_north(room)
        centres, _, astray = side_by_side(room.pixels(xy), (_MARKER_PT + _EDGE_PT) * room.pt)
        if astray.any():
            draw_true_places(self.ax, xy[astray], self.ids.new("true-places"))
        reach = (_MARKER_PT + _EDGE_PT + 0.6) / 2 * room.pt
        room.markers.extend(shapely.box(*(centres - reach).T, *(centres + reach).T))
        for spot, category, sample in zip(room.data(centres), shown["category"], shown["sample"], strict=True):
            self.ax.add_line(_marker(spot, marks[category], self.ids.new("place", str(sample))))
        if labels is not None:
            self._names(room, shown, centres, labels)

    def _names(self, room: Room, shown: pd.DataFrame, centres: np.ndarray, labels: str) -> None:
        """One name per station of neighbouring markers, not one per sample."""
        own = shown[labels].fillna("").astype(str)
        names = own.where(own != "", shown["sample"].astype(str)).to_numpy()
        groups: dict[str, list[int]] = {}
        for k, name in enumerate(names):
            groups.setdefault(name, []).append(k)
        wanted = [(name, part) for name, rows in groups.items() for part in _near(centres, rows, 24.0 * room.pt)]
        if len(wanted) > _MOST_LABELS:
            self.left_out = len(wanted)
            return
        anchors = np.array([centres[rows].mean(0) for _, rows in wanted]).reshape(-1, 2)
        spots = label_points(room, anchors, [name for name, _ in wanted], _MARKER_PT / 2 * room.pt, style.SMALL_PT)
        for spot, (name, rows) in zip(spots, wanted, strict=True):
            if spot is None:
                self.left_out += 1
                continue
            x, y = room.data([spot.centre])[0]
            gid = self.ids.new("name", name)
            look: dict[str, Any] = {"fontsize": style.SMALL_PT, "ha": "center", "va": "center", "parse_math": False}
            self.ax.text(x, y, name, zorder=Z_WORDS, gid=gid, **look)
            # a row of markers is wide: near its end no line is needed
            off = min(shapely.distance(spot.shape, room.markers[k]) for k in rows)
            if spot.target is not None and off > _LEADER_FROM_PT * room.pt:
                ends = room.data([edge_towards(spot.centre, spot.shape, spot.target), spot.target])
                leader = self.ids.new("leader", gid)
                self.ax.add_line(Line2D(*ends.T, color=style.INK, lw=0.5, zorder=Z_LEADER, gid=leader))


def _near(centres: np.ndarray, rows: list[int], reach: float) -> list[list[int]]:
    """Rows in groups around their first: samples of one station at other places get a name of their own."""
    groups: list[list[int]] = []
    for row in rows:
        home = next((group for group in groups if np.hypot(*(centres[row] - centres[group[0]])) <= reach), None)
        if home is None:
            groups.append([row])
        else:
            home.append(row)
    return groups


def _marker(spot: np.ndarray, mark: Symbol, gid: str | None) -> Line2D:
    size = _MARKER_PT * _SIZES.get(mark.marker, 1.0)
    look: dict[str, Any] = {"ms": size, "mfc": mark.fill or "white", "mec": style.INK, "mew": _EDGE_PT}
    return Line2D([spot[0]], [spot[1]], ls="", marker=mark.marker, zorder=Z_POINT, gid=gid, **look)


def _handles(shown: pd.DataFrame, marks: dict[str, Symbol]) -> list[Line2D]:
    """Keys with how many samples each has."""
    counts = shown["category"].value_counts()
    found = []
    for name, mark in marks.items():
        handle = _marker(np.zeros(2), mark, None)
        handle.set_label(f"{mark.text} ({counts[name]})")
        found.append(handle)
    return found
