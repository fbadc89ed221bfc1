"""From a table of samples to what the engine computes with: totals, ligands, ionic strength, and what is missing.

Not measured is not absent: what wasn't analysed is unknown (NaN) and said; a non-detect is an upper bound.
"""

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
import pandas as pd

from gley.columns import amount_column
from gley.constants import nernst_slope_mV
from gley.settings import StabilitySettings
from gley.stability import water
from gley.stability.data import COMPANION, FIXED, SULFUR
from gley.stability.environment import pool_line
from gley.stability.solve import Bath

LIGAND_INPUTS = {channel: analysis for channel, (_, analysis) in FIXED.items()} | SULFUR
"""The analysis that tells each ligand channel."""

MAX_IONIC_STRENGTH_M = 0.5


@dataclass(frozen=True)
class Waters:
    """n samples ready for assignment. `totals` and `ligands` in mol/L (NaN = not measured) by element and channel;
    `limited` says by the same names where a value is only an upper bound; `assumed` where the settings gave it.
    """

    pH: np.ndarray
    Eh_mV: np.ndarray
    pe: np.ndarray
    temperature_C: np.ndarray
    ionic_strength_M: np.ndarray
    ionic_strength_basis: np.ndarray
    X: np.ndarray
    totals: Mapping[str, np.ndarray]
    ligands: Mapping[str, np.ndarray]
    limited: Mapping[str, np.ndarray]
    assumed: Mapping[str, np.ndarray]
    tied: np.ndarray
    temperature_assumed: np.ndarray
    too_acid: np.ndarray

    def bath(self, rows: np.ndarray, tied: bool, scale: float = 1.0) -> Bath:
        """The waters of some rows for one treatment of sulfur; values that are limits are multiplied by `scale`."""
        X = self.X[rows]
        ligands = {name: self._scaled(self.ligands, name, rows, scale) for name in self.ligands}
        if tied:
            # an unmeasured sulfide adds nothing to the total that Eh then splits
            ligands["S"] = ligands.pop("S(VI)") + np.nan_to_num(ligands.pop("S(-II)"))
        return Bath(X, ligands, {COMPANION: self._scaled(self.totals, COMPANION, rows, scale)}, tied)

    def log_total(self, element: str, rows: np.ndarray, scale: float = 1.0) -> np.ndarray:
        """log10 of an element's total; −inf for zero, NaN for unknown."""
        with np.errstate(divide="ignore", invalid="ignore"):
            return np.log10(self._scaled(self.totals, element, rows, scale))

    def _scaled(self, values: Mapping[str, np.ndarray], name: str, rows: np.ndarray, scale: float) -> np.ndarray:
        taken = values[name][rows]
        return np.where(self.limited[name][rows], taken * scale, taken) if scale != 1.0 else taken


def waters(frame: pd.DataFrame, elements: tuple[str, ...], settings: StabilitySettings) -> Waters:
    """Read a table of samples.

    Parameters
    ----------
    frame : DataFrame
        Columns as in the house vocabulary: `pH`, `Eh_mV`, `temperature_C`, `SC_uS_cm`, `<constituent>_mol_L`,
        `alkalinity_eq_L`, and `<constituent>_limit` holding `<` where the value is an upper bound. Any may be missing.
    elements : tuple of str
        Elements whose totals are wanted.
    settings : StabilitySettings
        Assumed totals, sulfur treatment, ionic strength rules.
    """
    pH = water.column_of(frame, "pH")
    temperature = water.column_of(frame, "temperature_C")
    basis_T = frame.get("temperature_basis", pd.Series("", index=frame.index)).fillna("").astype(str)
    temperature_assumed = np.isnan(temperature) | basis_T.str.startswith("assumed").to_numpy()
    temperature = np.where(np.isnan(temperature), settings.assumed_temperature_C, temperature)
    Eh = water.column_of(frame, "Eh_mV")
    strength, basis = water.ionic_strength(frame, settings.charge_balance_percent, settings.default_ionic_strength_M)
    X = water.features(np.nan_to_num(pH, nan=7.0), temperature, strength)
    totals, ligands, limited, assumed = {}, {}, {}, {}
    for element in (*elements, *(() if COMPANION in elements else (COMPANION,))):
        key = "SO4" if element == "S" else element
        totals[element], limited[element], assumed[element] = _total(frame, key, settings)
    for channel, key in LIGAND_INPUTS.items():
        ligands[channel], limited[channel], assumed[channel] = _total(frame, key, settings)
    ligands["C(IV)"], assumed["C(IV)"] = _filled(water.inorganic_carbon(frame, X), "DIC", settings)
    pe = Eh / nernst_slope_mV(temperature)
    if settings.sulfur == "measured":
        idle = _sulfide_below_limit(X, pe, ligands, limited["S(-II)"])
        ligands["S(-II)"] = np.where(idle, np.nan, ligands["S(-II)"])
        limited["S(-II)"] = limited["S(-II)"] & ~idle
    if "S" in totals:
        totals["S"] = totals["S"] + np.nan_to_num(ligands["S(-II)"])
        limited["S"] = limited["S(VI)"] & (limited["S(-II)"] | np.isnan(ligands["S(-II)"]))
    tied = np.isnan(ligands["S(-II)"]) & ~np.isnan(ligands["S(VI)"])
    if settings.sulfur == "tied":
        tied = ~np.isnan(ligands["S(VI)"])
    elif settings.sulfur == "inert":
        tied = np.zeros(len(frame), bool)
    return Waters(
        pH, Eh, pe, temperature, strength, basis, X,
        totals, ligands, limited, assumed, tied, temperature_assumed, pH < water.DIC_MIN_PH,
    )  # fmt: skip


def _sulfide_below_limit(X: np.ndarray, pe: np.ndarray, ligands: Mapping[str, np.ndarray], limited: np.ndarray):
    """Where sulfide wasn't detected and Eh leaves less of it than the limit (n,): there the limit says nothing.

    Sulfide at its limit beside sulfate at a high Eh would make pyrite of oxic water.
    """
    sulfate = pool_line("S(VI)", X, ligands["S(VI)"], rates=False)
    unit = pool_line("S(-II)", X, np.ones(len(X)), rates=False)
    with np.errstate(invalid="ignore", divide="ignore"):
        computed = sulfate.level - unit.level + (sulfate.slope - unit.slope) * pe
        return limited & (computed < np.log10(ligands["S(-II)"]))


def _total(frame: pd.DataFrame, key: str, settings: StabilitySettings) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Amounts of a constituent, where they are upper bounds, and where the settings' value was taken."""
    values = water.column_of(frame, amount_column(key))
    flags = frame.get(f"{key}_limit")
    limited = np.zeros(len(frame), bool) if flags is None else (flags.fillna("").astype(str) == "<").to_numpy()
    values, assumed = _filled(values, key, settings)
    return values, limited, assumed


def _filled(values: np.ndarray, key: str, settings: StabilitySettings) -> tuple[np.ndarray, np.ndarray]:
    """Values with the settings' assumed total in the gaps, and where it was taken."""
    stated = settings.assumed_mol_L.get(key)
    gaps = np.isnan(values)
    if stated is None:
        return values, np.zeros(len(values), bool)
    return np.where(gaps, float(stated), values), gaps
