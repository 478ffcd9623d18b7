"""Shoreline or only the edge of the drawing? Outlines of water and land, without the sides where they were cut off."""

from typing import Any

import numpy as np
import shapely
from numpy.typing import NDArray

KM_PER_DEGREE = 111.0
CUT_LEAST_KM = 1.0
"""A coast seldom runs this far exactly along the rectangle round its layer; a cut does. [km]"""
FRAME_NEAR_DEG = 5e-4
"""An outline that follows the terrain's edge within this (about 55 m) for more than CUT_LEAST_KM was cut there. [°]"""


def layer_sides(polygons: NDArray[np.object_], km_per_unit: float) -> NDArray[np.object_]:
    """The outlines that run along the rectangle round a layer of polygons.

    Parameters
    ----------
    polygons : object array
        In the layer's own system, where such a rectangle is upright.
    km_per_unit : float
        111 for degrees, 0.001 for metres.

    Returns
    -------
    object array of multi-lines, shape (4,)
        Along the west, south, east and north side, in the layer's own numbers. A side where outlines run along it for
        no more than 1 km in all is empty: the layer only reaches it.
    """
    bounds = shapely.total_bounds(polygons)
    slack = 1e-9 * max(bounds[2] - bounds[0], bounds[3] - bounds[1])
    start, end = _edges(shapely.boundary(polygons))
    sides = np.full(4, shapely.MultiLineString(), dtype=object)
    for side, value in enumerate(bounds):
        axis = side % 2
        on = (np.abs(start[:, axis] - value) <= slack) & (np.abs(end[:, axis] - value) <= slack)
        length = float(np.abs(end[on, 1 - axis] - start[on, 1 - axis]).sum())
        if length * km_per_unit > CUT_LEAST_KM:
            sides[side] = shapely.multilinestrings(shapely.linestrings(np.stack([start[on], end[on]], axis=1)))
    return sides


def _edges(lines: NDArray[np.object_]) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Start and end of every edge of lines and multi-lines; shapes (k, 2)."""
    coordinates, owner = shapely.get_coordinates(shapely.get_parts(lines), return_index=True)
    same = owner[:-1] == owner[1:]
    return coordinates[:-1][same], coordinates[1:][same]


def cut_sides(sides_lonlat: NDArray[np.object_], frame: Any) -> NDArray[np.object_]:
    """Of the outlines along a layer's rectangle, those where the layer was merely cut off; EPSG:4326.

    Parameters
    ----------
    sides_lonlat : object array, shape (4,)
        :func:`layer_sides` in longitude and latitude.
    frame : shapely geometry
        Outline of the terrain.

    Returns
    -------
    object array of multi-lines, shape (4,)
        A stretch that runs inside the terrain for more than 1 km is left out, whole: the terrain shows that the world
        goes on there, so a straight shore is a shore.
    """
    inside = shapely.buffer(frame, -CUT_LEAST_KM / KM_PER_DEGREE)
    cut = np.full(4, shapely.MultiLineString(), dtype=object)
    for side, lines in enumerate(sides_lonlat):
        stretches: NDArray[np.object_] = np.asarray(shapely.get_parts(shapely.line_merge(lines)), dtype=object)
        seen = shapely.length(shapely.intersection(stretches, inside)) * KM_PER_DEGREE > CUT_LEAST_KM
        cut[side] = shapely.multilinestrings(stretches[~seen])
    return cut


def known_region(bounds: NDArray[np.float64], cut: NDArray[np.bool_], km_per_unit: float) -> Any:
    """The ground a layer speaks of, in its own numbers: nothing is known beyond a side where it was cut.

    Parameters
    ----------
    bounds : array, shape (4,)
        West, south, east, north of the layer.
    cut : bool array, shape (4,)
        Whether the layer was cut off on that side.
    km_per_unit : float
        111 for degrees, 0.001 for metres.
    """
    far = np.where(cut, 0.0, 1000.0 / km_per_unit) * np.array([-1.0, -1.0, 1.0, 1.0])
    return shapely.box(*(bounds + far).tolist())


def without_cuts(lines: NDArray[np.object_], cut: NDArray[np.object_]) -> NDArray[np.object_]:
    """Lines without the stretches where their layer was cut off."""
    strip = shapely.buffer(shapely.union_all(cut), 5e-7, cap_style="flat", quad_segs=2)  # 5 cm to either side
    return lines if strip.is_empty else np.asarray(shapely.difference(lines, strip), dtype=object)


def without_frame(lines: NDArray[np.object_], frame: Any) -> NDArray[np.object_]:
    """Lines without long stretches along the terrain's own edge, where water was clipped to it; EPSG:4326."""
    rim = shapely.buffer(shapely.boundary(frame), FRAME_NEAR_DEG, quad_segs=4)
    shapely.prepare(rim)
    out = lines.copy()
    for row in np.flatnonzero(shapely.intersects(rim, lines)):
        along = np.asarray(shapely.get_parts(_merged(shapely.intersection(lines[row], rim))), dtype=object)
        long = along[shapely.length(along) * KM_PER_DEGREE > CUT_LEAST_KM]
        if len(long):
            out[row] = shapely.difference(lines[row], shapely.buffer(shapely.union_all(long), 5e-7, cap_style="flat"))
    return out


def _merged(lines: Any) -> Any:
    """Touching pieces joined; pieces that are points, where a line only touches, dropped."""
    parts = np.asarray(shapely.get_parts(lines), dtype=object)
    return shapely.line_merge(shapely.multilinestrings(parts[shapely.get_type_id(parts) == 1]))


__all__ = ["cut_sides", "known_region", "layer_sides", "without_cuts", "without_frame"]
