"""Compiled loops of :mod:`sitescreen.terrain.hollows`: the filled surface, the pools, their sills and catchments."""

import math
from typing import Any

import numpy as np
from numba import njit

# Levels are only ever compared and copied, never added, so float32 in gives exactly the same levels as float64 would.
# Volumes are added up in float64.
_INF = np.float32(math.inf)
_NAN = np.float32(math.nan)

INTERIOR, RIM, OUTLET, UNKNOWN = 0, 1, 2, 3


@njit(nogil=True, cache=True, error_model="numpy")
def cell_kinds(elevation_m: Any, outlets: Any, kind: Any, start: Any, stop: Any) -> None:
    """0 interior, 1 known cell beside unknown ground, 2 outlet or known cell beside an unknown outlet, 3 unknown."""
    rows, cols = elevation_m.shape
    columns = np.empty(cols, dtype=np.float32)
    for row in range(start, stop):
        inner = 0 < row < rows - 1
        if inner:
            above, here, below = elevation_m[row - 1], elevation_m[row], elevation_m[row + 1]
            for col in range(cols):
                columns[col] = (above[col] - above[col]) + (here[col] - here[col]) + (below[col] - below[col])
        for col in range(cols):
            # nearly every cell: inside the data, all nine of its neighbourhood known
            if inner and 0 < col < cols - 1 and columns[col - 1] + columns[col] + columns[col + 1] == 0:
                kind[row, col] = 2 if outlets[row, col] else 0
                continue
            z = elevation_m[row, col]
            if z != z:
                kind[row, col] = 3
                continue
            if outlets[row, col]:
                kind[row, col] = 2
                continue
            beside = 1 if row == 0 or col == 0 or row == rows - 1 or col == cols - 1 else 0
            for r in range(max(row - 1, 0), min(row + 2, rows)):
                for c in range(max(col - 1, 0), min(col + 2, cols)):
                    if elevation_m[r, c] != elevation_m[r, c]:
                        beside = 2 if outlets[r, c] or beside == 2 else 1
            kind[row, col] = beside


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
def _flood_group(
    first: Any,
    around: Any,
    ground: Any,
    level: Any,
    state: Any,
    members: Any,
    keys: Any,
    cells: Any,
) -> None:
    """Priority-flood of one group of open cells (state 1) from its settled neighbours (state 0)."""
    # the group, 2 = met, each cell at the lowest level that its settled neighbours let it drain at
    state[first] = 2
    members[0] = first
    count, done, size = 1, 0, 0
    while done < count:
        cell = members[done]
        done += 1
        edge = _INF
        for k in range(8):
            other = cell + around[k]
            if state[other] == 1:
                state[other] = 2
                members[count] = other
                count += 1
            elif state[other] == 0 and level[other] < edge:
                edge = level[other]
        level[cell] = edge if edge > ground[cell] else ground[cell]
    # the flood starts from the lowest of them: a cell beside a lower one will be offered that one's level, or its own
    # height, which is no more than it has
    for k in range(count):
        cell = members[k]
        offered = level[cell]
        lowest = offered < _INF
        if lowest:
            for j in range(8):
                other = cell + around[j]
                if level[other] <= offered and state[other] == 2 and (level[other] < offered or other < cell):
                    lowest = False
                    break
        if lowest:
            size = _push(keys, cells, size, level[cell], cell)
    wet = members  # the list is no longer needed
    while size > 0:
        now, cell = keys[0], cells[0]
        size = _drop_top(keys, cells, size)
        if state[cell] == 2:
            state[cell] = 3
            level[cell] = now
        elif level[cell] < now:
            continue
        # cells that this level floods are next in any order: they need no heap
        wet[0] = cell
        waiting = 1
        while waiting > 0:
            waiting -= 1
            cell = wet[waiting]
            for k in range(8):
                other = cell + around[k]
                if state[other] != 2:
                    continue
                # lowest first: nothing that comes later can offer less, so this is final
                state[other] = 3
                z = ground[other]
                if z <= now:
                    level[other] = now
                    wet[waiting] = other
                    waiting += 1
                else:
                    level[other] = z
                    size = _push(keys, cells, size, z, other)


@njit(nogil=True, cache=True, error_model="numpy")
def drained_levels(elevation_m: Any, kind: Any, level_m: Any, start: Any, stop: Any) -> None:
    """Where the fill starts from: ground that drains at its own height, everything else at no limit yet."""
    for row in range(start, stop):
        ground, what, level = elevation_m[row], kind[row], level_m[row]
        for col in range(ground.shape[0]):
            level[col] = ground[col] if what[col] == RIM or what[col] == OUTLET else _INF


@njit(nogil=True, cache=True, error_model="numpy")
def sweep_levels(elevation_m: Any, level_m: Any) -> None:
    """Two raster sweeps, down and up.

    Levels only ever fall to the filled surface and never pass the ground, so a cell whose level equals its ground is
    final, in any order: on real terrain about nine in ten.
    """
    _sweep(elevation_m, level_m, True)
    _sweep(elevation_m, level_m, False)


@njit(nogil=True, cache=True, error_model="numpy")
def open_cells(elevation_m: Any, kind: Any, level_m: Any, state: Any, start: Any, stop: Any) -> None:
    """Mark in ``state`` the cells whose level is not final, with 1; unknown ground gets no level."""
    for row in range(start, stop):
        ground, what, level, open_ = elevation_m[row], kind[row], level_m[row], state[row]
        for col in range(ground.shape[0]):
            open_[col] = 1 if level[col] > ground[col] else 0
            level[col] = _NAN if what[col] == UNKNOWN else level[col]


@njit(nogil=True, cache=True, error_model="numpy")
def flood_open_cells(elevation_m: Any, level_m: Any, state: Any, count: Any) -> None:
    """Flood each group of the ``count`` open cells by itself, from its settled neighbours with a heap of its own."""
    cols = elevation_m.shape[1]
    # open cells are never on the outer ring, which drains: all their neighbours exist
    around = np.array([-cols - 1, -cols, -cols + 1, -1, 1, cols - 1, cols, cols + 1])
    ground, level, mark = elevation_m.reshape(-1), level_m.reshape(-1), state.reshape(-1)
    members = np.empty(count, dtype=np.int32)
    # a cell enters the heap at most once from settled neighbours and once from within
    keys = np.empty(2 * count + 1, dtype=np.float32)
    cells = np.empty(2 * count + 1, dtype=np.int32)
    for cell in range(mark.shape[0]):
        if mark[cell] == 1:
            _flood_group(cell, around, ground, level, mark, members, keys, cells)


@njit(nogil=True, cache=True, error_model="numpy")
def label_pools(elevation_m: Any, level_m: Any, pool_id: Any) -> Any:
    """Number the connected groups of cells under water, from 1, by their first cell in reading order; returns how many.

    Neighbours under water share one level: each would otherwise drain to the other.
    """
    rows, cols = elevation_m.shape
    # as in the flood, no cell under water is on the outer ring
    around = np.array([-cols - 1, -cols, -cols + 1, -1, 1, cols - 1, cols, cols + 1])
    ground, level, label = elevation_m.reshape(-1), level_m.reshape(-1), pool_id.reshape(-1)
    for cell in range(rows * cols):
        label[cell] = -1 if level[cell] > ground[cell] else 0
    stack = np.empty(1024, dtype=np.int64)
    pools = 0
    for first in range(rows * cols):
        if label[first] != -1:
            continue
        pools += 1
        label[first] = pools
        stack[0] = first
        size = 1
        while size > 0:
            size -= 1
            cell = stack[size]
            if size + 8 > stack.shape[0]:
                longer = np.empty(2 * stack.shape[0], dtype=np.int64)
                longer[:size] = stack[:size]
                stack = longer
            for k in range(8):
                other = cell + around[k]
                if label[other] == -1:
                    label[other] = pools
                    stack[size] = other
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
    cols = pool_id.shape[1]
    ways = np.array([-cols - 1, -cols, -cols + 1, -1, 0, 1, cols - 1, cols, cols + 1])
    pool, way, found_at = pool_id.reshape(-1), direction.reshape(-1), stop_at.reshape(-1)
    for cell in range(pool.shape[0]):
        found_at[cell] = pool[cell]
    path = np.empty(1024, dtype=np.int64)
    for first in range(pool.shape[0]):
        cell = first
        size = 0
        while found_at[cell] == 0 and way[cell] != 9:
            if way[cell] == 4:
                found_at[cell] = -1 - cell
                break
            if size == path.shape[0]:
                longer = np.empty(2 * size, dtype=np.int64)
                longer[:size] = path
                path = longer
            path[size] = cell
            size += 1
            cell += ways[way[cell]]
        found = found_at[cell]
        for k in range(size):
            found_at[path[k]] = found


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
