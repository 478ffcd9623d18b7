"""The readings of the beds that water runs in: how much ground drains past the plot, and how high it lies above."""

import numpy as np

from sitescreen.judgement.coverage import Coverage
from sitescreen.judgement.readings import Readings
from sitescreen.terrain.watercourses import Watercourses

WATERCOURSE_COLUMNS = ("floor_height_m", "watercourse_km2")

NO_BED = "no watercourse below it on this terrain: its water reaches the sea or the edge of the terrain without one"
NO_GROUND = "the terrain model has no data under part of the plot"


def with_watercourses(
    readings: Readings, coverage: Coverage, found: Watercourses, known_share_least: float
) -> Readings:
    """The readings with those of the nearest beds added.

    Parameters
    ----------
    readings : Readings, n rows
    coverage : Coverage
        The cells under the plots.
    found : Watercourses
        On the grid of the coverage.
    known_share_least : float
        A mean needs so much of the plot's area known.

    Returns
    -------
    Readings
        With ``floor_height_m`` [m], the mean height above the bed that the plot's ground drains to, and
        ``watercourse_km2`` [km²], the largest catchment of a bed that crosses the plot or passes beside it; 0 where
        none does.
    """
    values, why = readings.values.copy(), readings.why_unknown.copy()
    values["floor_height_m"] = coverage.mean(found.height_m.values, known_share_least)
    values["watercourse_km2"] = coverage.largest(found.catchment_km2.values)
    for column, reason in zip(WATERCOURSE_COLUMNS, (NO_BED, NO_GROUND), strict=True):
        missing = np.isnan(values[column].to_numpy(dtype=np.float64))
        if missing.any():
            why[column] = np.where(missing, reason, "")
    return Readings(values, why)


__all__ = ["WATERCOURSE_COLUMNS", "with_watercourses"]
