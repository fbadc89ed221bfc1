"""The E-pH chart of one element with the samples of a survey on it."""

from collections.abc import Sequence
from pathlib import Path

import numpy as np
import pandas as pd
import shapely
from matplotlib.axes import Axes
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.figure import Figure
from matplotlib.lines import Line2D
from matplotlib.patches import Patch
from matplotlib.ticker import MaxNLocator, MultipleLocator

from gley.constants import nernst_slope_mV
from gley.drawing import layers, style
from gley.drawing.captions import Under, conditions_line, fan_line, made_by
from gley.drawing.naming import Names
from gley.drawing.points import Points, draw_points
from gley.drawing.room import figure_of
from gley.drawing.save import save_figure
from gley.stability import Chart

_LEFT, _RIGHT, _TOP, _HEIGHT = 0.64, 0.56, 0.34, 4.15
"""Margins and height of the plot in a figure of its own, inches."""

_UNDER_PT = 33.0
_CAPTION_PT = 72.0 * (style.WIDTH_MM / 25.4 - _LEFT - 0.12)
_LAYOUT_DPI = 144


class EphChart:
    """An E-pH chart: pH across, E in mV on the hydrogen scale at the left, pe at the right.

    Parameters
    ----------
    ax : Axes, optional
        Where to draw; a figure of report width is made without it.
    window : tuple, optional
        (pH_min, pH_max, E_min_V, E_max_V); the chart's own without it.

    Notes
    -----
    Call `draw` first, then what is wanted of `fan`, `over`, `points`, `caption`, then `save` (or `finish`): names are
    placed last, when all points are known.
    """

    def __init__(self, ax: Axes | None = None, window: tuple[float, float, float, float] | None = None) -> None:
        self._own = ax is None
        if ax is None:
            with style.look():
                figure = Figure(figsize=(style.WIDTH_MM / 25.4, 6.0), dpi=_LAYOUT_DPI)
                FigureCanvasAgg(figure)
                ax = figure.add_axes((0.1, 0.3, 0.8, 0.6))
        self.ax: Axes = ax
        self._window_V = window
        self._chart: Chart | None = None
        self._over: Chart | None = None
        self._fan: tuple[Chart, Chart, bool] | None = None
        self._percentiles = True
        self._points: Points | None = None
        self._lines: list[str] | None = [] if self._own else None
        self._title = ""
        self._finished = False
        self.ids = layers.Ids()
        self.names: Names | None = None

    @property
    def figure(self) -> Figure:
        """The figure the chart is on."""
        return figure_of(self.ax)

    def draw(self, chart: Chart, title: str = "") -> "EphChart":
        """Fields, boundaries, water's limits and axes; the title is the element's name unless one is given."""
        if self._chart is not None:
            message = "a chart is already drawn here; lay a second element over it with `over`"
            raise RuntimeError(message)
        self._chart = chart
        self._title = title or style.element_name(chart.element)
        self._titled = bool(title)
        low_pH, high_pH, low, high = self._window_V or chart.window
        self.window = (low_pH, high_pH, 1000.0 * low, 1000.0 * high)
        self._frame = shapely.box(low_pH, self.window[2], high_pH, self.window[3])
        with style.look():
            self._axes(chart)
            self._shapes = {item.name: layers.field_shape(item, self._frame) for item in chart.fields}
            for item in chart.fields:
                gid = self.ids.new("field", item.name)
                layers.draw_field(self.ax, chart.element, item, self._shapes[item.name], gid)
            layers.draw_lines(self.ax, chart.boundaries, self.ids)
            self._water = layers.draw_water(self.ax, chart, self.window, self.ids)
        return self

    def over(self, chart: Chart) -> "EphChart":
        """A second element's lines over the first, its field names boxed."""
        self._ready()
        self._over = chart
        if not self._titled:
            self._title = f"{style.element_name(chart.element)} over {self._title.lower()}"
        with style.look():
            self._set_title()
            layers.draw_lines(self.ax, chart.boundaries, self.ids, over=True)
        return self

    def fan(self, low_chart: Chart, high_chart: Chart, percentiles: bool = True) -> "EphChart":
        """Shade how far lines move between two charts: at the P10 and P90 of a survey's totals, or as stated."""
        self._ready()
        with style.look():
            seen = layers.draw_fan(self.ax, low_chart, high_chart, self._frame, self.ids)
        self._fan = (low_chart, high_chart, seen)
        self._percentiles = percentiles
        return self

    def points(self, frame: pd.DataFrame) -> "EphChart":
        """Samples with bars of one standard deviation, filled by the field of their own water.

        Parameters
        ----------
        frame : DataFrame
            `sample`, `station`, `pH`, `pH_sd`, `Eh_mV`, `Eh_sd_mV`, `field`, `kind` (dissolved | solid | ""). Samples
            without pH or Eh and those outside the axes aren't drawn; the caption counts them.
        """
        self._ready()
        with style.look():
            self._points = draw_points(self.ax, frame, self.window, self.ids)
        return self

    def caption(self, lines: Sequence[str] = ()) -> "EphChart":
        """Lines under the plot, after those on conditions, fan and points that stand there in any case."""
        self._ready()
        self._lines = [*(self._lines or []), *lines]
        return self

    def finish(self) -> "EphChart":
        """Set legend and caption, then place all names. `save` does it; call it to go on with the axes yourself."""
        if self._chart is None:
            message = "nothing is drawn yet: call `draw` first"
            raise RuntimeError(message)
        if not self._finished:
            self._finished = True
            with style.look():
                if self._own:
                    self._place(style.WIDTH_MM / 25.4, 9.0)
                under = Under(self.ax, _UNDER_PT, width_pt=_CAPTION_PT if self._own else None)
                if self._lines is not None:
                    under.legend(self._handles())
                    under.caption(self._caption_lines())
                if self._own:
                    self._place(style.WIDTH_MM / 25.4, _TOP + _HEIGHT + under.depth / 72.0 + 0.04)
                self.names = Names(self.ax, self.ids)
                self.names.place(self._chart, self._shapes, self._water, self.window, self._over, self._points)
        return self

    def save(self, stem: str | Path, dpi: int = 300) -> list[Path]:
        """Write `<stem>.svg` and `<stem>.png`, the same bytes for the same input; returns the two paths."""
        self.finish()
        with style.look():
            words = " ".join(self._caption_lines())
        return save_figure(self.figure, stem, f"{self._title}: E-pH chart", words, dpi, tight=not self._own)

    def _ready(self) -> None:
        if self._chart is None or self._finished:
            state = "already laid out" if self._finished else "empty: call `draw` first"
            message = f"the chart is {state}"
            raise RuntimeError(message)

    def _place(self, width: float, height: float) -> None:
        """Give the figure its size in inches and the plot its own inside it."""
        self.figure.set_size_inches(width, height)
        across, up = width - _LEFT - _RIGHT, _HEIGHT
        self.ax.set_position((_LEFT / width, (height - _TOP - up) / height, across / width, up / height))

    def _axes(self, chart: Chart) -> None:
        ax, (left, right, low, high) = self.ax, self.window
        ax.set(xlim=(left, right), ylim=(low, high), xlabel="pH")
        ax.set_ylabel("Eh (mV, standard hydrogen electrode)")
        ax.set_axisbelow(False)
        ax.xaxis.set_major_locator(MultipleLocator(1.0 if right - left > 4 else 0.5))
        ax.yaxis.set_major_locator(MaxNLocator(8, steps=[1, 2, 5, 10]))
        per_pe = float(nernst_slope_mV(chart.conditions.temperature_C))
        pe = ax.secondary_yaxis(
            "right", functions=(lambda E: np.asarray(E) / per_pe, lambda value: np.asarray(value) * per_pe)
        )
        pe.set_ylabel(f"pe at {chart.conditions.temperature_C:g} °C")
        pe.yaxis.set_major_locator(MaxNLocator(8, integer=True, steps=[1, 2, 5, 10]))
        pe.set_gid("axis-pe")
        for axis in (ax, pe):
            axis.tick_params(length=3.0, width=0.7)
        self._set_title()

    def _set_title(self) -> None:
        self.ax.set_title(self._title, loc="left", fontsize=style.TITLE_PT, fontweight="bold", pad=5.0)

    def _caption_lines(self) -> list[str]:
        assert self._chart is not None
        lines = [conditions_line(self._chart)]
        if self._over is not None:
            lines.append(f"Over it, boxed: {conditions_line(self._over)}")
        if self._fan is not None:
            low, high, seen = self._fan
            lines.append(fan_line(low, high, seen=seen, percentiles=self._percentiles))
        if self._points is not None:
            lines.append(self._points.sentence(self.names.left_out if self.names else 0))
        return [*lines, *(self._lines or [made_by()])]

    def _handles(self) -> list:
        """Keys for the tints in sight, the marker shapes, the fan and the second element's lines."""
        assert self._chart is not None
        states = {
            (self._chart.element, item.oxidation_state, item.kind)
            for item in self._chart.fields
            if layers.polygons_of(self._shapes[item.name])
        }
        if self._points is not None:
            states |= self._points.states()
        found: list = [
            Patch(fc=colour, ec=style.LINE, lw=0.4, label=label) for colour, label in style.key_of_tints(states)
        ]
        if self._fan is not None and self._fan[2]:
            label = "P10–P90 of the total" if self._percentiles else "lines move here"
            found.append(Patch(fc=(0, 0, 0, 0.10), ec=(0, 0, 0, 0.45), lw=0.4, label=label))
        if self._over is not None:
            found.append(Line2D([], [], color=style.OVER, lw=1.5, label=f"lines of {self._over.element}"))
        return found + (self._points.handles() if self._points is not None else [])
