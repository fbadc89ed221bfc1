"""Redox category and process from dissolved O2, nitrate, manganese, iron, sulfate and sulfide.

McMahon & Chapelle 2008, Ground Water 46: 259-271 (thresholds), with the iron/sulfide mass ratio of Chapelle and others
2009, Ground Water 47: 300-305 (ratio limits seen, thresholds from memory). The Eh of an oxic water says little, because
platinum doesn't sense O2 and nitrate; this reads the chemistry instead.

Each input is above, below or unknown. A non-detect is below its threshold only when its limit is; otherwise it decides
nothing. What the known inputs leave open is said, never filled in.
"""

from itertools import product

import numpy as np
import pandas as pd

from gley.columns import amount_column, constituents
from gley.formula import molar_mass
from gley.settings import EvidenceSettings, Settings

_UNDECIDED = "undetermined"
_INPUTS = ("O2", "NO3", "Mn", "Fe", "SO4")


def process_table(amounts: pd.DataFrame, settings: Settings) -> pd.DataFrame:
    """Category and process of every sample.

    Parameters
    ----------
    amounts : DataFrame
        `<constituent>_mol_L` [mol/L] with `<constituent>_limit` (`<` = upper bound); missing columns = not analysed.
    settings : Settings
        Thresholds of the group `evidence` [mg/L, µg/L].

    Returns
    -------
    DataFrame
        Same index: `redox_category` (oxic, suboxic, anoxic, mixed, undetermined), `redox_process`, `process_basis` (the
        comparison in words), `process_missing` (inputs that were not analysed or whose limit is too high).
    """
    stated = settings.evidence
    inputs = {key: _state(amounts, key, threshold) for key, threshold in _thresholds(stated).items()}
    ratio = _ratio(amounts)
    rows = []
    for i in range(len(amounts)):
        known = {key: inputs[key][i] for key in _INPUTS}
        category, process = _decide(known, ratio[i], stated)
        missing = ", ".join(key for key in _INPUTS if known[key] is None)
        rows.append((category, process, _basis(known, ratio[i], stated), missing))
    names = ["redox_category", "redox_process", "process_basis", "process_missing"]
    return pd.DataFrame(rows, columns=names, index=amounts.index)


def _thresholds(stated: EvidenceSettings) -> dict[str, float]:
    """Thresholds in mol/L."""
    grams = {
        "O2": (stated.O2_mg_L / 1000, "O2"),
        "NO3": (stated.NO3_N_mg_L / 1000, "N"),
        "Mn": (stated.Mn_ug_L / 1e6, "Mn"),
        "Fe": (stated.Fe_ug_L / 1e6, "Fe"),
        "SO4": (stated.SO4_mg_L / 1000, "SO4"),
    }
    return {key: mass / molar_mass(basis) for key, (mass, basis) in grams.items()}


def _values(amounts: pd.DataFrame, key: str) -> tuple[np.ndarray, np.ndarray]:
    """Amounts in mol/L (NaN = not analysed) and which of them are only upper bounds."""
    column = amount_column(key)
    value = amounts[column].to_numpy(float) if column in amounts else np.full(len(amounts), np.nan)
    flags = amounts.get(f"{key}_limit")
    bound = np.zeros(len(amounts), bool) if flags is None else (flags.fillna("").astype(str) == "<").to_numpy()
    return value, bound


def _state(amounts: pd.DataFrame, key: str, threshold: float) -> list[bool | None]:
    """True at or above the threshold, False below, None unknown: not analysed, or a limit above the threshold."""
    value, bound = _values(amounts, key)
    # 1e-9: a value typed as the threshold itself must not fall below it by rounding
    above = value >= threshold * (1 - 1e-9)
    return [None if np.isnan(v) or (b and a) else bool(a) for v, a, b in zip(value, above, bound, strict=True)]


def _ratio(amounts: pd.DataFrame) -> list[tuple[float, float] | None]:
    """Iron/sulfide mass ratio as (lowest, highest) that limits leave open; None where either was not analysed."""
    iron, iron_bound = _values(amounts, "Fe")
    sulfide, sulfide_bound = _values(amounts, "sulfide")
    scale = molar_mass("Fe") / molar_mass(constituents()["sulfide"].formula)
    found: list[tuple[float, float] | None] = []
    for fe, fe_open, s, s_open in zip(iron, iron_bound, sulfide, sulfide_bound, strict=True):
        if np.isnan(fe) or np.isnan(s) or (s == 0 and fe == 0):
            found.append(None)
            continue
        value = np.inf if s == 0 else scale * fe / s
        found.append((0.0 if fe_open else value, np.inf if s_open else value))
    return found


def _decide(known: dict[str, bool | None], ratio, stated: EvidenceSettings) -> tuple[str, str]:
    """The one answer that all completions of the unknown inputs share, else what they leave open."""
    open_keys = [key for key in _INPUTS if known[key] is None]
    answers = set()
    for guess in product((True, False), repeat=len(open_keys)):
        filled = {**known, **dict(zip(open_keys, guess, strict=True))}
        answers.add(_classify({key: bool(state) for key, state in filled.items()}, ratio, stated))
    if len(answers) == 1:
        return answers.pop()
    categories = sorted({category for category, _ in answers})
    processes = sorted({process for _, process in answers})
    category = categories[0] if len(categories) == 1 else _UNDECIDED
    if category == _UNDECIDED and known["O2"] is False and set(categories) == {"anoxic", "suboxic"}:
        category = "anoxic or suboxic"
    return category, processes[0] if len(processes) == 1 else _UNDECIDED


def _classify(above: dict[str, bool], ratio, stated: EvidenceSettings) -> tuple[str, str]:
    """Category and process when every input is known (table 1 of McMahon & Chapelle 2008)."""
    reduced = above["Mn"] or above["Fe"]
    if above["O2"]:
        second = "Fe(III)/SO4" if above["Fe"] else "Mn(IV)"
        return ("mixed", f"O2-{second}") if reduced else ("oxic", "O2")
    if above["NO3"]:
        second = "Fe(III)/SO4" if above["Fe"] else "Mn(IV)"
        return ("mixed", f"NO3-{second}") if reduced else ("anoxic", "NO3")
    if not above["Fe"]:
        return ("anoxic", "Mn(IV)") if above["Mn"] else ("suboxic", "suboxic")
    return "anoxic", _by_ratio(ratio, stated) if above["SO4"] else "CH4"


def _by_ratio(ratio, stated: EvidenceSettings) -> str:
    """Iron or sulfate reduction by the iron/sulfide mass ratio; both together where it can't tell."""
    if ratio is None:
        return "Fe(III)/SO4"
    low, high = ratio
    if low > stated.ratio_high:
        return "Fe(III)"
    if high < stated.ratio_low:
        return "SO4"
    inside = low >= stated.ratio_low and high <= stated.ratio_high
    return "Fe(III)-SO4" if inside else "Fe(III)/SO4"


def _basis(known: dict[str, bool | None], ratio, stated: EvidenceSettings) -> str:
    """The comparisons in words."""
    limits = {
        "O2": f"{stated.O2_mg_L:g} mg/L",
        "NO3": f"{stated.NO3_N_mg_L:g} mg/L N",
        "Mn": f"{stated.Mn_ug_L:g} µg/L",
        "Fe": f"{stated.Fe_ug_L:g} µg/L",
        "SO4": f"{stated.SO4_mg_L:g} mg/L",
    }
    words = [f"{key} {'≥' if state else '<'} {limits[key]}" for key, state in known.items() if state is not None]
    if ratio is not None and known["Fe"]:
        low, high = ratio
        words.append(f"Fe/sulfide {'>' if np.isinf(high) else ''}{low if np.isinf(high) else high:.3g}")
    return ", ".join(words)
