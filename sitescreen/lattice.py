"""The absolute lattice: which cells exist, and which block reads a plot.

One lattice for the whole Earth, not a box drawn round the plots of the day: a plot's readings then never depend on the
other plots, on the number of tiles or on who computes it. Every point has exactly one block. Its UTM zone follows from
its longitude; the northern system of the zone (EPSG:326xx) serves both hemispheres, with negative northings south of
the equator, so that the equator is no seam. Cells lie on whole multiples of their size, blocks on whole multiples of
4,500 cells.
"""

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from sitescreen.errors import GridError
from sitescreen.grid import Bounds, Field, Grid

CELL_LADDER_M = (5.0, 10.0, 30.0, 90.0)
"""Cell sizes that the lattice knows. [m]"""

BLOCK_CELLS = 4500
"""Cells along one side of a block's core (135 km at 30 m)."""


def cell_size_m(source_spacing_m: float) -> float:
    """The ladder's step nearest by ratio to the spacing of a terrain model.

    Parameters
    ----------
    source_spacing_m : float
        Spacing of the model's cells on the ground. [m] 1″ is about 31 m, 3″ about 93 m.
    """
    return min(CELL_LADDER_M, key=lambda step: abs(math.log(step / source_spacing_m)))


def utm_zone(lon_deg: float) -> int:
    """UTM zone 1–60 by longitude alone (the exceptions round Norway are outside the climates served here)."""
    return math.floor((lon_deg + 180.0) / 6.0) % 60 + 1


@dataclass(frozen=True, order=True)
class Block:
    """One block of the lattice.

    Parameters
    ----------
    zone : int
        UTM zone 1–60; the block's system is the zone's northern one.
    east, north : int
        Index of the core: it spans [east, east + 1) × [north, north + 1) times the core's side.
    cell_size_m : float
        A step of the ladder. [m]
    """

    zone: int
    east: int
    north: int
    cell_size_m: float

    @property
    def crs(self) -> str:
        """The zone's northern UTM system."""
        return f"EPSG:{32600 + self.zone}"

    @property
    def core_bounds(self) -> Bounds:
        """The ground this block answers for. [m]"""
        side = BLOCK_CELLS * self.cell_size_m
        return self.east * side, self.north * side, (self.east + 1) * side, (self.north + 1) * side

    def window(self, margin_m: float, data_bounds: Bounds) -> Grid:
        """The grid to compute: core plus margin, clipped only by where there are data.

        Parameters
        ----------
        margin_m : float
            Ground needed round the core. [m] Rounded up to whole cells.
        data_bounds : Bounds
            Extent of the terrain data in the block's system. [m] Widened to whole cells.

        Raises
        ------
        GridError
            If no data lie inside.
        """
        step = self.cell_size_m
        margin = math.ceil(margin_m / step) * step
        west, south, east, north = self.core_bounds
        west = max(west - margin, math.floor(data_bounds[0] / step) * step)
        south = max(south - margin, math.floor(data_bounds[1] / step) * step)
        east = min(east + margin, math.ceil(data_bounds[2] / step) * step)
        north = min(north + margin, math.ceil(data_bounds[3] / step) * step)
        if not (west < east and south < north):
            raise GridError(
                f"block {self} was asked for where there is no terrain",
                "terrain that covers part of the block is needed",
                "Add the tile that covers the plots",
            )
        return Grid(self.crs, west, north, step, round((north - south) / step), round((east - west) / step))


def block_of(lon_deg: float, lat_deg: float, cell_size_m: float) -> Block:
    """The one block that reads a point.

    Parameters
    ----------
    lon_deg, lat_deg : float
        WGS84. [°]
    cell_size_m : float
        A step of the ladder. [m]
    """
    return blocks_of(np.array([lon_deg]), np.array([lat_deg]), cell_size_m)[0]


def blocks_of(lon_deg: NDArray[np.float64], lat_deg: NDArray[np.float64], cell_size_m: float) -> list[Block]:
    """The block of each point; see :func:`block_of`."""
    from pyproj import Transformer

    side = BLOCK_CELLS * cell_size_m
    zones = np.array([utm_zone(lon) for lon in lon_deg], dtype=np.int64)
    blocks: list[Block | None] = [None] * len(zones)
    for zone in np.unique(zones):
        to_utm = Transformer.from_crs("EPSG:4326", f"EPSG:{32600 + zone}", always_xy=True)
        where = np.flatnonzero(zones == zone)
        east, north = to_utm.transform(lon_deg[where], lat_deg[where])
        for i, e, n in zip(where, np.floor(east / side), np.floor(north / side), strict=True):
            blocks[i] = Block(int(zone), int(e), int(n), cell_size_m)
    return [block for block in blocks if block is not None]


def convergence_deg(crs: str, lon_deg: NDArray[np.float64], lat_deg: NDArray[np.float64]) -> NDArray[np.float64]:
    """Meridian convergence: the bearing of grid north from true north at each point, clockwise positive. [°]

    A grid azimuth plus this is a true bearing.
    """
    from pyproj import Proj

    return np.asarray(Proj(crs).get_factors(lon_deg, lat_deg).meridian_convergence, dtype=np.float64)


def from_true_north(bearing: Field) -> Field:
    """A field of bearings from grid north, turned to bearings from true north. [°]

    The convergence is computed at 33 × 33 places and linear between: across a block it bends by under 0.001°.
    """
    from pyproj import Transformer

    grid = bearing.grid
    x, y = grid.x_centres_m(), grid.y_centres_m()
    at_x, at_y = np.linspace(x[0], x[-1], 33), np.linspace(y[0], y[-1], 33)
    lon, lat = Transformer.from_crs(grid.crs, "EPSG:4326", always_xy=True).transform(*np.meshgrid(at_x, at_y))
    nodes = convergence_deg(grid.crs, lon.ravel(), lat.ravel()).reshape(33, 33)
    along = np.array([np.interp(x, at_x, row) for row in nodes])
    place = np.interp(np.arange(grid.rows), np.linspace(0, grid.rows - 1, 33), np.arange(33.0))
    below = np.minimum(place.astype(np.int64), 31)
    values = np.empty(grid.shape, dtype=np.float32)
    for row in range(grid.rows):
        part = place[row] - below[row]
        turn = along[below[row]] * (1.0 - part) + along[below[row] + 1] * part
        values[row] = (bearing.values[row] + turn) % 360.0
    return Field(values, grid, bearing.unit, bearing.what.replace("grid north", "true north"))
