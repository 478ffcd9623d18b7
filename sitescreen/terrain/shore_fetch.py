"""Which shores look out on open water: a creek is not the sea, and a pond no lake. Geometry of the map, no climate."""

from collections.abc import Callable
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray
from pyproj import Transformer

from sitescreen.grid import Bounds
from sitescreen.inputs.shore import Shore
from sitescreen.terrain._shore_fetch_kernel import open_water
from sitescreen.terrain.shore_distance import nearest_on, points_in
from sitescreen.terrain.shore_segments import Segments, shore_segments
from sitescreen.terrain.threads import in_bands

FloatArray = NDArray[np.float64]

SAMPLE_M = 100.0
"""Length of shoreline that one look out over the water decides for. [m]"""
RAYS = 72
"""Directions looked into, all round: every 5°."""
TESTED_KM = 300.0
"""Shores farther than this from the block count as open without a look: no reading cares. [km]"""
_SIDE_M = 1.0
"""How far beside the shoreline is looked which of its sides is wet. [m]"""


class OpenRule(NamedTuple):
    """Open water: in some sector this wide, at least this share of the directions is clear for the fetch."""

    fetch_m: float
    sector_deg: float
    share: float


class OpenShore(NamedTuple):
    """The nearest open shore of points; arrays of shape (n,), NaN without one.

    Distance on the ground [m], 0 in that water; bearing to it clockwise from true north [°]; where it is [°]; width of
    the water [km], inf for the sea, NaN for a lake of unknown width.
    """

    distance_m: FloatArray
    bearing_deg: FloatArray
    lon: FloatArray
    lat: FloatArray
    width_km: FloatArray


class _Samples(NamedTuple):
    """Places along the shore, each in the middle of a segment; ``run`` gives each segment's place."""

    segment: NDArray[np.int64]
    run: NDArray[np.int64]


def open_segments(
    shore: Shore, kind: str, crs: str, bounds: Bounds, rule: OpenRule, least_lake_width_km: float = 0.0
) -> Segments:
    """The shorelines of one kind of water that look out on open water.

    Parameters
    ----------
    shore : Shore
    kind : str
        "sea" or "lake".
    crs : str
        UTM system of the block.
    bounds : Bounds
        Core of the block in that system. [m] Shores within 300 km of it are tested, the others count as open. What is
        open depends on the block and the layer, never on which plots ask.
    rule : OpenRule
    least_lake_width_km : float
        Narrower lakes are left out; those of unknown width are not. [km]

    Returns
    -------
    Segments
        Of at most 100 m where tested. All of the shore where it was given as lines: their wet side is not known.

    Notes
    -----
    Looked at every 100 m of the shoreline, from the line itself, in 72 directions over its wet side. A direction is
    clear if no shoreline of the same kind crosses it within the fetch; the edge at which a layer was cut off is no
    shoreline and hides nothing. The sector may lie in any direction, so that the breeze need not come along the
    shortest way; a few of its directions may be blocked, so that an islet does not close the sea behind it.
    """
    whole = shore_segments(shore, kind, crs)
    wanted = shore_segments(shore, kind, crs, least_lake_width_km)
    if len(wanted.water_id) == 0 or len(shore.waters) == 0:
        return wanted
    near = _within(wanted, bounds, TESTED_KM * 1000.0)
    far = Segments(wanted.start[~near], wanted.end[~near], wanted.water_id[~near])
    tested = _cut(Segments(wanted.start[near], wanted.end[near], wanted.water_id[near]))
    if len(tested.water_id) == 0:
        return far
    around = _within(whole, bounds, TESTED_KM * 1000.0 + 2.0 * rule.fetch_m)
    walls = _cut(Segments(whole.start[around], whole.end[around], whole.water_id[around]))
    samples = _samples(tested)
    kept = _looks_out(tested, samples.segment, walls, shore, crs, rule)[samples.run]
    return Segments.joined(Segments(tested.start[kept], tested.end[kept], tested.water_id[kept]), far)


def _within(segments: Segments, bounds: Bounds, distance_m: float) -> NDArray[np.bool_]:
    west, south, east, north = bounds
    x, y = ((segments.start + segments.end) / 2.0).T
    off_x = np.maximum(np.maximum(west - x, x - east), 0.0)
    off_y = np.maximum(np.maximum(south - y, y - north), 0.0)
    near: NDArray[np.bool_] = np.hypot(off_x, off_y) <= distance_m
    return near


def _cut(segments: Segments) -> Segments:
    """The same in segments of at most 100 m, and none of no length."""
    length = np.hypot(*(segments.end - segments.start).T)
    number = np.ceil(length / SAMPLE_M).astype(np.int64)
    segment = np.repeat(np.arange(len(length)), number)
    within = np.arange(len(segment)) - np.repeat(np.cumsum(number) - number, number)
    start, along = segments.start[segment], (segments.end - segments.start)[segment]
    low, high = (within / number[segment])[:, None], ((within + 1) / number[segment])[:, None]
    end = np.where(high < 1.0, start + high * along, segments.end[segment])
    return Segments(start + low * along, end, segments.water_id[segment])


def _samples(segments: Segments) -> _Samples:
    """Runs of at most about 100 m along the shore, and the segment in the middle of each."""
    length = np.hypot(*(segments.end - segments.start).T)
    fresh = np.ones(len(length), dtype=bool)
    # cut segments meet to within rounding
    fresh[1:] = np.hypot(*(segments.start[1:] - segments.end[:-1]).T) > 1e-6
    fresh[1:] |= segments.water_id[1:] != segments.water_id[:-1]
    before = np.cumsum(length) - length
    part = np.cumsum(fresh) - 1
    run = np.floor((before - before[fresh][part]) / SAMPLE_M)
    begins = fresh.copy()
    begins[1:] |= run[1:] != run[:-1]
    first = np.flatnonzero(begins)
    last = np.append(first[1:], len(length)) - 1
    return _Samples((first + last) // 2, np.cumsum(begins) - 1)


def _looks_out(
    segments: Segments, sample: NDArray[np.int64], walls: Segments, shore: Shore, crs: str, rule: OpenRule
) -> NDArray[np.bool_]:
    """Whether each sampled segment looks out on open water."""
    start, end = segments.start[sample], segments.end[sample]
    eye, along = (start + end) / 2.0, end - start
    left = np.column_stack([-along[:, 1], along[:, 0]]) / np.hypot(*along.T)[:, None] * _SIDE_M
    left_wet, right_wet = (_wet(shore, eye + side, crs) for side in (left, -left))
    bucket_m = rule.fetch_m + SAMPLE_M
    middle = (walls.start + walls.end) / 2.0
    origin = np.minimum(middle.min(axis=0), eye.min(axis=0))
    cells = ((middle - origin) // bucket_m).astype(np.int64)
    cols, rows = (int(top) + 1 for top in cells.max(axis=0))
    place = cells[:, 1] * cols + cells[:, 0]
    by_bucket = np.argsort(place, kind="stable")
    edges = np.searchsorted(place[by_bucket], np.arange(rows * cols + 1))
    bucket_from = np.column_stack([edges[:-1].reshape(rows, cols), edges[cols::cols]])
    rays_in_sector = round(rule.sector_deg / 360.0 * RAYS) + 1
    is_open = np.zeros(len(sample), dtype=bool)
    in_bands(
        open_water,
        len(sample),
        eye,
        _own(walls, eye),
        along,
        left_wet,
        right_wet,
        walls.start,
        walls.end,
        by_bucket,
        bucket_from,
        bucket_m,
        origin,
        rule.fetch_m,
        RAYS,
        rays_in_sector,
        int(np.ceil(rule.share * rays_in_sector - 1e-9)),
        is_open,
        bands_a_thread=4,
    )
    # which side is wet can fail where outlines do not close: such a shore is not called a creek
    return is_open | ~(left_wet | right_wet)


def _own(walls: Segments, eye: FloatArray) -> NDArray[np.int64]:
    """The wall that each eye stands on."""
    from scipy.spatial import cKDTree

    _, own = cKDTree((walls.start + walls.end) / 2.0).query(eye)
    return np.asarray(own, dtype=np.int64)


def _wet(shore: Shore, xy: FloatArray, crs: str) -> NDArray[np.bool_]:
    lon, lat = Transformer.from_crs(crs, "EPSG:4326", always_xy=True).transform(xy[:, 0], xy[:, 1])
    return np.asarray(points_in(shore, lon, lat) != "", dtype=bool)


def open_shores(
    shore: Shore,
    segments: Segments,
    kind: str,
    lon_deg: FloatArray,
    lat_deg: FloatArray,
    crs: str,
    breeze_of_lake: Callable[[FloatArray, FloatArray], FloatArray] | None = None,
) -> OpenShore:
    """The nearest open shore of each point; of several lakes the one that gives the most breeze.

    Parameters
    ----------
    shore : Shore
    segments : Segments
        Open shores of that kind, as :func:`open_segments` gives them.
    kind : str
        "sea" or "lake".
    lon_deg, lat_deg : array, shape (n,)
        WGS 84. [°]
    crs : str
        UTM system of the segments.
    breeze_of_lake : callable, optional
        Breeze that reaches a place, from its distance to a lake [km] and the lake's width [km]: 0 beyond the width.
        Where no lake gives any, and without it, the nearest counts.
    """
    lon, lat = np.asarray(lon_deg, dtype=np.float64), np.asarray(lat_deg, dtype=np.float64)
    widths = dict(zip(shore.waters["water_id"].tolist(), shore.waters["width_km"].tolist(), strict=True))
    found = nearest_on(segments, lon, lat, crs)
    unknown = np.inf if kind == "sea" else np.nan
    width = np.array([widths.get(water, unknown) for water in found.water_id.tolist()], dtype=np.float64)
    best = OpenShore(found.distance_m, found.bearing_deg, found.lon, found.lat, width)
    if breeze_of_lake is not None and len(np.unique(segments.water_id)) > 1:
        best = _best_of_lakes(best, segments, widths, lon, lat, crs, breeze_of_lake)
    wet = points_in(shore, lon, lat) == kind
    if wet.any():
        # out in a creek, the open shore is as far as it is; out on the open water it is here
        bank = nearest_on(shore_segments(shore, kind, crs), lon[wet], lat[wet], crs)
        wet[wet] = bank.distance_m >= best.distance_m[wet] - SAMPLE_M
    return best._replace(
        distance_m=np.where(wet, 0.0, best.distance_m), bearing_deg=np.where(wet, np.nan, best.bearing_deg)
    )


def _best_of_lakes(
    best: OpenShore,
    segments: Segments,
    widths: dict[int, float],
    lon: FloatArray,
    lat: FloatArray,
    crs: str,
    breeze_of_lake: Callable[[FloatArray, FloatArray], FloatArray],
) -> OpenShore:
    """The nearest lake, or another whose breeze is stronger at the place: a narrow one must not hide the great one."""
    x, y = Transformer.from_crs("EPSG:4326", crs, always_xy=True).transform(lon, lat)
    place = np.column_stack([x, y])
    breeze = np.nan_to_num(breeze_of_lake(best.distance_m / 1000.0, best.width_km))
    best = OpenShore(*(values.copy() for values in best))
    for lake in np.unique(segments.water_id).tolist():
        own = segments.water_id == lake
        shores = Segments(segments.start[own], segments.end[own], segments.water_id[own])
        ends = np.concatenate([shores.start, shores.end])
        off = np.maximum(np.maximum(ends.min(axis=0) - place, place - ends.max(axis=0)), 0.0)
        width = widths.get(lake, np.nan)
        near = np.flatnonzero(np.hypot(*off.T) < width * 1000.0)
        if len(near) == 0:
            continue
        found = nearest_on(shores, lon[near], lat[near], crs)
        strength = breeze_of_lake(found.distance_m / 1000.0, np.full(len(near), width))
        better = strength > breeze[near]
        rows = near[better]
        breeze[rows] = strength[better]
        for column, values in zip(best, (*found[:4], np.full(len(near), width)), strict=True):
            column[rows] = values[better]
    return best


__all__ = ["OpenRule", "OpenShore", "open_segments", "open_shores"]
