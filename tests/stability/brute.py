"""A second engine for the tests: slow, plain, from chemical potentials of the elements. Shares no code with gley.

Each species i made of n_k atoms of the elements k and of charge z has log a_i = Σ n_k μ_k − z μ_e − G_i, all over
RT ln10, with μ_e = G_e − pe, μ_H = μ_e − pH, μ_O = μ(H2O) − 2 μ_H, and μ of every other element set by what holds its
total (or by a pure solid). The species table is read as the file it is; formation energies are worked out once more.
"""

import csv
from dataclasses import dataclass, field
from importlib.resources import files

import numpy as np
from reaction_math import LN10, T0, R, composition, kelvin, sides

SETS = {"none": {"default"}, "fresh": {"default", "fresh"}, "aged": {"default", "fresh", "aged"}}
CP_ELECTRON = 14.42  # half of H2(g), 28.84 J/(mol K)
NO_SPECIES = ""


@dataclass
class Row:
    name: str
    atoms: dict
    charge: int
    element: str
    state: str
    phase: str
    set: str
    channels: dict
    reaction: str
    G: float = np.nan  # J/mol
    H: float = np.nan  # J/mol
    Cp: float = np.nan  # J/(mol K)
    genuine_Cp: bool = False
    grade: str = ""


@dataclass
class Water:
    """Conditions of n waters as arrays; ligand totals in mol/L by channel (`S` = tied by Eh), NaN = not there."""

    pH: np.ndarray
    pe: np.ndarray
    T_C: np.ndarray
    strength: np.ndarray
    ligands: dict = field(default_factory=dict)
    iron: np.ndarray | None = None


def read_rows():
    """The species table with ΔGf, ΔHf and Cp of every row, those given by a reaction included."""
    text = (files("gley.stability") / "species.csv").read_text(encoding="utf-8")
    raw = {row["name"]: row for row in csv.DictReader(text.splitlines())}
    rows = {}
    for name, item in raw.items():
        atoms, charge = composition(item["formula"])
        channels = {part.split("(")[0]: part for part in item["ligands"].split()}
        rows[name] = Row(name, atoms, charge, item["element"], item["oxidation_state"], item["phase"], item["set"],
                         channels, item["reaction"], grade=item["grade"])  # fmt: skip
        given = item["Cp_J_mol_K"]
        rows[name].genuine_Cp = bool(given)
        rows[name].Cp = float(given) if given else np.nan
    rows["H^+"] = Row("H^+", {"H": 1}, 1, "", "", "", "base", {}, "", 0.0, 0.0, 0.0, True)
    rows["e^-"] = Row("e^-", {}, -1, "", "", "", "base", {}, "", 0.0, 0.0, CP_ELECTRON, True)
    for name in raw:
        _complete(rows, raw, name)
    return rows


def _complete(rows, raw, name):
    """Energies of a row, by its reaction where it has no value of its own; members first."""
    row, item = rows[name], raw.get(name)
    if item is None or not np.isnan(row.G):
        return
    terms = sides(row.reaction) if row.reaction else []
    own = sum(count for count, other in terms if other == name)
    rest = [(count, rows[other]) for count, other in terms if other != name]
    for _, other in rest:
        _complete(rows, raw, other.name)

    def solve_for(change, value):
        return (change - sum(count * getattr(other, value) for count, other in rest)) / own

    row.G = solve_for(-R * T0 * LN10 * float(item["logK"]), "G") if item["logK"] else 1000 * float(item["dGf_kJ_mol"])
    if item["dHf_kJ_mol"]:
        row.H = 1000 * float(item["dHf_kJ_mol"])
    elif rest:
        row.H = solve_for(1000 * float(item["dH_r_kJ_mol"] or 0), "H")
    if rest:
        # Cp counts only where the whole reaction has it
        row.genuine_Cp = row.genuine_Cp and all(other.genuine_Cp for _, other in rest)
        if not row.genuine_Cp:
            row.Cp = solve_for(0.0, "Cp")
    elif not row.genuine_Cp:
        row.Cp = _Cp_of_formation(rows, row)


def _Cp_of_formation(rows, row):
    """Cp that leaves the formation from the elements (with water, H+ and e-) without ΔCp."""
    n_O, n_H = row.atoms.get("O", 0), row.atoms.get("H", 0)
    electrons = (n_H - 2 * n_O) - row.charge
    total = n_O * rows["H2O"].Cp + electrons * CP_ELECTRON
    for symbol, count in row.atoms.items():
        if symbol not in "OH":
            pure = [r for r in rows.values() if set(r.atoms) == {symbol} and r.charge == 0 and r.genuine_Cp]
            total += count * (pure[0].Cp / pure[0].atoms[symbol] if pure else 0.0)
    return total


ROWS = read_rows()


def debye_hueckel_A(T_C):
    """From natural constants, Kell's density (1975) and Malmberg & Maryott's permittivity (1956) of water, memory."""
    t, T = T_C, kelvin(T_C)
    density = 999.83952 + 16.945176 * t - 7.9870401e-3 * t**2 - 46.170461e-6 * t**3 + 105.56302e-9 * t**4
    density = (density - 280.54253e-12 * t**5) / (1 + 16.897850e-3 * t)
    permittivity = 87.740 - 0.40008 * t + 9.398e-4 * t**2 - 1.410e-6 * t**3
    e, k, N, vacuum = 1.602176634e-19, 1.380649e-23, 6.02214076e23, 8.8541878128e-12
    return e**3 * np.sqrt(2 * N * density) / (LN10 * 8 * np.pi * (vacuum * permittivity * k * T) ** 1.5)


def log_gamma(charge, T_C, strength):
    """Davies 1962; neutral forms 0.1 I."""
    if charge == 0:
        return 0.1 * strength
    root = np.sqrt(strength)
    return -debye_hueckel_A(T_C) * charge**2 * (root / (1 + root) - 0.3 * strength)


def reduced_G(row, T_C):
    """G/(RT ln10) of a row at temperature: from ΔH, ΔS and Cp against 25 °C."""
    T = kelvin(np.asarray(T_C, float))
    entropy = (row.H - row.G) / T0
    at_T = row.H - T * entropy + row.Cp * (T - T0 - T * np.log(T / T0))
    return at_T / (R * T * LN10)


class Solver:
    """Potentials of elements in given waters, then everything's activity."""

    def __init__(self, water, solids="fresh", extra=(), left_out=()):
        self.water, self.extra, self.left_out = water, set(extra), set(left_out)
        self.allowed = SETS[solids]
        mu_water = reduced_G(ROWS["H2O"], water.T_C) + np.log10(1 - 0.017 * 2 * water.strength)
        self.mu_electron = reduced_G(ROWS["e^-"], water.T_C) - water.pe
        self.mu = {"H": self.mu_electron - water.pH}
        self.mu["O"] = mu_water - 2 * self.mu["H"]
        self.state = None
        self.state_gap = np.full(len(water.pH), np.inf)
        self._ligands()

    def members(self, element):
        rows = [row for row in ROWS.values() if row.element == element and row.set != "base"]
        rows = [row for row in rows if row.set in self.allowed or row.name in self.extra]
        return [row for row in rows if row.name not in self.left_out]

    def log_m(self, row, own):
        """log activity (solid) or molality (dissolved) with the own element's potential at 0; −inf = can't be."""
        w = self.water
        value = -row.charge * self.mu_electron - reduced_G(row, w.T_C)
        for symbol, count in row.atoms.items():
            if symbol == own:
                continue
            channel = row.channels.get(symbol, symbol)
            potential = self.mu.get(channel)
            if potential is None:
                return np.full(len(w.pH), -np.inf)
            value = value + count * np.where(np.isnan(potential), -np.inf, potential)
        if row.phase == "dissolved":
            value = value - log_gamma(row.charge, w.T_C, w.strength)
            if self.state is not None and any(ch.startswith("S(") for ch in row.channels.values()):
                value = np.where(self.state == row.channels["S"], value, -np.inf)
        return value

    def _pool_potential(self, element, state, total):
        """Potential at which the forms of one state sum to the total."""
        parts = [
            row
            for row in ROWS.values()
            if row.element == element and row.state == state and row.set == "default" and row.phase == "dissolved"
        ]
        # the state of a channel holds one atom per form in this table
        amounts = sum(10.0 ** (self.log_m(row, element) - self._top(parts, element)) for row in parts)
        with np.errstate(divide="ignore"):
            level = np.log10(total) - self._top(parts, element) - np.log10(amounts)
        return np.where(np.isfinite(level), level, np.nan)

    def _top(self, parts, element):
        return np.max([self.log_m(row, element) for row in parts], axis=0)

    def _ligands(self):
        for channel, total in self.water.ligands.items():
            if channel != "S":
                element, state = channel[:-1].split("(")
                self.mu[channel] = self._pool_potential(element, state, total)
        if "S" in self.water.ligands:
            total = self.water.ligands["S"]
            levels = {state: self._pool_potential("S", state, total) for state in ("VI", "-II")}
            if "fresh" in self.allowed and "sulfur (rhombic)" not in self.left_out:
                pure = reduced_G(ROWS["sulfur (rhombic)"], self.water.T_C)
                levels["0"] = np.where(np.isnan(levels["VI"]), np.nan, pure)
            names = np.array(list(levels))
            stack = np.where(np.isnan(list(levels.values())), np.inf, list(levels.values()))
            self.state = np.array([f"S({name})" for name in names])[stack.argmin(axis=0)]
            ordered = np.sort(stack, axis=0)
            with np.errstate(invalid="ignore"):
                self.state_gap = np.where(np.isfinite(ordered[1]), ordered[1] - ordered[0], np.inf)
            lowest = np.where(np.isfinite(stack.min(axis=0)), stack.min(axis=0), np.nan)
            self.mu["S(VI)"] = self.mu["S(-II)"] = lowest
        if self.water.iron is not None:
            answer = self.solve("Fe", self.water.iron)
            self.mu["Fe"] = np.where(np.isnan(self.water.iron), np.nan, answer.potential)
            self.state_gap = np.fmin(self.state_gap, np.where(np.isnan(self.water.iron), np.inf, answer.gap))

    def solve(self, element, total):
        """The element's competition: who reaches its limit at the lowest potential of the element."""
        members = self.members(element)
        unit = {row.name: self.log_m(row, element) for row in members}
        log_total = np.log10(total)
        levels, namers = {}, {}
        pools = {}
        for row in members:
            nu = row.atoms[element]
            if row.phase != "dissolved":
                levels[row.name], namers[row.name] = -unit[row.name] / nu, [row]
            elif nu > 1:
                levels[row.name], namers[row.name] = (log_total - np.log10(nu) - unit[row.name]) / nu, [row]
            else:
                pools.setdefault(row.state, []).append(row)
        for state, forms in pools.items():
            stack = np.array([unit[row.name] for row in forms])
            top = stack.max(axis=0)
            levels[state] = log_total - top - np.log10((10.0 ** (stack - top)).sum(axis=0))
            namers[state] = forms
        return Answer(element, unit, levels, namers)


@dataclass
class Answer:
    """Levels (n,) of every candidate and what follows from them."""

    element: str
    unit: dict
    levels: dict
    namers: dict

    def __post_init__(self):
        self.keys = list(self.levels)
        self.table = np.array([self.levels[key] for key in self.keys])
        order = np.sort(self.table, axis=0)
        self.potential = order[0]
        self.gap = order[1] - order[0]
        self.field = self._named(self.table.argmin(axis=0))
        liquid = [k for k, key in enumerate(self.keys) if self.namers[key][0].phase == "dissolved"]
        self.liquid_level = self.table[liquid].min(axis=0)
        self.form = self._named(np.array(liquid)[self.table[liquid].argmin(axis=0)])
        self.form_gap = self._form_gap()

    def _named(self, winner):
        names = np.empty(winner.shape, dtype=object)
        for k in np.unique(winner):
            rows = winner == k
            forms = self.namers[self.keys[k]]
            stack = np.array([self.unit[row.name][rows] for row in forms])
            names[rows] = np.array([row.name for row in forms], dtype=object)[stack.argmax(axis=0)]
        return names

    def _form_gap(self):
        """log10 ratio of the largest to the second form of the winning pool (n,); inf for a single form."""
        found = np.full(self.potential.shape, np.inf)
        winner = self.table.argmin(axis=0)
        for k, key in enumerate(self.keys):
            forms = self.namers[key]
            if len(forms) > 1:
                stack = np.sort([self.unit[row.name] for row in forms], axis=0)
                with np.errstate(invalid="ignore"):
                    gap = np.where(np.isfinite(stack[-2]), stack[-1] - stack[-2], np.inf)
                found = np.where(winner == k, gap, found)
        return found

    def SI(self):
        """Highest saturation index among the solids and its solid, at the dissolved total's own potential."""
        best, name = np.full(self.potential.shape, -np.inf), np.full(self.potential.shape, "", dtype=object)
        for key, forms in self.namers.items():
            if forms[0].phase == "dissolved":
                continue
            nu = forms[0].atoms[self.element]
            value = nu * (self.liquid_level - self.levels[key])
            higher = value > best
            best, name = np.where(higher, value, best), np.where(higher, key, name)
        return np.where(np.isfinite(best), best, np.nan), name

    def share(self, form):
        """Share of a dissolved form in all mononuclear ones, at one potential (n,)."""
        forms = [row for rows in self.namers.values() for row in rows if row.phase == "dissolved"]
        forms = [row for row in forms if row.atoms[self.element] == 1]
        stack = np.array([self.unit[row.name] for row in forms])
        top = stack.max(axis=0)
        shares = 10.0 ** (stack - top) / (10.0 ** (stack - top)).sum(axis=0)
        index = {row.name: k for k, row in enumerate(forms)}
        return np.array([shares[index[name], k] for k, name in enumerate(form)])


def bisected_potential(solver, forms, element, total):
    """Potential of an element by bisection on the sum of its forms: a check of the closed form used above."""
    lo, hi = np.full(len(total), -400.0), np.full(len(total), 400.0)
    unit = [solver.log_m(row, element) for row in forms]
    for _ in range(80):
        middle = 0.5 * (lo + hi)
        with np.errstate(over="ignore"):
            amount = sum(10.0 ** np.minimum(value + middle, 300.0) for value in unit)
        lo, hi = np.where(amount < total, middle, lo), np.where(amount < total, hi, middle)
    return 0.5 * (lo + hi)
