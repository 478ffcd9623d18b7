"""Whether the day's breeze sets in against the wind of the day: Biggs and Graves' index, as a note."""

from typing import TYPE_CHECKING

import numpy as np
import pandas as pd

from sitescreen.notes import Note

if TYPE_CHECKING:
    from sitescreen.inputs.normals import Normals
    from sitescreen.inputs.wind import WindTable

AIR_J_G_K = 1.003
"""Specific heat of air in joules per **gram** and kelvin, as the index wants it: J/kg makes it 1,000 times less."""

ONSET = 3.0
"""Below this a lake breeze was observed (Biggs & Graves 1962, J. Appl. Meteorol. 1:474–480, figure from memory)."""

HOT_MONTHS = 3
"""The hot season is the three months with the warmest afternoons: our choice, no source."""


def onset_index(wind_m_s: float, land_c: float, water_c: float) -> float:
    """Biggs and Graves' lake breeze index V²/(c_p·ΔT).

    Parameters
    ----------
    wind_m_s : float
        Large-scale wind. [m/s]
    land_c, water_c : float
        Air over land at its warmest, and the water's surface. [°C]

    Returns
    -------
    float
        In the unit the authors use it in, c_p in J/(g K); inf where the land is no warmer than the water.

    References
    ----------
    .. [1] W. G. Biggs and M. E. Graves, "A lake breeze index," J. Appl. Meteorol., vol. 1, pp. 474–480, 1962.
    """
    warmer_k = land_c - water_c
    return wind_m_s**2 / (AIR_J_G_K * warmer_k) if warmer_k > 0.0 else float("inf")


def strongest_wind_m_s(land_c: float, water_c: float) -> float:
    """The wind at which the index reaches its limit; 0 where the land is no warmer than the water. [m/s]"""
    return float(np.sqrt(ONSET * AIR_J_G_K * max(land_c - water_c, 0.0)))


def onset_notes(normals: "Normals", wind: "WindTable") -> tuple[Note, ...]:
    """What the index says at each station with a water temperature; nothing without one.

    Parameters
    ----------
    normals : Normals
    wind : WindTable
        Its hot-season afternoons; where they are assumed the note gives the strongest wind instead.
    """
    months = normals.stations
    if "water_c" not in months:
        return ()
    return tuple(
        _note(str(station), hot, wind)
        for station, table in months.groupby("station", sort=True)
        if np.isfinite((hot := table.nlargest(HOT_MONTHS, "t_max_c"))["water_c"]).all()
    )


def _note(station: str, hot: pd.DataFrame, wind: "WindTable") -> Note:
    land, water = float(hot["t_max_c"].mean()), float(hot["water_c"].mean())
    where = f"Breeze at {station}, three hottest months: afternoons over land {land:.1f} °C, water {water:.1f} °C"
    source = "Biggs & Graves 1962, made for a lake of the middle latitudes"
    if land <= water:
        return Note("warning", "breeze", f"{where}: the land is no warmer, so no day breeze sets in ({source}).")
    limit = strongest_wind_m_s(land, water)
    if wind.is_assumed("hot_afternoon"):
        said = f"{where}; a day breeze sets in against winds of up to {limit:.1f} m/s ({source}); nobody gave the wind."
        return Note("info", "breeze", said)
    rose = wind.rose("hot_afternoon", float(hot["lon"].iloc[0]), float(hot["lat"].iloc[0]))
    speed = float((rose.share * rose.speed_m_s).sum() / rose.share.sum())
    index = onset_index(speed, land, water)
    outcome = "a day breeze sets in" if index < ONSET else "that wind mostly stops a day breeze from setting in"
    said = (
        f"{where}, mean wind {speed:.1f} m/s: index {index:.1f}, limit {ONSET:g}, so {outcome}; winds of up to "
        f"{limit:.1f} m/s would let it ({source}). The table's wind may hold the breeze itself: too high then."
    )
    return Note("info", "breeze", said)
