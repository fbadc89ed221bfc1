"""The tables of a run as frames: one row per sample, one per sample and element, one per finding, one per line."""

import numpy as np
import pandas as pd

from gley.columns import columns
from gley.delivery.result import Result
from gley.findings import Findings
from gley.stability import Chart
from gley.survey import Survey, of_station

_COLUMNS = (
    "sample", "station", "date", "time", "round", "sample_type", "duplicate_of", "pH", "pH_where", "pH_lab",
    "temperature_C", "SC_uS_cm", "EC_uS_cm", "O2_percent", "turbidity_NTU", "water_level_m", "depth_cm", "depth_top_m",
    "depth_bottom_m", "ORP_mV", "ORP_replicates", "ORP_spread_mV", "Eh_given_mV", "probe", "electrode_used",
    "reference_mV", "check_offset_mV", "Eh_platinum_mV", "Eh_mV", "Eh_sd_mV", "Eh_sd_own_mV", "Eh_sd_common_mV", "pe",
    "temperature_used_C", "temperature_basis", "Eh_basis", "Eh_status",
)  # fmt: skip
_WHERE_DELIVERED = (
    "duplicate_of", "pH_lab", "EC_uS_cm", "O2_percent", "turbidity_NTU", "water_level_m", "depth_cm", "depth_top_m",
    "depth_bottom_m", "ORP_replicates", "ORP_spread_mV", "Eh_given_mV", "probe", "Eh_platinum_mV",
)  # fmt: skip
"""Left out where no sample has one."""

_DIGITS = {
    "Eh_mV": -1, "Eh_platinum_mV": -1, "reference_mV": 0, "check_offset_mV": 0, "Eh_sd_mV": 0, "Eh_sd_own_mV": 0,
    "Eh_sd_common_mV": 0, "ORP_mV": 0, "ORP_spread_mV": 0, "pe": 1, "pH": 2, "temperature_C": 1,
    "temperature_used_C": 1,
}  # fmt: skip
_SHORT = ("sample", "station", "date", "round", "pH", "temperature_C", "ORP_mV", "Eh_mV", "Eh_sd_mV", "pe")
_WGS84 = "EPSG:4326"


def sample_table(result: Result) -> pd.DataFrame:
    """One row per delivered sample row: measured values, Eh in full and how, redox process, fields, values as reported,
    mol/L, coordinates, remarks.
    """
    samples, eh = result.survey.samples, result.eh
    whole = pd.concat([samples.drop(columns=[name for name in samples if name in eh.columns]), eh], axis=1)
    empty = [name for name in _WHERE_DELIVERED if name in whole and whole[name].replace("", np.nan).isna().all()]
    table = whole[[name for name in _COLUMNS if name in whole and name not in empty]].copy()
    table["date"] = table["date"].dt.strftime("%Y-%m-%d").fillna("")
    parts = [
        table,
        result.evidence,
        _field_columns(result),
        result.survey.reported,
        _amounts(result),
        _coordinates(result),
        samples[["remarks"]],
    ]
    return pd.concat([part for part in parts if part.shape[1]], axis=1)


def field_table(result: Result) -> pd.DataFrame:
    """One row per sample and element: the columns of the vocabulary in its order, others behind."""
    first = [name for name in ("sample", "element", *columns("fields")) if name in result.fields]
    return result.fields[[*first, *[name for name in result.fields if name not in first]]]


def evidence_table(table: pd.DataFrame, name: str) -> pd.DataFrame:
    """A table of rivals, couples, scenarios or overlaps: sample and element if any, then the vocabulary's."""
    order = [column for column in ("sample", "element") if column in table]
    return table.reindex(columns=[*order, *columns(name)])


def by_sample(result: Result, element: str, column: str) -> np.ndarray:
    """A column of the fields of one element in the order of the samples; empty where it wasn't assigned."""
    own = result.fields[result.fields["element"] == element].set_index("sample")[column]
    return own.reindex(result.survey.samples["sample"]).fillna("").to_numpy(object)


def printed(table: pd.DataFrame) -> pd.DataFrame:
    """A sample table as a report shows it: Eh to 10 mV, the rest to the digits that a field reading has."""
    shown = table.copy()
    for name, digits in _DIGITS.items():
        if name in shown:
            shown[name] = shown[name].round(digits) + 0.0  # no negative zero
    return shown


def short_table(result: Result) -> pd.DataFrame:
    """The sample table of the report: the columns that are read, rounded, empty ones left out."""
    table = printed(sample_table(result))
    wanted = [*_SHORT, "redox_process", *[f"field_{element}" for element in result.elements]]
    return table[[name for name in wanted if name in table and table[name].replace("", np.nan).notna().any()]]


def _field_columns(result: Result) -> pd.DataFrame:
    """The field of each element beside its sample, the outcome in words behind it."""
    made = {}
    for element in result.elements:
        made[f"field_{element}"] = by_sample(result, element, "field")
        made[f"outcome_{element}"] = by_sample(result, element, "outcome")
    return pd.DataFrame(made, index=result.survey.samples.index)


def _amounts(result: Result) -> pd.DataFrame:
    amounts = result.survey.amounts
    return amounts[[name for name in amounts if not str(name).endswith("_limit")]]


def _coordinates(result: Result) -> pd.DataFrame:
    """Coordinates in the reference system of the places and in WGS 84 degrees; without places as delivered.

    A system in feet has `x_ft`, `y_ft`; one of degrees leaves `x_m`, `y_m` as delivered.
    """
    given = _delivered(result.survey)
    if result.places is None:
        return given
    points = result.places.geometry
    there = (points.notna() & ~points.is_empty).to_numpy()
    degrees = result.places.to_crs(_WGS84).geometry
    made = {name: given[name].to_numpy() for name in ("x_m", "y_m")}
    if result.places.crs.is_projected:
        unit = "ft" if "foot" in result.places.crs.axis_info[0].unit_name else "m"
        made = {f"x_{unit}": points.x.where(there), f"y_{unit}": points.y.where(there)}
    made["crs"] = np.where(there, result.places.crs.to_string(), "")
    made["longitude_deg"], made["latitude_deg"] = degrees.x.where(there), degrees.y.where(there)
    # a point outside what its system can hold has no degrees
    return pd.DataFrame(made, index=given.index).replace([np.inf, -np.inf], np.nan)


def _delivered(survey: Survey) -> pd.DataFrame:
    """Coordinates as the survey gives them, of the sample or else of its station."""
    made = {}
    for name in ("x_m", "y_m", "crs", "longitude_deg", "latitude_deg"):
        own = survey.samples[name]
        at_station = of_station(survey.samples, survey.stations, name)
        made[name] = own.where(own.notna() & (own != ""), at_station)
    return pd.DataFrame(made, index=survey.samples.index)


def finding_table(findings: Findings) -> pd.DataFrame:
    """One row per finding, errors first."""
    names = ["severity", "rule", "file", "sheet", "cell", "sample", "value", "message", "cure"]
    rows = [item.as_dict() for severity in ("error", "warning", "note") for item in findings.of(severity)]
    return pd.DataFrame(rows, columns=names)


def boundary_table(chart: Chart) -> pd.DataFrame:
    """One row per line of a chart; `points` as `pH E_V` pairs separated by semicolons."""
    rows = []
    for line in chart.boundaries:
        record = {"element": chart.element, **line.as_dict()}
        record["left"], record["right"] = record.pop("between")
        record["points"] = "; ".join(f"{pH:.6g} {E:.6g}" for pH, E in record["points"])
        rows.append(record)
    first = ["element", "left", "right", "kind", "reaction", "protons", "electrons"]
    return pd.DataFrame(rows, columns=[*first, "slope_mV_per_pH", "E_mV_at_pH0", "pH", "ligand_forms", "points"])
