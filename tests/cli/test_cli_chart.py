"""`gley chart` and `gley data`: the JSON that others rely on, the text, and clear refusals."""

import json

import pytest

from gley import chart as library_chart
from gley.cli import main


def answer(capsys, *words):
    code = main(list(words))
    out, err = capsys.readouterr()
    return code, out, err


def test_chart_json_is_the_library_object(capsys):
    code, out, _ = answer(capsys, "chart", "Fe", "--total", "1e-5", "--ligand", "C=2e-3", "--json")
    assert code == 0
    twin = library_chart("Fe", 1e-5, 25.0, ligands={"C": 2e-3}).as_dict()
    assert json.loads(out) == json.loads(json.dumps(twin))


def test_chart_json_has_the_agreed_names(capsys):
    _, out, _ = answer(capsys, "chart", "Fe", "--total", "1e-5", "--temperature", "25", "--json")
    record = json.loads(out)
    assert {"element", "conditions", "fields", "boundaries"} <= record.keys()
    assert {"name", "formula", "kind", "oxidation_state", "polygons"} <= record["fields"][0].keys()
    ring = record["fields"][0]["polygons"][0][0]
    assert ring[0] == ring[-1]
    assert len(ring[0]) == 2
    wanted = {"between", "ligand_forms", "reaction", "protons", "electrons", "kind", "slope_mV_per_pH", "E_mV_at_pH0"}
    assert wanted | {"pH", "points"} <= record["boundaries"][0].keys()


def test_several_totals_and_temperatures_give_charts(capsys):
    _, out, _ = answer(capsys, "chart", "Mn", "--total", "1e-6,1e-4", "--temperature", "25,5", "--json")
    charts = json.loads(out)["charts"]
    found = [(item["conditions"]["total_mol_L"], item["conditions"]["temperature_C"]) for item in charts]
    assert found == [(1e-6, 25), (1e-6, 5), (1e-4, 25), (1e-4, 5)]


def test_iron_three_over_two_is_horizontal_at_0_77_V(capsys):
    # E°(Fe^3+/Fe^2+) = 0.771 V: CRC Handbook of Chemistry and Physics, electrochemical series
    _, out, _ = answer(capsys, "chart", "Fe", "--total", "1e-6", "--ionic-strength", "0", "--json")
    edge = next(e for e in json.loads(out)["boundaries"] if set(e["between"]) == {"Fe^3+", "Fe^2+"})
    assert edge["kind"] == "horizontal"
    assert edge["E_mV_at_pH0"] == pytest.approx(771, abs=6)


def test_with_and_without_change_who_competes(capsys):
    names = {}
    for words in ((), ("--without", "ferrihydrite (2-line)", "--with", "hematite")):
        _, out, _ = answer(capsys, "chart", "Fe", "--total", "1e-6", *words, "--json")
        names[words] = {field["name"] for field in json.loads(out)["fields"]}
    plain, changed = names.values()
    assert "ferrihydrite (2-line)" in plain
    assert "hematite" in changed
    assert "ferrihydrite (2-line)" not in changed


def test_text_names_every_line_with_its_reaction(capsys):
    _, out, _ = answer(capsys, "chart", "Mn", "--total", "1e-6")
    assert "MnO2(s) + 4 H^+ + 2 e^- = Mn^2+ + 2 H2O" in out
    assert "-118.3 mV/pH" in out  # 4 protons, 2 electrons: −2 · 59.16 mV at 25 °C


@pytest.mark.parametrize(
    ("words", "says"),
    [
        (("chart", "Xx"), "There is no chart of 'Xx'"),
        (("chart", "Fe", "--total", "0"), "total 0 mol/L: above 0 and up to 10 mol/L is wanted"),
        (("chart", "Fe", "--total", "-1"), "above 0"),
        (("chart", "Fe", "--total", "much"), "'much' isn't a number"),
        (("chart", "Fe", "--temperature", "200"), "0 to 100 °C is wanted"),
        (("chart", "Fe", "--ligand", "C"), "isn't NAME=TOTAL"),
        (("chart", "Fe", "--ligand", "Q=1e-3"), "ligand 'Q'"),
        (("chart", "Fe", "--ligand", "Fe=1e-3"), "chart's own element"),
        (("chart", "Fe", "--ligand", "S=1e-3", "--ligand", "S(VI)=1e-3"), "one or the other"),
        (("chart", "Fe", "--solids", "old"), "one of none, fresh, aged is wanted"),
        (("chart", "Fe", "--with", "goethit3"), "No species is called 'goethit3'"),
        (("data", "Qq"), "There are no species of 'Qq'"),
        (("chart", "Fe", "--colour"), "--colour"),
        (("chrt",), "No such command"),
    ],
)
def test_bad_calls_give_one_line_and_code_2(capsys, words, says):
    code, out, err = answer(capsys, *words)
    assert code == 2
    assert out == ""
    assert says in err
    assert "Traceback" not in err
    assert len(err.strip().splitlines()) <= 2


def test_data_lists_species_with_source_and_grade(capsys):
    _, out, _ = answer(capsys, "data", "Fe", "--json")
    record = json.loads(out)
    wanted = {
        "name",
        "formula",
        "phase",
        "dGf_kJ_mol",
        "dHf_kJ_mol",
        "logK",
        "reaction",
        "set",
        "T_basis",
        "source",
        "grade",
    }
    for row in record["species"]:
        assert wanted <= row.keys()
        assert row["source"]
        assert row["grade"]
    assert record["electrodes"]
    assert "siderite" in {row["name"] for row in record["species"]}


def test_chart_folder_is_written_once(capsys, tmp_path):
    words = ("chart", "Mn", "--total", "1e-6", "--out", str(tmp_path / "charts"))
    assert answer(capsys, *words)[0] == 0
    first = {path.name: path.read_bytes() for path in (tmp_path / "charts").iterdir()}
    assert {"Mn.svg", "Mn.png", "Mn.json", "Mn.csv"} <= first.keys()
    code, _, err = answer(capsys, *words)
    assert code == 1
    assert "--overwrite" in err
    assert {path.name: path.read_bytes() for path in (tmp_path / "charts").iterdir()} == first
    assert answer(capsys, *words, "--overwrite")[0] == 0


def test_over_lays_one_element_over_another(capsys):
    words = ("chart", "Fe", "--total", "1e-5", "--ligand", "C=2e-3", "--over", "As=1e-7")
    code, out, _ = answer(capsys, *words, "--json")
    record = json.loads(out)
    assert code == 0
    assert record["over"]["element"] == "As"
    assert record["over"]["conditions"]["total_mol_L"] == 1e-7
    assert sum(item["share"] for item in record["overlaps"]) == pytest.approx(1.0, abs=1e-4)
    _, text, _ = answer(capsys, *words)
    assert "As over Fe, part of the chart:" in text
    assert "%  HAsO4^2- over ferrihydrite (2-line)" in text


def test_over_writes_its_regions_as_a_table(capsys, tmp_path):
    code, _, _ = answer(capsys, "chart", "Fe", "--over", "As", "--out", str(tmp_path / "c"))
    assert code == 0
    lines = (tmp_path / "c" / "As_over_Fe_overlaps.csv").read_text(encoding="utf-8").splitlines()
    assert lines[0] == "over_element,over_field,under_element,under_field,share_of_chart"
    assert (tmp_path / "c" / "As_over_Fe.svg").exists()


def test_fan_is_drawn_between_two_conditions(capsys, tmp_path):
    code, out, _ = answer(capsys, "chart", "Fe", "--total", "1e-5,1e-7,1e-4", "--fan", "--json")
    record = json.loads(out)
    assert code == 0
    assert record["chart"]["conditions"]["total_mol_L"] == 1e-5
    assert [item["conditions"]["total_mol_L"] for item in record["fan"]] == [1e-7, 1e-4]
    assert answer(capsys, "chart", "Mn", "--temperature", "5,25", "--fan", "--out", str(tmp_path / "f"))[0] == 0
    svg = (tmp_path / "f" / "Mn.svg").read_text(encoding="utf-8")
    assert 'id="fan' in svg
    code, _, err = answer(capsys, "chart", "Fe", "--fan")
    assert (code, "A fan is drawn between two conditions" in err) == (2, True)


def test_inert_leaves_dinitrogen_or_sulfate_out_of_the_reaction(capsys):
    # nitrate and N2 react only with microbes (common practice): without N2 nitrite and ammonium have fields
    _, out, _ = answer(capsys, "chart", "N", "--inert", "N2", "--json")
    names = {item["name"] for item in json.loads(out)["fields"]}
    assert "N2(aq)" not in names
    assert {"NO3^-", "NO2^-", "NH4^+"} <= names
    _, out, _ = answer(capsys, "chart", "Fe", "--ligand", "S=1e-3", "--inert", "sulfate", "--json")
    record = json.loads(out)
    assert record["conditions"]["ligands_mol_L"] == {"S(VI)": 1e-3}
    assert "mackinawite" not in {item["name"] for item in record["fields"]}
    code, _, err = answer(capsys, "chart", "Fe", "--inert", "gold")
    assert (code, "'gold' can't be taken as inert" in err) == (2, True)
