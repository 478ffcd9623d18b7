"""How much of the sky a cell sees past the terrain and its own slope."""

import math

import numpy as np
from numpy.typing import NDArray

from sitescreen.errors import GridError
from sitescreen.grid import Field
from sitescreen.terrain._sky_view_kernel import add_direction, finish
from sitescreen.terrain.horizon import horizon_stream
from sitescreen.terrain.slope import Gradient, gradient
from sitescreen.terrain.threads import in_bands


def even_azimuths(azimuths: int) -> NDArray[np.float64]:
    """Directions evenly spaced from grid north. [°] Shape (azimuths,).

    Raises
    ------
    GridError
        With fewer than 4.
    """
    if azimuths < 4:
        raise GridError(
            f"a sky view from {azimuths} directions was asked for",
            "at least 4 directions are needed",
            "Set sky_azimuths to 36",
        )
    return 360.0 / azimuths * np.arange(azimuths, dtype=np.float64)


class SkySum:
    """Adds up the sky view of :func:`sky_view`, one azimuth after another; a consumer of the horizon stream.

    Parameters
    ----------
    slope : Gradient
        Of the ground.
    """

    def __init__(self, slope: Gradient) -> None:
        self._slope = slope
        self._total = np.zeros(slope.east.grid.shape, dtype=np.float32)
        self._azimuths = 0

    def __call__(self, azimuth_deg: float, tangent: NDArray[np.float32]) -> None:
        """Add one of evenly spaced azimuths: the horizon's tangents there, shape (rows, cols)."""
        sin, cos = np.float32(math.sin(math.radians(azimuth_deg))), np.float32(math.cos(math.radians(azimuth_deg)))
        east, north = self._slope.east.values, self._slope.north.values
        in_bands(add_direction, tangent.shape[0], tangent, east, north, sin, cos, self._total)
        self._azimuths += 1

    def sky_view(self) -> Field:
        """The sky view factor of all azimuths so far."""
        total, grid = self._total.copy(), self._slope.east.grid
        in_bands(finish, grid.rows, total, self._slope.east.values, self._slope.north.values, self._azimuths)
        return Field(total, grid, "1", "sky view factor, with the slope's own horizon")


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
    every = even_azimuths(azimuths)
    total = SkySum(gradient(elevation))
    horizon_stream(elevation, every, [total])
    return total.sky_view()
