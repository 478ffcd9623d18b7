"""The breeze as a layer: read as a plot's is, at the middle of coarse cells, since each has a way to look along."""

import math

import numpy as np

from sitescreen.climate.breeze import lake_reach, plot_breeze
from sitescreen.grid import Bounds, Field, Grid
from sitescreen.inputs.shore import Shore
from sitescreen.lattice import BLOCK_CELLS
from sitescreen.settings import BreezeSettings
from sitescreen.terrain.shore_fetch import open_shores
from sitescreen.terrain.shore_segments import Segments

COARSE_M = 300.0
"""Side of the layer's cells, about: a breeze does not change from wall to wall, and each cell costs a way. [m]"""


def coarse_grid(grid: Grid, core: Bounds) -> Grid:
    """Coarse cells on absolute multiples of their size that cover the part of a grid within a block's core."""
    fine = grid.cell_size_m
    # a number of cells that a block's side is a multiple of, so that the layers of neighbours meet
    times = min((n for n in range(1, 101) if BLOCK_CELLS % n == 0), key=lambda n: abs(math.log(n * fine / COARSE_M)))
    step = times * fine
    west, south, east, north = grid.bounds
    west, south = (math.floor(max(a, b) / step) * step for a, b in ((west, core[0]), (south, core[1])))
    east, north = (math.ceil(min(a, b) / step) * step for a, b in ((east, core[2]), (north, core[3])))
    return Grid(grid.crs, west, north, step, round((north - south) / step), round((east - west) / step))


def breeze_field(
    elevation: Field, core: Bounds, shore: Shore, sea: Segments, lake: Segments, settings: BreezeSettings
) -> Field:
    """Breeze reach over a block's core.

    Parameters
    ----------
    elevation : Field
        Height. [m]
    core : tuple
        West, south, east and north of the block's core. [m]
    shore : Shore
    sea, lake : Segments
        Open shores of either kind.
    settings : BreezeSettings

    Returns
    -------
    Field
        What a plot in the middle of each cell of about 300 m would read: distance, the lake's width and the screen of
        the ground on the straight way. NaN on the water and where that ground is unknown.
    """
    from pyproj import Transformer

    grid = coarse_grid(elevation.grid, core)
    x, y = np.meshgrid(grid.x_centres_m(), grid.y_centres_m())
    lon, lat = Transformer.from_crs(grid.crs, "EPSG:4326", always_xy=True).transform(x.ravel(), y.ravel())
    breeze = plot_breeze(
        elevation,
        lon,
        lat,
        open_shores(shore, sea, "sea", lon, lat, grid.crs),
        open_shores(shore, lake, "lake", lon, lat, grid.crs, lambda km, width_km: lake_reach(km, width_km, settings)),
        settings,
    )
    values = np.where(breeze.distance_m == 0.0, np.nan, breeze.reach).astype(np.float32)
    what = "share of a full daytime breeze of sea or lake that arrives, screens on its straight way taken off"
    return Field(values.reshape(grid.shape), grid, "1", what)
