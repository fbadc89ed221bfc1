"""What a run writes: tables that hold every row as reported, charts that can be drawn again, output that repeats."""

import json
from pathlib import Path

import geopandas
import numpy as np
import openpyxl
import pandas as pd
import pytest

from gley import pipeline
from gley.columns import columns
from gley.delivery import draw, from_record
from gley.settings import Settings

TOP = Path(__file__).parents[2]


@pytest.fixture(scope="module")
def delivered(tmp_path_factory):
    settings = Settings().replace(chart={"dpi": 60})
    result = pipeline.run(TOP / "sample_surveys/erlenwiek.xlsx", settings, command="gley run erlenwiek.xlsx")
    folder = tmp_path_factory.mktemp("delivered") / "a"
    pipeline.write(result, folder)
    return result, folder


def test_all_files_of_the_design_are_there(delivered):
    _, folder = delivered
    found = {path.relative_to(folder).as_posix() for path in folder.rglob("*") if path.is_file()}
    wanted = {"report.html", "run.json", "samples.csv", "samples.xlsx", "samples.gpkg", "fields.csv", "findings.csv"}
    wanted |= {"rivals.csv", "couples.csv", "scenarios.csv", "overlaps.csv"}
    wanted |= {
        f"charts/{key}{suffix}" for key in ("As", "Fe", "Mn", "As_over_Fe") for suffix in (".svg", ".png", ".json")
    }
    wanted |= {f"boundaries/{key}.csv" for key in ("As", "Fe", "Mn", "As_over_Fe")}
    wanted |= {f"maps/{key}{suffix}" for key in ("As", "Fe", "Mn", "redox_process") for suffix in (".svg", ".png")}
    assert found == wanted


def test_values_stay_as_reported(delivered):
    result, folder = delivered
    samples = pd.read_csv(folder / "samples.csv", dtype=str, keep_default_na=False)
    book = pd.read_excel(folder / "samples.xlsx", sheet_name="samples", dtype=str, keep_default_na=False)
    limited = (result.survey.amounts["Fe_limit"] == "<").to_numpy()
    assert limited.any()
    for table in (samples, book):
        assert set(table.loc[limited, "Fe_mg_L"]) == {"<0.05"}
        assert set(table.loc[limited, "Fe_flag"]) == {"<"}
    assert "see report" in set(samples["Mn_mg_L"])


def test_eh_is_full_in_the_csv_and_to_10_mV_in_the_workbook(delivered):
    result, folder = delivered
    samples = pd.read_csv(folder / "samples.csv")
    assert np.allclose(samples["Eh_mV"], result.eh["Eh_mV"])
    book = pd.read_excel(folder / "samples.xlsx", sheet_name="samples")
    assert (book["Eh_mV"].dropna() % 10 == 0).all()


def test_fields_have_the_columns_of_the_vocabulary(delivered):
    _, folder = delivered
    assert list(pd.read_csv(folder / "fields.csv")) == ["sample", "element", *columns("fields")]


def test_layers_hold_the_same_as_the_tables(delivered):
    _, folder = delivered
    layer = geopandas.read_file(folder / "samples.gpkg", layer="samples")
    samples = pd.read_csv(folder / "samples.csv")
    assert list(layer["sample"]) == list(samples["sample"])
    assert np.allclose(layer.geometry.x, samples["x_m"])
    fields = geopandas.read_file(folder / "samples.gpkg", layer="fields")
    assert len(fields) == len(pd.read_csv(folder / "fields.csv"))
    back = layer.to_crs("EPSG:4326").geometry
    assert np.allclose(back.x, samples["longitude_deg"], atol=1e-7)


@pytest.mark.parametrize("key", ["As", "Fe", "As_over_Fe"])
def test_chart_is_drawn_again_from_its_json_to_the_byte(delivered, tmp_path, key):
    _, folder = delivered
    record = json.loads((folder / f"charts/{key}.json").read_text(encoding="utf-8"))
    svg, _ = draw(from_record(record)).save(tmp_path / key, dpi=60)
    assert svg.read_bytes() == (folder / f"charts/{key}.svg").read_bytes()


def test_report_is_self_contained_and_cautious(delivered):
    _, folder = delivered
    page = (folder / "report.html").read_text(encoding="utf-8")
    assert "http://" not in page.replace("http://www.w3.org", "")
    assert "mixed potential" in page
    assert "Sorption" in page
    assert "licensed" in page
    assert page.count("<figure>") == 8


def test_names_in_the_survey_are_harmless_in_the_report(tmp_path):
    path = tmp_path / "s.csv"
    path.write_text("Sample;ORP (mV);pH\n<script>alert(1)</script>;1;7\n", encoding="utf-8")
    settings = Settings().replace(probe={"electrode": "SCE"}, survey={"crs": "none"})
    pipeline.write(pipeline.run(path, settings), tmp_path / "a")
    page = (tmp_path / "a/report.html").read_text(encoding="utf-8")
    assert "<script>" not in page
    assert "&lt;script&gt;" in page


def test_names_that_look_like_formulas_stay_text_in_the_workbook(tmp_path):
    path = tmp_path / "s.csv"
    path.write_text("Sample;ORP (mV);pH\n=1+1;1;7\n", encoding="utf-8")
    settings = Settings().replace(probe={"electrode": "SCE"}, survey={"crs": "none"})
    pipeline.write(pipeline.run(path, settings), tmp_path / "a")
    sheet = openpyxl.load_workbook(tmp_path / "a/samples.xlsx")["samples"]
    assert sheet["A2"].value == "=1+1"
    assert sheet["A2"].data_type == "s"


def test_output_repeats_to_the_byte(delivered, tmp_path, monkeypatch):
    monkeypatch.setenv("SOURCE_DATE_EPOCH", "1900000000")
    result, _ = delivered
    for name in ("one", "two"):
        pipeline.write(result, tmp_path / name)
    for path in sorted((tmp_path / "one").rglob("*")):
        if path.is_file():
            twin = tmp_path / "two" / path.relative_to(tmp_path / "one")
            assert path.read_bytes() == twin.read_bytes(), path.name
