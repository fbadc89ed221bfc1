"""Potentials of measured couples against textbook constants by plain arithmetic, and what is made of them.

Constants of Stumm & Morgan 1996 (pe° per electron, seen where their table was) and others as named; ionic strength 0.
"""

import math

import numpy as np
import pandas as pd
import pytest

from gley.evidence import Eh_from, couples_table, scenario_table, with_measured, with_robust
from gley.findings import Findings
from gley.settings import Settings
from gley.stability import assign, couple_potentials, couples

VOLT = 59.16  # mV per pe unit at 25 °C


def water(**given):
    return {"sample": "w", "pH": 7.0, "temperature_C": 25.0, "SC_uS_cm": 0.0, "Eh_mV": 200.0, "Eh_sd_mV": 30.0, **given}


def frame(*rows):
    return pd.DataFrame(list(rows))


def potential(couple, **given):
    found = couple_potentials(frame(water(**given)), Settings()).set_index("couple")
    return float(found.loc[couple, "Eh_mV"])


def test_oxygen_and_water():
    # 1.229 V (any table); 1.26e-3 mol/L at 1 bar (Benson & Krause 1984, memory); 2.6e-4 mol/L is air-saturated water
    expected = 1229 - VOLT * 7.0 + VOLT / 4 * math.log10(2.6e-4 / 1.26e-3)
    assert potential("oxygen", O2_mol_L=2.6e-4) == pytest.approx(expected, abs=3)


def test_iron_and_ferrihydrite():
    # pe of Fe(OH)3 of log Ksp −38.5 + 3 H+ + e- = Fe2+: 16.54 (Stumm & Morgan 1996, seen)
    pe = 16.54 - 3 * 6.0 + 5.0
    assert potential("iron", pH=6.0, Fe_II_mol_L=1e-5) == pytest.approx(VOLT * pe, abs=6)
    assert potential("iron", pH=6.0, Fe_mol_L=1e-5) == pytest.approx(VOLT * pe, abs=6)


def test_manganese_and_birnessite():
    # MnO2 + 4 H+ + 2 e- = Mn2+: 1.292 V for birnessite (Bricker 1965, memory)
    expected = 1292 - 2 * VOLT * 6.5 + VOLT / 2 * 6.0
    assert potential("manganese", pH=6.5, Mn_mol_L=1e-6) == pytest.approx(expected, abs=6)


def test_arsenic():
    # H3AsO4 + 2 H+ + 2 e- = H3AsO3 + H2O: 0.572 V, pK1 2.30 (Nordstrom & Archer 2003, memory); all H2AsO4- at pH 4.6
    expected = 572 + VOLT / 2 * 2.30 - 1.5 * VOLT * 4.6 + VOLT / 2 * math.log10(3.0)
    assert potential("arsenic", pH=4.6, As_V_mol_L=3e-7, As_III_mol_L=1e-7) == pytest.approx(expected, abs=4)
    assert potential("arsenic", pH=4.6, As_mol_L=4e-7, As_III_mol_L=1e-7) == pytest.approx(expected, abs=4)


def test_sulfate_and_sulfide():
    # 1/8 SO4 + 9/8 H+ + e- = 1/8 HS- + 1/2 H2O: pe° 4.25 (Stumm & Morgan 1996, seen); pK of H2S 7.0
    sulfide = 1e-5 / (1 + 10 ** (7.0 - 8.5))
    expected = VOLT * (4.25 - 9 / 8 * 8.5 + math.log10(1e-3 / sulfide) / 8)
    assert potential("sulfur", pH=8.5, SO4_mol_L=1e-3, sulfide_mol_L=1e-5) == pytest.approx(expected, abs=4)


def test_nitrate_and_ammonium():
    # 1/8 NO3 + 5/4 H+ + e- = 1/8 NH4 + 3/8 H2O: pe° 14.9 (Stumm & Morgan 1996, seen)
    expected = VOLT * (14.9 - 1.25 * 6.0 + math.log10(10.0) / 8)
    assert potential("nitrogen", pH=6.0, NO3_mol_L=1e-4, NH4_mol_L=1e-5) == pytest.approx(expected, abs=4)


def test_chromium():
    # HCrO4- + 7 H+ + 3 e- = Cr3+ + 4 H2O: 1.35 V older, 1.38 V with Cr3+ −215.5 kJ (25 mV, see the row's note), at pH 2
    expected = 1380 - VOLT * 7 / 3 * 2.0
    found = potential("chromium", pH=2.0, Cr_mol_L=2e-6, Cr_VI_mol_L=1e-6)
    assert found == pytest.approx(expected, abs=25)


def test_every_couple_has_both_forms_in_the_engine():
    rows = water(
        Fe_mol_L=1e-5, Fe_II_mol_L=1e-5, Fe_III_mol_L=1e-8, Mn_mol_L=1e-6, As_III_mol_L=1e-7, As_V_mol_L=1e-7,
        Cr_mol_L=2e-7, Cr_VI_mol_L=1e-7, Se_IV_mol_L=1e-8, Se_VI_mol_L=1e-8, Sb_III_mol_L=1e-8, Sb_V_mol_L=1e-8,
        SO4_mol_L=1e-3, sulfide_mol_L=1e-6, NO3_mol_L=1e-4, NO2_mol_L=1e-6, NH4_mol_L=1e-5, CH4_mol_L=1e-6,
        alkalinity_eq_L=3e-3, O2_mol_L=1e-4,
    )  # fmt: skip
    found = couple_potentials(frame(rows), Settings())
    assert list(found["couple"]) == list(couples())
    assert found["Eh_mV"].between(-400, 1300).all()
    assert (found["Eh_sd_mV"] > 0).all()


def test_a_non_detect_makes_no_couple():
    rows = frame(water(As_III_mol_L=1e-8, As_III_limit="<", As_V_mol_L=1e-7), water(sample="x", As_V_mol_L=1e-7))
    assert couple_potentials(rows, Settings()).empty


def test_standard_deviation_follows_pH_and_log_K():
    # one electron, three protons: 3 × 0.1 pH and 0.4 log units of a grade B solid, 10 % of the total
    found = couple_potentials(frame(water(pH=6.0, Fe_mol_L=1e-5, pH_sd=0.1)), Settings()).set_index("couple")
    expected = VOLT * math.sqrt(0.3**2 + 0.4**2 + (0.1 / math.log(10)) ** 2)
    assert found.loc["iron", "Eh_sd_mV"] == pytest.approx(expected, rel=0.01)


def eh_table(samples):
    return pd.DataFrame({
        "Eh_mV": samples["Eh_mV"], "Eh_sd_mV": samples["Eh_sd_mV"], "Eh_sd_own_mV": 30.0, "Eh_sd_common_mV": 5.0,
        "pe": samples["Eh_mV"] / VOLT, "temperature_used_C": 25.0, "Eh_basis": "electrode", "Eh_status": "ok",
    })  # fmt: skip


def test_Eh_of_a_couple_is_taken_where_there_is_one():
    samples = frame(water(pH=6.0, Fe_mol_L=1e-5), water(sample="x"))
    settings, findings = Settings().replace(evidence={"Eh_from": "iron"}), Findings()
    table = couples_table(samples, settings, findings)
    found = Eh_from(eh_table(samples), samples["sample"], table, settings, findings)
    assert found["Eh_mV"].tolist() == pytest.approx([VOLT * 3.54, 200.0], abs=6)
    assert found["Eh_platinum_mV"].tolist() == [200.0, 200.0]
    assert found["pe"].tolist() == pytest.approx((found["Eh_mV"] / VOLT).tolist(), abs=0.01)
    assert found["Eh_basis"].tolist() == ["iron couple: Fe, ferrihydrite (2-line)", "electrode"]
    assert {item.rule for item in findings} >= {"evidence.Eh_from_couple", "evidence.couple_missing"}
    same = Eh_from(eh_table(samples), samples["sample"], table, Settings(), Findings())
    assert "Eh_platinum_mV" not in same


def test_a_couple_far_from_the_electrode_is_said():
    findings = Findings()
    table = couples_table(frame(water(pH=6.0, Fe_mol_L=1e-5, Eh_mV=600.0)), Settings(), findings)
    assert table["agreement"].tolist() == ["platinum higher"]
    assert [item.rule for item in findings] == ["evidence.couples_differ"]
    near = couples_table(frame(water(pH=6.0, Fe_mol_L=1e-5, Eh_mV=215.0)), Settings(), Findings())
    assert near["agreement"].tolist() == ["agree"]


def test_measured_state_beside_the_assigned_one():
    # Eh says As(V), the laboratory found nine parts of As(III) in ten
    samples = frame(water(Eh_mV=400.0, As_mol_L=1e-6, As_III_mol_L=9e-7), water(sample="x", As_mol_L=1e-6))
    findings, settings = Findings(), Settings()
    fields = assign(samples, ["As"], settings)
    table = couples_table(samples, settings, findings)
    found = with_measured(fields, samples, table, settings, findings)
    assert found["field"].str.startswith("H").all()
    assert found["state_measured"].tolist() == ["As(III) 90 %", ""]
    assert found["field_measured"].tolist() == ["H3AsO3(aq)", ""]
    assert "evidence.state_differs" in {item.rule for item in findings}


def test_scenarios_say_what_changes_and_robust_counts_it():
    # Eh 20 mV above the line of 2-line ferrihydrite: the fresher gel, 1.4 log units more soluble, dissolves there
    samples = frame(water(pH=6.0, Fe_mol_L=1e-5, Eh_mV=230.0, Eh_sd_common_mV=5.0))
    settings = Settings()
    fields = assign(samples, ["Fe"], settings)
    assert fields["field"].tolist() == ["ferrihydrite (2-line)"]
    table = scenario_table(fields, samples, couples_table(samples, settings, Findings()), settings)
    said = table.set_index("scenario")
    assert said.loc["aged solids", "field"] == "goethite"
    assert said.loc["ferrihydrite at its least soluble", "field"] == "ferrihydrite (6-line)"
    assert said.loc["ferrihydrite fresh from the gel", "holds"] == "no"
    assert said.loc["all readings of a day and probe too high", "holds"] == "yes"
    yes = int((table["holds"] == "yes").sum())
    assert with_robust(fields, table)["robust"].tolist() == [f"{yes} of {len(table)}"]
    assert yes == len(table) - int(said.loc["Eh from the iron couple", "holds"] == "no") - 1


def test_unassigned_samples_have_no_scenario():
    samples = frame(water(pH=np.nan, Fe_mol_L=1e-5))
    fields = assign(samples, ["Fe"])
    table = scenario_table(fields, samples, couples_table(samples, Settings(), Findings()), Settings())
    assert table.empty
    assert with_robust(fields, table)["robust"].tolist() == [""]
