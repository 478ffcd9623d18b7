"""The climate normals of a station, moved to a plot's height."""

from typing import TYPE_CHECKING

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from sitescreen.notes import Note
from sitescreen.settings import ZoneSettings

if TYPE_CHECKING:
    from sitescreen.inputs.normals import Normals

FloatArray = NDArray[np.float64]

COOL_SEASON_MONTHS = 3
"""The cool season is the three coolest months of the year: our choice, no source."""

COOL_SEASON = {
    "cool_season_min_c": "t_min_c",
    "cool_season_mean_c": "t_mean_c",
    "cool_season_rh": "rh_mean",
    "clear_calm_nights": "clear_calm_nights",
}
"""Columns that are means over those months, and the monthly column each is the mean of."""


def station_climate(normals: "Normals") -> pd.DataFrame:
    """The year of each station, from its twelve months.

    Parameters
    ----------
    normals : Normals
        Its ``stations`` table, one row a station and month.

    Returns
    -------
    DataFrame, one row a station
        station, lon, lat, elevation_m; t_mean_c, mean of the monthly (max + min)/2; t_range_k, mean of the monthly
        ranges; rh_mean [%]; hottest_month_max_c; coolest_month_min_c; rain_year_mm; of the three coolest months
        cool_season_min_c, cool_season_mean_c, cool_season_rh, and clear_calm_nights a month, NaN where not given.
    """
    months = normals.stations
    if "clear_calm_nights" not in months:
        months = months.assign(clear_calm_nights=np.nan)
    months = months.assign(
        t_mean_c=(months["t_max_c"] + months["t_min_c"]) / 2.0, t_range_k=months["t_max_c"] - months["t_min_c"]
    )
    by_station = months.groupby("station", sort=True)
    table = by_station.agg(
        lon=("lon", "first"),
        lat=("lat", "first"),
        elevation_m=("elevation_m", "first"),
        t_mean_c=("t_mean_c", "mean"),
        t_range_k=("t_range_k", "mean"),
        rh_mean=("rh_mean", "mean"),
        hottest_month_max_c=("t_max_c", "max"),
        coolest_month_min_c=("t_min_c", "min"),
        rain_year_mm=("rain_mm", "sum"),
    )
    coolest = months.sort_values(["station", "t_mean_c", "month"]).groupby("station").head(COOL_SEASON_MONTHS)
    cool = coolest.groupby("station")
    for name, column in COOL_SEASON.items():
        table[name] = cool[column].mean()
    return table.reset_index()


def plot_climate(
    normals: "Normals", lon: FloatArray, lat: FloatArray, elevation_m: FloatArray, settings: ZoneSettings
) -> pd.DataFrame:
    """The climate at each plot, from one station moved to the plot's height.

    Parameters
    ----------
    normals : Normals
    lon, lat : float64 arrays, shape (n,)
        [°], WGS 84.
    elevation_m : float64 array or Series, shape (n,)
        Height of the plots. [m] NaN where unknown: the temperatures there are NaN.
    settings : ZoneSettings

    Returns
    -------
    DataFrame, n rows
        t_mean_c, t_range_k, rh_mean, hottest_month_max_c, coolest_month_min_c, rain_year_mm, those of
        :data:`COOL_SEASON`, station, station_distance_km, station_rise_m (plot above station). Indexed as
        ``elevation_m`` if that is.

    Notes
    -----
    The station is the one with the least distance + some kilometres for each 100 m of height between them,
    since a near station on another level has another climate. Temperatures fall by 6.5 K per km (ICAO standard
    atmosphere); daily range, humidity and rain are taken over as they are. A plot's climate depends on no other plot.
    """
    from pyproj import Geod

    index = elevation_m.index if isinstance(elevation_m, pd.Series) else None
    height = np.asarray(elevation_m, dtype=np.float64)
    stations = station_climate(normals)
    geod = Geod(ellps="WGS84")
    least_cost = np.full(len(height), np.inf)
    chosen = np.zeros(len(height), dtype=np.int64)
    distance_km = np.full(len(height), np.nan)
    plot_lon, plot_lat = np.asarray(lon, dtype=np.float64), np.asarray(lat, dtype=np.float64)
    for row, (place_lon, place_lat, place_m) in enumerate(stations[["lon", "lat", "elevation_m"]].to_numpy(np.float64)):
        _, _, metres = geod.inv(
            np.full_like(plot_lon, place_lon), np.full_like(plot_lat, place_lat), plot_lon, plot_lat
        )
        away_km = np.asarray(metres) / 1000.0
        # a plot of unknown height takes the nearest station
        rise_100m = np.abs(np.nan_to_num(height - place_m)) / 100.0
        cost = away_km + settings.station_height_km_per_100m * rise_100m
        better = cost < least_cost
        least_cost[better], chosen[better], distance_km[better] = cost[better], row, away_km[better]
    at = stations.iloc[chosen].reset_index(drop=True)
    rise_m = height - at["elevation_m"].to_numpy(np.float64)
    cooler_k = settings.lapse_k_km * rise_m / 1000.0
    climate = pd.DataFrame(
        {
            "t_mean_c": at["t_mean_c"].to_numpy(np.float64) - cooler_k,
            "t_range_k": at["t_range_k"].to_numpy(np.float64),
            "rh_mean": at["rh_mean"].to_numpy(np.float64),
            "hottest_month_max_c": at["hottest_month_max_c"].to_numpy(np.float64) - cooler_k,
            "coolest_month_min_c": at["coolest_month_min_c"].to_numpy(np.float64) - cooler_k,
            "rain_year_mm": at["rain_year_mm"].to_numpy(np.float64),
            "cool_season_min_c": at["cool_season_min_c"].to_numpy(np.float64) - cooler_k,
            "cool_season_mean_c": at["cool_season_mean_c"].to_numpy(np.float64) - cooler_k,
            "cool_season_rh": at["cool_season_rh"].to_numpy(np.float64),
            "clear_calm_nights": at["clear_calm_nights"].to_numpy(np.float64),
            "station": at["station"].to_numpy(),
            "station_distance_km": distance_km,
            "station_rise_m": rise_m,
        }
    )
    if index is not None:
        climate.index = index
    return climate


def climate_notes(climate: pd.DataFrame, settings: ZoneSettings) -> tuple[Note, ...]:
    """What to say about plots whose station is far away or on another level."""
    notes = []
    far = climate["station_distance_km"] > settings.station_far_km
    if far.any():
        most = climate.loc[far, "station_distance_km"].max()
        notes.append(
            Note(
                "warning",
                "climate",
                f"{_plots(far)} more than {settings.station_far_km:.0f} km from the climate station used, "
                f"up to {most:.0f} km away: check the zone.",
            )
        )
    high = climate["station_rise_m"].abs() > settings.station_high_m
    if high.any():
        most = climate.loc[high, "station_rise_m"].abs().max()
        notes.append(
            Note(
                "warning",
                "climate",
                f"{_plots(high)} more than {settings.station_high_m:.0f} m above or below the climate station used, "
                f"up to {most:.0f} m: the temperature rests on {settings.lapse_k_km:g} K per km alone, and humidity "
                f"and daily range are those of the station's level.",
            )
        )
    return tuple(notes)


def _plots(chosen: pd.Series) -> str:
    count = int(chosen.sum())
    return "1 plot lies" if count == 1 else f"{count} plots lie"
