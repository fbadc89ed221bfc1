"""The redox process against the published framework, row by row.

McMahon & Chapelle 2008, Ground Water 46: 259-271, table 1, with the iron/sulfide ratio of Chapelle and others 2009,
Ground Water 47: 300-305 (thresholds from memory, ratio limits seen).
"""

import pandas as pd
import pytest

from gley.evidence import process_table
from gley.formula import molar_mass
from gley.settings import Settings

WEIGHED = {"O2": "O2", "NO3": "N", "Mn": "Mn", "Fe": "Fe", "SO4": "SO4", "sulfide": "H2S"}
PER_UNIT = {"O2": 1e3, "NO3": 1e3, "Mn": 1e6, "Fe": 1e6, "SO4": 1e3, "sulfide": 1e3}  # mg/L, µg/L


def decide(**reported):
    """O2, NO3 as N, SO4, sulfide as H2S in mg/L, Mn and Fe in µg/L; a text such as '<0.5' is a limit."""
    row = {}
    for key, value in reported.items():
        text = str(value)
        row[f"{key}_mol_L"] = float(text.lstrip("<>")) / PER_UNIT[key] / molar_mass(WEIGHED[key])
        row[f"{key}_limit"] = text[0] if text[0] in "<>" else ""
    return process_table(pd.DataFrame([row]), Settings()).loc[0]


PUBLISHED = [
    # O2, NO3-N, Mn, Fe, SO4, sulfide, category, process; each row also at its own thresholds
    (5.0, 0.1, 10, 20, 20, 0.01, "oxic", "O2"),
    (0.5, 3.0, 49.9, 99.9, 20, 0.01, "oxic", "O2"),
    (0.2, 0.1, 10, 20, 20, 0.01, "suboxic", "suboxic"),
    (0.49, 0.49, 49.9, 99.9, 20, 0.01, "suboxic", "suboxic"),
    (0.2, 3.0, 10, 20, 20, 0.01, "anoxic", "NO3"),
    (0.49, 0.5, 49.9, 99.9, 20, 0.01, "anoxic", "NO3"),
    (0.2, 0.1, 50, 20, 20, 0.01, "anoxic", "Mn(IV)"),
    (0.2, 0.1, 500, 2000, 20, 0.01, "anoxic", "Fe(III)"),  # ratio 200
    (0.2, 0.1, 10, 100, 0.5, 0.0099, "anoxic", "Fe(III)"),  # ratio 10.1
    (0.2, 0.1, 500, 200, 20, 0.1, "anoxic", "Fe(III)-SO4"),  # ratio 2
    (0.2, 0.1, 500, 200, 20, 0.0201, "anoxic", "Fe(III)-SO4"),  # ratio 9.95
    (0.2, 0.1, 500, 200, 20, 0.66, "anoxic", "Fe(III)-SO4"),  # ratio 0.303
    (0.2, 0.1, 500, 200, 20, 0.67, "anoxic", "SO4"),  # ratio 0.299
    (0.2, 0.1, 500, 200, 20, 2.0, "anoxic", "SO4"),  # ratio 0.1
    (0.2, 0.1, 500, 2000, 0.2, 0.01, "anoxic", "CH4"),
    (2.0, 0.1, 100, 20, 20, 0.01, "mixed (oxic-anoxic)", "O2-Mn(IV)"),
    (2.0, 0.1, 10, 200, 20, 0.01, "mixed (oxic-anoxic)", "O2-Fe(III)/SO4"),
    (0.2, 3.0, 100, 20, 20, 0.01, "mixed (anoxic)", "NO3-Mn(IV)"),
    (0.2, 3.0, 10, 200, 20, 2.0, "mixed (anoxic)", "NO3-Fe(III)/SO4"),
]


@pytest.mark.parametrize("row", PUBLISHED, ids=lambda row: f"{row[6]}-{row[7]}")
def test_published_table(row):
    O2, NO3, Mn, Fe, SO4, sulfide, category, process = row
    found = decide(O2=O2, NO3=NO3, Mn=Mn, Fe=Fe, SO4=SO4, sulfide=sulfide)
    assert (found["redox_category"], found["redox_process"]) == (category, process)
    assert found["process_missing"] == ""


def test_without_sulfide_iron_and_sulfate_stay_together():
    found = decide(O2=0.2, NO3=0.1, Mn=500, Fe=2000, SO4=20)
    assert found["redox_process"] == "Fe(III)/SO4"
    assert found["process_missing"] == "not analysed: sulfide"
    mixed = decide(O2=2.0, NO3=0.1, Mn=500, Fe=2000, SO4=20)
    assert mixed["redox_process"] == "O2-Fe(III)/SO4"


def test_limit_below_the_threshold_decides_as_below():
    found = decide(O2="<0.1", NO3="<0.1", Mn="<5", Fe="<10", SO4=20, sulfide=0.01)
    assert found["redox_category"] == "suboxic"
    assert found["process_missing"] == ""


def test_limit_at_the_threshold_is_below_it():
    found = decide(O2="<0.5", NO3="<0.5", Mn="<50", Fe="<100", SO4=20)
    assert found["redox_category"] == "suboxic"


def test_limit_above_the_threshold_decides_nothing():
    found = decide(O2="<1", NO3=0.1, Mn=10, Fe=20, SO4=20, sulfide=0.01)
    assert found["redox_category"] == "undetermined"
    assert found["redox_process"] == "undetermined"
    assert found["process_missing"] == "limit decides nothing: O2"
    assert found["process_basis"].endswith("; leaves open O2 or suboxic")


def test_lower_bound_decides_as_above_or_nothing():
    # a meter or strip at the end of its range
    assert decide(O2=">2", NO3=0.1, Mn=10, Fe=20)["redox_process"] == "O2"
    assert decide(O2=0.1, NO3=0.1, Mn=10, Fe=">50", SO4=20)["redox_process"] == "undetermined"
    # iron above 500 µg/L over 0.01 mg/L sulfide: more than 50
    assert decide(O2=0.1, NO3=0.1, Mn=1, Fe=">500", SO4=20, sulfide=0.01)["redox_process"] == "Fe(III)"
    # over more than 2 mg/L sulfide: below 0.25
    assert decide(O2=0.1, NO3=0.1, Mn=1, Fe=500, SO4=20, sulfide=">2")["redox_process"] == "SO4"
    assert decide(O2=0.1, NO3=0.1, Mn=1, Fe=500, SO4=20, sulfide=">0.01")["redox_process"] == "Fe(III)/SO4"


def test_missing_input_that_does_not_matter_leaves_the_answer():
    # oxic whatever sulfate is
    found = decide(O2=5.0, NO3=1.0, Mn=10, Fe=20)
    assert found["redox_process"] == "O2"
    assert found["process_missing"] == "not analysed: SO4, sulfide"


def test_only_low_oxygen_leaves_anoxic_or_suboxic_open():
    found = decide(O2=0.1, NO3=0.1)
    assert found["redox_category"] == "anoxic or suboxic"
    assert found["redox_process"] == "undetermined"


def test_only_high_oxygen_leaves_oxic_or_mixed_open():
    found = decide(O2=5.0)
    assert found["redox_category"] == "oxic or mixed (oxic-anoxic)"
    assert found["redox_process"] == "undetermined"


def test_iron_without_nitrate_is_anoxic_by_one_process_or_two():
    found = decide(O2=0.1, Mn=100, Fe=500, SO4=20, sulfide=0.001)
    assert found["redox_category"] == "anoxic"
    assert found["redox_process"] == "undetermined"
    assert "leaves open Fe(III) or NO3-Fe(III)/SO4" in found["process_basis"]


def test_iron_without_sulfate_leaves_methane_open():
    found = decide(O2=0.1, NO3=0.1, Mn=100, Fe=500)
    assert found["redox_category"] == "anoxic"
    assert "leaves open CH4 or Fe(III)/SO4" in found["process_basis"]


def test_sulfide_limit_bounds_the_ratio_from_below():
    # Fe 2000 µg/L over at most 0.05 mg/L sulfide: more than 40
    assert decide(O2=0.1, NO3=0.1, Mn=1, Fe=2000, SO4=20, sulfide="<0.05")["redox_process"] == "Fe(III)"
    # over at most 1 mg/L: anything above 2
    found = decide(O2=0.1, NO3=0.1, Mn=1, Fe=2000, SO4=20, sulfide="<1")
    assert found["redox_process"] == "Fe(III)/SO4"
    assert found["process_missing"] == "limit decides nothing: sulfide"


def test_sulfide_of_zero_is_iron_reduction():
    found = decide(O2=0.1, NO3=0.1, Mn=1, Fe=2000, SO4=20, sulfide=0)
    assert found["redox_process"] == "Fe(III)"
    assert "no sulfide" in found["process_basis"]


def test_ratio_is_by_mass_of_H2S():
    # 1 mol Fe weighs 55.845 g, 1 mol H2S 34.08 g (IUPAC weights): equal moles make 1.64
    equal = pd.DataFrame([{"O2_mol_L": 0.0, "NO3_mol_L": 0.0, "Mn_mol_L": 0.0, "Fe_mol_L": 1e-5, "SO4_mol_L": 1e-3,
                           "sulfide_mol_L": 1e-5}])  # fmt: skip
    assert "Fe/sulfide 1.64" in process_table(equal, Settings()).loc[0, "process_basis"]


def test_nothing_analysed_is_undetermined_and_every_row_stays():
    found = process_table(pd.DataFrame(index=[3, 7]), Settings())
    assert list(found.index) == [3, 7]
    assert set(found["redox_category"]) == {"undetermined"}
    assert found.loc[3, "process_missing"] == "not analysed: O2, NO3, Mn, Fe, SO4, sulfide"


def test_no_samples_give_no_rows_but_the_columns():
    found = process_table(pd.DataFrame(), Settings())
    assert found.shape == (0, 4)


def test_thresholds_are_settings():
    amounts = pd.DataFrame([{"O2_mol_L": 1.0e-3 / molar_mass("O2")}])
    strict = process_table(amounts, Settings().replace(evidence={"O2_mg_L": 2.0}))
    assert "O2 < 2 mg/L" in strict.loc[0, "process_basis"]
