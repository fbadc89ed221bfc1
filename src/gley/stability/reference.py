"""The sample a survey's chart is drawn at: the one nearest the middle of its group, so the chart is a real water."""

from collections.abc import Mapping

import numpy as np
import pandas as pd

from gley.settings import Settings
from gley.stability.chart_types import Conditions
from gley.stability.data import COMPANION, FIXED, SULFUR
from gley.stability.solve import Choice
from gley.stability.waters import Waters, waters

_NAMES = {**{channel: short for channel, (short, _) in FIXED.items()}, **{channel: channel for channel in SULFUR}}


def reference(
    samples: pd.DataFrame, element: str, settings: Settings, among: np.ndarray
) -> tuple[int, Conditions] | None:
    """The median sample of a group and the conditions it gives a chart.

    Parameters
    ----------
    samples : DataFrame
        As for `assign`.
    element : str
        Whose chart it is.
    settings : Settings
        Solid set and assumptions.
    among : ndarray of bool (n,)
        Which samples may be chosen.

    Returns
    -------
    (row, Conditions) or None
        Position of the sample nearest the medians of total, temperature, ionic strength and ligand totals (each scaled
        by its spread), and its water with the temperature rounded to 1 °C; None when no sample may be chosen.
    """
    stated = settings.stability
    ready = waters(samples, (element,), stated)
    total = ready.totals[element]
    rows = np.flatnonzero(among & np.isfinite(total) & (total > 0))
    if not len(rows):
        return None
    detected = rows[~ready.limited[element][rows]]
    rows = detected if len(detected) else rows
    target = Choice(stated.solids, tuple(stated.with_names), tuple(stated.without_names)).system(element)
    row = int(rows[_distance(ready, element, target.channels, rows).argmin()])
    return row, Conditions(
        temperature_C=float(round(ready.temperature_C[row])), ionic_strength_M=float(ready.ionic_strength_M[row]),
        total_mol_L=float(total[row]), ligands_mol_L=_ligands(ready, target.channels, row), solids=stated.solids,
        with_names=tuple(stated.with_names), without_names=tuple(stated.without_names),
        sulfur="tied" if ready.tied[row] else "measured",
    )  # fmt: skip


def _distance(ready: Waters, element: str, channels: tuple[str, ...], rows: np.ndarray) -> np.ndarray:
    """Sum of distances from the medians in units of the interquartile range; an unknown ligand counts as one range."""
    with np.errstate(divide="ignore", invalid="ignore"):
        columns = [np.log10(ready.totals[element]), ready.temperature_C, ready.ionic_strength_M]
        columns += [np.log10(ready.ligands[channel]) for channel in channels if channel in ready.ligands]
    distance = np.zeros(len(rows))
    for column in columns:
        values = np.where(np.isfinite(column[rows]), column[rows], np.nan)
        if np.isnan(values).all():
            continue
        low, middle, high = np.nanpercentile(values, [25, 50, 75])
        spread = high - low if high > low else 1.0
        distance += np.nan_to_num(np.abs(values - middle) / spread, nan=1.0)
    return distance


def _ligands(ready: Waters, channels: tuple[str, ...], row: int) -> Mapping[str, float]:
    """Ligand totals of one sample under the names a chart takes; unknown and absent ones are left out."""
    found = {_NAMES[c]: float(ready.ligands[c][row]) for c in channels if c in ready.ligands}
    if COMPANION in channels:
        found[COMPANION] = float(ready.totals[COMPANION][row])
    if ready.tied[row] and SULFUR.keys() & found.keys():
        parts = [found.pop(name, np.nan) for name in SULFUR]
        found["S"] = float(np.nansum(parts))
    return {name: total for name, total in found.items() if np.isfinite(total) and total > 0}
