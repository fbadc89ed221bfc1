"""Figures to files, the same bytes for the same drawing: no dates, no random ids."""

from pathlib import Path

from matplotlib.figure import Figure

from gley import __version__
from gley.drawing.style import look


def save_figure(figure: Figure, stem: str | Path, title: str, description: str, dpi: int, *, tight: bool) -> list[Path]:
    """Write `<stem>.svg` and `<stem>.png`.

    Parameters
    ----------
    figure : Figure
        The drawing.
    stem : path
        Without suffix; dots in it stay.
    title, description : str
        Kept in both files as metadata.
    dpi : int
        Resolution of the PNG.
    tight : bool
        Cut to what is drawn; otherwise the figure's own size.

    Returns
    -------
    list of Path
        The two files.
    """
    stem = Path(stem)
    made = [stem.with_name(f"{stem.name}.{suffix}") for suffix in ("svg", "png")]
    box = "tight" if tight else None
    svg = {"Date": None, "Creator": f"gley {__version__}", "Title": title, "Description": description}
    png = {"Software": None, "Title": title, "Description": description}
    with look():
        figure.savefig(made[0], format="svg", bbox_inches=box, metadata=svg)
        figure.savefig(made[1], format="png", bbox_inches=box, metadata=png, dpi=dpi)
    return made
