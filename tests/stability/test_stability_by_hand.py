"""One water for each element, worked through by hand: published constants and plain arithmetic, no engine.

25 °C and zero ionic strength, so that constants stand as published. Constants are typed here apart from the species
table, from the sources named beside them (from memory where no `seen` stands). A field begins where the whole dissolved
oxidation state outweighs the other, or where a solid is saturated by what is dissolved.
"""

from math import log10

import pandas as pd
import pytest

from gley.settings import Settings
from gley.stability import OFFERED, assign

VOLT = 0.05916
"""Nernst slope at 25 °C in V."""

PK1, PK2 = 6.35, 10.33  # carbonic acid, CRC Handbook (Perrin 1982, seen)
WORKED = ("Fe", "Mn", "As", "S", "U", "Cr", "Se", "Cu", "Pb", "Zn", "Cd", "Ni", "Co", "V", "Mo", "Sb", "Hg", "Ag")


def water(element, stability=None, **amounts):
    """The row gley gives to one water of 25 °C and zero ionic strength."""
    frame = pd.DataFrame([{"sample": "W", "temperature_C": 25.0, **amounts}])
    given = {"draws": 16, "default_ionic_strength_M": 0.0, **(stability or {})}
    return assign(frame, [element], Settings().replace(stability=given)).iloc[0]


def carbonate(pH, DIC):
    """HCO3^- and CO3^2- in mol/L."""
    parts = 10 ** (PK1 - pH), 1.0, 10 ** (pH - PK2)
    return DIC / sum(parts), DIC * parts[2] / sum(parts)


def expect(row, *, field, share=None, SI=None, line_V=None, Eh_mV=None, within=(0.02, 0.1, 8.0)):
    """Field, and where given the share of the largest form, the SI and the next line's potential."""
    assert row["field"] == field
    if share is not None:
        assert row["share"] == pytest.approx(share, abs=within[0])
    if SI is not None:
        assert row["SI"] == pytest.approx(SI, abs=within[1])
    if line_V is not None:
        assert row["margin_mV"] == pytest.approx(1000 * line_V - Eh_mV, abs=within[2])


def test_every_offered_element_is_worked():
    names = {name.removeprefix("test_").partition("_")[0] for name in globals() if name.startswith("test_")}
    assert set(OFFERED) <= set(WORKED)
    assert {element.lower() for element in WORKED} <= names


def test_fe_1e5_M_at_pH_7_leaves_ferrihydrite_at_30_mV():
    # Stumm & Morgan 1996 (seen): Fe(OH)3 of log Ksp -38.5, pE = 16.54 - log Fe(II) - 3 pH; FeOH^+ of pK 9.5
    ferrous = 1e-5 / (1 + 10 ** (7 - 9.5))
    line = VOLT * (16.54 - log10(ferrous) - 3 * 7)
    row = water("Fe", pH=7.0, Eh_mV=-100.0, Fe_mol_L=1e-5)
    expect(row, field="Fe^2+", share=1 / (1 + 10 ** (7 - 9.5)), line_V=line, Eh_mV=-100)
    assert row["next_field"] == "ferrihydrite (2-line)"


def test_mn_1e5_M_at_pH_7_stays_dissolved_up_to_610_mV():
    # Stumm & Morgan 1996 (seen): birnessite pE = 21.82 - 0.5 log Mn(II) - 2 pH
    line = VOLT * (21.82 + 2.5 - 2 * 7)
    row = water("Mn", pH=7.0, Eh_mV=300.0, Mn_mol_L=1e-5)
    expect(row, field="Mn^2+", share=1.0, line_V=line, Eh_mV=300)
    assert row["next_field"] == "birnessite"


def test_as_at_pH_7_is_half_and_half_arsenate_and_turns_to_arsenite_near_zero():
    # pKs 2.30 and 6.99 (Nordstrom & Archer 2003, seen); E0 H3AsO4/H3AsO3 0.575 V (Harris, seen)
    half = 10 ** (6.99 - 7)
    per_HAsO4 = 1 + half
    line = 0.575 + VOLT / 2 * (2.30 + 6.99 - 4 * 7) - VOLT / 2 * log10(per_HAsO4)
    reduced = 10 ** (2 * (1000 * line - 100) / (1000 * VOLT)) * per_HAsO4
    row = water("As", pH=7.0, Eh_mV=100.0, As_mol_L=1e-6)
    expect(row, field="HAsO4^2-", share=1 / (per_HAsO4 + reduced), line_V=line, Eh_mV=100)
    assert row["next_field"] == "H3AsO3(aq)"


def test_s_at_pH_7_turns_to_sulfide_at_minus_212_mV():
    # Stumm & Morgan 1996 (seen): pE = 4.25 - 9/8 pH for SO4^2-/HS^-; H2S of pK 6.99
    per_HS = 1 + 10 ** (6.99 - 7)
    line = VOLT * (4.25 - 9 / 8 * 7 + log10(per_HS) / 8)
    row = water("S", pH=7.0, Eh_mV=0.0, SO4_mol_L=1e-3)
    expect(row, field="SO4^2-", share=1.0, line_V=line, Eh_mV=0)


def test_u_in_calcium_bicarbonate_water_is_a_neutral_calcium_complex():
    # log beta of UO2 with CO3: 9.94, 16.61, 21.84 (Grenthe et al. 1992); with Ca 27.18 and 30.70 (Dong & Brooks 2006)
    pH, Ca = 7.5, 1e-3
    CO3 = carbonate(pH, 4e-3)[1]
    forms = {
        "UO2^2+": 1.0, "UO2OH^+": 10 ** (pH - 5.25), "UO2(OH)2(aq)": 10 ** (2 * pH - 12.15),
        "UO2CO3(aq)": 10**9.94 * CO3, "UO2(CO3)2^2-": 10**16.61 * CO3**2, "UO2(CO3)3^4-": 10**21.84 * CO3**3,
        "CaUO2(CO3)3^2-": 10**27.18 * Ca * CO3**3, "Ca2UO2(CO3)3(aq)": 10**30.70 * Ca**2 * CO3**3,
    }  # fmt: skip
    largest = max(forms, key=forms.get)
    free = 1e-7 / sum(forms.values())
    # UO2^2+/U^4+ 0.2673 V and UO2(am) + 4 H^+ = U^4+ + 2 H2O of log K 1.5 (Neck & Kim 2001, log Ksp -54.5)
    line = 0.2673 + VOLT / 2 * (log10(free) - 1.5)
    row = water("U", pH=pH, Eh_mV=300.0, U_mol_L=1e-7, DIC_mol_L=4e-3, Ca_mol_L=Ca)
    expect(row, field=largest, share=forms[largest] / sum(forms.values()), line_V=line, Eh_mV=300)
    assert largest == row["dissolved_form"] == "Ca2UO2(CO3)3(aq)"
    assert row["next_field"] == "uranium dioxide (amorphous)"


def test_cr_1e6_M_at_pH_7_turns_from_chromate_to_hydroxide_at_half_a_volt():
    # Cr2O7^2-/Cr^3+ 1.36 V (CRC), dimer log K 1.53 (Baes & Mesmer 1976), pK 6.49 (CRC, seen), Cr(OH)3 log *K 9.35
    # (Rai et al. 1987)
    chromate = 1 / (1 + 10 ** (6.49 - 7))
    E0 = 1.36 + VOLT / 6 * 1.53 + VOLT / 3 * (6.49 - 9.35)
    line = E0 - VOLT * 5 / 3 * 7 + VOLT / 3 * log10(1e-6 * chromate)
    row = water("Cr", pH=7.0, Eh_mV=700.0, Cr_mol_L=1e-6)
    expect(row, field="CrO4^2-", share=chromate, line_V=line, Eh_mV=700)
    assert row["next_field"] == "chromium(III) hydroxide (amorphous)"


def test_se_at_pH_7_turns_from_biselenite_to_selenate_at_455_mV():
    # Pourbaix 1966: 1.075 - 0.0886 pH; H2SeO3 of pKs 2.64 and 8.36 (Olin et al. 2005)
    per_HSeO3 = 1 + 10 ** (7 - 8.36) + 10 ** (2.64 - 7)
    line = 1.075 - 0.0886 * 7 + VOLT / 2 * log10(per_HSeO3)
    selenate = per_HSeO3 * 10 ** (2 * (400 - 1000 * line) / (1000 * VOLT))
    row = water("Se", pH=7.0, Eh_mV=400.0, Se_mol_L=1e-7)
    expect(row, field="HSeO3^-", share=1 / (per_HSeO3 + selenate), line_V=line, Eh_mV=400)
    assert row["next_field"] == "SeO4^2-"


def test_cu_1e6_M_at_pH_7_dissolves_its_fresh_hydroxide_but_not_tenorite():
    # hydrolysis 7.95 and 16.2, Cu(OH)2 8.67, CuO 7.64 (Powell et al. 2007); cuprite 0.203 + 0.0591 pH (Pourbaix 1966)
    share = 1 / (1 + 10 ** (7 - 7.95) + 10 ** (14 - 16.2))
    free = log10(1e-6 * share)
    line = 0.203 + 0.0591 * (7 + free)
    row = water("Cu", pH=7.0, Eh_mV=400.0, Cu_mol_L=1e-6)
    # 8 mV between cuprite of the atlas and of Robie & Hemingway 1995
    expect(row, field="Cu^2+", share=share, SI=free + 14 - 8.67, line_V=line, Eh_mV=400, within=(0.02, 0.1, 12.0))
    assert row["next_field"] == "cuprite"
    expect(water("Cu", {"solids": "aged"}, pH=7.0, Eh_mV=400.0, Cu_mol_L=1e-6), field="tenorite", SI=free + 14 - 7.64)


def test_pb_1e6_M_at_pH_7_and_1_mM_carbon_is_just_above_cerussite():
    # cerussite -13.18, PbCO3(aq) 6.45, Pb(CO3)2 10.13, hydrolysis 7.46 and 16.94 (Powell et al. 2009)
    CO3 = carbonate(7, 1e-3)[1]
    pair = 10**6.45 * CO3
    side = 1 + pair + 10**10.13 * CO3**2 + 10 ** (7 - 7.46) + 10 ** (14 - 16.94)
    row = water("Pb", pH=7.0, Eh_mV=300.0, Pb_mol_L=1e-6, DIC_mol_L=1e-3)
    expect(row, field="cerussite", share=pair / side, SI=log10(1e-6 / side * CO3) + 13.18)
    assert row["dissolved_form"] == "PbCO3(aq)"
    # solubility 4.2e-7 mol/L: below it no field of cerussite
    soluble = 10**-13.18 / CO3 * side
    assert water("Pb", pH=7.0, Eh_mV=300.0, Pb_mol_L=0.8 * soluble, DIC_mol_L=1e-3)["kind"] == "dissolved"
    assert water("Pb", pH=7.0, Eh_mV=300.0, Pb_mol_L=1.2 * soluble, DIC_mol_L=1e-3)["field"] == "cerussite"


def test_zn_1e5_M_at_pH_7_5_and_2_mM_carbon_is_just_above_smithsonite():
    # smithsonite -10.9, ZnCO3(aq) 4.75, ZnHCO3^+ 1.62, Zn(OH)2(aq) 17.89 (Powell et al. 2013), ZnOH^+ 8.96
    HCO3, CO3 = carbonate(7.5, 2e-3)
    side = 1 + 10**4.75 * CO3 + 10**1.62 * HCO3 + 10 ** (7.5 - 8.96) + 10 ** (15 - 17.89)
    row = water("Zn", pH=7.5, Eh_mV=300.0, Zn_mol_L=1e-5, DIC_mol_L=2e-3)
    expect(row, field="smithsonite", share=1 / side, SI=log10(1e-5 / side * CO3) + 10.9)
    assert row["dissolved_form"] == "Zn^2+"


def test_cd_in_10_mM_chloride_is_half_chloro_complexes_and_below_otavite():
    # CdCl 1.98, CdCl2 2.64, CdCO3(aq) 4.4, CdOH 9.8 (Powell et al. 2011); otavite -12.1 (Stipp et al. 1993)
    CO3, Cl = carbonate(8, 2e-3)[1], 1e-2
    side = 1 + 10**1.98 * Cl + 10**2.64 * Cl**2 + 10**4.4 * CO3 + 10 ** (8 - 9.8)
    row = water("Cd", pH=8.0, Eh_mV=300.0, Cd_mol_L=1e-7, DIC_mol_L=2e-3, Cl_mol_L=Cl)
    expect(row, field="Cd^2+", share=1 / side, SI=log10(1e-7 / side * CO3) + 12.1)
    assert row["solid"] == "otavite"


def test_ni_1e5_M_at_pH_8_is_below_its_hydroxide():
    # Ni(OH)2 log *K 11.67 (seen); NiOH 9.54, Ni(OH)2(aq) 18.0 (Gamsjäger et al. 2005)
    share = 1 / (1 + 10 ** (8 - 9.54) + 10 ** (16 - 18.0))
    row = water("Ni", pH=8.0, Eh_mV=300.0, Ni_mol_L=1e-5)
    expect(row, field="Ni^2+", share=share, SI=log10(1e-5 * share) + 16 - 11.67)


def test_co_1e5_M_at_pH_8_is_far_below_its_hydroxide():
    # Ksp 2.5e-16 (seen), so log *K 12.4 with pKw 14; CoOH 9.65, Co(OH)2(aq) 18.8 (Baes & Mesmer 1976)
    share = 1 / (1 + 10 ** (8 - 9.65) + 10 ** (16 - 18.8))
    row = water("Co", pH=8.0, Eh_mV=300.0, Co_mol_L=1e-5)
    expect(row, field="Co^2+", share=share, SI=log10(1e-5 * share) + 16 - 12.4, within=(0.02, 0.15, 8.0))


def test_v_1e7_M_at_pH_6_turns_from_vanadate_to_vanadyl_near_30_mV():
    # VO2^+/VO^2+ 1.000 V (Bard et al. 1985); VO2^+ to H2VO4^- 7.1, to H3VO4 3.3, VO^2+ 5.67 (Baes & Mesmer 1976);
    # HVO4^2- of pK 8.2
    vanadate = 1 + 10 ** (7.1 - 3.3 - 6) + 10 ** (6 - 8.2)
    vanadyl = 1 + 10 ** (5.67 - 6)
    line = 1.000 + VOLT * (7.1 - 5.67 - 3 * 6) + VOLT * log10(vanadyl / vanadate)
    row = water("V", pH=6.0, Eh_mV=250.0, V_mol_L=1e-7)
    expect(row, field="H2VO4^-", share=1 / vanadate, line_V=line, Eh_mV=250)
    assert row["next_field"] == "VO(OH)^+"


def test_mo_is_molybdate_above_pH_4_and_below_powellite():
    # pKs 4.24 and 4.0 (Smith & Martell 1976); powellite -7.95 (Essington 1990)
    row = water("Mo", pH=5.0, Eh_mV=400.0, Mo_mol_L=1e-6)
    expect(row, field="MoO4^2-", share=1 / (1 + 10 ** (4.24 - 5) + 10 ** (8.24 - 10)))
    row = water("Mo", {"solids": "aged"}, pH=8.0, Eh_mV=400.0, Mo_mol_L=1e-6, Ca_mol_L=2e-3)
    expect(row, field="MoO4^2-", share=1.0, SI=-6 + log10(2e-3) + 7.95)
    assert row["solid"] == "powellite"


def test_sb_1e7_M_at_pH_7_stays_dissolved_down_to_minus_320_mV():
    # Pourbaix 1966: HSbO2/Sb 0.230 - 0.0591 pH + 0.0197 log Sb(III); Sb(OH)4^- of pK 11.8 (Baes & Mesmer 1976)
    line = 0.230 - 0.0591 * 7 + 0.0197 * -7
    row = water("Sb", {"solids": "aged"}, pH=7.0, Eh_mV=-200.0, Sb_mol_L=1e-7)
    expect(row, field="Sb(OH)3(aq)", share=1 / (1 + 10 ** (7 - 11.8)), line_V=line, Eh_mV=-200)
    assert row["next_field"] == "antimony"


def test_hg_at_pH_7_and_1_mM_chloride_is_hydroxochloride_down_to_400_mV():
    # Powell et al. 2005: Cl 7.31, 14.00, 14.93, 15.54; OH 3.4, 5.98; HgOHCl 4.27. Hg^2+/Hg 0.851 V (CRC);
    # solubility of mercury 60 ug/L, 10^-6.53 mol/L
    Cl, h = 1e-3, 1e-7
    forms = (
        1.0, 10**7.31 * Cl, 10**14.00 * Cl**2, 10**14.93 * Cl**3, 10**15.54 * Cl**4, 10**-3.4 / h, 10**-5.98 / h**2,
    )  # fmt: skip
    mixed = 10**4.27 * Cl / h
    side = sum(forms) + mixed
    line = 0.851 - VOLT / 2 * 6.53 - VOLT / 2 * log10(side)
    row = water("Hg", pH=7.0, Eh_mV=600.0, Hg_mol_L=1e-9, Cl_mol_L=Cl)
    expect(row, field="HgOHCl(aq)", share=mixed / side, line_V=line, Eh_mV=600)
    assert row["next_field"] == "Hg(aq)"


def test_ag_1e7_M_in_1_mM_chloride_is_a_neutral_complex_below_chlorargyrite():
    # AgCl(aq) 3.31, AgCl2 5.25 (Smith & Martell 1976); chlorargyrite -9.75; Ag^+/Ag 0.799 V (CRC)
    Cl = 1e-3
    pair = 10**3.31 * Cl
    side = 1 + pair + 10**5.25 * Cl**2
    free = log10(1e-7 / side)
    row = water("Ag", pH=7.0, Eh_mV=500.0, Ag_mol_L=1e-7, Cl_mol_L=Cl)
    line = 0.799 + VOLT * free
    expect(row, field="AgCl(aq)", share=pair / side, line_V=line, Eh_mV=500)
    assert row["next_field"] == "silver"
    # chlorargyrite is 0.76 below saturation
    fresh = water("Ag", {"without_names": ("silver", "silver oxide")}, pH=7.0, Eh_mV=500.0, Ag_mol_L=1e-7, Cl_mol_L=Cl)
    expect(fresh, field="AgCl(aq)", SI=free - 3 + 9.75)
