"""The sample surveys: what lies in `sample_surveys/` is what the script makes, and its chemistry holds together."""

import csv
from pathlib import Path

import openpyxl
import pytest

import make_surveys

TOP = Path(__file__).parents[1]


def cells(path):
    book = openpyxl.load_workbook(path)
    return {sheet.title: [[cell.value for cell in row] for row in sheet.iter_rows()] for sheet in book}


@pytest.fixture(scope="module")
def made(tmp_path_factory):
    folder = tmp_path_factory.mktemp("made")
    make_surveys.write(folder / "surveys", folder / "truth")
    return folder


def test_files_are_what_the_script_makes(made):
    assert cells(made / "surveys/erlenwiek.xlsx") == cells(TOP / "sample_surveys/erlenwiek.xlsx")
    for name in ("surveys/nebelbruch.csv", "truth/erlenwiek.csv", "truth/nebelbruch.csv"):
        kept = TOP / name.replace("surveys/", "sample_surveys/").replace("truth/", "tests/truth/")
        assert (made / name).read_text(encoding="utf-8") == kept.read_text(encoding="utf-8"), (
            "run tests/make_surveys.py"
        )


def test_charge_balance_of_every_sample_is_within_5_percent():
    rows = list(csv.DictReader((TOP / "tests/truth/erlenwiek.csv").read_text(encoding="utf-8").splitlines()))
    assert len(rows) >= 48
    assert all(abs(float(row["charge_balance_percent"])) < 5 for row in rows)
