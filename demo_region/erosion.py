"""Running water: fill what does not drain, route it, cut valleys. The loops that shape the invented ground."""

import math

import numpy as np
from numba import njit

# The eight neighbours, by row and column, and how far away each is in cells.
_ROWS = np.array([-1, -1, -1, 0, 0, 1, 1, 1])
_COLS = np.array([-1, 0, 1, -1, 1, -1, 0, 1])
_AWAY = np.array([math.sqrt(2), 1, math.sqrt(2), 1, 1, math.sqrt(2), 1, math.sqrt(2)])


@njit(cache=True)
def _push(keys, cells, size, key, cell):
    at = size
    while at > 0:
        parent = (at - 1) >> 1
        if keys[parent] <= key:
            break
        keys[at] = keys[parent]
        cells[at] = cells[parent]
        at = parent
    keys[at] = key
    cells[at] = cell


@njit(cache=True)
def _pop(keys, cells, size):
    key, cell = keys[size - 1], cells[size - 1]
    at = 0
    while True:
        child = 2 * at + 1
        if child >= size - 1:
            break
        if child + 1 < size - 1 and keys[child + 1] < keys[child]:
            child += 1
        if keys[child] >= key:
            break
        keys[at] = keys[child]
        cells[at] = cells[child]
        at = child
    keys[at] = key
    cells[at] = cell


@njit(cache=True)
def flood(ground, outlets, step):
    """Priority flood: the lowest surface that drains to the outlets or the edge, rising at least ``step`` a cell.

    Returns the surface and the cells in the order in which water reaches them (downstream before upstream).
    """
    rows, cols = ground.shape
    filled = np.full((rows, cols), np.inf)
    order = np.empty(rows * cols, np.int64)
    keys = np.empty(rows * cols, np.float64)
    cells = np.empty(rows * cols, np.int64)
    size = 0
    for row in range(rows):
        for col in range(cols):
            if outlets[row, col] or row == 0 or col == 0 or row == rows - 1 or col == cols - 1:
                filled[row, col] = ground[row, col]
                _push(keys, cells, size, ground[row, col], row * cols + col)
                size += 1
    done = 0
    while size > 0:
        here = cells[0]
        root_key = keys[0]
        _pop(keys, cells, size)
        size -= 1
        order[done] = here
        done += 1
        row, col = here // cols, here % cols
        for way in range(8):
            r, c = row + _ROWS[way], col + _COLS[way]
            if r < 0 or c < 0 or r >= rows or c >= cols or filled[r, c] != np.inf:
                continue
            filled[r, c] = max(ground[r, c], root_key + step)
            _push(keys, cells, size, filled[r, c], r * cols + c)
            size += 1
    return filled, order


@njit(cache=True)
def route(filled, outlets, order):
    """Steepest way down of every cell (itself where water leaves), its length in cells, and the cells upstream."""
    rows, cols = filled.shape
    to = np.empty(rows * cols, np.int64)
    away = np.ones(rows * cols)
    area = np.ones(rows * cols)
    for here in range(rows * cols):
        row, col = here // cols, here % cols
        to[here] = here
        if outlets[row, col] or row == 0 or col == 0 or row == rows - 1 or col == cols - 1:
            continue
        steepest = 0.0
        for way in range(8):
            r, c = row + _ROWS[way], col + _COLS[way]
            fall = (filled[row, col] - filled[r, c]) / _AWAY[way]
            if fall > steepest:
                steepest = fall
                to[here] = r * cols + c
                away[here] = _AWAY[way]
    for k in range(rows * cols - 1, -1, -1):
        here = order[k]
        if to[here] != here:
            area[to[here]] += area[here]
    return to, away, area


@njit(cache=True)
def cut(ground, order, to, away, area_km2, softness, cell_km):
    """One implicit step of stream-power incision (exponents 0.45 and 1), downstream cells first."""
    flat = ground.ravel().copy()
    soft = softness.ravel()
    for k in range(order.size):
        here = order[k]
        below = to[here]
        if below == here:
            continue
        if flat[below] < flat[here]:
            rate = soft[here] * area_km2[here] ** 0.45 / (away[here] * cell_km)
            flat[here] = (flat[here] + rate * flat[below]) / (1.0 + rate)
    return flat.reshape(ground.shape)


def weather(ground, outlets, softness, cell_km, steps, creep, restore=None):
    """Let water cut valleys and slopes creep for some steps.

    Parameters
    ----------
    ground : array, shape (rows, cols)
        Height. [m]
    outlets : bool array
        Where water leaves: sea, lakes, the floors of hollows that must stay. Never changed.
    softness : array
        How fast water cuts, km per step at 1 km² of catchment; 0 keeps the ground.
    cell_km : float
        Side of a cell. [km]
    steps : int
    creep : float
        Share of the difference to the mean of the four neighbours lost in each step.
    restore : callable, optional
        Called with the ground after each step; what it returns is added (uplift).
    """
    keep = outlets | (softness <= 0)
    for _ in range(steps):
        filled, order = flood(ground, outlets, 1e-4)
        to, away, area = route(filled, outlets, order)
        cut_ground = cut(filled, order, to, away, area * cell_km**2, softness, cell_km)
        ground = np.where(keep, ground, cut_ground)
        around = ground.copy()
        around[1:-1, 1:-1] = (ground[:-2, 1:-1] + ground[2:, 1:-1] + ground[1:-1, :-2] + ground[1:-1, 2:]) / 4
        ground = np.where(keep, ground, ground + creep * (around - ground))
        if restore is not None:
            ground = np.where(outlets, ground, ground + restore(ground))
    return ground


def upstream_km2(ground, outlets, cell_km):
    """Catchment of every cell over the filled ground, in square kilometres."""
    filled, order = flood(ground, outlets, 1e-4)
    return (route(filled, outlets, order)[2] * cell_km**2).reshape(ground.shape)
