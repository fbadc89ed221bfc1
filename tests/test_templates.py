"""The templates are what vocabulary and settings say today; when not: `python tests/make_templates.py`."""

import tomllib

import openpyxl
import pytest

from gley.columns import columns, constituents
from gley.probe import electrodes
from gley.settings import Settings, load, template
from gley.survey import read_survey, write_sheet
from make_templates import DELIVERY, SETTINGS, TEMPLATES, WORKBOOK, delivery

STALE = "stale: run `python tests/make_templates.py`"


def content(path):
    """Everything of a workbook that a user meets: values, notes, checks, by sheet and cell."""
    found = {}
    for sheet in openpyxl.load_workbook(path).worksheets:
        for row in sheet.iter_rows():
            for cell in row:
                if cell.value is not None or cell.comment:
                    found[sheet.title, cell.coordinate] = cell.value, cell.comment.text if cell.comment else ""
        for rule in sheet.data_validations.dataValidation:
            found[sheet.title, f"check {rule.sqref}"] = rule.type, rule.formula1, rule.formula2, rule.error
    return found


def test_field_workbook_is_current(tmp_path):
    now = write_sheet(tmp_path / "now.xlsx", [item["name"] for item in electrodes()])
    assert content(TEMPLATES / WORKBOOK) == content(now), STALE


def test_settings_are_current():
    assert (TEMPLATES / SETTINGS).read_text(encoding="utf-8") == template(), STALE


def test_delivery_is_current():
    assert (TEMPLATES / DELIVERY).read_text(encoding="utf-8") == delivery(), STALE


@pytest.mark.parametrize("table", ["Samples", "Stations", "Checks"])
def test_notes_in_the_workbook_are_the_vocabulary(table):
    sheet = openpyxl.load_workbook(TEMPLATES / WORKBOOK)[table]
    meanings = {name: column.meaning for name, column in columns(table.lower()).items()}
    if table == "Samples":
        meanings |= {key: item.meaning for key, item in constituents().items()}
    for cell in sheet[1]:
        assert cell.comment.text.splitlines()[0] == meanings[cell.value], STALE


def test_settings_as_delivered_change_nothing():
    assert load(TEMPLATES / SETTINGS) == Settings()


def test_settings_name_every_setting_and_are_valid_when_uncommented():
    lines = (TEMPLATES / SETTINGS).read_text(encoding="utf-8").splitlines()
    live = [line[1:] if line.startswith("#") and not line.startswith("# ") else line for line in lines]
    groups = tomllib.loads("\n".join(live))
    assert {group: set(values) for group, values in groups.items()} == {
        group: set(values) for group, values in Settings().as_dict().items()
    }


def test_delivery_reads_without_a_doubt():
    survey = read_survey(TEMPLATES / DELIVERY)
    doubts = {item.rule for item in survey.findings if item.severity != "note"}
    assert doubts == {"survey.no_ORP", "survey.no_pH"}  # a laboratory has neither
    first = survey.amounts.loc[survey.samples["sample"] == "KB1-A"].iloc[0]
    assert first["Fe_mol_L"] == pytest.approx(0.02e-3 / 55.845)
    assert first["Fe_limit"] == "<"
    assert first["NO3_mol_L"] == pytest.approx(6.4e-3 / 14.007, rel=1e-4)
    assert first["alkalinity_eq_L"] == pytest.approx(185e-3 / 50.04, rel=1e-3)


def test_readme_names_every_template():
    text = (TEMPLATES / "README.md").read_text(encoding="utf-8")
    names = {path.name for path in TEMPLATES.iterdir()}
    assert names == {WORKBOOK, SETTINGS, DELIVERY, "README.md"}
    assert all(f"`{name}`" in text for name in names - {"README.md"})
