"""How strong the cold of calm clear nights can grow in a climate: the loss of heat to the sky, after Brunt."""

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from sitescreen.climate.zones import ZoneShares
from sitescreen.settings import ColdAirSettings

FloatArray = NDArray[np.float64]

STEFAN_BOLTZMANN_W_M2_K4 = 5.670374e-8
"""CODATA 2018. [W/(m² K⁴)]"""

KELVIN_AT_0_C = 273.15
"""[K]"""

DEFICIT_K_PER_W_M2 = 4.0 / 64.0
"""Our closure: 64 W/m² of net loss, those of a warm humid coast, give a deficit of 4 K. [K/(W/m²)]"""


def saturation_hpa(temperature_c: FloatArray) -> FloatArray:
    """Pressure of water vapour in saturated air over water, 6.112·e^(17.62·t/(243.12 + t)). [hPa]

    The Magnus form of WMO-No. 8, Guide to Instruments and Methods of Observation, annex 4.B (from memory).
    """
    return np.asarray(6.112 * np.exp(17.62 * temperature_c / (243.12 + temperature_c)), dtype=np.float64)


def net_loss_w_m2(night_c: FloatArray, vapour_hpa: FloatArray) -> FloatArray:
    """Net longwave loss of open ground under a clear sky, σT⁴·(1 − 0.52 − 0.065·√e). [W/m²]

    Brunt 1932, Q. J. R. Meteorol. Soc. 58:389–420 (coefficients from memory).
    """
    emitted = STEFAN_BOLTZMANN_W_M2_K4 * (np.asarray(night_c) + KELVIN_AT_0_C) ** 4
    return np.asarray(emitted * (1.0 - 0.52 - 0.065 * np.sqrt(vapour_hpa)), dtype=np.float64)


def strength_k(night_c: FloatArray, day_mean_c: FloatArray, rh_mean: FloatArray) -> FloatArray:
    """Deficit of a deep pool under an open sky on a calm clear night. [K]

    Parameters
    ----------
    night_c, day_mean_c : float64 array
        Cool-season mean minimum, and mean of day and night. [°C]
    rh_mean : float64 array
        Mean relative humidity in that season. [%]

    Notes
    -----
    The air keeps its vapour through the night unless it falls as dew: e is that of the day's mean, at most saturation
    at the night's minimum.
    """
    vapour = np.minimum(0.01 * np.asarray(rh_mean) * saturation_hpa(day_mean_c), saturation_hpa(night_c))
    return np.asarray(DEFICIT_K_PER_W_M2 * net_loss_w_m2(night_c, vapour), dtype=np.float64)


def plot_strength_k(zones: ZoneShares, climate: pd.DataFrame | None, settings: ColdAirSettings) -> FloatArray:
    """Strength at each plot: from climate normals where given, else that of the zones that share it. [K]

    Parameters
    ----------
    zones : ZoneShares, n rows
    climate : DataFrame, n rows, optional
        As :func:`sitescreen.climate.normals.plot_climate` gives it.
    settings : ColdAirSettings

    Returns
    -------
    float64 array, shape (n,)
        NaN for a plot of no zone without normals.
    """
    if climate is not None:
        columns = ("cool_season_min_c", "cool_season_mean_c", "cool_season_rh")
        return strength_k(*(climate[name].to_numpy(dtype=np.float64) for name in columns))
    by_name = settings.strength_k
    ordinary = float(np.median(list(by_name.values())))  # for a planner's own zone, of which we know nothing
    by_zone = np.array([by_name.get(zone, ordinary) for zone in zones.shares.columns])
    total = zones.shares.to_numpy(dtype=np.float64)
    return np.where(total.sum(axis=1) > 0, total @ by_zone, np.nan)
