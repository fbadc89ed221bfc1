"""The installed command on the sample surveys, in a process of its own: what a newcomer gets."""

import json
import subprocess
import sys
from pathlib import Path

import geopandas
import pandas as pd
import pytest

pytestmark = pytest.mark.system

TOP = Path(__file__).parents[2]
SURVEYS = sorted(path for path in (TOP / "sample_surveys").iterdir() if path.suffix in (".xlsx", ".csv"))
GLEY = Path(sys.executable).parent / "gley"


def gley(*words, cwd):
    return subprocess.run([str(GLEY), *map(str, words)], cwd=cwd, capture_output=True, text=True, check=False)


@pytest.fixture(scope="module", params=SURVEYS, ids=lambda path: path.stem)
def done(request, tmp_path_factory):
    folder = tmp_path_factory.mktemp("job")
    finished = gley("run", request.param, "--out", "assessment", cwd=folder)
    assert finished.returncode in (0, 3), finished.stderr
    return request.param, folder / "assessment", finished


def rows_of(survey: Path) -> int:
    """Sample rows of the file, counted without the project's reader."""
    if survey.suffix == ".csv":
        lines = [line for line in survey.read_text(encoding="utf-8-sig").splitlines() if line and line[0] != "#"]
        return len(lines) - 1
    raw = pd.read_excel(survey, sheet_name="Samples", header=None, dtype=str)
    start = next(i for i in range(len(raw)) if raw.iloc[i].str.strip().str.lower().eq("ph").any())
    names = raw.iloc[start + 1 :, 0].dropna()
    return int((names != "-").sum())  # the row of units is no sample


def test_every_input_row_is_in_every_table(done):
    survey, folder, _ = done
    samples = pd.read_csv(folder / "samples.csv")
    assert len(samples) == rows_of(survey)
    assert len(pd.read_excel(folder / "samples.xlsx", sheet_name="samples")) == len(samples)
    assert len(geopandas.read_file(folder / "samples.gpkg", layer="samples")) == len(samples)


def test_layers_carry_the_survey_s_reference_system(done):
    _, folder, _ = done
    layers = geopandas.list_layers(folder / "samples.gpkg")["name"]
    assert {"samples", "fields"} <= set(layers)
    for layer in layers:
        assert geopandas.read_file(folder / "samples.gpkg", layer=layer).crs.to_epsg() == 25832


def test_no_traceback_and_a_summary(done):
    _, folder, finished = done
    assert "Traceback" not in finished.stderr
    assert "samples read" in finished.stdout
    assert (folder / "report.html").stat().st_size > 10_000


def test_run_record_names_inputs_and_settings(done):
    survey, folder, _ = done
    record = json.loads((folder / "run.json").read_text(encoding="utf-8"))
    text = json.dumps(record)
    assert survey.name in text
    assert "fresh" in text


def test_second_run_refuses_and_changes_nothing(done):
    survey, folder, _ = done
    before = {path: path.read_bytes() for path in sorted(folder.rglob("*")) if path.is_file()}
    again = gley("run", survey, "--out", "assessment", cwd=folder.parent)
    assert again.returncode == 1
    assert "--overwrite" in again.stderr
    assert {path: path.read_bytes() for path in sorted(folder.rglob("*")) if path.is_file()} == before


def test_help_is_light():
    code = "import sys; from gley.cli import main; main(['--help']); print({'pandas', 'matplotlib'} & {*sys.modules})"
    finished = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert finished.stdout.strip().endswith("set()")


def test_check_writes_nothing(tmp_path):
    finished = gley("check", SURVEYS[0], cwd=tmp_path)
    assert finished.returncode in (0, 3)
    assert list(tmp_path.iterdir()) == []


def test_workbook_is_made_once(tmp_path):
    assert gley("sheet", "field.xlsx", cwd=tmp_path).returncode == 0
    again = gley("sheet", "field.xlsx", cwd=tmp_path)
    assert again.returncode == 1
    assert "--overwrite" in again.stderr


@pytest.mark.parametrize(
    ("name", "content"),
    [
        ("nothing.xlsx", None),
        ("empty.csv", b""),
        ("broken.xlsx", b"not a workbook"),
        ("photo.jpg", b"\xff\xd8\xff"),
        ("text.csv", b"once upon a time\n"),
    ],
)
def test_bad_files_give_one_clear_line(tmp_path, name, content):
    if content is not None:
        (tmp_path / name).write_bytes(content)
    finished = gley("run", name, "--out", "x", cwd=tmp_path)
    assert finished.returncode in (1, 2)
    assert name in finished.stderr
    assert "Traceback" not in finished.stderr
    assert not (tmp_path / "x").exists()
