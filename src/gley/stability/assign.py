"""Each sample × element: its field, what lies beside it, how far the next one is, and what limits the answer."""

from collections.abc import Sequence

import numpy as np
import pandas as pd

from gley.columns import columns, constituents
from gley.constants import nernst_slope_mV
from gley.errors import UsageError
from gley.settings import Settings
from gley.stability import certainty, march, margins
from gley.stability.data import CHART_ONLY, COMPANION, OFFERED, check_names
from gley.stability.draws import Spread
from gley.stability.solve import Choice, Solved, solve
from gley.stability.systems import System, away_from_25
from gley.stability.water import DIC_MIN_PH, IMPLAUSIBLE_mV, beyond_water
from gley.stability.waters import LIGAND_INPUTS, MAX_IONIC_STRENGTH_M, Waters, waters

BLOCK = 8192
"""Samples solved at a time: keeps the working arrays in the processor's cache and memory bounded."""

ALWAYS = ("Fe", "Mn", "As")
"""Elements assigned wherever they were measured, non-detects too: they carry the redox story of a site."""

LIMIT_FRACTION = 0.01
"""A non-detect is tried at its limit and at this fraction of it."""


def assign(samples: pd.DataFrame, elements: Sequence[str], settings: Settings | None = None) -> pd.DataFrame:
    """Stability field of each sample for each element, at its own pH, Eh, temperature, ionic strength and totals.

    Parameters
    ----------
    samples : DataFrame
        One row per sample: `sample`, `pH`, `Eh_mV` (hydrogen scale), `temperature_C` [°C], `SC_uS_cm` [µS/cm at 25 °C],
        `<constituent>_mol_L` [mol/L], `alkalinity_eq_L` [eq/L], `<constituent>_limit` (`<` = upper bound), and for
        probabilities `Eh_sd_mV` [mV], `pH_sd`. Columns that are missing count as not measured.
    elements : sequence of str
        Symbols among those offered: `stability.OFFERED`.
    settings : Settings, optional
        Solid set, names added or left out, assumed totals, thresholds.

    Returns
    -------
    DataFrame
        `sample`, `element` and the columns of the vocabulary's table `fields`; one row per sample × element, in order.

    Raises
    ------
    UsageError
        For an element that isn't offered, or a species name that isn't known.
    """
    settings = settings or Settings()
    stated = settings.stability
    for element in elements:
        if element not in OFFERED:
            hint = "It is drawn as a chart only." if element in CHART_ONLY else ""
            message = f"'{element}' isn't among the elements whose samples are assigned. {hint}".strip()
            raise UsageError(message, f"Choose from {', '.join(OFFERED)}.")
    check_names(stated.with_names, stated.without_names)
    choice = Choice(stated.solids, tuple(stated.with_names), tuple(stated.without_names))
    ready = waters(samples, tuple(elements), stated)
    spread = Spread.of(samples, stated)
    if not elements:
        return pd.DataFrame(columns=["sample", "element", *columns("fields")])
    tables = [_element_table(element, ready, spread, choice, settings) for element in elements]
    names = samples["sample"] if "sample" in samples else pd.Series(samples.index.astype(str), index=samples.index)
    for element, table in zip(elements, tables, strict=True):
        table.insert(0, "element", element)
        table.insert(0, "sample", names.to_numpy())
        table.insert(0, "row", np.arange(len(samples)))
    joined = pd.concat(tables).sort_values(["row"], kind="stable")
    return joined.drop(columns="row").reset_index(drop=True)


def _element_table(element, ready: Waters, spread, choice: Choice, settings: Settings) -> pd.DataFrame:
    """The table `fields` of one element for all samples."""
    target = choice.system(element)
    n = len(ready.pH)
    empty = {name: np.full(n, np.nan) for name, column in columns("fields").items() if column.dtype == "number"}
    table = pd.DataFrame({name: empty.get(name, np.full(n, "", dtype=object)) for name in columns("fields")})
    status = _statuses(element, target, ready)
    usable = np.flatnonzero(_usable(element, ready, status))
    for tied in (False, True):
        group = usable[ready.tied[usable] == tied]
        for start in range(0, len(group), BLOCK):
            rows = group[start : start + BLOCK]
            _fill(table, status, rows, element, target, ready, spread, tied, choice, settings)
    table["status"] = [("; ".join(words) if words else "ok") for words in status]
    return table


def _usable(element: str, ready: Waters, status: list[list[str]]) -> np.ndarray:
    """Which samples can be assigned; the others get the reason as status."""
    total = ready.totals[element]
    reasons = (
        (np.isnan(ready.pH), "no pH"),
        ((ready.pH < 0) | (ready.pH > 14), "pH outside 0-14"),
        (np.isnan(ready.Eh_mV), "no Eh"),
        (np.abs(ready.Eh_mV) > 2000, "Eh outside ±2 V"),
        (np.isnan(total), f"{element} not measured"),
        (total == 0, f"{element} reported as zero"),
        ((total < 0) | np.isinf(total), f"{element} isn't a concentration"),
        (ready.ionic_strength_M < 0, "ionic strength isn't a concentration"),
    )
    usable = np.ones(len(total), bool)
    for where, words in reasons:
        for row in np.flatnonzero(where):
            status[row].insert(0, f"not assigned: {words}") if usable[row] else status[row].append(words)
        usable &= ~where
    return usable


def _statuses(element: str, target: System, ready: Waters) -> list[list[str]]:
    """What limits each sample's answer before anything is computed."""
    status: list[list[str]] = [[] for _ in ready.pH]

    def say(where: np.ndarray, words: str) -> None:
        for row in np.flatnonzero(where):
            status[row].append(words)

    say(ready.assumed[element], "assumed total")
    for value in np.unique(ready.temperature_C[ready.temperature_assumed]):
        say(ready.temperature_assumed & (ready.temperature_C == value), f"temperature assumed: {value:g} °C")
    for channel in target.channels:
        if channel == COMPANION:
            say(np.isnan(ready.totals[COMPANION]), f"companion not measured: {COMPANION}")
            continue
        say(ready.assumed[channel], f"ligand assumed: {channel}")
        if channel == "S(-II)":
            continue
        unknown = np.isnan(ready.ligands[channel]) & ~np.isnan(ready.pH)
        acid = ready.too_acid & unknown if channel == "C(IV)" else np.zeros(len(unknown), bool)
        say(acid, f"inorganic carbon unknown below pH {DIC_MIN_PH:g}")
        say(unknown & ~acid, f"ligand not measured: {LIGAND_INPUTS[channel]}")
    no_sulfide = np.isnan(ready.ligands["S(-II)"])
    if "S(-II)" in target.channels:
        say(ready.tied & no_sulfide, "sulfide computed")
        say(no_sulfide & ~ready.tied, "ligand not measured: sulfide")
    elif element == "S":
        say(no_sulfide, "sulfide not measured: total is sulfate alone")
    for name in [item.name for item in target.members if item.only_at_25]:
        say(away_from_25(ready.X), f"{name} left out: known at 25 °C only")
    beyond = np.abs(beyond_water(ready.pH, ready.Eh_mV, ready.temperature_C))
    say(beyond > IMPLAUSIBLE_mV, "Eh outside water's stability: not to be used")
    strong = ready.ionic_strength_M > MAX_IONIC_STRENGTH_M
    say(strong, f"ionic strength above {MAX_IONIC_STRENGTH_M:g} M: activities uncertain")
    return status


def _fill(table, status, rows, element, target, ready, spread, tied, choice, settings) -> None:
    """Compute one block of samples that share the treatment of sulfur and write it into the table."""
    stated = settings.stability
    bath, pe = ready.bath(rows, tied), ready.pe[rows]
    log_total = ready.log_total(element, rows)
    solved = solve(target, bath, pe, log_total, choice)
    names = np.array([item.name for item in target.members], dtype=object)

    def named(member: np.ndarray) -> np.ndarray:
        return np.where(member >= 0, names[member], "")

    def fact(text) -> np.ndarray:
        return np.array([text(item) for item in target.members], dtype=object)[solved.field]

    margin_pe, next_E = margins.along_pe(target, bath, pe, log_total, solved.field, choice)
    margin_pH, next_pH = march.along_pH(target, bath, pe, log_total, solved.field, choice)
    odds = certainty.probabilities(target, bath, pe, log_total, solved.field, spread.take(rows), choice, stated)
    _put(table, rows, {
        "field": named(solved.field),
        "formula": fact(lambda item: item.formula),
        "kind": fact(lambda item: item.kind),
        "oxidation_state": fact(lambda item: f"{element}({item.oxidation_state})"),
        "dissolved_form": named(solved.form), "share": solved.share,
        "saturation": _saturation(target, solved, stated), "solid": named(solved.solid), "SI": solved.SI,
        "next_field": named(next_E), "margin_mV": margin_pe * nernst_slope_mV(ready.temperature_C[rows]),
        "next_field_pH": named(next_pH), "margin_pH": margin_pH,
        "probability": odds.of(solved.field), "second_field": named(odds.second(solved.field)),
        "next_probability": odds.of(odds.second(solved.field)),
    })  # fmt: skip
    table.loc[rows, "outcome"] = _outcomes(table.loc[rows], _bounded(target, element, ready, rows), stated)
    _limits(table, status, rows, element, target, ready, tied, choice, solved)


def _put(table: pd.DataFrame, rows: np.ndarray, values: dict[str, np.ndarray]) -> None:
    for name, column in values.items():
        table.loc[rows, name] = column


def _saturation(target: System, solved: Solved, stated) -> np.ndarray:
    """under, near or over for the solid with the highest SI; '' where there is none."""
    fresh = np.array([item.set == "fresh" for item in target.members])[solved.solid]
    near = np.where(fresh, stated.near_SI_fresh, stated.near_SI)
    with np.errstate(invalid="ignore"):
        words = np.where(np.abs(solved.SI) <= near, "near", np.where(solved.SI > 0, "over", "under"))
    return np.where(np.isnan(solved.SI), "", words).astype(object)


def _bounded(target: System, element: str, ready: Waters, rows: np.ndarray) -> dict[str, np.ndarray]:
    """By solid: for which samples its saturation rests on a value that is only an upper bound."""
    found = {}
    for item in target.members:
        if not item.dissolved:
            names = [element, *(channel for channel in item.others if channel in ready.limited)]
            found[item.name] = np.any([ready.limited[name][rows] for name in names], axis=0)
    return found


def _outcomes(part: pd.DataFrame, bounded: dict[str, np.ndarray], stated) -> list[str]:
    """The outcome in words: a sample that sits on a solid's line is buffered there; that is evidence, not doubt.

    A limit proves no solid: where a solid's field rests on one, the outcome stays open.
    """
    words = []
    for i, row in enumerate(part.to_dict("records")):
        on_line = row["saturation"] == "near" and row["solid"] in (row["field"], row["next_field"])
        if row["kind"] == "solid" and bounded[row["field"]][i]:
            words.append("open: rests on a limit")
        elif on_line and not bounded[row["solid"]][i]:
            words.append(f"at equilibrium with {row['solid']}")
        elif row["probability"] >= stated.clear:
            words.append("clear")
        elif row["probability"] >= stated.likely:
            words.append("likely")
        else:
            other = row["second_field"] or row["next_field"]
            words.append(f"between {row['field']} and {other}" if other else "likely")
    return words


def _limits(table, status, rows, element, target, ready: Waters, tied, choice, solved: Solved) -> None:
    """Say where the answer hangs on a value that is only an upper bound; a limit never proves a solid."""
    used = [channel for channel in target.channels if channel in ready.limited]
    used += [element] + ([COMPANION] if COMPANION in target.channels else [])
    touched = np.zeros(len(rows), bool)
    for name in used:
        touched |= ready.limited[name][rows]
    some = rows[touched]
    if not len(some):
        return
    bath = ready.bath(some, tied, LIMIT_FRACTION)
    low = solve(target, bath, ready.pe[some], ready.log_total(element, some, LIMIT_FRACTION), choice)
    for row, before, after in zip(some, solved.field[touched], low.field, strict=True):
        own = ready.limited[element][row]
        if own:
            status[row].append(f"{element} not detected")
        item = target.members[before]
        held = own or any(ready.limited[name][row] for name in item.others if name in ready.limited)
        if before != after:
            status[row].append(f"depends on limit: {item.name} or {target.members[after].name}")
        elif not item.dissolved and held:
            status[row].append("a limit proves no solid")


def measured_elements(samples: pd.DataFrame) -> tuple[str, ...]:
    """Elements to assign when none is named: Fe, Mn and As where measured, others where detected; sulfur isn't one."""
    found = []
    for key in OFFERED:
        column = constituents()[key].column if key in constituents() else ""
        if column not in samples:
            continue
        told = samples[column].notna()
        if key not in ALWAYS and f"{key}_limit" in samples:
            told &= samples[f"{key}_limit"] != "<"
        if told.any():
            found.append(key)
    return tuple(found)
