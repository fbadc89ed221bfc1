"""`gley explain`: one sample's working, recomputed here by hand from published numbers."""

import json
from pathlib import Path

import numpy as np
import pandas as pd
import pytest

from gley.cli import main
from gley.settings import Settings
from gley.stability import working

SURVEY = str(Path(__file__).parents[2] / "sample_surveys/erlenwiek.xlsx")


def answer(capsys, *words):
    code = main(list(words))
    out, err = capsys.readouterr()
    return code, out, err


@pytest.fixture
def record(capsys):
    code, out, _ = answer(capsys, "explain", SURVEY, "EW-13-1", "--json")
    assert code == 0
    return json.loads(out)


def test_potential_adds_up(record):
    at = record["potential"]
    assert at["ORP_mV"] + at["reference_mV"] + at["check_offset_mV"] == pytest.approx(at["Eh_mV"])
    # pe = Eh F / (RT ln10), slope 0.198416 mV per kelvin (law)
    assert at["pe"] == pytest.approx(at["Eh_mV"] / (0.198416 * (273.15 + at["temperature_used_C"])), rel=1e-4)
    assert at["ORP_cell"].startswith("erlenwiek.xlsx > Samples > I")


def test_amounts_are_converted_by_molar_mass(record):
    found = {item["key"]: item for item in record["amounts"]}
    # molar masses: IUPAC 2021
    iron = float(found["Fe"]["reported"].split()[0])
    assert found["Fe"]["Fe_mol_L"] == pytest.approx(iron * 1e-3 / 55.845, rel=1e-4)
    alkalinity = float(found["alkalinity"]["reported"].split()[0])
    assert found["alkalinity"]["alkalinity_eq_L"] == pytest.approx(alkalinity * 1e-3 / 50.043, rel=1e-4)


def test_lowest_candidate_is_the_field_and_shares_sum_to_one(record):
    for part in record["elements"]:
        candidates = part["working"]["candidates"]
        assert [item["log_a"] for item in candidates] == sorted(item["log_a"] for item in candidates)
        first = candidates[0]
        named = first["forms"][0]["name"] if first["forms"] else first["name"]
        assert named == part["assigned"]["field"]
        for item in candidates:
            if item["forms"]:
                assert sum(form["share"] for form in item["forms"]) == pytest.approx(1, abs=0.02)


def test_line_of_arsenic_by_hand():
    # H3AsO4 + 2 H+ + 2 e- = H3AsO3 + H2O, E° 0.560 V (CRC Handbook, electrochemical series; gas-free standard state),
    # pKa1 of H3AsO4 2.25 (CRC Handbook): at 25 °C, I → 0, pH 5 H2AsO4- prevails and
    # E = 0.560 + 0.02958 · pKa1 − 1.5 · 0.05916 · pH
    by_hand = 560 + 29.58 * 2.25 - 88.74 * 5
    sample = pd.DataFrame([{"pH": 5.0, "Eh_mV": 300.0, "temperature_C": 25.0, "As_mol_L": 1e-6, "SC_uS_cm": 0.0}])
    line = working(sample, "As", Settings())["line"]
    assert line["reaction"] == "H2AsO4^- + 3 H^+ + 2 e^- = H3AsO3(aq) + H2O"
    assert line["E_straight_mV"] == pytest.approx(by_hand, abs=20)
    assert 300 + line["margin_mV"] == pytest.approx(line["E_straight_mV"], abs=1)


def test_siderite_saturation_by_hand():
    # Ksp of siderite 10^-10.89 (Bénézeth et al. 2009); pK2 of carbonic acid 10.33, pK1 6.35 (Plummer & Busenberg 1982)
    row = {"pH": 7.5, "Eh_mV": -100.0, "temperature_C": 25.0, "Fe_mol_L": 1e-5, "DIC_mol_L": 2e-3, "SC_uS_cm": 0.0}
    made = working(
        pd.DataFrame([row | {"SO4_mol_L": 1e-9, "sulfide_mol_L": 1e-15, "Cl_mol_L": 1e-9}]), "Fe", Settings()
    )
    candidates = {item["name"]: item for item in made["candidates"]}
    hydrogen = 10**-7.5
    carbonate = 2e-3 / (1 + hydrogen / 10**-10.33 + hydrogen**2 / 10**-16.68)
    free = next(form["share"] for form in candidates["dissolved Fe(II)"]["forms"] if form["name"] == "Fe^2+")
    by_hand = np.log10(1e-5 * free * carbonate) + 10.89
    SI = candidates["dissolved Fe(II)"]["log_a"] - candidates["siderite"]["log_a"]
    assert pytest.approx(by_hand, abs=0.1) == SI


def test_text_holds_the_working(capsys):
    _, out, _ = answer(capsys, "explain", SURVEY, "EW-13-1", "Fe")
    assert "Eh = ORP + E_ref + δ" in out
    assert "the lowest wins" in out
    assert "Fe(OH)3(s)" in out
    assert "\nAs:" not in out


def test_sample_without_pH_is_said(capsys):
    code, out, _ = answer(capsys, "explain", SURVEY, "EW-17-2", "Fe")
    assert code == 0
    assert "not assigned: no pH" in out


def test_unknown_sample_names_the_nearest(capsys):
    code, _, err = answer(capsys, "explain", SURVEY, "EW-131")
    assert code == 2
    assert "There is no sample 'EW-131'" in err
    assert "EW-13-1" in err
