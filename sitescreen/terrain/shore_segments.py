"""Shorelines as straight segments on a metric map, and the nearest of them."""

from typing import Any, NamedTuple

import numpy as np
import shapely
from numpy.typing import NDArray
from pyproj import CRS, Transformer
from scipy.spatial import cKDTree

from sitescreen.inputs.shore import STRAIGHT_DEG, Shore

FloatArray = NDArray[np.float64]

REACH_DEG = 30.0
"""Shores farther in longitude from the map's middle meridian are left out: a UTM map has no use there. [°]"""


class Found(NamedTuple):
    """The nearest shore of points: index of the segment, the point on it, and the distance on the map [m]."""

    segment: NDArray[np.int64]
    xy: FloatArray
    distance_m: FloatArray


class Segments(NamedTuple):
    """Straight pieces of shoreline on a map in metres; arrays of shape (k, 2) and (k,)."""

    start: FloatArray
    end: FloatArray
    water_id: NDArray[np.int64]

    @staticmethod
    def joined(*several: "Segments") -> "Segments":
        """Several lots of segments as one."""
        return Segments(*(np.concatenate(parts) for parts in zip(*several, strict=True)))

    def nearest(self, points: FloatArray) -> Found:
        """The nearest segment of each point, shape (n, 2), and the nearest point on it: exact."""
        tree = shapely.STRtree(shapely.linestrings(np.stack([self.start, self.end], axis=1)))
        return self._on(np.asarray(tree.nearest(shapely.points(points)), dtype=np.int64), points)

    def pieces(self, spacing_m: float | FloatArray) -> "Pieces":
        """The segments cut into short pieces, among which the nearest is found many times faster."""
        length = np.hypot(*(self.end - self.start).T)
        number = np.maximum(np.ceil(length / spacing_m), 1.0).astype(np.int64)
        segment = np.repeat(np.arange(len(length)), number)
        within = np.arange(len(segment)) - np.repeat(np.cumsum(number) - number, number)
        share = ((within + 0.5) / number[segment])[:, None]
        middles = self.start[segment] * (1.0 - share) + self.end[segment] * share
        return Pieces(self, segment, cKDTree(middles))

    def _on(self, segment: NDArray[np.int64], points: FloatArray) -> Found:
        """The nearest point on the given segment of each point."""
        start, along = self.start[segment], self.end[segment] - self.start[segment]
        length2 = (along**2).sum(axis=1)
        with np.errstate(invalid="ignore", divide="ignore"):
            share = np.clip(((points - start) * along).sum(axis=1) / length2, 0.0, 1.0)
        xy = start + np.where(length2 > 0.0, share, 0.0)[:, None] * along
        return Found(segment, xy, np.hypot(*(points - xy).T))


class Pieces(NamedTuple):
    """Segments cut into short pieces, kept by their middles."""

    segments: Segments
    segment: NDArray[np.int64]
    middles: Any

    def nearest(self, points: FloatArray) -> Found:
        """The nearer of the two segments whose pieces have the nearest middles.

        The distance is never too short, and too long by no more than half a piece: the nearest middle is at most that
        much farther than the nearest shore.
        """
        _, pieces = self.middles.query(points, k=[1, 2], workers=-1)
        last = len(self.segment) - 1  # with a single piece the second is missing, and numbered one too many
        one, other = (self.segments._on(self.segment[np.minimum(pieces[:, k], last)], points) for k in (0, 1))
        first = one.distance_m <= other.distance_m
        return Found(
            np.where(first, one.segment, other.segment),
            np.where(first[:, None], one.xy, other.xy),
            np.where(first, one.distance_m, other.distance_m),
        )


def shore_segments(shore: Shore, kinds: str | tuple[str, ...], crs: str, least_lake_width_km: float = 0.0) -> Segments:
    """The shorelines of one or several kinds of water, on a map.

    Parameters
    ----------
    shore : Shore
    kinds : str or tuple of str
        "sea", "lake".
    crs : str
        UTM system.
    least_lake_width_km : float
        Narrower lakes are left out; those of unknown width are not. [km]
    """
    wanted = (kinds,) if isinstance(kinds, str) else kinds
    rows = shore.lines["kind"].isin(wanted).to_numpy()
    if least_lake_width_km > 0.0:
        narrow = shore.waters["water_id"][shore.waters["width_km"] < least_lake_width_km]
        rows = rows & ~shore.lines["water_id"].isin(narrow).to_numpy()
    lines = np.asarray(shore.lines.geometry.values[rows], dtype=object)
    ids = shore.lines["water_id"].to_numpy(dtype=np.int64)[rows]
    parts, part_of = shapely.get_parts(shapely.segmentize(lines, STRAIGHT_DEG), return_index=True)
    lonlat, owner = shapely.get_coordinates(parts, return_index=True)
    there = Transformer.from_crs("EPSG:4326", crs, always_xy=True)
    x, y = there.transform(lonlat[:, 0], lonlat[:, 1]) if len(lonlat) else (np.empty(0), np.empty(0))
    xy = np.column_stack([x, y])
    near = np.isfinite(xy).all(axis=1)
    zone = CRS(crs).utm_zone
    if zone is not None:
        middle = 6.0 * int(zone[:-1]) - 183.0
        near &= np.abs((lonlat[:, 0] - middle + 180.0) % 360.0 - 180.0) < REACH_DEG
    joined = (owner[:-1] == owner[1:]) & near[:-1] & near[1:]
    start, end = xy[:-1][joined], xy[1:][joined]
    return Segments(start, end, ids[part_of[owner[:-1][joined]]])


__all__ = ["Found", "Pieces", "Segments", "shore_segments"]
