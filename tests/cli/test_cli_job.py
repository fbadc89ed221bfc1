"""`gley run`, `check`, `eh`, `sheet` from the command line: JSON twins, exit codes, one clear line for each fault."""

import json
from pathlib import Path

import pytest

import gley
from gley.cli import main
from gley.probe import convert

SURVEY = Path(__file__).parents[2] / "sample_surveys/nebelbruch.csv"


def answer(capsys, *words):
    code = main([str(word) for word in words])
    out, err = capsys.readouterr()
    return code, out, err


def test_eh_json_is_the_library_s_answer(capsys):
    words = ("eh", "215", "-120", "--electrode", "Ag/AgCl, 3 M KCl", "--temperature", "10", "--json")
    code, out, _ = answer(capsys, *words)
    assert code == 0
    assert json.loads(out) == {"readings": convert([215, -120], "Ag/AgCl, 3 M KCl", 10)}


def test_eh_text_says_reference_and_source(capsys):
    _, out, _ = answer(capsys, "eh", "-120", "--electrode", "SCE", "--temperature", "25")
    assert "reference 244 mV, Eh 124 mV" in out
    assert "Source: " in out


@pytest.mark.parametrize(
    ("words", "code", "says"),
    [
        (("eh", "215"), 2, "No reference electrode named"),
        (("eh", "x", "--electrode", "SCE"), 2, "'x' isn't a number"),
        (("eh", "1", "--electrode", "lead pipe"), 2, "isn't a reference electrode"),
        (("eh", "1", "--electrode", "Ag/AgCl"), 2, "leaves the filling solution open"),
        (("run", "nowhere.xlsx"), 1, "nowhere.xlsx: can't be read"),
        (("check", SURVEY, "--electrode", "lead pipe"), 2, "isn't a reference electrode"),
        (("run", SURVEY, "--elements", "Kr", "--out", "never"), 2, "'Kr' isn't among the elements"),
        (("run", SURVEY, "--solids", "old", "--out", "never"), 2, "one of fresh, aged, none is wanted"),
        (("run", SURVEY, "--crs", "EPSG:77", "--out", "never"), 2, "isn't a coordinate reference system"),
        (("run", SURVEY, "--settings", "nowhere.toml", "--out", "never"), 2, "nowhere.toml: can't be read"),
        (("sheet", "field.doc"), 2, "field.doc"),
    ],
)
def test_faults_are_one_line_and_a_code(capsys, words, code, says):
    found, out, err = answer(capsys, *words)
    assert found == code
    assert out == ""
    assert says in err
    assert "Traceback" not in err
    assert not Path("never").exists()


def test_check_json_holds_samples_and_findings(capsys):
    code, out, _ = answer(capsys, "check", SURVEY, "--json")
    assert code == 0
    record = json.loads(out)
    survey = gley.read_survey(SURVEY)
    assert [row["sample"] for row in record["samples"]] == list(survey.samples["sample"])
    assert record["counts"]["samples"] == len(survey.samples)


def test_error_in_the_data_is_exit_code_3(capsys, tmp_path):
    path = tmp_path / "s.csv"
    path.write_text("Sample;ORP (mV);pH;Fe\nW1;1;7;2\n", encoding="utf-8")
    code, out, _ = answer(capsys, "check", path, "--electrode", "SCE")
    assert code == 3
    assert "error: s.csv > D1: 'Fe' has no unit" in out


def test_run_json_twin_and_quiet(capsys, tmp_path):
    folder = tmp_path / "a"
    code, out, err = answer(capsys, "--quiet", "run", SURVEY, "--out", folder, "--crs", "none", "--json")
    assert (code, err) == (0, "")
    record = json.loads(out)
    assert record["elements"] == ["Fe", "Mn"]
    assert len(record["samples"]) == record["counts"]["samples"] == 35
    assert len(record["fields"]) == 70
    assert (folder / "report.html").exists()


def test_version_and_bare_call(capsys):
    assert answer(capsys, "--version")[1] == f"gley {gley.__version__}\n"
    code, out, _ = answer(capsys)
    assert code == 0
    assert "run" in out
    assert "check" in out


@pytest.mark.parametrize("name", ["run", "check", "explain", "eh", "chart", "data", "sheet"])
def test_every_command_has_help_with_an_example(capsys, name):
    code, out, _ = answer(capsys, name, "--help")
    assert code == 0
    assert f"Example: gley {name}" in out


def test_run_stopped_while_replacing_is_mended_and_said(capsys, tmp_path):
    (tmp_path / "a.previous").mkdir()
    (tmp_path / "a.previous/run.json").write_text("{}")
    code, _, err = answer(capsys, "run", SURVEY, "--out", tmp_path / "a")
    assert code == 1
    assert "the old result was put back" in err
    assert (tmp_path / "a/run.json").exists()
    assert not (tmp_path / "a.previous").exists()
