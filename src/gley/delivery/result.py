"""What a run found, complete in memory: the tables between the rooms and the charts to draw."""

from dataclasses import dataclass, field

import pandas as pd
from geopandas import GeoDataFrame

from gley.findings import Findings
from gley.settings import Settings
from gley.stability import Chart
from gley.survey import Survey


@dataclass(frozen=True)
class ChartSheet:
    """One chart of a survey: `key` names its files; `over` is laid over `chart`; `fan` are charts at a low and a high
    total; `points` has one row per sample shown; `reference` says which sample the chart is drawn at.
    """

    key: str
    title: str
    chart: Chart
    over: Chart | None
    fan: tuple[Chart, Chart] | None
    points: pd.DataFrame
    reference: str
    notes: tuple[str, ...] = ()


@dataclass(frozen=True)
class Result:
    """A run: `eh`, `evidence` and `places` have the index of `survey.samples`, `fields` a row per sample × element,
    `rivals` one per field that a sample may lie in, `couples` per measured couple, `scenarios` per assumption tried,
    `overlaps` per pair of fields of two elements laid over each other.
    """

    survey: Survey
    settings: Settings
    eh: pd.DataFrame
    fields: pd.DataFrame
    evidence: pd.DataFrame
    places: GeoDataFrame | None
    charts: tuple[ChartSheet, ...]
    findings: Findings
    elements: tuple[str, ...]
    rivals: pd.DataFrame = field(default_factory=pd.DataFrame)
    couples: pd.DataFrame = field(default_factory=pd.DataFrame)
    scenarios: pd.DataFrame = field(default_factory=pd.DataFrame)
    overlaps: pd.DataFrame = field(default_factory=pd.DataFrame)
    timing: dict[str, float] = field(default_factory=dict)
    command: str = ""
