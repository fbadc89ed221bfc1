"""The species table, checked and turned into formation reactions from element, water, proton and electron.

Every species is made as ``ν El + n_O H2O + h H^+ + e e^- + (other elements) = species`` with h = n_H − 2 n_O and
e = h − z. Values stand in `species.csv` with source and grade; the state of each is 25 °C, 1 bar, infinite dilution.

Temperature. A missing ΔHf is filled from the row's own defining reaction, with its ΔH_r where given, else with ΔH_r = 0
(log K of that reaction held); a row with neither is used at 25 ± 2 °C only. Cp enters only where every member of the
defining reaction has one; a missing one is filled so that ΔCp of that reaction is 0.
"""

import csv
import difflib
import re
from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from functools import cache
from importlib.resources import files
from types import MappingProxyType

from gley.constants import LN10, R_J_MOL_K, T0_K
from gley.errors import UsageError
from gley.formula import parse

OFFERED = ("Fe", "Mn", "As", "U", "Cr", "Se", "Cu", "Pb", "Zn", "Cd", "Ni", "Co", "V", "Mo", "Sb", "Hg", "Ag", "S")
"""Elements whose samples are assigned to fields: each one's chart was compared with a published one, three positions or
more in `tests/stability/test_stability_positions.py`.
"""

CHART_ONLY = ("N", "C")
"""Elements drawn as charts only: platinum doesn't sense their couples, so no sample is assigned by Eh."""

FIXED = {
    "C(IV)": ("C", "alkalinity"), "Cl(-I)": ("Cl", "Cl"), "P(V)": ("P", "PO4"), "Si(IV)": ("Si", "Si"),
    "F(-I)": ("F", "F"), "Ca(II)": ("Ca", "Ca"), "Mg(II)": ("Mg", "Mg"), "K(I)": ("K", "K"),
}  # fmt: skip
"""Ligand channels that keep their oxidation state whatever the Eh: what a chart calls each, and the analysis that tells
it. A channel is an element in one oxidation state."""

SULFUR = {"S(VI)": "SO4", "S(-II)": "sulfide"}
"""Sulfur's two channels and the analyses that tell them: as measured side by side, or tied by Eh."""

COMPANION = "Fe"
"""The metal that solids of As, Cr and Se may share; its own competition is solved first."""

SETS = {"none": (), "fresh": ("fresh",), "aged": ("fresh", "aged")}
"""Which solids each named set lets in; `named` solids come in by name only."""

_CP_ELECTRON = 14.4  # J/(mol K), half of H2(g) by convention
_RT_LN10_J = R_J_MOL_K * T0_K * LN10
_TERM = re.compile(r"^(?:(\d+(?:\.\d+)?) )?(.+)$")


@dataclass(frozen=True)
class Species:
    """One row of the table with its formation reaction.

    `nu` atoms of `element`; `h`, `e`, `n_O` count protons, electrons and water on the left; `others` counts the atoms
    of other elements by channel (element and oxidation state, such as `S(VI)`; a companion metal stands as `Fe`).
    `logK`, `dH_J_mol`, `dCp_J_mol_K` belong to the formation reaction.
    """

    name: str
    formula: str
    phase: str
    element: str
    oxidation_state: str
    set: str
    nu: int
    h: int
    e: int
    n_O: int
    charge: int
    others: Mapping[str, int]
    logK: float
    dH_J_mol: float
    dCp_J_mol_K: float
    T_basis: str
    dGf_kJ_mol: float
    dHf_kJ_mol: float | None
    given_logK: float | None
    reaction: str
    grade: str
    source: str
    seen: str
    alternatives: str
    note: str

    @property
    def dissolved(self) -> bool:
        """Whether it is a dissolved form (else a solid, liquid or gas)."""
        return self.phase == "dissolved"

    @property
    def kind(self) -> str:
        """`dissolved`, or `solid` for any phase of its own (liquid mercury too)."""
        return "dissolved" if self.dissolved else "solid"

    @property
    def only_at_25(self) -> bool:
        """Whether nothing tells its temperature dependence."""
        return self.T_basis.startswith("25")


def split_reaction(text: str) -> tuple[dict[str, float], dict[str, float]]:
    """`a A + b B = c C` → ({A: a, B: b}, {C: c}) by species name."""
    sides = []
    for side in text.split(" = "):
        terms: dict[str, float] = {}
        for part in side.split(" + "):
            found = _TERM.match(part.strip())
            if not found:
                message = f"'{text}' isn't a reaction"
                raise ValueError(message)
            terms[found.group(2)] = terms.get(found.group(2), 0.0) + float(found.group(1) or 1)
        sides.append(terms)
    left, right = sides
    return left, right


def net_reaction(text: str) -> dict[str, float]:
    """Stoichiometry of a reaction by species name, products positive."""
    left, right = split_reaction(text)
    names = {**left, **right}
    return {name: right.get(name, 0.0) - left.get(name, 0.0) for name in names}


@cache
def species() -> MappingProxyType:
    """Every species of the table by name.

    Raises
    ------
    ValueError
        When the table doesn't hold together: unknown member, unbalanced reaction, circular definition.
    """
    text = (files("gley.stability") / "species.csv").read_text(encoding="utf-8")
    rows = {row["name"]: row for row in csv.DictReader(text.splitlines())}
    energies, heats, bases, capacities = _derive(rows)
    found = {}
    for name, row in rows.items():
        found[name] = _species(row, energies, heats, bases, capacities)
    return MappingProxyType(found)


def _derive(rows: dict) -> tuple[dict, dict, dict, dict]:
    """ΔGf and ΔHf in J/mol, temperature basis, and Cp in J/(mol K) of every row, in order of definition."""
    energies: dict[str, float] = {"H^+": 0.0, "e^-": 0.0}
    heats: dict[str, float] = {"H^+": 0.0, "e^-": 0.0}
    genuine = {name: float(row["Cp_J_mol_K"]) for name, row in rows.items() if row["Cp_J_mol_K"]}
    genuine |= {"H^+": 0.0, "e^-": _CP_ELECTRON}
    capacities = {"H^+": 0.0, "e^-": _CP_ELECTRON}
    bases: dict[str, str] = {}
    waiting = list(rows)
    while waiting:
        ready = [name for name in waiting if _members(rows[name]) <= energies.keys()]
        if not ready:
            message = f"species defined by each other or by unknown names: {', '.join(waiting)}"
            raise ValueError(message)
        for name in ready:
            row = rows[name]
            energies[name] = _energy(row, energies)
            heats[name], bases[name] = _heat(row, heats)
            capacities[name] = _capacity(row, genuine, capacities, rows)
        waiting = [name for name in waiting if name not in energies]
    return energies, heats, bases, capacities


def _members(row: dict) -> set[str]:
    return set(net_reaction(row["reaction"])) - {row["name"]} if row["reaction"] else set()


def _own(row: dict) -> tuple[dict[str, float], float]:
    """The defining reaction without the row itself, and the row's own coefficient."""
    net = net_reaction(row["reaction"])
    return net, net.pop(row["name"])


def _energy(row: dict, energies: dict) -> float:
    if not row["logK"]:
        return 1000.0 * float(row["dGf_kJ_mol"])
    net, own = _own(row)
    total = sum(count * energies[name] for name, count in net.items())
    return (-_RT_LN10_J * float(row["logK"]) - total) / own


def _heat(row: dict, heats: dict) -> tuple[float, str]:
    if row["dHf_kJ_mol"]:
        return 1000.0 * float(row["dHf_kJ_mol"]), "dHf"
    if not row["reaction"]:
        return float("nan"), "25 ± 2 °C only"
    net, own = _own(row)
    total = sum(count * heats[name] for name, count in net.items())
    given = 1000.0 * float(row["dH_r_kJ_mol"] or 0.0)
    return (given - total) / own, "dH_r of the reaction" if row["dH_r_kJ_mol"] else "log K of the reaction held"


def _capacity(row: dict, genuine: dict, capacities: dict, rows: dict) -> float:
    if row["reaction"]:
        net, own = _own(row)
        if row["Cp_J_mol_K"] and net.keys() <= genuine.keys():
            return genuine[row["name"]]
        genuine.pop(row["name"], None)
        return -sum(count * capacities[name] for name, count in net.items()) / own
    if row["Cp_J_mol_K"]:
        return genuine[row["name"]]
    # nothing ties it to another species: its formation from the element gets ΔCp = 0
    n_O, _, e, nu, others = _counts(row)
    element_cp = sum(count * _element_cp(el, rows) for el, count in ((row["element"], nu), *others.items()))
    return element_cp + n_O * genuine["H2O"] + e * _CP_ELECTRON


def _element_cp(element: str, rows: dict) -> float:
    """Cp per mole of atoms of the element's reference state; 0 where no row has it (it cancels between rivals)."""
    for row in rows.values():
        atoms = parse(row["formula"]).atoms
        if set(atoms) == {element} and row["dGf_kJ_mol"] and float(row["dGf_kJ_mol"]) == 0 and row["Cp_J_mol_K"]:
            return float(row["Cp_J_mol_K"]) / atoms[element]
    return 0.0


def _counts(row: dict) -> tuple[int, int, int, int, dict[str, int]]:
    """n_O, h, e, ν and the other elements' counts of a row."""
    formula = parse(row["formula"])
    atoms = dict(formula.atoms)
    n_O, n_H = atoms.pop("O", 0), atoms.pop("H", 0)
    h = n_H - 2 * n_O
    nu = atoms.pop(row["element"], 0) if row["element"] else 0
    return n_O, h, h - formula.charge, nu, atoms


def _species(row: dict, energies: dict, heats: dict, bases: dict, capacities: dict) -> Species:
    name = row["name"]
    n_O, h, e, nu, others = _counts(row)
    channels = {part.split("(")[0]: part for part in row["ligands"].split()}
    if channels.keys() != others.keys():
        message = f"{name}: ligands {row['ligands'] or 'none'} don't name the other elements {sorted(others)}"
        raise ValueError(message)
    known_heat = heats[name] == heats[name]
    # elements are at their reference state in these formation reactions: their ΔGf, ΔHf are 0, their Cp left out
    return Species(
        name=name, formula=row["formula"], phase=row["phase"], element=row["element"],
        oxidation_state=row["oxidation_state"], set=row["set"], nu=nu, h=h, e=e, n_O=n_O,
        charge=parse(row["formula"]).charge, others=MappingProxyType({channels[el]: k for el, k in others.items()}),
        logK=-(energies[name] - n_O * energies["H2O"]) / _RT_LN10_J,
        dH_J_mol=heats[name] - n_O * heats["H2O"] if known_heat else 0.0,
        dCp_J_mol_K=capacities[name] - n_O * capacities["H2O"] - e * _CP_ELECTRON if known_heat else 0.0,
        T_basis=bases[name], dGf_kJ_mol=energies[name] / 1000.0,
        dHf_kJ_mol=heats[name] / 1000.0 if known_heat else None,
        given_logK=float(row["logK"]) if row["logK"] else None, reaction=row["reaction"],
        grade=row["grade"], source=row["source"], seen=row["seen"], alternatives=row["alternatives"], note=row["note"],
    )  # fmt: skip


def names_like(text: str, pool: Iterable[str]) -> list[str]:
    """Names of a pool that a user's word means: the same, or starting with it, case and spaces aside."""
    want = re.sub(r"\s+", "", text).lower()
    plain = {name: re.sub(r"\s+", "", name).lower() for name in pool}
    exact = [name for name, key in plain.items() if key == want]
    return exact or [name for name, key in plain.items() if key.startswith(want)]


def select(
    element: str, solids: str, with_names: Iterable[str] = (), without_names: Iterable[str] = ()
) -> list[Species]:
    """Dissolved forms and solids of an element that compete, in the order of the table.

    Parameters
    ----------
    element : str
        Symbol.
    solids : str
        `fresh`, `aged` or `none`.
    with_names, without_names : iterable of str
        Species added (`named` ones, or solids of another set) and left out, by name or its beginning. A name that
        belongs to another element is none of this element's business; check names with `check_names`.
    """
    own = [item for item in species().values() if item.element == element and item.set != "base"]
    names = [item.name for item in own]
    added = {name for word in with_names for name in names_like(word, names)}
    removed = {name for word in without_names for name in names_like(word, names)}
    allowed = {"default", *SETS[solids]}
    return [item for item in own if (item.set in allowed or item.name in added) and item.name not in removed]


def check_names(with_names: Iterable[str], without_names: Iterable[str]) -> None:
    """Refuse names that mean no species, or several to be added.

    Raises
    ------
    UsageError
        Naming the word and the nearest names.
    """
    names = [item.name for item in species().values() if item.set != "base"]
    for word in (*with_names, *without_names):
        found = names_like(word, names)
        if not found:
            near = difflib.get_close_matches(word, names, 3, 0.4)
            message = f"No species is called '{word}'."
            raise UsageError(message, f"Near names: {', '.join(near)}." if near else "See `gley data` for the names.")
        if len(found) > 1 and word in with_names:
            message = f"'{word}' means several species: {', '.join(found)}."
            raise UsageError(message, "Give the whole name.")
