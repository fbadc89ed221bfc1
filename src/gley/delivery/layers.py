"""GIS layers of a run in one GeoPackage, in the reference system of the places."""

from pathlib import Path

import geopandas
import pandas as pd
import pyogrio

_CLOCK = "OGR_CURRENT_DATE"


def write_layers(
    places: geopandas.GeoDataFrame, samples: pd.DataFrame, fields: pd.DataFrame, path: Path, made: str
) -> None:
    """Write the layers `samples` (a point per sample row) and `fields` (one per sample and element).

    Parameters
    ----------
    places : GeoDataFrame
        `sample` and points of all samples; a row without a place keeps an empty geometry.
    samples, fields : DataFrame
        Attributes, told apart by their column `sample`.
    path : Path
        The .gpkg file.
    made : str
        Time noted in the file, `2031-04-28T10:00:00Z`.
    """
    before = pyogrio.get_gdal_config_option(_CLOCK)
    # the container notes when it was changed: the same moment as the stamp
    pyogrio.set_gdal_config_options({_CLOCK: made.replace("Z", ".000Z")})
    try:
        by_name = dict(zip(places["sample"], places.geometry, strict=True))
        for name, frame in (("samples", samples), ("fields", fields)):
            if len(frame):
                points = [by_name[sample] for sample in frame["sample"]]
                layer = geopandas.GeoDataFrame(frame.copy(), geometry=points, crs=places.crs)
                layer.to_file(path, layer=name, driver="GPKG", engine="pyogrio", geometry_type="Point")
    finally:
        pyogrio.set_gdal_config_options({_CLOCK: before})
