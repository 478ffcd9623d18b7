"""Narrow gaps in the heights, closed from their rims; wide ones stay unknown."""

import numpy as np
from numpy.typing import NDArray
from scipy import ndimage

FloatArray = NDArray[np.float32]

WIDTH_CELLS = 3
"""Gaps up to this wide are closed."""

ARM_CELLS = 16
"""This near to a wide gap, or to the edge of the data, a narrow arm of it stays open too."""

REACH_CELLS = WIDTH_CELLS + ARM_CELLS + 1
"""How far a cell's value may look: a window needs this much around it to come out as the whole would."""

# step and the number of cells that a gap may have along it; diagonal steps are √2 long
_LINES = (((0, 1), WIDTH_CELLS), ((1, 0), WIDTH_CELLS), ((1, 1), WIDTH_CELLS - 1), ((1, -1), WIDTH_CELLS - 1))


def fill_narrow(heights: FloatArray) -> tuple[FloatArray, NDArray[np.bool_]]:
    """Close gaps up to three cells wide.

    A cell is closed if ground is known on both sides of it, on a line in one of four directions, with at most three
    unknown cells between; it gets the mean of the heights interpolated along those lines, each weighted by the inverse
    square of the gap's length. Nothing is carried on beyond a rim. Cells within 16 of a wide gap, along the gap, stay
    unknown: they are its ragged shore, a creek of the sea or the edge of the data, not a fault of the model. Each
    value follows from the 20 cells around it, so that the way a terrain is cut into windows cannot change it.

    Parameters
    ----------
    heights : float32 array, shape (rows, cols)
        NaN where unknown. Beyond the array counts as unknown.

    Returns
    -------
    heights : float32 array, shape (rows, cols)
        The same array if there was nothing to close.
    closed : bool array, shape (rows, cols)
    """
    unknown = np.isnan(heights)
    nothing = np.zeros(heights.shape, dtype=bool)
    if not unknown.any() or unknown.all():
        return heights, nothing
    near = unknown & (ndimage.distance_transform_cdt(unknown, metric="chessboard") <= WIDTH_CELLS)
    rows, cols = np.nonzero(near)
    total, weights = _along_lines(heights, rows, cols)
    crossed = weights > 0
    closed = nothing
    closed[rows[crossed], cols[crossed]] = True
    if not crossed.any():
        return heights, closed
    # a ring of unknown cells stands for what lies beyond the array
    wide = np.pad(unknown & ~closed, 1, constant_values=True)
    arms = ndimage.binary_dilation(
        wide, structure=np.ones((3, 3)), iterations=ARM_CELLS, mask=np.pad(unknown, 1, constant_values=True)
    )[1:-1, 1:-1]
    closed &= ~arms
    kept = closed[rows, cols]
    out = heights.copy()
    out[rows[kept], cols[kept]] = (total[kept] / weights[kept]).astype(np.float32)
    return out, closed


def _along_lines(
    heights: FloatArray, rows: NDArray[np.intp], cols: NDArray[np.intp]
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Weighted sum of heights interpolated across each cell's gap, and the sum of weights; 0 where none is narrow."""
    padded = np.pad(heights, WIDTH_CELLS, constant_values=np.nan)
    rows, cols = rows + WIDTH_CELLS, cols + WIDTH_CELLS
    total, weights = np.zeros(len(rows)), np.zeros(len(rows))
    for (down, right), most in _LINES:
        ends = []
        for way in (-1, 1):
            distance, height = np.full(len(rows), np.inf), np.zeros(len(rows))
            for step in range(most, 0, -1):
                found = padded[rows + way * step * down, cols + way * step * right]
                known = np.isfinite(found)
                distance[known], height[known] = step, found[known]
            ends.append((distance, height))
        (before, low), (after, high) = ends
        gap = before + after  # the cells between are gap − 1
        narrow = gap - 1 <= most
        length = gap[narrow] * np.hypot(down, right)
        weight = 1.0 / length**2
        between = (low[narrow] * after[narrow] + high[narrow] * before[narrow]) / gap[narrow]
        total[narrow] += weight * between
        weights[narrow] += weight
    return total, weights
