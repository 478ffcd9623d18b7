"""Compiled loops of :mod:`sitescreen.terrain.position`."""

import math
from typing import Any

import numpy as np
from numba import njit


@njit(nogil=True, cache=True, error_model="numpy")
def running_sums(elevation_m: Any, steps_per_m: Any, sum_steps: Any, sum_unknown: Any, start: Any, stop: Any) -> None:
    """Sums of each row from its west end, in whole steps of height, and how many cells were unknown.

    Whole numbers, because their sum is the same whatever the order: a disc's mean then does not depend on where the
    window begins. Where no ground is unknown, ``sum_unknown`` may have no rows: nothing is counted.
    """
    counting = sum_unknown.shape[0] > 0
    cols = elevation_m.shape[1]
    for row in range(start, stop):
        total = np.int64(0)
        unknown = np.int32(0)
        sum_steps[row, 0] = 0
        if counting:
            sum_unknown[row, 0] = 0
        for col in range(cols):
            z = elevation_m[row, col]
            if math.isnan(z):
                unknown += np.int32(1)
            else:
                total += np.int64(np.rint(np.float64(z) * steps_per_m))
            sum_steps[row, col + 1] = total
            if counting:
                sum_unknown[row, col + 1] = unknown


@njit(nogil=True, cache=True, error_model="numpy")
def disc_means(
    sum_steps: Any, sum_unknown: Any, half_widths: Any, steps_per_m: Any, mean_m: Any, start: Any, stop: Any
) -> None:
    """Mean of each disc from the rows' running sums; NaN where the disc is not wholly known."""
    rows, cols = mean_m.shape
    reach = half_widths.shape[0] // 2
    cells = 0
    for k in range(half_widths.shape[0]):
        cells += 2 * half_widths[k] + 1
    scale = 1.0 / (steps_per_m * cells)
    total = np.empty(cols, dtype=np.int64)
    unknown = np.empty(cols, dtype=np.int32)
    for row in range(start, stop):
        mean_m[row, :] = np.nan
        if row < reach or row >= rows - reach or cols <= 2 * reach:
            continue
        total[:] = 0
        unknown[:] = 0
        inside = cols - 2 * reach
        for k in range(half_widths.shape[0]):
            half = half_widths[k]
            here = row + k - reach
            east = sum_steps[here, reach + half + 1 : reach + half + 1 + inside]
            west = sum_steps[here, reach - half : reach - half + inside]
            for i in range(inside):
                total[i] += east[i] - west[i]
            if sum_unknown.shape[0] == 0:
                continue
            east_unknown = sum_unknown[here, reach + half + 1 : reach + half + 1 + inside]
            west_unknown = sum_unknown[here, reach - half : reach - half + inside]
            for i in range(inside):
                unknown[i] += east_unknown[i] - west_unknown[i]
        for i in range(inside):
            if unknown[i] == 0:
                mean_m[row, reach + i] = total[i] * scale
