"""Readings that follow from other readings of the same plot, for criteria that must not count one thing twice."""

import numpy as np
import pandas as pd
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]

DERIVED_READINGS = {"facing_ns": ("slope_deg", "aspect_deg")}
"""Each derived reading with the readings that it follows from."""

FULL_FACING_DEG = 10.0
"""Slope from which a direction counts fully: our choice, no source. [°]"""


def facing_ns(slope_deg: FloatArray, aspect_deg: FloatArray) -> FloatArray:
    """How far the ground faces north or south rather than east or west.

    Parameters
    ----------
    slope_deg : array, shape (n,)
        Mean slope. [°]
    aspect_deg : array, shape (n,)
        Bearing the ground falls to. [°] NaN on level ground.

    Returns
    -------
    float64 array, shape (n,)
        cos(2·aspect) × min(1, slope/10°): 1 on slopes that fall north or south, −1 on slopes that fall east or west,
        near 0 on level ground. NaN where the direction is unknown.

    Notes
    -----
    Houses set along the contour then face north and south, and near the equator those faces take least of the low sun
    of morning and evening. The sun on the ground itself is measured apart.
    """
    slope = np.asarray(slope_deg, dtype=np.float64)
    aspect = np.asarray(aspect_deg, dtype=np.float64)
    return np.asarray(np.cos(np.radians(2.0 * aspect)) * _facing_strength(slope), dtype=np.float64)


def _facing_strength(slope_deg: FloatArray) -> FloatArray:
    return np.asarray(np.clip(slope_deg / FULL_FACING_DEG, 0.0, 1.0))


def with_derived(readings: pd.DataFrame) -> pd.DataFrame:
    """The readings with the derived columns added; the table handed in stays as it is."""
    return readings.assign(facing_ns=facing_ns(_column(readings, "slope_deg"), _column(readings, "aspect_deg")))


def possible_range(reading: str, readings: pd.DataFrame) -> tuple[FloatArray, FloatArray]:
    """Between which values a reading must lie where it is unknown.

    Returns
    -------
    low, high : float64 arrays, shape (n,)
        −inf and inf where nothing limits it. Ground of unknown direction faces any way as far as its slope allows, so
        that level ground is close to 0 for certain. Cold that depends on ground beyond the terrain model lies between
        what two opposite guesses at that ground give.
    """
    low = np.full(len(readings), -np.inf)
    high = np.full(len(readings), np.inf)
    if reading == "facing_ns":
        strength = _facing_strength(_column(readings, "slope_deg"))
        # an unknown slope leaves the whole range
        high = np.where(np.isnan(strength), 1.0, strength)
        low = -high
    elif reading == "cold_deficit_k":
        least, most = _column(readings, "cold_deficit_least_k"), _column(readings, "cold_deficit_most_k")
        low, high = np.where(np.isnan(least), -np.inf, least), np.where(np.isnan(most), np.inf, most)
    return low, high


def unknown_because(reading: str, why_unknown: pd.DataFrame, plot: str) -> str:
    """The stated reason why a reading of one plot is unknown; "" where none was given."""
    for name in DERIVED_READINGS.get(reading, (reading,)):
        if name in why_unknown and plot in why_unknown.index:
            reason = why_unknown.at[plot, name]
            if isinstance(reason, str) and reason:
                return reason
    return ""


def _column(readings: pd.DataFrame, name: str) -> FloatArray:
    if name not in readings:
        return np.full(len(readings), np.nan)
    return np.asarray(readings[name].to_numpy(dtype=np.float64))
