"""Which charts a survey gets: the sample each is drawn at, the window they share, the drawn field behind each point."""

from dataclasses import replace

import numpy as np
import pandas as pd
import shapely

from gley import stability
from gley.columns import amount_column
from gley.delivery import ChartSheet
from gley.drawing import element_name
from gley.findings import Findings
from gley.settings import ChartSettings, Settings
from gley.stability import Chart, Conditions

FAN = (10, 90)
"""Percentiles of the detected totals between which a fan shows how far lines move."""

_FAN_LEAST = 5


def chart_sheets(
    waters: pd.DataFrame, fields: pd.DataFrame, elements: tuple[str, ...], settings: Settings
) -> tuple[ChartSheet, ...]:
    """One sheet per element with an assigned sample, and arsenic laid over iron where both are there.

    Parameters
    ----------
    waters : DataFrame
        As for `stability.assign`.
    fields : DataFrame
        What it gave.
    elements : tuple of str
        Their order.
    settings : Settings
        Window, fan and stability choices.
    """
    window = shared_window(waters, settings.chart)
    sheets = {}
    for element in elements:
        points = _points(waters, fields, element, settings)
        found = stability.reference(waters, element, settings, np.isin(waters["sample"], points["sample"]))
        if found is not None:
            sheets[element] = _sheet(element, waters, points, found, window, settings)
    if {"As", "Fe"} <= sheets.keys():
        sheets["As_over_Fe"] = _overlay(sheets["As"], sheets["Fe"], waters, settings, window)
    return tuple(sheets.values())


def shared_window(waters: pd.DataFrame, stated: ChartSettings) -> tuple[float, float, float, float]:
    """One range for all charts: the settings', widened to whole pH and 100 mV to hold every believable sample."""
    pH, Eh = waters["pH"].to_numpy(float), waters["Eh_mV"].to_numpy(float)
    beyond = np.abs(stability.beyond_water(pH, Eh, waters["temperature_used_C"].to_numpy(float)))
    keep = beyond <= stability.IMPLAUSIBLE_mV
    pH_low, pH_high, E_low, E_high = stated.pH_min, stated.pH_max, stated.Eh_min_mV, stated.Eh_max_mV
    if keep.any():
        pH_low, pH_high = min(pH_low, np.floor(pH[keep].min())), max(pH_high, np.ceil(pH[keep].max()))
        E_low = min(E_low, 100 * np.floor(Eh[keep].min() / 100))
        E_high = max(E_high, 100 * np.ceil(Eh[keep].max() / 100))
    return max(float(pH_low), 0.0), min(float(pH_high), 14.0), float(E_low) / 1000, float(E_high) / 1000


def _points(waters: pd.DataFrame, fields: pd.DataFrame, element: str, settings: Settings) -> pd.DataFrame:
    """Samples of one element as the chart shows them: where they lie, how sure, and their own field."""
    own = fields[(fields["element"] == element) & (fields["field"] != "")]
    stated = settings.stability
    at = waters.set_index("sample").loc[own["sample"]]
    laboratory = at["pH_where"].to_numpy() == "laboratory"
    return pd.DataFrame({
        "sample": own["sample"].to_numpy(), "station": at["station"].to_numpy(), "pH": at["pH"].to_numpy(float),
        "pH_sd": np.where(laboratory, stated.pH_sd_laboratory, stated.pH_sd_field),
        "Eh_mV": at["Eh_mV"].to_numpy(float), "Eh_sd_mV": at["Eh_sd_mV"].to_numpy(float),
        "field": own["field"].to_numpy(), "kind": own["kind"].to_numpy(), "outcome": own["outcome"].to_numpy(),
    })  # fmt: skip


def _sheet(element, waters, points, found: tuple[int, Conditions], window, settings: Settings) -> ChartSheet:
    row, conditions = found
    chart = stability.chart_at(element, conditions, window)
    points["background"] = background(chart, points["pH"].to_numpy(float), points["Eh_mV"].to_numpy(float))
    column = waters.get(amount_column(element), pd.Series(np.nan, index=waters.index))
    totals = column[np.isin(waters["sample"], points["sample"])].to_numpy(float)
    return ChartSheet(
        key=element, title=element_name(element), chart=chart, over=None,
        fan=_fan(element, conditions, totals, window, settings.chart), points=points,
        reference=f"sample {waters['sample'].iloc[row]}", notes=_notes(points, settings.chart.background_mismatch),
    )  # fmt: skip


def _notes(points: pd.DataFrame, most: float) -> tuple[str, ...]:
    """What a reader of the chart must know: that many points belong to other waters than the one drawn."""
    inside = points[points["background"] != ""]
    other = int((inside["background"] != inside["field"]).sum())
    if not len(inside) or other / len(inside) <= most:
        return ()
    words = f"{other} of {len(inside)} points lie in another field at their own water than the one drawn behind them;"
    return (f"{words} trust the filling of a point, and draw groups of like water (unit, round) apart.",)


def _fan(element: str, conditions: Conditions, totals: np.ndarray, window, stated: ChartSettings):
    """Charts at the low and high totals of the survey; None where there are too few or they hardly differ."""
    totals = totals[np.isfinite(totals) & (totals > 0)]
    if not stated.fan or len(totals) < _FAN_LEAST:
        return None
    low, high = np.percentile(totals, FAN)
    if high < 1.2 * low:
        return None
    low_chart, high_chart = (
        stability.chart_at(element, replace(conditions, total_mol_L=float(total)), window) for total in (low, high)
    )
    return low_chart, high_chart


def _overlay(arsenic: ChartSheet, iron: ChartSheet, waters: pd.DataFrame, settings: Settings, window) -> ChartSheet:
    """Arsenic's lines over iron's map, both in the water that arsenic's chart is drawn at where its iron is known."""
    here = "sample " + waters["sample"].to_numpy() == arsenic.reference
    found = stability.reference(waters, "Fe", settings, here)
    same = found is not None
    return ChartSheet(
        key="As_over_Fe", title="Arsenic over iron",
        chart=stability.chart_at("Fe", found[1], window) if found is not None else iron.chart,
        over=arsenic.chart, fan=None, points=arsenic.points,
        reference=arsenic.reference if same else f"{arsenic.reference} (As) and {iron.reference} (Fe)", notes=(),
    )  # fmt: skip


def with_background(fields: pd.DataFrame, sheets: tuple[ChartSheet, ...], findings: Findings) -> pd.DataFrame:
    """Fields with the column `background` filled from the sheets; a finding counts the samples it differs for."""
    table = fields.copy()
    for sheet in sheets:
        if sheet.over is not None:
            continue
        rows = table.index[(table["element"] == sheet.key) & (table["field"] != "")]
        drawn = sheet.points["background"].to_numpy()
        table.loc[rows, "background"] = drawn
        other = int(((table.loc[rows, "field"].to_numpy() != drawn) & (drawn != "")).sum())
        if other:
            at = sheet.reference
            findings.add("stability.background", element=sheet.key, count=other, total=len(rows), reference=at)
    return table


def background(chart: Chart, pH: np.ndarray, Eh_mV: np.ndarray) -> np.ndarray:
    """Name of the drawn field at each point (n,); empty outside the window."""
    found = np.full(len(pH), "", dtype=object)
    for item in chart.fields:
        shape = shapely.multipolygons([shapely.Polygon(rings[0], rings[1:]) for rings in item.polygons])
        shapely.prepare(shape)
        found[shapely.intersects_xy(shape, pH, Eh_mV / 1000.0)] = item.name
    return found
