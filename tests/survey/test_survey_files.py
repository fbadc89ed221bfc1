"""Files as they come: workbooks and text in several encodings and separators, and refusals that say what to do."""

import openpyxl
import pytest

from gley.errors import GleyError, UsageError
from gley.settings import Settings
from gley.survey import read_survey

LINES = ["Sample;ORP (mV);pH;T (°C);Fe (mg/L)", "W1;100,5;7,1;11,0;<0,05", "W2;-20;6,9;10,5;1,2"]


@pytest.mark.parametrize("encoding", ["utf-8", "utf-8-sig", "cp1252", "utf-16"])
@pytest.mark.parametrize("ending", ["\n", "\r\n", "\r"])
def test_encodings_and_line_ends(tmp_path, encoding, ending):
    path = tmp_path / "s.csv"
    path.write_bytes((ending.join(LINES) + ending).encode(encoding))
    survey = read_survey(path)
    assert list(survey.samples["ORP_mV"]) == [100.5, -20.0]
    assert list(survey.samples["temperature_C"]) == [11.0, 10.5]
    assert list(survey.amounts["Fe_limit"]) == ["<", ""]


@pytest.mark.parametrize(("mark", "suffix"), [(";", ".csv"), ("\t", ".tsv"), ("|", ".txt")])
def test_separators(tmp_path, mark, suffix):
    path = tmp_path / f"s{suffix}"
    path.write_text("\n".join(LINES).replace(";", mark), encoding="utf-8")
    assert list(read_survey(path).samples["pH"]) == [7.1, 6.9]


def test_comma_separated_with_decimal_points(tmp_path):
    path = tmp_path / "s.csv"
    path.write_text("Sample,ORP (mV),pH\nW1,100.5,7.1\n", encoding="utf-8")
    assert read_survey(path).samples.loc[0, "ORP_mV"] == 100.5


def test_stated_encoding_is_used(tmp_path):
    path = tmp_path / "s.csv"
    path.write_bytes("Sample;ORP (mV);pH;Remarks\nW1;1;7;žluť\n".encode("cp1250"))
    settings = Settings().replace(survey={"encoding": "cp1250"})
    assert read_survey(path, settings).samples.loc[0, "remarks"] == "žluť"


def test_workbook_with_titles_units_row_and_several_sheets(tmp_path):
    book = openpyxl.Workbook()
    sheet = book.active
    sheet.title = "Feldblatt"
    for row in (
        ["Survey of the made-up meadow"],
        [],
        ["Well", "Date", "ORP", "pH", "Temp", "Fe", "As"],
        [None, None, "mV", "-", "°C", "mg/L", "µg/L"],
        ["W1", "2031-04-28", 120, 7.1, 11.2, "<0.05", 12],
        ["W2", "2031-04-28", -80, 6.8, 11.9, 4.2, 130],
    ):
        sheet.append(row)
    stations = book.create_sheet("Wells")
    stations.append(["Well", "Easting (m)", "Northing (m)", "Screen top (m)", "Aquifer"])
    stations.append(["W1", 565000, 5934000, 3, "upper"])
    facts = book.create_sheet("Info")
    facts.append(["Reference electrode", "Ag/AgCl, 3 M KCl"])
    facts.append(["CRS", "EPSG:25832"])
    book.save(tmp_path / "s.xlsx")
    survey = read_survey(tmp_path / "s.xlsx")
    assert list(survey.samples["station"]) == ["W1", "W2"]
    assert survey.samples.loc[1, "ORP_mV"] == -80
    assert survey.stations.loc[0, "screen_top_m"] == 3
    assert survey.facts == {"electrode": "Ag/AgCl, 3 M KCl", "crs": "EPSG:25832"}
    assert str(survey.origin.place(1, "ORP_mV")) == "s.xlsx > Feldblatt > C6"
    assert survey.reported.loc[0, "Fe_mg_L"] == "<0.05"
    assert survey.findings.of("error") == []


def test_hidden_sheet_is_said(tmp_path):
    book = openpyxl.Workbook()
    book.active.append(["Sample", "ORP (mV)", "pH"])
    book.active.append(["W1", 1, 7])
    hidden = book.create_sheet("old")
    hidden.append(["nothing", "here"])
    hidden.sheet_state = "hidden"
    book.save(tmp_path / "s.xlsx")
    rules = read_survey(tmp_path / "s.xlsx").findings.rules()
    assert "survey.hidden_sheet" in rules
    assert "survey.sheet_not_understood" in rules


def test_input_is_named_with_its_hash(tmp_path):
    import hashlib

    path = tmp_path / "s.csv"
    path.write_text("\n".join(LINES), encoding="utf-8")
    (record,) = read_survey(path).inputs
    assert record == {"path": "s.csv", "sha256": hashlib.sha256(path.read_bytes()).hexdigest()}


@pytest.mark.parametrize(
    ("name", "content", "error", "says"),
    [
        ("s.xls", b"x", UsageError, r"s\.xls: '\.xls' isn't a survey file.*\.xlsx"),
        ("s.ods", b"x", UsageError, r"'\.ods' isn't a survey file"),
        ("s.csv", b"", GleyError, r"s\.csv: the file is empty"),
        ("s.csv", b"  \n", GleyError, r"the file is empty"),
        ("s.csv", b"\x00\x01\x02", GleyError, r"binary content"),
        ("s.xlsx", b"PK nothing", GleyError, r"not a readable \.xlsx workbook"),
        ("s.xlsx", b"\xd0\xcf\x11\xe0rest", GleyError, r"protected by a password"),
        ("s.csv", b"once upon a time\n", GleyError, r"no table of samples found"),
        ("s.csv", b"a;b\n1;2\n", GleyError, r"no table of samples found"),
    ],
)
def test_bad_files_are_refused(tmp_path, name, content, error, says):
    (tmp_path / name).write_bytes(content)
    with pytest.raises(error, match=says):
        read_survey(tmp_path / name)


def test_missing_file_is_refused(tmp_path):
    with pytest.raises(GleyError, match=r"nowhere\.csv: can't be read"):
        read_survey(tmp_path / "nowhere.csv")


def test_wrong_words_in_the_settings_are_refused_all_at_once(tmp_path):
    (tmp_path / "s.csv").write_text("\n".join(LINES), encoding="utf-8")
    settings = Settings().replace(survey={"columns": {"x1": "ORP"}, "units": {"Fe": "buckets"}})
    with pytest.raises(UsageError, match=r"'x1' = 'ORP' is no column.*'Fe' = 'buckets' is no unit"):
        read_survey(tmp_path / "s.csv", settings)
