"""Heights read off a mosaic at the centres of grid cells, by cubic convolution.

Each cell is computed from its own absolute position, never from a window's corner: two windows that share a cell give
the same bits, and so do one file and the four it was cut into.
"""

import math
from typing import Any

import numpy as np
from numpy.typing import NDArray
from pyproj import Transformer

from sitescreen.grid import Grid
from sitescreen.inputs._cubic_kernel import CLOSED, KNOWN, OUTSIDE, VOID, read_cells
from sitescreen.inputs.datum import Datum
from sitescreen.inputs.terrain_mosaic import Mosaic, SourceLattice
from sitescreen.inputs.terrain_voids import REACH_CELLS, fill_narrow

NODE_CELLS = 32
"""Positions are transformed at every so many grid cells and interpolated by cubics between: at 90 m cells that is
within a micrometre of transforming each cell (checked in the tests), and 1,000 times as fast."""

TILE_CELLS = 1024
"""Grid cells along one side of what is read at a time, which bounds the memory."""

FloatArray = NDArray[np.float64]

__all__ = ["CLOSED", "KNOWN", "NODE_CELLS", "OUTSIDE", "VOID", "positions", "warped"]


def positions(grid: Grid, rows: slice, cols: slice, lattice: SourceLattice, datum: Datum) -> tuple[Any, Any, int, int]:
    """Source positions at nodes round a part of a grid.

    Parameters
    ----------
    grid : Grid
    rows, cols : slice
        The part.
    lattice : SourceLattice
    datum : Datum
        From the source's system to WGS 84.

    Returns
    -------
    u, v : float64 arrays
        Column and row of the source at each node, from outer edges.
    offset_row, offset_col : int
        Rows and columns from the first node to the part's first cell.
    """
    step = grid.cell_size_m
    # nodes lie at whole multiples of NODE_CELLS of the grid's lattice, whatever part of it the grid is
    cell_col, cell_row = math.floor(grid.west_m / step + 1e-9), math.floor(-grid.north_m / step + 1e-9)
    shift_x, shift_y = grid.west_m - cell_col * step, grid.north_m + cell_row * step
    shift_x, shift_y = (0.0 if abs(shift) < 1e-6 * step else shift for shift in (shift_x, shift_y))
    first_col, last_col = cell_col + cols.start, cell_col + cols.stop - 1
    first_row, last_row = cell_row + rows.start, cell_row + rows.stop - 1
    node_cols = np.arange(first_col // NODE_CELLS - 1, last_col // NODE_CELLS + 3)
    node_rows = np.arange(first_row // NODE_CELLS - 1, last_row // NODE_CELLS + 3)
    x = (node_cols * NODE_CELLS + 0.5) * step + shift_x
    y = -(node_rows * NODE_CELLS + 0.5) * step + shift_y
    xx, yy = np.meshgrid(x, y)
    east, north = _source_coordinates(grid.crs, datum, xx.ravel(), yy.ravel())
    u = lattice.cells_x(east).reshape(xx.shape)
    v = lattice.cells_y(north).reshape(xx.shape)
    return u, v, first_row - int(node_rows[0]) * NODE_CELLS, first_col - int(node_cols[0]) * NODE_CELLS


def _source_coordinates(crs: str, datum: Datum, x: FloatArray, y: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Coordinates in the source's system of points in a grid's system; longitudes do not jump within a grid."""
    to_lonlat = Transformer.from_crs(crs, "EPSG:4326", always_xy=True)
    lon, lat = to_lonlat.transform(x, y)
    middle = central_meridian_deg(crs, to_lonlat, x, y)
    lon = np.where(np.isfinite(lon), middle + (np.asarray(lon) - middle + 180.0) % 360.0 - 180.0, np.inf)
    if is_wgs84_degrees(datum):
        return lon, np.asarray(lat)
    east, north = datum.transformer.transform(lon, lat, direction="INVERSE")
    east = np.asarray(east, dtype=np.float64)
    if datum.crs.is_geographic:
        east = np.where(np.isfinite(east), lon + (east - lon + 180.0) % 360.0 - 180.0, np.inf)
    return east, np.asarray(north, dtype=np.float64)


def is_wgs84_degrees(datum: Datum) -> bool:
    """Whether a source's coordinates are WGS 84 longitude and latitude as they stand."""
    prime = datum.crs.prime_meridian
    in_degrees = all(axis.unit_name == "degree" for axis in datum.crs.axis_info[:2])
    at_greenwich = prime is None or prime.longitude == 0.0
    return bool(datum.crs.is_geographic and datum.transformer.accuracy == 0.0 and in_degrees and at_greenwich)


def central_meridian_deg(crs: str, to_lonlat: Transformer, x: FloatArray, y: FloatArray) -> float:
    """The meridian that a projection is drawn round; for others that of the first point. [°]"""
    from pyproj import CRS

    operation = CRS.from_user_input(crs).coordinate_operation
    for parameter in operation.params if operation is not None else ():
        if parameter.name == "Longitude of natural origin":
            return float(parameter.value)
    return float(to_lonlat.transform(x[0], y[0])[0])


def warped(
    mosaic: Mosaic,
    datum: Datum,
    grid: Grid,
    heights: NDArray[np.float32],
    under: NDArray[np.uint8],
    stored: NDArray[np.float32],
) -> None:
    """Fill the cells of a grid that have no height yet, where a mosaic has one.

    Parameters
    ----------
    mosaic : Mosaic
    datum : Datum
        From its system to WGS 84.
    grid : Grid
    heights : float32 array, shape of the grid
        [m] NaN where unknown so far; changed in place.
    under : uint8 array, shape of the grid
        OUTSIDE, KNOWN, CLOSED or VOID; changed in place.
    stored : float32 array, shape of the grid
        The height of the source cell under each centre, not interpolated. [m] Changed in place.
    """
    sources: dict[str, Any] = {}
    try:
        for row in range(0, grid.rows, TILE_CELLS):
            for col in range(0, grid.cols, TILE_CELLS):
                rows = slice(row, min(row + TILE_CELLS, grid.rows))
                cols = slice(col, min(col + TILE_CELLS, grid.cols))
                open_cells = np.isnan(heights[rows, cols])
                if not open_cells.any():
                    continue
                found = _tile(mosaic, datum, grid, rows, cols, open_cells, sources)
                if found is None:
                    continue
                new, kind, nearest = found
                better = kind != OUTSIDE  # only open cells were asked for
                heights[rows, cols][better] = new[better]
                stored[rows, cols][better] = nearest[better]
                under[rows, cols][better] = kind[better]
    finally:
        for source in sources.values():
            source.close()


def _tile(
    mosaic: Mosaic,
    datum: Datum,
    grid: Grid,
    rows: slice,
    cols: slice,
    wanted: NDArray[np.bool_],
    sources: dict[str, Any],
) -> tuple[NDArray[np.float32], NDArray[np.uint8], NDArray[np.float32]] | None:
    u, v, offset_row, offset_col = positions(grid, rows, cols, mosaic.lattice, datum)
    if not (np.isfinite(u).any() and np.isfinite(v).any()):
        return None
    u_known, v_known = u[np.isfinite(u)], v[np.isfinite(v)]
    # twice the number of source cells under one grid cell is how far the kernel looks
    with np.errstate(invalid="ignore"):
        steps = [np.abs(np.diff(one, axis=axis)).ravel() for one in (u, v) for axis in (0, 1)]
    steps = [one[np.isfinite(one)] for one in steps]
    stretch = max(1.0, *(float(one.max(initial=0.0)) / NODE_CELLS for one in steps))
    pad = math.ceil(2.0 * math.sqrt(2.0) * stretch) + 2 + REACH_CELLS
    window = (
        math.floor(v_known.min()) - pad,
        math.ceil(v_known.max()) + pad,
        math.floor(u_known.min()) - pad,
        math.ceil(u_known.max()) + pad,
    )
    found = mosaic.window(*window, sources)
    if found is None:
        return None
    ground, closed = fill_narrow(found[0])
    shape = (rows.stop - rows.start, cols.stop - cols.start)
    heights = np.full(shape, np.nan, dtype=np.float32)
    under = np.full(shape, OUTSIDE, dtype=np.uint8)
    stored = np.full(shape, np.nan, dtype=np.float32)
    read_cells(
        ground,
        found[1],
        closed,
        wanted,
        window[0],
        window[2],
        u,
        v,
        NODE_CELLS,
        offset_row,
        offset_col,
        2 * pad,
        heights,
        under,
        stored,
    )
    return heights, under, stored
