"""What water itself sets: features of a sample, activity coefficients, ionic strength, carbonate, water's own limits.

Concentrations are mol/L taken as mol/kg (waters below about 0.5 M); pH is an activity; log γ follows Davies 1962.
"""

from functools import cache

import numpy as np
import pandas as pd

from gley.columns import constituents
from gley.constants import LN10, R_J_MOL_K, T0_K, kelvin, nernst_slope_mV
from gley.stability.data import Species, species

FEATURES = ("1", "1/T0 − 1/T", "ln(T/T0) + T0/T − 1", "pH", "log a_w", "Davies", "I")
"""Columns of the feature matrix; every log concentration is linear in them."""

_CORE_IONS = ("Ca", "Mg", "Na", "Cl", "SO4")
_CONDUCTIVITY_FACTOR = 1.6e-5  # mol/L per µS/cm at 25 °C: Russell 1976, in Standard Methods 2330 (from memory)
IMPLAUSIBLE_mV = 100.0
"""A potential further than this outside water's stability can't be a reading of a water at rest (common practice)."""

DIC_MIN_PH = 4.5
"""Below the end point of the alkalinity titration alkalinity says nothing about inorganic carbon."""


def debye_hueckel_A(temperature_C):
    """Debye-Hückel A (log10, kg^½ mol^−½) from density and permittivity of water.

    Density: Thiesen-type formula; permittivity: Truesdell & Jones 1974 (both from memory; A is 0.509 at 25 °C).
    """
    t, T = np.asarray(temperature_C, float), kelvin(np.asarray(temperature_C, float))
    density = 1 - (t - 3.9863) ** 2 * (t + 288.9414) / (508929.2 * (t + 68.12963))
    permittivity = 2727.586 + 0.6224107 * T - 466.9151 * np.log(T) - 52000.87 / T
    return 1.8248e6 * np.sqrt(density) / (permittivity * T) ** 1.5


def davies(temperature_C, ionic_strength_M):
    """log10 γ of a singly charged ion (Davies 1962 with 0.3 I); multiply by z²."""
    root = np.sqrt(ionic_strength_M)
    return -debye_hueckel_A(temperature_C) * (root / (1 + root) - 0.3 * np.asarray(ionic_strength_M))


def features(pH, temperature_C, ionic_strength_M) -> np.ndarray:
    """Feature matrix (n, 7) of samples; the activity of water is 1 − 0.017 Σm with Σm = 2 I (Garrels & Christ 1965)."""
    pH, t, strength = np.broadcast_arrays(*(np.asarray(x, float) for x in (pH, temperature_C, ionic_strength_M)))
    T = kelvin(t)
    log_aw = np.log10(np.maximum(1 - 0.034 * strength, 0.5))
    ratio = T / T0_K
    return np.column_stack([
        np.ones_like(T), 1 / T0_K - 1 / T, np.log(ratio) + 1 / ratio - 1, pH, log_aw, davies(t, strength), strength,
    ])  # fmt: skip


def coefficients(members) -> np.ndarray:
    """Coefficient matrix (7, S): features @ coefficients is log m at pe = 0 and unit element activities."""
    columns = []
    for item in members:
        charge = -float(item.charge**2) if item.dissolved else 0.0
        neutral = -0.1 if item.dissolved and item.charge == 0 else 0.0
        scale = R_J_MOL_K * LN10
        heat, capacity = item.dH_J_mol / scale, item.dCp_J_mol_K / scale
        columns.append([item.logK, heat, capacity, -float(item.h), float(item.n_O), charge, neutral])
    return np.array(columns).T.reshape(len(FEATURES), -1)


def product(X: np.ndarray, matrix: np.ndarray) -> np.ndarray:
    """X @ matrix with the columns contiguous in memory: sums and maxima over the forms then run along the samples."""
    return (matrix.T @ X.T).T


def log_sum(terms: np.ndarray) -> np.ndarray:
    """log10 of the sum of powers of ten along the last axis; −inf where all terms are."""
    top = terms.max(axis=-1, keepdims=True)
    safe = np.where(np.isfinite(top), top, 0.0)
    with np.errstate(divide="ignore"):  # exp is several times quicker than a power of ten
        return safe[..., 0] + np.log10(np.exp((terms - safe) * LN10).sum(axis=-1))


def mean_by_amount(terms: np.ndarray, log_total: np.ndarray, values: np.ndarray) -> np.ndarray:
    """Mean (n,) of `values` (forms,) or (n, forms), weighted by powers of ten of `terms` whose `log_sum` is given."""
    safe = np.where(np.isfinite(log_total), log_total, 0.0)
    return (np.exp((terms - safe[:, None]) * LN10) * values).sum(axis=-1)


@cache
def pool(channel: str) -> tuple[Species, ...]:
    """Dissolved forms of a channel such as `C(IV)` or `S(-II)`: one element in one oxidation state."""
    element, _, state = channel.rstrip(")").partition("(")
    return tuple(
        item
        for item in species().values()
        if item.element == element and item.oxidation_state == state and item.set == "default" and item.dissolved
    )


@cache
def _pool_matrix(channel: str) -> np.ndarray:
    return coefficients(pool(channel))


def pool_terms(channel: str, X: np.ndarray) -> np.ndarray:
    """log m of each form of a channel (n, forms) at pe = 0 and unit activity of its element."""
    return product(X, _pool_matrix(channel))


def fractions(channel: str, X: np.ndarray) -> dict[str, np.ndarray]:
    """Share of each form in a channel's total, by species name."""
    terms = pool_terms(channel, X)
    shares = np.power(10.0, terms - log_sum(terms)[:, None])
    return {item.name: shares[:, i] for i, item in enumerate(pool(channel))}


def water_lines(temperature_C, pH) -> dict[str, np.ndarray]:
    """E in V of water's two limits at each pH (arrays (n,) or scalars): O2 at 1 bar and H2 at 1 bar.

    O2(g) + 4 H^+ + 4 e^- = 2 H2O and 2 H^+ + 2 e^- = H2(g), from the table's O2(g), H2(g) and H2O.
    """
    pH, t = np.broadcast_arrays(*(np.atleast_1d(np.asarray(x, float)) for x in (pH, temperature_C)))
    X = features(np.zeros_like(pH), t, 0.0)
    lines = {}
    for name, gas in (("O2/H2O", "O2(g)"), ("H2O/H2", "H2(g)")):
        item = species()[gas]
        log_K = (X @ coefficients([item]))[:, 0]
        lines[name] = nernst_slope_mV(t) / 1000 * (log_K - pH * item.h) / item.e
    return lines


def beyond_water(pH, Eh_mV, temperature_C) -> np.ndarray:
    """How far in mV a potential lies outside water's stability at 1 bar: + above O2/H2O, − below H2O/H2, 0 within.

    Arrays (n,) of pH, Eh in mV and temperature in °C; NaN where one is missing.
    """
    lines = water_lines(temperature_C, pH)
    Eh = np.asarray(Eh_mV, float)
    return np.maximum(Eh - 1000 * lines["O2/H2O"], 0.0) + np.minimum(Eh - 1000 * lines["H2O/H2"], 0.0)


def ionic_strength(frame: pd.DataFrame, balance_percent: float, default_M: float) -> tuple[np.ndarray, np.ndarray]:
    """Ionic strength in mol/L and its basis in words, sample by sample.

    Major ions where Ca, Mg, Na, Cl, SO4 and alkalinity (or HCO3) are there and the charge balance closes within
    `balance_percent`; else 1.6e-5 × conductivity at 25 °C in µS/cm; else `default_M`.
    """
    known = constituents()
    positive, negative, strength = (np.zeros(len(frame)) for _ in range(3))
    for key in ("Ca", "Mg", "Na", "K", "NH4", "Fe", "Mn", "Cl", "SO4", "NO3", "NO2", "F"):
        amount = column_of(frame, known[key].column)
        charge = known[key].charge
        strength += 0.5 * np.nan_to_num(amount) * charge**2
        side = positive if charge > 0 else negative
        side += np.nan_to_num(amount) * abs(charge)
    alkalinity = _alkalinity(frame)
    negative += np.nan_to_num(alkalinity)
    strength += 0.5 * np.nan_to_num(alkalinity)
    acid = np.power(10.0, -np.nan_to_num(column_of(frame, "pH"), nan=7.0))
    positive, strength = positive + acid, strength + 0.5 * acid
    complete = ~np.isnan(alkalinity)
    for key in _CORE_IONS:
        complete &= ~np.isnan(column_of(frame, known[key].column))
    total = positive + negative
    error = 100 * np.abs(positive - negative) / np.where(total > 0, total, 1.0)
    conductivity = column_of(frame, "SC_uS_cm")
    majors = complete & (error <= balance_percent)
    by_conductivity = _CONDUCTIVITY_FACTOR * conductivity
    value = np.where(majors, strength, np.where(np.isnan(by_conductivity), default_M, by_conductivity))
    basis = np.where(
        majors, "major ions", np.where(np.isnan(by_conductivity), f"{default_M:g} M assumed", "conductivity")
    )
    return value, basis.astype(object)


def inorganic_carbon(frame: pd.DataFrame, X: np.ndarray) -> np.ndarray:
    """Dissolved inorganic carbon in mol/L from alkalinity at own pH, T and I; measured DIC wins; NaN = unknown.

    Taken from alkalinity first: OH^-, H^+ and, where measured, HS^-, NH3, phosphate and silicate. Unknown below pH 4.5
    (the alkalinity end point), where alkalinity says nothing about carbon.
    """
    pH, alkalinity = column_of(frame, "pH"), _alkalinity(frame)
    hydroxide = np.power(10.0, (X @ coefficients([species()["OH^-"]]))[:, 0])
    proton = np.power(10.0, -pH - X[:, FEATURES.index("Davies")])
    rest = alkalinity - hydroxide + proton
    for key, channel, equivalents in (
        ("sulfide", "S(-II)", {"HS^-": 1}),
        ("NH4", "N(-III)", {"NH3(aq)": 1}),
        ("PO4", "P(V)", {"HPO4^2-": 1, "PO4^3-": 2, "H3PO4(aq)": -1}),
        ("Si", "Si(IV)", {"H3SiO4^-": 1}),
    ):
        amount = np.nan_to_num(column_of(frame, f"{key}_mol_L"))
        if not amount.any():
            continue
        shares = fractions(channel, X)
        rest = rest - amount * sum(count * shares[name] for name, count in equivalents.items())
    shares = fractions("C(IV)", X)
    per_carbon = shares["HCO3^-"] + 2 * shares["CO3^2-"]
    with np.errstate(divide="ignore", invalid="ignore"):
        carbon = np.where(pH >= DIC_MIN_PH, np.maximum(rest, 0.0) / per_carbon, np.nan)
    measured = column_of(frame, "DIC_mol_L")
    return np.where(np.isnan(measured), carbon, measured)


def _alkalinity(frame: pd.DataFrame) -> np.ndarray:
    """Alkalinity in eq/L: as measured, else bicarbonate and twice carbonate."""
    given = column_of(frame, "alkalinity_eq_L")
    bicarbonate = column_of(frame, "HCO3_mol_L") + 2 * np.nan_to_num(column_of(frame, "CO3_mol_L"))
    return np.where(np.isnan(given), bicarbonate, given)


def column_of(frame: pd.DataFrame, name: str) -> np.ndarray:
    """A numeric column of a frame, NaN throughout where it isn't there."""
    if name not in frame:
        return np.full(len(frame), np.nan)
    return frame[name].to_numpy(dtype=float, na_value=np.nan)
