"""The ground of a plan map: true metres, window, axis names from the reference system, scale bar, north."""

from typing import Any

import numpy as np
from matplotlib.axes import Axes
from matplotlib.lines import Line2D
from matplotlib.patches import Polygon, Rectangle
from matplotlib.ticker import MaxNLocator
from pyproj import CRS, Geod, Transformer

from gley.drawing.layers import Z_WORDS
from gley.drawing.room import Room, Words
from gley.drawing.style import INK, SMALL_PT

_PAD, _PAD_BELOW = 0.09, 0.17
_LEAST_M, _LEAST_SHARE = 40.0, 0.3
_UNITS = {"metre": "m", "degree": "°", "foot": "ft", "US survey foot": "US ft", "kilometre": "km"}


class Ground:
    """What a reference system and the places (n, 2) make of a map.

    `metres` are true metres per axis unit, across and up, at the middle of the places: geodesic lengths on the system's
    own ellipsoid, so that degrees, feet and stretched projections come out right.
    """

    def __init__(self, crs: CRS | None, xy: np.ndarray) -> None:
        self.crs = CRS.from_user_input(crs) if crs is not None else None
        self.xy = xy
        low, high = (xy.min(0), xy.max(0)) if len(xy) else (np.zeros(2), np.ones(2))
        self.low, self.high, self.middle = low, high, (low + high) / 2
        self.metres = self._metres()
        self.aspect = self.metres[1] / self.metres[0]
        self.names = self._names()

    def _metres(self) -> np.ndarray:
        if self.crs is None:
            return np.ones(2)
        geodetic = self.crs.geodetic_crs
        if geodetic is None:
            return np.full(2, float(self.crs.axis_info[0].unit_conversion_factor or 1.0))
        there = Transformer.from_crs(self.crs, geodetic, always_xy=True)
        geod = self.crs.get_geod() or Geod(ellps="WGS84")
        factor = self.crs.axis_info[0].unit_conversion_factor
        step = 1e-4 if self.crs.is_geographic else 10.0 / (factor or 1.0)
        found = []
        for direction in np.eye(2):
            ends = np.array([self.middle - direction * step, self.middle + direction * step])
            longitude, latitude = there.transform(ends[:, 0], ends[:, 1])
            *_, length = geod.inv(longitude[0], latitude[0], longitude[1], latitude[1])
            found.append(length / (2 * step))
        return np.array(found) if np.isfinite(found).all() and min(found) > 0 else np.ones(2)

    def _names(self) -> tuple[str, str]:
        """Axis labels, across and up: names and units of the system's axes, its own name and code beside the first."""
        if self.crs is None:
            return "x · no reference system", "y"
        across, up = "x", "y"
        for axis in self.crs.axis_info[:2]:
            unit = _UNITS.get(axis.unit_name, axis.unit_name)
            name = axis.name.replace("Geodetic ", "").replace("Geographic ", "").capitalize()
            if axis.direction.lower() in ("east", "west"):
                across = f"{name} ({unit})"
            elif axis.direction.lower() in ("north", "south"):
                up = f"{name} ({unit})"
        authority = self.crs.to_authority()
        code = f" ({':'.join(authority)})" if authority else ""
        return f"{across} · {self.crs.name}{code}", up

    def shape(self) -> float:
        """Height of the places by their width on the ground, between 0.55 and 0.95."""
        width, height = self._size()
        return float(np.clip(height / width, 0.55, 0.95))

    def _size(self) -> np.ndarray:
        """Width and height to show, m: the places with air; a line of places or a single one gets some breadth too."""
        size = (self.high - self.low) * self.metres
        return np.maximum(size, max(_LEAST_SHARE * size.max(), _LEAST_M)) * [1 + 2 * _PAD, 1 + _PAD + _PAD_BELOW]

    def window(self, shape: float) -> tuple[float, float, float, float]:
        """(x0, y0, x1, y1) round the places, with air, in a plot of that height by width; more below, for the scale."""
        width, height = self._size()
        width, height = max(width, height / shape), max(height, width * shape)
        half = np.array([width, height]) / 2 / self.metres
        shift = np.array([0.0, height * (_PAD_BELOW - _PAD) / 2]) / self.metres
        low, high = self.middle - half - shift, self.middle + half - shift
        return float(low[0]), float(low[1]), float(high[0]), float(high[1])

    def ticks(self, axis: int, low: float, high: float) -> tuple[np.ndarray, list[str]]:
        """Places and texts of an axis' ticks: full coordinates, as many decimals as the step needs."""
        values = np.asarray(MaxNLocator(6 if axis == 0 else 5, steps=[1, 2, 5, 10]).tick_values(low, high), float)
        # none near the corners, where the two axes' texts would meet
        air = (high - low) * (0.01 if axis == 0 else 0.05)
        values = values[(values >= low + air) & (values <= high - air)]
        step = float(np.diff(values).min()) if len(values) > 1 else 1.0
        decimals = max(0, int(-np.floor(np.log10(step) + 1e-9)))
        return values, [f"{value:.{decimals}f}".replace("-", "−") for value in values]


def nice_length(most_m: float) -> float:
    """The longest of 1, 2, 5 × 10ⁿ m that isn't above a length in m."""
    power = 10.0 ** np.floor(np.log10(most_m))
    return float(max(step * power for step in (1.0, 2.0, 5.0) if step * power <= most_m * (1 + 1e-9)))


def draw_scale_bar(room: Room, ground: Ground) -> float:
    """A bar of two halves with its length in metres at the lower left; returns that length in m."""
    ax = room.ax
    left, right = ax.get_xlim()
    length = nice_length(0.28 * (right - left) * ground.metres[0])
    x0, y0, *_ = room.frame
    (x, y), (_, top) = room.data([(x0 + 8 * room.pt, y0 + 7 * room.pt), (x0, y0 + 10 * room.pt)])
    wide = length / ground.metres[0]
    look: dict[str, Any] = {"ec": INK, "lw": 0.6, "zorder": Z_WORDS}
    for k, fill in enumerate((INK, "white")):
        ax.add_patch(Rectangle((x + k * wide / 2, y), wide / 2, top - y, fc=fill, gid=f"scale-{k}", **look))
    text = f"{length:g} m" if length < 1000 else f"{length / 1000:g} km"
    for place, word in ((x, "0"), (x + wide, text)):
        above = room.data([(0, y0 + 12 * room.pt)])[0, 1]
        gid = "scale-zero" if word == "0" else "scale-length"
        ax.text(place, above, word, fontsize=SMALL_PT, ha="center", va="bottom", zorder=Z_WORDS, gid=gid)
    end = room.pixels([(x + wide, top)])[0, 0] + room.size(Words(text, SMALL_PT))[0] / 2
    room.block(x0, y0, end, y0 + 24 * room.pt)
    return length


def draw_north(room: Room) -> None:
    """An arrow to the top at the lower right, with its N."""
    x1, y0 = room.frame[2], room.frame[1]
    middle, foot = x1 - 12 * room.pt, y0 + 5 * room.pt
    for side, fill in ((-1, INK), (1, "white")):
        corners = [(middle, foot + 18 * room.pt), (middle + side * 4 * room.pt, foot), (middle, foot + 4 * room.pt)]
        room.ax.add_patch(Polygon(room.data(corners), fc=fill, ec=INK, lw=0.6, zorder=Z_WORDS, gid=f"north-{side:+d}"))
    x, y = room.data([(middle, foot + 20 * room.pt)])[0]
    room.ax.text(x, y, "N", fontsize=SMALL_PT + 1, weight="bold", ha="center", va="bottom", zorder=Z_WORDS, gid="north")
    room.block(middle - 7 * room.pt, y0, x1, foot + 32 * room.pt)


def draw_true_places(ax: Axes, xy: np.ndarray, gid: str) -> None:
    """Small crosses at places whose markers had to move aside."""
    ax.add_line(Line2D(*xy.T, ls="", marker="+", ms=4.0, mew=0.6, color=INK, zorder=Z_WORDS - 2.5, gid=gid))
