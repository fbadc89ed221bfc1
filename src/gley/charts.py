"""Which charts a survey gets: the sample each is drawn at, the window they share, the drawn field behind each point."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field, replace

import numpy as np
import pandas as pd
import shapely

from gley import stability
from gley.columns import amount_column
from gley.delivery import ChartSheet, PlainChart, overlap_table
from gley.drawing import element_name
from gley.errors import UsageError
from gley.findings import Findings
from gley.settings import ChartSettings, Settings
from gley.stability import Chart, Conditions

FAN = (10, 90)
"""Percentiles of the detected totals between which a fan shows how far lines move."""

_FAN_LEAST = 5

INERT: Mapping[str, Mapping[str, tuple[str, ...]]] = {"N2": {"N": ("N2(aq)",)}, "sulfate": {"S": ("SO4^2-", "HSO4^-")}}
"""What may be taken not to react, as it often doesn't (both need microbes), and the species that leave the element's
own chart. Inert sulfate still makes complexes and solids."""


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
    for over, under in _overlays(settings):
        if {over, under} <= sheets.keys():
            sheets[f"{over}_over_{under}"] = _overlay(sheets[over], sheets[under], waters, settings, window)
    return tuple(sheets.values())


def _overlays(settings: Settings) -> list[tuple[str, str]]:
    """Pairs of elements to lay over each other, upper first.

    Raises
    ------
    UsageError
        For an entry that doesn't name two elements on offer.
    """
    pairs = []
    for text in settings.chart.over:
        over, _, under = text.partition("/")
        if over == under or not {over, under} <= set(stability.OFFERED):
            message = f"[chart] over = '{text}' doesn't name two elements."
            raise UsageError(message, f"Write it like As/Fe, with two of {', '.join(stability.OFFERED)}.")
        pairs.append((over, under))
    return pairs


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


def _overlay(upper: ChartSheet, lower: ChartSheet, waters: pd.DataFrame, settings: Settings, window) -> ChartSheet:
    """One element's lines over another's map, both in the upper one's water where the lower one is known there."""
    here = "sample " + waters["sample"].to_numpy() == upper.reference
    found = stability.reference(waters, lower.key, settings, here)
    same = found is not None
    return ChartSheet(
        key=f"{upper.key}_over_{lower.key}", title=f"{upper.title} over {lower.title.lower()}",
        chart=stability.chart_at(lower.key, found[1], window) if found is not None else lower.chart,
        over=upper.chart, fan=None, points=upper.points,
        reference=upper.reference if same else f"{upper.reference} ({upper.key}) and {lower.reference} ({lower.key})",
        notes=(),
    )  # fmt: skip


def overlap_counts(sheets: tuple[ChartSheet, ...], fields: pd.DataFrame) -> pd.DataFrame:
    """For every overlay the regions that two fields share, and the samples assigned to both, as the vocabulary has it.

    Pairs that samples have at their own water but the chart doesn't show stand behind, with a share of 0.
    """
    own = fields[fields["field"] != ""].pivot(index="sample", columns="element", values="field")
    tables = []
    for sheet in sheets:
        if sheet.over is None:
            continue
        over, under = sheet.over.element, sheet.chart.element
        drawn = overlap_table(stability.overlay(sheet.chart, sheet.over), over, under)
        groups = own[[over, under]].dropna().reset_index().groupby([over, under])["sample"]
        held = groups.agg(samples="count", names=", ".join).reset_index()
        held = held.rename(columns={over: "over_field", under: "under_field"})
        table = drawn.merge(held, how="outer", on=["over_field", "under_field"])
        table = table.fillna({"share_of_chart": 0.0, "samples": 0, "names": ""})
        table = table.assign(over_element=over, under_element=under, samples=table["samples"].astype(int))
        tables.append(table.sort_values(["share_of_chart", "over_field", "under_field"], ascending=[False, True, True]))
    return pd.concat(tables, ignore_index=True) if tables else pd.DataFrame()


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


@dataclass(frozen=True)
class Wish:
    """What a chart without a survey shall hold: totals in mol/L, temperatures in °C, ligand totals in mol/L, species
    named in and out, what is taken as inert (`N2`, `sulfate`), and the options of `stability.chart`.
    """

    element: str
    totals: Sequence[float]
    temperatures: Sequence[float] = (25.0,)
    ligands: Mapping[str, float] = field(default_factory=dict)
    solids: str = "fresh"
    with_names: tuple[str, ...] = ()
    without_names: tuple[str, ...] = ()
    ionic_strength_M: float = 0.010
    inert: Sequence[str] = ()


def plain_charts(wish: Wish, over: tuple[str, float] | None = None, fan: bool = False) -> list[PlainChart]:
    """Charts at every total and temperature of a wish; `over` is an element and its total to lay over each.

    With `fan` the first is drawn and the lines' way between the two others shaded (two values: between both).

    Raises
    ------
    UsageError
        For a name that isn't known, or a fan that isn't of two or three conditions.
    """
    pairs = [(total, warmth) for total in wish.totals for warmth in wish.temperatures]
    drawn = [_plain(wish, wish.element, total, warmth) for total, warmth in pairs]
    if fan:
        if over is not None or len(drawn) not in (2, 3):
            message = f"A fan is drawn between two conditions; {len(drawn)} are given."
            raise UsageError(message, "Give two or three values, as in --total 1e-6,1e-8,1e-4 --fan, without --over.")
        return [PlainChart(drawn[0], fan=(drawn[-2], drawn[-1]))]
    if over is None:
        return [PlainChart(item) for item in drawn]
    upper = [_plain(wish, over[0], over[1], warmth, (wish.element, total)) for total, warmth in pairs]
    return [PlainChart(item, over=above) for item, above in zip(drawn, upper, strict=True)]


def _plain(wish: Wish, element: str, total: float, warmth: float, under: tuple[str, float] | None = None) -> Chart:
    """One chart of a wish; the element under it is a companion where solids share it."""
    ligands = {name: amount for name, amount in wish.ligands.items() if under is None or name != element}
    without = wish.without_names
    for name in wish.inert:
        if name not in INERT:
            message = f"'{name}' can't be taken as inert."
            raise UsageError(message, f"One of {', '.join(INERT)} is wanted.")
        if name == "sulfate" and "S" in ligands:
            ligands["S(VI)"] = ligands.pop("S")
        without = (*without, *INERT[name].get(element, ()))
    shared = wish.solids == "aged" or wish.with_names
    if under is not None and under[0] == "Fe" and shared:
        ligands = {"Fe": under[1], **ligands}
    return stability.chart(
        element, total, warmth, ionic_strength_M=wish.ionic_strength_M, ligands=ligands, solids=wish.solids,
        with_names=wish.with_names, without_names=without,
    )  # fmt: skip
