"""Compiled loops of :mod:`sitescreen.climate.breeze_path`."""

import math
from typing import Any

import numpy as np
from numba import njit


@njit(nogil=True, cache=True, error_model="numpy")
def _between(near: Any, far: Any, share: Any) -> Any:
    """Height between two cell centres; a cell without weight may be unknown."""
    if share <= 0.0:
        return near
    return near + share * (far - near)


@njit(nogil=True, cache=True, error_model="numpy")
def height_m(elevation_m: Any, row: Any, col: Any) -> Any:
    """Bilinear height at a place given in rows and columns of cell centres; NaN beside the grid."""
    rows, cols = elevation_m.shape
    if not (0.0 <= row <= rows - 1 and 0.0 <= col <= cols - 1):
        return math.nan
    r0, c0 = int(row), int(col)
    r1, c1 = min(r0 + 1, rows - 1), min(c0 + 1, cols - 1)
    upper = _between(np.float64(elevation_m[r0, c0]), np.float64(elevation_m[r0, c1]), col - c0)
    lower = _between(np.float64(elevation_m[r1, c0]), np.float64(elevation_m[r1, c1]), col - c0)
    return _between(upper, lower, row - r0)


@njit(nogil=True, cache=True, error_model="numpy")
def walk(
    elevation_m: Any,
    cell_size_m: Any,
    row: Any,
    col: Any,
    row_step: Any,
    col_step: Any,
    length_m: Any,
    reaches_shore: Any,
    eye_m: Any,
    out: Any,
    first: Any,
    last: Any,
) -> None:
    """Walk from each plot towards its shore, one cell a step; row_step and col_step are the parts of a step.

    Row k of ``out``: tangent of the skyline from the eye, distance and height over the plot of the ground that makes
    it, height of the plot, of the highest and the lowest ground, of the last; 1 if all ground was known.
    """
    for plot in range(first, last):
        out[:, plot] = math.nan
        length = length_m[plot]
        if not length >= 0.0:
            continue
        here = height_m(elevation_m, row[plot], col[plot])
        out[3, plot] = here
        if here != here:
            out[7, plot] = 0.0
            continue
        best, best_m, best_height = -math.inf, math.nan, math.nan
        highest, lowest, ground = here, here, here
        known = True
        steps = math.ceil(length / cell_size_m - 1e-9)
        for k in range(1, steps + 1):
            distance = min(k * cell_size_m, length)
            share = distance / cell_size_m
            ground = height_m(elevation_m, row[plot] + share * row_step[plot], col[plot] + share * col_step[plot])
            if ground != ground:
                # the water begins within two cells of the shore's end, and its cells may be gaps
                known = known and reaches_shore[plot] and length - distance <= 2.0 * cell_size_m
                continue
            tangent = (ground - here - eye_m) / distance
            if tangent > best:
                best, best_m, best_height = tangent, distance, ground - here
            highest, lowest = max(highest, ground), min(lowest, ground)
        out[0, plot], out[1, plot], out[2, plot] = best, best_m, best_height
        out[4, plot], out[5, plot], out[6, plot] = highest, lowest, ground
        out[7, plot] = 1.0 if known else 0.0


@njit(nogil=True, cache=True, error_model="numpy")
def profile(
    elevation_m: Any,
    cell_size_m: Any,
    row: Any,
    col: Any,
    row_step: Any,
    col_step: Any,
    length_m: Any,
    distance_out: Any,
    ground_out: Any,
    count_out: Any,
    first: Any,
    last: Any,
) -> None:
    """Distances and heights along each way, its ends and between them the highest of every few samples."""
    most = distance_out.shape[1]
    for plot in range(first, last):
        length = length_m[plot]
        if not length >= 0.0:
            continue
        steps = math.ceil(length / cell_size_m - 1e-6)  # samples 0 … steps, the last at the very end
        between = max(steps - 1, 0)
        groups = min(between, most - 2)
        ends = min(steps, 1)
        count_out[plot] = groups + 1 + ends
        for point in range(groups + 1 + ends):
            if point == 0:
                begin, stop = 0, 1
            elif point <= groups:
                begin, stop = 1 + (point - 1) * between // groups, 1 + point * between // groups
            else:
                begin, stop = steps, steps + 1
            best, best_m = math.nan, min(begin * cell_size_m, length)
            for k in range(begin, stop):
                away = min(k * cell_size_m, length)
                share = away / cell_size_m
                ground = height_m(elevation_m, row[plot] + share * row_step[plot], col[plot] + share * col_step[plot])
                if ground > best or (best != best and ground == ground):
                    best, best_m = ground, away
            distance_out[plot, point], ground_out[plot, point] = best_m, best
