"""Sheets and files as a whole: several tables, footnotes, merged cells, facts, and damage not to be passed over."""

import zipfile

import openpyxl
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from gley.errors import GleyError, UsageError
from gley.survey import read_survey
from survey_files import write


def book(tmp_path, *rows, merge=""):
    made = openpyxl.Workbook()
    for row in rows:
        made.active.append(row)
    if merge:
        made.active.merge_cells(merge)
    made.save(tmp_path / "s.xlsx")
    return tmp_path / "s.xlsx"


def said(survey, rule):
    return [(item.place.cell, item.value) for item in survey.findings if item.rule == rule]


def test_second_table_below_the_first(tmp_path):
    survey = read_survey(
        write(
            tmp_path, "s.csv", "Sample;ORP (mV);pH", "W1;5;7", "", "Checks", "Solution;Reading (mV);T (°C)",
            "ZoBell;230;20", "", "Well;Easting (m);Northing (m)", "W1;500000;5900000",
        )
    )  # fmt: skip
    assert list(survey.samples["sample"]) == ["W1"]
    assert list(survey.checks["reading_mV"]) == [230]
    assert str(survey.origin.of("checks", 0, "reading_mV")) == "s.csv > B6"
    assert list(survey.stations["x_m"]) == [500000]
    assert survey.findings.rules() == []


def test_table_above_a_wider_one(tmp_path):
    survey = read_survey(
        write(tmp_path, "s.csv", "Solution;Reading (mV)", "ZoBell;230", "", "Sample;ORP (mV);pH;Fe (mg/L)", "W1;5;7;1")
    )
    assert len(survey.checks) == len(survey.samples) == 1


def test_list_of_places_with_depths_makes_no_samples(tmp_path):
    field = write(tmp_path, "a.csv", "Well;ORP (mV);pH", "W1;5;7")
    survey = read_survey([field, write(tmp_path, "b.csv", "Well;X (m);Y (m);Depth (m);Aquifer", "W1;5;7;8;upper")])
    assert len(survey.samples) == 1
    assert list(survey.stations["aquifer"]) == ["upper"]


def test_station_twice_with_other_values_is_said(tmp_path):
    field = write(tmp_path, "a.csv", "Well;ORP (mV);pH", "W1;5;7")
    survey = read_survey([field, write(tmp_path, "b.csv", "Well;X (m);Y (m)", "W1;5;7", "W1;6;7")])
    assert said(survey, "survey.station_twice") == [("A3", "W1")]


@pytest.mark.parametrize("name", ["SD-1", "Source Hill", "MIN-04", "Summer 3", "#12", "Mean Street 2"])
def test_names_that_begin_like_closing_lines_are_samples(tmp_path, name):
    survey = read_survey(write(tmp_path, "s.csv", "Sample;ORP (mV);pH", f"{name};5;7"))
    assert list(survey.samples["sample"]) == [name]


@pytest.mark.parametrize("line", ["Mean;5;7", "Mean of all;5;7", "Max.;5;7", "Note: pumped;;", ";BDL below limit;"])
def test_closing_lines_and_footnotes(tmp_path, line):
    survey = read_survey(write(tmp_path, "s.csv", "Sample;ORP (mV);pH", "W1;5;7", line))
    assert len(survey.samples) == 1
    assert [cell[1:] for cell, _ in said(survey, "survey.closing_row")] == ["3"]


def test_column_without_a_header_is_said(tmp_path):
    survey = read_survey(write(tmp_path, "s.csv", "Sample;ORP (mV);pH;", "W1;5;7;x"))
    assert said(survey, "survey.column_unheaded") == [("D2", "x")]


def test_cells_merged_down_the_rows_hold_for_all_of_them(tmp_path):
    rows = ["Plot", "Depth (cm)", "ORP (mV)", "pH"], ["A", 5, 100, 7], [None, 10, 50, 7], ["B", 5, 20, 7]
    survey = read_survey(book(tmp_path, *rows, merge="A2:A3"))
    assert list(survey.samples["station"]) == ["A", "A", "B"]
    assert said(survey, "survey.merged_cells") == [("A1", "Plot")]


def test_merged_title_is_no_data(tmp_path):
    survey = read_survey(book(tmp_path, ["Made-up works"], ["Well", "ORP (mV)", "pH"], ["A", 5, 7], merge="A1:C1"))
    assert list(survey.samples["sample"]) == ["A"]
    assert survey.findings.rules() == []


def test_formula_without_a_stored_result_is_said(tmp_path):
    survey = read_survey(book(tmp_path, ["Well", "ORP (mV)", "pH"], ["A", "=2+3", 7], ["B", 5, 7]))
    assert said(survey, "survey.formula_unstored") == [("B2", "=2+3")]


def test_text_numbers_with_commas_in_a_workbook(tmp_path):
    survey = read_survey(book(tmp_path, ["Well", "ORP (mV)", "pH"], ["A", 120.5, "7,15"], ["B", 5, "6,9"]))
    assert list(survey.samples["pH"]) == [7.15, 6.9]
    assert survey.findings.rules() == []


@pytest.mark.parametrize(
    "line", ["# electrode: Ag/AgCl, 3 M KCl", "Electrode: Ag/AgCl, 3 M KCl", "electrode,Ag/AgCl, 3 M KCl"]
)
@pytest.mark.parametrize("row", ["W1,5,7,x", 'W1,5,7,"two\nlines"'])
def test_electrode_with_a_comma_above_comma_separated_cells(tmp_path, line, row):
    survey = read_survey(write(tmp_path, "s.csv", line, "Sample,ORP (mV),pH,Remarks", row))
    assert survey.facts == {"electrode": "Ag/AgCl, 3 M KCl"}


def test_electrodes_of_two_files_hold_for_their_own_rows(tmp_path):
    one = write(tmp_path, "a.csv", "# electrode: calomel, saturated KCl", "Sample;ORP (mV);pH", "W1;5;7")
    two = write(tmp_path, "b.csv", "# electrode: Ag/AgCl, 3 M KCl", "Sample;ORP (mV);pH", "W2;5;7")
    survey = read_survey([one, two])
    assert survey.facts["electrode"] == "calomel, saturated KCl"
    assert list(survey.samples["electrode"]) == ["", "Ag/AgCl, 3 M KCl"]
    assert said(survey, "survey.fact_of_its_rows") == [("A1", "Ag/AgCl, 3 M KCl")]


def test_fact_twice_in_one_sheet_the_first_holds_and_it_is_said(tmp_path):
    lines = "# electrode: calomel, saturated KCl", "# electrode: Ag/AgCl, 3 M KCl"
    survey = read_survey(write(tmp_path, "s.csv", *lines, "Sample;ORP (mV);pH", "W1;5;7"))
    assert survey.facts["electrode"] == "calomel, saturated KCl"
    assert list(survey.samples["electrode"]) == [""]
    assert said(survey, "survey.fact_twice") == [("A2", "Ag/AgCl, 3 M KCl")]


def test_open_quotation_is_refused(tmp_path):
    path = write(tmp_path, "s.csv", "Sample;ORP (mV);pH;Remarks", 'W1;5;7;"deep', "W2;5;7;x")
    with pytest.raises(GleyError, match=r"s\.csv: row 2 can't be read \(a quotation mark is opened and never closed\)"):
        read_survey(path)


def test_damaged_sheet_is_refused_in_one_line(tmp_path):
    whole = book(tmp_path, ["Well", "ORP (mV)", "pH"], ["A", 5, 7])
    with zipfile.ZipFile(whole) as old, zipfile.ZipFile(tmp_path / "t.xlsx", "w") as new:
        for name in old.namelist():
            new.writestr(name, b"<worksheet><oops" if "sheet1" in name else old.read(name))
    with pytest.raises(GleyError, match=r"t\.xlsx: not a readable \.xlsx workbook"):
        read_survey(tmp_path / "t.xlsx")


def test_no_file_and_the_same_file_twice_are_refused(tmp_path):
    path = write(tmp_path, "s.csv", "Sample;ORP (mV);pH", "W1;5;7")
    with pytest.raises(UsageError, match="No survey file is given"):
        read_survey([])
    with pytest.raises(UsageError, match=r"s\.csv: the same content is given twice"):
        read_survey([path, path])


CELLS = st.sampled_from(
    [
        "Sample", "Well", "ORP (mV)", "pH", "Fe (mg/L)", "As", "Date", "Pt 1", "Parameter", "Result", "Unit",
        "Solution", "Reading (mV)", "mV", "mg/L", "W1", "7,1", "<0.5", "ND", "1.200", "-999", "#N/A",
        "03/04/2031", "24:61", "Mean", "# x", "#", "electrode: x", '"', "'", "=1+1", "°C", "x_m", "µ", "1e999",
        "",
    ]
)  # fmt: skip


@settings(max_examples=300, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(st.lists(st.lists(CELLS, min_size=1, max_size=6), min_size=1, max_size=8), st.sampled_from(";,\t|"))
def test_whatever_the_cells_there_is_a_survey_or_one_clear_refusal(tmp_path, rows, mark):
    path = write(tmp_path, "any.csv", *(mark.join(row) for row in rows))
    try:
        survey = read_survey(path)
    except GleyError:
        return
    assert survey.samples["sample"].is_unique
    assert list(survey.samples.index) == list(survey.amounts.index) == list(survey.reported.index)
