"""Half-cells and check solutions against published tables, typed a second time in `tests/published/half_cells.csv`."""

import csv
from itertools import pairwise
from pathlib import Path

import numpy as np
import pytest

from gley.constants import nernst_slope_mV
from gley.errors import UsageError
from gley.probe import convert, electrodes, find_electrode, reference_mV, solutions
from gley.probe.electrodes import half_cells
from gley.probe.solutions import curves, find_solution

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
    ("text", "name"),
    [
        ("Zobell's", "ZoBell"),
        ("ZoBell solution", "ZoBell"),
        ("Light's", "Light"),
        ("quinhydrone pH 4", "quinhydrone pH 4"),
        ("Quinhydrone, pH 7.00".replace(",", ""), "quinhydrone pH 7"),
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


def test_every_value_has_source_and_grade():
    for item in [*electrodes(), *solutions()]:
        assert item["source"]
        assert item["grade"] in "ABC"
        assert item["seen"]
