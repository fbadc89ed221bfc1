"""Made-up waters for the engine's tests, and the second engine run on the same table of samples."""

import brute
import numpy as np
import pandas as pd
from reaction_math import volt_per_decade

from gley.settings import Settings

QUICK = {"draws": 16}
"""Probabilities aren't looked at here: as few points as the settings take."""


def settings(**stability):
    return Settings().replace(stability={**QUICK, **stability})


def random_waters(n, seed, temperature_C=None, sulfide="some", gaps=True):
    """n waters over the whole range of groundwater and a bit beyond; `sulfide`: some, all or none analysed."""
    rng = np.random.default_rng(seed)

    def decades(low, high):
        return 10.0 ** rng.uniform(low, high, n)

    frame = pd.DataFrame({
        "sample": [f"W{i:04d}" for i in range(n)],
        "pH": rng.uniform(2.0, 12.0, n), "Eh_mV": rng.uniform(-500, 1100, n),
        "temperature_C": rng.uniform(1, 40, n) if temperature_C is None else np.full(n, float(temperature_C)),
        "SC_uS_cm": decades(1.5, 4.4),
        "Fe_mol_L": decades(-7, -2.5), "Mn_mol_L": decades(-7, -3), "As_mol_L": decades(-8, -3.5),
        "DIC_mol_L": decades(-4, -1.7), "SO4_mol_L": decades(-5, -1.7), "Cl_mol_L": decades(-4, -1),
        "sulfide_mol_L": decades(-7, -2.5),
    })  # fmt: skip
    if sulfide == "none":
        frame = frame.drop(columns="sulfide_mol_L")
    elif sulfide == "some":
        frame.loc[rng.random(n) < 0.5, "sulfide_mol_L"] = np.nan
    if gaps:
        for name in ("DIC_mol_L", "SO4_mol_L", "Fe_mol_L"):
            frame.loc[rng.random(n) < 0.1, name] = np.nan
    return frame


def column(frame, name):
    return frame[name].to_numpy(float) if name in frame else np.full(len(frame), np.nan)


def conditions(frame, pH=None, Eh_mV=None, sulfur="measured"):
    """What the second engine needs, for waters that treat sulfur alike; pH and Eh may be put in."""
    T = column(frame, "temperature_C")
    pH = column(frame, "pH") if pH is None else pH
    Eh = column(frame, "Eh_mV") if Eh_mV is None else Eh_mV
    ligands = {"C(IV)": column(frame, "DIC_mol_L"), "Cl(-I)": column(frame, "Cl_mol_L")}
    sulfate, sulfide = column(frame, "SO4_mol_L"), column(frame, "sulfide_mol_L")
    if is_tied(frame, sulfur).any():
        ligands["S"] = sulfate + np.nan_to_num(sulfide)
    else:
        ligands |= {"S(VI)": sulfate, "S(-II)": sulfide}
    strength = 1.6e-5 * column(frame, "SC_uS_cm")
    return brute.Water(pH, Eh / 1000 / volt_per_decade(T), T, strength, ligands, column(frame, "Fe_mol_L"))


def is_tied(frame, sulfur="measured"):
    """Sulfur is tied by Eh where sulfate was analysed and sulfide wasn't, or where the settings say so."""
    known = ~np.isnan(column(frame, "SO4_mol_L"))
    return known if sulfur == "tied" else known & np.isnan(column(frame, "sulfide_mol_L"))


def total(frame, element):
    if element == "S":
        return column(frame, "SO4_mol_L") + np.nan_to_num(column(frame, "sulfide_mol_L"))
    return column(frame, f"{element}_mol_L")


def solved(frame, element, solids="fresh", extra=(), sulfur="measured", **put_in):
    """(solver, answer, rows) of the second engine for each way of treating sulfur; rows without a total left out."""
    known = ~np.isnan(total(frame, element))
    tied = is_tied(frame, sulfur)
    for treatment in (True, False):
        rows = np.flatnonzero(known & (tied == treatment))
        if len(rows):
            part = frame.iloc[rows]
            cut = {name: value[rows] for name, value in put_in.items()}
            solver = brute.Solver(conditions(part, sulfur=sulfur, **cut), solids, extra)
            yield solver, solver.solve(element, total(part, element)), rows
