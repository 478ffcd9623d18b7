"""Zone polygons: a map of climate zones that overrides what the ground says."""

from pathlib import Path
from typing import Any

from sitescreen.errors import InputError
from sitescreen.inputs.vector_files import read_vector


def read_zone_map(path: Path) -> Any:
    """Polygons with a text column ``zone``.

    Parameters
    ----------
    path : Path
        Any vector file that GDAL reads.

    Returns
    -------
    GeoDataFrame, EPSG:4326
        Columns ``zone`` and ``geometry``.

    Raises
    ------
    InputError
        If the file cannot be read, has no such column or no coordinate system.
    """
    table = read_vector(path, "zone map").table
    if "zone" not in table.columns:
        raise InputError(
            f"the zone polygons {path.name} have the columns {', '.join(map(str, table.columns))}",
            "a text column called “zone” is needed",
            "Rename the column that holds the zone",
        )
    if table.crs is None:
        raise InputError(
            f"the zone polygons {path.name} do not say their coordinate system",
            "a stated coordinate system is needed",
            "Save them again with one, for instance as GeoPackage",
        )
    table = table[["zone", "geometry"]]
    told = table["zone"].map(lambda zone: isinstance(zone, str) and bool(zone.strip()))
    areas = table.geometry.geom_type.isin(("Polygon", "MultiPolygon"))
    if not (told & areas).all():
        odd = int((~(told & areas)).sum())
        raise InputError(
            f"{odd} of {len(table)} rows of the zone map {path.name} are no polygons or name no zone",
            "polygons whose column “zone” holds a zone's name are needed",
            "Complete or remove those rows",
        )
    return table.to_crs("EPSG:4326")


def zone_at(zone_map: Any, lon: Any, lat: Any) -> list[str]:
    """The zone of each point, "" outside every polygon; where polygons overlap the first in the file wins."""
    import geopandas as gpd

    points = gpd.GeoDataFrame(geometry=gpd.points_from_xy(lon, lat), crs="EPSG:4326")
    joined = gpd.sjoin(points, zone_map, how="left", predicate="within")
    first = joined.sort_values("index_right", kind="stable").groupby(level=0)["zone"].first()
    return [str(zone) if isinstance(zone, str) else "" for zone in first.reindex(range(len(points)))]
