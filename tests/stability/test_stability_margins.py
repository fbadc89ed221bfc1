"""Margins against a scan with the second engine: Eh in steps of 1 mV, pH in steps of 0.001 near the sample.

No field may change nearer than the margin, and just before and just behind it stand the sample's field and the next.
"""

import numpy as np
import pytest
from waters_made_up import random_waters, settings, solved

from gley.stability import assign

EH_STEP_mV, EH_EXACT_mV = 1.0, 0.02
PH_STEP, PH_EXACT = 0.001, 0.001

CASES = {
    "sulfur tied": {"sulfide": "none", "solids": "fresh"},
    "sulfate and sulfide side by side": {"sulfide": "all", "solids": "fresh"},
    "aged solids": {"sulfide": "some", "solids": "aged"},
}


def dilute(n, seed, sulfide):
    """Waters so dilute that the two engines' Debye-Hückel A makes no difference."""
    frame = random_waters(n, seed, sulfide=sulfide)
    frame["SC_uS_cm"] = 6.0
    return frame


def moved(frame, element, solids, vary, offsets):
    """Field (waters, offsets) of the second engine with `vary` (pH or Eh_mV) moved by each water's offsets."""
    n, m = offsets.shape
    many = frame.loc[frame.index.repeat(m)].reset_index(drop=True)
    many[vary] = many[vary].to_numpy(float) + offsets.ravel()
    fields = np.full(n * m, "", dtype=object)
    for _, answer, rows in solved(many, element, solids):
        fields[rows] = answer.field
    return fields.reshape(n, m)


def assert_margins(frame, table, element, solids, vary, offsets, words):
    """`words` are the columns of the margin and of the field beyond; returns how many samples have a margin."""
    margin, beyond = (table[word].to_numpy() for word in words)
    margin = margin.astype(float)
    step = EH_STEP_mV if vary == "Eh_mV" else PH_STEP
    exact = EH_EXACT_mV if vary == "Eh_mV" else PH_EXACT
    own = table["field"].to_numpy()
    scanned = moved(frame, element, solids, vary, np.tile(offsets, (len(frame), 1)))
    allowed = np.abs(offsets)[None, :] < np.where(np.isnan(margin), np.inf, np.abs(margin))[:, None] - 1.5 * step
    if vary == "pH":
        at = frame["pH"].to_numpy()[:, None] + offsets
        allowed &= (at >= 0) & (at <= 14)
    nearer = allowed & (scanned != own[:, None]) & (own != "")[:, None]
    shown = [f"{table.loc[k, 'sample']} {own[k]}: engine {margin[k]} to {beyond[k]}, at {offsets[j]} {scanned[k, j]}"
             for k, j in np.argwhere(nearer)[:5]]  # fmt: skip
    assert not nearer.any(), shown
    rows = np.flatnonzero(~np.isnan(margin))
    some, signs = frame.iloc[rows].reset_index(drop=True), np.sign(margin[rows])
    both_sides = np.column_stack([margin[rows] - exact * signs, margin[rows] + exact * signs])
    around = moved(some, element, solids, vary, both_sides)
    assert list(around[:, 0]) == list(own[rows])
    assert list(around[:, 1]) == list(beyond[rows])
    return len(rows)


@pytest.mark.parametrize("element", ["Fe", "Mn", "As", "S"])
@pytest.mark.parametrize("case", CASES)
def test_margin_along_Eh_is_where_a_scan_finds_it(element, case):
    given = CASES[case]
    frame = dilute(40, 21, given["sulfide"])
    table = assign(frame, [element], settings(solids=given["solids"]))
    offsets = np.arange(-2000.0, 2000.0 + EH_STEP_mV, EH_STEP_mV)
    words = ("margin_mV", "next_field")
    assert assert_margins(frame, table, element, given["solids"], "Eh_mV", offsets, words) >= 25


@pytest.mark.parametrize("element", ["Fe", "Mn", "As", "S"])
@pytest.mark.parametrize("case", CASES)
def test_margin_along_pH_is_where_a_scan_finds_it(element, case):
    given = CASES[case]
    frame = dilute(30, 22, given["sulfide"])
    table = assign(frame, [element], settings(solids=given["solids"]))
    fine, coarse = np.arange(-0.5, 0.5 + PH_STEP, PH_STEP), np.arange(0.51, 14.0, 0.01)
    offsets = np.concatenate([-coarse[::-1], fine, coarse])
    words = ("margin_pH", "next_field_pH")
    assert assert_margins(frame, table, element, given["solids"], "pH", offsets, words) >= 15


def test_margin_is_positive_where_the_variable_must_rise():
    # dissolved iron(II) in acid water below the Fe^3+/Fe^2+ line; ferrihydrite above its line in neutral water
    frame = random_waters(2, 1, temperature_C=25, gaps=False).assign(
        pH=[1.0, 7.0], Eh_mV=[600.0, 300.0], Fe_mol_L=1e-4, SC_uS_cm=60.0, SO4_mol_L=1e-9, DIC_mol_L=1e-9,
        sulfide_mol_L=1e-12,
    )  # fmt: skip
    table = assign(frame, ["Fe"], settings())
    assert list(table["field"]) == ["Fe^2+", "ferrihydrite (2-line)"]
    acid, neutral = table["margin_mV"]
    # 771 mV less complexes and hydrolysis of Fe^3+ at pH 1 (some mV)
    assert acid == pytest.approx(171, abs=8)
    # E = 0.771 + 0.0592 (3.5 − 3 pH − log 1e-4): published constants, activity coefficient 0.97
    assert neutral == pytest.approx(1000 * (0.771 + 0.05916 * (3.5 - 21 + 4)) - 300, abs=8)
    assert table["margin_pH"].iloc[0] > 0
    assert table["margin_pH"].iloc[1] < 0


def test_margins_stay_within_two_volts():
    frame = random_waters(3, 2, temperature_C=25, gaps=False).assign(
        pH=0.5, Eh_mV=[-1300.0, -1400.0, -1990.0], SO4_mol_L=np.nan, DIC_mol_L=np.nan, sulfide_mol_L=np.nan,
    )  # fmt: skip
    for element in ("Fe", "Mn"):
        margin = assign(frame, [element], settings(solids="none"))["margin_mV"]
        assert (margin.dropna().abs() <= 2000.0).all(), list(margin)
