"""Headers, numbers and dates that are easily misread: each is refused, settled by the file itself, or said."""

import math

import pytest

from gley.survey.headers import understand
from gley.units import recognise
from survey_files import read, said


def test_Eh_brought_to_pH_7_is_not_a_reading(tmp_path):
    survey = read(tmp_path, "Sample;pH;Eh7 (mV);ORP (mV)", "W1;6;300;100")
    assert survey.samples.loc[0, "ORP_mV"] == 100
    assert math.isnan(survey.samples.loc[0, "Eh_given_mV"])
    assert said(survey, "survey.column_unknown") == [("C1", "Eh7 (mV)")]


def test_numbered_Eh_columns_stay_on_the_hydrogen_scale(tmp_path):
    survey = read(tmp_path, "Sample;pH;Eh 1 (mV);Eh 2 (mV)", "W1;6;300;310")
    assert survey.samples.loc[0, "Eh_given_mV"] == 305
    assert math.isnan(survey.samples.loc[0, "ORP_mV"])


def test_voltage_of_the_glass_electrode_is_no_pH(tmp_path):
    survey = read(tmp_path, "Sample;pH;pH (mV);ORP (mV)", "W1;7,2;5,5;100")
    assert survey.samples.loc[0, "pH"] == 7.2
    assert said(survey, "survey.column_unknown") == [("C1", "pH (mV)")]


@pytest.mark.parametrize(
    ("header", "column", "electrode"),
    [
        ("ORP (mV vs Ag/AgCl, 3 M KCl)", "ORP_mV", "Ag/AgCl, 3 M KCl"),
        ("ORP vs. SCE [mV]", "ORP_mV", "SCE"),
        ("ORP (Ag/AgCl) mV", "ORP_mV", "Ag/AgCl"),
        ("Eh (mV, Ag/AgCl)", "ORP_mV", "Ag/AgCl"),
        ("Eh_mV_SHE", "Eh_given_mV", None),
        ("Redox potential (mV vs. NHE)", "Eh_given_mV", None),
    ],
)
def test_reference_named_in_the_header_of_a_potential(tmp_path, header, column, electrode):
    survey = read(tmp_path, f"Sample;{header};pH", "W1;120;7")
    assert survey.samples.loc[0, column] == 120
    assert survey.facts.get("electrode") == electrode
    assert said(survey, "survey.electrode_in_header") == ([("B1", header)] if electrode else [])


def test_fuller_name_of_the_same_couple_in_the_facts_is_kept(tmp_path):
    survey = read(tmp_path, "# electrode: Ag/AgCl, 3 M KCl", "Sample;ORP (mV vs Ag/AgCl);pH", "W1;120;7")
    assert survey.facts["electrode"] == "Ag/AgCl, 3 M KCl"
    assert survey.samples.loc[0, "electrode"] == ""


@pytest.mark.parametrize("header", ["Redox (mV)", "Redoxpotential (mV)", "Redox potential [mV]"])
def test_redox_without_a_scale_is_taken_as_a_reading_and_said(tmp_path, header):
    survey = read(tmp_path, f"Sample;{header};pH", "W1;120;7")
    assert survey.samples.loc[0, "ORP_mV"] == 120
    assert said(survey, "survey.redox_as_ORP") == [("B1", header)]


def test_replicates_are_said_and_come_before_their_mean(tmp_path):
    survey = read(tmp_path, "Sample;ORP (mV);Pt 1 (mV);Pt 2 (mV);pH", "W1;300;190;210;7")
    assert survey.samples.loc[0, "ORP_mV"] == 200
    assert said(survey, "survey.replicates") == [("C1", "2")]
    assert said(survey, "survey.column_twice") == [("B1", "ORP (mV)")]


def test_filtered_result_comes_before_the_total_beside_it(tmp_path):
    survey = read(tmp_path, "Sample;pH;ORP (mV);Fe total (mg/L);Fe diss (mg/L)", "W1;7;5;9;0,1", "W2;7;5;8;")
    assert list(survey.reported["Fe_mg_L"]) == ["0,1", "8"]
    assert said(survey, "survey.column_twice") == [("D1", "Fe total (mg/L)")]
    assert said(survey, "survey.total_taken") == [("D1", "Fe total (mg/L)")]


@pytest.mark.parametrize("header", ["Fe(T) (mg/L)", "Total Fe (mg/L)", "Fe, total (mg/L)", "Iron total [mg/l]"])
def test_total_alone_is_taken_and_said(tmp_path, header):
    survey = read(tmp_path, f"Sample;pH;ORP (mV);{header}", "W1;7;5;9")
    assert survey.reported.iloc[0, 0] == "9"
    assert said(survey, "survey.total_taken") == [("D1", header)]


@pytest.mark.parametrize("header", ["Total alkalinity (meq/L)", "As total dissolved (µg/L)", "Total sulfide (mg/L)"])
def test_what_is_no_unfiltered_total_is_not_called_one(tmp_path, header):
    assert said(read(tmp_path, f"Sample;pH;ORP (mV);{header}", "W1;7;5;1"), "survey.total_taken") == []


def test_species_in_roman_numerals_is_no_volts(tmp_path):
    survey = read(tmp_path, "Sample;ORP;pH;As V", ";mV;-;µg/L", "W1;7;7;50")
    assert survey.amounts.loc[0, "As_V_mol_L"] == pytest.approx(50e-6 / 74.922, rel=1e-4)


@pytest.mark.parametrize(
    ("header", "column", "mol_L"),
    [
        # 50 mg/L as CaCO3 are 50/50.04 meq/L, whatever ion is counted so (common practice; hardness, alkalinity)
        ("HCO3 (mg/L as CaCO3)", "HCO3_mol_L", 50e-3 / 50.043),
        ("Mg (mg/L as CaCO3)", "Mg_mol_L", 50e-3 / 50.043 / 2),
        ("Ca (mg/L as CaCO3)", "Ca_mol_L", 50e-3 / 50.043 / 2),
        ("Alkalinity (mmol/L as CaCO3)", "alkalinity_eq_L", 50e-3 * 2),
        ("Silica (mg/L)", "Si_mol_L", 50e-3 / 60.083),
        ("Nitrate nitrogen (mg/L)", "NO3_mol_L", 50e-3 / 14.007),
        ("N-NO3 (mg/L)", "NO3_mol_L", 50e-3 / 14.007),
        ("Nitrate (as N) mg/L", "NO3_mol_L", 50e-3 / 14.007),
        ("NO3 (mg/L as NO3-N)", "NO3_mol_L", 50e-3 / 14.007),
        ("Hydrogen sulfide (mg/L)", "sulfide_mol_L", 50e-3 / 34.08),
        ("Mn (µM)", "Mn_mol_L", 50e-6),
        ("Fe (mg L⁻¹)", "Fe_mol_L", 50e-3 / 55.845),
    ],
)
def test_what_is_weighed_and_its_unit(tmp_path, header, column, mol_L):
    survey = read(tmp_path, f"Sample;pH;ORP (mV);{header}", "W1;7;5;50")
    assert survey.amounts.loc[0, column] == pytest.approx(mol_L, rel=2e-4)


@pytest.mark.parametrize("text", ["mg/L (as CaCO3)", "mg/l (as CaCO3)", "mg/L as CaCO3", "mg CaCO3/L", "mg/L-CaCO3"])
def test_basis_in_parentheses(text):
    assert recognise(text).basis == "CaCO3"


def test_metre_in_capitals_is_no_molarity():
    assert recognise("M").kind == "length"
    assert recognise("mM").kind == "amount"


def test_unit_below_the_header_that_is_none_is_not_passed_over(tmp_path):
    survey = read(tmp_path, "Sample;T;ORP;pH;Fe", ";K;mV;-;buckets", "W1;284;5;7;1")
    assert said(survey, "survey.unit_unknown") == [("B1", "K"), ("E1", "buckets")]
    assert math.isnan(survey.samples.loc[0, "temperature_C"])


def test_depth_without_a_unit_is_not_guessed(tmp_path):
    survey = read(tmp_path, "Well;Depth;ORP (mV);pH", "W1;61;5;7")
    assert said(survey, "survey.unit_missing_field") == [("B1", "Depth")]


def test_depth_in_metres_by_the_units_row_is_a_well_s(tmp_path):
    survey = read(tmp_path, "Well;Depth;ORP;pH", ";m;mV;-", "W1;6;5;7")
    assert survey.samples.loc[0, "depth_bottom_m"] == 6
    assert math.isnan(survey.samples.loc[0, "depth_cm"])


@pytest.mark.parametrize(
    ("cell", "problem"),
    [
        ("1.200", "the point can mean thousands or decimals"),
        ("<0,000", "a limit of zero says nothing"),
        ("1e400", "too large a number"),
        ("#N/A", "a spreadsheet error"),
        ("< LOD", "not detected, but without its limit"),
    ],
)
def test_numbers_that_say_nothing_certain(tmp_path, cell, problem):
    survey = read(tmp_path, "Sample;ORP (mV);pH;Na (mg/L)", f"W1;1,5;7,2;{cell}", "W2;1,5;7,2;3,5")
    assert said(survey, "survey.not_a_number") == [("D2", cell)]
    assert problem in next(item.message for item in survey.findings)
    assert math.isnan(survey.amounts.loc[0, "Na_mol_L"])


def test_decimal_point_in_a_file_of_commas_is_said(tmp_path):
    survey = read(tmp_path, "Sample;ORP (mV);pH", "W1;1,5;7,2", "W2;1,5;6.95")
    assert survey.samples.loc[1, "pH"] == 6.95
    assert said(survey, "survey.decimal_mark") == [("C3", "6.95")]


def test_decimal_comma_in_a_file_of_points_is_said(tmp_path):
    survey = read(tmp_path, "Sample;ORP (mV);pH", "W1;1.5;7.2", "W2;1.5;6,95")
    assert survey.samples.loc[1, "pH"] == 6.95
    assert said(survey, "survey.decimal_mark") == [("C3", "6,95")]


def test_quoted_decimal_commas_between_commas(tmp_path):
    survey = read(tmp_path, "Sample,ORP (mV),pH", 'W1,"100,5","7,1"', 'W2,"90,5","6,95"')
    assert list(survey.samples["pH"]) == [7.1, 6.95]
    assert survey.findings.rules() == []


def test_order_of_day_and_month_is_settled_by_the_column(tmp_path):
    survey = read(tmp_path, "Sample;Date;ORP (mV);pH", "W1;3-1-2031;5;7", "W2;3-25-2031;5;7")
    assert [day.date().isoformat() for day in survey.samples["date"]] == ["2031-03-01", "2031-03-25"]
    assert said(survey, "survey.date_order") == [("B1", "Date")]


def test_dates_with_strokes_or_dashes_are_doubted_alone(tmp_path):
    survey = read(tmp_path, "Sample;Date;ORP (mV);pH", "W1;3-1-2031;5;7")
    assert said(survey, "survey.date_doubt") == [("B2", "3-1-2031")]


@pytest.mark.parametrize("cell", ["28 Apr 2031", "28-Apr-31", "2031/04/28", "28. April 2031"])
def test_more_forms_of_a_date(tmp_path, cell):
    survey = read(tmp_path, "Sample;Date;ORP (mV);pH", f"W1;{cell};5;7")
    assert survey.samples.loc[0, "date"].date().isoformat() == "2031-04-28"
    assert survey.findings.rules() == []


@pytest.mark.parametrize(("cell", "time"), [("2:30 PM", "14:30"), ("12:05 a.m.", "00:05"), ("9:05:59", "09:05")])
def test_times_of_half_days(tmp_path, cell, time):
    assert read(tmp_path, "Sample;Time;ORP (mV);pH", f"W1;{cell};5;7").samples.loc[0, "time"] == time


def test_what_is_no_time_is_said(tmp_path):
    assert said(read(tmp_path, "Sample;Time;ORP (mV);pH", "W1;noon;5;7"), "survey.not_a_time") == [("B2", "noon")]


def test_bound_of_a_reading_is_not_used(tmp_path):
    survey = read(tmp_path, "Sample;ORP (mV);pH", "W1;>200;7")
    assert math.isnan(survey.samples.loc[0, "ORP_mV"])
    assert said(survey, "survey.limit_not_used") == [("B2", ">200")]


def test_conductivity_is_taken_at_25_degrees_and_said(tmp_path):
    survey = read(tmp_path, "Sample;ORP (mV);pH;EC (mS/m)", "W1;5;7;50")
    assert survey.samples.loc[0, "SC_uS_cm"] == 500
    assert said(survey, "survey.conductivity_at_25") == [("D1", "EC (mS/m)")]


def test_stated_column_of_another_table_is_no_crash(tmp_path):
    survey = read(tmp_path, "Sample;ORP (mV);pH;foo", "W1;5;7;3", columns={"foo": "screen_top_m"})
    assert said(survey, "survey.column_unknown") == [("D1", "foo")]


def test_probe_is_the_sample_where_nothing_else_is(tmp_path):
    survey = read(tmp_path, "Probe;Redoxspannung (mV);pH-Wert", "W1;5;7")
    assert list(survey.samples["sample"]) == ["W1"]
    assert said(survey, "survey.probe_is_sample") == [("A1", "Probe")]


def test_sample_types_of_deliveries_become_house_words(tmp_path):
    survey = read(tmp_path, "Sample;Sample type;ORP (mV);pH", "A;N;5;7", "B;FD;5;7", "C;Trip blank;5;7", "D;odd;5;7")
    assert list(survey.samples["sample_type"]) == ["normal", "duplicate", "blank", "odd"]
    assert said(survey, "survey.sample_type_unknown") == [("B5", "odd")]


@pytest.mark.parametrize(
    ("text", "target"),
    [
        ("SC (µS/cm at 25 °C)", "SC_uS_cm"),
        ("Dissolved Oxygen (% saturation) (%Sat)", "O2_percent"),
        ("MonitoringLocationIdentifier", "station"),
        ("Date (UTC)", "date"),
        ("Temp (air)", ""),
        ("Eh 7", ""),
        ("rH", ""),
    ],
)
def test_meaning_of_more_headers(text, target):
    assert understand(text, "samples").target == target
