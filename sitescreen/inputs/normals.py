"""Climate normals: a table of monthly means at stations."""

from dataclasses import dataclass
from pathlib import Path

import pandas as pd

from sitescreen.errors import InputError
from sitescreen.inputs.climate_tables import Row, read_rows
from sitescreen.inputs.stamps import FileStamp, stamp
from sitescreen.notes import Note

LIMITS = {
    "lon": (-180.0, 360.0),
    "lat": (-90.0, 90.0),
    "elevation_m": (-450.0, 6000.0),
    "month": (1.0, 12.0),
    "t_max_c": (-60.0, 60.0),
    "t_min_c": (-60.0, 60.0),
    "rh_mean": (0.0, 100.0),
    "rain_mm": (0.0, 5000.0),
}
"""Columns of numbers, and what each may be."""

NIGHTS = "clear_calm_nights"
WATER = "water_c"
_PLACE = ("lon", "lat", "elevation_m")
_WARM_YEAR_C = 45.0
"""A year's mean maximum above this suggests degrees Fahrenheit. [°C] The hottest places on record stay below 42."""


@dataclass(frozen=True)
class Normals:
    """Stations and their twelve months.

    Parameters
    ----------
    stations : DataFrame
        Twelve rows a station, by station and month: station (str), lon, lat [°, WGS 84], elevation_m, month (int),
        t_max_c and t_min_c (means of the daily extremes), rh_mean [%], rain_mm [a month] and, where the table has them,
        clear_calm_nights [a month; NaN where empty] and water_c (surface of the sea or lake beside it) [°C; likewise].
    stamp : FileStamp
    notes : tuple of Note
    """

    stations: pd.DataFrame
    stamp: FileStamp
    notes: tuple[Note, ...]


def read_normals(path: Path) -> Normals:
    """Read a table of climate normals.

    Parameters
    ----------
    path : Path
        CSV with the columns station, lon, lat, elevation_m, month, t_max_c, t_min_c, rh_mean, rain_mm and, optionally,
        clear_calm_nights and water_c.

    Raises
    ------
    InputError
        If a value is no number or out of range, a station has not each month once, its place changes between rows, a
        minimum lies above its maximum, or humidity is given as a share of 1.
    """
    rows = read_rows(path, ("station", *LIMITS), (NIGHTS, WATER), "table of climate normals")
    optional = [column for column in (NIGHTS, WATER) if any(row.text(column) for row in rows)]
    by_station: dict[str, dict[int, dict[str, float]]] = {}
    for row in rows:
        station, values = _values(row, optional)
        months = by_station.setdefault(station, {})
        month = int(values["month"])
        if month in months:
            raise row.refuse(
                f"“{station}” has month {month} twice", "each month once is needed", "Remove one of the two"
            )
        if months and any(values[key] != next(iter(months.values()))[key] for key in _PLACE):
            raise row.refuse(
                f"“{station}” lies elsewhere than in the row before",
                "one place for all months of a station is needed",
                "Correct lon, lat or elevation_m, or give the other station another name",
            )
        months[month] = values
    for station, months in by_station.items():
        missing = [month for month in range(1, 13) if month not in months]
        if missing:
            raise InputError(
                f"“{station}” in {path.name} has no month {', '.join(map(str, missing))}",
                "twelve months a station are needed",
                "Add them, or remove the station",
            )
    table = pd.DataFrame(
        [
            {"station": station, **months[month]}
            for station, months in sorted(by_station.items())
            for month in range(1, 13)
        ]
    )
    table["month"] = table["month"].astype(int)
    _refuse_other_units(table, path.name)
    notes = (
        Note("info", "climate", f"{path.name}: normals of {len(by_station)} station(s)."),
        *_same_place(table, path.name),
    )
    return Normals(table, stamp(path), notes)


def _values(row: Row, optional: list[str]) -> tuple[str, dict[str, float]]:
    """A row's station and numbers, checked."""
    station = row.text("station")
    if not station:
        raise row.refuse("it names no station", "a station's name is needed", "Fill in that cell")
    values = {column: row.number(column, low, high) for column, (low, high) in LIMITS.items()}
    if values["month"] != int(values["month"]):
        raise row.refuse(
            f"month is “{row.text('month')}”", "a whole number from 1 to 12 is needed", "Correct that cell"
        )
    if values["t_min_c"] > values["t_max_c"]:
        raise row.refuse(
            f"t_min_c {values['t_min_c']:g} is above t_max_c {values['t_max_c']:g}",
            "a minimum below the maximum is needed",
            "Check whether the two columns are swapped",
        )
    if values["lon"] > 180.0:
        values["lon"] -= 360.0
    limits = {NIGHTS: (0.0, 31.0), WATER: (-2.0, 45.0)}
    for column in optional:
        values[column] = row.number(column, *limits[column]) if row.text(column) else float("nan")
    return station, values


def _refuse_other_units(table: pd.DataFrame, name: str) -> None:
    """Whole columns that can only be in another unit."""
    if table["rh_mean"].max() <= 1.0:
        raise InputError(
            f"rh_mean in {name} is nowhere above {table['rh_mean'].max():g}",
            "relative humidity in per cent is needed",
            "Multiply shares of 1 by 100",
        )
    warmest = table.groupby("station")["t_max_c"].mean().max()
    if warmest > _WARM_YEAR_C:
        raise InputError(
            f"the mean of t_max_c over a year reaches {warmest:.0f} in {name}",
            "temperatures in degrees Celsius are needed",
            "Convert them if they are in degrees Fahrenheit",
        )


def _same_place(table: pd.DataFrame, name: str) -> list[Note]:
    """Two names for one place: the same station twice, or a slip."""
    places = table.drop_duplicates("station").groupby(list(_PLACE))["station"].apply(list)
    return [
        Note("warning", "climate", f"{' and '.join(stations)} in {name} lie at the same place; the first serves.")
        for stations in places
        if len(stations) > 1
    ]
