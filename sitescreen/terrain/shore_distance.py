"""How far the nearest sea and lake shores are, and in which direction. Geometry of the map, no climate."""

from typing import Any, NamedTuple

import numpy as np
import shapely
from numpy.typing import NDArray
from pyproj import Geod, Transformer

from sitescreen.grid import Field, Grid
from sitescreen.inputs.shore import Shore
from sitescreen.lattice import convergence_deg
from sitescreen.terrain.shore_segments import Pieces, Segments, shore_segments

FloatArray = NDArray[np.float64]

WGS84 = Geod(ellps="WGS84")
SMOOTHING_M = 500.0
"""Scale over which the direction to the shore is averaged: small bends and creeks do not turn the breeze. [m]"""
STEADY_LEAST = 0.5
"""Below this mean of unit vectors a plot lies between shores that face one another: no one direction (our closure)."""
PIECE_M = 100.0
"""Length of the pieces of shoreline among which directions are looked for. [m]"""
AT_ONCE = 20_000
"""Plots whose directions are looked for at once, to bound the memory."""
NODE_CELLS = 4
"""The layer of distances is measured at every fourth cell away from the shore."""


class ShoreDistance(NamedTuple):
    """Nearest shores of points; arrays of shape (n,).

    Distances are geodesic [m], 0 in the water itself; bearings run from the point to the nearest point of the shore,
    clockwise from true north [°], NaN in that water. NaN, "" or −1 where there is no such shore.
    """

    kind: NDArray[np.object_]
    """"sea" or "lake", whichever is nearer; the sea where they are equally far."""
    water_id: NDArray[np.int64]
    distance_m: FloatArray
    bearing_deg: FloatArray
    lon: FloatArray
    """Longitude of the nearest point of the shore. [°]"""
    lat: FloatArray
    sea_distance_m: FloatArray
    sea_bearing_deg: FloatArray
    lake_distance_m: FloatArray
    lake_bearing_deg: FloatArray
    lake_width_km: FloatArray
    """Width of the nearest lake, as :attr:`Shore.waters` has it. [km]"""
    lake_water_id: NDArray[np.int64]
    in_water: NDArray[np.object_]
    """"sea", "lake" or "": the mapped water that the point itself lies in."""


class Nearest(NamedTuple):
    """Nearest points of a shoreline: distance [m], bearing from true north [°], where [°], and of which water."""

    distance_m: FloatArray
    bearing_deg: FloatArray
    lon: FloatArray
    lat: FloatArray
    water_id: NDArray[np.int64]


def nearest_shore(
    shore: Shore, lon_deg: FloatArray, lat_deg: FloatArray, crs: str, least_lake_width_km: float = 0.0
) -> ShoreDistance:
    """The nearest sea shore and the nearest lake shore of each point, from the whole shore layer.

    Parameters
    ----------
    shore : Shore
    lon_deg, lat_deg : array, shape (n,)
        WGS 84. [°]
    crs : str
        UTM system of the block, in which the nearest point is looked for.
    least_lake_width_km : float
        Narrower lakes are passed over, so that a pond cannot hide the great lake behind it. [km] Lakes of unknown
        width count.

    Returns
    -------
    ShoreDistance
        Distances to shore segments, not corners. Within the UTM zone the nearest point is found to about 0.1 % of the
        distance (the scale of the map differs that much from place to place); the length to it is exact.
    """
    lon, lat = np.asarray(lon_deg, dtype=np.float64), np.asarray(lat_deg, dtype=np.float64)
    in_water = points_in(shore, lon, lat)
    sea = nearest_on(shore_segments(shore, "sea", crs), lon, lat, crs)
    lake = nearest_on(shore_segments(shore, "lake", crs, least_lake_width_km), lon, lat, crs)
    sea, lake = _wet(sea, in_water == "sea"), _wet(lake, in_water == "lake")
    with np.errstate(invalid="ignore"):
        sea_first = ~np.isnan(sea.distance_m) & ~(lake.distance_m < sea.distance_m)
    first = Nearest(*(np.where(sea_first, one, other) for one, other in zip(sea, lake, strict=True)))
    kind = np.where(np.isnan(first.distance_m), "", np.where(sea_first, "sea", "lake")).astype(object)
    widths = dict(zip(shore.waters["water_id"].tolist(), shore.waters["width_km"].tolist(), strict=True))
    return ShoreDistance(
        kind=kind,
        water_id=first.water_id,
        distance_m=first.distance_m,
        bearing_deg=first.bearing_deg,
        lon=first.lon,
        lat=first.lat,
        sea_distance_m=sea.distance_m,
        sea_bearing_deg=sea.bearing_deg,
        lake_distance_m=lake.distance_m,
        lake_bearing_deg=lake.bearing_deg,
        lake_width_km=np.array([widths.get(water, np.nan) for water in lake.water_id.tolist()], dtype=np.float64),
        lake_water_id=lake.water_id,
        in_water=in_water,
    )


def nearest_on(segments: Segments, lon: FloatArray, lat: FloatArray, crs: str) -> Nearest:
    """Nearest point on segments in the map's plane; length and bearing to it along the ellipsoid."""
    nothing = np.full(len(lon), np.nan)
    placed = np.isfinite(lon) & np.isfinite(lat)
    if len(segments.water_id) == 0 or not placed.any():
        return Nearest(nothing, nothing, nothing, nothing, np.full(len(lon), -1, dtype=np.int64))
    if not placed.all():
        part = nearest_on(segments, lon[placed], lat[placed], crs)
        return Nearest(*(_spread(values, placed, unset) for values, unset in zip(part, _UNSET, strict=True)))
    east, north = Transformer.from_crs("EPSG:4326", crs, always_xy=True).transform(lon, lat)
    found = segments.nearest(np.column_stack([east, north]))
    back = Transformer.from_crs(crs, "EPSG:4326", always_xy=True)
    there_lon, there_lat = back.transform(found.xy[:, 0], found.xy[:, 1])
    bearing, _, distance = WGS84.inv(lon, lat, there_lon, there_lat)
    bearing = np.where(np.asarray(distance) > 0.0, np.asarray(bearing) % 360.0, np.nan)
    return Nearest(np.asarray(distance), bearing, there_lon, there_lat, segments.water_id[found.segment])


_UNSET = (np.nan, np.nan, np.nan, np.nan, -1)


def _spread(values: NDArray[Any], where: NDArray[np.bool_], unset: float) -> NDArray[Any]:
    """Values of some rows as values of all, with the others left unset."""
    out = np.full(len(where), unset, dtype=values.dtype)
    out[where] = values
    return out


def _wet(nearest: Nearest, wet: NDArray[np.bool_]) -> Nearest:
    """Distance 0 and no bearing for points in that water."""
    return nearest._replace(
        distance_m=np.where(wet, 0.0, nearest.distance_m), bearing_deg=np.where(wet, np.nan, nearest.bearing_deg)
    )


def points_in(shore: Shore, lon: FloatArray, lat: FloatArray) -> NDArray[np.object_]:
    """The mapped water that each point lies in: "sea", "lake" or ""."""
    inside = np.full(len(lon), "", dtype=object)
    if len(shore.waters) == 0:
        return inside
    points: NDArray[np.object_] = np.asarray(shapely.points(lon, lat), dtype=object)
    points[~(np.isfinite(lon) & np.isfinite(lat))] = None
    tree = shapely.STRtree(points)
    water, point = tree.query(np.asarray(shore.waters.geometry.values, dtype=object), predicate="contains")
    inside[point] = shore.waters["kind"].to_numpy(dtype=object)[water]
    return inside


class Onshore(NamedTuple):
    """Where the breeze comes from by day; arrays of shape (n,)."""

    from_deg: FloatArray
    """Bearing that the onshore breeze comes from, clockwise from true north. [°] NaN between opposite shores."""
    steadiness: FloatArray
    """Length of the mean unit vector, 0–1: 1 beside a straight coast, 0 midway between two."""


def onshore_bearing(
    shore: Shore,
    lon_deg: FloatArray,
    lat_deg: FloatArray,
    crs: str,
    kind: str,
    least_lake_width_km: float = 0.0,
    open_shores: Segments | None = None,
) -> Onshore:
    """The bearing that an onshore breeze comes from: down the slope of the smoothed distance to the shore.

    Parameters
    ----------
    shore : Shore
    lon_deg, lat_deg : array, shape (n,)
        WGS 84. [°]
    crs : str
        UTM system of the block.
    kind : str
        "sea" or "lake".
    least_lake_width_km : float
        As in :func:`nearest_shore`.
    open_shores : Segments, optional
        The shorelines of that kind that count, where not all of them do: a creek then turns nothing.

    Returns
    -------
    Onshore

    Notes
    -----
    The slope of a distance smoothed by a Gaussian of 500 m is the mean, under the same Gaussian, of the unit vectors
    that point away from the nearest shore. The mean is taken over twelve places round the plot, six each at the
    distances that halve the inner and the outer half of the Gaussian (0.76 and 1.67 times its scale). A place on the
    other side of the shoreline looks back at it, so its vector is turned round; with lines only, the sides cannot be
    told, and such places are left out if the shoreline lies between them and the plot.
    """
    lon, lat = np.asarray(lon_deg, dtype=np.float64), np.asarray(lat_deg, dtype=np.float64)
    whole = shore_segments(shore, kind, crs, least_lake_width_km)
    segments = whole if open_shores is None else open_shores
    placed = np.isfinite(lon) & np.isfinite(lat)
    if len(segments.water_id) == 0 or not placed.any():
        return Onshore(np.full(len(lon), np.nan), np.full(len(lon), np.nan))
    lon, lat = lon[placed], lat[placed]
    pieces = segments.pieces(PIECE_M)
    banks = None if open_shores is None else whole.pieces(PIECE_M)
    parts = [
        _onshore(shore, lon[at : at + AT_ONCE], lat[at : at + AT_ONCE], crs, kind, pieces, banks)
        for at in range(0, len(lon), AT_ONCE)
    ]
    joined = (np.concatenate(values) for values in zip(*parts, strict=True))
    return Onshore(*(_spread(values, placed, np.nan) for values in joined))


def _onshore(
    shore: Shore, lon: FloatArray, lat: FloatArray, crs: str, kind: str, pieces: Pieces, banks: Pieces | None
) -> Onshore:
    east, north = Transformer.from_crs("EPSG:4326", crs, always_xy=True).transform(lon, lat)
    here = np.column_stack([east, north])
    places = here + _OFFSETS_M[:, None, :]  # (places, n, 2); the first is the plot itself
    toward = (pieces.nearest(places.reshape(-1, 2)).xy).reshape(places.shape) - places
    length = np.hypot(toward[..., 0], toward[..., 1])
    used, sign = length > 0.0, np.ones(length.shape)
    wet_here = np.zeros(len(lon), dtype=bool)
    if len(shore.waters):
        back = Transformer.from_crs(crs, "EPSG:4326", always_xy=True)
        place_lon, place_lat = back.transform(places[..., 0].ravel(), places[..., 1].ravel())
        wet = (points_in(shore, place_lon, place_lat) == kind).reshape(length.shape)
        if banks is not None:
            # out in a creek is not across the open shore
            to_bank = banks.nearest(places.reshape(-1, 2)).distance_m.reshape(length.shape)
            wet &= length <= to_bank + PIECE_M
        wet_here = wet[0]
        sign[wet != wet_here] = -1.0
    else:
        looks_back = (toward * toward[0]).sum(axis=-1) < 0.0
        used &= ~(looks_back & (length + length[0] < np.hypot(*_OFFSETS_M.T)[:, None] * 1.001))
    with np.errstate(invalid="ignore", divide="ignore"):
        unit = np.where(used[..., None], sign[..., None] * toward / length[..., None], 0.0)[1:]
        total = unit.sum(axis=0)
        steadiness = np.hypot(total[:, 0], total[:, 1]) / used[1:].sum(axis=0)
    from_deg = (np.degrees(np.arctan2(total[:, 0], total[:, 1])) + convergence_deg(crs, lon, lat)) % 360.0
    return Onshore(np.where((steadiness >= STEADY_LEAST) & ~wet_here, from_deg, np.nan), steadiness)


def _offsets_m() -> FloatArray:
    """The plot itself and twelve places round it that stand for equal parts of the Gaussian; shape (13, 2). [m]."""
    offsets = [(0.0, 0.0)]
    for share, turn in ((0.25, 0.0), (0.75, 30.0)):
        radius = SMOOTHING_M * np.sqrt(-2.0 * np.log(1.0 - share))
        azimuths = np.radians(np.arange(0.0, 360.0, 60.0) + turn)
        offsets.extend(zip(radius * np.sin(azimuths), radius * np.cos(azimuths), strict=True))
    return np.array(offsets)


_OFFSETS_M = _offsets_m()


def shore_distance(
    shore: Shore, grid: Grid, kinds: tuple[str, ...] = ("sea", "lake"), open_shores: Segments | None = None
) -> Field:
    """Distance from each cell's centre to the nearest shore, for looking at; plots are measured by nearest_shore.

    Parameters
    ----------
    shore : Shore
    grid : Grid
    kinds : tuple of str
        Of "sea" and "lake", those that count.
    open_shores : Segments, optional
        The shorelines of those kinds that count, where not all of them do.

    Returns
    -------
    Field
        [km] 0 in the water. All NaN without such a shore.

    Notes
    -----
    Measured at every fourth cell and at all cells within eight cells of the shore; linear between. The whole layer
    counts, cut into pieces of one cell. Nowhere too low by more than 3 cells (a distance changes by 1 m a metre, and
    no cell is farther than 2.9 from its fourth cells), and that only along the line halfway between two shores;
    nowhere too high by more than half a cell. Lengths are the map's, within 0.1 % of those on the ground inside a UTM
    zone. A cell's value does not depend on the grid's window by more than a tenth of a cell.
    """
    segments = shore_segments(shore, kinds, grid.crs) if open_shores is None else open_shores
    values = np.full(grid.shape, np.nan)
    if len(segments.water_id):
        pieces = segments.pieces(_spacing_m(segments, grid))
        values = _between_nodes(pieces, grid)
        near = np.argwhere(values <= 2.0 * NODE_CELLS * grid.cell_size_m)
        cells = np.column_stack([grid.x_centres_m()[near[:, 1]], grid.y_centres_m()[near[:, 0]]])
        values[near[:, 0], near[:, 1]] = pieces.nearest(cells).distance_m
        water = shore.water_kind(grid)
        for kind, code in (("sea", 1), ("lake", 2)):
            if kind in kinds:
                values[water == code] = 0.0
    return Field(
        (values / 1000.0).astype(np.float32), grid, "km", f"distance to the nearest {' or '.join(kinds)} shore"
    )


def _spacing_m(segments: Segments, grid: Grid) -> FloatArray:
    """Length of pieces: a cell on the grid, more far off, where the nearest middle errs by spacing²/(8 distance)."""
    west, south, east, north = grid.bounds
    middle = (segments.start + segments.end) / 2.0
    off_x = np.maximum(np.maximum(west - middle[:, 0], middle[:, 0] - east), 0.0)
    off_y = np.maximum(np.maximum(south - middle[:, 1], middle[:, 1] - north), 0.0)
    half = np.hypot(*(segments.end - segments.start).T) / 2.0
    away = np.maximum(np.hypot(off_x, off_y) - half, 0.0)
    tenth_of_a_cell: FloatArray = np.sqrt(0.8 * grid.cell_size_m * away)
    return np.maximum(tenth_of_a_cell, grid.cell_size_m)


def _between_nodes(pieces: Pieces, grid: Grid) -> FloatArray:
    """Distances at all cells, linear between nodes that lie on the same places whatever the window is."""
    step = NODE_CELLS * grid.cell_size_m
    x, y = grid.x_centres_m(), grid.y_centres_m()
    node_x = np.arange(np.floor(x[0] / step), np.ceil(x[-1] / step) + 1.5) * step
    node_y = np.arange(np.floor(y[-1] / step), np.ceil(y[0] / step) + 1.5) * step
    nodes = np.column_stack([np.tile(node_x, len(node_y)), np.repeat(node_y, len(node_x))])
    at_node = pieces.nearest(nodes).distance_m.reshape(len(node_y), len(node_x))
    col, right = _place(x, node_x[0], step)
    row, up = _place(y, node_y[0], step)
    by_row = at_node[:, col] * (1.0 - right) + at_node[:, col + 1] * right
    return np.asarray(by_row[row] * (1.0 - up[:, None]) + by_row[row + 1] * up[:, None], dtype=np.float64)


def _place(centres: FloatArray, first: float, step: float) -> tuple[NDArray[np.int64], FloatArray]:
    """The node below each centre, and how far on the way to the next it lies."""
    at = (centres - first) / step
    below = np.floor(at).astype(np.int64)
    return below, at - below


__all__: list[Any] = ["Onshore", "ShoreDistance", "nearest_shore", "onshore_bearing", "shore_distance"]
