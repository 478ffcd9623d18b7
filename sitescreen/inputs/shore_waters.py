"""Seas and lakes as areas, and their shorelines, from polygons of water or of land. All in EPSG:4326."""

from typing import Any, NamedTuple

import numpy as np
import shapely
from numpy.typing import NDArray

from sitescreen.errors import InputError
from sitescreen.inputs.plot_geometry import areas_m2
from sitescreen.inputs.shore_edges import KM_PER_DEGREE
from sitescreen.notes import Note

Geometries = NDArray[np.object_]

BEYOND_KM = 60.0
"""A sea that is only known as "not land" is drawn this far beyond the terrain. [km]"""


class Waters(NamedTuple):
    """Areas and outlines before anything is cut away: the sea as one, each lake by itself.

    ``sea`` is an empty geometry without a sea. ``sea_outline`` and ``lake_outlines`` are complete outlines.
    """

    sea: Any
    sea_outline: Any
    lakes: Geometries
    lake_outlines: Geometries
    notes: tuple[Note, ...]


def dissolved(polygons: Geometries) -> Any:
    """One geometry of all polygons: the seams between neighbours are no shores."""
    return shapely.union_all(polygons) if len(polygons) else shapely.MultiPolygon()


def polygon_parts(geometry: Any) -> Geometries:
    """The polygons of a geometry."""
    parts: Geometries = np.asarray(shapely.get_parts(geometry), dtype=object)
    return np.asarray(parts[(shapely.get_type_id(parts) == 3) & ~shapely.is_empty(parts)], dtype=object)


def waters_of(polygons: Geometries, kinds: NDArray[np.object_], frame: Any, region: Any, name: str) -> Waters:
    """Seas and lakes from polygons that are sea, lake or land.

    Parameters
    ----------
    polygons : object array, shape (n,)
        Valid polygons.
    kinds : object array, shape (n,)
        "sea", "lake" or "land".
    frame : shapely geometry
        Outline of the terrain.
    region : shapely geometry
        Ground that the layer speaks of; nothing outside it is called sea for not being land.
    name : str
        The file, for messages.

    Returns
    -------
    Waters

    Raises
    ------
    InputError
        If there is land, no sea, and the land lies nowhere on the terrain.

    Notes
    -----
    Land inside a lake is an island. Land beside given sea is an island or the mainland, and is taken out of it. Other
    land without any sea leaves the sea as what is not land; a hole in it is a lake.
    """
    sea, lake_area, land = (dissolved(polygons[kinds == kind]) for kind in ("sea", "lake", "land"))
    land_parts = polygon_parts(land)
    notes: list[Note] = []
    if len(land_parts):
        filled = dissolved(_filled(polygon_parts(lake_area)))
        shapely.prepare(filled)
        island = shapely.covers(filled, land_parts) if not filled.is_empty else np.zeros(len(land_parts), dtype=bool)
        lake_area = shapely.difference(lake_area, dissolved(land_parts[island]))
        land_parts = land_parts[~island]
    if len(land_parts) and sea.is_empty:
        return _beside_land(land_parts, lake_area, frame, region, name)
    if len(land_parts):
        sea = shapely.difference(sea, dissolved(land_parts))
    lakes = polygon_parts(lake_area)
    return Waters(sea, shapely.boundary(sea), lakes, shapely.boundary(lakes), tuple(notes))


def _filled(polygons: Geometries) -> Geometries:
    return np.asarray(shapely.polygons(shapely.get_exterior_ring(polygons)), dtype=object)


def _beside_land(land_parts: Geometries, lake_area: Any, frame: Any, region: Any, name: str) -> Waters:
    """The sea as what is not land, and holes in the land as lakes."""
    if not shapely.intersects(frame, land_parts).any():
        raise InputError(
            f"the land polygons of {name} lie nowhere on the terrain",
            "land that covers the terrain is needed, since everything else is taken for sea",
            'Check the file; if it holds water, set [shore] kind = "sea" or "lake" in the brief',
        )
    filled = _filled(land_parts)
    inner = _inside_another(filled)
    holes = shapely.difference(dissolved(filled), dissolved(land_parts))
    hole_count = len(polygon_parts(holes))
    lake_area = shapely.union_all([holes, lake_area])
    outer = dissolved(filled[~inner])
    west, south, east, north = shapely.bounds(frame)
    high = BEYOND_KM / KM_PER_DEGREE
    wide = high / max(np.cos(np.radians(max(abs(south), abs(north)))), 0.1)
    around = shapely.intersection(region, shapely.box(west - wide, south - high, east + wide, north + high))
    sea = shapely.difference(around, outer)
    # inland waters that lie beside the land's outline are lakes all the same
    sea = shapely.difference(sea, lake_area)
    lakes = polygon_parts(lake_area)
    notes = [Note("info", "shore", f"{name} holds land; what is not land was taken for sea.")]
    if hole_count:
        notes.append(Note("info", "shore", f"{hole_count} closed water(s) inside that land were taken for lakes."))
    return Waters(sea, shapely.boundary(outer), lakes, shapely.boundary(lakes), tuple(notes))


def _inside_another(filled: Geometries) -> NDArray[np.bool_]:
    """Land parts that lie in a hole of another part: islands in its lakes."""
    tree = shapely.STRtree(filled)
    inner, outer = tree.query(filled, predicate="covered_by")
    inside = np.zeros(len(filled), dtype=bool)
    inside[inner[inner != outer]] = True
    return inside


def lake_widths_km(lakes: Geometries) -> NDArray[np.float64]:
    """Width of each lake: twice the radius of the largest circle that fits in.

    Parameters
    ----------
    lakes : object array of polygons, shape (n,)
        Islands are holes.

    Returns
    -------
    float64 array, shape (n,)
        [km] Measured on a map whose degrees have their true length at the lake's middle latitude: within 1 % for lakes
        up to 200 km long within 25° of the equator; the circle is found to 1 % of the lake's size.
    """
    widths = np.zeros(len(lakes))
    for row, lake in enumerate(lakes):
        _, south, _, north = shapely.bounds(lake)
        middle = np.radians((south + north) / 2.0)
        bend = 1.0 - 0.00669438 * np.sin(middle) ** 2
        scale = np.radians([6378.137 / np.sqrt(bend) * np.cos(middle), 6378.137 * (1.0 - 0.00669438) / bend**1.5])
        plane = shapely.transform(lake, lambda xy, scale=scale: xy * scale)
        size = np.sqrt(shapely.area(plane))
        if shapely.get_num_coordinates(plane) > 2000:
            plane = shapely.simplify(plane, 0.002 * size)
        widths[row] = 2.0 * shapely.length(shapely.maximum_inscribed_circle(plane, tolerance=0.01 * size))
    return widths


def areas_km2(geometry: Geometries) -> NDArray[np.float64]:
    """Area on the ellipsoid, in km²."""
    return areas_m2(geometry) / 1e6


__all__ = ["Waters", "areas_km2", "dissolved", "lake_widths_km", "polygon_parts", "waters_of"]
