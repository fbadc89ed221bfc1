"""The working of one assignment: every number a reviewer would compute again by hand."""

from typing import Any

import numpy as np
import pandas as pd

from gley.constants import nernst_slope_mV
from gley.settings import Settings
from gley.stability import margins
from gley.stability.data import COMPANION, SULFUR
from gley.stability.edges import largest
from gley.stability.environment import Environment
from gley.stability.reactions import between
from gley.stability.solve import Choice, locate, solve
from gley.stability.systems import Lines, System
from gley.stability.water import FEATURES, debye_hueckel_A, features
from gley.stability.waters import LIGAND_INPUTS, Waters, waters

_SHOWN_SHARE = 0.005


def working(sample: pd.DataFrame, element: str, settings: Settings) -> dict[str, Any]:
    """How one sample came to its field.

    Parameters
    ----------
    sample : DataFrame
        One row, as for `assign`, with pH, Eh and a total of the element.
    element : str
        Symbol of an element on offer.
    settings : Settings
        As for `assign`.

    Returns
    -------
    dict
        `pH`, `Eh_mV`, `pe`, `temperature_C`, `ionic_strength_M` and its basis, `debye_hueckel_A`, `log_gamma` of charge
        numbers 1 to 3, `total_mol_L`, `ligands` (mol/L and log activity of the element), `candidates` (name, limit in
        words, log of the element activity at the sample's pe, its change per pe, dissolved forms with log m and share),
        `field`, and `line` (reaction, potential on it at the sample's pH, distance) to the next field along E.
    """
    stated = settings.stability
    ready = waters(sample, (element,), stated)
    choice = Choice(stated.solids, tuple(stated.with_names), tuple(stated.without_names))
    target, rows = choice.system(element), np.array([0])
    bath = ready.bath(rows, bool(ready.tied[0]))
    log_total = ready.log_total(element, rows)
    solved = solve(target, bath, ready.pe, log_total, choice)
    found = bath.environments(target, choice)
    here = found[int(locate(found, ready.pe)[0])]
    lines = target.lines(bath.X, log_total, here)
    margin, following = margins.along_pe(target, bath, ready.pe, log_total, solved.field, choice)
    strength = float(ready.ionic_strength_M[0])
    gamma = float(bath.X[0, FEATURES.index("Davies")])
    return {
        "element": element,
        "pH": float(ready.pH[0]),
        "Eh_mV": float(ready.Eh_mV[0]),
        "pe": float(ready.pe[0]),
        "temperature_C": float(ready.temperature_C[0]),
        "ionic_strength_M": strength,
        "ionic_strength_basis": str(ready.ionic_strength_basis[0]),
        "debye_hueckel_A": float(debye_hueckel_A(ready.temperature_C[0])),
        "log_gamma": {str(z): gamma * z * z for z in (1, 2, 3)},
        "total_mol_L": float(ready.totals[element][0]),
        "ligands": _ligands(target, ready, here, float(ready.pe[0])),
        "candidates": _candidates(lines, float(ready.pe[0])),
        "field": target.members[int(solved.field[0])].name,
        "line": _line(target, ready, here, log_total, int(solved.field[0]), int(following[0]), float(margin[0])),
    }


def _ligands(target: System, ready: Waters, here: Environment, pe: float) -> list[dict[str, Any]]:
    """Totals of the ligand elements and the activity their pools give them."""
    found = []
    for channel in target.channels:
        if channel not in here.alpha or channel == COMPANION:
            continue
        level = float(here.alpha[channel][0] + here.beta[channel] * pe)
        total = float(ready.ligands[channel][0])
        words = {"channel": channel, "from": LIGAND_INPUTS.get(channel, ""), "total_mol_L": total}
        found.append({**words, "log_a": level, "state": here.state if channel in SULFUR else ""})
    return found


def _candidates(lines: Lines, pe: float) -> list[dict[str, Any]]:
    """All candidates that can be, lowest element activity first: the first is the field."""
    level = lines.at(np.array([pe]))[0]
    rows = []
    for j in np.argsort(level, kind="stable"):
        if not np.isfinite(level[j]):
            continue
        members = lines.system.candidates[j]
        first = lines.system.members[members[0]]
        solid = bool(lines.system.solid[j])
        state = f"{lines.system.element}({first.oxidation_state})"
        rows.append(
            {
                "name": first.name if solid else f"dissolved {state}",
                "limit": "saturated" if solid else "holds the total",
                "log_a": float(level[j]),
                "per_pe": float(lines.beta[j]),
                "forms": [] if solid else _forms(lines, members, pe, float(level[j])),
            }
        )
    return rows


def _forms(lines: Lines, members: np.ndarray, pe: float, log_a: float) -> list[dict[str, Any]]:
    """Forms of a pool when it holds the total, largest first; traces are left out."""
    nu = lines.system.nu[members]
    amount = lines.q[0, members] + lines.slopes[members] * pe + nu * log_a
    share = np.power(10.0, amount - np.log10(np.power(10.0, amount).sum()))
    order = [k for k in np.argsort(-amount, kind="stable") if share[k] >= _SHOWN_SHARE]
    names = [lines.system.members[i].name for i in members]
    return [{"name": names[k], "log_m": float(amount[k]), "share": float(share[k])} for k in order]


def _line(target, ready: Waters, here: Environment, log_total, field: int, following: int, margin: float):
    """The reaction to the next field along E with the straight line of its dominant forms at the sample's pH."""
    if following < 0 or np.isnan(margin):
        return None
    t, pH = float(ready.temperature_C[0]), float(ready.pH[0])
    slope = float(nernst_slope_mV(t))
    forms = {}
    for channel in target.channels:
        if channel != COMPANION:
            tied = here.state.split(f" {COMPANION}")[0].strip() if channel in SULFUR else ""
            forms[channel] = largest(tied or channel, ready.X)[0]
    with np.errstate(divide="ignore"):
        totals = {channel: float(np.log10(ready.ligands[channel][0])) for channel in forms if channel in ready.ligands}
    a, b = target.members[field], target.members[following]
    record = {"next_field": b.name, "margin_mV": margin * slope, "reaction": "", "E_straight_mV": None}
    needed = {channel for item in (a, b) for channel in item.others}
    if not needed <= totals.keys() & forms.keys():
        return record
    X0 = features(np.zeros(1), t, float(ready.ionic_strength_M[0]))
    reaction = between(a, b, forms, float(log_total[0]), totals, X0)
    record |= {"reaction": reaction.text, "protons": reaction.protons, "electrons": reaction.electrons}
    if reaction.electrons:
        record["E_straight_mV"] = slope * (reaction.constant - reaction.protons * pH) / reaction.electrons
    return record
