"""Rows: every sample row stays, names become unique, laboratory files join, closing lines don't pass for samples."""

import pytest

from gley.survey import read_survey
from survey_files import FIELD, places, write


def test_wide_laboratory_file_joins_by_name(tmp_path):
    field = write(tmp_path, "field.csv", *FIELD)
    laboratory = write(tmp_path, "lab.csv", "Sample ID;Fe (mg/L);As (µg/L)", "w2;1,5;<1", "W1;0,1;3")
    survey = read_survey([field, laboratory])
    assert len(survey.samples) == 2
    assert list(survey.reported["Fe_mg_L"]) == ["0,1", "1,5"]
    assert str(survey.origin.place(1, "Fe")) == "lab.csv > B2"
    assert places(survey, "survey.laboratory_joined") == [("lab.csv", "", "2")]


def test_long_laboratory_file_joins_by_name(tmp_path):
    field = write(tmp_path, "field.csv", *FIELD)
    laboratory = write(
        tmp_path,
        "lab.csv",
        "Sample;Parameter;Result;Unit;Flag;Limit",
        "W1;Iron;0,12;mg/L;;0,05",
        "W1;Arsenic;;µg/L;U;1",
        "W2;Iron;1,5;mg/L;;0,05",
        "W2;Nitrate as N;0,5;mg/L;<;0,5",
        "W2;Unobtainium;3;mg/L;;",
        "W2;Iron;1,7;mg/L;;0,05",
    )
    survey = read_survey([field, laboratory])
    assert list(survey.reported["Fe_mg_L"]) == ["0,12", "1,5"]
    assert list(survey.amounts["As_limit"]) == ["<", ""]
    assert list(survey.amounts["NO3_limit"]) == ["", "<"]
    assert places(survey, "survey.parameter_unknown") == [("lab.csv", "B6", "Unobtainium")]
    assert places(survey, "survey.result_twice") == [("lab.csv", "C7", "1,7")]


def test_laboratory_sample_without_a_partner_keeps_its_row(tmp_path):
    survey = read_survey(
        [write(tmp_path, "field.csv", *FIELD), write(tmp_path, "lab.csv", "Sample;Fe (mg/L)", "W1;1", "W9;2")]
    )
    assert list(survey.samples["sample"]) == ["W1", "W2", "W9"]
    assert places(survey, "survey.laboratory_alone") == [("lab.csv", "A3", "W9")]


def test_same_value_twice_the_first_stays_and_it_is_said(tmp_path):
    field = write(tmp_path, "field.csv", "Sample;ORP (mV);pH;Fe (mg/L)", "W1;100;7,1;1,0")
    survey = read_survey([field, write(tmp_path, "lab.csv", "Sample;Fe (mg/L);Mn (mg/L)", "W1;1,3;0,2")])
    assert survey.reported.loc[0, "Fe_mg_L"] == "1,0"
    assert survey.reported.loc[0, "Mn_mg_L"] == "0,2"
    assert places(survey, "survey.value_twice") == [("lab.csv", "B2", "1,3")]


def test_repeated_names_are_told_apart(tmp_path):
    survey = read_survey(
        write(tmp_path, "s.csv", "Sample;Round;ORP (mV);pH", "W1;1;1;7", "W1;2;2;7", "W2;;3;7", "W2;;4;7")
    )
    assert list(survey.samples["sample"]) == ["W1 1", "W1 2", "W2", "W2 #2"]
    assert [value for _, _, value in places(survey, "survey.name_repeated")] == ["W1", "W2"]


def test_station_with_round_names_a_sample(tmp_path):
    survey = read_survey(write(tmp_path, "s.csv", "Well;Round;ORP (mV);pH", "W1;spring;1;7", "W1;autumn;2;7"))
    assert list(survey.samples["sample"]) == ["W1 spring", "W1 autumn"]
    assert survey.findings.rules() == []


def test_row_without_any_name_is_kept_and_said(tmp_path):
    survey = read_survey(write(tmp_path, "s.csv", "Sample;ORP (mV);pH", "W1;1;7", ";2;7"))
    assert list(survey.samples["sample"]) == ["W1", "row 3"]
    assert places(survey, "survey.sample_unnamed") == [("s.csv", "A3", "row 3")]


def test_field_duplicate_is_a_row_of_its_own(tmp_path):
    survey = read_survey(write(tmp_path, "s.csv", "Sample;ORP (mV);pH", "W1;1;7", "W1-DUP;2;7"))
    assert list(survey.samples["sample_type"]) == ["", "duplicate"]
    assert "survey.duplicate_by_name" in survey.findings.rules()


def test_closing_lines_and_repeated_headers_are_no_samples(tmp_path):
    survey = read_survey(
        write(
            tmp_path,
            "s.csv",
            "Sample;ORP (mV);pH",
            "W1;1;7",
            "Sample;ORP (mV);pH",
            "W2;2;7",
            "Mean;1,5;7",
            "Legend: field pH",
        )
    )
    assert list(survey.samples["sample"]) == ["W1", "W2"]
    assert [cell for _, cell, _ in places(survey, "survey.closing_row")] == ["A5", "A6"]
    assert [cell for _, cell, _ in places(survey, "survey.repeated_header")] == ["A3"]


def test_facts_above_the_table(tmp_path):
    lines = ("# electrode: calomel, saturated KCl", "Project: Moor, north", "CRS;EPSG:25832", "", *FIELD)
    survey = read_survey(write(tmp_path, "s.csv", *lines))
    assert survey.facts == {"electrode": "calomel, saturated KCl", "project": "Moor, north", "crs": "EPSG:25832"}


def test_laboratory_pH_is_taken_and_said_where_there_is_no_other(tmp_path):
    survey = read_survey(write(tmp_path, "s.csv", "Sample;ORP (mV);pH lab", "W1;1;7,4"))
    assert survey.samples.loc[0, "pH"] == 7.4
    assert survey.samples.loc[0, "pH_where"] == "laboratory"
    assert survey.findings.rules() == ["survey.pH_laboratory"]


@pytest.mark.parametrize(
    ("header", "rule"), [("Sample;pH;Fe (mg/L)", "survey.no_ORP"), ("Sample;ORP (mV)", "survey.no_pH")]
)
def test_survey_without_orp_or_pH_is_an_error(tmp_path, header, rule):
    survey = read_survey(write(tmp_path, "s.csv", header, "W1;7;1"))
    assert rule in [item.rule for item in survey.findings.of("error")]


def test_missing_pH_of_one_sample_is_said(tmp_path):
    survey = read_survey(write(tmp_path, "s.csv", "Sample;ORP (mV);pH", "W1;1;7", "W2;2;"))
    assert [item.message for item in survey.findings if item.rule == "survey.pH_missing"] == [
        "Sample W2 has no pH: it keeps its row, without stability fields."
    ]
