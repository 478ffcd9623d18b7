"""How much of the sky a cell sees past the terrain and its own slope."""

import math

import numpy as np

from sitescreen.errors import GridError
from sitescreen.grid import Field
from sitescreen.terrain._sky_view_kernel import add_direction, finish
from sitescreen.terrain.horizon import horizon_tangent
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
    east, north = slope.east.values, slope.north.values
    total = np.zeros(grid.shape, dtype=np.float32)
    tangent = np.empty(grid.shape, dtype=np.float32)
    for k in range(azimuths):
        azimuth = 360.0 * k / azimuths
        horizon_tangent(elevation, azimuth, out=tangent)
        sin, cos = np.float32(math.sin(math.radians(azimuth))), np.float32(math.cos(math.radians(azimuth)))
        in_bands(add_direction, grid.rows, tangent, east, north, sin, cos, total)
    in_bands(finish, grid.rows, total, east, north, azimuths)
    return Field(total, grid, "1", "sky view factor, with the slope's own horizon")
