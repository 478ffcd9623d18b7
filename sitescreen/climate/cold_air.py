"""Closed hollows that hold cold air on calm clear nights, told from the noise of the terrain model.

Air that narrows hold back without any closed hollow, and air in motion, are found by
:mod:`sitescreen.climate.cold_layer`.
"""

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from sitescreen.grid import Field
from sitescreen.settings import ColdAirSettings
from sitescreen.terrain.hollows import Hollows


class ClosedPools(NamedTuple):
    """Closed hollows deep and wide enough to be told from the terrain model's error."""

    depth_m: Field
    cut: NDArray[np.bool_]


def smallest_pool_seen_m(vertical_error_m: float, settings: ColdAirSettings) -> float:
    """The least greatest depth of a hollow that is not taken for noise: twice the terrain's error, at least 1 m. [m]

    Single pits of noise reach 2–3 standard deviations (common practice; check against Lindsay & Creed 2006, Comput.
    Geosci. 32:1192–1204, whose Monte-Carlo principle the later reading follows).
    """
    return max(settings.least_depth_m, settings.noise_factor * vertical_error_m)


def closed_pools(hollows: Hollows, vertical_error_m: float, settings: ColdAirSettings) -> ClosedPools:
    """Depth of cold air below the sill, in the hollows that count.

    Parameters
    ----------
    hollows : Hollows
        Every closed depression of the ground.
    vertical_error_m : float
        One standard deviation of the terrain's height. [m]

    Returns
    -------
    ClosedPools
        ``depth_m``: 0 outside pools and in those too shallow or too small to trust; NaN where the ground is unknown.
        ``cut``: cells of hollows that run off the known ground: how deep they are cannot be said.
    """
    pools = hollows.pools
    mean_depth_m = pools.volume_m3 / (pools.cells * hollows.depth_m.grid.cell_size_m**2)
    counts = (
        (pools.deepest_m >= smallest_pool_seen_m(vertical_error_m, settings))
        & (mean_depth_m >= settings.mean_noise_factor * vertical_error_m)
        & (pools.cells >= settings.least_cells)
    )
    # index 0 of the lookup is "no pool"
    keep = np.concatenate([[False], counts])
    cut = np.concatenate([[False], pools.cut])
    depth = np.where(keep[hollows.pool_id] | np.isnan(hollows.depth_m.values), hollows.depth_m.values, np.float32(0.0))
    return ClosedPools(
        Field(depth, hollows.depth_m.grid, "m", "depth of cold air in closed hollows, below the sill"),
        cut[hollows.pool_id],
    )
