"""A place for every sample: its own coordinates or its station's, in one stated reference system."""

import geopandas
import numpy as np
import pandas as pd
from pyproj import CRS
from pyproj.exceptions import CRSError

from gley.errors import UsageError
from gley.findings import Findings, Place, some
from gley.settings import Settings
from gley.survey import of_station

NONE = "none"
_DEGREES = "EPSG:4326"
_PAIRS = (("x_m", "y_m"), ("longitude_deg", "latitude_deg"))
_AREA_MARGIN_DEG = 2.0
"""How far beyond its area of use a system may be stretched, as at the edge of a zone."""

_FAR = 100.0
"""Times the usual distance between samples, from which one with exchanged coordinates stands out."""


def places(survey, settings: Settings, findings: Findings) -> geopandas.GeoDataFrame | None:
    """Points of all samples.

    Parameters
    ----------
    survey : Survey
        Tables `samples` and `stations`, `facts`.
    settings : Settings
        `survey.crs`: a code, or `none` for no places at all.
    findings : Findings
        Added to: assumed or converted degrees, samples without a place, coordinates that can't be right.

    Returns
    -------
    GeoDataFrame or None
        Index as the samples: `sample`, `station` and the point (empty where unknown); None without coordinates, or when
        the settings or the file want none.

    Raises
    ------
    UsageError
        When coordinates are there, aren't plainly degrees and no reference system is named, or its code is unknown, or
        isn't one of maps, or is one of degrees while the coordinates aren't.
    """
    if settings.survey.crs.strip().lower() == NONE:
        return None
    table = _coordinates(survey)
    if table["x"].isna().all():
        findings.add("site.no_coordinates")
        return None
    code = _code(survey, settings, table, findings)
    if code.lower() == NONE:
        return None
    crs = _crs(code)
    geometry = _points(table, crs, findings)
    frame = geopandas.GeoDataFrame(survey.samples[["sample", "station"]].copy(), geometry=geometry, crs=crs)
    missing = table["x"].isna().to_numpy()
    _say_missing(frame, missing, findings)
    outside = _say_outside(frame, ~missing, crs, findings)
    _say_exchanged(frame, ~missing & ~outside, findings)
    return frame


def _coordinates(survey) -> pd.DataFrame:
    """x, y of each sample, whether they are degrees, and the reference system written beside them.

    A pair is taken whole, from one row: the sample's own first, else its station's; projected before degrees.
    """
    own, stations = survey.samples, survey.stations
    rows = len(own)
    x, y, degrees, crs = np.full(rows, np.nan), np.full(rows, np.nan), np.zeros(rows, bool), np.full(rows, "", object)
    at_station = {name: of_station(own, stations, name) for name in (*_PAIRS[0], *_PAIRS[1], "crs")}
    own_crs = own["crs"].fillna("").to_numpy(object)
    station_crs = at_station["crs"].fillna("").to_numpy(object)
    for source, codes in ((own, own_crs), (at_station, np.where(station_crs != "", station_crs, own_crs))):
        for first, second in _PAIRS:
            across, up = source[first].to_numpy(float), source[second].to_numpy(float)
            take = np.isnan(x) & ~np.isnan(across) & ~np.isnan(up)
            x[take], y[take], degrees[take] = across[take], up[take], first == "longitude_deg"
            crs[take] = np.where(codes == "", station_crs, codes)[take]
    return pd.DataFrame({"x": x, "y": y, "degrees": degrees, "crs": crs}, index=own.index)


def _code(survey, settings: Settings, table: pd.DataFrame, findings: Findings) -> str:
    """The reference system: settings, else written in the tables, else in the facts; degrees alone need none."""
    here = table[table["x"].notna()]
    written = list(dict.fromkeys(code.strip() for code in here["crs"] if code.strip()))
    wanted = settings.survey.crs.strip()
    if len(written) > 1:
        message = f"The survey names several reference systems: {', '.join(written)}."
        raise UsageError(message, "Bring all coordinates into one, or give --crs none.")
    declared = (written[0] if written else "") or survey.facts.get("crs", "").strip()
    code = wanted or declared
    if wanted and declared and not _same(declared, wanted):
        findings.add("site.crs_differs", value=wanted, declared=declared)
    if here["degrees"].all():
        if not code:
            findings.add("site.degrees_assumed", value=_DEGREES)
            return _DEGREES
        if code.lower() != NONE and not _crs(code).is_geographic:
            findings.add("site.degrees_not_projected", value=code, used=_DEGREES)
            return _DEGREES
        return code
    if not code:
        x, y = here.loc[~here["degrees"], ["x", "y"]].iloc[0]
        message = f"Coordinates such as {x:.10g}, {y:.10g} have no reference system."
        raise UsageError(
            message, "Name it with --crs, e.g. --crs EPSG:25832, or --crs none for no maps and GIS layers."
        )
    return code


def _same(declared: str, wanted: str) -> bool:
    """Whether the survey's own code means the system that is taken; one that can't be read doesn't."""
    try:
        return _crs(declared) == _crs(wanted)
    except UsageError:
        _crs(wanted)
        return False


def _crs(code: str) -> CRS:
    text = f"EPSG:{code.strip()}" if code.strip().isdigit() else code.strip()
    try:
        crs = CRS.from_user_input(text)
    except CRSError:
        message = f"'{code}' isn't a coordinate reference system."
        raise UsageError(message, "Give a code such as EPSG:25832 with --crs, or --crs none.") from None
    if not (crs.is_projected or crs.is_geographic):
        message = f"'{code}' ({crs.name}) isn't a system of eastings and northings or of degrees."
        raise UsageError(message, "Give that of the map, such as EPSG:25832, with --crs, or --crs none.")
    return crs


def _points(table: pd.DataFrame, crs: CRS, findings: Findings) -> geopandas.GeoSeries:
    """Points in the reference system; degrees beside projected coordinates are converted, and said."""
    x, y = table["x"].to_numpy(float), table["y"].to_numpy(float)
    geometry = geopandas.GeoSeries(geopandas.points_from_xy(x, y), index=table.index, crs=crs)
    degrees = table["degrees"].to_numpy(bool)
    if degrees.any() and crs.is_projected:
        given = geopandas.GeoSeries(geopandas.points_from_xy(x[degrees], y[degrees]), crs=_DEGREES)
        geometry[degrees] = given.to_crs(crs).to_numpy()
        findings.add("site.degrees_converted", value=int(degrees.sum()), given=_DEGREES, crs=crs.to_string())
    elif crs.is_geographic and (np.nanmax(np.abs(x)) > 360 or np.nanmax(np.abs(y)) > 360):
        k = int(np.nanargmax(np.fmax(np.abs(x), np.abs(y))))
        message = f"Coordinates such as {x[k]:.10g}, {y[k]:.10g} aren't degrees, as {crs.to_string()} wants them."
        raise UsageError(message, "Name the system of the eastings and northings with --crs, or give --crs none.")
    geometry[np.isnan(x)] = None
    return geometry


def _names(frame: geopandas.GeoDataFrame, where: np.ndarray) -> str:
    return some(frame.loc[where, "sample"])


def _one(frame: geopandas.GeoDataFrame, where: np.ndarray) -> Place:
    """The place of a finding that concerns a single sample."""
    return Place(sample=str(frame.loc[where, "sample"].iloc[0])) if where.sum() == 1 else Place()


def _say_missing(frame: geopandas.GeoDataFrame, missing: np.ndarray, findings: Findings) -> None:
    if missing.any():
        findings.add("site.no_place", _one(frame, missing), int(missing.sum()), samples=_names(frame, missing))


def _say_outside(frame: geopandas.GeoDataFrame, there: np.ndarray, crs: CRS, findings: Findings) -> np.ndarray:
    """Coordinates that can't belong to their system: outside its area of use, as exchanged columns often are."""
    outside = np.zeros(len(frame), bool)
    area = crs.area_of_use
    if area is None:
        return outside
    found = frame.loc[there].geometry
    inside = _within(found.to_crs(_DEGREES), area, _AREA_MARGIN_DEG)
    exchanged = geopandas.GeoSeries(geopandas.points_from_xy(found.y, found.x), crs=crs)
    fits = _within(exchanged.to_crs(_DEGREES), area, 0.0)
    outside[there] = ~inside
    swapped = np.zeros(len(frame), bool)
    swapped[there] = ~inside & fits
    for where, hint in (
        (swapped, "exchanged, they would lie inside"),
        (outside & ~swapped, "they lie far outside"),
    ):
        if where.any():
            _say(frame, where, findings, "site.outside_area", crs=crs.to_string(), hint=hint)
    return outside


def _within(points: geopandas.GeoSeries, area, margin: float) -> np.ndarray:
    """Which points (degrees) lie in an area of use; one that spans the date line has its west east of its east."""
    x, y = points.x.to_numpy(), points.y.to_numpy()
    west, east = area.west - margin, area.east + margin
    across = (x >= west) & (x <= east) if area.west <= area.east else (x >= west) | (x <= east)
    return across & (y >= area.south - margin) & (y <= area.north + margin)


def _say_exchanged(frame: geopandas.GeoDataFrame, there: np.ndarray, findings: Findings) -> None:
    """Samples that lie far from all others, and among them with their two coordinates exchanged."""
    points = frame.loc[there].geometry
    if len(points) < 3:
        return
    x, y = points.x.to_numpy(), points.y.to_numpy()
    middle_x, middle_y = np.median(x), np.median(y)
    off = np.hypot(x - middle_x, y - middle_y)
    off_exchanged = np.hypot(y - middle_x, x - middle_y)
    where = np.zeros(len(frame), bool)
    where[there] = (off > _FAR * np.median(off)) & (off_exchanged < off / _FAR)
    if where.any():
        _say(frame, where, findings, "site.exchanged")


def _say(frame: geopandas.GeoDataFrame, where: np.ndarray, findings: Findings, rule: str, **words: str) -> None:
    """One finding for all samples that it concerns, with the first one's coordinates."""
    first = frame.loc[where].geometry.iloc[0]
    text = f"{first.x:.10g}, {first.y:.10g}"
    findings.add(rule, _one(frame, where), text, count=int(where.sum()), samples=_names(frame, where), **words)
