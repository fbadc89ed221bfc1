"""Lines of published E-pH charts against the lines drawn here: at each position the same potential, pH or slope.

`tests/published/positions.csv` is typed apart from the species table: equations of the charts' lines and positions
read off them. `memory` means that the number wasn't looked up again. A tolerance wider than 15 mV or 0.15 pH has its
published reason in the note.
"""

import csv
from collections import Counter
from functools import cache
from pathlib import Path

import numpy as np
import pytest

from gley.stability import OFFERED, chart, species

TABLE = Path(__file__).parent.parent / "published" / "positions.csv"
POSITIONS = list(csv.DictReader(TABLE.read_text(encoding="utf-8").splitlines()))
WHOLE_PLANE = (0.0, 14.0, -2.0, 2.0)
CONDITIONS = ("element", "total_mol_L", "T_C", "ionic_strength_M", "solids", "with", "without", "ligands")
USUAL = {"E_V_at_pH": 0.015, "E_mV_at_pH0": 15.0, "pH_of_vertical": 0.15, "slope_mV_per_pH": 0.5}
"""Widest tolerance that needs no reason."""


@cache
def drawn(element, total, T_C, strength, solids, added, removed, ligands):
    totals = {name: float(amount) for name, _, amount in (item.partition("=") for item in split(ligands))}
    return chart(
        element, float(total), float(T_C), ionic_strength_M=float(strength), ligands=totals, solids=solids,
        with_names=split(added), without_names=split(removed), window=WHOLE_PLANE,
    )  # fmt: skip


def split(cell):
    return tuple(item for item in cell.split(";") if item)


def lines(row):
    """Lines between the two fields on the chart of the row's conditions."""
    pair = {row["left"], row["right"]}
    found = drawn(*(row[name] for name in CONDITIONS))
    met = [line for line in found.boundaries if set(line.between) == pair]
    assert met, f"{row['left']} and {row['right']} don't meet; fields: {', '.join(item.name for item in found.fields)}"
    return met


def potential_V(met, pH):
    """E where the lines cross a pH."""
    for line in met:
        points = line.points[np.argsort(line.points[:, 0])]
        if line.kind != "vertical" and points[0, 0] <= pH <= points[-1, 0]:
            return float(np.interp(pH, *points.T))
    ends = ", ".join(f"{line.points[:, 0].min():.2f}-{line.points[:, 0].max():.2f}" for line in met)
    raise AssertionError(f"no line at pH {pH:g}; the two fields meet at pH {ends}")


def position(row):
    met, quantity = lines(row), row["quantity"]
    if quantity == "E_V_at_pH":
        return potential_V(met, float(row["pH"]))
    if quantity == "pH_of_vertical":
        (line,) = [line for line in met if line.kind == "vertical"]
        return line.pH
    (line,) = [line for line in met if line.kind != "vertical"]
    return getattr(line, quantity)


def label(row):
    at = f"@{row['pH']}" if row["pH"] else ""
    return f"{row['element']}: {row['left']} | {row['right']} {row['quantity']}{at}"


@pytest.mark.parametrize("row", POSITIONS, ids=[label(row) for row in POSITIONS])
def test_line_lies_where_it_was_published(row):
    assert position(row) == pytest.approx(float(row["value"]), abs=float(row["tolerance"]))


def test_every_offered_element_has_three_positions_or_more():
    places = {(row["element"], row["left"], row["right"], row["quantity"], row["pH"]) for row in POSITIONS}
    counts = Counter(element for element, *_, quantity, _ in places if quantity != "slope_mV_per_pH")
    assert {element for element in OFFERED if counts[element] < 3} == set()


def test_table_is_whole():
    assert len({label(row) for row in POSITIONS}) == len(POSITIONS)
    for row in POSITIONS:
        assert {row["left"], row["right"], *split(row["with"]), *split(row["without"])} <= species().keys(), label(row)
        assert row["source"], label(row)
        assert row["seen"] in ("seen", "memory"), label(row)
        assert (row["pH"] != "") == (row["quantity"] == "E_V_at_pH"), label(row)
        if float(row["tolerance"]) > USUAL[row["quantity"]]:
            assert row["note"], label(row)
