"""A small run made by hand, written and read back: rows, columns, places, workbook, report, stamp, redrawing."""

import hashlib
import json
from importlib.resources import files

import geopandas
import openpyxl
import pandas as pd
import pytest
from results_made_up import places_made_up, result_made_up

from gley.delivery import draw, from_record, htmltable, workbook, write
from gley.delivery.page import map_title
from gley.delivery.tables import sample_table
from gley.drawing import SiteMap
from gley.errors import GleyError
from gley.findings import Findings

NAMES = ["A1", "=1+1", "C1", "D1"]
EPOCH = 1_936_000_000  # 2031-05-08T09:46:40Z, by `date -u -d @1936000000`


@pytest.fixture(scope="module")
def written(tmp_path_factory):
    folder = tmp_path_factory.mktemp("made_up") / "a"
    with pytest.MonkeyPatch.context() as patch:
        patch.setenv("SOURCE_DATE_EPOCH", str(EPOCH))
        paths = write(result_made_up(), folder)
    return folder, paths


def test_every_row_is_in_every_table_and_layer(written):
    folder, _ = written
    assert list(pd.read_csv(folder / "samples.csv")["sample"]) == NAMES
    sheet = openpyxl.load_workbook(folder / "samples.xlsx")["samples"]
    assert [cell.value for cell in sheet["A"]][1:] == NAMES
    layer = geopandas.read_file(folder / "samples.gpkg", layer="samples")
    assert list(layer["sample"]) == NAMES
    assert list(layer.geometry.isna()) == [False, False, False, True]
    fields = geopandas.read_file(folder / "samples.gpkg", layer="fields")
    assert list(fields["sample"]) == ["D1", "=1+1", "A1"]
    assert list(fields.geometry.isna()) == [True, False, False]
    assert layer.crs.to_epsg() == fields.crs.to_epsg() == 25832


def test_columns_of_the_samples_stand_in_the_order_of_the_contract(written):
    folder, _ = written
    found = list(pd.read_csv(folder / "samples.csv"))
    wanted = [
        "sample", "station", "date", "time", "round", "sample_type", "pH", "temperature_C", "SC_uS_cm", "ORP_mV",
        "electrode_used", "reference_mV", "check_offset_mV", "Eh_mV", "Eh_sd_mV", "pe", "Eh_basis", "Eh_status",
        "redox_category", "redox_process", "process_basis", "field_Fe", "Fe_mg_L", "Fe_flag", "Fe_mol_L", "x_m", "y_m",
        "crs", "longitude_deg", "latitude_deg", "remarks",
    ]  # fmt: skip
    assert [name for name in found if name in wanted] == wanted
    # measured but not in that list: kept beside, only where a sample has it
    assert "pH_lab" in found
    assert "turbidity_NTU" not in found
    book = openpyxl.load_workbook(folder / "samples.xlsx")
    assert [cell.value for cell in book["samples"][1]] == found


def test_fields_are_matched_by_name_not_by_position():
    table = sample_table(result_made_up()).set_index("sample")
    assert dict(table["field_Fe"]) == {"A1": "siderite", "=1+1": "ferrihydrite (2-line)", "C1": "", "D1": "Fe^2+"}


def test_coordinates_in_the_reference_system_and_in_degrees():
    table = sample_table(result_made_up())
    assert list(table["x_m"].dropna()) == [565000.0, 565050.0, 565100.0]
    assert list(table["crs"]) == ["EPSG:25832"] * 3 + [""]
    # zone 32 has its central meridian at 9 E and false easting 500 km: 65 km east of it at 53.5 N is about 0.98 degrees
    assert table.loc[0, "longitude_deg"] == pytest.approx(9.98, abs=0.01)
    assert table.loc[0, "latitude_deg"] == pytest.approx(53.55, abs=0.01)


def test_coordinates_without_places_stay_as_delivered():
    table = sample_table(result_made_up(places=None))
    assert list(table["x_m"].dropna()) == [565000.0, 565050.0, 565100.0]
    assert table["longitude_deg"].isna().all()


def test_system_in_feet_has_columns_in_feet():
    # EPSG:2263 counts US survey feet
    table = sample_table(result_made_up(places=places_made_up("EPSG:2263")))
    assert "x_ft" in table
    assert "x_m" not in table


def test_workbook_sorts_and_keeps_what_was_reported(written):
    folder, _ = written
    book = openpyxl.load_workbook(folder / "samples.xlsx")
    assert book.sheetnames == ["samples", "fields", "findings"]
    assert all(sheet.freeze_panes == "B2" and sheet.auto_filter.ref for sheet in book)
    sheet = book["samples"]
    at = {cell.value: cell.column for cell in sheet[1]}
    iron = [sheet.cell(row, at["Fe_mg_L"]) for row in range(2, 6)]
    assert [cell.value for cell in iron] == [0.5, "<0.05", "see report", "1,12"]
    assert iron[0].number_format == "0.00"
    assert sheet.cell(3, at["sample"]).data_type == "s"
    assert sheet.cell(4, at["remarks"]).value == "bell and <b>tag</b>"
    assert [sheet.cell(row, at["Eh_mV"]).value for row in range(2, 6)] == [0, 320, None, 0]
    assert sheet.cell(2, at["Fe_mol_L"]).number_format == "0.00E+00"
    assert sheet.column_dimensions["A"].width >= 8


def test_eh_is_in_full_in_the_csv(written):
    folder, _ = written
    assert list(pd.read_csv(folder / "samples.csv")["Eh_mV"].dropna()) == [4.9, 316.04, -3.2]


def test_table_too_long_for_a_sheet_is_left_out_and_said(tmp_path, monkeypatch):
    monkeypatch.setattr(workbook, "MOST_ROWS", 3)
    result = result_made_up(charts=(), places=None)
    write(result, tmp_path / "a")
    assert openpyxl.load_workbook(tmp_path / "a/samples.xlsx").sheetnames == ["fields", "findings"]
    assert list(pd.read_csv(tmp_path / "a/findings.csv")["rule"]) == ["delivery.sheet_too_long"]
    assert len(result.findings) == 0  # the result in memory is left as it was


def test_report_rounds_to_what_a_reading_is_worth(written):
    folder, _ = written
    page = (folder / "report.html").read_text(encoding="utf-8")
    assert '<td class="n">10.25</td><td class="n">10.5</td><td class="n">−204</td><td class="n">0</td>' in page
    assert ">−0<" not in page
    assert ">−0.0<" not in page
    assert "from 0 to 320 mV" in page
    assert "Fe<sup>2+</sup>" in page
    assert "&lt;0.05" not in page  # reported values stand in the tables of the folder


def test_report_holds_the_stamp_and_every_setting(written):
    folder, _ = written
    page = (folder / "report.html").read_text(encoding="utf-8")
    for text in ("gley run made_up.csv", "0" * 64, "chart.dpi", "evidence.Fe_ug_L", "2031-05-08", "Nowhere"):
        assert text in page
    assert "<td>60</td><td>yes</td>" in page  # dpi differs from its default


def test_long_tables_are_cut_in_the_report_and_said(monkeypatch):
    monkeypatch.setattr(htmltable, "MOST_ROWS", 2)
    text = htmltable.table(pd.DataFrame({"sample": NAMES}), "samples.csv")
    assert text.count("<tr>") == 3
    assert "The first 2 of 4 rows; samples.csv holds all." in text


def test_stamp_names_files_hashes_and_time(written):
    folder, paths = written
    record = json.loads((folder / "run.json").read_text(encoding="utf-8"))
    assert record["files"] == [path.relative_to(folder).as_posix() for path in paths]
    assert record["made"] == "2031-05-08T09:46:40Z"
    assert record["inputs"] == [{"path": "made_up.csv", "sha256": "0" * 64}]
    for package, name in (("stability", "species.csv"), ("probe", "electrodes.csv"), ("survey", "headers.csv")):
        content = (files("gley") / package / name).read_bytes()
        assert record["data"][name] == hashlib.sha256(content).hexdigest()
    assert record["settings"]["chart"]["dpi"] == 60
    assert record["counts"]["samples"] == 4
    assert record["counts"]["with_Eh"] == 3
    assert record["counts"]["assigned"] == {"Fe": 3}
    assert record["command"] == "gley run made_up.csv"
    assert {"numpy", "pandas", "geopandas"} <= record["packages"].keys()


def test_chart_and_map_are_drawn_again_from_the_folder_alone(written, tmp_path):
    folder, _ = written
    dpi = json.loads((folder / "run.json").read_text(encoding="utf-8"))["settings"]["chart"]["dpi"]
    record = json.loads((folder / "charts/Fe.json").read_text(encoding="utf-8"))
    samples = pd.read_csv(folder / "samples.csv", keep_default_na=False)
    xy = [pd.to_numeric(samples[name]) for name in ("x_m", "y_m")]
    there = xy[0].notna()
    points = geopandas.GeoSeries(geopandas.points_from_xy(*xy), crs=samples["crs"][0]).where(there, None)
    frame = geopandas.GeoDataFrame(samples[["sample", "station", "round", "field_Fe"]], geometry=points)
    drawn = [
        *draw(from_record(record)).save(tmp_path / "chart", dpi=dpi),
        *SiteMap().draw(frame, "field_Fe", title=map_title("Fe")).save(tmp_path / "map", dpi=dpi),
    ]
    first = [folder / "charts/Fe.svg", folder / "charts/Fe.png", folder / "maps/Fe.svg", folder / "maps/Fe.png"]
    for again, path in zip(drawn, first, strict=True):
        assert again.read_bytes() == path.read_bytes(), path.name


def test_lines_of_both_elements_of_an_overlay_are_in_the_table(tmp_path):
    sheet = result_made_up().charts[0]
    over = type(sheet)(**{**vars(sheet), "key": "Fe_twice", "over": sheet.chart})
    write(result_made_up(charts=(over,), places=None), tmp_path / "a")
    lines = pd.read_csv(tmp_path / "a/boundaries/Fe_twice.csv")
    assert len(lines) == 2 * len(sheet.chart.boundaries)
    assert set(lines["element"]) == {"Fe"}


def test_second_run_over_the_first_and_over_a_file_of_the_user(tmp_path):
    result = result_made_up(charts=(), places=None)
    write(result, tmp_path / "a")
    with pytest.raises(GleyError, match=r"earlier run; nothing was changed.*--overwrite"):
        write(result, tmp_path / "a")
    write(result, tmp_path / "a", overwrite=True)
    (tmp_path / "a/plan.qgz").write_text("mine")
    with pytest.raises(GleyError, match=r"no run wrote \(plan\.qgz\)"):
        write(result, tmp_path / "a", overwrite=True)
    assert (tmp_path / "a/plan.qgz").read_text() == "mine"


def test_run_killed_while_replacing_is_a_finding_of_the_next(tmp_path):
    result = result_made_up(charts=(), places=None)
    write(result, tmp_path / "a")
    (tmp_path / "a").rename(tmp_path / "a.previous")
    write(result, tmp_path / "a", overwrite=True)
    assert list(pd.read_csv(tmp_path / "a/findings.csv")["rule"]) == ["delivery.restored"]
    assert [path.name for path in tmp_path.iterdir()] == ["a"]


def test_findings_said_alike_of_several_places_stand_once(tmp_path):
    findings = Findings()
    for _ in range(8):
        findings.add("survey.pH_laboratory")
    write(result_made_up(charts=(), places=None, findings=findings), tmp_path / "a")
    page = (tmp_path / "a/report.html").read_text(encoding="utf-8")
    assert "Warnings (8)" in page
    assert page.count("Only laboratory pH") == 1
    assert len(pd.read_csv(tmp_path / "a/findings.csv")) == 8
