"""Sunlight under a sky without clouds."""

from typing import Any

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]

_SOLAR_CONSTANT_W_M2 = 1361.0
"""Kopp & Lean 2011, Geophys. Res. Lett. 38:L01706."""


def pressure_hpa(elevation_m: float) -> float:
    """Pressure of the ICAO standard atmosphere (Doc 7488), troposphere. [hPa]"""
    return float(1013.25 * (1.0 - 6.5e-3 * elevation_m / 288.15) ** 5.25588)


def clear_sky(
    height_deg: FloatArray, day_of_year: NDArray[Any], elevation_m: float, linke_turbidity: float
) -> tuple[FloatArray, FloatArray]:
    """Light under a sky without clouds.

    Parameters
    ----------
    height_deg : float64 array
        Apparent height of the sun. [°]
    day_of_year : array, of a shape that goes with it
    elevation_m : float
        Height above sea level. [m]
    linke_turbidity : float
        [1]

    Returns
    -------
    beam_w_m2 : float64 array
        On a plane that faces the sun. [W/m²] 0 where the sun is down.
    diffuse_w_m2 : float64 array
        From the whole sky on level open ground. [W/m²] 0 where the sun is down.
    """
    from pvlib.atmosphere import get_relative_airmass
    from pvlib.clearsky import ineichen
    from pvlib.irradiance import get_extra_radiation

    height = np.asarray(height_deg, dtype=np.float64)
    up = height > 0
    zenith = 90.0 - np.where(up, height, 45.0)  # a sun that is down is put up, and its light taken away below
    airmass = get_relative_airmass(zenith, "kastenyoung1989") * pressure_hpa(elevation_m) / 1013.25
    extra = get_extra_radiation(np.asarray(day_of_year, dtype=np.float64), _SOLAR_CONSTANT_W_M2, method="spencer")
    found = ineichen(zenith, airmass, linke_turbidity, elevation_m, np.broadcast_to(extra, height.shape))
    # the formulas part the light so that the remainder may fall below nothing at a sun on the horizon
    beam, diffuse = np.maximum(found["dni"], 0.0), np.maximum(found["dhi"], 0.0)
    return np.where(up, beam, 0.0), np.where(up, diffuse, 0.0)
