"""Redox category and process from dissolved O2, nitrate, manganese, iron, sulfate and sulfide.

McMahon & Chapelle 2008, Ground Water 46: 259-271 (thresholds), with the iron/sulfide mass ratio of Chapelle and others
2009, Ground Water 47: 300-305 (ratio limits seen, thresholds from memory). The Eh of an oxic water says little, because
platinum doesn't sense O2 and nitrate; this reads the chemistry instead.

Each input is above, below or unknown. A bound (`<`, `>`) decides only when all values it allows lie on one side of the
threshold. What the known inputs leave open is said, never filled in.
"""

from functools import lru_cache
from itertools import product

import numpy as np
import pandas as pd

from gley.columns import amount_column
from gley.formula import molar_mass
from gley.settings import EvidenceSettings, Settings

_UNDECIDED = "undetermined"
_INPUTS = ("O2", "NO3", "Mn", "Fe", "SO4")
_OXIC_ANOXIC, _ANOXIC_ANOXIC = "mixed (oxic-anoxic)", "mixed (anoxic)"
_OPEN_RATIO = "Fe(III)/SO4"
_MOST_OPEN = 4
"""More open processes than these aren't listed."""

# 1e-9: a value typed as the threshold itself must not fall to the wrong side by rounding
_ROUNDING = 1e-9

State = bool | None


def process_table(amounts: pd.DataFrame, settings: Settings) -> pd.DataFrame:
    """Category and process of every sample.

    Parameters
    ----------
    amounts : DataFrame
        `<constituent>_mol_L` [mol/L] with `<constituent>_limit` (`<` upper, `>` lower bound); missing columns = not
        analysed.
    settings : Settings
        Thresholds of the group `evidence` [mg/L, µg/L].

    Returns
    -------
    DataFrame
        Same index, text. `redox_category`: oxic, suboxic, anoxic, mixed (oxic-anoxic), mixed (anoxic), undetermined, or
        two of them where no more is known. `redox_process`: O2, NO3, Mn(IV), Fe(III), SO4, Fe(III)-SO4 (both at once),
        Fe(III)/SO4 (the data can't tell which), CH4, a pair such as O2-Mn(IV) in mixed water, suboxic, undetermined.
        `process_basis`: the comparisons, and what they leave open. `process_missing`: what wasn't analysed, or has a
        limit that decides nothing.
    """
    stated = settings.evidence
    thresholds = _thresholds(stated)
    inputs = [_state(amounts, key, thresholds[key]) for key in _INPUTS]
    ratios = _ratio(amounts)
    absent = {key: np.isnan(_values(amounts, key)[0]) for key in (*_INPUTS, "sulfide")}
    rows = []
    for i, states in enumerate(zip(*inputs, strict=True)):
        by_ratio = _by_ratio(ratios[i], stated)
        category, process, left_open = _decide(states, by_ratio)
        basis = _basis(states, ratios[i], left_open, stated)
        missing = _missing(states, {key for key, where in absent.items() if where[i]}, by_ratio)
        rows.append((category, process, basis, missing))
    names = ["redox_category", "redox_process", "process_basis", "process_missing"]
    return pd.DataFrame(rows, columns=names, index=amounts.index, dtype=object)


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
    """Amounts in mol/L (NaN = not analysed) and their limits (`<`, `>` or empty)."""
    column = amount_column(key)
    value = amounts[column].to_numpy(float) if column in amounts else np.full(len(amounts), np.nan)
    flags = amounts.get(f"{key}_limit")
    limit = np.full(len(amounts), "", object) if flags is None else flags.fillna("").astype(str).to_numpy(object)
    return value, limit


def _state(amounts: pd.DataFrame, key: str, threshold: float) -> list[State]:
    """True at or above the threshold, False below, None unknown: not analysed, or a bound that allows both."""
    value, limit = _values(amounts, key)
    above = value >= threshold * (1 - _ROUNDING)
    # `<0.5` is below a threshold of 0.5
    below = value <= threshold * (1 + _ROUNDING)
    decided_above = above & (limit != "<")
    decided_below = np.where(limit == "<", below, ~above & (limit != ">")) & ~np.isnan(value)
    return [True if up else False if down else None for up, down in zip(decided_above, decided_below, strict=True)]


def _ratio(amounts: pd.DataFrame) -> list[tuple[float, float] | None]:
    """Iron/sulfide mass ratio (sulfide counted as H2S) as (lowest, highest) that bounds leave; None without both."""
    iron, iron_limit = _values(amounts, "Fe")
    sulfide, sulfide_limit = _values(amounts, "sulfide")
    scale = molar_mass("Fe") / molar_mass("H2S")
    found: list[tuple[float, float] | None] = []
    for fe, fe_limit, s, s_limit in zip(iron, iron_limit, sulfide, sulfide_limit, strict=True):
        if np.isnan(fe) or np.isnan(s) or (s == 0 and fe == 0):
            found.append(None)
            continue
        value = np.inf if s == 0 else scale * fe / s
        low = 0.0 if fe_limit == "<" or s_limit == ">" else value
        high = np.inf if fe_limit == ">" or s_limit == "<" else value
        found.append((low, high))
    return found


def _by_ratio(ratio: tuple[float, float] | None, stated: EvidenceSettings) -> str:
    """Iron or sulfate reduction by the iron/sulfide mass ratio; left open where it can't tell."""
    if ratio is None:
        return _OPEN_RATIO
    low, high = ratio
    if low > stated.ratio_high:
        return "Fe(III)"
    if high < stated.ratio_low:
        return "SO4"
    inside = low >= stated.ratio_low and high <= stated.ratio_high
    return "Fe(III)-SO4" if inside else _OPEN_RATIO


@lru_cache(maxsize=4096)
def _decide(states: tuple[State, ...], by_ratio: str) -> tuple[str, str, tuple[str, ...]]:
    """Category and process that all completions of the unknown inputs share; the processes left open, if several."""
    choices = [(True, False) if state is None else (state,) for state in states]
    answers = {_classify(filled, by_ratio) for filled in product(*choices)}
    categories = {category for category, _ in answers}
    processes = tuple(sorted({process for _, process in answers}))
    if len(processes) == 1:
        return _category(categories), processes[0], ()
    return _category(categories), _UNDECIDED, processes


def _category(possible: set[str]) -> str:
    """The narrowest name for the categories that are possible."""
    if len(possible) == 1:
        return next(iter(possible))
    if possible == {"oxic", _OXIC_ANOXIC}:
        return f"oxic or {_OXIC_ANOXIC}"
    if possible <= {"anoxic", _ANOXIC_ANOXIC}:
        return "anoxic"  # by one process or by two
    return "anoxic or suboxic" if possible <= {"anoxic", _ANOXIC_ANOXIC, "suboxic"} else _UNDECIDED


def _classify(above: tuple[bool, ...], by_ratio: str) -> tuple[str, str]:
    """Category and process when every input is known (table 1 of McMahon & Chapelle 2008).

    In mixed water the table asks neither sulfate nor the ratio: iron and sulfate stay together there.
    """
    O2, NO3, Mn, Fe, SO4 = above
    second = _OPEN_RATIO if Fe else "Mn(IV)" if Mn else ""
    if O2:
        return (_OXIC_ANOXIC, f"O2-{second}") if second else ("oxic", "O2")
    if NO3:
        return (_ANOXIC_ANOXIC, f"NO3-{second}") if second else ("anoxic", "NO3")
    if Fe:
        return "anoxic", by_ratio if SO4 else "CH4"
    return ("anoxic", "Mn(IV)") if Mn else ("suboxic", "suboxic")


def _basis(states: tuple[State, ...], ratio, left_open: tuple[str, ...], stated: EvidenceSettings) -> str:
    """The comparisons in words, and what they leave open."""
    limits = (
        f"{stated.O2_mg_L:g} mg/L", f"{stated.NO3_N_mg_L:g} mg/L N", f"{stated.Mn_ug_L:g} µg/L",
        f"{stated.Fe_ug_L:g} µg/L", f"{stated.SO4_mg_L:g} mg/L",
    )  # fmt: skip
    known = zip(_INPUTS, states, limits, strict=True)
    words = [f"{key} {'≥' if state else '<'} {limit}" for key, state, limit in known if state is not None]
    if ratio is not None and states[_INPUTS.index("Fe")]:
        words.append(_ratio_text(*ratio))
    text = ", ".join(words) or "none of the inputs decides"
    if not left_open:
        return text
    return f"{text}; leaves open {' or '.join(left_open) if len(left_open) <= _MOST_OPEN else 'most'}"


def _ratio_text(low: float, high: float) -> str:
    if low == high:
        return "no sulfide" if np.isinf(low) else f"Fe/sulfide {low:.3g}"
    if np.isinf(high):
        return f"Fe/sulfide > {low:.3g}" if low else "Fe/sulfide unknown"
    return f"Fe/sulfide < {high:.3g}"


def _missing(states: tuple[State, ...], absent: set[str], by_ratio: str) -> str:
    """What wasn't analysed, and which limits decide nothing."""
    known = dict(zip(_INPUTS, states, strict=True))
    gone = [key for key in (*_INPUTS, "sulfide") if key in absent]
    high = [key for key in _INPUTS if known[key] is None and key not in absent]
    if "sulfide" not in absent and by_ratio == _OPEN_RATIO and known["Fe"]:
        high.append("sulfide")
    parts = [f"not analysed: {', '.join(gone)}"] if gone else []
    return "; ".join([*parts, f"limit decides nothing: {', '.join(high)}"] if high else parts)
