"""Where cold air lies on calm clear nights: closed hollows only, in this first version.

Cold air that is held back by a narrow gap without any closed depression ("leaky") and air in motion ("moving") are not
seen yet. A plot that this version calls ``none`` can therefore still be cold at night, and the outputs say so.
"""

from typing import Any, NamedTuple

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


def deficit_k(depth_m: Any, strength_k: Any, sky_view: Any, settings: ColdAirSettings) -> NDArray[np.float64]:
    """How much colder the hollow is than open level ground on a calm clear night, ΔT·(1 − e^(−d/h0))·sky view. [K]

    Parameters
    ----------
    depth_m : array
        Mean depth of the pool over the plot. [m]
    strength_k : array
        ΔT of the plot's climate, the deficit of a deep pool under an open sky. [K]
    sky_view : array
        0–1; the most important terrain parameter for small basins (Whiteman et al. 2004, J. Appl. Meteor.
        43:1224–1236).

    Notes
    -----
    h0 = 15 m and the form are our closure. The calm share of the night's wind and the heat budget are not in yet.
    """
    depth = np.asarray(depth_m, dtype=np.float64)
    return np.asarray(strength_k * (1.0 - np.exp(-depth / settings.fill_scale_m)) * sky_view, dtype=np.float64)
