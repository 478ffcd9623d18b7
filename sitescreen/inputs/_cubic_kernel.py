# mypy: disallow-untyped-decorators=False
"""Loops that read heights off a source raster at the centres of grid cells."""

import math
from typing import Any

import numpy as np
from numba import njit, prange

OUTSIDE, KNOWN, CLOSED, VOID = 0, 1, 2, 3
"""What lies under a cell: no file, a height, a height in a gap that was closed, a gap."""


@njit(cache=True)
def _cubic(x: float) -> float:
    """Keys' cubic convolution with a = −1/2 (1981, IEEE Trans. ASSP 29:1153–1160, Eq. 15)."""
    x = abs(x)
    if x >= 2.0:
        return 0.0
    if x >= 1.0:
        return ((-0.5 * x + 2.5) * x - 4.0) * x + 2.0
    return (1.5 * x - 2.5) * x * x + 1.0


@njit(cache=True)
def _between(t: float, a: float, b: float, c: float, d: float) -> float:
    """The cubic through four points at −1, 0, 1, 2 (Lagrange), at t from 0 to 1."""
    return (
        -t * (t - 1.0) * (t - 2.0) / 6.0 * a
        + (t + 1.0) * (t - 1.0) * (t - 2.0) / 2.0 * b
        - (t + 1.0) * t * (t - 2.0) / 2.0 * c
        + (t + 1.0) * t * (t - 1.0) / 6.0 * d
    )


@njit(cache=True)
def _sum(
    ground: Any,
    row: int,
    col: int,
    past_row: float,
    past_col: float,
    scale_v: float,
    scale_u: float,
    cubic: bool,
    weights_u: Any,
) -> tuple[float, float, bool]:
    """Weighted sum of heights, the sum of weights, and whether an unknown height had a weight.

    The point lies ``past_row`` and ``past_col`` (0 to 1) after the centre of the cell ``row``, ``col``. Whole and
    fractional parts are kept apart, since a position counted from the window's corner would be rounded with it.
    ``weights_u`` is room for the weights along a row.
    """
    reach = 2.0 if cubic else 1.0
    first_u = math.ceil(past_col - reach * scale_u)
    count_u = math.floor(past_col + reach * scale_u) + 1 - first_u
    for m in range(count_u):
        x = (first_u + m - past_col) / scale_u
        weights_u[m] = _cubic(x) if cubic else max(0.0, 1.0 - abs(x))
    total, weights, missing = 0.0, 0.0, False
    for k in range(math.ceil(past_row - reach * scale_v), math.floor(past_row + reach * scale_v) + 1):
        y = (k - past_row) / scale_v
        weight_v = _cubic(y) if cubic else max(0.0, 1.0 - abs(y))
        if weight_v == 0.0:
            continue
        for m in range(count_u):
            weight = weight_v * weights_u[m]
            if weight == 0.0:
                continue
            at_row, at_col = row + k, col + first_u + m
            if not (0 <= at_row < ground.shape[0] and 0 <= at_col < ground.shape[1]):
                missing = True
                continue
            height = ground[at_row, at_col]
            if math.isnan(height):
                missing = True
            else:
                total += weight * height
                weights += weight
    return total, weights, missing


@njit(cache=True)
def _plane(
    ground: Any, row: int, col: int, past_row: float, past_col: float, scale_v: float, scale_u: float, weights_u: Any
) -> tuple[float, float, float]:
    """The plane that fits the known heights around a point best, near ones counting most.

    Its height at the point and its rise per ``scale_u`` columns and ``scale_v`` rows. Arguments as for :func:`_sum`.
    """
    first_u = math.ceil(past_col - 2.0 * scale_u)
    count_u = math.floor(past_col + 2.0 * scale_u) + 1 - first_u
    for m in range(count_u):
        weights_u[m] = max(0.0, 1.0 - abs(first_u + m - past_col) / (2.0 * scale_u))
    first_v = math.ceil(past_row - 2.0 * scale_v)
    count_v = math.floor(past_row + 2.0 * scale_v) + 1 - first_v
    at_x, at_y, at_z, weights = 0.0, 0.0, 0.0, 0.0
    xx, xy, yy, xz, yz = 0.0, 0.0, 0.0, 0.0, 0.0
    base = 0.0  # the first height: sums of differences keep their digits
    for k in range(count_v):
        y = (first_v + k - past_row) / scale_v
        weight_v = max(0.0, 1.0 - abs(y) / 2.0)
        for m in range(count_u):
            weight = weight_v * weights_u[m]
            r, c = row + first_v + k, col + first_u + m
            if weight == 0.0 or not (0 <= r < ground.shape[0] and 0 <= c < ground.shape[1]):
                continue
            if math.isnan(ground[r, c]):
                continue
            if weights == 0.0:
                base = float(ground[r, c])
            x, z = (first_u + m - past_col) / scale_u, float(ground[r, c]) - base
            weights += weight
            at_x, at_y, at_z = at_x + weight * x, at_y + weight * y, at_z + weight * z
            xx, xy, yy = xx + weight * x * x, xy + weight * x * y, yy + weight * y * y
            xz, yz = xz + weight * x * z, yz + weight * y * z
    at_x, at_y, at_z = at_x / weights, at_y / weights, at_z / weights
    xx, xy, yy = xx / weights - at_x * at_x, xy / weights - at_x * at_y, yy / weights - at_y * at_y
    xz, yz = xz / weights - at_x * at_z, yz / weights - at_y * at_z
    slope_x, slope_y = 0.0, 0.0
    determinant = xx * yy - xy * xy
    if determinant > 1e-3:
        slope_x, slope_y = (xz * yy - yz * xy) / determinant, (yz * xx - xz * xy) / determinant
    elif xx + yy > 1e-3:  # the known cells lie in one line: the slope along it is all that they tell
        slope_x, slope_y = xz / (xx + yy), yz / (xx + yy)
    return base + at_z - slope_x * at_x - slope_y * at_y, slope_x, slope_y


@njit(cache=True)
def _beside_gap(
    ground: Any, row: int, col: int, past_row: float, past_col: float, scale_v: float, scale_u: float, weights_u: Any
) -> float:
    """Height at a point some of whose neighbours are unknown: the tent's mean, a plane standing in for those.

    Left out, they would pull the mean to the known side: on a slope of 20 % half a 30 m cell makes that 3 m, a bank
    along every gap and seam that is not there. Arguments as for :func:`_sum`.
    """
    height, slope_x, slope_y = _plane(ground, row, col, past_row, past_col, scale_v, scale_u, weights_u)
    first_u = math.ceil(past_col - scale_u)
    count_u = math.floor(past_col + scale_u) + 1 - first_u
    total, weights = 0.0, 0.0
    for k in range(math.ceil(past_row - scale_v), math.floor(past_row + scale_v) + 1):
        y = (k - past_row) / scale_v
        for m in range(count_u):
            x = (first_u + m - past_col) / scale_u
            weight = max(0.0, 1.0 - abs(y)) * max(0.0, 1.0 - abs(x))
            r, c = row + k, col + first_u + m
            known = 0 <= r < ground.shape[0] and 0 <= c < ground.shape[1] and not math.isnan(ground[r, c])
            total += weight * (float(ground[r, c]) if known else height + slope_x * x + slope_y * y)
            weights += weight
    return total / weights


@njit(cache=True, parallel=True)
def read_cells(
    ground: Any,
    covered: Any,
    closed: Any,
    wanted: Any,
    first_row: int,
    first_col: int,
    u_nodes: Any,
    v_nodes: Any,
    step: int,
    offset_row: int,
    offset_col: int,
    widest: int,
    heights: Any,
    under: Any,
    stored: Any,
) -> None:
    """Fill ``heights``, ``under`` and ``stored`` (the nearest height as it is) where a grid cell is ``wanted``.

    ``ground`` starts at source row and column ``first_row`` and ``first_col``; positions ``u_nodes`` (column) and
    ``v_nodes`` (row) are in source cells from their outer edges, at every ``step``-th grid cell; the first cell lies
    ``offset_row`` and ``offset_col`` cells after the first node. ``widest`` bounds the cells under the kernel's width.
    """
    rows, cols = heights.shape
    nodes = u_nodes.shape[1]
    for row in prange(rows):
        node_row = (row + offset_row) // step
        t_row = ((row + offset_row) % step) / step
        u_row = np.empty(nodes)
        v_row = np.empty(nodes)
        weights_u = np.empty(widest)
        for n in range(nodes):
            u_row[n] = _between(
                t_row,
                u_nodes[node_row - 1, n],
                u_nodes[node_row, n],
                u_nodes[node_row + 1, n],
                u_nodes[node_row + 2, n],
            )
            v_row[n] = _between(
                t_row,
                v_nodes[node_row - 1, n],
                v_nodes[node_row, n],
                v_nodes[node_row + 1, n],
                v_nodes[node_row + 2, n],
            )
        for col in range(cols):
            if not wanted[row, col]:
                continue
            n = (col + offset_col) // step
            t_col = ((col + offset_col) % step) / step
            u = _between(t_col, u_row[n - 1], u_row[n], u_row[n + 1], u_row[n + 2])
            v = _between(t_col, v_row[n - 1], v_row[n], v_row[n + 1], v_row[n + 2])
            if not (abs(u) < 1e12 and abs(v) < 1e12):
                continue  # beyond what the projection can show
            at_col = math.floor(u) - first_col
            at_row = math.floor(v) - first_row
            if not (0 <= at_row < ground.shape[0] and 0 <= at_col < ground.shape[1]):
                continue
            if not covered[at_row, at_col]:
                continue
            if math.isnan(ground[at_row, at_col]):
                under[row, col] = VOID
                continue
            stored[row, col] = ground[at_row, at_col]
            # cells of the source under one cell of the grid, along each axis of the source; the kernel widens with them
            across_u = (u_nodes[node_row, n + 1] - u_nodes[node_row, n]) / step
            down_u = (u_nodes[node_row + 1, n] - u_nodes[node_row, n]) / step
            across_v = (v_nodes[node_row, n + 1] - v_nodes[node_row, n]) / step
            down_v = (v_nodes[node_row + 1, n] - v_nodes[node_row, n]) / step
            scale_u = max(1.0, math.sqrt(across_u * across_u + down_u * down_u))
            scale_v = max(1.0, math.sqrt(across_v * across_v + down_v * down_v))
            whole_u, whole_v = math.floor(u - 0.5), math.floor(v - 0.5)
            past_u, past_v = u - 0.5 - whole_u, v - 0.5 - whole_v
            r, c = whole_v - first_row, whole_u - first_col
            total, weights, missing = _sum(ground, r, c, past_v, past_u, scale_v, scale_u, True, weights_u)
            if missing:
                # beside a gap the cubic's negative lobes would swing; the tent's weights are all positive
                total, weights, missing = _sum(ground, r, c, past_v, past_u, scale_v, scale_u, False, weights_u)
            if missing:
                heights[row, col] = _beside_gap(ground, r, c, past_v, past_u, scale_v, scale_u, weights_u)
            else:
                heights[row, col] = total / weights
            under[row, col] = CLOSED if closed[at_row, at_col] else KNOWN
