"""Fields, shares and saturation against a second engine written for the tests (`brute.py`)."""

import brute
import numpy as np
import pandas as pd
import pytest
from waters_made_up import random_waters, settings, solved

from gley.columns import columns
from gley.stability import assign, march
from gley.stability.water import ionic_strength

CHLORIDES = ("FeCl^+", "FeCl^2+", "MnCl^+")
TIE = 0.01
"""log10 units below which two candidates count as even (the second engine has its own Debye-Hückel A)."""

CASES = {
    "25 °C": {"temperature_C": 25.0},
    "any temperature": {},
    "sulfate and sulfide side by side": {"sulfide": "all"},
    "sulfide not analysed": {"sulfide": "none"},
    "aged solids": {"solids": "aged"},
    "no solids": {"solids": "none"},
    "chloride complexes": {"extra": CHLORIDES},
    "sulfur tied throughout": {"sulfur": "tied"},
}


@pytest.fixture(autouse=True)
def _no_margins_along_pH(monkeypatch):
    """The slow part of `assign` is tested in a file of its own."""

    def none(target, bath, pe, log_total, field, choice):
        return np.full(len(pe), np.nan), np.full(len(pe), -1)

    monkeypatch.setattr(march, "along_pH", none)


@pytest.mark.parametrize("element", ["Fe", "Mn", "As", "S"])
@pytest.mark.parametrize("case", CASES)
def test_field_is_the_second_engines(element, case):
    given = dict(CASES[case])
    solids, extra, sulfur = given.pop("solids", "fresh"), given.pop("extra", ()), given.pop("sulfur", "measured")
    frame = random_waters(400, seed=sorted(CASES).index(case) + 1, **given)
    answer = assign(frame, [element], settings(solids=solids, with_names=extra, sulfur=sulfur))
    compared = 0
    for solver, second, rows in solved(frame, element, solids, extra, sulfur):
        clear = (second.gap > TIE) & (second.form_gap > TIE) & (solver.state_gap > TIE)
        compared += int(clear.sum())
        own = answer.iloc[rows]
        wrong = clear & (own["field"].to_numpy() != second.field)
        shown = frame.iloc[rows][wrong].assign(gley=own["field"].to_numpy()[wrong], second=second.field[wrong])
        assert not wrong.any(), shown.head(5).T.to_string()
        assert_beside(own[clear], second, clear)
    assert compared > 300


def assert_beside(own, second, clear):
    """Dissolved form, its share, the leading solid and its SI."""
    single = np.array([brute.ROWS[name].atoms[second.element] == 1 for name in second.form])
    # the form is named by the winning pool: compare where that is no tie either
    same = own["dissolved_form"].to_numpy() == second.form[clear]
    assert same.mean() > 0.98
    share = second.share(np.where(single, second.form, next(iter(single_forms(second)))))[clear]
    both = same & single[clear]
    np.testing.assert_allclose(own["share"].to_numpy(float)[both], share[both], atol=0.005)
    SI, solid = second.SI()
    np.testing.assert_allclose(own["SI"].to_numpy(float), SI[clear], atol=0.02)
    assert (own["solid"].to_numpy() == solid[clear]).mean() > 0.98


def single_forms(second):
    return [name for name in second.unit
            if brute.ROWS[name].phase == "dissolved" and brute.ROWS[name].atoms[second.element] == 1]  # fmt: skip


@pytest.mark.parametrize("element", ["Fe", "Mn", "As", "S"])
def test_saturation_index_is_exact_in_dilute_water(element):
    """Cold water, sulfur tied: elemental sulfur as the ligand's own state included (1 °C: ΔCp counts most)."""
    frame = random_waters(600, seed=12, temperature_C=1.0, sulfide="none", gaps=False)
    frame["SC_uS_cm"] = 1.0
    table = assign(frame, [element], settings())
    for _, second, rows in solved(frame, element):
        SI, _ = second.SI()
        np.testing.assert_allclose(table["SI"].to_numpy(float)[rows], SI, atol=2e-3)


def test_second_engines_closed_form_is_its_own_bisection():
    frame = random_waters(60, seed=99, gaps=False)
    for solver, second, _ in solved(frame, "Fe"):
        for key, forms in second.namers.items():
            if len(forms) > 1:
                found = brute.bisected_potential(solver, forms, "Fe", solver.water.iron)
                np.testing.assert_allclose(second.levels[key], found, atol=1e-9)


def test_solid_field_means_oversaturated_and_no_other_more():
    frame = random_waters(600, seed=5)
    for element in ("Fe", "Mn", "As", "S"):
        table = assign(frame, [element], settings())
        table = table[table["field"] != ""]
        solid = table["kind"] == "solid"
        assert solid.any()
        assert (table.loc[solid, "SI"] >= 0).all()
        assert not (table.loc[~solid, "SI"] > 0).any()
        assert (table.loc[~solid, "field"] == table.loc[~solid, "dissolved_form"]).all()


def test_solid_field_is_the_least_soluble_one():
    # solids of unlike stoichiometry are ranked by the element activity they leave, not by SI
    frame = random_waters(600, seed=6, sulfide="all")
    for element in ("Fe", "Mn", "As"):
        table = assign(frame, [element], settings(solids="aged"))
        for _, second, rows in solved(frame, element, "aged"):
            own = table.iloc[rows]
            solid = (own["kind"] == "solid").to_numpy() & (second.gap > TIE)
            assert (own["field"].to_numpy()[solid] == second.field[solid]).all()


def test_shares_of_all_forms_sum_to_one():
    frame = random_waters(50, seed=8, gaps=False)
    for element in ("Fe", "Mn", "As"):
        for _, second, _ in solved(frame, element):
            names = single_forms(second)
            total = sum(second.share(np.full(len(second.form), name, dtype=object)) for name in names)
            np.testing.assert_allclose(total, 1.0)
        share = assign(frame, [element], settings())["share"]
        assert share.between(0.0, 1.0).all()


def test_table_is_within_the_vocabulary():
    frame = random_waters(200, seed=9)
    table = assign(frame, ["Fe", "Mn", "As", "S"], settings())
    assert list(table.columns) == ["sample", "element", *columns("fields")]
    for name, item in columns("fields").items():
        if item.dtype == "number" and item.minimum is not None:
            assert table[name].dropna().between(item.minimum, item.maximum).all(), name


def test_ionic_strength_of_major_ions_counts_once_each():
    # 5 mM CaCl2 + 5 mM NaHCO3: I = ½ (4·5 + 10 + 5 + 5) mM = 20 mM
    frame = pd.DataFrame({
        "pH": [7.0], "Ca_mol_L": [5e-3], "Mg_mol_L": [0.0], "Na_mol_L": [5e-3], "Cl_mol_L": [10e-3],
        "SO4_mol_L": [0.0], "alkalinity_eq_L": [5e-3], "SC_uS_cm": [100.0],
    })  # fmt: skip
    value, basis = ionic_strength(frame, 10.0, 0.01)
    assert value[0] == pytest.approx(0.020, rel=1e-4)
    assert basis[0] == "major ions"
