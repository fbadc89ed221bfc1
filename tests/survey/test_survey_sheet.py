"""The blank field workbook: what it holds, how it refuses, and that a filled one reads back whole."""

import datetime as dt
import os
import zipfile

import openpyxl
import pytest

from gley.columns import columns, constituents
from gley.errors import GleyError, UsageError
from gley.probe import electrodes, find_electrode, solutions
from gley.survey import read_survey, write_sheet
from gley.survey import sheet as form
from gley.survey.headers import fact_keys
from gley.units import recognise

NAMES = tuple(item["name"] for item in electrodes())
TABLES = {"Samples": "samples", "Stations": "stations", "Checks": "checks"}


@pytest.fixture(scope="module")
def blank(tmp_path_factory):
    return write_sheet(tmp_path_factory.mktemp("sheet") / "field.xlsx", NAMES)


@pytest.fixture
def book(blank):
    return openpyxl.load_workbook(blank)


def heads(sheet):
    return {cell.value: cell.column for cell in sheet[1]}


def rules(sheet):
    """Checks of a table by the heading of their column."""
    names = {column: name for name, column in heads(sheet).items()}
    return {names[next(iter(rule.sqref)).min_col]: rule for rule in sheet.data_validations.dataValidation}


def fill(sheet, *rows, first=3):
    """Rows of {heading: value} into a table of the form."""
    at = heads(sheet)
    for r, row in enumerate(rows, start=first):
        for name, value in row.items():
            sheet.cell(r, at[name], value)


# ---------------------------------------------------------------- what it holds


def test_sheets_open_on_the_samples(book):
    assert book.sheetnames == ["Samples", "Stations", "Checks", "Facts", "How to"]
    assert book.active.title == "Samples"
    assert {sheet.sheet_state for sheet in book} == {"visible"}


@pytest.mark.parametrize("title", TABLES)
def test_headings_and_units_are_those_of_the_vocabulary(book, title):
    sheet, vocabulary = book[title], columns(TABLES[title])
    assert len(heads(sheet)) == sheet.max_column
    for name, c in heads(sheet).items():
        unit = sheet.cell(2, c).value or ""
        if name in vocabulary:
            assert unit == vocabulary[name].unit
        else:
            assert name in constituents()
            assert recognise(unit).kind == "mass"


def test_what_a_survey_lives_on_is_in_the_samples(book):
    wanted = {"sample", "station", "date", "time", "depth_cm", "probe", "electrode", "ORP_mV", "pH", "temperature_C"}
    wanted |= {"O2", "NO3", "Mn", "Fe", "SO4", "sulfide", "alkalinity", "As"}  # process from chemistry, elements
    assert wanted <= heads(book["Samples"]).keys()


@pytest.mark.parametrize("title", TABLES)
def test_ranges_are_those_of_the_vocabulary(book, title):
    sheet, vocabulary = book[title], columns(TABLES[title])
    found = rules(sheet)
    for name in heads(sheet).keys() & vocabulary.keys():
        column = vocabulary[name]
        if column.dtype == "number" and column.minimum is not None:
            assert found[name].type == "decimal"
            assert (float(found[name].formula1), float(found[name].formula2)) == (column.minimum, column.maximum)
        elif column.dtype != "text":
            assert found[name].type == {"number": "custom"}.get(column.dtype, column.dtype)
            assert found[name].error


def test_choices_are_what_vocabulary_and_probe_room_know(book):
    assert form.LISTS["solution"] == tuple(item["name"] for item in solutions())
    for table, name in (("samples", "sample_type"), ("checks", "solution")):
        assert all(choice in columns(table)[name].meaning for choice in form.LISTS[name])
        rule = rules(book[table.capitalize()])[name]
        assert rule.formula1 == '"' + ",".join(form.LISTS[name]) + '"'


@pytest.mark.parametrize("title", TABLES)
def test_electrodes_are_offered_where_one_is_asked_for(book, title):
    place, cells = rules(book[title])["electrode"].formula1.split("!")
    assert tuple(cell.value for (cell,) in book[place.strip("'")][cells.replace("$", "")]) == NAMES


def test_without_electrodes_nothing_is_offered(tmp_path):
    made = openpyxl.load_workbook(write_sheet(tmp_path / "field.xlsx"))
    assert "electrode" not in rules(made["Samples"])
    assert not [cell for (cell,) in made["How to"].iter_rows() if str(cell.value).startswith("Reference electrodes")]


def test_non_detects_pass_and_words_are_stopped_in_chemistry(book):
    rule = rules(book["Samples"])["As"]
    letter = openpyxl.utils.get_column_letter(heads(book["Samples"])["As"])
    assert rule.formula1 == f'OR(AND(ISNUMBER({letter}3),{letter}3>=0),LEFT({letter}3,1)="<",LEFT({letter}3,1)=">")'
    assert rule.errorStyle == "warning"


def test_limits_that_spreadsheet_programs_set(book):
    for sheet in book:
        assert len(sheet.title) <= 31
        for rule in sheet.data_validations.dataValidation:
            assert len(rule.error or "") <= 225
            assert len(rule.errorTitle or "") <= 32
            assert len(rule.formula1) <= 255


@pytest.mark.parametrize("title", TABLES)
def test_prints_landscape_with_its_headings_and_keeps_them_in_sight(book, title):
    sheet = book[title]
    assert sheet.page_setup.orientation == "landscape"
    assert sheet.sheet_properties.pageSetUpPr.fitToPage
    assert sheet.page_setup.fitToWidth == 1
    assert sheet.print_title_rows == "$1:$2"
    assert sheet.freeze_panes.endswith("3")


def test_site_and_laboratory_columns_print_on_pages_of_their_own(book):
    sheet = book["Samples"]
    site, laboratory = (area.split("!")[-1] for area in sheet.print_area.split(","))
    assert site.startswith("$A$1:")
    assert sheet[laboratory.split(":")[0].replace("$", "")].value == form.LABORATORY[0]
    assert sheet.print_title_cols == "$A:$A"


def test_how_to_says_what_matters(book):
    text = " ".join(str(cell.value) for row in book["How to"].iter_rows() for cell in row if cell.value)
    wanted = ("check solution", "temperature", "flow-through cell", "stabilise", "as it is", "Don't convert", "<0.5")
    for words in (*wanted, "One row, one sample"):
        assert words in text
    choice = text.split("write the electrode as '")[1].split("'")[0]
    assert find_electrode(choice) == choice


def test_facts_are_keys_the_reader_knows(book):
    keys = [book["Facts"].cell(row, 1).value for row in range(1, len(form.FACTS) + 1)]
    assert keys == list(form.FACTS)
    known = {fact_keys()[key.replace(" ", "").lower()] for key in keys}
    assert known >= {"project", "site", "electrode", "crs", "probe"}


# ---------------------------------------------------------------- how it is written


def test_same_arguments_same_bytes(tmp_path, blank):
    again = write_sheet(tmp_path / "other.xlsx", NAMES)
    assert again.read_bytes() == blank.read_bytes()
    with zipfile.ZipFile(again) as archive:
        assert b"2026-01-01T00:00:00Z</dcterms:modified>" in archive.read("docProps/core.xml")


def test_an_existing_file_is_left_alone(tmp_path):
    path = tmp_path / "field.xlsx"
    path.write_text("mine")
    with pytest.raises(GleyError, match=r"field\.xlsx is there already; nothing was changed\. .*--overwrite"):
        write_sheet(path)
    assert path.read_text() == "mine"
    write_sheet(path, overwrite=True)
    assert openpyxl.load_workbook(path).sheetnames[0] == "Samples"


@pytest.mark.parametrize("name", ["field.xls", "field.csv", "field"])
def test_other_suffixes_are_refused(tmp_path, name):
    with pytest.raises(UsageError, match=r"the field workbook is an \.xlsx file\. Call it field\.xlsx\."):
        write_sheet(tmp_path / name)
    assert not list(tmp_path.iterdir())


def test_a_folder_that_is_not_there_is_refused(tmp_path):
    with pytest.raises(GleyError, match=r"can't be written .*Check that the folder exists"):
        write_sheet(tmp_path / "nowhere" / "field.xlsx")
    (tmp_path / "file").write_text("")
    with pytest.raises(GleyError, match="can't be written"):
        write_sheet(tmp_path / "file" / "field.xlsx")


def test_a_folder_of_that_name_is_refused_and_nothing_stays_behind(tmp_path):
    (tmp_path / "field.xlsx").mkdir()
    with pytest.raises(GleyError, match="can't be written"):
        write_sheet(tmp_path / "field.xlsx", overwrite=True)
    assert [path.name for path in tmp_path.iterdir()] == ["field.xlsx"]


def test_what_was_there_survives_a_failing_write(tmp_path, monkeypatch):
    path = write_sheet(tmp_path / "field.xlsx")
    before = path.read_bytes()

    def refuse(self, target):
        raise PermissionError(13, "Permission denied")

    monkeypatch.setattr("pathlib.Path.replace", refuse)
    with pytest.raises(
        GleyError, match=r"can't be written \(Permission denied\)\. .*no other program has the file open"
    ):
        write_sheet(path, NAMES, overwrite=True)
    assert path.read_bytes() == before
    assert os.listdir(tmp_path) == ["field.xlsx"]


# ---------------------------------------------------------------- and back

SAMPLES = (
    {
        "sample": "KB1-A", "station": "KB1", "round": "spring", "date": dt.date(2031, 4, 28), "time": dt.time(9, 40),
        "sample_type": "normal", "water_level_m": 2.15, "probe": "P1", "ORP_mV": 212, "temperature_C": 10.4, "pH": 6.9,
        "SC_uS_cm": 640, "O2": 5.2, "alkalinity": 185, "Fe": "<0.02", "NO3": 6.4, "As": "<0.5",
        "remarks": "clear",
    },
    {
        "sample": "KB2-A", "station": "KB2", "round": "spring", "date": dt.date(2031, 4, 28), "time": dt.time(11, 5),
        "sample_type": "normal", "probe": "P1", "electrode": NAMES[1], "ORP_mV": -118, "temperature_C": 11.0,
        "pH_lab": 7.2, "SC_uS_cm": 810, "O2": 0.1, "Fe": 2.1, "Fe_II": 2.0, "Mn": 0.62, "NO3": "<0.2",
        "SO4": 27, "sulfide": "<0.05", "As": 14, "As_III": 9.5, "Cr_VI": 3,
    },
    {
        "sample": "KB2-B", "station": "KB2", "round": "spring", "date": dt.date(2031, 4, 28), "time": dt.time(11, 20),
        "sample_type": "duplicate", "duplicate_of": "KB2-A", "probe": "P1", "ORP_mV": -121, "temperature_C": 11.1,
        "pH": 7.2, "Fe": 2.2, "As": 15,
    },
)  # fmt: skip
STATIONS = (
    {"station": "KB1", "x_m": 412350, "y_m": 5711220, "crs": "EPSG:25832", "ground_elevation_m": 61.3,
     "screen_top_m": 4, "screen_bottom_m": 6, "aquifer": "upper sand", "remarks": "by the ditch"},
    {"station": "KB2", "x_m": 412410, "y_m": 5711260, "crs": "EPSG:25832", "electrode": "Ag/AgCl, 3.5 M KCl"},
    {"station": "KB3", "latitude_deg": 51.5448, "longitude_deg": 7.7351},
)  # fmt: skip
CHECKS = (
    {"date": dt.date(2031, 4, 28), "time": dt.time(8, 30), "probe": "P1", "solution": "ZoBell", "temperature_C": 12,
     "reading_mV": 251, "electrode": "Ag/AgCl, 3 M KCl"},
)  # fmt: skip
FACTS = {
    "Project": "Invented 7", "Site": "Kiebitzbruch", "Date": "April 2031", "Sampled by": "crew 2", "ORP probe": "P1",
    "Electrode and filling solution": "Ag/AgCl, 3 M KCl", "Coordinate reference system": "EPSG:25832",
    "Remarks": "dry week",
}  # fmt: skip


@pytest.fixture(scope="module")
def survey(blank, tmp_path_factory):
    book = openpyxl.load_workbook(blank)
    for title, rows in (("Samples", SAMPLES), ("Stations", STATIONS), ("Checks", CHECKS)):
        fill(book[title], *rows)
    for row in book["Facts"].iter_rows(max_row=len(form.FACTS)):
        row[1].value = FACTS.get(row[0].value, row[1].value)
    path = tmp_path_factory.mktemp("filled") / "field.xlsx"
    book.save(path)
    return read_survey(path)


def test_reads_back_without_a_finding(survey):
    assert [str(item) for item in survey.findings] == []


@pytest.mark.parametrize(("kind", "rows"), [("samples", SAMPLES), ("stations", STATIONS), ("checks", CHECKS)])
def test_every_cell_of_the_tables_arrives(survey, kind, rows):
    table = getattr(survey, kind)
    assert len(table) == len(rows)
    for (_, got), row in zip(table.iterrows(), rows, strict=True):
        for name in row.keys() & columns(kind).keys():
            wanted = row[name]
            if name == "date":
                assert got[name].date() == wanted
            elif name == "time":
                assert got[name] == wanted.strftime("%H:%M")
            else:
                assert got[name] == wanted, name


def test_what_a_unit_weighs_is_said_where_it_could_be_two_things(book):
    sheet = book["Samples"]
    for name, c in heads(sheet).items():
        item = constituents().get(name)
        if item and (len(item.formula.split("^")[0]) > 2 or name == "sulfide"):
            weighed = recognise(sheet.cell(2, c).value).basis
            # one reading only: sulfate is never given as S in a water analysis, gases are weighed whole
            assert weighed or name in ("SO4", "O2", "CH4"), name


def test_chemistry_arrives_with_limits_units_and_places(survey):
    amounts, reported = survey.amounts, survey.reported
    # molar masses (IUPAC 2021) in the words of a calculator
    assert amounts["As_mol_L"].tolist() == pytest.approx([0.5e-6 / 74.922, 14e-6 / 74.922, 15e-6 / 74.922], rel=1e-4)
    assert amounts["As_limit"].tolist() == ["<", "", ""]
    assert amounts["NO3_mol_L"][0] == pytest.approx(6.4e-3 / 14.007, rel=1e-4)
    assert amounts["alkalinity_eq_L"][0] == pytest.approx(3.697e-3, rel=1e-3)
    assert amounts["sulfide_mol_L"][1] == pytest.approx(0.05e-3 / 32.06, rel=1e-3)
    assert amounts["Fe_II_mol_L"][1] == pytest.approx(2.0e-3 / 55.845, rel=1e-4)
    assert amounts["As_III_mol_L"][1] == pytest.approx(9.5e-6 / 74.922, rel=1e-4)
    assert amounts["Cr_VI_mol_L"][1] == pytest.approx(3e-6 / 51.996, rel=1e-4)
    assert reported["As_ug_L"].tolist() == ["<0.5", "14", "15"]
    assert reported["NO3_mg_L_as_N"].tolist() == ["6.4", "<0.2", ""]
    letter = openpyxl.utils.get_column_letter((*form.FIELD, *form.LABORATORY).index("As") + 1)
    assert survey.origin.place(1, "As").cell == f"{letter}4"


def test_a_laboratory_pH_is_known_as_one(survey):
    assert survey.samples["pH"].tolist() == [6.9, 7.2, 7.2]
    assert survey.samples["pH_where"].tolist() == ["field", "laboratory", "field"]


def test_facts_arrive(survey):
    assert survey.facts == {
        "project": "Invented 7", "site": "Kiebitzbruch", "date": "April 2031", "operator": "crew 2", "probe": "P1",
        "electrode": "Ag/AgCl, 3 M KCl", "crs": "EPSG:25832", "remarks": "dry week",
    }  # fmt: skip


def test_several_electrodes_at_one_depth_as_the_how_to_says(blank, tmp_path):
    book = openpyxl.load_workbook(blank)
    sheet = book["Samples"]
    fill(sheet, {"sample": "S1", "station": "plot 3", "depth_cm": 15, "pH": 6.1, "temperature_C": 9})
    for k, reading in enumerate((110, 140, 95), start=1):
        sheet.cell(1, sheet.max_column + 1, f"Pt{k} (mV)")
        sheet.cell(3, sheet.max_column, reading)
    book.save(tmp_path / "soil.xlsx")
    read = read_survey(tmp_path / "soil.xlsx")
    assert read.samples.loc[0, ["ORP_mV", "ORP_replicates", "depth_cm"]].tolist() == [110, 3, 15]
    assert [str(item) for item in read.findings if item.severity != "note"] == []


def test_a_blank_workbook_holds_no_samples_facts_or_doubts(blank):
    read = read_survey(blank)
    assert len(read.samples) == len(read.stations) == len(read.checks) == 0
    assert set(read.facts) == {"remarks"}  # the purpose that stands in the form
    assert {item.rule for item in read.findings} == {"survey.no_ORP", "survey.no_pH"}
