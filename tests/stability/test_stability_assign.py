"""What `assign` says beside the field: statuses, limits, probabilities; and that rows don't depend on each other."""

from statistics import NormalDist

import numpy as np
import pandas as pd
import pytest
from waters_made_up import random_waters, settings

from gley.columns import columns
from gley.errors import UsageError
from gley.settings import Settings
from gley.stability import assign

WATER = {
    "sample": "W1", "pH": 7.0, "Eh_mV": 0.0, "temperature_C": 12.0, "SC_uS_cm": 500.0, "Fe_mol_L": 5e-5,
    "Mn_mol_L": 1e-5, "As_mol_L": 1e-7, "SO4_mol_L": 5e-4, "sulfide_mol_L": 1e-7, "alkalinity_eq_L": 4e-3,
    "Cl_mol_L": 1e-3,
}  # fmt: skip


def one(element="Fe", stability=None, **changes):
    """The row that a single water gets; a change to None takes the column away."""
    water = {name: value for name, value in {**WATER, **changes}.items() if value is not None}
    return assign(pd.DataFrame([water]), [element], settings(**(stability or {}))).iloc[0]


def test_whole_analysis_is_ok():
    for element in ("Fe", "Mn", "As"):
        assert one(element)["status"] == "ok"


@pytest.mark.parametrize(
    ("changes", "words"),
    [
        ({"pH": np.nan}, "not assigned: no pH"),
        ({"Eh_mV": np.nan}, "not assigned: no Eh"),
        ({"Fe_mol_L": np.nan}, "not assigned: Fe not measured"),
        ({"Fe_mol_L": None}, "not assigned: Fe not measured"),
        ({"Fe_mol_L": 0.0}, "not assigned: Fe reported as zero"),
        ({"Fe_mol_L": -1e-6}, "not assigned: Fe isn't a concentration"),
        ({"pH": 14.5}, "not assigned: pH outside 0-14"),
        ({"pH": -1.0}, "not assigned: pH outside 0-14"),
        ({"Eh_mV": 2500.0}, "not assigned: Eh outside ±2 V"),
    ],
)
def test_what_cannot_be_assigned_keeps_its_row_and_says_why(changes, words):
    row = one(**changes)
    assert words in row["status"]
    assert row["field"] == ""
    assert np.isnan(row["margin_mV"])
    assert np.isnan(row["probability"])


@pytest.mark.parametrize(
    ("element", "changes", "words"),
    [
        ("Fe", {"alkalinity_eq_L": None}, "alkalinity"),
        ("Fe", {"SO4_mol_L": None, "sulfide_mol_L": None}, "SO4"),
        ("Fe", {"SO4_mol_L": None, "sulfide_mol_L": None}, "sulfide"),
        ("Fe", {"sulfide_mol_L": None}, "sulfide computed"),
        ("As", {"sulfide_mol_L": None}, "sulfide computed"),
        ("S", {"sulfide_mol_L": None}, "sulfide"),
        ("Mn", {"alkalinity_eq_L": np.nan}, "alkalinity"),
    ],
)
def test_not_measured_is_said(element, changes, words):
    assert words in one(element, **changes)["status"]


def test_companion_iron_not_measured_is_said_where_a_solid_needs_it():
    assert "companion not measured: Fe" in one("As", {"solids": "aged"}, Fe_mol_L=None)["status"]
    assert "companion" not in one("As", Fe_mol_L=None)["status"]


def test_missing_temperature_is_said():
    # DESIGN 6: the median of the round, else 25 °C with a status
    assert "25" in one(temperature_C=np.nan)["status"]


def test_carbon_is_unknown_below_pH_4_5_not_zero():
    low, high = one(pH=4.4, Eh_mV=-200.0), one(pH=4.6, Eh_mV=-200.0)
    assert low["status"] != "ok"
    assert high["status"] == "ok"
    assert low["field"] == "Fe^2+"


@pytest.mark.parametrize("key", ["SO4", "DIC", "sulfide"])
def test_assumed_ligand_is_said(key):
    missing = {"DIC": {"alkalinity_eq_L": None}, "SO4": {"SO4_mol_L": None}, "sulfide": {"sulfide_mol_L": None}}[key]
    row = one("Fe", {"assumed_mol_L": {key: 1e-4}}, **missing)
    assert "assumed" in row["status"]


def test_assumed_total_is_said_and_used():
    row = one("Mn", {"assumed_mol_L": {"Mn": 1e-5}}, Mn_mol_L=None)
    assert "assumed total" in row["status"]
    assert row["field"] == one("Mn")["field"]
    # measured values stay
    assert "assumed" not in one("Mn", {"assumed_mol_L": {"Mn": 1e-5}})["status"]


def test_element_not_detected_where_the_limit_decides():
    # 0.5 mg/L iron at pH 8 and 250 mV is far above ferrihydrite's saturation; a hundredth of it just as well
    row = one("Fe", pH=8.0, Eh_mV=250.0, Fe_mol_L=1e-5, Fe_limit="<")
    assert row["field"] == "ferrihydrite (2-line)"
    assert "Fe not detected" in row["status"]
    assert "a limit proves no solid" in row["status"]
    # close to saturation the limit decides
    near = one("Fe", pH=7.0, Eh_mV=110.0, Fe_mol_L=3e-5, Fe_limit="<")
    assert near["field"] == "ferrihydrite (2-line)"
    assert "depends on limit: ferrihydrite (2-line) or Fe^2+" in near["status"]


def test_element_not_detected_and_dissolved_is_no_doubt():
    row = one("Fe", pH=5.0, Eh_mV=0.0, Fe_mol_L=1e-6, Fe_limit="<")
    assert row["field"] == "Fe^2+"
    assert "depends on limit" not in row["status"]


def test_limit_of_a_ligand_where_it_decides():
    row = one("Fe", pH=7.5, Eh_mV=-220.0, Fe_mol_L=2e-4, sulfide_mol_L=1e-5, sulfide_limit="<")
    assert row["field"] == "mackinawite"
    assert "depends on limit: mackinawite or siderite" in row["status"]


def test_limit_of_a_ligand_never_proves_its_solid():
    # mackinawite at the limit and at a hundredth of it: yet the water may hold no sulfide at all
    row = one("Fe", pH=9.0, Eh_mV=-300.0, Fe_mol_L=1e-3, alkalinity_eq_L=1e-4, sulfide_mol_L=1e-3, sulfide_limit="<")
    assert row["field"] == "mackinawite"
    assert row["status"] != "ok"


def test_strong_water_is_said():
    assert "ionic strength above 0.5" in one(SC_uS_cm=50000.0)["status"]


def test_species_without_temperature_data_is_left_out_away_from_25():
    given = {"with_names": ("green rust (carbonate)",)}
    assert "green rust (carbonate) left out" in one("Fe", given)["status"]
    assert "left out" not in one("Fe", given, temperature_C=25.0)["status"]


def test_order_and_slices_make_no_difference():
    frame = random_waters(30, seed=31)
    frame.loc[::7, "Fe_limit"] = "<"
    elements = ["Fe", "As", "S"]
    whole = assign(frame, elements, settings())
    assert list(whole["sample"][:6]) == ["W0000"] * 3 + ["W0001"] * 3
    assert list(whole["element"][:3]) == elements
    parts = pd.concat([assign(frame.iloc[a : a + 17], elements, settings()) for a in range(0, 30, 17)])
    pd.testing.assert_frame_equal(parts.reset_index(drop=True), whole)
    mixed = assign(frame.sample(frac=1.0, random_state=3), elements, settings())
    key = ["sample", "element"]
    pd.testing.assert_frame_equal(
        mixed.sort_values(key).reset_index(drop=True), whole.sort_values(key).reset_index(drop=True)
    )
    alone = assign(frame, ["As"], settings()).reset_index(drop=True)
    pd.testing.assert_frame_equal(alone, whole[whole["element"] == "As"].reset_index(drop=True))


def test_input_is_not_changed():
    frame = random_waters(20, seed=32)
    before = frame.copy(deep=True)
    assign(frame, ["Fe", "As"], settings())
    pd.testing.assert_frame_equal(frame, before)


def test_empty_table_and_no_elements_give_tables_with_columns():
    names = ["sample", "element", *columns("fields")]
    assert list(assign(random_waters(3, 1).iloc[:0], ["Fe"], settings()).columns) == names
    empty = assign(random_waters(3, 1), [], settings())
    assert len(empty) == 0
    assert list(empty.columns) == names


def test_unknown_elements_and_names_are_refused():
    with pytest.raises(UsageError, match=r"'Zr'.*Choose from Fe, Mn, As, U.*S"):
        assign(random_waters(2, 1), ["Zr"])
    with pytest.raises(UsageError, match=r"'N'.*chart only"):
        assign(random_waters(2, 1), ["N"])
    with pytest.raises(UsageError, match=r"goethit[ex].*Near names: goethite"):
        one("Fe", {"with_names": ("goethitx",)})
    with pytest.raises(UsageError, match="several species"):
        one("Fe", {"with_names": ("green rust",)})


@pytest.mark.parametrize("distance_mV", [-70.0, -30.0, -5.0, 5.0, 30.0, 70.0])
def test_probability_is_the_normal_one_on_a_single_line(distance_mV):
    """Fe^3+/Fe^2+ in acid, and ferrihydrite/Fe^2+ with the solid's log K (grade B: 0.4) beside Eh."""
    quiet = {"draws": 256, "total_sd_percent": 0.0}
    acid = {"pH": 1.0, "pH_sd": 0.0, "SO4_mol_L": None, "sulfide_mol_L": None, "temperature_C": 25.0, "Eh_sd_mV": 30.0}
    line = 400.0 + one("Fe", {"solids": "none", **quiet}, **acid, Eh_mV=400.0)["margin_mV"]
    row = one("Fe", {"solids": "none", **quiet}, **acid, Eh_mV=line + distance_mV)
    assert row["probability"] == pytest.approx(NormalDist().cdf(abs(distance_mV) / 30.0), abs=0.012)
    assert row["next_probability"] == pytest.approx(1 - row["probability"], abs=1e-9)
    neutral = {**acid, "pH": 7.0, "alkalinity_eq_L": None}
    line = one("Fe", quiet, **neutral, Eh_mV=0.0)["margin_mV"]
    row = one("Fe", quiet, **neutral, Eh_mV=line + distance_mV)
    sd = float(np.hypot(30.0, 0.4 * 59.16))
    assert row["probability"] == pytest.approx(NormalDist().cdf(abs(distance_mV) / sd), abs=0.015)


def test_outcome_words_follow_probability_and_saturation():
    stated = Settings().stability
    table = assign(random_waters(100, 33), ["Fe", "As"], settings(draws=64))
    table = table[table["field"] != ""]
    for row in table.to_dict("records"):
        buffered = row["saturation"] == "near" and row["solid"] in (row["field"], row["next_field"])
        if row["outcome"].startswith("at equilibrium with"):
            assert buffered
            assert row["outcome"].endswith(row["solid"])
        elif row["probability"] >= stated.clear:
            assert row["outcome"] == "clear"
        elif row["probability"] >= stated.likely:
            assert row["outcome"] == "likely"
        else:
            assert row["outcome"] == f"between {row['field']} and {row['second_field']}"
        assert row["probability"] + np.nan_to_num(row["next_probability"]) <= 1 + 1e-9
        holds = {"under": row["SI"] < 0, "over": row["SI"] > 0, "near": abs(row["SI"]) <= 1.0, "": True}
        assert holds[row["saturation"]]


def test_probability_is_the_same_in_every_run_and_rises_with_certainty():
    frame = random_waters(40, seed=34)
    first, again = (assign(frame, ["Fe"], settings(draws=64)) for _ in range(2))
    pd.testing.assert_frame_equal(first, again)
    sure = assign(frame.assign(Eh_sd_mV=0.0, pH_sd=0.0), ["Fe"], settings(draws=64, total_sd_percent=0.0))
    dissolved = (sure["kind"] == "dissolved") & (sure["SI"] < -4)
    assert (sure.loc[dissolved, "probability"] == 1.0).all()
