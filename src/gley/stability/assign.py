"""Each sample × element: its field, what lies beside it, how far the next one is, and what limits the answer."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import pandas as pd

from gley.columns import columns, constituents
from gley.constants import nernst_slope_mV
from gley.errors import UsageError
from gley.settings import Settings, StabilitySettings
from gley.stability import certainty, march, margins
from gley.stability.data import CHART_ONLY, COMPANION, OFFERED, check_names
from gley.stability.draws import Spread
from gley.stability.outcome import outcomes, saturation
from gley.stability.solve import Choice, Solved, fields, solve
from gley.stability.status import Remarks, limits_of, usable
from gley.stability.systems import System
from gley.stability.threads import one_blas_thread
from gley.stability.waters import Waters, waters

BLOCK = 16384
"""Samples solved at a time: keeps the working arrays in the processor's cache and memory bounded."""

ALWAYS = ("Fe", "Mn", "As")
"""Elements assigned wherever they were measured, non-detects too: they carry the redox story of a site."""

LIMIT_FRACTION = 0.01
"""A non-detect is tried at its limit and at this fraction of it."""


@dataclass(frozen=True)
class Assignment:
    """`fields`: a row per sample × element; `rivals`: a row per sample, element and field with any probability."""

    fields: pd.DataFrame
    rivals: pd.DataFrame


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
    return assignment(samples, elements, settings).fields


@one_blas_thread()
def assignment(samples: pd.DataFrame, elements: Sequence[str], settings: Settings | None = None) -> Assignment:
    """Fields as from `assign`, and with them the probability of every field that a sample may lie in.

    Takes what `assign` takes. `rivals` has `sample`, `element` and the columns of the vocabulary's table `rivals`, the
    most probable first.
    """
    settings = settings or Settings()
    ready, choice = _ready(samples, elements, settings)
    spread = Spread.of(samples, settings.stability)
    names = samples["sample"] if "sample" in samples else pd.Series(samples.index.astype(str), index=samples.index)
    tables: list[pd.DataFrame] = []
    rivals: list[pd.DataFrame] = []
    for element in elements:
        work = _Work(element, choice.system(element), ready, spread, choice, settings.stability)
        for collected, table in zip((tables, rivals), _element_tables(work), strict=True):
            table.insert(0, "element", element)
            table.insert(0, "sample", names.to_numpy()[table["row"]])
            collected.append(table)
    return Assignment(_joined(tables, "fields"), _joined(rivals, "rivals"))


@one_blas_thread()
def named_fields(samples: pd.DataFrame, elements: Sequence[str], settings: Settings | None = None) -> pd.DataFrame:
    """Only which field each sample lies in: `sample`, `element`, `field` (empty where it can't be assigned).

    Takes what `assign` takes, and gives the same fields in a fraction of the time.
    """
    settings = settings or Settings()
    ready, choice = _ready(samples, elements, settings)
    names = samples["sample"] if "sample" in samples else pd.Series(samples.index.astype(str), index=samples.index)
    tables = []
    for element in elements:
        target = choice.system(element)
        found = np.full(len(samples), "", dtype=object)
        members = np.array([item.name for item in target.members], dtype=object)
        for rows, tied in _blocks(ready, np.flatnonzero(usable(element, ready, Remarks(len(samples))))):
            bath, log_total = ready.bath(rows, tied), ready.log_total(element, rows)
            found[rows] = members[fields(target, bath, ready.pe[rows], log_total, choice)]
        row = np.arange(len(samples))
        tables.append(pd.DataFrame({"sample": names.to_numpy(), "element": element, "row": row, "field": found}))
    return _joined(tables, "") if tables else pd.DataFrame({"sample": [], "element": [], "field": []})


def _ready(samples: pd.DataFrame, elements: Sequence[str], settings: Settings) -> tuple[Waters, Choice]:
    """What the engine computes with; refuses elements and names that aren't known."""
    stated = settings.stability
    for element in elements:
        if element not in OFFERED:
            hint = "It is drawn as a chart only." if element in CHART_ONLY else ""
            message = f"'{element}' isn't among the elements whose samples are assigned. {hint}".strip()
            raise UsageError(message, f"Choose from {', '.join(OFFERED)}.")
    check_names(stated.with_names, stated.without_names)
    choice = Choice(stated.solids, tuple(stated.with_names), tuple(stated.without_names))
    return waters(samples, tuple(elements), stated), choice


def _joined(tables: list[pd.DataFrame], name: str) -> pd.DataFrame:
    """Tables of all elements as one, sample by sample."""
    if not tables:
        return pd.DataFrame(columns=["sample", "element", *columns(name)])
    joined = pd.concat(tables, ignore_index=True).sort_values("row", kind="stable")
    return joined.drop(columns="row").reset_index(drop=True)


def _blocks(ready: Waters, fit: np.ndarray):
    """Rows in blocks that share the treatment of sulfur, with that treatment."""
    for tied in (False, True):
        group = fit[ready.tied[fit] == tied]
        for start in range(0, len(group), BLOCK):
            yield group[start : start + BLOCK], tied


@dataclass(frozen=True)
class _Work:
    """One element to assign to all samples."""

    element: str
    target: System
    ready: Waters
    spread: Spread
    choice: Choice
    stated: StabilitySettings


def _element_tables(work: _Work) -> tuple[pd.DataFrame, pd.DataFrame]:
    """The tables `fields` and `rivals` of one element, with the sample's `row`."""
    n = len(work.ready.pH)
    table = {
        name: np.full(n, np.nan) if column.dtype == "number" else np.full(n, "", dtype=object)
        for name, column in columns("fields").items()
    }
    remarks = limits_of(work.element, work.target, work.ready)
    fit = np.flatnonzero(usable(work.element, work.ready, remarks))
    rivals = [_block(work, rows, tied, table, remarks) for rows, tied in _blocks(work.ready, fit)]
    table["status"] = remarks.texts()
    told = pd.concat(rivals, ignore_index=True) if rivals else pd.DataFrame(columns=["row", *columns("rivals")])
    return pd.DataFrame({"row": np.arange(n), **table}), told


def _block(work: _Work, rows: np.ndarray, tied: bool, table: dict, remarks: Remarks) -> pd.DataFrame:
    """Compute one block of samples, write it into the table's columns, give its rivals."""
    target, ready, choice = work.target, work.ready, work.choice
    bath, pe, log_total = ready.bath(rows, tied), ready.pe[rows], ready.log_total(work.element, rows)
    solved = solve(target, bath, pe, log_total, choice)
    margin_pe, next_E = margins.along_pe(target, bath, pe, log_total, solved.field, choice)
    margin_pH, next_pH = march.along_pH(target, bath, pe, log_total, solved.field, choice)
    odds = certainty.probabilities(
        target, bath, pe, log_total, solved.field, work.spread.take(rows), choice, work.stated
    )
    second = odds.second(solved.field)
    facts = _facts(target)

    def named(member: np.ndarray) -> np.ndarray:
        return np.where(member >= 0, facts["field"][member], "")

    found = {name: values[solved.field] for name, values in facts.items()} | {
        "dissolved_form": named(solved.form), "share": solved.share, "solid": named(solved.solid), "SI": solved.SI,
        "saturation": saturation(target, solved, work.stated),
        "next_field": named(next_E), "margin_mV": margin_pe * nernst_slope_mV(ready.temperature_C[rows]),
        "next_field_pH": named(next_pH), "margin_pH": margin_pH, "probability": odds.of(solved.field),
        "second_field": named(second), "next_probability": odds.of(second),
        "outcome": outcomes(target, solved, next_E, second, odds, _bounded(work, rows), work.stated),
    }  # fmt: skip
    for name, values in found.items():
        table[name][rows] = values
    _say_limits(work, rows, tied, solved, remarks)
    row, member = np.nonzero(odds.share)
    order = np.lexsort((-odds.share[row, member], row))
    row, member = row[order], member[order]
    told = {name: values[member] for name, values in facts.items()}
    return pd.DataFrame({"row": rows[row], **told, "probability": odds.share[row, member]})


def _facts(target: System) -> dict[str, np.ndarray]:
    """What is known of each member as a field, by column (S,)."""
    told = {
        "field": [item.name for item in target.members],
        "formula": [item.formula for item in target.members],
        "kind": [item.kind for item in target.members],
        "oxidation_state": [f"{item.element}({item.oxidation_state})" for item in target.members],
    }
    return {name: np.array(values, dtype=object) for name, values in told.items()}


def _bounded(work: _Work, rows: np.ndarray) -> np.ndarray:
    """For which samples a solid's saturation rests on a value that is only an upper bound (n, S)."""
    limited = work.ready.limited
    found = np.zeros((len(rows), len(work.target.members)), bool)
    for i, item in enumerate(work.target.members):
        if not item.dissolved:
            names = [work.element, *(channel for channel in item.others if channel in limited)]
            found[:, i] = np.any([limited[name][rows] for name in names], axis=0)
    return found


def _say_limits(work: _Work, rows: np.ndarray, tied: bool, solved: Solved, remarks: Remarks) -> None:
    """Say where the answer hangs on a value that is only an upper bound; a limit never proves a solid."""
    target, ready, element = work.target, work.ready, work.element
    used = [channel for channel in target.channels if channel in ready.limited]
    used += [element] + ([COMPANION] if COMPANION in target.channels else [])
    touched = np.flatnonzero(np.any([ready.limited[name][rows] for name in used], axis=0))
    some, before = rows[touched], solved.field[touched]
    if not len(some):
        return
    bath = ready.bath(some, tied, LIMIT_FRACTION)
    low = solve(target, bath, ready.pe[some], ready.log_total(element, some, LIMIT_FRACTION), work.choice)

    def say(where: np.ndarray, words: str) -> None:
        whole = np.zeros(len(ready.pH), bool)
        whole[some[where]] = True
        remarks.say(whole, words)

    own = ready.limited[element][some]
    say(own, f"{element} not detected")
    for a, b in sorted(set(zip(before.tolist(), low.field.tolist(), strict=True))):
        here = (before == a) & (low.field == b)
        item = target.members[a]
        if a != b:
            say(here, f"depends on limit: {item.name} or {target.members[b].name}")
        elif not item.dissolved:
            bounds = [ready.limited[name][some] for name in item.others if name in ready.limited]
            say(here & np.any([own, *bounds], axis=0), "a limit proves no solid")


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
