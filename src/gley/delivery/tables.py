"""The tables of a run as frames: one row per sample, one per sample and element, one per finding, one per line."""

import numpy as np
import pandas as pd

from gley.delivery.result import Result
from gley.findings import Findings
from gley.stability import Chart

_FIRST = ("sample", "station", "date", "time", "round", "sample_type")
_MEASURED = (
    "pH",
    "pH_where",
    "temperature_C",
    "SC_uS_cm",
    "EC_uS_cm",
    "O2_percent",
    "depth_cm",
    "depth_top_m",
    "depth_bottom_m",
)
# left out where no sample has one
_WHERE_MEASURED = (
    "EC_uS_cm", "O2_percent", "depth_cm", "depth_top_m", "depth_bottom_m", "ORP_replicates", "ORP_spread_mV",
)  # fmt: skip
_POTENTIAL = (
    "ORP_mV", "ORP_replicates", "ORP_spread_mV", "electrode_used", "reference_mV", "check_offset_mV",
    "Eh_mV", "Eh_sd_mV", "Eh_sd_own_mV", "Eh_sd_common_mV", "pe", "temperature_used_C", "temperature_basis",
    "Eh_basis", "Eh_status",
)  # fmt: skip
_SHORT = ("sample", "station", "date", "round", "pH", "temperature_C", "ORP_mV", "Eh_mV", "Eh_sd_mV", "pe")
_WGS84 = "EPSG:4326"


def sample_table(result: Result) -> pd.DataFrame:
    """One row per delivered sample row: measured values, Eh in full and how, redox process, fields, values as reported,
    mol/L, coordinates.
    """
    samples, eh = result.survey.samples, result.eh
    beside = samples.drop(columns=[name for name in samples if name in eh.columns])
    whole = pd.concat([beside, eh], axis=1)
    whole = whole.drop(columns=[name for name in _WHERE_MEASURED if name in whole and whole[name].isna().all()])
    table = whole[[name for name in (*_FIRST, *_MEASURED, *_POTENTIAL) if name in whole]].copy()
    table["date"] = _dates(table["date"])
    parts = [
        table,
        result.evidence,
        _field_columns(result),
        result.survey.reported,
        _amounts(result),
        _coordinates(result),
    ]
    joined = pd.concat([part for part in parts if part.shape[1]], axis=1)
    joined["remarks"] = samples["remarks"]
    return joined


def printed(table: pd.DataFrame) -> pd.DataFrame:
    """A sample table as a report shows it: Eh to 10 mV, the rest to the digits that a field reading has."""
    shown = table.copy()
    rules = {"Eh_mV": -1, "reference_mV": 0, "check_offset_mV": 0, "Eh_sd_mV": 0, "pe": 1, "pH": 2, "temperature_C": 1}
    rules |= {"Eh_sd_own_mV": 0, "Eh_sd_common_mV": 0, "temperature_used_C": 1, "ORP_mV": 0, "ORP_spread_mV": 0}
    for name, digits in rules.items():
        if name in shown:
            shown[name] = shown[name].round(digits)
    return shown


def short_table(result: Result) -> pd.DataFrame:
    """The sample table of the report: the columns that are read, rounded, empty ones left out."""
    table = printed(sample_table(result))
    wanted = [*_SHORT, "redox_category", "redox_process", *[f"field_{element}" for element in result.elements]]
    return table[[name for name in wanted if name in table and table[name].replace("", np.nan).notna().any()]]


def _dates(column: pd.Series) -> pd.Series:
    return column.dt.strftime("%Y-%m-%d").fillna("")


def _field_columns(result: Result) -> pd.DataFrame:
    """The field of each element beside its sample, the outcome in words behind it."""
    made = {}
    for element in result.elements:
        own = result.fields[result.fields["element"] == element]
        made[f"field_{element}"] = own["field"].to_numpy()
        made[f"outcome_{element}"] = own["outcome"].to_numpy()
    return pd.DataFrame(made, index=result.survey.samples.index)


def _amounts(result: Result) -> pd.DataFrame:
    amounts = result.survey.amounts
    return amounts[[name for name in amounts if not str(name).endswith("_limit")]]


def _coordinates(result: Result) -> pd.DataFrame:
    """Coordinates in the survey's system and in WGS 84 degrees."""
    index = result.survey.samples.index
    if result.places is None:
        return pd.DataFrame(index=index)
    degrees = result.places.to_crs(_WGS84).geometry
    points = result.places.geometry
    code = result.places.crs.to_string()
    there = points.notna() & ~points.is_empty
    return pd.DataFrame(
        {
            "x": points.x.where(there),
            "y": points.y.where(there),
            "crs": np.where(there, code, ""),
            "longitude_deg": degrees.x.where(there),
            "latitude_deg": degrees.y.where(there),
        },
        index=index,
    )


def finding_table(findings: Findings) -> pd.DataFrame:
    """One row per finding, errors first."""
    names = ["severity", "rule", "file", "sheet", "cell", "sample", "value", "message", "cure"]
    rows = [item.as_dict() for severity in ("error", "warning", "note") for item in findings.of(severity)]
    return pd.DataFrame(rows, columns=names)


def boundary_table(chart: Chart) -> pd.DataFrame:
    """One row per line of a chart; `points` as `pH E_V` pairs separated by semicolons."""
    rows = []
    for line in chart.boundaries:
        record = line.as_dict()
        record["left"], record["right"] = record.pop("between")
        record["points"] = "; ".join(f"{pH:.6g} {E:.6g}" for pH, E in record["points"])
        rows.append(record)
    first = ["left", "right", "kind", "reaction", "protons", "electrons", "slope_mV_per_pH", "E_mV_at_pH0", "pH"]
    return pd.DataFrame(rows, columns=[*first, "ligand_forms", "points"])
