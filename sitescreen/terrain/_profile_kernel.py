"""Compiled loops of :func:`sitescreen.terrain.horizon.horizon_profile`."""

import math
from typing import Any

import numpy as np
from numba import njit


@njit(nogil=True, cache=True, error_model="numpy")
def _between(near: Any, far: Any, share: Any) -> Any:
    """Height between two cell centres; a cell without weight may be unknown."""
    if share <= 0.0:
        return near
    if share >= 1.0:
        return far
    return near + share * (far - near)


@njit(nogil=True, cache=True, error_model="numpy")
def _height(elevation_m: Any, row: Any, col: Any) -> Any:
    """Bilinear height at a place given in rows and columns of cell centres; NaN beside the grid."""
    rows, cols = elevation_m.shape
    if row < 0.0 or col < 0.0 or row > rows - 1 or col > cols - 1:
        return math.nan
    r0, c0 = int(row), int(col)
    r1, c1 = min(r0 + 1, rows - 1), min(c0 + 1, cols - 1)
    share = col - c0
    upper = _between(np.float64(elevation_m[r0, c0]), np.float64(elevation_m[r0, c1]), share)
    lower = _between(np.float64(elevation_m[r1, c0]), np.float64(elevation_m[r1, c1]), share)
    return _between(upper, lower, row - r0)


TOP_CELLS = 16
"""Cells along the side of a square whose highest ground is known beforehand. Fixed, so that dividing by it is cheap."""


@njit(nogil=True, cache=True, error_model="numpy")
def tops(elevation_m: Any, out: Any, start: Any, stop: Any) -> None:
    """Highest ground of each square and of the row and column of cells behind it; infinite where some is unknown."""
    rows, cols = elevation_m.shape
    for square in range(start, stop):
        for across in range(out.shape[1]):
            top = -math.inf
            for row in range(square * TOP_CELLS, min((square + 1) * TOP_CELLS + 1, rows)):
                for col in range(across * TOP_CELLS, min((across + 1) * TOP_CELLS + 1, cols)):
                    z = elevation_m[row, col]
                    top = max(top, np.float64(z)) if z == z else math.inf
            out[square, across] = top


@njit(nogil=True, cache=True, error_model="numpy")
def profiles(
    elevation_m: Any,
    tops_m: Any,
    cell_size_m: Any,
    point_rows: Any,
    point_cols: Any,
    azimuths_rad: Any,
    height_m: Any,
    bend_per_m: Any,
    reach_m: Any,
    tangent: Any,
    seen_m: Any,
    start: Any,
    stop: Any,
) -> None:
    """Largest tangent along each ray from each point, and the distance to its first unknown ground.

    Rays are read wherever they cross a line through cell centres: there the bilinear surface has its edges. Where not
    even the highest ground of the square would be seen, the surface is not looked up; the answer is the same.
    """
    rows, cols = elevation_m.shape
    for point in range(start, stop):
        row0, col0 = point_rows[point], point_cols[point]
        eye = _height(elevation_m, row0, col0) + height_m
        for k in range(azimuths_rad.shape[0]):
            tangent[point, k] = math.nan
            seen_m[point, k] = 0.0
            if eye != eye:
                continue
            d_col, d_row = math.sin(azimuths_rad[k]), -math.cos(azimuths_rad[k])
            # distances in cells between crossings, and to the next one, on each axis
            gap_col = 1.0 / abs(d_col) if abs(d_col) > 1e-12 else math.inf
            gap_row = 1.0 / abs(d_row) if abs(d_row) > 1e-12 else math.inf
            to_col = (math.floor(col0) + 1.0 - col0 if d_col > 0 else col0 - math.ceil(col0) + 1.0) * gap_col
            to_row = (math.floor(row0) + 1.0 - row0 if d_row > 0 else row0 - math.ceil(row0) + 1.0) * gap_row
            best = -math.inf
            unbroken = True
            while True:
                crosses_col = to_col <= to_row
                d = to_col if crosses_col else to_row
                row, col = row0 + d * d_row, col0 + d * d_col
                # the crossed line's own index is a whole number
                if crosses_col:
                    col = np.rint(col)
                    to_col += gap_col
                if not crosses_col or to_row <= d:
                    row = np.rint(row)
                    to_row += gap_row
                distance = d * cell_size_m
                if row < 0.0 or col < 0.0 or row > rows - 1 or col > cols - 1 or distance > reach_m:
                    break
                top = tops_m[int(row) // TOP_CELLS, int(col) // TOP_CELLS]
                # a micrometre of room, so that rounding cannot hide ground that would just be seen
                if top - eye + 1e-6 <= (best + bend_per_m * distance) * distance:
                    if unbroken:
                        seen_m[point, k] = distance
                    continue
                z = _height(elevation_m, row, col)
                if z != z:
                    unbroken = False
                    continue
                if unbroken:
                    seen_m[point, k] = distance
                best = max(best, (z - eye) / distance - bend_per_m * distance)
            if best > -math.inf:
                tangent[point, k] = best
