"""The ground at 90 m for flows along it: averaged, but with narrow ways through kept open at their true width."""

import math
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from sitescreen.errors import GridError
from sitescreen.grid import Field, Grid

COARSE_CELL_M = 90.0
"""The lattice's coarsest step. [m]"""

FINE_CELL_M = 30.0
"""Finer ground is averaged to this first. [m]"""

FloatArray = NDArray[np.float64]


class CoarseGround(NamedTuple):
    """Ground on the 90 m lattice, for flows from cell to cell.

    ``grid``: whole cells of the lattice that cover the fine ground. ``bed_m``, shape (rows, cols): height of each cell,
    NaN where unknown. ``sill_x_m``, shape (rows, cols + 1): lowest height at which anything passes the west side of
    cell (r, c); ``width_x``: the open share of that side. ``sill_y_m``, ``width_y``, shape (rows + 1, cols): the same
    for its north side. Sides next to unknown ground and the outermost have sill +inf and width 1.
    """

    grid: Grid
    bed_m: FloatArray
    sill_x_m: FloatArray
    width_x: FloatArray
    sill_y_m: FloatArray
    width_y: FloatArray


def coarse_ground(elevation: Field, gorge_depth_m: float, section_m: float) -> CoarseGround:
    """Average the ground to 90 m, except along ways through that are narrower than that.

    Parameters
    ----------
    elevation : Field, shape (rows, cols)
        Height on the lattice, cells of 5, 10, 30 or 90 m. [m] NaN where unknown.
    gorge_depth_m : float
        A cell whose lowest ground lies further than this below its mean, once its own even slope is taken off, begins
        to take the height of its lowest ground instead of its mean, and has taken it at twice this. [m] Keep it above
        three times the terrain's error, so that noise alone lowers nothing.
    section_m : float
        Depth of flow for which the width of a side is taken: its open section below that, divided by it. [m]

    Returns
    -------
    CoarseGround
        Heights in float64. A cell is unknown where fewer than half of its fine cells are known.

    Raises
    ------
    GridError
        If the cells are not of the lattice.

    Notes
    -----
    A mean plugs every gap narrower than a cell, and cold air then stands behind a dam that does not exist. A mean is
    right on slopes, where the lowest ground of a cell says only that the cell is wide. So an even slope is taken off
    first: along each axis the smaller of the two steps between the cell's three rows (or columns), none if they differ
    in sign. Ways through that run askew are joined corner to corner before. At 90 m as given there is nothing to keep.
    Ridges narrower than 90 m come out too low; where that matters, the 30 m hollows see them.
    """
    step = elevation.grid.cell_size_m
    if step not in (5.0, 10.0, FINE_CELL_M, COARSE_CELL_M):
        raise GridError(
            f"ground with cells of {step:g} m was given",
            "cells of 5, 10, 30 or 90 m are needed",
            "Take a grid of the lattice (sitescreen.lattice)",
        )
    grid = coarse_grid(elevation.grid)
    if step == COARSE_CELL_M:
        bed = elevation.values.astype(np.float64)
        return _with_sides(grid, bed, None, None, section_m)
    fine = block_means(on_coarse_edges(elevation, grid), round(FINE_CELL_M / step))
    fine = _corners_joined(fine)
    blocks = fine.reshape(grid.rows, 3, grid.cols, 3)
    mean = _mean_of_known(blocks, 5)
    low = _lowest(blocks)
    dip = np.nan_to_num(mean - _lowest_off_slope(blocks), nan=0.0)
    taken = np.clip(dip / gorge_depth_m - 1.0, 0.0, 1.0)
    bed = np.where(taken > 0, mean + taken * (low - mean), mean)
    return _with_sides(grid, bed, np.where(np.isnan(fine), np.inf, fine), taken, section_m)


def coarse_grid(grid: Grid) -> Grid:
    """The whole 90 m cells of the lattice that cover a grid."""
    west, south, east, north = (bound / COARSE_CELL_M for bound in grid.bounds)
    col0, row0 = math.floor(west + 1e-9), math.ceil(north - 1e-9)
    cols, rows = math.ceil(east - 1e-9) - col0, row0 - math.floor(south + 1e-9)
    return Grid(grid.crs, col0 * COARSE_CELL_M, row0 * COARSE_CELL_M, COARSE_CELL_M, rows, cols)


def on_coarse_edges(field: Field, grid: Grid) -> FloatArray:
    """The field's values widened with NaN to the edges of a coarse grid that covers it."""
    fine = field.grid
    per_cell = round(COARSE_CELL_M / fine.cell_size_m)
    row = round((grid.north_m - fine.north_m) / fine.cell_size_m)
    col = round((fine.west_m - grid.west_m) / fine.cell_size_m)
    wide = np.full((grid.rows * per_cell, grid.cols * per_cell), np.nan)
    wide[row : row + fine.rows, col : col + fine.cols] = field.values
    return wide


def block_means(values: FloatArray, per_cell: int) -> FloatArray:
    """Mean of the known cells of each block; NaN where fewer than half are known."""
    if per_cell == 1:
        return values
    rows, cols = values.shape[0] // per_cell, values.shape[1] // per_cell
    return _mean_of_known(values.reshape(rows, per_cell, cols, per_cell), (per_cell**2 + 1) // 2)


def _mean_of_known(blocks: FloatArray, at_least: int) -> FloatArray:
    total = np.zeros((blocks.shape[0], blocks.shape[2]))
    known = np.zeros(total.shape, dtype=np.int32)
    for i in range(blocks.shape[1]):
        for j in range(blocks.shape[3]):
            part = blocks[:, i, :, j]
            there = ~np.isnan(part)
            total += np.where(there, part, 0.0)
            known += there
    return np.where(known >= at_least, total / np.maximum(known, 1), np.nan)


def _lowest(blocks: FloatArray) -> FloatArray:
    low = blocks[:, 0, :, 0].copy()
    for i in range(3):
        for j in range(3):
            np.fmin(low, blocks[:, i, :, j], out=low)
    return low


def _even_step(first: FloatArray, second: FloatArray) -> FloatArray:
    """The smaller of two steps, 0 if they differ in sign."""
    smaller = np.where(np.abs(first) < np.abs(second), first, second)
    return np.where(first * second > 0, smaller, 0.0)


def _lowest_off_slope(blocks: FloatArray) -> FloatArray:
    """The lowest of each 3 × 3 block once its even slope is taken off; NaN where one of the nine is unknown."""
    rows = [blocks[:, i].mean(axis=2) for i in range(3)]
    cols = [blocks[:, :, :, j].mean(axis=1) for j in range(3)]
    down = _even_step(rows[1] - rows[0], rows[2] - rows[1])
    across = _even_step(cols[1] - cols[0], cols[2] - cols[1])
    low = np.full(down.shape, np.inf)
    for i in range(3):
        for j in range(3):
            np.minimum(low, blocks[:, i, :, j] - (i - 1) * down - (j - 1) * across, out=low)
    return low


def _corners_joined(fine: FloatArray) -> FloatArray:
    """Where two low cells meet only at a corner, lower the lower of the other two to the higher of them.

    ::

        low  high         low  high
        high low    →     low  low
    """
    a, b, c, d = fine[:-1, :-1], fine[:-1, 1:], fine[1:, :-1], fine[1:, 1:]
    joined = fine.copy()
    for one, other, (left, left_at), (right, right_at) in (
        (a, d, (c, (slice(1, None), slice(None, -1))), (b, (slice(None, -1), slice(1, None)))),
        (b, c, (a, (slice(None, -1), slice(None, -1))), (d, (slice(1, None), slice(1, None)))),
    ):
        way = np.maximum(one, other)
        blocked = way < np.minimum(left, right)
        lower_left = blocked & (left <= right)
        for at, where in ((left_at, lower_left), (right_at, blocked & ~lower_left)):
            target = joined[at]
            target[where] = np.minimum(target[where], way[where])
    return joined


def _with_sides(
    grid: Grid, bed: FloatArray, fine: FloatArray | None, taken: FloatArray | None, section_m: float
) -> CoarseGround:
    """Sills and widths of all sides: between the beds, and by the fine cells on either side."""
    sill_x, width_x = np.full((grid.rows, grid.cols + 1), np.inf), np.ones((grid.rows, grid.cols + 1))
    sill_y, width_y = np.full((grid.rows + 1, grid.cols), np.inf), np.ones((grid.rows + 1, grid.cols))
    sill_x[:, 1:-1] = np.maximum(bed[:, :-1], bed[:, 1:])
    sill_y[1:-1] = np.maximum(bed[:-1], bed[1:])
    if fine is not None and taken is not None:
        across = np.maximum(fine[:, 2:-1:3], fine[:, 3::3]).reshape(grid.rows, 3, grid.cols - 1)
        down = np.maximum(fine[2:-1:3], fine[3::3]).reshape(grid.rows - 1, grid.cols, 3)
        _narrow(
            sill_x[:, 1:-1],
            width_x[:, 1:-1],
            [across[:, i] for i in range(3)],
            np.maximum(taken[:, :-1], taken[:, 1:]),
            section_m,
        )
        _narrow(
            sill_y[1:-1],
            width_y[1:-1],
            [down[:, :, i] for i in range(3)],
            np.maximum(taken[:-1], taken[1:]),
            section_m,
        )
    for sill, width in ((sill_x, width_x), (sill_y, width_y)):
        shut = ~np.isfinite(sill)
        sill[shut] = np.inf
        width[shut] = 1.0
    return CoarseGround(grid, bed, sill_x, width_x, sill_y, width_y)


def _narrow(sill: FloatArray, width: FloatArray, passes: list[FloatArray], taken: FloatArray, section_m: float) -> None:
    """Raise sills to the lowest of the three fine ways over each side; open sides of narrow ways by their section.

    Where neither cell lies at its lowest ground the side is as wide as the cell: an even slope is no gorge.
    """
    np.maximum(sill, np.minimum(np.minimum(passes[0], passes[1]), passes[2]), out=sill)
    narrow = taken > 0
    level = sill[narrow]
    open_share = sum(np.clip(1.0 - (one[narrow] - level) / section_m, 0.0, 1.0) for one in passes) / 3.0
    width[narrow] = 1.0 - taken[narrow] * (1.0 - open_share)
