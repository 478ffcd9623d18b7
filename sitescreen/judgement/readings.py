"""The readings: what was measured of each plot, and why a value is missing where it is."""

from typing import Any, NamedTuple

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from sitescreen.judgement.coverage import Coverage
from sitescreen.settings import ReadingSettings
from sitescreen.terrain.ground import Ground

FloatArray = NDArray[np.float64]


class Readings(NamedTuple):
    """Readings of plots, and the reasons for the gaps.

    ``values``: one row a plot, indexed by plot id, a column a reading; NaN or "" where unknown. ``why_unknown``: the
    same rows; a sentence where the value is missing, "" elsewhere; only columns with gaps.
    """

    values: pd.DataFrame
    why_unknown: pd.DataFrame


def block_readings(
    plot_ids: list[str],
    coverage: Coverage,
    ground: Ground,
    convergence_deg: FloatArray,
    settings: ReadingSettings,
) -> Readings:
    """Readings of one block's plots, from its fields.

    Parameters
    ----------
    plot_ids : list of str, length n
    coverage : Coverage
        The cells under those plots.
    ground : Ground
        Fields on the same grid.
    convergence_deg : float64 array, shape (n,)
        Bearing of grid north from true north at each plot. [°]
    settings : ReadingSettings

    Returns
    -------
    Readings
        Coverage-weighted means over the plot unless the column says otherwise. Bearings from true north.
    """
    out: dict[str, Any] = {}
    why: dict[str, NDArray[np.object_]] = {}

    def mean(values: NDArray[Any]) -> FloatArray:
        return coverage.mean(values, settings.known_share_least)

    def gap(column: str, missing: NDArray[np.bool_], reason: str) -> None:
        reasons = why.setdefault(column, np.full(len(plot_ids), "", dtype=object))
        reasons[missing & (reasons == "")] = reason

    def reading(column: str, values: FloatArray, reason: str) -> None:
        out[column] = values
        if np.isnan(values).any():
            gap(column, np.isnan(values), reason)

    no_ground = "the terrain model has no data under part of the plot"
    small = coverage.cells < settings.cells_least
    too_small = f"the plot is smaller than {settings.cells_least:g} terrain cells, which the terrain cannot resolve"

    reading("elevation_m", mean(ground.elevation.values), no_ground)
    reading("slope_deg", mean(ground.slope.values), no_ground)

    aspect, flat = _aspect(coverage, ground, convergence_deg, settings)
    aspect[small] = np.nan
    if small.any():
        gap("aspect_deg", small, too_small)
    if flat.any():
        gap("aspect_deg", flat, "the ground is too level to face any way")
    reading("aspect_deg", aspect, no_ground)

    share = mean(ground.buildable.values)
    share[small] = np.nan
    if small.any():
        gap("buildable_share", small, too_small)
    reading("buildable_share", share, no_ground)

    reading("rise_m", mean(ground.rise.values), "the terrain model ends within 1 km of the plot")
    reading("sky_view", mean(ground.sky_view.values), no_ground)

    out["cells"] = coverage.cells
    out["share_flat_water"] = mean((ground.flat.label > 0).astype(np.float32))
    # over the plot's mapped water only, however small a part of it that is
    out["over_water_m"] = coverage.mean(ground.over_water_m, 0.0)
    index = pd.Index(plot_ids, name="plot")
    return Readings(pd.DataFrame(out, index=index), pd.DataFrame(why, index=index))


def _aspect(
    coverage: Coverage, ground: Ground, convergence_deg: FloatArray, settings: ReadingSettings
) -> tuple[FloatArray, NDArray[np.bool_]]:
    """Bearing that the plot's mean gradient falls to, from true north [°], and where there is too little to say."""
    east = coverage.mean(ground.gradient.east.values, settings.known_share_least)
    north = coverage.mean(ground.gradient.north.values, settings.known_share_least)
    flat = np.hypot(east, north) < settings.flat_gradient
    # downslope is against the gradient; + convergence turns the grid's bearing into a true one
    aspect = (np.degrees(np.arctan2(-east, -north)) + convergence_deg) % 360.0
    return np.where(flat, np.nan, aspect), flat


def stack(parts: list[Readings], plot_ids: list[str]) -> Readings:
    """Join the blocks' readings in the order of the plots; plots that no block has read stay without values."""
    values = pd.concat([part.values for part in parts]) if parts else pd.DataFrame(index=pd.Index([], name="plot"))
    why = pd.concat([part.why_unknown for part in parts]) if parts else pd.DataFrame(index=pd.Index([], name="plot"))
    values = values.reindex(plot_ids)
    why = why.reindex(plot_ids).astype(object).fillna("")
    return Readings(values, why)
