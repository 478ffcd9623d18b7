"""How much of the day's sea or lake breeze reaches a plot, by its distance from the shore alone.

First version: distance and the width of the lake. Ground that stands between plot and shore is not looked at yet, and
every sea and every lake above the stated size counts as open water.
"""

from typing import Any

import numpy as np
from numpy.typing import NDArray

from sitescreen.settings import BreezeSettings

FloatArray = NDArray[np.float64]


def arrival_h(distance_km: FloatArray, settings: BreezeSettings) -> FloatArray:
    """Local hour at which the breeze front reaches a plot: onset plus distance over the front's speed. [h]

    NaN where the front would arrive after the breeze has ended.
    """
    hour = settings.onset_h + np.asarray(distance_km) * 1000.0 / settings.front_speed_m_s / 3600.0
    return np.where(hour < settings.end_h, hour, np.nan)


def sea_reach(distance_km: FloatArray, settings: BreezeSettings) -> FloatArray:
    """Share of the sea breeze that reaches a plot, 1 at the shore and strictly falling.

    Parameters
    ----------
    distance_km : array
        Distance to the shore. [km] NaN stays NaN.

    Returns
    -------
    float64 array
        Share of the daytime breeze hours left when the front arrives (front 3 m/s: Linacre & Geerts, *Climates and
        Weather Explained*, ch. 14, morning fronts at Jakarta; onset and end likewise), times a tail beyond the design
        band: exp(−(D − 8 km)/20 km), our closure. 0.99 at 1 km, 0.91 at 8 km.
    """
    distance = np.asarray(distance_km, dtype=np.float64)
    length_h = settings.end_h - settings.onset_h
    hours_left = np.clip(1.0 - distance * 1000.0 / settings.front_speed_m_s / 3600.0 / length_h, 0.0, 1.0)
    tail = np.exp(-np.maximum(distance - settings.tail_from_km, 0.0) / settings.tail_length_km)
    return hours_left * tail


def lake_weight(width_km: FloatArray, settings: BreezeSettings) -> FloatArray:
    """How much of a breeze a lake of this width makes: 0 at 2 km across, 1 at 25 km, linear between (our closure)."""
    low, high = settings.lake_width_none_km, settings.lake_width_full_km
    return np.clip((np.asarray(width_km, dtype=np.float64) - low) / (high - low), 0.0, 1.0)


def lake_reach(distance_km: FloatArray, width_km: FloatArray, settings: BreezeSettings) -> FloatArray:
    """Share of a lake's breeze that reaches a plot, its weight by width included.

    By early afternoon the breeze of a lake under about 50 km reaches less far inland than the lake is wide (Segal et
    al. 1997, BAMS 78:1135–1147), so the share fades over the outer half of that distance and ends there.
    """
    distance = np.asarray(distance_km, dtype=np.float64)
    width = np.asarray(width_km, dtype=np.float64)
    with np.errstate(invalid="ignore", divide="ignore"):
        within = np.clip((width - distance) / (0.5 * width), 0.0, 1.0)
    return lake_weight(width, settings) * within * sea_reach(distance, settings)


def breeze_reach(sea_km: Any, lake_km: Any, lake_width_km: Any, settings: BreezeSettings) -> FloatArray:
    """The stronger of the sea's and the lake's breeze at each plot, 0–1.

    NaN where no shore is known at all: nobody has said that there is none.
    """
    sea = np.asarray(sea_km, dtype=np.float64)
    lake = np.asarray(lake_km, dtype=np.float64)
    reach = np.fmax(sea_reach(sea, settings), lake_reach(lake, np.asarray(lake_width_km), settings))
    return np.where(np.isnan(sea) & np.isnan(lake), np.nan, reach)
