"""The plan map: where the samples lie, with their field or redox process by colour, shape and legend."""

from collections.abc import Sequence
from pathlib import Path

import geopandas
import numpy as np
import pandas as pd
from matplotlib.axes import Axes
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.figure import Figure
from matplotlib.lines import Line2D
from matplotlib.ticker import FuncFormatter, MaxNLocator

from gley.drawing import style
from gley.drawing.captions import Under, names_text, plural
from gley.drawing.ground import Ground, draw_north, draw_scale_bar
from gley.drawing.layers import Z_LEADER, Z_POINT, Z_WORDS, Ids
from gley.drawing.pointlabels import label_points
from gley.drawing.room import Room
from gley.drawing.save import save_figure
from gley.drawing.symbols import Symbol, symbols

_LEFT, _RIGHT, _TOP, _HEIGHT = 0.58, 0.16, 0.34, 4.9
_UNDER_PT = 33.0
_CAPTION_PT = 72.0 * (style.WIDTH_MM / 25.4 - _LEFT - 0.12)
_LAYOUT_DPI = 144
_MOST_LABELS = 60
_EDGE_PT = 0.8


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
                figure = Figure(figsize=(style.WIDTH_MM / 25.4, 7.0), dpi=_LAYOUT_DPI)
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
        return self.ax.get_figure(root=True)  # type: ignore[return-value]

    def draw(
        self, places: geopandas.GeoDataFrame, category: str, title: str = "", labels: str | None = "station",
        lines: Sequence[str] = (),
    ) -> "SiteMap":  # fmt: skip
        """Draw all samples that have a place.

        Parameters
        ----------
        places : GeoDataFrame
            One row per sample: `sample`, point geometry (None where unknown), the columns named below.
        category : str
            Column that colour and shape follow: fields or redox processes; "" is drawn hollow.
        title : str
            Heading.
        labels : str or None
            Column to name the places by; a missing entry falls back to the sample. None = no names.
        lines : sequence of str
            Further lines of the caption.
        """
        if self._drawn:
            message = "the map is already drawn"
            raise RuntimeError(message)
        self._drawn, self._title = True, title
        table = pd.DataFrame(places.drop(columns=places.geometry.name))
        table["category"] = table[category].fillna("").astype(str)
        has_place = ~(places.geometry.isna() | places.geometry.is_empty)
        xy = np.column_stack([places.geometry[has_place].x, places.geometry[has_place].y])
        shown, without = table[has_place.to_numpy()].reset_index(drop=True), table[~has_place.to_numpy()]
        ground = Ground(places.crs, xy)
        with style.look():
            self._axes(ground, title)
            marks = symbols(shown["category"])
            crowded = _crowded(shown["category"], xy)
            self._words = " ".join(self._under(shown, without, ground, marks, crowded, lines))
            self._content(ground, shown, xy, marks, labels)
        return self

    def save(self, stem: str | Path, dpi: int = 300) -> list[Path]:
        """Write `<stem>.svg` and `<stem>.png`, the same bytes for the same input; returns the two paths."""
        title = self._title or "Site map"
        return save_figure(self.figure, stem, title, self._words, dpi, tight=not self._own)

    def _axes(self, ground: Ground, title: str) -> None:
        ax = self.ax
        x0, y0, x1, y1 = ground.window(self._plot_shape() if self._own else None)
        ax.set(xlim=(x0, x1), ylim=(y0, y1), xlabel=ground.names[0], ylabel=ground.names[1])
        ax.set_aspect(ground.aspect, adjustable="box" if self._own else "datalim")
        for axis in (ax.xaxis, ax.yaxis):
            axis.set_major_locator(MaxNLocator(5, steps=[1, 2, 5, 10]))
            axis.set_major_formatter(FuncFormatter(ground.tick_text))
        ax.tick_params(length=3.0, width=0.7)
        for label in ax.get_yticklabels():
            label.set(rotation=90, va="center")
        ax.set_facecolor("#fbfaf7")
        ax.grid(color="#dcd7cf", lw=0.4, zorder=0)
        ax.set_axisbelow(True)
        ax.set_title(title, loc="left", fontsize=style.TITLE_PT, fontweight="bold", pad=5.0)

    @staticmethod
    def _plot_shape() -> float:
        return _HEIGHT / (style.WIDTH_MM / 25.4 - _LEFT - _RIGHT)
