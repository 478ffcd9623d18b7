"""The ground of a plot: mended polygons, discs round points, area, width, twins. All in WGS 84."""

from typing import NamedTuple

import numpy as np
import shapely
from numpy.typing import NDArray
from pyproj import Geod

FloatArray = NDArray[np.float64]
Geometries = NDArray[np.object_]

WGS84 = Geod(ellps="WGS84")
DISC_CORNERS = 64
LEAST_AREA_M2 = 1.0
"""Outlines that enclose less are no plots but slips of the pen. [m²]"""
MOST_WIDTH_KM = 12.0
"""A plot must fit into the 12.6 km margin that its block is computed with. [km]"""
SAME_DEG = 1e-7
"""Corners closer than this are the same corner (1 cm). [°]"""

_POINT, _LINE, _RING, _POLYGON, _POINTS, _LINES, _POLYGONS, _COLLECTION = range(8)


class Ground(NamedTuple):
    """What became of each row's geometry. Arrays of shape (n,)."""

    geometry: Geometries
    """Valid polygon or multipolygon, None where there is none."""
    was_point: NDArray[np.bool_]
    centre: FloatArray
    """Longitude and latitude of a single point, NaN elsewhere; shape (n, 2). [°]"""
    outcome: NDArray[np.object_]
    remarks: NDArray[np.object_]
    """Lists of sentences."""


FAR_PARTS_KM = 0.5
"""Parts farther from their neighbours than this are said to be far apart: a breeze may differ. Our choice. [km]"""


def plot_ground(geometry: Geometries, point_radius_m: float, closed_lines: bool) -> Ground:
    """Valid polygons from whatever stood in the file, or the reason why there is none.

    Parameters
    ----------
    geometry : object array, shape (n,)
        Two-dimensional WGS 84 geometries, None where missing.
    point_radius_m : float
        Radius of the disc that stands for a point. [m]
    closed_lines : bool
        Whether a line that returns to its start is the outline of a plot (tracks walked round a site).
    """
    count = len(geometry)
    geometry = geometry.copy()
    outcome = np.full(count, "", dtype=object)
    remarks = np.empty(count, dtype=object)
    remarks[:] = [[] for _ in range(count)]

    def end(rows: NDArray[np.bool_], sentence: str) -> None:
        outcome[rows & (outcome == "")] = sentence
        geometry[rows] = None

    end(shapely.is_missing(geometry) | shapely.is_empty(geometry), "it has no geometry")
    end(_not_finite(geometry), "its coordinates are not all numbers")
    west, south, east, north = shapely.bounds(geometry).T
    with np.errstate(invalid="ignore"):
        off = (west < -180.0) | (east > 180.0) | (south < -90.0) | (north > 90.0)
    end(off, "its coordinates lie outside ±180° of longitude or ±90° of latitude")
    _unpack_collections(geometry, remarks)
    kinds = shapely.get_type_id(geometry)
    if closed_lines:
        for row in np.flatnonzero((kinds == _LINE) | (kinds == _LINES)):
            ring = _closed(geometry[row])
            if ring is not None:
                geometry[row] = ring
                remarks[row].append("a closed track was taken as its outline")
        kinds = shapely.get_type_id(geometry)
    end(np.isin(kinds, (_LINE, _RING, _LINES)), "it is a line, and a line is not a plot")
    end(np.isin(kinds, (_POLYGON, _POLYGONS)) & _spans_the_date_line(geometry), _DATE_LINE)
    was_point = np.isin(shapely.get_type_id(geometry), (_POINT, _POINTS))
    centre = _discs_for_points(geometry, point_radius_m, remarks)
    end(was_point & _spans_the_date_line(geometry), _DATE_LINE)
    _mend(geometry, remarks)
    area_m2 = areas_m2(geometry)
    end(~shapely.is_missing(geometry) & ~(area_m2 >= LEAST_AREA_M2), "its outline encloses no ground (under 1 m²)")
    width = widths_km(geometry)
    for row in np.flatnonzero(width > MOST_WIDTH_KM):
        outcome[row] = (
            f"it is {width[row]:.1f} km wide, wider than the {MOST_WIDTH_KM:g} km that one screening can look at; "
            "divide it into smaller plots"
        )
    return Ground(geometry, was_point, centre, outcome, remarks)


_DATE_LINE = "its outline spans more than half the globe: it crosses the 180° meridian or its corners are wrong"


def _not_finite(geometry: Geometries) -> NDArray[np.bool_]:
    coordinates, owner = shapely.get_coordinates(geometry, return_index=True)
    bad = np.zeros(len(geometry), dtype=bool)
    bad[owner[~np.isfinite(coordinates).all(axis=1)]] = True
    return bad


def _spans_the_date_line(geometry: Geometries) -> NDArray[np.bool_]:
    west, _, east, _ = shapely.bounds(geometry).T
    with np.errstate(invalid="ignore"):
        return np.asarray(east - west > 180.0)


def _unpack_collections(geometry: Geometries, remarks: NDArray[np.object_]) -> None:
    """Reduce collections, however nested, to their polygons; without polygons to their points; else to their lines."""
    for row in np.flatnonzero(shapely.get_type_id(geometry) == _COLLECTION):
        parts = _parts(geometry[row])
        kinds = shapely.get_type_id(parts)
        for wanted, build in (
            (_POLYGON, shapely.multipolygons),
            (_POINT, shapely.multipoints),
            (_LINE, shapely.multilinestrings),
        ):
            if (kinds == wanted).any():
                geometry[row] = build(parts[kinds == wanted])
                if wanted == _POLYGON and not (kinds == wanted).all():
                    remarks[row].append("the points and lines beside its polygons were left out")
                break
    # a multi-geometry of one part is that part
    kinds = shapely.get_type_id(geometry)
    single = np.isin(kinds, (_POINTS, _LINES, _POLYGONS)) & (shapely.get_num_geometries(geometry) == 1)
    geometry[single] = shapely.get_geometry(geometry[single], 0)


def _parts(collection: shapely.Geometry) -> Geometries:
    parts: Geometries = np.asarray(shapely.get_parts(collection), dtype=object)
    while (shapely.get_type_id(parts) >= _POINTS).any():
        parts = np.asarray(shapely.get_parts(parts), dtype=object)
    return np.asarray(parts[~shapely.is_empty(parts)], dtype=object)


def _closed(line: shapely.Geometry) -> shapely.Geometry | None:
    """The polygon inside a line that ends within 1 % of its length from where it began, else None."""
    merged = shapely.line_merge(line) if line.geom_type == "MultiLineString" else line
    if merged.geom_type != "LineString" or shapely.get_num_points(merged) < 4:
        return None
    corners = shapely.get_coordinates(merged)
    if np.hypot(*(corners[0] - corners[-1])) > 0.01 * shapely.length(merged):
        return None
    return shapely.polygons(np.vstack([corners, corners[:1]]))


def discs(lon_deg: FloatArray, lat_deg: FloatArray, radius_m: float) -> Geometries:
    """Polygons of 64 corners, each at the radius from its point along the ellipsoid.

    Parameters
    ----------
    lon_deg, lat_deg : array, shape (n,)
        WGS 84. [°]
    radius_m : float
        On the ground: no map projection's scale enters. [m]

    Returns
    -------
    object array of polygons, shape (n,)
        The area is 0.16 % below the circle's, as for every polygon of 64 corners.
    """
    turn = np.arange(DISC_CORNERS) * (360.0 / DISC_CORNERS)
    size = len(lon_deg), DISC_CORNERS
    lon, lat, _ = WGS84.fwd(
        np.repeat(lon_deg, DISC_CORNERS),
        np.repeat(lat_deg, DISC_CORNERS),
        np.tile(-turn, len(lon_deg)),  # against the clock, as exterior rings go
        np.full(len(lon_deg) * DISC_CORNERS, radius_m),
    )
    corners = np.stack([np.reshape(lon, size), np.reshape(lat, size)], axis=-1)
    return np.asarray(shapely.polygons(np.concatenate([corners, corners[:, :1]], axis=1)), dtype=object)


def _discs_for_points(geometry: Geometries, radius_m: float, remarks: NDArray[np.object_]) -> FloatArray:
    centre = np.full((len(geometry), 2), np.nan)
    kinds = shapely.get_type_id(geometry)
    single = kinds == _POINT
    if single.any():
        centre[single] = shapely.get_coordinates(geometry[single])
        geometry[single] = discs(centre[single, 0], centre[single, 1], radius_m)
    for row in np.flatnonzero(kinds == _POINTS):
        corners = shapely.get_coordinates(geometry[row])
        remarks[row].append(f"it has {len(corners)} points; each was given its disc")
        geometry[row] = shapely.union_all(discs(corners[:, 0], corners[:, 1], radius_m))
    return centre


def _mend(geometry: Geometries, remarks: NDArray[np.object_]) -> None:
    """Make polygons valid, and say so; name multi-part plots."""
    there = ~shapely.is_missing(geometry)
    for row in np.flatnonzero(there & ~shapely.is_valid(geometry)):
        mended = shapely.make_valid(geometry[row], method="structure", keep_collapsed=False)
        parts = _parts(mended)
        parts = parts[shapely.get_type_id(parts) == _POLYGON]
        if len(parts):
            remarks[row].append("its outline was not valid (it crosses or touches itself) and was mended")
        geometry[row] = parts[0] if len(parts) == 1 else shapely.multipolygons(parts)
    for row in np.flatnonzero(shapely.get_type_id(geometry) == _POLYGONS):
        number = shapely.get_num_geometries(geometry[row])
        if number > 1:
            gap_km = _widest_gap_km(_parts(geometry[row]))
            apart = f", {gap_km:.1f} km apart: the shore is measured from one of them" if gap_km >= FAR_PARTS_KM else ""
            remarks[row].append(f"it is in {number} parts, read together{apart}")


def _widest_gap_km(parts: Geometries) -> float:
    """The farthest that any part lies from the part nearest to it, on a map true to scale in the middle. [km]"""
    middle = np.radians(float(np.mean(shapely.total_bounds(parts)[[1, 3]])))
    km = np.radians(1.0) * WGS84.a / 1000.0
    flat = shapely.transform(parts, lambda degrees: degrees * np.array([km * np.cos(middle), km]))
    tree = shapely.STRtree(flat)
    _, gap = tree.query_nearest(flat, exclusive=True, return_distance=True, all_matches=False)
    return float(gap.max(initial=0.0))


def areas_m2(geometry: Geometries) -> FloatArray:
    """Area on the WGS 84 ellipsoid. [m²] NaN where there is no geometry.

    Parameters
    ----------
    geometry : object array, shape (n,)
        Polygons in longitude and latitude.

    Returns
    -------
    float64 array, shape (n,)

    Notes
    -----
    Inside geodesic edges for what is 1 km wide or more (Karney 2013, doi:10.1007/s00190-012-0578-z, as pyproj has it).
    For smaller plots, ten times faster, the plane area of the normal cylindrical equal-area map (Snyder 1987, *Map
    Projections: A Working Manual*, USGS Professional Paper 1395, equations 10-14, 10-15 and 3-12), whose areas are
    exact; its straight edges differ from geodesics by less than 5e-5 of such a plot's area.
    """
    squared = WGS84.es
    root = np.sqrt(squared)

    def equal_area(lonlat: FloatArray) -> FloatArray:
        sine = np.sin(np.radians(lonlat[:, 1]))
        q = (1.0 - squared) * (sine / (1.0 - squared * sine**2) + np.arctanh(root * sine) / root)
        return np.column_stack([WGS84.a * np.radians(lonlat[:, 0]), WGS84.a * q / 2.0])

    area: FloatArray = np.full(len(geometry), np.nan)
    width = widths_km(geometry)
    small, large = width < 1.0, width >= 1.0
    area[small] = shapely.area(shapely.transform(geometry[small], equal_area))
    for row in np.flatnonzero(large):
        area[row] = sum(_geodesic_m2(part) for part in shapely.get_parts(geometry[row]))
    return area


def _geodesic_m2(polygon: shapely.Geometry) -> float:
    rings = shapely.get_rings(polygon)
    areas = [abs(WGS84.polygon_area_perimeter(*shapely.get_coordinates(ring).T)[0]) for ring in rings]
    return float(areas[0] - sum(areas[1:])) if areas else 0.0


def widths_km(geometry: Geometries) -> FloatArray:
    """The larger side of the north-up rectangle round each geometry. [km] NaN where there is none."""
    west, south, east, north = shapely.bounds(geometry).T
    middle = np.radians((south + north) / 2.0)
    # lengths of a degree from the ellipsoid's two radii of curvature
    bend = 1.0 - WGS84.es * np.sin(middle) ** 2
    east_km = np.radians(east - west) * WGS84.a / np.sqrt(bend) * np.cos(middle) / 1000.0
    north_km = np.radians(north - south) * WGS84.a * (1.0 - WGS84.es) / bend**1.5 / 1000.0
    return np.asarray(np.maximum(east_km, north_km), dtype=np.float64)


def earlier_twin(geometry: Geometries) -> NDArray[np.int64]:
    """The first earlier row that covers the same ground, −1 where there is none.

    Parameters
    ----------
    geometry : object array, shape (n,)
        Valid polygons, None where missing.

    Returns
    -------
    int64 array, shape (n,)
        Twins have equal outlines once corners are rounded to 1e-7° and brought into one order; or outlines that lie
        nowhere more than 2e-7° apart.
    """
    twin = np.full(len(geometry), -1, dtype=np.int64)
    rows = np.flatnonzero(~shapely.is_missing(geometry))
    if len(rows) < 2:
        return twin
    rounded = shapely.normalize(shapely.transform(geometry[rows], lambda xy: np.round(xy / SAME_DEG) * SAME_DEG))
    first: dict[bytes, int] = {}
    for row, key in zip(rows.tolist(), shapely.to_wkb(rounded).tolist(), strict=True):
        twin[row] = first.setdefault(key, row)
    twin[twin == np.arange(len(geometry))] = -1
    _near_twins(geometry, rows[twin[rows] == -1], twin)
    return twin


def _near_twins(geometry: Geometries, rows: NDArray[np.int64], twin: NDArray[np.int64]) -> None:
    """Find twins that rounding has parted; the rectangles round them agree to twice the rounding."""
    from scipy.spatial import cKDTree

    pairs = cKDTree(shapely.bounds(geometry[rows])).query_pairs(2.0 * SAME_DEG, p=np.inf, output_type="ndarray")
    if len(pairs) == 0:
        return
    one, other = rows[pairs.min(axis=1)], rows[pairs.max(axis=1)]
    near = shapely.hausdorff_distance(geometry[one], geometry[other]) <= 2.0 * SAME_DEG
    for earlier, later in sorted(zip(one[near].tolist(), other[near].tolist(), strict=True)):
        if twin[later] == -1:
            twin[later] = twin[earlier] if twin[earlier] != -1 else earlier
    for row in np.flatnonzero(twin >= 0):  # the twin of a twin is the first of them
        if twin[twin[row]] >= 0:
            twin[row] = twin[twin[row]]


__all__ = ["Ground", "areas_m2", "discs", "earlier_twin", "plot_ground", "widths_km"]
