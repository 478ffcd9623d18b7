"""Where water gathers and runs: beds, how much drains through them, how high the ground lies above them."""

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray
from scipy import ndimage

from sitescreen.grid import Field
from sitescreen.terrain.drainage import catchment_cells, channels, drainage, height_above_channel_m


class Watercourses(NamedTuple):
    """Beds, dry or wet, that the ground itself shows.

    ``catchment_km2``: the largest catchment of a bed at or near each cell, 0 where there is none; NaN where the ground
    is unknown. ``height_m``: height above the bed that the cell drains to; NaN where its water reaches the sea or the
    edge of the ground without one.
    """

    catchment_km2: Field
    height_m: Field


def watercourses(
    elevation: Field, water_kind: NDArray[np.uint8], least_catchment_km2: float, near_m: float
) -> Watercourses:
    """The beds of a piece of ground, by the steepest ways down its filled surface.

    Parameters
    ----------
    elevation : Field, shape (rows, cols)
        Height. [m] Ground beyond it is not seen: catchments are at least as large as said.
    water_kind : uint8 array, shape (rows, cols)
        0 land, 1 sea, 2 lake. The sea takes all water; a lake passes it on, and is no bed itself.
    least_catchment_km2 : float
        From this on a line of steepest descent counts as a bed. [km²]
    near_m : float
        A bed within this, north–south and east–west, counts as at the cell. [m]
    """
    drained = drainage(elevation, water_kind == 1)
    cells = catchment_cells(drained)
    bed = channels(elevation, cells, least_catchment_km2) & (water_kind == 0)
    cell_km2 = (elevation.grid.cell_size_m / 1000.0) ** 2
    through = np.where(bed, cells * np.float32(cell_km2), np.float32(0.0)).astype(np.float32)
    reach = 2 * round(near_m / elevation.grid.cell_size_m) + 1
    near = ndimage.maximum_filter(through, size=reach, mode="constant", cval=0.0)
    near[np.isnan(elevation.values)] = np.nan
    what = "largest catchment of a watercourse at or near the cell"
    return Watercourses(Field(near, elevation.grid, "km²", what), height_above_channel_m(elevation, drained, bed))


__all__ = ["Watercourses", "watercourses"]
