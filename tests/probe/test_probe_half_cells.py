"""Half-cells and check solutions against published tables, typed a second time in `tests/published/half_cells.csv`."""

import csv
from importlib.resources import files
from itertools import pairwise
from pathlib import Path

import numpy as np
import pytest

from gley.constants import nernst_slope_mV
from gley.errors import UsageError
from gley.probe import convert, electrodes, find_electrode, reference_mV, solutions
from gley.probe.electrodes import half_cells
from gley.probe.solutions import curves, find_solution
from gley.settings import Settings

TABLE = Path(__file__).parents[1] / "published/half_cells.csv"
PUBLISHED = list(csv.DictReader(TABLE.read_text(encoding="utf-8").splitlines()))


@pytest.mark.parametrize("row", PUBLISHED, ids=lambda row: f"{row['what']}-{row['T_C']}-{row['mV']}")
def test_published_value(row):
    temperature = np.array([float(row["T_C"])])
    curve = curves()[row["what"]] if row["kind"] == "solution" else half_cells()[row["what"]]
    assert curve.at(temperature)[0][0] == pytest.approx(float(row["mV"]), abs=float(row["tolerance_mV"]))


def test_potential_falls_with_strength_of_the_filling_solution():
    # Nernst: more chloride, lower potential (law)
    names = ["Ag/AgCl, 0.1 M KCl", "Ag/AgCl, 1 M KCl", "Ag/AgCl, 3 M KCl", "Ag/AgCl, 3.33 M KCl", "Ag/AgCl, 3.5 M KCl"]
    names += ["Ag/AgCl, 4 M KCl"]
    values = [reference_mV(name, 25.0) for name in names]
    # the 3.33 M and 3.5 M tables come from two sources that differ by 0.7 mV
    assert all(after <= before + 0.8 for before, after in pairwise(values))
    assert values[0] - values[1] == pytest.approx(nernst_slope_mV(25.0), abs=6)  # a decade, less activity coefficients


def test_calomel_stands_45_mV_above_silver_chloride():
    # saturated KCl both: 45 mV (common practice)
    apart = reference_mV("SCE", 25.0) - reference_mV("Ag/AgCl, saturated KCl", 25.0)
    assert apart == pytest.approx(45, abs=1)


@pytest.mark.parametrize(
    ("text", "name"),
    [
        ("Ag/AgCl 3M KCl", "Ag/AgCl, 3 M KCl"),
        ("Ag/AgCl, 3 mol/L", "Ag/AgCl, 3 M KCl"),
        ("silver/silver chloride, sat. KCl", "Ag/AgCl, saturated KCl"),
        ("Ag/AgCl (3,5 mol/l KCl)", "Ag/AgCl, 3.5 M KCl"),
        ("SCE", "calomel, saturated KCl"),
        ("Calomel saturated", "calomel, saturated KCl"),
        ("Hg/Hg2Cl2 0.1 M", "calomel, 0.1 M KCl"),
        ("CSE", "Cu/CuSO4, saturated CuSO4"),
        ("SHE", "hydrogen scale (already Eh)"),
        ("already Eh", "hydrogen scale (already Eh)"),
        ("ag/agcl fill unknown", "Ag/AgCl, fill unknown"),
        ("Ag/AgCl, fill not stated", "Ag/AgCl, fill unknown"),
        ("AgCl sat.", "Ag/AgCl, saturated KCl"),
        ("Ag/AgCl_sat", "Ag/AgCl, saturated KCl"),
        # the silver salt is at saturation, KCl isn't: 8 mV apart at 25 °C
        ("Ag/AgCl, 3 M KCl saturated with AgCl", "Ag/AgCl, 3 M KCl"),
        ("Ag/AgCl 3 mol/L KCl, gesättigt mit AgCl", "Ag/AgCl, 3 M KCl"),
        ("Ag/AgCl, saturated KCl (4.2 M)", "Ag/AgCl, saturated KCl"),
        # the half-cell's own potential, not the scale of the readings
        ("Ag/AgCl, 3 M KCl (+207 mV vs. SHE)", "Ag/AgCl, 3 M KCl"),
        ("vs SCE", "calomel, saturated KCl"),
        ("Hg2Cl2 sat.", "calomel, saturated KCl"),
        ("ORP vs SHE", "hydrogen scale (already Eh)"),
    ],
)
def test_electrode_is_found_as_people_write_it(text, name):
    assert find_electrode(text) == name


def test_electrode_without_fill_is_refused_with_the_choices():
    with pytest.raises(UsageError, match=r"leaves the filling solution open.*fill unknown"):
        find_electrode("Ag/AgCl")


def test_unknown_electrode_is_refused():
    with pytest.raises(UsageError, match=r"'gold' isn't a reference electrode"):
        find_electrode("gold")
    with pytest.raises(UsageError, match=r"no Ag/AgCl with this filling solution"):
        find_electrode("Ag/AgCl, 2.2 M KCl")


@pytest.mark.parametrize(
    ("text", "says"),
    [
        ("Ag/AgCl in 3 M NaCl", "no Ag/AgCl with this filling solution"),
        ("calomel, saturated NaCl", "no calomel with this filling solution"),
        ("Ag/AgCl, unsaturated", "leaves the filling solution open"),
        ("Ag/AgCl, 3 mmol/L", "leaves the filling solution open"),
        ("Ag/AgCl, saturated KCl, 3 M", "states two filling solutions"),
        ("Ag/AgCl, 3 M KCl, outer 1 M KNO3", "states two filling solutions"),
        ("Ag/AgCl 3 M, SHE corrected", "names Ag/AgCl and hydrogen scale"),
        ("Ag/AgCI, 3 M KCl", r"Did you mean Ag/AgCl, 3 M KCl"),
    ],
)
def test_electrode_that_could_mean_another_is_refused(text, says):
    with pytest.raises(UsageError, match=says):
        find_electrode(text)


@pytest.mark.parametrize(
    ("text", "name"),
    [
        ("Zobell's", "ZoBell"),
        ("ZoBell solution", "ZoBell"),
        ("Light's", "Light"),
        ("quinhydrone pH 4", "quinhydrone pH 4"),
        ("Quinhydrone, pH 7.00", "quinhydrone pH 7"),
        ("pH 4.01 quinhydrone (buffer)", "quinhydrone pH 4"),
        ("quinhydrone pH 6.86", ""),  # 8 mV from pH 7
        ("quinhydrone", ""),
        ("Zobel", "ZoBell"),
        ("Lightning", ""),
        ("tap water", ""),
    ],
)
def test_solution_is_found_as_people_write_it(text, name):
    assert find_solution(text) == name


def test_worked_example():
    # 215 mV at 10 °C against 3 M KCl (217 mV, ISO 11271 Annex C): 432 mV; pe = 432 / 56.18 (slope at 10 °C, law)
    (row,) = convert([215.0], "Ag/AgCl, 3 M KCl", 10.0)
    assert row["Eh_mV"] == pytest.approx(432.0, abs=0.5)
    assert row["pe"] == pytest.approx(432.0 / 56.18, abs=0.01)
    assert list(row) == ["orp_mV", "electrode", "temperature_C", "reference_mV", "Eh_mV", "Eh_sd_mV", "pe", "source"]


def test_zobell_is_the_published_equation():
    # Nordstrom 1977, Geochim. Cosmochim. Acta 41, stated for 8 to 85 °C (from memory)
    curve = curves()["ZoBell"]
    assert curve.T_C[0] == 8
    t = curve.T_C - 25
    assert curve.E_mV == pytest.approx(430.28 - 2.5157 * t - 0.0037979 * t**2, abs=0.051)


def test_without_temperature_the_settings_one_is_taken_and_said():
    # 217 mV at 10 °C: ISO 11271 Annex C
    settings = Settings().replace(stability={"assumed_temperature_C": 10.0})
    (row,) = convert([0.0], "Ag/AgCl, 3 M KCl", settings=settings)
    assert row["reference_mV"] == pytest.approx(217, abs=0.5)
    assert row["Eh_sd_mV"] == pytest.approx(np.hypot(60, 10))
    assert "temperature not given, 10 °C taken" in row["source"]


def test_outside_the_published_range_the_end_is_held_and_the_sd_grows():
    inside, outside = convert([0.0], "SCE", 10.0)[0], convert([0.0], "SCE", 2.0)[0]
    assert outside["reference_mV"] == inside["reference_mV"]
    assert outside["Eh_sd_mV"] == pytest.approx(np.hypot(inside["Eh_sd_mV"], 8.0))
    assert "outside the published" in outside["source"]


@pytest.mark.parametrize(
    ("call", "says"),
    [
        ((["0"], "", 10.0), "No reference electrode named"),
        (([0.0], "SCE", 200.0), "100 °C is wanted"),
        (([9999.0], "SCE", 10.0), "2000 mV is wanted"),
        (([float("nan")], "SCE", 10.0), "2000 mV is wanted"),
    ],
)
def test_bad_conversions_are_refused(call, says):
    with pytest.raises(UsageError, match=says):
        convert(*call)


@pytest.mark.parametrize("name", ["electrodes.csv", "solutions.csv"])
def test_no_cell_of_a_table_is_cut_off(name):
    # an unquoted comma would put the rest of a note beyond the last column
    rows = list(csv.reader((files("gley.probe") / name).read_text(encoding="utf-8").splitlines()))
    assert {len(row) for row in rows} == {len(rows[0])}


def test_every_electrode_has_couple_and_fill():
    by_name = {item["name"]: item for item in electrodes()}
    assert by_name["calomel, saturated KCl"]["couple"] == "calomel"
    assert by_name["Ag/AgCl, 3.5 M KCl"]["fill"] == "3.5 M KCl"
    assert all(find_electrode(name) == name for name in by_name)


def test_every_value_has_source_and_grade():
    for item in [*electrodes(), *solutions()]:
        assert item["source"]
        assert item["grade"] in "ABC"
        assert item["seen"]
