"""The height of trees and roofs, taken off a terrain model that shows their tops."""

from dataclasses import dataclass
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from sitescreen.errors import InputError
from sitescreen.grid import Grid
from sitescreen.inputs.stamps import FileStamp, stamp
from sitescreen.inputs.terrain_headers import read_header
from sitescreen.inputs.terrain_mosaic import Mosaic, mosaic_datum, mosaics
from sitescreen.inputs.terrain_warp import OUTSIDE, warped
from sitescreen.notes import Note

TALLEST_M = 120.0
"""The tallest trees are some 115 m: greater heights are in another unit. [m]"""


@dataclass(frozen=True)
class Canopy:
    """A raster of heights above the ground."""

    mosaics: tuple[Mosaic, ...]
    stamp: FileStamp
    notes: tuple[Note, ...]

    def height_m(self, grid: Grid) -> NDArray[np.float32]:
        """Height of trees and roofs at the cell centres of a grid, by the interpolation that the terrain has. [m]

        Parameters
        ----------
        grid : Grid

        Returns
        -------
        float32 array, shape (rows, cols)
            0 where the raster has none or does not reach. Beside steep steps it may dip a little below 0, as the
            interpolated terrain does there: the two cancel.

        Raises
        ------
        InputError
            If the raster holds heights that no tree has.
        """
        heights: NDArray[np.float32] = np.full(grid.shape, np.nan, dtype=np.float32)
        stored: NDArray[np.float32] = np.full(grid.shape, np.nan, dtype=np.float32)
        under: NDArray[np.uint8] = np.full(grid.shape, OUTSIDE, dtype=np.uint8)
        for mosaic in self.mosaics:
            warped(mosaic, mosaic_datum(mosaic), grid, heights, under, stored)
        known = stored[np.isfinite(stored)]
        if known.size and (known.min() < 0.0 or known.max() > TALLEST_M):
            raise InputError(
                f"the canopy in {self.stamp.name} is {known.min():g} to {known.max():g} m high",
                f"heights of trees and roofs above the ground, 0 to {TALLEST_M:g} m, are needed",
                "Check its unit, that it is no terrain model, and that its no-data value is set",
            )
        return np.nan_to_num(heights, nan=0.0)


def open_canopy(path: Path) -> Canopy:
    """Open a raster of canopy heights.

    Raises
    ------
    InputError
        If it is missing, damaged, or without a usable coordinate system.
    """
    header = read_header(path, "m", None)
    said = f"The height of trees and roofs in {header.name} is taken off the terrain; where it has none, nothing is."
    return Canopy(mosaics([header]), stamp(path), (Note("info", "terrain", said),))
