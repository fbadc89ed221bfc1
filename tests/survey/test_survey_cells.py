"""Cells, headers and units as people write them: one defect a test, with the rule and the cell that says so."""

import math

import pytest

from gley.formula import molar_mass
from gley.survey import read_survey
from survey_files import read, said


@pytest.mark.parametrize(
    ("header", "column"),
    [
        ("ORP (mV)", "ORP_mV"),
        ("Redox [mV]", "ORP_mV"),
        ("Oxidation Reduction Potential (ORP) (mV)", "ORP_mV"),
        ("ORP_mV", "ORP_mV"),
        ("Eh (mV)", "Eh_given_mV"),
        ("Eh vs SHE (mV)", "Eh_given_mV"),
        ("ORP (SHE) (mV)", "Eh_given_mV"),
        ("SpCond (µS/cm)", "SC_uS_cm"),
        ("Specific Conductance (mS/cm)", "SC_uS_cm"),
        ("Actual Conductivity (µS/cm)", "EC_uS_cm"),
        ("DO (% sat)", "O2_percent"),
        ("Turbidity (NTU)", "turbidity_NTU"),
    ],
)
def test_header_spellings(tmp_path, header, column):
    survey = read(tmp_path, f"Sample;pH;{header}", "W1;7;50")
    assert survey.samples.loc[0, column] == pytest.approx(50_000 if "mS/cm" in header else 50)


@pytest.mark.parametrize(
    ("header", "key", "mol_L"),
    [
        # molar masses: IUPAC 2021
        ("As (µg/L)", "As", 50e-6 / 74.922),
        ("As_ug_L", "As", 50e-6 / 74.922),
        ("As μg/l", "As", 50e-6 / 74.922),
        ("Fe [mg/L]", "Fe", 50e-3 / 55.845),
        ("Iron, dissolved (mg/L)", "Fe", 50e-3 / 55.845),
        ("Fe2+ (mg/L)", "Fe_II", 50e-3 / 55.845),
        ("Mn (µmol/L)", "Mn", 50e-6),
        ("NO3 (mg/L)", "NO3", 50e-3 / 62.004),
        ("NO3-N (mg/L)", "NO3", 50e-3 / 14.007),
        ("Nitrate as N (mg/L)", "NO3", 50e-3 / 14.007),
        ("NO3 (mg/L as N)", "NO3", 50e-3 / 14.007),
        ("NH4 (mg N/L)", "NH4", 50e-3 / 14.007),
        ("SO4 (meq/L)", "SO4", 50e-3 / 2),
        ("SiO2 (mg/L)", "Si", 50e-3 / 60.083),
        ("H2S (mg/L)", "sulfide", 50e-3 / 34.08),
        ("Sulfide (mg/L as S)", "sulfide", 50e-3 / 32.06),
        ("Alkalinity (mg/L as CaCO3)", "alkalinity", 50e-3 / 100.086 * 2),
        ("Alkalinity (mg/L)", "alkalinity", 50e-3 / 100.086 * 2),
        ("Alkalinity (meq/L)", "alkalinity", 50e-3),
        ("KS4.3 (mmol/L)", "alkalinity", 50e-3),
        ("HCO3 (mg/L)", "HCO3", 50e-3 / 61.016),
        ("DO (mg/L)", "O2", 50e-3 / 31.998),
        ("Ca (ppm)", "Ca", 50e-3 / 40.078),
    ],
)
def test_concentrations_by_header_unit_and_basis(tmp_path, header, key, mol_L):
    survey = read(tmp_path, f"Sample;pH;ORP (mV);{header}", "W1;7;1;50")
    column = "alkalinity_eq_L" if key == "alkalinity" else f"{key}_mol_L"
    assert survey.amounts.loc[0, column] == pytest.approx(mol_L, rel=2e-4)


def test_units_row_below_the_header(tmp_path):
    survey = read(tmp_path, "Sample;ORP;pH;T;Fe", ";mV;-;°C;mg/l", "W1;7;7;50;1")
    assert survey.amounts.loc[0, "Fe_mol_L"] == pytest.approx(1e-3 / molar_mass("Fe"))
    assert len(survey.samples) == 1


def test_fahrenheit_and_volts(tmp_path):
    survey = read(tmp_path, "Sample;ORP (V);pH;Temp (°F)", "W1;0,25;7;50")
    assert survey.samples.loc[0, "ORP_mV"] == pytest.approx(250)
    assert survey.samples.loc[0, "temperature_C"] == pytest.approx(10)


def test_concentration_without_a_unit_is_an_error_and_not_used(tmp_path):
    survey = read(tmp_path, "Sample;ORP (mV);pH;Fe", "W1;7;7;50")
    assert said(survey, "survey.unit_missing") == [("D1", "Fe")]
    assert survey.findings.of("error")
    assert "Fe_mol_L" not in survey.amounts
    assert survey.reported.loc[0, "Fe_flag"] == "not used"


def test_unit_stated_in_the_settings_is_used(tmp_path):
    survey = read(tmp_path, "Sample;ORP (mV);pH;Fe", "W1;7;7;50", units={"Fe": "µg/L"})
    assert survey.amounts.loc[0, "Fe_mol_L"] == pytest.approx(50e-6 / 55.845, rel=1e-4)


def test_potential_without_a_unit_is_mV_when_it_can_be_nothing_else(tmp_path):
    survey = read(tmp_path, "Sample;ORP;pH", "W1;120;7")
    assert survey.samples.loc[0, "ORP_mV"] == 120
    assert said(survey, "survey.unit_assumed") == [("B1", "ORP")]


def test_potential_that_may_be_volts_is_not_guessed(tmp_path):
    survey = read(tmp_path, "Sample;ORP;pH", "W1;0,12;7", "W2;0,31;7")
    assert said(survey, "survey.unit_missing_field") == [("B1", "ORP")]
    assert survey.samples["ORP_mV"].isna().all()


def test_content_of_a_solid_is_not_a_concentration_in_water(tmp_path):
    survey = read(tmp_path, "Sample;ORP (mV);pH;As (mg/kg)", "W1;1;7;12")
    assert "As_mol_L" not in survey.amounts
    assert [item.severity for item in survey.findings if item.rule == "survey.unit_impossible"] == ["error"]


def test_wrong_kind_of_unit_is_an_error(tmp_path):
    survey = read(tmp_path, "Sample;ORP (mV);pH;Temp (mV)", "W1;1;7;12")
    assert said(survey, "survey.unit_wrong") == [("D1", "mV")]
    assert math.isnan(survey.samples.loc[0, "temperature_C"])


@pytest.mark.parametrize(
    ("cell", "value", "limit"),
    [
        ("<0,5", 0.5, "<"),
        ("< 0,5", 0.5, "<"),
        ("0,5 U", 0.5, "<"),
        (">200", 200, ">"),
        ("1,2E-1", 0.12, ""),
        ("1.200,5", 1200.5, ""),
    ],
)
def test_numbers_and_limits(tmp_path, cell, value, limit):
    survey = read(tmp_path, "Sample;ORP (mV);pH;Na (mg/L)", f"W1;1,5;7,2;{cell}", "W2;1,5;7,2;3,5")
    assert survey.amounts.loc[0, "Na_mol_L"] == pytest.approx(value * 1e-3 / molar_mass("Na"))
    assert survey.amounts.loc[0, "Na_limit"] == limit
    assert survey.reported.loc[0, "Na_mg_L"] == cell


@pytest.mark.parametrize("cell", ["n.d.", "ND", "BDL", "abc", "-3", "#REF!"])
def test_what_is_no_amount_is_said_and_kept_as_reported(tmp_path, cell):
    survey = read(tmp_path, "Sample;ORP (mV);pH;Fe (mg/L)", f"W1;1;7;{cell}", "W2;1;7;2")
    assert said(survey, "survey.not_a_number") == [("D2", cell)]
    assert math.isnan(survey.amounts.loc[0, "Fe_mol_L"])
    assert survey.reported.loc[0, "Fe_mg_L"] == cell


@pytest.mark.parametrize("cell", ["", "-", "NA", "nm"])
def test_nothing_measured_is_no_finding(tmp_path, cell):
    survey = read(tmp_path, "Sample;ORP (mV);pH;Fe (mg/L)", f"W1;1;7;{cell}", "W2;1;7;2")
    assert survey.findings.rules() == []


def test_comma_that_can_mean_two_things_is_not_guessed(tmp_path):
    path = tmp_path / "s.csv"
    path.write_text('Sample,ORP (mV),pH,Na (mg/L)\nW1,1.5,7.2,"1,234"\n', encoding="utf-8")
    survey = read_survey(path)
    assert said(survey, "survey.not_a_number") == [("D2", "1,234")]


@pytest.mark.parametrize(
    ("column", "cell"), [("pH", "15,2"), ("ORP (mV)", "2600"), ("T (°C)", "140"), ("T (°C)", "-40")]
)
def test_physically_impossible_values_are_not_used(tmp_path, column, cell):
    heads = ["ORP (mV)", "pH", "T (°C)"]
    values = {"ORP (mV)": "1", "pH": "7", "T (°C)": "10", column: cell}
    survey = read(tmp_path, "Sample;" + ";".join(heads), "W1;" + ";".join(values[head] for head in heads))
    assert [value for _, value in said(survey, "survey.out_of_range")] == [cell]
    assert len(survey.samples) == 1


def test_concentration_beyond_what_water_holds(tmp_path):
    survey = read(tmp_path, "Sample;ORP (mV);pH;As (g/L)", "W1;1;7;50")
    assert said(survey, "survey.too_high") == [("D2", "50")]


def test_unknown_header_is_said_with_a_hint(tmp_path):
    survey = read(tmp_path, "Sample;ORP (mV);pH;Manganeze (mg/L);Li (mg/L)", "W1;1;7;2;3")
    assert [cell for cell, _ in said(survey, "survey.column_unknown")] == ["D1", "E1"]
    assert "Did you mean Mn?" in next(item for item in survey.findings if item.place.cell == "D1").cure


def test_header_mapped_and_ignored_by_the_settings(tmp_path):
    survey = read(
        tmp_path,
        "Sample;Hell voltage (mV);pH;Code",
        "W1;12;7;x",
        columns={"Hell voltage (mV)": "ORP_mV", "Code": "ignore"},
    )
    assert survey.samples.loc[0, "ORP_mV"] == 12
    assert said(survey, "survey.column_ignored") == [("D1", "Code")]


@pytest.mark.parametrize(
    ("cell", "iso", "rules"),
    [
        ("2031-04-28", "2031-04-28", []),
        ("28.04.2031", "2031-04-28", []),
        ("28/04/2031", "2031-04-28", []),
        ("04/28/2031", "2031-04-28", []),
        ("03/04/2031", "2031-04-03", ["survey.date_doubt"]),
    ],
)
def test_dates(tmp_path, cell, iso, rules):
    survey = read(tmp_path, "Sample;Date;Time;ORP (mV);pH", f"W1;{cell};14:05;1;7")
    assert survey.samples.loc[0, "date"].date().isoformat() == iso
    assert survey.samples.loc[0, "time"] == "14:05"
    assert survey.findings.rules() == rules


def test_what_is_no_date_is_said(tmp_path):
    survey = read(tmp_path, "Sample;Date;ORP (mV);pH", "W1;spring;1;7")
    assert said(survey, "survey.not_a_date") == [("B2", "spring")]


def test_replicate_electrodes(tmp_path):
    # median, number and sample standard deviation, worked by hand: 190, 200, 240
    survey = read(tmp_path, "Plot;Depth (cm);Pt 1 (mV);Pt 2 (mV);Pt 3 (mV);pH", "A;10;190;240;200;6")
    row = survey.samples.loc[0]
    assert (row["ORP_mV"], row["ORP_replicates"]) == (200, 3)
    assert row["ORP_spread_mV"] == pytest.approx(math.sqrt((20**2 + 10**2 + 30**2) / 2))


def test_depth_in_metres_is_a_well_s_not_an_electrode_s(tmp_path):
    survey = read(tmp_path, "Well;Depth (m);ORP (mV);pH", "W1;61;1;7")
    assert survey.samples.loc[0, "depth_bottom_m"] == 61
    assert math.isnan(survey.samples.loc[0, "depth_cm"])


@pytest.mark.parametrize(
    ("header", "key", "g_mol"),
    [
        # laboratories report species of arsenic and chromium as the element (common practice)
        ("As(III) (µg/L)", "As_III", 74.922),
        ("As III (µg/L)", "As_III", 74.922),
        ("As(V) (µg/L)", "As_V", 74.922),
        ("Fe(II) (µg/L)", "Fe_II", 55.845),
        ("Cr(VI) (µg/L)", "Cr_VI", 51.996),
        ("boron (µg/L)", "B", 10.81),
        ("DIC (µg/L)", "DIC", 12.011),
        ("NH3 (µg/L)", "NH4", 17.031),
    ],
)
def test_species_and_elements_weigh_what_laboratories_report(tmp_path, header, key, g_mol):
    survey = read(tmp_path, f"Sample;pH;ORP (mV);{header}", "W1;7;1;50")
    assert survey.amounts.loc[0, f"{key}_mol_L"] == pytest.approx(50e-6 / g_mol, rel=2e-4)


def test_what_is_weighed_is_said_where_the_header_leaves_it_open(tmp_path):
    survey = read(tmp_path, "Sample;pH;ORP (mV);Nitrate (mg/L);NO3-N (mg/L)", "W1;7;1;50;2", "W2;7;1;40;2")
    assert said(survey, "survey.weighed_as") == [("D1", "Nitrate (mg/L)")]


def test_pH_can_be_said_to_be_the_laboratory_s(tmp_path):
    survey = read(tmp_path, "Sample;pH;pH where;ORP (mV)", "W1;7;Lab;1", "W2;7;;1")
    assert list(survey.samples["pH_where"]) == ["laboratory", "field"]
