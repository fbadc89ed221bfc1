"""Samples on a chart: markers filled by their own field, bars for both coordinates, and who stays outside."""

from dataclasses import dataclass
from typing import Any

import numpy as np
import pandas as pd
from matplotlib.axes import Axes
from matplotlib.collections import LineCollection
from matplotlib.lines import Line2D

from gley.drawing.captions import names_text, plural
from gley.drawing.layers import Z_BAR, Z_POINT, Ids
from gley.drawing.style import INK, field_colour, field_state

MARKERS = {"dissolved": ("o", 5.4), "solid": ("s", 5.0), "": ("D", 4.4)}
"""Shape and size in pt by kind of field; a sample without a field is a white diamond."""

_EDGE_PT = 0.9
_SINGLE = 300
_KEYS = {
    "dissolved": "sample: dissolved form",
    "solid": "sample: oversaturated with a solid",
    "": "sample: not assigned",
}


@dataclass(frozen=True)
class Points:
    """The samples of a chart: `shown` on the axes, with `label`; `outside` and `incomplete` are names of samples."""

    shown: pd.DataFrame
    outside: tuple[str, ...]
    incomplete: tuple[str, ...]

    @property
    def radius_pt(self) -> float:
        """Half the width of the largest marker with its edge, pt."""
        return (max(size for _, size in MARKERS.values()) + _EDGE_PT) / 2

    def states(self) -> set[tuple[str, str, str]]:
        """Element, oxidation state and kind of the fields that markers are filled for."""
        found = {field_state(name) for name in self.shown["field"].unique()}
        return {state for state in found if state is not None}

    def handles(self) -> list[Line2D]:
        """Keys for the marker shapes in use."""
        used = set(self.shown["kind"])
        return [
            Line2D([], [], ls="", marker=shape, ms=size, mfc="white", mec=INK, mew=_EDGE_PT, label=_KEYS[kind])
            for kind, (shape, size) in MARKERS.items()
            if kind in used
        ]

    def sentence(self, unnamed: int) -> str:
        """How many are shown and how many not, and what bars and filling mean."""
        parts = [f"{plural(len(self.shown), 'sample')} shown"]
        outside = f", {len(self.outside)} outside the axes{names_text(self.outside)}"
        parts.append(outside)
        if self.incomplete:
            parts.append(f", {len(self.incomplete)} without pH or Eh{names_text(self.incomplete)}")
        if unnamed:
            parts.append(f", {unnamed} left unnamed for want of room")
        meaning = " Bars: ± 1 standard deviation; filling: the field in the sample's own water."
        return "".join(parts) + "." + (meaning if len(self.shown) else "")


def draw_points(ax: Axes, frame: pd.DataFrame, window: tuple[float, float, float, float], ids: Ids) -> Points:
    """Draw the samples within a window (pH, mV); see `EphChart.points` for the columns."""
    table = frame.reset_index(drop=True)
    pH, Eh = table["pH"].to_numpy(float), table["Eh_mV"].to_numpy(float)
    known = np.isfinite(pH) & np.isfinite(Eh)
    inside = known & (pH >= window[0]) & (pH <= window[1]) & (Eh >= window[2]) & (Eh <= window[3])
    shown = table[inside].copy()
    shown["kind"] = shown["kind"].fillna("").where(shown["kind"].isin(list(MARKERS)), "")
    shown["field"] = shown["field"].fillna("")
    shown["label"] = _labels(shown)
    _bars(ax, shown, ids)
    groups = [shown.iloc[[k]] for k in range(len(shown))]
    if len(shown) > _SINGLE:
        groups = [part for _, part in shown.groupby(["field", "kind"])]
    for group in groups:
        _markers(ax, group, ids, single=len(shown) <= _SINGLE)
    names = table["sample"].astype(str).to_numpy()
    return Points(shown, tuple(names[known & ~inside]), tuple(names[~known]))


def _labels(shown: pd.DataFrame) -> list[str]:
    """The station where it tells the points apart, else the sample."""
    stations = shown["station"].fillna("").astype(str)
    own = stations if (stations != "").all() and stations.is_unique else shown["sample"].astype(str)
    return list(own)


def _markers(ax: Axes, group: pd.DataFrame, ids: Ids, *, single: bool) -> None:
    first = group.iloc[0]
    shape, size = MARKERS[first["kind"]]
    fill = field_colour(first["field"]) or "white"
    gid = ids.new("point", str(first["sample"])) if single else ids.new("points", first["field"] or "not assigned")
    look: dict[str, Any] = {"ms": size, "mfc": fill, "mec": INK, "mew": _EDGE_PT, "zorder": Z_POINT}
    line = Line2D(group["pH"], group["Eh_mV"], ls="", marker=shape, gid=gid, **look)
    line.set_clip_on(False)
    ax.add_artist(line)
    line.set_clip_path(None)


def _bars(ax: Axes, shown: pd.DataFrame, ids: Ids) -> None:
    for name, along, across in (("pH", "pH", "Eh_mV"), ("Eh", "Eh_mV", "pH")):
        sd = shown["pH_sd" if name == "pH" else "Eh_sd_mV"].to_numpy(float)
        keep = np.isfinite(sd) & (sd > 0)
        if not keep.any():
            continue
        middle, other, sd = shown[along].to_numpy(float)[keep], shown[across].to_numpy(float)[keep], sd[keep]
        ends = np.stack([np.column_stack([middle - sd, other]), np.column_stack([middle + sd, other])], axis=1)
        ends = ends if name == "pH" else ends[..., ::-1]
        bars = LineCollection(list(ends), colors=INK, lw=0.6, alpha=0.75, zorder=Z_BAR, gid=ids.new("bars", name))
        ax.add_collection(bars, autolim=False)


def bar_ends(shown: pd.DataFrame) -> list[np.ndarray]:
    """The bars of all samples as lines (2, 2) in pH and mV."""
    found = []
    for pH, Eh, pH_sd, Eh_sd in shown[["pH", "Eh_mV", "pH_sd", "Eh_sd_mV"]].to_numpy(float):
        for wide, high in ((pH_sd, 0.0), (0.0, Eh_sd)):
            if np.isfinite(wide + high):
                found.append(np.array([[pH - wide, Eh - high], [pH + wide, Eh + high]]))
    return found
