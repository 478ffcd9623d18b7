"""The sun's path over a place: where it stands through twelve days of the year, and how strong it shines from there.

Bearings are degrees clockwise from true north, heights above the horizontal are apparent (with refraction).
"""

from functools import lru_cache
from typing import Any, NamedTuple

import numpy as np
from numpy.typing import NDArray

from sitescreen.climate.clear_sky import clear_sky, pressure_hpa
from sitescreen.errors import InputError
from sitescreen.settings import SunSettings

FloatArray = NDArray[np.float64]
BoolArray = NDArray[np.bool_]

DAY_OF_YEAR = np.array([17, 47, 75, 105, 135, 162, 198, 228, 258, 288, 318, 344])
"""The day that stands for each month: its extraterrestrial radiation is nearest to the month's mean (S. A. Klein,
"Calculation of monthly average insolation on tilted surfaces", Sol. Energy 19:325–329, 1977, table 1)."""

DAYS_IN_MONTH = np.array([31, 28, 31, 30, 31, 30, 31, 31, 30, 31, 30, 31])

_YEAR = 2026
"""Half-way between leap years, so that the declination is within 0.1° of any year's."""

_DELTA_T_S = 67.0
"""Terrestrial less universal time. [s] Five seconds more or less turn the sun by 0.0002°."""

_TEMPERATURE_C = 15.0
"""Air for the refraction; 15 K more or less change it by 0.03° at the horizon. [°C]"""


class SunPath(NamedTuple):
    """The sun over one place, on twelve days and through their steps.

    ``day_of_year`` (12,): the day that stands for each month. ``hour`` (steps,): clock hour in the middle of each step
    [h], in the time zone ``utc_offset_h``. ``elevation_deg`` (12, steps): apparent height of the sun's middle [°],
    negative at night. ``azimuth_deg`` (12, steps): clockwise from true north [°]. ``beam_w_m2`` (12, steps): clear-sky
    beam on a plane that faces the sun [W/m²], 0 at night. ``diffuse_w_m2`` (12, steps): clear-sky light from the whole
    sky on level open ground [W/m²]. ``step_h``: length of a step [h]. No value is NaN.
    """

    day_of_year: NDArray[np.int64]
    hour: FloatArray
    elevation_deg: FloatArray
    azimuth_deg: FloatArray
    beam_w_m2: FloatArray
    diffuse_w_m2: FloatArray
    step_h: float
    utc_offset_h: float


def assumed_utc_offset_h(lon_deg: float) -> float:
    """The nearest whole hour of longitude: clocks there may by law show another time. [h]"""
    return float(np.floor(lon_deg / 15.0 + 0.5))


def sun_path(
    lon_deg: float, lat_deg: float, elevation_m: float, settings: SunSettings, utc_offset_h: float | None = None
) -> SunPath:
    """The sun over one place.

    Parameters
    ----------
    lon_deg, lat_deg : float
        WGS84. [°]
    elevation_m : float
        Height above sea level. [m]
    settings : SunSettings
    utc_offset_h : float, optional
        The clock's lead over universal time. [h] Else that of :func:`assumed_utc_offset_h`.

    Returns
    -------
    SunPath
        Arrays are read-only, since places may share them.

    Raises
    ------
    InputError
        If the place is unknown.

    Notes
    -----
    Positions by the algorithm of Reda and Andreas [1]_, refraction as there, for the pressure of the standard
    atmosphere at that height. Light of a sky without clouds by Ineichen and Perez [2]_ with one turbidity for all.

    References
    ----------
    .. [1] I. Reda and A. Andreas, "Solar position algorithm for solar radiation applications," Sol. Energy, vol. 76,
       pp. 577–589, 2004 (NREL/TP-560-34302).
    .. [2] P. Ineichen and R. Perez, "A new airmass independent formulation for the Linke turbidity coefficient," Sol.
       Energy, vol. 73, pp. 151–157, 2002.
    """
    if not np.isfinite([lon_deg, lat_deg, elevation_m]).all():
        raise InputError(
            f"the sun was asked for at longitude {lon_deg}, latitude {lat_deg}, height {elevation_m} m",
            "a known place is needed",
            "Leave out plots of unknown height",
        )
    offset_h = assumed_utc_offset_h(lon_deg) if utc_offset_h is None else float(utc_offset_h)
    return _sun_path(float(lon_deg), float(lat_deg), float(elevation_m), settings, offset_h)


@lru_cache(maxsize=4096)
def _sun_path(lon_deg: float, lat_deg: float, elevation_m: float, settings: SunSettings, offset_h: float) -> SunPath:
    from pvlib.spa import atmospheric_refraction_correction

    hour, true_deg, azimuth_deg = _positions(lon_deg, lat_deg, settings.step_h, offset_h)
    bent = atmospheric_refraction_correction(pressure_hpa(elevation_m), _TEMPERATURE_C, true_deg, 0.5667)
    height_deg = true_deg + bent
    beam, diffuse = clear_sky(height_deg, DAY_OF_YEAR[:, None], elevation_m, settings.linke_turbidity)
    arrays = (DAY_OF_YEAR, hour, height_deg, azimuth_deg, beam, diffuse)
    for array in arrays:
        array.flags.writeable = False
    return SunPath(*arrays, settings.step_h, offset_h)


@lru_cache(maxsize=1024)
def _positions(
    lon_deg: float, lat_deg: float, step_h: float, offset_h: float
) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Clock hours (steps,), and height without refraction and bearing of the sun (12, steps). [h, °, °]"""
    import pandas as pd
    from pvlib.solarposition import spa_python

    steps = round(24.0 / step_h)
    hour = (np.arange(steps) + 0.5) * (24.0 / steps)
    seconds = (DAY_OF_YEAR[:, None] - 1) * 86_400.0 + (hour[None, :] - offset_h) * 3600.0
    times = pd.Timestamp(f"{_YEAR}-01-01", tz="UTC") + pd.to_timedelta(seconds.ravel(), unit="s")
    found = spa_python(pd.DatetimeIndex(times), lat_deg, lon_deg, delta_t=_DELTA_T_S)
    shape = (12, steps)
    height, azimuth = (found[name].to_numpy(dtype=np.float64).reshape(shape) for name in ("elevation", "azimuth"))
    return np.asarray(hour, dtype=np.float64), height, azimuth


class Skies(NamedTuple):
    """The suns that many plots share: ``paths``, and for each plot the number of its own, −1 where unknown."""

    paths: tuple[SunPath, ...]
    which: NDArray[np.int64]


def sun_paths(
    lon_deg: FloatArray,
    lat_deg: FloatArray,
    elevation_m: FloatArray,
    settings: SunSettings,
    utc_offset_h: float | None = None,
) -> Skies:
    """The suns over many plots: one for each cell of latitude, longitude and height.

    Parameters
    ----------
    lon_deg, lat_deg, elevation_m : float64 arrays, shape (n,)
        [°, °, m] A plot of unknown height has no sun.
    settings : SunSettings
        ``cell_deg`` and ``level_m`` are the sizes of the cells.
    utc_offset_h : float, optional
        See :func:`sun_path`.

    Notes
    -----
    Cells have absolute places, so that a plot's sun does not depend on the other plots. A plot's sun is that of the
    middle of its cell: with 0.1° and 100 m its height is within 0.07°, its time within 12 s, and from
    20° up its beam within 0.7 %.
    """
    places = np.column_stack([lon_deg, lat_deg, elevation_m]).astype(np.float64)
    known = np.isfinite(places).all(axis=1)
    size = np.array([settings.cell_deg, settings.cell_deg, settings.level_m])
    cells, number = np.unique(np.floor(places[known] / size).astype(np.int64), axis=0, return_inverse=True)
    which = np.full(len(places), -1, dtype=np.int64)
    which[known] = number.ravel()
    middles = ((cells + 0.5) * size).tolist()
    return Skies(tuple(sun_path(lon, lat, height, settings, utc_offset_h) for lon, lat, height in middles), which)


def lit(path: SunPath, skyline_deg: NDArray[np.floating[Any]]) -> BoolArray:
    """Where the sun stands above a skyline.

    Parameters
    ----------
    path : SunPath
    skyline_deg : float64 array, shape (m,) or (n, m)
        Height of the skyline in m even directions from true north, clockwise; between them it is linear. [°] Where it
        is below the horizontal, or NaN because no ground is known there, the level horizon hides the sun.

    Returns
    -------
    bool array, shape (12, steps) or (n, 12, steps)
        Whether the middle of the sun is up and stands above the skyline, in the middle of each step.
    """
    return np.asarray(clearance_deg(path, skyline_deg) > 0)


def clearance_deg(path: SunPath, skyline_deg: NDArray[np.floating[Any]]) -> FloatArray:
    """How high the sun stands above a skyline as in :func:`lit`, below it negative; of the same shapes. [°]"""
    return np.asarray(path.elevation_deg - skyline_at(skyline_deg, path.azimuth_deg))


def skyline_at(skyline_deg: NDArray[np.floating[Any]], azimuth_deg: FloatArray) -> FloatArray:
    """Height of a skyline towards given bearings, at least level. [°]

    Parameters
    ----------
    skyline_deg : float64 array, shape (m,) or (n, m)
        As in :func:`lit`.
    azimuth_deg : float64 array, any shape
        Clockwise from true north. [°]

    Returns
    -------
    float64 array, shape of azimuth_deg, with n before it where there are n skylines
    """
    heights = np.nan_to_num(np.maximum(np.asarray(skyline_deg, dtype=np.float64), 0.0), nan=0.0)
    count = heights.shape[-1]
    place = np.asarray(azimuth_deg) % 360.0 * (count / 360.0)
    before = np.floor(place).astype(np.int64)
    part = place - before
    left, right = heights[..., before % count], heights[..., (before + 1) % count]
    # picking columns leaves them in another order in memory, and sums over them would depend on it
    return np.ascontiguousarray(left + part * (right - left))


def cos_incidence(path: SunPath, tilt_deg: float, azimuth_deg: float) -> FloatArray:
    """Cosine of the angle between the sun and a plane's outward normal, 0 where the sun is behind the plane.

    Parameters
    ----------
    path : SunPath
    tilt_deg : float
        0 for level ground, 90 for a wall. [°]
    azimuth_deg : float
        Bearing the plane faces, clockwise from true north. [°]

    Returns
    -------
    float64 array, shape (12, steps)
    """
    height, tilt = np.radians(path.elevation_deg), np.radians(tilt_deg)
    away = np.radians(path.azimuth_deg - azimuth_deg)
    cosine = np.sin(height) * np.cos(tilt) + np.cos(height) * np.sin(tilt) * np.cos(away)
    return np.asarray(np.maximum(cosine, 0.0))


def on_plane(
    path: SunPath,
    lit: BoolArray,
    tilt_deg: float,
    azimuth_deg: float,
    sky_view: float | None = None,
    clear_share: float | FloatArray = 1.0,
    albedo: float = 0.2,
) -> FloatArray:
    """Sunlight on a slope or a wall.

    Parameters
    ----------
    path : SunPath
    lit : bool array, shape (12, steps)
        See :func:`lit`.
    tilt_deg, azimuth_deg : float
        See :func:`cos_incidence`. [°]
    sky_view : float, optional
        How much of its light from the sky an open level plane would have, the plane has: 0–1. Of a slope the plot's sky
        view factor, of a wall :func:`wall_sky_view`. Without it (1 + cos tilt)/2: no ground around.
    clear_share : float or array that goes with (12, steps)
        Share of the time without cloud before the sun, 0–1.
    albedo : float
        Share of light that the ground around throws back.

    Returns
    -------
    float64 array, shape (12, steps)
        Beam + light of the sky + light from the ground. [W/m²]

    Notes
    -----
    beam · cos i · lit · clear + sky · V + albedo · (1 − V) · (beam · sin h · lit · clear + sky), with the light of the
    sky the same from all sides (isotropic). Clouds take from the beam; the light of the sky is left as it is under a
    clear one, which understates it a little.
    """
    view = 0.5 * (1.0 + np.cos(np.radians(tilt_deg))) if sky_view is None else sky_view
    beam = path.beam_w_m2 * lit * clear_share
    level = beam * np.maximum(np.sin(np.radians(path.elevation_deg)), 0.0) + path.diffuse_w_m2
    direct = beam * cos_incidence(path, tilt_deg, azimuth_deg)
    return np.asarray(direct + path.diffuse_w_m2 * view + albedo * (1.0 - view) * level)


def wall_sky_view(skyline_deg: NDArray[np.floating[Any]], azimuth_deg: float) -> FloatArray:
    """How much of the light of the sky a wall has over a skyline, against an open level plane.

    Parameters
    ----------
    skyline_deg : float64 array, shape (m,) or (n, m)
        As in :func:`lit`. [°]
    azimuth_deg : float
        Bearing the wall faces, clockwise from true north. [°]

    Returns
    -------
    float64 array, shape () or (n,)
        0.5 in the open; an isotropic sky seen by a vertical plane,
        (1/π)∫cos(φ − A)·[(π/2 − γ)/2 − sin(2γ)/4] dφ over the half circle in front, γ the skyline.
    """
    fine = np.radians(np.arange(-89.5, 90.0))  # a degree a step
    height = np.radians(skyline_at(skyline_deg, np.degrees(fine) + azimuth_deg))
    part = (0.5 * np.pi - height) / 2.0 - np.sin(2.0 * height) / 4.0
    facing = np.cos(fine)
    # the sum of the cosines stands for their integral, 2, so that the open wall has 0.5 exactly
    return np.asarray((part * facing).sum(axis=-1) / facing.sum() * 2.0 / np.pi)
