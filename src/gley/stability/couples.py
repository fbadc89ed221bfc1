"""The potential at which two measured forms of one element are in equilibrium, in a sample's own water.

Each form's line log a = α + β pe is the engine's own: a pool at its measured amount, or a solid at saturation; where
two lines cross lies the couple's potential.
"""

import csv
from dataclasses import dataclass
from functools import cache
from importlib.resources import files

import numpy as np
import pandas as pd

from gley.columns import amount_column
from gley.constants import nernst_slope_mV
from gley.settings import Settings
from gley.stability.data import species
from gley.stability.draws import SOLID_LOG_K_SD, Spread
from gley.stability.solve import Bath, Choice
from gley.stability.systems import System
from gley.stability.water import coefficients, column_of
from gley.stability.waters import Waters, waters


@dataclass(frozen=True)
class Couple:
    """Two states of an element that can be measured side by side. A state is a pool (`III`), the most stable oxide or
    hydroxide of a state (`solid III`), or a species by name; an amount is constituents, the first that was measured.
    """

    name: str
    element: str
    oxidised: str
    reduced: str
    oxidised_amount: str
    reduced_amount: str
    meaning: str


@cache
def couples() -> dict[str, Couple]:
    """Every couple by name."""
    text = (files("gley.stability") / "couples.csv").read_text(encoding="utf-8")
    rows = csv.DictReader(text.splitlines())
    return {row["couple"]: Couple(row["couple"], *list(row.values())[1:]) for row in rows}


def couple_potentials(samples: pd.DataFrame, settings: Settings) -> pd.DataFrame:
    """Potential of every couple both of whose forms were detected in a sample.

    Parameters
    ----------
    samples : DataFrame
        As for `assign`; a measured potential isn't needed.
    settings : Settings
        Solid set, standard deviations of pH and concentrations.

    Returns
    -------
    DataFrame
        `sample`, `couple`, `Eh_mV`, `Eh_sd_mV`, `basis`, `share_oxidised` (of the two dissolved amounts, by element;
        NaN where one form is a solid or water): a row per sample and couple, sample by sample.
    """
    tables = []
    ready = waters(samples, ("Fe", "Mn"), settings.stability)
    spread = Spread.of(samples, settings.stability)
    for couple in couples().values():
        amounts = [_amount(samples, ready, text) for text in (couple.oxidised_amount, couple.reduced_amount)]
        told = np.isfinite(ready.pH) & (ready.pH >= 0) & (ready.pH <= 14)
        for values, _ in amounts:
            told &= values > 0
        rows = np.flatnonzero(told)
        if len(rows):
            tables.append(_table(couple, ready, spread, amounts, rows, settings))
    empty = pd.DataFrame(columns=["row", "couple", "Eh_mV", "Eh_sd_mV", "basis", "share_oxidised"])
    table = pd.concat(tables, ignore_index=True) if tables else empty
    names = samples["sample"] if "sample" in samples else pd.Series(samples.index.astype(str))
    table.insert(0, "sample", names.to_numpy()[table["row"].to_numpy(int)])
    return table.sort_values("row", kind="stable").drop(columns="row").reset_index(drop=True)


def _amount(samples: pd.DataFrame, ready: Waters, text: str) -> tuple[np.ndarray, np.ndarray]:
    """Amounts in mol/L (NaN = not measured or only a limit) and which constituents gave them, as words."""
    n = len(samples)
    found, words = np.full(n, np.inf if not text else np.nan), np.full(n, "", dtype=object)
    for option in text.split("|") if text else []:
        parts = [_detected(samples, ready, key) for key in option.split(" - ")]
        value = parts[0] - parts[1] if len(parts) > 1 else parts[0]
        take = np.isnan(found) & (value > 0)
        found, words = np.where(take, value, found), np.where(take, option, words)
    return found, words


def _detected(samples: pd.DataFrame, ready: Waters, key: str) -> np.ndarray:
    values = ready.ligands["C(IV)"] if key == "DIC" else column_of(samples, amount_column(key))
    flags = samples.get(f"{key}_limit")
    limited = np.zeros(len(samples), bool) if flags is None else (flags.fillna("").astype(str) != "").to_numpy()
    return np.where(limited, np.nan, values)


def _table(
    couple: Couple, ready: Waters, spread: Spread, amounts, rows: np.ndarray, settings: Settings
) -> pd.DataFrame:
    """One couple's potential in the rows that have it."""
    stated = settings.stability
    bath = ready.bath(rows, tied=False)
    logs = [np.where(np.isfinite(values), np.log10(np.where(values > 0, values, 1.0)), 0.0) for values, _ in amounts]
    choice = Choice(stated.solids, tuple(stated.with_names), tuple(stated.without_names))
    if couple.element == "O":
        pe, sd, words = _oxygen(bath, logs[0][rows], spread.take(rows))
    else:
        pe, sd, words = _crossing(couple, bath, [log[rows] for log in logs], spread.take(rows), choice)
    slope = nernst_slope_mV(ready.temperature_C[rows])
    told = [part[rows] for _, part in amounts]
    basis = [", ".join(word for word in (a, b, words) if word) for a, b in zip(*told, strict=True)]
    share = 1.0 / (1.0 + 10.0 ** (logs[1][rows] - logs[0][rows]))
    dissolved = bool(couple.oxidised_amount and couple.reduced_amount)
    return pd.DataFrame({
        "row": rows, "couple": couple.name, "Eh_mV": pe * slope, "Eh_sd_mV": sd * slope, "basis": basis,
        "share_oxidised": share if dissolved else np.nan,
    })  # fmt: skip


def _crossing(couple: Couple, bath: Bath, logs, spread: Spread, choice: Choice) -> tuple[np.ndarray, np.ndarray, str]:
    """pe (n,) where the two lines cross, its standard deviation, and the solid that takes part."""
    target = choice.system(couple.element)
    environment = bath.environments(target, choice, rates=True)[0]
    alpha, beta, per_pH, of_total, log_K, words = [], [], [], [], 0.0, ""
    for state, log in ((couple.oxidised, logs[0]), (couple.reduced, logs[1])):
        lines = target.lines(bath.X, log, environment)
        j = _candidate(target, state, lines.alpha)
        alpha.append(lines.alpha[:, j])
        beta.append(lines.beta[j])
        per_pH.append(lines.per_pH(environment)[1][:, j])
        of_total.append(target.per_total[j])
        if target.solid[j]:
            solid = target.members[target.candidates[j][0]]
            log_K, words = SOLID_LOG_K_SD[solid.grade] / solid.nu, solid.name
    electrons = beta[0] - beta[1]
    pe = (alpha[1] - alpha[0]) / electrons
    variance = ((per_pH[1] - per_pH[0]) * spread.pH) ** 2 + log_K**2
    variance = variance + (of_total[0] ** 2 + of_total[1] ** 2) * spread.log_total**2
    return pe, np.sqrt(variance) / abs(electrons), words


def _candidate(target: System, state: str, alpha: np.ndarray) -> int:
    """The pool of a state, or for `solid III` its most stable oxide or hydroxide among those that may form."""
    kind, _, number = state.rpartition(" ")
    first = [target.members[members[0]] for members in target.candidates]
    plain = [item.nu == 1 if item.dissolved else not item.others for item in first]
    fitting = [
        j
        for j, item in enumerate(first)
        if plain[j] and item.oxidation_state == number and item.dissolved == (kind != "solid")
    ]
    return min(fitting, key=lambda j: float(alpha[:, j].mean()))


def _oxygen(bath: Bath, log_O2: np.ndarray, spread: Spread) -> tuple[np.ndarray, np.ndarray, str]:
    """O2(aq) + 4 H^+ + 4 e^- = 2 H2O."""
    item = species()["O2(aq)"]
    pe = ((bath.X @ coefficients([item]))[:, 0] - log_O2) / item.e
    return pe, np.sqrt(spread.pH**2 + (spread.log_total / item.e) ** 2), ""
