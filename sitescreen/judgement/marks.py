"""Marks: how well each reading suits a zone, 0–100."""

import numpy as np
import pandas as pd
from numpy.typing import ArrayLike, NDArray

from sitescreen.judgement.derived import possible_range
from sitescreen.judgement.profiles import Criterion, ZoneProfile

FloatArray = NDArray[np.float64]


def mark(value: ArrayLike, criterion: Criterion) -> FloatArray:
    """The mark that each value of a reading earns.

    Parameters
    ----------
    value : array, shape (n,)
        In the criterion's unit. NaN stays NaN.
    criterion : Criterion
        Its curve is linear between its points and level beyond them, and knows nothing of the other plots.

    Returns
    -------
    float64 array, shape (n,)
        0–100.
    """
    points = np.asarray(criterion.curve, dtype=np.float64)
    return np.asarray(np.interp(np.asarray(value, dtype=np.float64), points[:, 0], points[:, 1]), dtype=np.float64)


def mark_range(low: FloatArray, high: FloatArray, criterion: Criterion) -> tuple[FloatArray, FloatArray]:
    """The lowest and the highest mark that readings between two values could earn.

    Parameters
    ----------
    low, high : float64 arrays, shape (n,)
        Ends of the range; −inf and inf where nothing is known.

    Returns
    -------
    lowest, highest : float64 arrays, shape (n,)
    """
    at_low, at_high = mark(low, criterion), mark(high, criterion)
    lowest, highest = np.minimum(at_low, at_high), np.maximum(at_low, at_high)
    for value, points in criterion.curve:
        inside = (low < value) & (value < high)
        lowest = np.where(inside, np.minimum(lowest, points), lowest)
        highest = np.where(inside, np.maximum(highest, points), highest)
    return lowest, highest


def marks(readings: pd.DataFrame, profile: ZoneProfile) -> pd.DataFrame:
    """The marks of every plot for one zone.

    Parameters
    ----------
    readings : DataFrame, n rows
        With the derived readings; a column that is missing is unknown for all.
    profile : ZoneProfile

    Returns
    -------
    DataFrame, n rows
        ``mark_<criterion>``, 0–100, NaN where the reading is unknown; in the profile's order.
    """
    return pd.DataFrame(
        {f"mark_{one.name}": mark(_values(readings, one), one) for one in profile.criteria},
        index=readings.index,
    )


def mark_limits(readings: pd.DataFrame, profile: ZoneProfile) -> tuple[pd.DataFrame, pd.DataFrame]:
    """The lowest and the highest mark each plot could have: its mark where the reading is known.

    Where the reading is unknown it may be anything that other readings leave open; mostly that is the whole curve.
    """
    lowest, highest = {}, {}
    for one in profile.criteria:
        lowest[f"mark_{one.name}"], highest[f"mark_{one.name}"] = limits_of(readings, one)
    return pd.DataFrame(lowest, index=readings.index), pd.DataFrame(highest, index=readings.index)


def limits_of(readings: pd.DataFrame, criterion: Criterion) -> tuple[FloatArray, FloatArray]:
    """The lowest and the highest mark of one criterion; two arrays of shape (n,)."""
    value = _values(readings, criterion)
    from_value, to_value = possible_range(criterion.reading, readings)
    unknown = np.isnan(value)
    return mark_range(np.where(unknown, from_value, value), np.where(unknown, to_value, value), criterion)


def _values(readings: pd.DataFrame, criterion: Criterion) -> FloatArray:
    """The reading as numbers; of words, their place among the criterion's kinds. NaN where unknown."""
    if criterion.column not in readings:
        return np.full(len(readings), np.nan)
    if criterion.kinds:
        places = {kind: float(place) for place, kind in enumerate(criterion.kinds)}
        return np.array([places.get(str(word), np.nan) for word in readings[criterion.column]], dtype=np.float64)
    return np.asarray(readings[criterion.column].to_numpy(dtype=np.float64))
