"""What to say of the wind's figures: what the method must not be used for, and from how far off the wind is taken."""

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from sitescreen.climate.roses import distances_m
from sitescreen.inputs.wind import WindTable
from sitescreen.notes import Note
from sitescreen.settings import WindSettings

FloatArray = NDArray[np.float64]

NAMED = 5
"""So many plots are named."""


def method_note(values: pd.DataFrame, settings: WindSettings) -> Note:
    """For what the wind's figures must not be used, and which plots lie where they are weak.

    Parameters
    ----------
    values : DataFrame, indexed by plot
        ``wind_outside_share``.
    settings : WindSettings
    """
    limit_deg = np.degrees(np.arctan(settings.slope_most))
    said = (
        "Wind figures compare plots with open level ground in neutral, moderate wind (above some 6 m/s aloft; Taylor & "
        "Lee 1984). They are not for calm nights, breezes, storms, gusts or the loads on a building, nor behind steep "
        f"ground, nor on slopes over {settings.slope_most:g} ({limit_deg:.0f}°)"
    )
    share = values["wind_outside_share"].to_numpy(dtype=np.float64)
    measured, steep = np.isfinite(share), share > 0.5
    if not steep.any():
        return Note("info", "wind", f"{said}: no plot lies mostly on such slopes.")
    names = [str(plot) for plot in values.index[steep]]
    shown = ", ".join(names[:NAMED]) + (" …" if len(names) > NAMED else "")
    of_all = f"{steep.sum()} of {measured.sum()} plots lie mostly on such slopes ({shown})"
    return Note("warning", "wind", f"{said}: {of_all}; their wind figures are weak.")


def _against(rise_m: float) -> str:
    return f"{abs(rise_m):,.0f} m {'below' if rise_m < 0.0 else 'above'}"


def place_notes(
    table: WindTable, lon: FloatArray, lat: FloatArray, height_m: FloatArray, settings: WindSettings
) -> tuple[Note, ...]:
    """How far off, and how much lower or higher, the places lie that give the plots their wind.

    Parameters
    ----------
    table : WindTable
    lon, lat : float64 arrays, shape (n,)
        Plots. [°] WGS 84.
    height_m : float64 array, shape (n,)
        Their height; NaN for those that are not measured, of which nothing is said. [m]
    settings : WindSettings
        ``place_high_m``.
    """
    on = np.isfinite(height_m)
    if table.assumed or np.isnan(table.places[0][0]) or not on.any():
        return ()
    away_km = distances_m(table, lon[on], lat[on]) / 1000.0
    nearest = np.argmin(away_km, axis=1)
    notes = []
    for number, (place_lon, place_lat) in enumerate(table.places):
        serves = np.ones(len(away_km), dtype=bool) if table.blended else nearest == number
        if not serves.any():
            continue
        where = f"The wind of the place at {place_lon:g}, {place_lat:g}"
        how = "counts, with the others, for" if table.blended else "serves"
        said = f"{where} {how} {serves.sum()} plot{'s' if serves.sum() > 1 else ''}, "
        said += f"{away_km[serves, number].min():.0f} to {away_km[serves, number].max():.0f} km away"
        rise = height_m[on][serves] - table.place_m[number]
        if np.isnan(table.place_m[number]):
            notes.append(Note("info", "wind", f"{said}; its height is not given (column elevation_m)."))
            continue
        lowest, highest = _against(float(rise.min())), _against(float(rise.max()))
        between = lowest if lowest == highest else f"{lowest} to {highest}"
        said += f", {between} it (it lies at {table.place_m[number]:,.0f} m)."
        too_high = bool(np.abs(rise).max() > settings.place_high_m)
        if too_high:
            said += f" Over {settings.place_high_m:.0f} m higher or lower another wind blows: a nearer table tells."
        notes.append(Note("warning" if too_high else "info", "wind", said))
    return tuple(notes)
