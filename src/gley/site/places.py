"""A place for every sample: its own coordinates or its station's, in one stated reference system."""

import geopandas
import numpy as np
import pandas as pd
from pyproj import CRS
from pyproj.exceptions import CRSError

from gley.errors import UsageError
from gley.findings import Findings
from gley.settings import Settings
from gley.survey import of_station

NONE = "none"
_DEGREES = "EPSG:4326"


def places(survey, settings: Settings, findings: Findings) -> geopandas.GeoDataFrame | None:
    """Points of all samples.

    Parameters
    ----------
    survey : Survey
        Tables `samples` and `stations`, `facts`.
    settings : Settings
        `survey.crs`: a code, or `none` for no places at all.
    findings : Findings
        Added to: assumed degrees, samples without a place, coordinates outside the system's area of use.

    Returns
    -------
    GeoDataFrame or None
        Index as the samples: `sample`, `station` and the point (empty where unknown); None without coordinates, or when
        the settings want none.

    Raises
    ------
    UsageError
        When coordinates are there, aren't plainly degrees and no reference system is named, or its code is unknown.
    """
    if settings.survey.crs.lower() == NONE:
        return None
    table = _coordinates(survey)
    if table[["x", "y"]].isna().all(axis=None):
        findings.add("site.no_coordinates")
        return None
    code = _code(survey, settings, table, findings)
    crs = _crs(code)
    xy = table[["x", "y"]].to_numpy(float)
    missing = np.isnan(xy).any(axis=1)
    points = geopandas.points_from_xy(xy[:, 0], xy[:, 1])
    geometry = geopandas.GeoSeries(points, index=table.index, crs=crs)
    geometry[missing] = None
    frame = geopandas.GeoDataFrame(survey.samples[["sample", "station"]].copy(), geometry=geometry, crs=crs)
    _say_missing(frame, missing, findings)
    _say_outside(frame, ~missing, crs, findings)
    return frame


def _coordinates(survey) -> pd.DataFrame:
    """x, y of each sample, whether they are degrees, and the reference system written beside them."""
    own, stations = survey.samples, survey.stations
    columns = {}
    for name in ("x_m", "y_m", "longitude_deg", "latitude_deg"):
        columns[name] = own[name].fillna(of_station(own, stations, name)).to_numpy(float)
    projected = ~np.isnan(columns["x_m"]) & ~np.isnan(columns["y_m"])
    at_station = of_station(own, stations, "crs")
    crs = np.array([mine or its for mine, its in zip(own["crs"], at_station, strict=True)], object)
    return pd.DataFrame(
        {
            "x": np.where(projected, columns["x_m"], columns["longitude_deg"]),
            "y": np.where(projected, columns["y_m"], columns["latitude_deg"]),
            "degrees": ~projected & ~np.isnan(columns["longitude_deg"]) & ~np.isnan(columns["latitude_deg"]),
            "crs": crs,
        },
        index=own.index,
    )


def _code(survey, settings: Settings, table: pd.DataFrame, findings: Findings) -> str:
    """The reference system: settings, else written in the tables, else in the facts; degrees alone need none."""
    here = table[table["x"].notna()]
    written = list(dict.fromkeys(code for code in here["crs"] if code))
    if len(written) > 1:
        message = f"The survey names several reference systems: {', '.join(written)}."
        raise UsageError(message, "Bring all coordinates into one, or give --crs none.")
    code = settings.survey.crs or (written[0] if written else "") or survey.facts.get("crs", "")
    if here["degrees"].all():
        if not code:
            findings.add("site.degrees_assumed", value=_DEGREES)
            return _DEGREES
        if not _crs(code).is_geographic:
            findings.add("site.degrees_not_projected", value=code, used=_DEGREES)
            return _DEGREES
        return code
    if here["degrees"].any():
        message = "Some samples have projected coordinates, others only latitude and longitude."
        raise UsageError(message, "Give all in one kind, or --crs none.")
    if not code:
        x, y = here["x"].iloc[0], here["y"].iloc[0]
        message = f"Coordinates such as {x:g}, {y:g} have no reference system."
        raise UsageError(
            message, "Name it with --crs, e.g. --crs EPSG:25832, or --crs none for no maps and GIS layers."
        )
    return code


def _crs(code: str) -> CRS:
    text = f"EPSG:{code.strip()}" if code.strip().isdigit() else code.strip()
    try:
        return CRS.from_user_input(text)
    except CRSError:
        message = f"'{code}' isn't a coordinate reference system."
        raise UsageError(message, "Give a code such as EPSG:25832 with --crs, or --crs none.") from None


def _say_missing(frame: geopandas.GeoDataFrame, missing: np.ndarray, findings: Findings) -> None:
    names = list(frame.loc[missing, "sample"])
    if names:
        shown = ", ".join(names[:6]) + (" …" if len(names) > 6 else "")
        findings.add("site.no_place", value=len(names), samples=shown)


def _say_outside(frame: geopandas.GeoDataFrame, there: np.ndarray, crs: CRS, findings: Findings) -> None:
    """Coordinates that can't belong to their system: outside its area of use, as swapped columns often are."""
    area = crs.area_of_use
    if area is None:
        return
    degrees = frame.loc[there].to_crs(_DEGREES).geometry
    inside = degrees.x.between(area.west - 2, area.east + 2) & degrees.y.between(area.south - 2, area.north + 2)
    swapped = geopandas.GeoSeries(
        geopandas.points_from_xy(frame.loc[there].geometry.y, frame.loc[there].geometry.x), crs=crs
    ).to_crs(_DEGREES)
    fits = swapped.x.between(area.west, area.east) & swapped.y.between(area.south, area.north)
    for (_, row), ok, other in zip(frame.loc[there].iterrows(), inside, fits, strict=True):
        if not ok:
            hint = "exchanged, they would lie inside" if other else "they lie far outside"
            text = f"{row.geometry.x:g}, {row.geometry.y:g}"
            findings.add("site.outside_area", value=text, sample=row["sample"], crs=crs.to_string(), hint=hint)
