"""The redox process against the published framework, row by row.

McMahon & Chapelle 2008, Ground Water 46: 259-271, table 1, with the iron/sulfide ratio of Chapelle and others 2009,
Ground Water 47: 300-305 (thresholds from memory, ratio limits seen).
"""

import pandas as pd
import pytest

from gley.evidence import process_table
from gley.formula import molar_mass
from gley.settings import Settings

WEIGHED = {"O2": "O2", "NO3": "N", "Mn": "Mn", "Fe": "Fe", "SO4": "SO4", "sulfide": "HS^-"}
PER_UNIT = {"O2": 1e3, "NO3": 1e3, "Mn": 1e6, "Fe": 1e6, "SO4": 1e3, "sulfide": 1e3}  # mg/L, µg/L


def decide(**reported):
    """O2, NO3 as N, SO4, sulfide in mg/L, Mn and Fe in µg/L; a text such as '<0.5' is a limit."""
    row = {}
    for key, value in reported.items():
        text = str(value)
        row[f"{key}_mol_L"] = float(text.lstrip("<")) / PER_UNIT[key] / molar_mass(WEIGHED[key])
        row[f"{key}_limit"] = "<" if text.startswith("<") else ""
    return process_table(pd.DataFrame([row]), Settings()).loc[0]


PUBLISHED = [
    # O2, NO3-N, Mn, Fe, SO4, sulfide, category, process
    (5.0, 0.1, 10, 20, 20, 0.01, "oxic", "O2"),
    (0.5, 3.0, 10, 20, 20, 0.01, "oxic", "O2"),
    (0.2, 0.1, 10, 20, 20, 0.01, "suboxic", "suboxic"),
    (0.2, 3.0, 10, 20, 20, 0.01, "anoxic", "NO3"),
    (0.2, 0.1, 50, 20, 20, 0.01, "anoxic", "Mn(IV)"),
    (0.2, 0.1, 500, 2000, 20, 0.01, "anoxic", "Fe(III)"),  # ratio 200
    (0.2, 0.1, 500, 200, 20, 0.1, "anoxic", "Fe(III)-SO4"),  # ratio 2
    (0.2, 0.1, 500, 200, 20, 2.0, "anoxic", "SO4"),  # ratio 0.1
    (0.2, 0.1, 500, 2000, 0.2, 0.01, "anoxic", "CH4"),
    (2.0, 0.1, 100, 20, 20, 0.01, "mixed", "O2-Mn(IV)"),
    (2.0, 0.1, 10, 200, 20, 0.01, "mixed", "O2-Fe(III)/SO4"),
    (0.2, 3.0, 100, 20, 20, 0.01, "mixed", "NO3-Mn(IV)"),
    (0.2, 3.0, 10, 200, 20, 0.01, "mixed", "NO3-Fe(III)/SO4"),
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


def test_limit_below_the_threshold_decides_as_below():
    found = decide(O2="<0.1", NO3="<0.1", Mn="<5", Fe="<10", SO4=20)
    assert found["redox_category"] == "suboxic"


def test_limit_above_the_threshold_decides_nothing():
    found = decide(O2="<1", NO3=0.1, Mn=10, Fe=20, SO4=20)
    assert found["redox_process"] == "undetermined"
    assert "O2" in found["process_missing"]


def test_missing_input_that_does_not_matter_leaves_the_answer():
    # oxic whatever sulfate is
    found = decide(O2=5.0, NO3=1.0, Mn=10, Fe=20)
    assert found["redox_process"] == "O2"
    assert found["process_missing"] == "SO4"


def test_only_low_oxygen_leaves_anoxic_or_suboxic_open():
    found = decide(O2=0.1, NO3=0.1)
    assert found["redox_category"] == "anoxic or suboxic"
    assert found["redox_process"] == "undetermined"


def test_sulfide_limit_bounds_the_ratio_from_below():
    # Fe 2000 µg/L over at most 0.05 mg/L sulfide: more than 40
    assert decide(O2=0.1, NO3=0.1, Mn=1, Fe=2000, SO4=20, sulfide="<0.05")["redox_process"] == "Fe(III)"
    # over at most 1 mg/L: anything above 2
    assert decide(O2=0.1, NO3=0.1, Mn=1, Fe=2000, SO4=20, sulfide="<1")["redox_process"] == "Fe(III)/SO4"


def test_nothing_analysed_is_undetermined_and_every_row_stays():
    found = process_table(pd.DataFrame(index=[3, 7]), Settings())
    assert list(found.index) == [3, 7]
    assert set(found["redox_category"]) == {"undetermined"}


def test_thresholds_are_settings():
    amounts = pd.DataFrame([{"O2_mol_L": 1.0e-3 / molar_mass("O2")}])
    strict = process_table(amounts, Settings().replace(evidence={"O2_mg_L": 2.0}))
    assert "O2 < 2 mg/L" in strict.loc[0, "process_basis"]
