"""Zone polygons: a map of climate zones that overrides what the ground says."""

from pathlib import Path
from typing import Any

from sitescreen.errors import InputError


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
    import geopandas as gpd
    from pyogrio.errors import DataSourceError

    try:
        table = gpd.read_file(path)
    except (DataSourceError, OSError) as error:
        raise InputError(
            f"the zone polygons {path.name} cannot be read",
            "a vector file of polygons is needed",
            "Check the path under [zones] polygons in the brief",
        ) from error
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
    return table[["zone", "geometry"]].to_crs("EPSG:4326")


def zone_at(zone_map: Any, lon: Any, lat: Any) -> list[str]:
    """The zone of each point, "" outside every polygon; where polygons overlap the first in the file wins."""
    import geopandas as gpd

    points = gpd.GeoDataFrame(geometry=gpd.points_from_xy(lon, lat), crs="EPSG:4326")
    joined = gpd.sjoin(points, zone_map, how="left", predicate="within")
    first = joined.sort_values("index_right", kind="stable").groupby(level=0)["zone"].first()
    return [str(zone) if isinstance(zone, str) else "" for zone in first.reindex(range(len(points)))]
