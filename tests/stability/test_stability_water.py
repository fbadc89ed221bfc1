"""Water's lines, activity coefficients, ionic strength and inorganic carbon against formulas of the tests' own."""

import brute
import numpy as np
import pandas as pd
import pytest
from reaction_math import volt_per_decade

from gley.stability import beyond_water, water_lines
from gley.stability.water import debye_hueckel_A, features, inorganic_carbon, ionic_strength


@pytest.mark.parametrize("T_C", [0.0, 10.0, 25.0, 40.0])
def test_waters_lines(T_C):
    pH = np.array([0.0, 7.0, 14.0])
    lines = water_lines(T_C, pH)
    slope = volt_per_decade(T_C)
    # 1.229 V and −0.846 mV/K for O2/H2O (CRC; Bratsch 1989, from memory); H2 at 1 bar is the zero of the scale
    np.testing.assert_allclose(lines["O2/H2O"], 1.229 - 0.846e-3 * (T_C - 25) - slope * pH, atol=6e-4)
    np.testing.assert_allclose(lines["H2O/H2"], -slope * pH, atol=1e-9 if T_C == 25 else 2e-4)


def test_waters_lines_fall_by_the_nernst_slope():
    for T_C, slope_mV in ((0.0, 54.20), (10.0, 56.18), (25.0, 59.16), (40.0, 62.14)):
        for line in water_lines(T_C, np.array([4.0, 5.0])).values():
            assert 1000 * (line[1] - line[0]) == pytest.approx(-slope_mV, abs=0.006)


def test_beyond_water_is_positive_above_and_negative_below():
    beyond = beyond_water(np.array([7.0, 7.0, 7.0, np.nan]), np.array([900.0, -500.0, 200.0, 0.0]), np.full(4, 25.0))
    assert beyond[0] == pytest.approx(900 - (1229 - 7 * 59.16), abs=1)
    assert beyond[1] == pytest.approx(-500 + 7 * 59.16, abs=1)
    assert beyond[2] == 0.0
    assert np.isnan(beyond[3])


def test_debye_hueckel_A_from_natural_constants():
    T_C = np.array([0.5, 5.0, 10.0, 15.0, 25.0, 40.0, 50.0])
    np.testing.assert_allclose(debye_hueckel_A(T_C), brute.debye_hueckel_A(T_C), rtol=0.004)
    # 0.509–0.511 at 25 °C in textbooks
    assert debye_hueckel_A(25.0) == pytest.approx(0.510, abs=0.0012)


@pytest.mark.parametrize(("charge", "gamma"), [(1, 0.782), (2, 0.373), (3, 0.108)])
def test_davies_at_a_tenth_molar(charge, gamma):
    # textbook figures for the Davies equation at I = 0.1 and A = 0.509
    X = features(7.0, 25.0, 0.1)
    assert 10 ** (X[0, 5] * charge**2) == pytest.approx(gamma, rel=0.012)


def test_activity_of_water():
    # sea-water-like 0.5 M: 0.983
    assert 10 ** features(7.0, 25.0, 0.5)[0, 4] == pytest.approx(0.983, abs=0.0005)


def plummer_busenberg(T_C):
    T = T_C + 273.15
    K1 = -356.3094 - 0.06091964 * T + 21834.37 / T + 126.8339 * np.log10(T) - 1684915 / T**2
    K2 = -107.8871 - 0.03252849 * T + 5151.79 / T + 38.92561 * np.log10(T) - 563713.9 / T**2
    # Harned & Hamer 1933 as in Stumm & Morgan, from memory
    Kw = -4470.99 / T + 6.0875 - 0.01706 * T
    return 10.0**K1, 10.0**K2, 10.0**Kw


def carbon_of(alkalinity, pH, T_C, strength):
    """DIC in mol/L from alkalinity in eq/L, by the constants of Plummer & Busenberg 1982 and Davies."""
    K1, K2, Kw = plummer_busenberg(T_C)
    one, two = (10.0 ** brute.log_gamma(z, T_C, strength) for z in (1, 2))
    neutral = 10.0 ** (0.1 * strength)
    proton = 10.0**-pH
    bicarbonate = (alkalinity - Kw / proton / one + proton / one) / (1 + 2 * K2 * one / (proton * two))
    return bicarbonate * (1 + K2 * one / (proton * two) + proton * one / (K1 * neutral))


@pytest.mark.parametrize("T_C", [5.0, 15.0, 25.0])
@pytest.mark.parametrize("pH", [4.8, 6.0, 6.4, 7.5, 8.3, 9.5, 10.5])
@pytest.mark.parametrize("strength", [0.001, 0.01, 0.1])
def test_inorganic_carbon_from_alkalinity(T_C, pH, strength):
    alkalinity = 4e-3
    frame = pd.DataFrame({"pH": [pH], "alkalinity_eq_L": [alkalinity]})
    found = inorganic_carbon(frame, features(np.array([pH]), T_C, strength))
    # a_w is left out by the equation above: up to 0.2 % at 0.1 M
    assert found[0] == pytest.approx(carbon_of(alkalinity, pH, T_C, strength), rel=0.012)


def test_inorganic_carbon_takes_other_bases_off_first():
    # pH 9.8 at 25 °C: 1 mM sulfide is HS^- (pK 7), 1 mM ammonium is half … NH3 (pK 9.25), 1 mM phosphate HPO4^2-
    pH = np.array([9.8])
    X = features(pH, 25.0, 0.0)

    def carbon(**amounts):
        return inorganic_carbon(pd.DataFrame({"pH": pH, "alkalinity_eq_L": 5e-3, **amounts}), X)[0]

    per_mol = carbon() / (5e-3 - 10**-4.2)
    assert (carbon() - carbon(sulfide_mol_L=1e-3)) / per_mol == pytest.approx(1e-3 / (1 + 10 ** (6.98 - 9.8)), rel=0.01)
    assert (carbon() - carbon(NH4_mol_L=1e-3)) / per_mol == pytest.approx(1e-3 / (1 + 10 ** (9.246 - 9.8)), rel=0.01)
    assert (carbon() - carbon(PO4_mol_L=1e-3)) / per_mol == pytest.approx(1e-3 * 1.0028, rel=0.01)
    assert (carbon() - carbon(Si_mol_L=1e-3)) / per_mol == pytest.approx(1e-3 / (1 + 10 ** (9.82 - 9.8)), rel=0.03)


def test_inorganic_carbon_is_unknown_below_pH_4_5_and_measured_carbon_wins():
    frame = pd.DataFrame({"pH": [4.49, 4.51, 4.0], "alkalinity_eq_L": 1e-3, "DIC_mol_L": [np.nan, np.nan, 7e-3]})
    found = inorganic_carbon(frame, features(frame["pH"].to_numpy(), 15.0, 0.01))
    assert np.isnan(found[0])
    assert found[1] > 0.04  # nearly all of it CO2
    assert found[2] == 7e-3


def test_ionic_strength_falls_back_in_order():
    # 5 mM CaCl2 + 5 mM NaHCO3: I = ½ (4·5 + 10 + 5 + 5) mM = 20 mM
    whole = {"pH": 7.0, "Ca_mol_L": 5e-3, "Mg_mol_L": 0.0, "Na_mol_L": 5e-3, "Cl_mol_L": 10e-3, "SO4_mol_L": 0.0,
             "alkalinity_eq_L": 5e-3, "SC_uS_cm": 1000.0}  # fmt: skip
    unbalanced = {**whole, "Na_mol_L": 50e-3}
    incomplete = {**whole, "Ca_mol_L": np.nan}
    nothing = {**incomplete, "SC_uS_cm": np.nan}
    value, basis = ionic_strength(pd.DataFrame([whole, unbalanced, incomplete, nothing]), 10.0, 0.010)
    np.testing.assert_allclose(value, [0.020, 0.016, 0.016, 0.010], rtol=1e-4)
    assert list(basis) == ["major ions", "conductivity", "conductivity", "0.01 M assumed"]
