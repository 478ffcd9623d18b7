"""How high a cell stands among its surroundings."""

import math

import numpy as np
from numpy.typing import NDArray

from sitescreen.errors import GridError
from sitescreen.grid import Field
from sitescreen.terrain._position_kernel import disc_means, running_sums
from sitescreen.terrain.threads import in_bands

_STEPS_PER_M = 16384.0
"""Heights are summed in whole steps of 1/16384 m (0.06 mm), far below any terrain model's own step."""


def disc_half_widths(radius_m: float, cell_size_m: float) -> NDArray[np.int64]:
    """Half the width, in cells, of each row of the disc whose cells have their centre within a radius.

    Returns
    -------
    int64 array, shape (2·reach + 1,)
        From the northernmost row of the disc to the southernmost; the row itself counts as cell 0.
    """
    radius = radius_m / cell_size_m
    reach = math.floor(radius + 1e-9)
    across = np.arange(-reach, reach + 1)
    half_widths: NDArray[np.int64] = np.floor(np.sqrt(np.maximum(radius**2 - across**2, 0.0)) + 1e-9).astype(np.int64)
    return half_widths


def disc_mean(elevation: Field, radius_m: float) -> Field:
    """Mean height of the ground within a distance of each cell.

    Parameters
    ----------
    elevation : Field, shape (rows, cols)
        Height. [m] NaN where unknown.
    radius_m : float
        Cells count whose centre lies no further away. [m]

    Returns
    -------
    Field, shape (rows, cols)
        [m] NaN where any cell of the disc is unknown or outside the grid.

    Raises
    ------
    GridError
        If the radius is not positive.
    """
    if not radius_m > 0:
        raise GridError(
            f"a disc of {radius_m} m radius was asked for", "a positive radius is needed", "Give the radius in metres"
        )
    grid = elevation.grid
    half_widths = disc_half_widths(radius_m, grid.cell_size_m)
    sums = np.empty((grid.rows, grid.cols + 1), dtype=np.int64)
    gaps = grid.rows if np.isnan(elevation.values).any() else 0
    unknown = np.empty((gaps, grid.cols + 1), dtype=np.int32)
    in_bands(running_sums, grid.rows, elevation.values, _STEPS_PER_M, sums, unknown)
    mean = np.empty(grid.shape, dtype=np.float32)
    in_bands(disc_means, grid.rows, sums, unknown, half_widths, _STEPS_PER_M, mean)
    return Field(mean, grid, "m", f"mean height within {radius_m:g} m")


def rise_m(elevation: Field, radius_m: float = 1000.0) -> Field:
    """Height above the mean of the surroundings (topographic position after Weiss [1]_, on a disc, not a ring).

    Parameters
    ----------
    elevation : Field, shape (rows, cols)
        Height. [m]
    radius_m : float
        Size of the surroundings. [m]

    Returns
    -------
    Field, shape (rows, cols)
        [m] Positive on rises, 0 on a plane, negative in valleys; NaN as in :func:`disc_mean`.

    References
    ----------
    .. [1] A. D. Weiss, "Topographic position and landforms analysis," conference poster, 2001.
    """
    values = elevation.values - disc_mean(elevation, radius_m).values
    return Field(values, elevation.grid, "m", f"height above the mean of the ground within {radius_m:g} m")
