"""Where the mapped water and the terrain model tell different stories about a plot."""

import numpy as np
import pandas as pd
from numpy.typing import NDArray

MAPPED_SHARE = 0.02
"""Part of a plot in mapped water that is worth comparing: less is the drawing accuracy of a map. (our choice)"""

FLAT_SHARE = 0.5
"""Part of a plot that must be as level as water before the terrain is said to show water. (our choice)"""


def waters_disagree(readings: pd.DataFrame, vertical_error_m: float) -> NDArray[np.float64]:
    """Whether a plot is dry by one source and wet by the other.

    Parameters
    ----------
    readings : DataFrame, n rows
        ``share_in_water`` (mapped, NaN without a shoreline), ``share_flat_water`` (as level as water in the terrain
        model) and ``over_water_m`` (mean height over the level of the mapped water, NaN where none is mapped).
    vertical_error_m : float
        One standard deviation of the terrain's height. [m]

    Returns
    -------
    float64 array, shape (n,)
        1 where they disagree: water is mapped on ground that is not level and stands more than two standard deviations
        over that water, or half of the plot is as level as water and not mapped as such. 0 where they agree; NaN where
        nobody mapped water and the terrain shows none.

    Notes
    -----
    Ground that the map calls water and that does not stand clear of its level is never said to be dry.
    """
    mapped = readings["share_in_water"].to_numpy(dtype=np.float64)
    flat = readings["share_flat_water"].to_numpy(dtype=np.float64)
    clear = readings["over_water_m"].to_numpy(dtype=np.float64) > 2.0 * vertical_error_m
    map_only = (mapped > MAPPED_SHARE) & (flat < FLAT_SHARE) & clear
    # where most of the plot is mapped as water too, both say water, and nothing may call it dry
    unmapped = flat - np.nan_to_num(mapped)
    terrain_only = (flat >= FLAT_SHARE) & (unmapped >= FLAT_SHARE - MAPPED_SHARE) & ~(mapped > 0.5)
    disagree = np.where(map_only | terrain_only, 1.0, 0.0)
    return np.where(np.isnan(mapped) & ~terrain_only, np.nan, disagree)
