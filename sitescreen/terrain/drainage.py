"""Where water runs: the filled surface, flow directions, the ground that drains through each cell, channels."""

import math
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from sitescreen.errors import GridError
from sitescreen.grid import Field
from sitescreen.terrain._drainage_kernel import (
    accumulate,
    count_inflows,
    flat_ways,
    heights_above_channel,
    steepest_ways,
)
from sitescreen.terrain._hollows_kernel import (
    cell_kinds,
    drained_levels,
    flood_open_cells,
    open_cells,
    sweep_levels,
)
from sitescreen.terrain.threads import in_bands

LEAVES, UNKNOWN = 4, 9
"""Directions of cells whose water leaves the ground there, and of unknown ground; 0–8 but 4 point to a neighbour,
3·(row step + 1) + (column step + 1): 0 north-west, 1 north, 2 north-east, 3 west, 5 east, 6 south-west …"""


class Drainage(NamedTuple):
    """The filled surface and the ways down it.

    ``level_m``: float32, the lowest surface on and above the ground that drains everywhere; NaN where unknown.
    ``kind``: uint8, 0 interior, 1 rim of the known ground, 2 outlet, 3 unknown. ``direction``: uint8, see
    :data:`LEAVES`. ``flat_order``: int64, flat indices of the level cells, nearest to their exit first.
    """

    level_m: NDArray[np.float32]
    kind: NDArray[np.uint8]
    direction: NDArray[np.uint8]
    flat_order: NDArray[np.int64]


def filled(elevation: Field, outlets: NDArray[np.bool_] | None = None) -> tuple[NDArray[np.float32], NDArray[np.uint8]]:
    """The lowest surface on and above the ground from which every cell drains (priority-flood [1]_).

    Parameters
    ----------
    elevation : Field, shape (rows, cols)
        Height. [m] Water also leaves over the rim of the known ground: the grid's edge and cells beside unknown ones.
    outlets : bool array, shape (rows, cols), optional
        Cells that take any water: sea and lakes.

    Returns
    -------
    level_m : float32 array, shape (rows, cols)
        NaN where the ground is unknown. Exact: levels are heights of the ground, only compared and copied.
    kind : uint8 array, shape (rows, cols)
        See :class:`Drainage`.

    Raises
    ------
    GridError
        If the outlets are not on the field's grid.

    References
    ----------
    .. [1] R. Barnes, C. Lehman and D. Mulla, "Priority-flood: An optimal depression-filling and watershed-labeling
       algorithm for digital elevation models," Comput. Geosci., vol. 62, pp. 117–127, 2014.
    """
    shape = elevation.grid.shape
    taking = np.zeros(shape, dtype=np.bool_) if outlets is None else np.ascontiguousarray(outlets, dtype=np.bool_)
    if taking.shape != shape:
        raise GridError(
            f"outlets of {taking.shape} were given for ground of {shape}",
            "one outlet flag a cell is needed",
            "Rasterise the waters on the ground's own grid",
        )
    kind = np.empty(shape, dtype=np.uint8)
    in_bands(cell_kinds, shape[0], elevation.values, taking, kind)
    level = np.empty(shape, dtype=np.float32)
    in_bands(drained_levels, shape[0], elevation.values, kind, level)
    sweep_levels(elevation.values, level)
    state = np.empty(shape, dtype=np.uint8)
    in_bands(open_cells, shape[0], elevation.values, kind, level, state)
    flood_open_cells(elevation.values, level, state, np.count_nonzero(state))
    return level, kind


def drainage(elevation: Field, outlets: NDArray[np.bool_] | None = None) -> Drainage:
    """Steepest way down the filled surface from every cell, to one of its eight neighbours (O'Callaghan & Mark [1]_).

    Parameters
    ----------
    elevation, outlets
        As in :func:`filled`.

    Returns
    -------
    Drainage
        Level cells, flooded hollows among them, drain towards the nearest exit of their level. Ties go to the
        neighbour that comes first in reading order.

    References
    ----------
    .. [1] J. F. O'Callaghan and D. M. Mark, "The extraction of drainage networks from digital elevation data," Comput.
       Vis. Graph. Image Process., vol. 28, pp. 323–344, 1984.
    """
    return ways_down(*filled(elevation, outlets))


def ways_down(level_m: NDArray[np.float32], kind: NDArray[np.uint8]) -> Drainage:
    """The second half of :func:`drainage`: directions on a surface that :func:`filled` has made."""
    direction = np.empty(level_m.shape, dtype=np.uint8)
    in_bands(steepest_ways, level_m.shape[0], level_m, kind, direction)
    return Drainage(level_m, kind, direction, flat_ways(level_m, direction))


def catchment_cells(drained: Drainage) -> NDArray[np.int32]:
    """How many cells drain through each cell, itself included; 0 where unknown. Shape (rows, cols)."""
    shape = drained.direction.shape
    inflows = np.empty(shape, dtype=np.uint8)
    in_bands(count_inflows, shape[0], drained.direction, inflows)
    cells = np.empty(shape, dtype=np.int32)
    accumulate(drained.direction, inflows, cells)
    return cells


def channels(elevation: Field, cells: NDArray[np.int32], least_catchment_km2: float) -> NDArray[np.bool_]:
    """Cells whose catchment reaches a stated size. Shape (rows, cols).

    Parameters
    ----------
    elevation : Field
        Gives the grid.
    cells : int32 array
        From :func:`catchment_cells`. Cut catchments count with the part that is inside the grid.
    least_catchment_km2 : float
        [km²]
    """
    least = math.ceil(least_catchment_km2 * 1e6 / elevation.grid.cell_size_m**2 - 1e-9)
    return np.asarray(cells >= max(least, 1))


def height_above_channel_m(elevation: Field, drained: Drainage, channel: NDArray[np.bool_]) -> Field:
    """Height of each cell above the channel that it drains to, along its way down.

    Returns
    -------
    Field, shape (rows, cols)
        [m] 0 in channels; NaN where the way leaves the ground without meeting a channel. Can be negative in hollows.
    """
    height = np.empty(elevation.grid.shape, dtype=np.float32)
    heights_above_channel(elevation.values, drained.direction, np.ascontiguousarray(channel), height)
    return Field(height, elevation.grid, "m", "height above the channel that the cell drains to")
