"""How much of the sky a cell sees past the terrain and its own slope."""

import math

import numpy as np
from numpy.typing import NDArray

from sitescreen.errors import GridError
from sitescreen.grid import Field, Grid
from sitescreen.terrain._sky_view_kernel import add_direction, finish
from sitescreen.terrain.horizon import sweep, sweeps_transposed, transposed
from sitescreen.terrain.slope import gradient
from sitescreen.terrain.threads import in_bands


def sky_view(elevation: Field, azimuths: int = 36) -> Field:
    """Sky view factor of the slope: its share of the sky's diffuse light, for an evenly bright sky [1]_, [2]_.

    Parameters
    ----------
    elevation : Field, shape (rows, cols)
        Height. [m]
    azimuths : int
        Directions looked into, evenly spaced from grid north.

    Returns
    -------
    Field, shape (rows, cols)
        0–1, 1 on open level ground, (1 + cos S)/2 on an open slope S. NaN where the slope is. Ground beyond the data
        is taken not to rise above the horizontal: near the edge the value is an upper bound.

    Raises
    ------
    GridError
        With fewer than 4 azimuths.

    Notes
    -----
    V = (1/2π) ∫ [cos S·sin²H + sin S·cos(φ − A)·(H − sin H cos H)] dφ, H from the zenith to the horizon, which is the
    highest of the terrain, the slope itself and the horizontal.

    References
    ----------
    .. [1] J. Dozier and J. Frew, "Rapid calculation of terrain parameters for radiation modeling from digital elevation
       data," IEEE Trans. Geosci. Remote Sens., vol. 28, pp. 963–969, 1990, eq. 7b.
    .. [2] J. Dozier, "Revisiting topographic horizons in the era of big data and parallel computing," IEEE Geosci.
       Remote Sens. Lett., vol. 19, 2022, eq. 3 (the slope's own horizon).
    """
    if azimuths < 4:
        raise GridError(
            f"a sky view from {azimuths} directions was asked for",
            "at least 4 directions are needed",
            "Set sky_azimuths to 36",
        )
    grid = elevation.grid
    slope = gradient(elevation)
    every = 360.0 / azimuths * np.arange(azimuths)
    # azimuths near north and south are swept, and added up, over the transposed ground
    total = np.zeros(grid.shape, dtype=np.float32)
    _add(
        total,
        elevation.values,
        grid,
        slope.east.values,
        slope.north.values,
        [a for a in every if not sweeps_transposed(a)],
    )
    other = np.zeros(grid.shape[::-1], dtype=np.float32)
    _add(
        other,
        transposed(elevation.values),
        grid,
        transposed(slope.east.values),
        transposed(slope.north.values),
        [a for a in every if sweeps_transposed(a)],
    )
    total += transposed(other)
    del other
    in_bands(finish, grid.rows, total, slope.east.values, slope.north.values, azimuths)
    return Field(total, grid, "1", "sky view factor, with the slope's own horizon")


def _add(
    total: NDArray[np.float32],
    values: NDArray[np.float32],
    grid: Grid,
    east: NDArray[np.float32],
    north: NDArray[np.float32],
    azimuths_deg: list[float],
) -> None:
    """Add the azimuths' integrands to the running total, one after the other; only one horizon is ever held."""
    tangent = np.empty(total.shape, dtype=np.float32)
    for azimuth in azimuths_deg:
        sweep(values, grid, azimuth, True, tangent)
        sin, cos = np.float32(math.sin(math.radians(azimuth))), np.float32(math.cos(math.radians(azimuth)))
        in_bands(add_direction, total.shape[0], tangent, east, north, sin, cos, total)
