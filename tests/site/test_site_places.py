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


def test_exchanged_columns_of_all_samples_are_one_finding():
    _, findings = locate([{"x_m": 5934000.0 + i, "y_m": 565000.0} for i in range(9)], crs="EPSG:25832")
    (said,) = [item for item in findings if item.rule == "site.outside_area"]
    assert "9 samples: s0, s1, s2, s3, s4, s5 …" in said.message


def test_one_sample_with_latitude_and_longitude_exchanged_is_noticed():
    degrees = [{"longitude_deg": 10.0 + 0.001 * i, "latitude_deg": 53.5 + 0.001 * i} for i in range(5)]
    made, findings = locate([*degrees, {"longitude_deg": 53.502, "latitude_deg": 10.001}], crs="EPSG:4326")
    assert findings.rules() == ["site.exchanged"]
    assert next(iter(findings)).place.sample == "s5"
    # said, not mended
    assert made.geometry.iloc[5].x == 53.502


def test_samples_spread_wide_or_all_at_one_place_are_no_exchange():
    _, wide = locate([{"longitude_deg": x, "latitude_deg": y} for x, y in ((1, 2), (30, 40), (100, -20), (9, 9))])
    _, same = locate([{"longitude_deg": 9.0, "latitude_deg": 9.0}] * 4)
    assert wide.rules() == same.rules() == ["site.degrees_assumed"]


def test_a_pair_is_never_made_of_two_rows():
    # the sample's own easting without a northing isn't joined to its station's northing
    made, _ = locate([{"station": "A", "x_m": 1.0}], [{"station": "A", **UTM}], crs="25832")
    assert (made.geometry.x.iloc[0], made.geometry.y.iloc[0]) == (565000.0, 5934000.0)


def test_own_degrees_win_over_the_station_and_are_converted():
    # 53.55 N 9.98 E in zone 32: easting near 565 km, northing near 5934 km (central meridian 9 E; by hand to 1 km)
    own = {"station": "A", "longitude_deg": 9.98, "latitude_deg": 53.55}
    made, findings = locate([own, {"station": "A"}], [{"station": "A", "x_m": 566000.0, "y_m": 5935000.0}], crs="25832")
    assert made.geometry.x.iloc[0] == pytest.approx(565_000, abs=1000)
    assert made.geometry.y.iloc[0] == pytest.approx(5_934_000, abs=1000)
    assert made.geometry.x.iloc[1] == 566000.0
    assert findings.rules() == ["site.degrees_converted"]


def test_option_against_the_file_is_said():
    made, findings = locate([UTM], facts={"crs": "EPSG:25833"}, crs="EPSG:25832")
    assert made.crs.to_epsg() == 25832
    assert findings.rules() == ["site.crs_differs"]
    assert locate([UTM], facts={"crs": "EPSG:25832"}, crs="25832")[1].rules() == []


def test_file_may_want_no_places():
    made, findings = locate([UTM], facts={"crs": "none"})
    assert made is None
    assert findings.rules() == []


def test_eastings_in_a_system_of_degrees_are_refused():
    with pytest.raises(UsageError, match=r"565000, 5934000 aren't degrees, as EPSG:4326.*--crs"):
        locate([UTM], crs="EPSG:4326")


@pytest.mark.parametrize("code", ["EPSG:5703", "EPSG:4978"])
def test_heights_and_geocentric_systems_are_refused(code):
    with pytest.raises(UsageError, match="isn't a system of eastings and northings"):
        locate([UTM], crs=code)


def test_area_across_the_date_line_is_understood():
    # Fiji Map Grid spans 180°; its false origin (2 000 000, 4 000 000) lies at 178.75 E 17 S (EPSG registry)
    _, findings = locate([{"x_m": 2_000_000.0, "y_m": 4_000_000.0}], crs="EPSG:3460")
    assert findings.rules() == []


def test_option_mends_a_code_of_the_file_that_means_nothing():
    made, findings = locate([UTM], facts={"crs": "our local grid"}, crs="EPSG:25832")
    assert made.crs.to_epsg() == 25832
    assert findings.rules() == ["site.crs_differs"]
