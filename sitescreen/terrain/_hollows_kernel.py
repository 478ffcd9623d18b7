"""Compiled loops of :mod:`sitescreen.terrain.hollows`: the filled surface, the pools, their sills and catchments."""

import math
from typing import Any

import numpy as np
from numba import njit

# Levels are only ever compared and copied, never added, so float32 in gives exactly the same levels as float64 would.
# Volumes are added up in float64.
_INF = np.float32(math.inf)

INTERIOR, RIM, OUTLET, UNKNOWN = 0, 1, 2, 3


@njit(nogil=True, cache=True, error_model="numpy")
def cell_kinds(elevation_m: Any, outlets: Any, kind: Any, start: Any, stop: Any) -> None:
    """0 interior, 1 known cell beside unknown ground, 2 outlet or known cell beside an unknown outlet, 3 unknown."""
    rows, cols = elevation_m.shape
    for row in range(start, stop):
        for col in range(cols):
            z = elevation_m[row, col]
            if z != z:
                kind[row, col] = 3
                continue
            if outlets[row, col]:
                kind[row, col] = 2
                continue
            here = 0
            if row == 0 or col == 0 or row == rows - 1 or col == cols - 1:
                here = 1
            for r in range(max(row - 1, 0), min(row + 2, rows)):
                for c in range(max(col - 1, 0), min(col + 2, cols)):
                    if elevation_m[r, c] != elevation_m[r, c]:
                        here = 2 if outlets[r, c] or here == 2 else 1
            kind[row, col] = here


@njit(nogil=True, cache=True, error_model="numpy")
def _sweep(elevation_m: Any, level_m: Any, downward: Any) -> None:
    """One raster sweep: each cell takes the lowest level that its neighbours passed so far let it drain at."""
    rows, cols = elevation_m.shape
    lowest = np.empty(cols, dtype=np.float32)
    for k in range(rows):
        row = k if downward else rows - 1 - k
        before = row - 1 if downward else row + 1
        here, ground = level_m[row], elevation_m[row]
        for col in range(cols):
            lowest[col] = here[col]
        if 0 <= before < rows:
            other = level_m[before]
            for col in range(cols):
                lowest[col] = min(lowest[col], other[col])
            for col in range(1, cols):
                lowest[col] = min(lowest[col], other[col - 1])
            for col in range(cols - 1):
                lowest[col] = min(lowest[col], other[col + 1])
        passed = _INF
        for i in range(cols):
            col = i if downward else cols - 1 - i
            z = ground[col]
            drain = min(lowest[col], passed)
            passed = drain if drain > z else z
            passed = passed if z == z else _INF
            here[col] = passed


@njit(nogil=True, cache=True, error_model="numpy")
def _push(keys: Any, cells: Any, size: Any, key: Any, cell: Any) -> Any:
    """Add to a binary heap, the lowest key on top; returns the new size."""
    i = size
    while i > 0:
        parent = (i - 1) >> 1
        if keys[parent] <= key:
            break
        keys[i] = keys[parent]
        cells[i] = cells[parent]
        i = parent
    keys[i] = key
    cells[i] = cell
    return size + 1


@njit(nogil=True, cache=True, error_model="numpy")
def _drop_top(keys: Any, cells: Any, size: Any) -> Any:
    """Remove the top of the heap; returns the new size."""
    size -= 1
    key, cell = keys[size], cells[size]
    i = 0
    while True:
        child = 2 * i + 1
        if child >= size:
            break
        if child + 1 < size and keys[child + 1] < keys[child]:
            child += 1
        if keys[child] >= key:
            break
        keys[i] = keys[child]
        cells[i] = cells[child]
        i = child
    keys[i] = key
    cells[i] = cell
    return size


@njit(nogil=True, cache=True, error_model="numpy")
def fill(elevation_m: Any, kind: Any, level_m: Any) -> None:
    """The lowest surface on and above the ground from which every cell drains to the rim or an outlet.

    Two raster sweeps, down and up, come first. Levels only ever fall to the filled surface and never pass the ground,
    so a cell whose level equals its ground is final, in any order: on real terrain about nine in ten. Each group of
    cells left over is then flooded by itself from its settled neighbours with a heap of its own (priority-flood).
    """
    rows, cols = elevation_m.shape
    for row in range(rows):
        for col in range(cols):
            z = elevation_m[row, col]
            level_m[row, col] = z if kind[row, col] == RIM or kind[row, col] == OUTLET else _INF
    _sweep(elevation_m, level_m, True)
    _sweep(elevation_m, level_m, False)

    open_ = np.zeros((rows, cols), dtype=np.uint8)
    left = 0
    for row in range(rows):
        for col in range(cols):
            if level_m[row, col] > elevation_m[row, col]:
                open_[row, col] = 1
                left += 1
    members = np.empty(left, dtype=np.int64)
    # a cell enters at most once from settled neighbours and once from within
    keys = np.empty(2 * left + 1, dtype=np.float32)
    cells = np.empty(2 * left + 1, dtype=np.int64)
    for row0 in range(rows):
        for col0 in range(cols):
            if open_[row0, col0] != 1:
                continue
            # the group, 2 = met
            open_[row0, col0] = 2
            members[0] = row0 * cols + col0
            count, done, size = 1, 0, 0
            while done < count:
                cell = members[done]
                done += 1
                row, col = cell // cols, cell % cols
                edge = _INF
                for r in range(max(row - 1, 0), min(row + 2, rows)):
                    for c in range(max(col - 1, 0), min(col + 2, cols)):
                        if open_[r, c] == 1:
                            open_[r, c] = 2
                            members[count] = r * cols + c
                            count += 1
                        elif open_[r, c] == 0 and level_m[r, c] < edge:
                            edge = level_m[r, c]
                if edge < _INF:
                    z = elevation_m[row, col]
                    size = _push(keys, cells, size, edge if edge > z else z, cell)
            while size > 0:
                level, cell = keys[0], cells[0]
                size = _drop_top(keys, cells, size)
                row, col = cell // cols, cell % cols
                if open_[row, col] == 2:
                    open_[row, col] = 3
                    level_m[row, col] = level
                elif level_m[row, col] < level:
                    continue
                for r in range(max(row - 1, 0), min(row + 2, rows)):
                    for c in range(max(col - 1, 0), min(col + 2, cols)):
                        if open_[r, c] == 2:
                            z = elevation_m[r, c]
                            # lowest first: nothing that comes later can offer less, so this is final
                            level_m[r, c] = level if level > z else z
                            open_[r, c] = 3
                            size = _push(keys, cells, size, level_m[r, c], r * cols + c)
    for row in range(rows):
        for col in range(cols):
            if kind[row, col] == UNKNOWN:
                level_m[row, col] = math.nan


@njit(nogil=True, cache=True, error_model="numpy")
def label_pools(elevation_m: Any, level_m: Any, pool_id: Any) -> Any:
    """Number the connected groups of cells under water, from 1, by their first cell in reading order; returns how many.

    Neighbours under water share one level: each would otherwise drain to the other.
    """
    rows, cols = elevation_m.shape
    stack = np.empty(1024, dtype=np.int64)
    pools = 0
    for row in range(rows):
        for col in range(cols):
            pool_id[row, col] = -1 if level_m[row, col] > elevation_m[row, col] else 0
    for row0 in range(rows):
        for col0 in range(cols):
            if pool_id[row0, col0] != -1:
                continue
            pools += 1
            pool_id[row0, col0] = pools
            stack[0] = row0 * cols + col0
            size = 1
            while size > 0:
                size -= 1
                row, col = stack[size] // cols, stack[size] % cols
                if size + 8 > stack.shape[0]:
                    longer = np.empty(2 * stack.shape[0], dtype=np.int64)
                    longer[:size] = stack[:size]
                    stack = longer
                for r in range(max(row - 1, 0), min(row + 2, rows)):
                    for c in range(max(col - 1, 0), min(col + 2, cols)):
                        if pool_id[r, c] == -1:
                            pool_id[r, c] = pools
                            stack[size] = r * cols + c
                            size += 1
    return pools


@njit(nogil=True, cache=True, error_model="numpy")
def pool_figures(
    elevation_m: Any, level_m: Any, pool_id: Any, sill_m: Any, deepest_m: Any, cells: Any, depth_sum_m: Any
) -> None:
    """Level, greatest depth, cell count and summed depth of each pool; arrays are indexed by pool number."""
    rows, cols = elevation_m.shape
    for row in range(rows):
        for col in range(cols):
            pool = pool_id[row, col]
            if pool > 0:
                depth = np.float64(level_m[row, col]) - np.float64(elevation_m[row, col])
                sill_m[pool] = level_m[row, col]
                deepest_m[pool] = max(deepest_m[pool], depth)
                cells[pool] += 1
                depth_sum_m[pool] += depth


@njit(nogil=True, cache=True, error_model="numpy")
def pool_sills(pool_id: Any, direction: Any, flat_order: Any, sill_cell: Any) -> None:
    """The cell over which each pool spills: where the way out of its first cell, nearest to the exit, leads."""
    cols = pool_id.shape[1]
    for k in range(flat_order.shape[0]):
        cell = flat_order[k]
        row, col = cell // cols, cell % cols
        pool = pool_id[row, col]
        if pool > 0 and sill_cell[pool] < 0:
            code = direction[row, col]
            sill_cell[pool] = (row + code // 3 - 1) * cols + col + code % 3 - 1


@njit(nogil=True, cache=True, error_model="numpy")
def first_stop(pool_id: Any, direction: Any, stop_at: Any) -> None:
    """Where each cell's water first comes to rest: n > 0 the pool, n < 0 the cell −1 − n where it leaves; 0 unknown.

    Cells of a pool rest in it.
    """
    rows, cols = pool_id.shape
    path = np.empty(1024, dtype=np.int64)
    for row in range(rows):
        for col in range(cols):
            stop_at[row, col] = pool_id[row, col]
    for row0 in range(rows):
        for col0 in range(cols):
            row, col = row0, col0
            size = 0
            while stop_at[row, col] == 0:
                code = direction[row, col]
                if code == 9:
                    break
                if code == 4:
                    stop_at[row, col] = -1 - (row * cols + col)
                    break
                if size == path.shape[0]:
                    longer = np.empty(2 * size, dtype=np.int64)
                    longer[:size] = path
                    path = longer
                path[size] = row * cols + col
                size += 1
                row += int(code) // 3 - 1
                col += int(code) % 3 - 1
            found = stop_at[row, col]
            for k in range(size):
                stop_at[path[k] // cols, path[k] % cols] = found


@njit(nogil=True, cache=True, error_model="numpy")
def count_catchments(stop_at: Any, cells: Any) -> None:
    """How many cells come to rest in each pool, its own included."""
    for row in range(stop_at.shape[0]):
        for col in range(stop_at.shape[1]):
            if stop_at[row, col] > 0:
                cells[stop_at[row, col]] += 1


@njit(nogil=True, cache=True, error_model="numpy")
def pool_exits(stop_at: Any, sill_cell: Any, exit_cell: Any) -> None:
    """The cell where each pool's overflow leaves the ground in the end, through whatever pools it fills on its way."""
    cols = stop_at.shape[1]
    path = np.empty(sill_cell.shape[0], dtype=np.int64)
    for first in range(1, sill_cell.shape[0]):
        pool = first
        size = 0
        found = np.int64(-1)
        while True:
            if exit_cell[pool] >= 0:
                found = exit_cell[pool]
                break
            path[size] = pool
            size += 1
            next_ = stop_at[sill_cell[pool] // cols, sill_cell[pool] % cols]
            if next_ < 0:
                found = -1 - np.int64(next_)
                break
            pool = next_
        for k in range(size):
            exit_cell[path[k]] = found
