"""Which months are cool and which are hot, for people indoors without machines."""

from collections.abc import Sequence
from typing import NamedTuple

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from sitescreen.climate.sun_path import DAY_OF_YEAR
from sitescreen.inputs.normals import Normals

FloatArray = NDArray[np.float64]
BoolArray = NDArray[np.bool_]

COMFORT_BAND_K = 3.5
"""Half the band that satisfies 80 % of people: ASHRAE 55, adaptive model (coefficients from secondary sources)."""

MONTHS_OF_A_SEASON = 3
"""Where no month is too cool or too hot, so many of the coolest or hottest stand for the season: our choice."""

WEAK_SPREAD = 0.25
"""Below this difference between the sunniest and the least sunny month, over the mean, the sun does not set the
seasons: our choice. It is passed at about 11° of latitude."""

FROM_NORMALS, FROM_BRIEF, PARTLY, ASSUMED = "normals", "brief", "brief, one season assumed", "assumed"


class Seasons(NamedTuple):
    """The seasons of n plots.

    ``cool``, ``hot`` (n, 12): whether a month belongs to the season. ``is_too_cool``, ``is_too_hot`` (n,): whether its
    months are outside comfort, not only the coolest or hottest of a mild year; False where unknown. ``source``:
    one of the words above.
    """

    cool: BoolArray
    hot: BoolArray
    is_too_cool: BoolArray
    is_too_hot: BoolArray
    source: str


def comfort_c(prevailing_mean_c: FloatArray) -> FloatArray:
    """Temperature that people find neither warm nor cool, given the mean outdoors. [°C]

    0.31·t + 17.8 (ASHRAE 55, adaptive model), t held to 10–33.5 °C, where the model holds.
    """
    return np.asarray(0.31 * np.clip(prevailing_mean_c, 10.0, 33.5) + 17.8)


def seasons_from_normals(normals: Normals, climate: pd.DataFrame, lapse_k_km: float) -> Seasons:
    """The seasons from station normals, moved to the plots' height.

    Parameters
    ----------
    normals : Normals
    climate : DataFrame, n rows
        From :func:`sitescreen.climate.normals.plot_climate`: the plot's ``station`` and ``station_rise_m``.
    lapse_k_km : float
        [K/km]

    Notes
    -----
    A month is cool where its mean temperature lies more than 3.5 K below the adaptive comfort temperature, and hot
    where its mean daily maximum lies more than 3.5 K above it. Where no month does, the three coolest, or hottest,
    stand for the season.
    """
    by_month = normals.stations.pivot(index="station", columns="month", values=["t_max_c", "t_min_c"])
    rise_km = climate["station_rise_m"].to_numpy(dtype=np.float64)[:, None] / 1000.0
    at = by_month.loc[climate["station"]]
    highest = at["t_max_c"].to_numpy(dtype=np.float64) - lapse_k_km * rise_km
    mean = 0.5 * (highest + at["t_min_c"].to_numpy(dtype=np.float64) - lapse_k_km * rise_km)
    comfort = comfort_c(mean)
    too_cool, too_hot = mean < comfort - COMFORT_BAND_K, highest > comfort + COMFORT_BAND_K
    is_too_cool, is_too_hot = too_cool.any(axis=1), too_hot.any(axis=1)
    return Seasons(
        np.where(is_too_cool[:, None], too_cool, _least(mean)),
        np.where(is_too_hot[:, None], too_hot, _least(-highest)),
        is_too_cool,
        is_too_hot,
        FROM_NORMALS,
    )


def seasons_without_normals(
    lat_deg: FloatArray, cool_months: Sequence[int] | None = None, hot_months: Sequence[int] | None = None
) -> Seasons:
    """The seasons that a brief states; a season it leaves out is assumed from the sun above the air.

    Parameters
    ----------
    lat_deg : float64 array, shape (n,)
        [°]
    cool_months, hot_months : sequence of int, optional
        1–12, the same for all plots.

    Notes
    -----
    The three months with least, or most, sun above the air stand for a season. At the equator that makes May to July
    or so the cool season, since the Earth is farthest from the sun in July. The rule follows whole degrees of latitude,
    and :func:`is_weak` says where it is no more than a guess.
    """
    whole: FloatArray = np.round(np.asarray(lat_deg, dtype=np.float64)).astype(np.float64)
    degrees, which = np.unique(whole, return_inverse=True)
    day = extraterrestrial_mj_m2(degrees.astype(np.float64)[:, None], DAY_OF_YEAR[None, :])
    cool, hot = (
        _least(sign * day)[which.ravel()] if stated is None else np.tile(_are(stated), (len(whole), 1))
        for sign, stated in ((1.0, cool_months), (-1.0, hot_months))
    )
    unknown = np.zeros(len(whole), dtype=np.bool_)
    is_stated = cool_months is not None, hot_months is not None
    source = FROM_BRIEF if all(is_stated) else PARTLY if any(is_stated) else ASSUMED
    return Seasons(cool, hot, unknown, unknown, source)


def _are(months: Sequence[int]) -> BoolArray:
    return np.isin(np.arange(1, 13), np.asarray(months))


def is_weak(lat_deg: FloatArray) -> BoolArray:
    """Where the sun hardly changes over the year, so that seasons from it are a guess; shape (n,)."""
    whole: FloatArray = np.round(np.asarray(lat_deg, dtype=np.float64)).astype(np.float64)
    day = extraterrestrial_mj_m2(whole[:, None], DAY_OF_YEAR[None, :])
    return np.asarray((day.max(axis=1) - day.min(axis=1)) < WEAK_SPREAD * day.mean(axis=1))


def extraterrestrial_mj_m2(lat_deg: FloatArray, day_of_year: NDArray[np.integer]) -> FloatArray:
    """Sun on level ground above the air, over a day [1]_, eq. 21–25. [MJ/m²]

    Parameters
    ----------
    lat_deg : float64 array
        [°] Within the polar circles.
    day_of_year : integer array, of a shape that goes with it

    References
    ----------
    .. [1] R. G. Allen, L. S. Pereira, D. Raes and M. Smith, "Crop evapotranspiration," FAO Irrigation and Drainage
       Paper 56, 1998.
    """
    year = 2.0 * np.pi * np.asarray(day_of_year) / 365.0
    phi, declination = np.radians(lat_deg), 0.409 * np.sin(year - 1.39)
    nearer = 1.0 + 0.033 * np.cos(year)
    sunset = np.arccos(np.clip(-np.tan(phi) * np.tan(declination), -1.0, 1.0))
    lift = sunset * np.sin(phi) * np.sin(declination) + np.cos(phi) * np.cos(declination) * np.sin(sunset)
    return np.asarray(24.0 * 60.0 / np.pi * 0.0820 * nearer * lift)


def _least(values: FloatArray) -> BoolArray:
    """The months with the least values, (n, 12); of equal ones the earlier."""
    order = np.argsort(values, axis=1, kind="stable")[:, :MONTHS_OF_A_SEASON]
    out = np.zeros(values.shape, dtype=np.bool_)
    np.put_along_axis(out, order, True, axis=1)
    return out
