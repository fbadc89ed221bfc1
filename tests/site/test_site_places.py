"""Places of samples: own or station's coordinates, one stated reference system, refusals that name the cure."""

from types import SimpleNamespace

import pytest

from gley.errors import UsageError
from gley.findings import Findings
from gley.settings import Settings
from gley.site import places
from tables import table


def locate(samples, stations=(), facts=None, crs=""):
    findings = Findings()
    named = [{"sample": f"s{i}", **row} for i, row in enumerate(samples)]
    survey = SimpleNamespace(
        samples=table("samples", named), stations=table("stations", list(stations)), facts=facts or {}
    )
    return places(survey, Settings().replace(survey={"crs": crs}), findings), findings


UTM = {"x_m": 565000.0, "y_m": 5934000.0}


def test_station_gives_the_place_own_coordinates_win():
    made, findings = locate(
        [{"station": "A"}, {"station": "A", "x_m": 565100.0, "y_m": 5934100.0}],
        [{"station": "A", **UTM}],
        {"crs": "EPSG:25832"},
    )
    assert list(made.geometry.x) == [565000.0, 565100.0]
    assert made.crs.to_epsg() == 25832
    assert findings.rules() == []


def test_sample_without_a_place_keeps_its_row():
    made, findings = locate([{"station": "A"}, {"station": "B"}], [{"station": "A", **UTM}], crs="25832")
    assert len(made) == 2
    assert made.geometry.iloc[1] is None
    assert findings.rules() == ["site.no_place"]


def test_projected_coordinates_without_a_system_are_refused():
    with pytest.raises(UsageError, match=r"no reference system.*--crs"):
        locate([UTM])


def test_plain_degrees_are_taken_as_such_and_said():
    made, findings = locate([{"longitude_deg": 10.0, "latitude_deg": 53.5}])
    assert made.crs.to_epsg() == 4326
    assert findings.rules() == ["site.degrees_assumed"]


def test_none_means_no_places():
    made, _ = locate([UTM], crs="none")
    assert made is None


def test_no_coordinates_at_all_is_said():
    made, findings = locate([{"station": "A"}])
    assert made is None
    assert findings.rules() == ["site.no_coordinates"]


def test_unknown_code_is_refused():
    with pytest.raises(UsageError, match=r"'EPSG:999999' isn't a coordinate reference system"):
        locate([UTM], crs="EPSG:999999")


def test_several_systems_are_refused():
    with pytest.raises(UsageError, match=r"several reference systems"):
        locate([{**UTM, "crs": "EPSG:25832"}, {**UTM, "crs": "EPSG:25833"}])


def test_exchanged_columns_are_noticed():
    _, findings = locate([{"x_m": 5934000.0, "y_m": 565000.0}], crs="EPSG:25832")
    (said,) = [item for item in findings if item.rule == "site.outside_area"]
    assert "exchanged" in said.message
