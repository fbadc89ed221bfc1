"""What stands under a drawing: legend and caption, wrapped to the width of the axes, and how high they are."""

from collections.abc import Sequence

from matplotlib.axes import Axes
from matplotlib.legend import Legend
from matplotlib.text import Text
from matplotlib.transforms import ScaledTranslation

from gley import __version__
from gley.drawing.room import figure_of
from gley.drawing.style import INK, SMALL_PT, amount_text, state_text
from gley.stability import Chart

_LINE_SPACING = 1.35


def conditions_line(chart: Chart) -> str:
    """`12 °C · total Fe 10 µmol/L (0.56 mg/L) · I 0.01 mol/L · C 5.0 mmol/L · fresh solids`."""
    stated = chart.conditions
    parts = [
        f"{stated.temperature_C:g}\u00a0°C",
        f"total\u00a0{chart.element}\u00a0{amount_text(stated.total_mol_L, chart.element)}",
        f"I\u00a0{stated.ionic_strength_M:.2g}\u00a0mol/L",
    ]
    for name, total in stated.ligands_mol_L.items():
        tied = ", tied by Eh" if name == "S" and stated.sulfur == "tied" else ""
        parts.append(f"{state_text(name)}\u00a0{amount_text(total)}{tied}")
    if not stated.ligands_mol_L:
        parts.append("no ligands")
    parts.append("no solids" if stated.solids == "none" else f"{stated.solids}\u00a0solids")
    parts += [f"with {name}" for name in stated.with_names] + [f"without {name}" for name in stated.without_names]
    return " · ".join(parts)


def fan_line(low: Chart, high: Chart, *, seen: bool, percentiles: bool) -> str:
    """What the shaded bands mean: between two percentiles of a survey's totals, or two stated conditions."""
    element = low.element
    totals = [amount_text(item.conditions.total_mol_L, element) for item in (low, high)]
    warmth = [f"{item.conditions.temperature_C:g}\u00a0°C" for item in (low, high)]
    if percentiles:
        ends = f"the P10 and P90 of total {element}, {totals[0]} and {totals[1]}"
    elif totals[0] == totals[1]:
        ends = f"{warmth[0]} and {warmth[1]}"
    else:
        ends = f"{totals[0]} at {warmth[0]} and {totals[1]} at {warmth[1]}"
    return f"Shaded: the field changes between {ends}." if seen else f"No line moves between {ends}."


def made_by() -> str:
    """The data version: constants travel with the package."""
    return f"Constants: gley\u00a0{__version__}."


def names_text(names: Sequence[str], most: int = 4) -> str:
    """` (A, B, C …)`: a few names in brackets, nothing for none."""
    if not names:
        return ""
    shown = ", ".join(name.replace("$", r"\$") for name in names[:most])
    return f" ({shown}{' …' if len(names) > most else ''})"


def plural(count: int, word: str) -> str:
    """`1 sample`, `3 samples`."""
    return f"{count} {word}" if count == 1 else f"{count} {word}s"


class Under:
    """The strip under an axes: a legend, then a caption. Heights in points from the lower edge of the axes."""

    def __init__(self, ax: Axes, start_pt: float, left_pt: float = 0.0, width_pt: float | None = None) -> None:
        self.ax, self.depth, self.left = ax, start_pt, left_pt
        self.figure = figure_of(ax)
        self.px = self.figure.dpi / 72.0
        self.width = width_pt if width_pt is not None else ax.get_window_extent().width / self.px - left_pt

    def _anchor(self):
        shift = ScaledTranslation(self.left / 72.0, -self.depth / 72.0, self.figure.dpi_scale_trans)
        return self.ax.transAxes + shift

    def legend(self, handles: Sequence, gid: str = "legend") -> Legend | None:
        """A legend in as many columns as fit; None without handles."""
        if not handles:
            return None
        labels = [handle.get_label() for handle in handles]
        for columns in range(len(handles), 0, -1):
            made = Legend(
                self.ax, handles, labels, loc="upper left", bbox_to_anchor=(0.0, 0.0), ncols=columns,
                bbox_transform=self._anchor(), fontsize=SMALL_PT, frameon=False, borderpad=0.0, borderaxespad=0.0,
                handlelength=1.5, handleheight=0.9, handletextpad=0.5, columnspacing=1.4, labelspacing=0.45,
            )  # fmt: skip
            made.set_zorder(20)
            made.set_gid(gid)
            made.set_clip_on(False)
            extent = made.get_window_extent()
            if extent.width <= self.width * self.px or columns == 1:
                break
        self.ax.add_artist(made)
        made.set_clip_path(None)
        self.depth += extent.height / self.px + 5.0
        return made

    def caption(self, lines: Sequence[str], gid: str = "caption") -> Text | None:
        """Lines of text wrapped to the width; None without any."""
        rows = [row for line in lines for row in self.wrap(line)]
        if not rows:
            return None
        made = self.ax.text(
            0.0, 0.0, "\n".join(rows), transform=self._anchor(), fontsize=SMALL_PT, va="top", ha="left", color=INK,
            linespacing=_LINE_SPACING, gid=gid, clip_on=False, zorder=20,
        )  # fmt: skip
        self.depth += made.get_window_extent().height / self.px + 4.0
        return made

    def wrap(self, line: str) -> list[str]:
        """One line broken at spaces so that each part fits; formulas in `$…$` stay whole."""
        rows: list[str] = []
        for word in _words(line):
            longer = f"{rows[-1]} {word}" if rows else word
            if rows and self._wide(longer):
                rows.append(word)
            else:
                rows[-1:] = [longer]
        return rows

    def _wide(self, text: str) -> bool:
        probe = Text(0, 0, text, fontsize=SMALL_PT)
        probe.set_figure(self.figure)
        return probe.get_window_extent().width > self.width * self.px


def _words(line: str) -> list[str]:
    """Split at plain spaces outside of `$…$`."""
    words: list[str] = []
    for part in line.split(" "):
        if words and words[-1].count("$") % 2:
            words[-1] += f" {part}"
        elif part:
            words.append(part)
    return words
