"""Compiled loops of :mod:`sitescreen.terrain.drainage`: flow directions and what follows them.

A direction is one number, 3·(row step + 1) + (column step + 1): 0 north-west, 1 north, 2 north-east, 3 west, 5 east,
6 south-west, 7 south, 8 south-east; 4 stands for leaving here, 9 for unknown ground.
"""

import math
from typing import Any

import numpy as np
from numba import njit

_FLAT = 10


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
    rows, cols = level_m.shape
    count = 0
    for row in range(rows):
        for col in range(cols):
            if direction[row, col] == _FLAT:
                count += 1
    order = np.empty(count, dtype=np.int64)
    size = 0
    for row in range(1, rows - 1):
        for col in range(1, cols - 1):
            if direction[row, col] != _FLAT:
                continue
            for code in range(9):
                r, c = row + code // 3 - 1, col + code % 3 - 1
                # 16 and more: reached in this pass, not an exit of its own
                if direction[r, c] < 9 and level_m[r, c] == level_m[row, col]:
                    direction[row, col] = 16 + code
                    order[size] = row * cols + col
                    size += 1
                    break
    for k in range(size):
        direction[order[k] // cols, order[k] % cols] -= 16
    done = 0
    while done < size:
        row, col = order[done] // cols, order[done] % cols
        done += 1
        for code in range(9):
            r, c = row + code // 3 - 1, col + code % 3 - 1
            if direction[r, c] == _FLAT and level_m[r, c] == level_m[row, col]:
                direction[r, c] = 8 - code
                order[size] = r * cols + c
                size += 1
    return order[:size]


@njit(nogil=True, cache=True, error_model="numpy")
def accumulate(direction: Any, cells: Any) -> None:
    """How many cells drain through each cell, itself included; unknown ground 0."""
    rows, cols = direction.shape
    inflows = np.zeros((rows, cols), dtype=np.uint8)
    for row in range(rows):
        for col in range(cols):
            code = direction[row, col]
            cells[row, col] = 0 if code == 9 else 1
            if code != 9 and code != 4:
                inflows[row + code // 3 - 1, col + code % 3 - 1] += 1
    for row0 in range(rows):
        for col0 in range(cols):
            if inflows[row0, col0] != 0 or direction[row0, col0] == 9:
                continue
            row, col = row0, col0
            while True:
                code = direction[row, col]
                if code == 4:
                    break
                carried = cells[row, col]
                inflows[row, col] = 255  # passed on
                row += int(code) // 3 - 1
                col += int(code) % 3 - 1
                cells[row, col] += carried
                inflows[row, col] -= 1
                if inflows[row, col] != 0:
                    break


@njit(nogil=True, cache=True, error_model="numpy")
def heights_above_channel(elevation_m: Any, direction: Any, channel: Any, height_m: Any) -> None:
    """Height of each cell over the channel cell that it drains to; NaN where its way leaves without meeting one."""
    rows, cols = direction.shape
    floor_m = np.full((rows, cols), np.float32(math.inf), dtype=np.float32)
    path = np.empty(1024, dtype=np.int64)
    for row0 in range(rows):
        for col0 in range(cols):
            row, col = row0, col0
            size = 0
            while True:
                found = floor_m[row, col]
                if found < math.inf or found != found:
                    break
                if channel[row, col]:
                    found = elevation_m[row, col]
                    floor_m[row, col] = found
                    break
                code = direction[row, col]
                if code == 4 or code == 9:
                    found = np.float32(math.nan)
                    floor_m[row, col] = found
                    break
                if size == path.shape[0]:
                    longer = np.empty(2 * size, dtype=np.int64)
                    longer[:size] = path
                    path = longer
                path[size] = row * cols + col
                size += 1
                row += int(code) // 3 - 1
                col += int(code) % 3 - 1
            for k in range(size):
                floor_m[path[k] // cols, path[k] % cols] = found
    for row in range(rows):
        for col in range(cols):
            height_m[row, col] = elevation_m[row, col] - floor_m[row, col]
