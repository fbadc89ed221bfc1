"""Laboratory and field files together: what joins, what doesn't, and what is whose."""

import math

import pytest

from gley.settings import Settings
from gley.survey import read_survey
from survey_files import FIELD, places, write


def test_laboratory_table_with_pH_joins_and_its_pH_is_the_laboratory_s(tmp_path):
    laboratory = write(tmp_path, "b.csv", "Sample;pH;T (°C);Fe (mg/L)", "W1;7,6;20;1", "W2;7,5;20;2")
    survey = read_survey([write(tmp_path, "a.csv", *FIELD), laboratory])
    assert list(survey.samples["pH"]) == [7.1, 6.9]
    assert list(survey.samples["pH_lab"]) == [7.6, 7.5]
    assert list(survey.samples["temperature_C"]) == [11, 10]
    assert places(survey, "survey.pH_of_laboratory") == [("b.csv", "B2", "7.6")]
    assert places(survey, "survey.bench_temperature") == [("b.csv", "C2", "20")]


def test_field_sheet_in_two_parts_keeps_its_pH(tmp_path):
    one = write(tmp_path, "a.csv", "Sample;ORP (mV)", "W1;100")
    survey = read_survey([one, write(tmp_path, "b.csv", "Sample;pH;T (°C);DO (mg/L)", "W1;7,0;10;1")])
    assert len(survey.samples) == 1
    assert (survey.samples.loc[0, "pH"], survey.samples.loc[0, "pH_where"]) == (7.0, "field")
    assert survey.samples.loc[0, "temperature_C"] == 10


def test_join_by_station_where_no_sample_is_named(tmp_path):
    field = write(tmp_path, "a.csv", "Well;Date;ORP (mV);pH", "W1;2031-04-01;100;7", "W2;2031-04-01;50;7")
    survey = read_survey([field, write(tmp_path, "b.csv", "Well;Fe (mg/L)", "w2;2", "W1;1")])
    assert list(survey.reported["Fe_mg_L"]) == ["1", "2"]
    assert places(survey, "survey.laboratory_loosely") == [("b.csv", "", "2")]


def test_rounds_at_one_station_join_by_their_day(tmp_path):
    field = write(tmp_path, "a.csv", "Well;Date;ORP (mV);pH", "W1;2031-01-01;100;7", "W1;2031-05-01;50;7")
    lab = write(tmp_path, "b.csv", "Well;Date;Fe (mg/L)", "W1;2031-05-01;5", "W1;2031-01-01;1", "W1;2031-09-01;9")
    survey = read_survey([field, lab])
    assert list(survey.reported["Fe_mg_L"]) == ["1", "5", "9"]
    assert places(survey, "survey.laboratory_alone") == [("b.csv", "A4", "W1")]


def test_exact_name_comes_before_one_in_other_case(tmp_path):
    field = write(tmp_path, "a.csv", "Sample;ORP (mV);pH", "W1;1;7", "w1;2;7")
    survey = read_survey([field, write(tmp_path, "b.csv", "Sample;Fe (mg/L)", "w1;2", "W1;1")])
    assert list(survey.reported["Fe_mg_L"]) == ["1", "2"]


def test_several_rows_that_fit_are_not_chosen_from(tmp_path):
    field = write(tmp_path, "a.csv", "Well;ORP (mV);pH", "W1;1;7", "W1;2;7")
    survey = read_survey([field, write(tmp_path, "b.csv", "Well;Fe (mg/L)", "W1;2")])
    assert len(survey.samples) == 3
    assert places(survey, "survey.laboratory_ambiguous") == [("b.csv", "A2", "W1")]


def test_two_rounds_in_two_files_stay_two_samples(tmp_path):
    one = write(tmp_path, "a.csv", "Sample;Date;ORP (mV);pH", "W1;2031-01-01;1;7")
    survey = read_survey([one, write(tmp_path, "b.csv", "Sample;Date;ORP (mV);pH", "W1;2031-05-01;2;7")])
    assert list(survey.samples["sample"]) == ["W1 2031-01-01", "W1 2031-05-01"]


def test_field_value_twice_and_different_is_said(tmp_path):
    field = write(tmp_path, "a.csv", "Sample;ORP (mV);pH;SC (µS/cm)", "W1;1;7;500")
    survey = read_survey([field, write(tmp_path, "b.csv", "Sample;SC (µS/cm);Fe (mg/L)", "W1;510;1")])
    assert survey.samples.loc[0, "SC_uS_cm"] == 500
    assert places(survey, "survey.value_twice") == [("b.csv", "B2", "510")]


def test_same_value_in_another_unit_is_no_contradiction(tmp_path):
    field = write(tmp_path, "a.csv", "Sample;ORP (mV);pH;Fe (mg/L)", "W1;1;7;0.1")
    survey = read_survey([field, write(tmp_path, "b.csv", "Sample;Fe (µg/L)", "W1;100")])
    assert places(survey, "survey.value_twice") == []


def test_numbered_names_avoid_those_that_are_there(tmp_path):
    survey = read_survey(write(tmp_path, "s.csv", "Sample;ORP (mV);pH", "W1;1;7", "W1;1;7", "W1 #2;1;7"))
    assert list(survey.samples["sample"]) == ["W1", "W1 #3", "W1 #2"]


LONG = "Sample;Parameter;Fraction;Result;Unit;Qualifier;Reporting limit"


def test_long_table_with_field_readings(tmp_path):
    rows = "W1;pH;;7,6;;;", "W1;ORP;;100;mV;;", "W1;Temperature, water;;11,5;deg C;;", "W1;Conductivity;;0,5;mS/cm;;"
    row = read_survey(write(tmp_path, "s.csv", LONG, *rows)).samples.loc[0]
    assert (row["pH"], row["ORP_mV"], row["temperature_C"], row["SC_uS_cm"]) == (7.6, 100, 11.5, 500)


def test_long_table_takes_the_filtered_result(tmp_path):
    rows = "W1;Iron;Total;9;mg/L;;", "W1;Iron;Dissolved;1;mg/L;;", "W1;Lead;Total;8;mg/L;;"
    survey = read_survey([write(tmp_path, "a.csv", *FIELD), write(tmp_path, "b.csv", LONG, *rows)])
    assert survey.reported.loc[0, "Fe_mg_L"] == "1"
    assert places(survey, "survey.fraction_left") == [("b.csv", "D2", "9")]
    assert places(survey, "survey.total_taken") == [("b.csv", "D4", "Lead")]


@pytest.mark.parametrize(
    ("result", "flag", "limit", "shown", "bound"),
    [
        ("1", "U", "", "< 1", "<"),  # the number of a result flagged U is its limit (common practice)
        ("", "U", "0,5", "< 0,5", "<"),
        ("ND", "", "0,5", "< 0,5", "<"),
        ("", "Not Detected", "0,5", "< 0,5", "<"),
        ("1", "<", "", "< 1", "<"),
        ("1", "J", "", "1", ""),
    ],
)
def test_long_table_non_detects(tmp_path, result, flag, limit, shown, bound):
    survey = read_survey(
        [write(tmp_path, "a.csv", *FIELD), write(tmp_path, "b.csv", LONG, f"W1;As;;{result};µg/L;{flag};{limit}")]
    )
    assert survey.reported.loc[0, "As_ug_L"] == shown
    assert survey.amounts.loc[0, "As_limit"] == bound
    assert len(places(survey, "survey.flagged")) == (flag == "J")


def test_long_table_rejected_result_is_not_used(tmp_path):
    survey = read_survey([write(tmp_path, "a.csv", *FIELD), write(tmp_path, "b.csv", LONG, "W1;As;;1;µg/L;R;")])
    assert "As_mol_L" not in survey.amounts
    assert places(survey, "survey.rejected") == [("b.csv", "D2", "1")]


def test_long_table_limit_without_a_result_is_said(tmp_path):
    survey = read_survey([write(tmp_path, "a.csv", *FIELD), write(tmp_path, "b.csv", LONG, "W1;As;;;µg/L;;2")])
    assert survey.amounts.loc[0, "As_limit"] == "<"
    assert places(survey, "survey.limit_alone") == [("b.csv", "D2", "As")]


def test_long_table_unknown_unit_is_named(tmp_path):
    survey = read_survey([write(tmp_path, "a.csv", *FIELD), write(tmp_path, "b.csv", LONG, "W1;As;;1;buckets;;")])
    assert places(survey, "survey.unit_unknown") == [("b.csv", "D2", "buckets")]
    assert survey.findings.of("error")


def test_long_table_by_station_and_day(tmp_path):
    head = "Station;Date;Parameter;Result;Unit"
    rows = "S1;2031-04-01;ORP;100;mV", "S1;2031-04-01;pH;7;", "S1;2031-05-01;ORP;50;mV"
    survey = read_survey(write(tmp_path, "s.csv", head, *rows))
    assert list(survey.samples["sample"]) == ["S1 2031-04-01", "S1 2031-05-01"]
    assert list(survey.samples["ORP_mV"]) == [100, 50]
    assert math.isnan(survey.samples.loc[1, "pH"])


def test_german_laboratory_list_joins_a_german_field_sheet(tmp_path):
    field = tmp_path / "feld.csv"
    field.write_text(
        "Messstelle;Redoxspannung (mV);pH-Wert;Leitf. (mS/m);Fe gelöst mg/l;Säurekapazität KS4,3 (mmol/l)\n"
        "KB 1;120;7,1;61;0,5;4,2\nKB 2;-80;6,9;75;3,1;5,0\n",
        encoding="utf-8",
    )
    laboratory = tmp_path / "labor.csv"
    laboratory.write_text(
        "Probe;Parameter;Messwert;Einheit;BG\nKB 1;Arsen;14;µg/l;1\nKB 2;Arsen;;µg/l;1\nKB 2;Nitrat;<0,5;mg/l;0,5\n",
        encoding="utf-8",
    )
    survey = read_survey([field, laboratory])
    assert list(survey.samples["station"]) == ["KB 1", "KB 2"]
    assert list(survey.samples["SC_uS_cm"]) == [610, 750]
    assert list(survey.amounts["alkalinity_eq_L"]) == pytest.approx([4.2e-3, 5.0e-3])
    assert list(survey.amounts["As_limit"]) == ["", "<"]
    assert list(survey.amounts["NO3_limit"]) == ["", "<"]
    assert survey.reported.loc[1, "Fe_mg_L"] == "3,1"


def test_file_that_holds_no_table_is_said_beside_one_that_does(tmp_path):
    field = tmp_path / "field.csv"
    field.write_text("Sample;ORP (mV);pH\nW1;1;7\n", encoding="utf-8")
    other = tmp_path / "other.csv"
    other.write_text("Probe;Colour;Smell;Taste;Mood\nW1;red;none;none;good\n", encoding="utf-8")
    said = [
        item.place.file for item in read_survey([field, other]).findings if item.rule == "survey.sheet_not_understood"
    ]
    assert said == ["other.csv"]


def test_parameter_is_mapped_by_the_settings_and_a_mapping_that_fits_nothing_is_said(tmp_path):
    field = write(tmp_path, "field.csv", *FIELD)
    laboratory = write(tmp_path, "lab.csv", "Sample;Parameter;Value;Unit", "W1;Rotten eggs;2;mg/L", "W2;AOX;3;mg/L")
    columns = {"Rotten eggs": "sulfide", "AOX": "ignore", "Fooo": "Fe"}
    survey = read_survey([field, laboratory], Settings().replace(survey={"columns": columns}))
    assert survey.reported.loc[0, "sulfide_mg_L"] == "2"
    assert [value for _, _, value in places(survey, "survey.mapping_unused")] == ["Fooo"]
    assert "survey.parameter_unknown" not in survey.findings.rules()


def test_footnote_in_the_first_column_is_no_sample(tmp_path):
    survey = read_survey(write(tmp_path, "s.csv", *FIELD, "* provisional"))
    assert list(survey.samples["sample"]) == ["W1", "W2"]
    assert "survey.closing_row" in survey.findings.rules()
