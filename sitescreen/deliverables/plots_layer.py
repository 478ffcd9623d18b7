"""``plots.gpkg``: the plots' shapes with the same columns as the ranking."""

from collections.abc import Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any

from sitescreen.deliverables.columns import Column
from sitescreen.deliverables.table import rows_of, value_of

if TYPE_CHECKING:
    import geopandas as gpd

_POLYGONS = {"Polygon", "MultiPolygon"}


def write_plots(
    table: "gpd.GeoDataFrame", columns: Sequence[Column], path: Path, patches: "gpd.GeoDataFrame | None" = None
) -> None:
    """Write the plots as a layer called “plots”, and their best squares as “best_patches”, in WGS 84.

    Parameters
    ----------
    table : GeoDataFrame, EPSG:4326
        One row a plot; a plot without a usable shape keeps its row.
    columns : sequence of Column
    path : Path
    patches : GeoDataFrame, EPSG:4326, optional
        The best square inside each plot that has room for one; no layer if there are none.
    """
    from io import BytesIO

    import geopandas as gpd
    import pandas as pd
    import pyogrio

    rows = [[value_of(c, v) for c, v in zip(columns, row, strict=True)] for row in rows_of(table, columns)]
    data: dict[str, Any] = {}
    for i, column in enumerate(columns):
        data[column.name] = pd.array([row[i] for row in rows], dtype=_dtype(column))
    plots = gpd.GeoDataFrame(data, geometry=table.geometry.array, crs="EPSG:4326")
    kinds = set(plots.geom_type.dropna())
    same = {"promote_to_multi": True} if kinds <= _POLYGONS else {"geometry_type": "Unknown"}
    # the file would otherwise hold the hour of the run
    pyogrio.set_gdal_config_options({"OGR_CURRENT_DATE": "1980-01-01T00:00:00.000Z"})
    made = BytesIO()  # in memory, so that a full disk is met in Python, which says so
    try:
        pyogrio.write_dataframe(plots, made, layer="plots", driver="GPKG", **same)
        if patches is not None and len(patches):
            # a second layer cannot be added to a file in memory, so the first goes by way of the disk
            path.write_bytes(made.getvalue())
            pyogrio.write_dataframe(patches, path, layer="best_patches", driver="GPKG", append=True)
            made = BytesIO(path.read_bytes())
    finally:
        pyogrio.set_gdal_config_options({"OGR_CURRENT_DATE": None})
    path.write_bytes(made.getvalue())


def _dtype(column: Column) -> str:
    return {"text": "object", "whole": "Int64", "number": "float64"}[column.kind]
