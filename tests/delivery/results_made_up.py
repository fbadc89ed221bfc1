"""A small run made by hand: four samples, one without a place, one without Eh, values as laboratories write them."""

import geopandas
import numpy as np
import pandas as pd

from gley.columns import columns
from gley.delivery import ChartSheet, Result
from gley.evidence import process_table
from gley.findings import Findings
from gley.settings import Settings
from gley.stability import chart
from gley.survey import Origin, Survey
from tables import table

SAMPLES = [
    {"sample": "A1", "station": "A", "date": "2031-05-01", "pH": 10.25, "temperature_C": 10.5, "ORP_mV": -204.0},
    {"sample": "=1+1", "station": "B", "date": "2031-05-01", "pH": 7.1, "temperature_C": 9.9, "ORP_mV": 100.0},
    {"sample": "C1", "station": "C", "pH": 6.5, "remarks": "bell\x07 and <b>tag</b>", "pH_lab": 6.9},
    {"sample": "D1", "station": "D", "pH": 7.0, "temperature_C": 11.0, "ORP_mV": 0.0},
]
STATIONS = [{"station": name, "x_m": 565000.0 + 50 * k, "y_m": 5934000.0 + 20 * k} for k, name in enumerate("ABC")]


def survey_made_up():
    samples = table("samples", SAMPLES)
    amounts = pd.DataFrame({"Fe_mol_L": [1e-5, 9e-7, np.nan, 2e-5], "Fe_limit": ["", "<", "", ""]})
    reported = pd.DataFrame({"Fe_mg_L": ["0.50", "<0.05", "see report", "1,12"], "Fe_flag": ["", "<", "not used", ""]})
    return Survey(
        samples=samples, amounts=amounts, reported=reported, stations=table("stations", STATIONS),
        checks=table("checks", []), facts={"crs": "EPSG:25832", "site": "Nowhere"}, origin=Origin(),
        findings=Findings(), inputs=({"path": "made_up.csv", "sha256": "0" * 64},),
    )  # fmt: skip


def eh_made_up():
    eh = pd.DataFrame({name: [""] * 4 for name in columns("eh")})
    numbers = {
        "Eh_mV": [4.9, 316.04, np.nan, -3.2], "Eh_sd_mV": [30.0, 15.0, np.nan, 60.0], "pe": [0.09, 5.6, np.nan, -0.04],
        "reference_mV": [208.9, 216.04, np.nan, -3.2], "check_offset_mV": [0.0, 0.0, np.nan, 0.0],
        "Eh_sd_own_mV": [30.0, 15.0, np.nan, 60.0], "Eh_sd_common_mV": [0.0, 0.0, np.nan, 0.0],
        "temperature_used_C": [10.5, 9.9, 25.0, 11.0], "Eh_platinum_mV": [np.nan] * 4,
    }  # fmt: skip
    eh = eh.assign(**numbers)
    eh["Eh_status"] = ["ok", "ok", "no ORP", "ok"]
    return eh


def fields_made_up():
    """Rows out of the order of the samples, and none for C1."""
    numbers = [name for name, column in columns("fields").items() if column.dtype == "number"]
    rows = []
    for sample, field in (("D1", "Fe^2+"), ("=1+1", "ferrihydrite (2-line)"), ("A1", "siderite")):
        row = {"sample": sample, "element": "Fe", **dict.fromkeys(columns("fields"), ""), **dict.fromkeys(numbers, 0.5)}
        rows.append({**row, "field": field, "outcome": "clear", "status": "ok", "next_field": "siderite"})
    return pd.DataFrame(rows)


def places_made_up(crs="EPSG:25832"):
    points = geopandas.points_from_xy(*np.array([[row["x_m"], row["y_m"]] for row in STATIONS] + [[0, 0]]).T)
    geometry = geopandas.GeoSeries(points, crs=crs)
    geometry[3] = None
    return geopandas.GeoDataFrame(table("samples", SAMPLES)[["sample", "station"]], geometry=geometry, crs=crs)


def result_made_up(**changed):
    survey, settings = survey_made_up(), Settings().replace(chart={"dpi": 60})
    points = pd.DataFrame({
        "sample": ["A1", "D1"], "station": ["A", "D"], "pH": [8.2, 7.0], "pH_sd": 0.1, "Eh_mV": [4.9, -3.2],
        "Eh_sd_mV": [30.0, np.nan], "field": ["siderite", "Fe^2+"], "kind": ["solid", "dissolved"], "outcome": "clear",
    })  # fmt: skip
    sheet = ChartSheet("Fe", "Iron", chart("Fe", 1e-5, 10.0), None, None, points, "sample A1", ("A note.",))
    parts = {
        "survey": survey, "settings": settings, "eh": eh_made_up(), "fields": fields_made_up(),
        "evidence": process_table(survey.amounts, settings), "places": places_made_up(), "charts": (sheet,),
        "findings": Findings(), "elements": ("Fe",), "timing": {"survey": 0.1}, "command": "gley run made_up.csv",
    }  # fmt: skip
    return Result(**{**parts, **changed})
