"""Closed hollows of the ground: how deep below their sill, where they spill, what drains into them."""

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from sitescreen.grid import Field
from sitescreen.terrain._hollows_kernel import (
    count_catchments,
    first_stop,
    label_pools,
    pool_exits,
    pool_figures,
    pool_sills,
)
from sitescreen.terrain.drainage import drainage

DOUBTFUL_DROP_M = 2.0
"""Our closure: a pool whose overflow leaves the known ground less than this far below its sill is called cut. [m]"""

RIM = 1


class Pools(NamedTuple):
    """One entry a pool; pool number n is entry n − 1.

    ``sill_m``: level at which it spills. ``deepest_m``: greatest depth below the sill. ``sill_row``, ``sill_col``: the
    cell outside the pool over which it spills. ``cells``: size. ``volume_m3``: volume below the sill.
    ``catchment_cells``: cells whose water comes to rest in this pool first, its own included; what upstream pools spill
    is not counted. ``exit_drop_m``: how far below the sill the overflow leaves the known ground over its rim; infinite
    where it ends in an outlet. ``cut``: ``exit_drop_m`` is under :data:`DOUBTFUL_DROP_M`.
    """

    sill_m: NDArray[np.float64]
    deepest_m: NDArray[np.float64]
    sill_row: NDArray[np.int64]
    sill_col: NDArray[np.int64]
    cells: NDArray[np.int64]
    volume_m3: NDArray[np.float64]
    catchment_cells: NDArray[np.int64]
    exit_drop_m: NDArray[np.float64]
    cut: NDArray[np.bool_]


class Hollows(NamedTuple):
    """Depth below the sill (0 outside hollows, NaN where the ground is unknown), pool numbers (0 none), the pools."""

    depth_m: Field
    pool_id: NDArray[np.int32]
    pools: Pools


def hollows(elevation: Field, outlets: NDArray[np.bool_] | None = None) -> Hollows:
    """Every closed hollow of the ground, however small.

    Parameters
    ----------
    elevation : Field, shape (rows, cols)
        Height. [m] NaN where unknown.
    outlets : bool array, shape (rows, cols), optional
        Sea and lakes: cells that take any water and are no hollows themselves.

    Returns
    -------
    Hollows

    Raises
    ------
    GridError
        If the outlets are not on the field's grid.

    Notes
    -----
    Water also leaves over the rim of the known ground, so a valley that runs off the data is no hollow here, and a pool
    may be deeper in truth than it is called. A pool is ``cut`` where that is likely: where its overflow reaches the rim
    at its sill or less than :data:`DOUBTFUL_DROP_M` below it, so that slightly higher ground beyond would raise its
    level. A pool whose overflow falls further before it leaves could be deepened only by a dam of that height.
    """
    drained = drainage(elevation, outlets)
    grid = elevation.grid
    pool_id = np.empty(grid.shape, dtype=np.int32)
    count = int(label_pools(elevation.values, drained.level_m, pool_id))
    # entry 0 stands for "no pool" until the end
    sill, deepest, depth_sum = (np.zeros(count + 1, dtype=np.float64) for _ in range(3))
    cells, catchment = (np.zeros(count + 1, dtype=np.int64) for _ in range(2))
    sill_cell, exit_cell = (np.full(count + 1, -1, dtype=np.int64) for _ in range(2))
    pool_figures(elevation.values, drained.level_m, pool_id, sill, deepest, cells, depth_sum)
    pool_sills(pool_id, drained.direction, drained.flat_order, sill_cell)
    stop_at = np.empty(grid.shape, dtype=np.int32)
    first_stop(pool_id, drained.direction, stop_at)
    count_catchments(stop_at, catchment)
    pool_exits(stop_at, sill_cell, exit_cell)
    exits = exit_cell[1:]
    over_rim = drained.kind.ravel()[exits] == RIM
    exit_m = elevation.values.ravel()[exits].astype(np.float64)
    drop = np.where(over_rim, sill[1:] - exit_m, np.inf)
    depth = drained.level_m - elevation.values
    return Hollows(
        Field(depth, grid, "m", "depth below the sill of closed hollows"),
        pool_id,
        Pools(
            sill_m=sill[1:],
            deepest_m=deepest[1:],
            sill_row=sill_cell[1:] // grid.cols,
            sill_col=sill_cell[1:] % grid.cols,
            cells=cells[1:],
            volume_m3=depth_sum[1:] * grid.cell_size_m**2,
            catchment_cells=catchment[1:],
            exit_drop_m=drop,
            cut=drop < DOUBTFUL_DROP_M,
        ),
    )
