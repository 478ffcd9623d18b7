"""Compiled loop of :mod:`sitescreen.terrain.flat_water`."""

from typing import Any

import numpy as np
from numba import njit


@njit(nogil=True, cache=True, error_model="numpy")
def _is_heart(heights: Any, row: int, col: int) -> bool:
    """Whether nine cells are exactly level; the edge of the field and gaps end what can be known."""
    level = heights[row, col]
    for r in range(max(row - 1, 0), min(row + 2, heights.shape[0])):
        for c in range(max(col - 1, 0), min(col + 2, heights.shape[1])):
            if heights[r, c] != level:  # true for NaN too
                return False
    return True


@njit(nogil=True, cache=True, error_model="numpy")
def level_patches(heights: Any, label: Any) -> int:
    """Number the patches of exactly level cells that share sides and hold at least one heart; the rest stays 0.

    ``label`` comes as zeros and is filled in. Returns the number of patches, counted from the north-west.
    """
    rows, cols = heights.shape
    waiting = np.empty(rows * cols, dtype=np.int32)
    count = 0
    for row in range(rows):
        for col in range(cols):
            if label[row, col] != 0 or not _is_heart(heights, row, col):
                continue
            count += 1
            level = heights[row, col]
            label[row, col] = count
            waiting[0] = row * cols + col
            left = 1
            while left > 0:
                left -= 1
                at_row, at_col = waiting[left] // cols, waiting[left] % cols
                for r, c in ((at_row - 1, at_col), (at_row + 1, at_col), (at_row, at_col - 1), (at_row, at_col + 1)):
                    if 0 <= r < rows and 0 <= c < cols and label[r, c] == 0 and heights[r, c] == level:
                        label[r, c] = count
                        waiting[left] = r * cols + c
                        left += 1
    return count
