"""Charts: a tiling of the window, the second engine's field at any point, lines with balanced reactions."""

import json
import re

import brute
import numpy as np
import pandas as pd
import pytest
import shapely
from reaction_math import composition, volt_per_decade
from waters_made_up import settings

from gley.errors import UsageError
from gley.stability import Chart, assign, chart

CHANNEL = {"C": "C(IV)", "S": "S", "S(VI)": "S(VI)", "S(-II)": "S(-II)", "Cl": "Cl(-I)"}
CHLORIDES = ("FeCl^+", "FeCl^2+")

CASES = {
    "Fe alone": ("Fe", 1e-5, 25, {}, {}),
    "Fe dilute, no solids": ("Fe", 1e-7, 10, {}, {"solids": "none"}),
    "Fe with C": ("Fe", 1e-4, 10, {"C": 4e-3}, {}),
    "Fe with S": ("Fe", 1e-5, 15, {"S": 1e-3}, {}),
    "Fe with C and S": ("Fe", 5e-5, 25, {"C": 5e-3, "S": 2e-3}, {}),
    "Fe aged with C and S": ("Fe", 5e-5, 40, {"C": 5e-3, "S": 2e-3}, {"solids": "aged"}),
    "Fe with sulfate beside sulfide": ("Fe", 1e-4, 12, {"C": 2e-3, "S(VI)": 1e-3, "S(-II)": 1e-5}, {}),
    "Fe in salt water": ("Fe", 1e-4, 20, {"C": 2e-3, "S": 2e-2, "Cl": 0.3},
                         {"with_names": CHLORIDES, "ionic_strength_M": 0.4}),
    "Mn alone, aged": ("Mn", 1e-6, 5, {}, {"solids": "aged"}),
    "Mn with C": ("Mn", 1e-5, 10, {"C": 4e-3}, {}),
    "Mn with C and S, aged": ("Mn", 1e-3, 25, {"C": 1e-2, "S": 1e-2}, {"solids": "aged"}),
    "As alone": ("As", 1e-6, 25, {}, {}),
    "As with S": ("As", 1e-5, 10, {"S": 1e-2}, {}),
    "As aged with Fe, C and S": ("As", 1e-4, 15, {"Fe": 1e-3, "S": 1e-3, "C": 1e-3}, {"solids": "aged"}),
    "As aged with Fe": ("As", 1e-3, 25, {"Fe": 1e-2}, {"solids": "aged"}),
    "Fe aged alone": ("Fe", 1e-6, 25, {}, {"solids": "aged"}),
    "S": ("S", 1e-2, 25, {}, {}),
    "N": ("N", 1e-3, 15, {}, {}),
    "C": ("C", 1e-2, 25, {}, {}),
}  # fmt: skip
NEAR_EDGE_V = 0.0005


@pytest.fixture(scope="module")
def charts():
    made = {}

    def get(name):
        if name not in made:
            element, total, T_C, ligands, more = CASES[name]
            made[name] = chart(element, total, T_C, ligands=ligands, **more)
        return made[name]

    return get


def second(name, pH, E_V):
    """The second engine's answer over points of a chart."""
    element, total, T_C, ligands, more = CASES[name]
    n = len(pH)
    totals = {CHANNEL[key]: np.full(n, value) for key, value in ligands.items() if key != "Fe"}
    iron = np.full(n, ligands["Fe"]) if "Fe" in ligands else None
    strength = np.full(n, more.get("ionic_strength_M", 0.010))
    water = brute.Water(pH, E_V / volt_per_decade(T_C), np.full(n, float(T_C)), strength, totals, iron)
    solver = brute.Solver(water, more.get("solids", "fresh"), more.get("with_names", ()))
    return solver.solve(element, np.full(n, total))


def shapes(drawn):
    return {
        item.name: shapely.union_all([shapely.Polygon(rings[0], rings[1:]) for rings in item.polygons])
        for item in drawn.fields
    }


@pytest.mark.parametrize("name", CASES)
def test_fields_tile_the_window(charts, name):
    drawn = charts(name)
    left, right, low, high = drawn.window
    whole = (right - left) * (high - low)
    parts = [shapely.Polygon(rings[0], rings[1:]) for item in drawn.fields for rings in item.polygons]
    assert all(part.is_valid for part in parts)
    assert sum(part.area for part in parts) == pytest.approx(whole, rel=1e-6)
    assert shapely.union_all(parts).area == pytest.approx(whole, rel=1e-6)
    for item in drawn.fields:
        for rings in item.polygons:
            assert all((ring[0] == ring[-1]).all() for ring in rings)
            assert shapely.Polygon(rings[0]).area > 1e-6 * whole


@pytest.mark.parametrize("name", CASES)
def test_any_point_has_the_second_engines_field(charts, name):
    drawn = charts(name)
    left, right, low, high = drawn.window
    rng = np.random.default_rng(7)
    pH, E = rng.uniform(left, right, 1500), rng.uniform(low, high, 1500)
    answer = second(name, pH, E)
    scale = np.array([0.0592, 1.0])
    edges = {key: shapely.transform(shape, lambda xy: xy * scale).boundary for key, shape in shapes(drawn).items()}
    points = shapely.points(np.column_stack([pH, E]) * scale)
    near = np.min([shapely.distance(edge, points) for edge in edges.values()], axis=0) < NEAR_EDGE_V
    said = np.full(len(pH), "", dtype=object)
    for key, shape in shapes(drawn).items():
        said[shapely.contains_xy(shape, pH, E)] = key
    wrong = ~near & (said != answer.field)
    assert not wrong.any(), list(zip(pH[wrong], E[wrong], said[wrong], answer.field[wrong], strict=True))[:5]
    assert near.mean() < 0.08
    # nothing of any size is missing from the chart
    assert {key for key in answer.field if (answer.field == key).sum() > 3} <= set(edges)


@pytest.mark.parametrize("name", ["Fe with C and S", "As with S", "Mn with C"])
def test_chart_and_assign_agree(charts, name):
    element, total, T_C, ligands, _ = CASES[name]
    drawn = charts(name)
    rng = np.random.default_rng(17)
    n = 60
    pH, E = rng.uniform(0.5, 13.5, n), rng.uniform(-0.9, 1.4, n)
    frame = pd.DataFrame({
        "pH": pH, "Eh_mV": 1000 * E, "temperature_C": float(T_C), "SC_uS_cm": 0.010 / 1.6e-5,
        f"{element}_mol_L": total, "DIC_mol_L": ligands.get("C", np.nan), "SO4_mol_L": ligands.get("S", np.nan),
    })  # fmt: skip
    table = assign(frame, [element], settings())
    for k, field in enumerate(table["field"]):
        shape = shapes(drawn)[field]
        assert shape.distance(shapely.Point(pH[k], E[k])) < NEAR_EDGE_V, (pH[k], E[k], field)


@pytest.mark.parametrize("name", ["Fe with C and S", "As with S", "Fe aged with C and S", "Mn with C and S, aged"])
def test_number_of_parts_is_that_of_a_grid(charts, name):
    drawn = charts(name)
    left, right, low, high = drawn.window
    # 0.05 pH and 8 mV: parts narrower than that aren't looked for
    x, y = np.linspace(left, right, 281)[1:-1], np.linspace(low, high, 313)[1:-1]
    grid_x, grid_y = np.meshgrid(x, y, indexing="ij")
    field = second(name, grid_x.ravel(), grid_y.ravel()).field.reshape(grid_x.shape)
    counts = connected_parts(field, smallest=40)
    drawn_counts = {
        item.name: sum(shapely.Polygon(rings[0]).buffer(-0.02).area > 0.02 for rings in item.polygons)
        for item in drawn.fields
    }
    assert {key: count for key, count in drawn_counts.items() if count} == {
        key: count for key, count in counts.items() if drawn_counts.get(key)
    }
    assert set(counts) <= {item.name for item in drawn.fields}


def connected_parts(field, smallest):
    """Number of connected parts of at least `smallest` cells of each name on a grid."""
    seen = np.zeros(field.shape, bool)
    counts = {}
    for start in np.ndindex(field.shape):
        if seen[start]:
            continue
        name, stack, size = field[start], [start], 0
        seen[start] = True
        while stack:
            i, j = stack.pop()
            size += 1
            for a, b in ((i + 1, j), (i - 1, j), (i, j + 1), (i, j - 1)):
                inside = 0 <= a < field.shape[0] and 0 <= b < field.shape[1]
                if inside and not seen[a, b] and field[a, b] == name:
                    seen[a, b] = True
                    stack.append((a, b))
        if size >= smallest:
            counts[name] = counts.get(name, 0) + 1
    return counts


def terms_of(reaction):
    """[(count, formula)] with products positive; `(s)` and `(aq)` taken off."""
    found = []
    for side, sign in zip(reaction.split(" = "), (-1, 1), strict=True):
        for term in side.split(" + "):
            number, formula = re.match(r"^(?:(\d+(?:\.\d+)?) )?(.+)$", term).groups()
            found.append((sign * float(number or 1), re.sub(r"\((?:s|aq)\)$", "", formula)))
    return found


@pytest.mark.parametrize("name", CASES)
def test_reactions_balance_and_count_what_the_boundary_says(charts, name):
    for line in charts(name).boundaries:
        total = {}
        for count, formula in terms_of(line.reaction):
            atoms, charge = composition(formula)
            for symbol, number in [*atoms.items(), ("charge", charge)]:
                total[symbol] = total.get(symbol, 0.0) + count * number
        assert all(abs(value) < 1e-9 for value in total.values()), line.reaction
        # counts on the left side
        sums = {"H^+": 0.0, "e^-": 0.0}
        for count, formula in terms_of(line.reaction):
            if formula in sums:
                sums[formula] -= count
        assert sums["H^+"] == pytest.approx(line.protons), line.reaction
        assert sums["e^-"] == pytest.approx(line.electrons), line.reaction
        assert line.electrons >= 0
        formulas = {formula for _, formula in terms_of(line.reaction)}
        own = {item.name: item.formula for item in charts(name).fields}
        named = {own[key] for key in line.between}
        # the two fields, or the ligand whose change of state ends a complex: then it's the ligand's reaction alone
        ligand = {part.removesuffix("(s)").removesuffix("(aq)") for part in line.ligand_forms.split(", ")}
        assert named <= formulas or (not named & formulas and len(ligand) == 2 and ligand <= formulas)


@pytest.mark.parametrize("name", CASES)
def test_slope_of_straight_lines_is_protons_over_electrons(charts, name):
    drawn = charts(name)
    slope_mV = 1000 * volt_per_decade(drawn.conditions.temperature_C)
    for line in drawn.boundaries:
        if line.kind == "vertical":
            assert line.electrons == 0
            assert line.slope_mV_per_pH is None
            assert np.ptp(line.points[:, 0]) < 0.02, (line.reaction, line.points.tolist())
            assert np.abs(line.points[:, 0] - line.pH).max() < 0.02
            continue
        assert line.slope_mV_per_pH == pytest.approx(-slope_mV * line.protons / line.electrons, abs=1e-6)
        assert (line.kind == "horizontal") == (line.protons == 0)
        runs = np.diff(line.points, axis=0)
        longest = np.abs(runs[:, 0]).argmax()
        if abs(runs[longest, 0]) < 1.0:
            continue
        # straight to 0.005 log unit: at most 0.01 over the run
        drawn_slope = 1000 * runs[longest, 1] / runs[longest, 0]
        assert drawn_slope == pytest.approx(line.slope_mV_per_pH, abs=1.5), (line.between, line.reaction)
        at = line.points[longest : longest + 2].mean(axis=0)
        assert 1000 * at[1] == pytest.approx(line.E_mV_at_pH0 + line.slope_mV_per_pH * at[0], abs=3.0), line.reaction


def cleaned(shape):
    """A shape without spikes and slits thinner than 2e-5 (pH and V); corners stay."""

    def moved(figure, distance):
        return shapely.buffer(figure, distance, join_style="mitre")

    return moved(moved(moved(moved(shape, -1e-5), 1e-5), 1e-5), -1e-5)


@pytest.mark.parametrize("name", CASES)
def test_outlines_have_no_spikes_and_slits(charts, name):
    for key, shape in shapes(charts(name)).items():
        extra = shape.boundary.difference(cleaned(shape).boundary.buffer(1e-5))
        # the tip of a real wedge may be that thin for some mm of outline
        assert shape.boundary.length - cleaned(shape).boundary.length < 0.02, (key, extra.bounds)


@pytest.mark.parametrize("name", CASES)
def test_lines_run_between_the_fields_they_name(charts, name):
    by_name = {key: shape.boundary for key, shape in shapes(charts(name)).items()}
    for line in charts(name).boundaries:
        shape = shapely.LineString(line.points)
        for key in line.between:
            assert shapely.difference(shape, by_name[key].buffer(1e-5)).length < 1e-3, (key, line.reaction)


@pytest.mark.parametrize("name", CASES)
def test_every_outline_has_its_line(charts, name):
    drawn = charts(name)
    left, right, low, high = drawn.window
    known = [shapely.LineString(line.points) for line in drawn.boundaries]
    known = shapely.union_all([*known, shapely.box(left, low, right, high).boundary]).buffer(3e-5)
    for key, shape in shapes(drawn).items():
        bare = cleaned(shape).boundary.difference(known)
        assert bare.length < 1e-3, (key, bare.length, bare.bounds)


@pytest.mark.parametrize(
    ("element", "acid", "base", "pK", "charge"),
    [
        # Nordstrom & Archer 2003; CRC; Plummer & Busenberg 1982: see tests/published/constants.csv
        ("As", "H3AsO3(aq)", "H2AsO3^-", 9.17, 0), ("As", "H3AsO4(aq)", "H2AsO4^-", 2.30, 0),
        ("As", "H2AsO4^-", "HAsO4^2-", 6.99, -1), ("As", "HAsO4^2-", "AsO4^3-", 11.80, -2),
        ("C", "CO2(aq)", "HCO3^-", 6.352, 0), ("C", "HCO3^-", "CO3^2-", 10.329, -1),
        ("S", "H2S(aq)", "HS^-", 6.99, 0), ("S", "HSO4^-", "SO4^2-", 1.988, -1), ("N", "NH4^+", "NH3(aq)", 9.246, 1),
    ],
)  # fmt: skip
@pytest.mark.parametrize("strength", [0.0, 0.1])
def test_vertical_line_stands_at_the_pK(element, acid, base, pK, charge, strength):
    drawn = chart(element, 1e-6, 25, ionic_strength_M=strength)
    lines = [line for line in drawn.boundaries if set(line.between) == {acid, base}]
    assert lines
    # equal amounts: pH = pK + log γ(base) − log γ(acid), Davies
    gamma = brute.log_gamma(charge - 1, 25.0, strength) - brute.log_gamma(charge, 25.0, strength)
    # water taken up by CO2 is below pure water's activity by 0.0015
    for line in lines:
        assert line.kind == "vertical"
        assert line.pH == pytest.approx(pK + gamma, abs=0.015)
        assert np.ptp(line.points[:, 0]) < 1e-6


def test_known_lines_of_iron_and_manganese():
    # E° 0.771 V; 1.291 V − 2 × 59.16 mV/pH − 29.58 log Mn; 0.771 + 0.05916 (3.5 − 3 pH − log Fe): I = 0, 1e-5 M
    iron = {frozenset(line.between): line for line in chart("Fe", 1e-5, 25, ionic_strength_M=0.0).boundaries}
    assert iron[frozenset({"Fe^3+", "Fe^2+"})].E_mV_at_pH0 == pytest.approx(771, abs=2)
    line = iron[frozenset({"ferrihydrite (2-line)", "Fe^2+"})]
    assert (line.slope_mV_per_pH, line.protons, line.electrons) == (pytest.approx(-177.5, abs=0.1), 3.0, 1.0)
    assert line.E_mV_at_pH0 == pytest.approx(771 + 59.16 * (3.5 + 5), abs=3)
    manganese = {frozenset(line.between): line for line in chart("Mn", 1e-5, 25, ionic_strength_M=0.0).boundaries}
    line = manganese[frozenset({"birnessite", "Mn^2+"})]
    assert line.E_mV_at_pH0 == pytest.approx(1291 + 29.58 * 5, abs=3)
    assert line.slope_mV_per_pH == pytest.approx(-118.3, abs=0.1)


@pytest.mark.parametrize("name", ["Fe with C and S", "As aged with Fe, C and S", "Mn with C"])
def test_as_dict_goes_through_json_and_back(charts, name):
    drawn = charts(name)
    again = Chart.from_dict(json.loads(json.dumps(drawn.as_dict(), allow_nan=False)))
    assert again.as_dict() == drawn.as_dict()
    assert again.conditions == drawn.conditions
    assert [item.name for item in again.fields] == [item.name for item in drawn.fields]
    assert isinstance(again.boundaries[0].points, np.ndarray)


def test_smaller_window_is_a_cut_of_the_whole():
    whole = chart("Fe", 1e-5, 15, ligands={"C": 3e-3, "S": 1e-3})
    window = (5.0, 9.0, -0.4, 0.6)
    part = chart("Fe", 1e-5, 15, ligands={"C": 3e-3, "S": 1e-3}, window=window)
    frame = shapely.box(window[0], window[2], window[1], window[3])
    for key, shape in shapes(part).items():
        assert shape.symmetric_difference(shapes(whole)[key].intersection(frame)).area < 0.004


def test_waters_lines_stand_at_the_charts_temperature():
    drawn = chart("Fe", 1e-5, 10.0)
    assert drawn.water["O2/H2O"][0] == pytest.approx([0.0, 1.2417], abs=6e-4)
    assert drawn.water["H2O/H2"][1] == pytest.approx([14.0, -14 * volt_per_decade(10.0)], abs=5e-4)


@pytest.mark.parametrize(
    ("call", "words"),
    [
        ({"element": "Fx"}, "no chart of 'Fx'.*Fe"), ({"total_mol_L": 0.0}, "total 0 mol/L"),
        ({"total_mol_L": float("nan")}, "total nan"), ({"temperature_C": -3.0}, "temperature -3 °C"),
        ({"ligands": {"Q": 1e-3}}, "ligand 'Q'.*C, Cl.*S, S"), ({"ligands": {"C": -1e-3}}, "ligand C = -0.001"),
        ({"ligands": {"S": 1e-3, "S(VI)": 1e-3}}, "tied by Eh"), ({"ligands": {"Fe": 1e-3}}, "own element"),
        ({"solids": "new"}, "solid set 'new'"), ({"window": (8.0, 4.0, -1.0, 1.0)}, "pH 8 to 4"),
        ({"window": (4.0, 8.0, 1.0, -1.0)}, "E 1 to -1 V"), ({"with_names": ("kryptonite",)}, "kryptonite"),
        ({"with_names": ("green rust (carbonate)",), "temperature_C": 10.0}, "green rust"),
    ],
)  # fmt: skip
def test_what_cannot_be_drawn_is_refused(call, words):
    with pytest.raises(UsageError, match=words):
        chart(**{"element": "Fe", "total_mol_L": 1e-5, **call})
