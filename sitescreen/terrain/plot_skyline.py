"""The skyline of each plot, towards 72 directions from true north."""

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from sitescreen.grid import Field
from sitescreen.lattice import convergence_deg
from sitescreen.terrain.horizon import horizon_profile

FloatArray = NDArray[np.float64]

AZIMUTHS_DEG = np.arange(72) * 5.0
"""Directions of a skyline, clockwise from true north. [°]"""

_TURN_DEG = 0.05
"""Plots whose grid north differs by less share their rays. [°]"""


class PlotSkylines(NamedTuple):
    """Skylines of n plots, both arrays of shape (n, 72), towards :data:`AZIMUTHS_DEG`.

    ``height_deg``: height of the skyline [°], NaN where no ground is known. ``seen_m``: how far the ground is known
    without a gap [m].
    """

    height_deg: NDArray[np.float32]
    seen_m: NDArray[np.float32]


def plot_skylines(
    elevation: Field, lon_deg: FloatArray, lat_deg: FloatArray, eye_m: float, reach_m: float
) -> PlotSkylines:
    """The skyline from the plots' points, along exact rays, with the Earth's curvature and refraction.

    Parameters
    ----------
    elevation : Field
        Height. [m]
    lon_deg, lat_deg : float64 arrays, shape (n,)
        A point in each plot, WGS84. [°]
    eye_m : float
        Height of the eye above the ground. [m]
    reach_m : float
        Ground further away is not looked at. [m]

    Notes
    -----
    Grid north differs from true north by up to a degree or two; rays are turned by the difference at each plot, in
    absolute steps of 0.05°, so that a plot's rays do not depend on the other plots.
    """
    from pyproj import Transformer

    crs = elevation.grid.crs
    x, y = Transformer.from_crs("EPSG:4326", crs, always_xy=True).transform(lon_deg, lat_deg)
    turn = np.round(convergence_deg(crs, lon_deg, lat_deg) / _TURN_DEG).astype(np.int64)
    # single precision holds an angle to 0.00001°, and 200,000 plots in half the memory
    height = np.empty((len(lon_deg), len(AZIMUTHS_DEG)), dtype=np.float32)
    seen = np.empty_like(height)
    for one in np.unique(turn):
        here = turn == one
        # a grid azimuth plus the convergence is a true bearing
        found = horizon_profile(elevation, x[here], y[here], AZIMUTHS_DEG - one * _TURN_DEG, eye_m, reach_m=reach_m)
        height[here], seen[here] = found.angle_deg, found.seen_m
    return PlotSkylines(height, seen)
