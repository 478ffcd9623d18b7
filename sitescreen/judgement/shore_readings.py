"""The readings that the shore gives: how far it is, how much of its breeze reaches a plot, and what screens it."""

from typing import Any

import numpy as np
from numpy.typing import NDArray

from sitescreen.climate.breeze import PlotBreeze, arrival_h
from sitescreen.judgement.readings import Readings
from sitescreen.settings import BreezeSettings
from sitescreen.terrain.shore_distance import ShoreDistance
from sitescreen.terrain.shore_fetch import OpenShore

FloatArray = NDArray[np.float64]

SHORE_COLUMNS = (
    "shore_distance_km",
    "onshore_from_deg",
    "offshore_from_deg",
    "breeze_reach",
    "breeze_arrival_h",
    "shore_skyline_deg",
    "breeze_screen",
)
CREST_COLUMNS = ("crest_bearing_deg", "crest_distance_m", "crest_above_plot_m")

NOT_GIVEN = "no shoreline was given"
NO_WATER = "the shoreline given has neither a sea nor a lake wide enough to make a breeze"
NOT_OPEN = "no shore on open water was found: only creeks, channels or ponds"
BETWEEN = "it lies between shores that face one another, or in the water"
TOO_LATE = "it lies too far from the shore for the day's breeze to arrive"
UNSEEN = "the terrain model has no data for part of the way to the shore"
NO_WIDTH = "how wide the lake is cannot be told from the shoreline given"
NO_CREST = "no ground on the way to the shore stands above the plot"


def with_shore(
    readings: Readings,
    near: ShoreDistance | None,
    lake: OpenShore | None,
    breeze: PlotBreeze | None,
    onshore_from_deg: FloatArray,
    settings: BreezeSettings,
) -> Readings:
    """The readings with the shore's added: kind, distance, bearings, breeze and what screens it.

    Parameters
    ----------
    readings : Readings, n rows
    near : ShoreDistance, of the same plots, or None
        The nearest waters of any kind: what zones, surges and salt go by. None where no shoreline was given: the
        shore's readings are unknown then, and say so.
    lake : OpenShore, or None
        The lake whose breeze is strongest.
    breeze : PlotBreeze, or None
    onshore_from_deg : float64 array, shape (n,)
        Bearing that the day's breeze comes from. [°] NaN between opposite shores. The night's comes from the other
        side, off the land.
    settings : BreezeSettings
    """
    values, why = readings.values.copy(), readings.why_unknown.copy()
    count = len(values)
    if near is None or lake is None or breeze is None:
        values["shore_kind"] = np.full(count, "", dtype=object)
        for column in (*SHORE_COLUMNS, *CREST_COLUMNS, "shore_bearing_deg", "sea_km", "lake_km", "lake_width_km"):
            values[column] = np.nan
        for column in (*SHORE_COLUMNS, *CREST_COLUMNS):
            why[column] = NOT_GIVEN
        return Readings(values, why)

    way = breeze.way
    values["shore_kind"] = breeze.kind
    values["shore_distance_km"] = breeze.distance_m / 1000.0
    values["shore_bearing_deg"] = breeze.bearing_deg
    values["onshore_from_deg"] = onshore_from_deg
    values["offshore_from_deg"] = (onshore_from_deg + 180.0) % 360.0
    values["breeze_reach"] = breeze.reach
    values["breeze_arrival_h"] = arrival_h(breeze.distance_m / 1000.0, settings)
    values["shore_skyline_deg"] = np.where(way.known, way.skyline_deg, np.nan)
    values["breeze_screen"] = breeze.screen
    crest = way.known & np.isfinite(way.crest_distance_m)
    values["crest_bearing_deg"] = np.where(crest, breeze.bearing_deg, np.nan)
    values["crest_distance_m"] = np.where(crest, way.crest_distance_m, np.nan)
    values["crest_above_plot_m"] = np.where(crest, way.crest_above_plot_m, np.nan)
    values["sea_km"] = near.sea_distance_m / 1000.0
    open_lake = ~np.isnan(lake.distance_m)
    values["lake_km"] = np.where(open_lake, lake.distance_m, near.lake_distance_m) / 1000.0
    values["lake_width_km"] = np.where(open_lake, lake.width_km, near.lake_width_km)

    dry = breeze.kind == ""
    dry_because = np.where(np.isnan(near.distance_m), NO_WATER, NOT_OPEN)
    reasons: dict[str, Any] = {
        "onshore_from_deg": BETWEEN,
        "offshore_from_deg": BETWEEN,
        "breeze_arrival_h": TOO_LATE,
        "breeze_reach": np.where(way.known, NO_WIDTH, UNSEEN),
        "shore_skyline_deg": UNSEEN,
        "breeze_screen": UNSEEN,
        **{column: np.where(way.known, NO_CREST, UNSEEN) for column in CREST_COLUMNS},
    }
    for column in (*SHORE_COLUMNS, *CREST_COLUMNS):
        missing = np.isnan(values[column].to_numpy(dtype=np.float64))
        if missing.any():
            told = np.where(dry, dry_because, np.asarray(reasons.get(column, ""), dtype=object))
            why[column] = np.where(missing, told, "")
    return Readings(values, why)


__all__ = ["with_shore"]
