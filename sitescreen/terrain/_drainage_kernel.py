"""Compiled loops of :mod:`sitescreen.terrain.drainage`: flow directions and what follows them.

A direction is one number, 3·(row step + 1) + (column step + 1): 0 north-west, 1 north, 2 north-east, 3 west, 5 east,
6 south-west, 7 south, 8 south-east; 4 stands for leaving here, 9 for unknown ground.
"""

import math
from typing import Any

import numpy as np
from numba import njit

_FLAT = 10
_INF = np.float32(math.inf)


@njit(nogil=True, cache=True, error_model="numpy")
def steepest_ways(level_m: Any, kind: Any, direction: Any, start: Any, stop: Any) -> None:
    """Direction of the steepest fall on the filled surface; 10 where no neighbour lies lower."""
    cols = level_m.shape[1]
    diagonal = np.float32(1.0 / math.sqrt(2.0))
    for row in range(start, stop):
        for col in range(cols):
            if kind[row, col] == 3:
                direction[row, col] = 9
            elif kind[row, col] != 0:
                direction[row, col] = 4
            else:
                here = level_m[row, col]
                best, code = np.float32(0.0), 10
                fall = (here - level_m[row - 1, col - 1]) * diagonal
                if fall > best:
                    best, code = fall, 0
                fall = here - level_m[row - 1, col]
                if fall > best:
                    best, code = fall, 1
                fall = (here - level_m[row - 1, col + 1]) * diagonal
                if fall > best:
                    best, code = fall, 2
                fall = here - level_m[row, col - 1]
                if fall > best:
                    best, code = fall, 3
                fall = here - level_m[row, col + 1]
                if fall > best:
                    best, code = fall, 5
                fall = (here - level_m[row + 1, col - 1]) * diagonal
                if fall > best:
                    best, code = fall, 6
                fall = here - level_m[row + 1, col]
                if fall > best:
                    best, code = fall, 7
                fall = (here - level_m[row + 1, col + 1]) * diagonal
                if fall > best:
                    best, code = fall, 8
                direction[row, col] = code


@njit(nogil=True, cache=True, error_model="numpy")
def flat_ways(level_m: Any, direction: Any) -> Any:
    """Lead level cells, step by step, to the nearest place where their level ends; returns them in the order reached.

    The wave starts from every cell that already drains, so whatever it reaches first is nearest to an exit.
    """
    cols = level_m.shape[1]
    # level cells are never on the outer ring, which leaves: all their neighbours exist
    ways = np.array([-cols - 1, -cols, -cols + 1, -1, 0, 1, cols - 1, cols, cols + 1])
    level, way = level_m.reshape(-1), direction.reshape(-1)
    count = 0
    for cell in range(way.shape[0]):
        count += 1 if way[cell] == _FLAT else 0
    order = np.empty(count, dtype=np.int64)
    size = 0
    for cell in range(way.shape[0]):
        if way[cell] != _FLAT:
            continue
        for code in range(9):
            other = cell + ways[code]
            # 16 and more: reached in this pass, not an exit of its own
            if way[other] < 9 and level[other] == level[cell]:
                way[cell] = 16 + code
                order[size] = cell
                size += 1
                break
    for k in range(size):
        way[order[k]] -= 16
    done = 0
    while done < size:
        cell = order[done]
        done += 1
        for code in range(9):
            other = cell + ways[code]
            if way[other] == _FLAT and level[other] == level[cell]:
                way[other] = 8 - code
                order[size] = other
                size += 1
    return order[:size]


@njit(nogil=True, cache=True, error_model="numpy")
def count_inflows(direction: Any, inflows: Any, start: Any, stop: Any) -> None:
    """How many of its eight neighbours drain into each cell; the outer ring receives too."""
    rows, cols = direction.shape
    for row in range(start, stop):
        here = inflows[row]
        here[:] = 0
        for code in range(9):
            # the neighbour at ``code`` drains here if its own direction is the opposite one
            if code == 4 or not 0 <= row + code // 3 - 1 < rows:
                continue
            aside = code % 3 - 1
            low, high = max(0, -aside), min(cols, cols - aside)
            other, opposite = direction[row + code // 3 - 1, low + aside :], np.uint8(8 - code)
            target = here[low:]
            for col in range(high - low):
                target[col] += np.uint8(1) if other[col] == opposite else np.uint8(0)


@njit(nogil=True, cache=True, error_model="numpy")
def accumulate(direction: Any, inflows: Any, cells: Any) -> None:
    """How many cells drain through each cell, itself included; unknown ground 0. Uses up ``inflows``."""
    cols = direction.shape[1]
    ways = np.array([-cols - 1, -cols, -cols + 1, -1, 0, 1, cols - 1, cols, cols + 1])
    way, waiting_for, total = direction.reshape(-1), inflows.reshape(-1), cells.reshape(-1)
    for cell in range(way.shape[0]):
        total[cell] = 0 if way[cell] == 9 else 1
    for first in range(way.shape[0]):
        if waiting_for[first] != 0 or way[first] == 9:
            continue
        cell = first
        while True:
            waiting_for[cell] = 255  # passed on
            if way[cell] == 4:
                break
            carried = total[cell]
            cell += ways[way[cell]]
            total[cell] += carried
            waiting_for[cell] -= 1
            if waiting_for[cell] != 0:
                break


@njit(nogil=True, cache=True, error_model="numpy")
def heights_above_channel(elevation_m: Any, direction: Any, channel: Any, height_m: Any) -> None:
    """Height of each cell over the channel cell that it drains to; NaN where its way leaves without meeting one."""
    cols = direction.shape[1]
    ways = np.array([-cols - 1, -cols, -cols + 1, -1, 0, 1, cols - 1, cols, cols + 1])
    ground, way, is_channel, height = (
        elevation_m.reshape(-1),
        direction.reshape(-1),
        channel.reshape(-1),
        height_m.reshape(-1),
    )
    floor_m = np.full(way.shape[0], _INF, dtype=np.float32)
    path = np.empty(1024, dtype=np.int64)
    for first in range(way.shape[0]):
        cell = first
        size = 0
        while floor_m[cell] == _INF:
            if is_channel[cell]:
                floor_m[cell] = ground[cell]
                break
            if way[cell] == 4 or way[cell] == 9:
                floor_m[cell] = math.nan
                break
            if size == path.shape[0]:
                longer = np.empty(2 * size, dtype=np.int64)
                longer[:size] = path
                path = longer
            path[size] = cell
            size += 1
            cell += ways[way[cell]]
        for k in range(size):
            floor_m[path[k]] = floor_m[cell]
    for cell in range(way.shape[0]):
        height[cell] = ground[cell] - floor_m[cell]
