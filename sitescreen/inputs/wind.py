"""The table of winds: how often the wind blows from where, and how fast, by season and part of the day."""

import math
from collections.abc import Sequence
from dataclasses import dataclass, replace
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from sitescreen.errors import InputError
from sitescreen.inputs.climate_tables import Row, read_rows
from sitescreen.inputs.stamps import FileStamp, stamp
from sitescreen.notes import Note

FloatArray = NDArray[np.float64]

SEASONS = ("hot", "cool", "rain", "year")
PARTS = ("morning", "afternoon", "night", "all")
SLOTS = {
    "hot_afternoon": ("hot", "afternoon"),
    "hot_night": ("hot", "night"),
    "cool_night": ("cool", "night"),
    "year": ("year", "all"),
}
"""The parts of the year that readings ask for."""

RAIN = "rain"
"""The rainy season, all of its day: for driving rain. There is none where the table has no rows for it."""

SECTORS = 16
SECTOR_DEG = 360.0 / SECTORS
COMPASSES = (16, 12, 32, 36, 24, 72, 180, 360)
"""Numbers of directions that tables are made for, the likeliest first; 4 and 8 are told apart from these."""

SUM_NOTE, SUM_REFUSED = 0.02, 0.20
"""Shares whose sum is this far from 1 leave a note, or are refused."""

MOST_PLACES = 255
FAST_M_S = 20.0
"""A mean wind above this suggests another unit. [m/s] Common practice, no source."""

_NO_PLACE = (math.nan, math.nan)


@dataclass(frozen=True)
class Rose:
    """The winds of one slot at one place.

    Parameters
    ----------
    direction_deg : array, shape (n,)
        Centre of one of 16 sectors, 0, 22.5 … 337.5, from which the wind blows, clockwise from true north. [°] A sector
        may stand more than once, with different speeds.
    share : array, shape (n,)
        Share of the time; sums to 1 − ``calm_share``.
    speed_m_s : array, shape (n,)
        [m/s]
    calm_share : float
        Share of the time without wind.
    assumed : bool
        Whether nobody gave it: no table, or a table without these rows, for which others stand in.
    """

    direction_deg: FloatArray
    share: FloatArray
    speed_m_s: FloatArray
    calm_share: float
    assumed: bool


@dataclass(frozen=True)
class WindTable:
    """Winds at one or several places.

    Parameters
    ----------
    places : tuple of (lon, lat)
        WGS 84 [°]; one of NaN where the table names no place.
    roses : dict
        By slot and number of the place.
    assumed : bool
        Whether there is no table at all.
    stamp : FileStamp, optional
    notes : tuple of Note
    place_m : tuple of float
        Height of each place above the terrain's zero. [m] NaN where the table does not say.
    blended : bool
        Between several places each counts by the inverse square of its distance; else the nearest alone.
    """

    places: tuple[tuple[float, float], ...]
    roses: dict[tuple[str, int], Rose]
    assumed: bool
    stamp: FileStamp | None
    notes: tuple[Note, ...]
    place_m: tuple[float, ...] = (math.nan,)
    blended: bool = False

    def has(self, slot: str) -> bool:
        """Whether every place has a wind for a slot; all but :data:`RAIN` always have, if only an assumed one."""
        return all((slot, number) in self.roses for number in range(len(self.places)))

    def is_assumed(self, slot: str) -> bool:
        """Whether a slot's wind is assumed at any place."""
        return any(self.roses[slot, number].assumed for number in range(len(self.places)))

    def rose(self, slot: str, lon: float, lat: float) -> Rose:
        """The winds of a slot at the place nearest to a point.

        Parameters
        ----------
        slot : str
            One of :data:`SLOTS`, or :data:`RAIN` where the table has it.
        lon, lat : float
            WGS 84. [°]
        """
        if len(self.places) == 1:
            return self.roses[slot, 0]
        distance = [_away_deg(lon, lat, *place) for place in self.places]
        return self.roses[slot, int(np.argmin(distance))]


def _away_deg(lon: float, lat: float, place_lon: float, place_lat: float) -> float:
    """Great-circle distance. [°] The first of two equally near places wins."""
    a, b = math.radians(lat), math.radians(place_lat)
    half = math.sin((b - a) / 2) ** 2 + math.cos(a) * math.cos(b) * math.sin(math.radians(place_lon - lon) / 2) ** 2
    return math.degrees(2.0 * math.asin(math.sqrt(min(1.0, half))))


def assumed_wind() -> WindTable:
    """Where nobody gave a table: the same wind of 3 m/s from everywhere, and no calm."""
    even = Rose(
        np.arange(SECTORS, dtype=np.float64) * SECTOR_DEG,
        np.full(SECTORS, 1.0 / SECTORS),
        np.full(SECTORS, 3.0),
        0.0,
        assumed=True,
    )
    said = (
        "No wind table was given: wind is taken to blow alike from all sides, and what rests on it counts half. "
        "A table of a near station tells ridges from sheltered ground."
    )
    return WindTable((_NO_PLACE,), {(slot, 0): even for slot in SLOTS}, True, None, (Note("assumed", "wind", said),))


@dataclass(frozen=True)
class _Wind:
    """One line: a direction (NaN for calm), its share, its speed."""

    direction_deg: float
    share: float
    speed_m_s: float


def read_wind(path: Path, blended: bool = False) -> WindTable:
    """Read a table of winds.

    Parameters
    ----------
    path : Path
        CSV with the columns season (hot, cool, rain, year), part (morning, afternoon, night, all), direction_deg (from,
        true north), share, speed_m_s and, for several places, lon and lat, with elevation_m if known. A calm row has no
        direction, or speed 0. Shares may be in per cent.
    blended : bool
        See :class:`WindTable`.

    Returns
    -------
    WindTable
        A slot that the table lacks is taken from, in this order: all of that season's day, that part of the day over
        the year, the whole year, the mean of all that there is; its notes say so, and such a rose is assumed.

    Raises
    ------
    InputError
        If a value is no number or out of range, a row stands twice, the shares of a season and part are more than 20 %
        off, or there is nothing but calm.
    """
    needed = ("season", "part", "direction_deg", "share", "speed_m_s")
    rows = read_rows(path, needed, ("lon", "lat", "elevation_m"), "wind table")
    heights: dict[tuple[float, float], float] = {}
    groups: dict[tuple[float, float], dict[tuple[str, str], list[_Wind]]] = {}
    seen: set[tuple[object, ...]] = set()
    for row in rows:
        place, when, wind = _place(row), (row.word("season", SEASONS), row.word("part", PARTS)), _wind(row)
        key = (place, when, row.text("direction_deg"), wind.speed_m_s)
        if key in seen:
            raise row.refuse(
                "it stands there twice, with the same time, direction and speed", "each once", "Remove one"
            )
        seen.add(key)
        groups.setdefault(place, {}).setdefault(when, []).append(wind)
        _add_height(row, place, heights)
    if len(groups) > MOST_PLACES or (len(groups) > 1 and any(math.isnan(place[0]) for place in groups)):
        raise InputError(
            f"the wind table {path.name} has {len(groups)} places"
            + ("" if len(groups) > MOST_PLACES else ", one of them without lon and lat"),
            f"up to {MOST_PLACES} places are needed, each with lon and lat on all its rows",
            "Correct these columns; rows that belong together have the same figures there",
        )
    notes: list[Note] = []
    compass = _compass([winds for times in groups.values() for winds in times.values()])
    if compass != SECTORS:
        said = f"{path.name} has {compass} directions; they were shared out over 16 sectors by angle."
        notes.append(Note("info", "wind", said))
    roses: dict[tuple[str, int], Rose] = {}
    for number, (place, times) in enumerate(groups.items()):
        label = "" if len(groups) == 1 else f" at {place[0]:g}, {place[1]:g}"
        known = {when: _rose(winds, compass, path.name, when, label, notes) for when, winds in times.items()}
        for slot, when in SLOTS.items():
            roses[slot, number] = _slot(known, when, f"{path.name}{label}", notes)
        rain = {when: one for when, one in known.items() if when[0] == RAIN}
        if rain:
            roses[RAIN, number] = rain.get((RAIN, "all")) or _mean(list(rain.values()))
    place_m = tuple(heights.get(place, math.nan) for place in groups)
    return WindTable(tuple(groups), roses, False, stamp(path), tuple(_once(notes)), place_m, blended)


def _add_height(row: Row, place: tuple[float, float], heights: dict[tuple[float, float], float]) -> None:
    """Keep the height of a place that a row gives; one place has one height."""
    if not row.text("elevation_m"):
        return
    height = row.number("elevation_m", -450.0, 6000.0)
    if heights.setdefault(place, height) != height:
        raise row.refuse(
            f"elevation_m is {height:g} here and {heights[place]:g} further up, at the same place",
            "one height for all rows of a place is needed",
            "Correct it",
        )


def _place(row: Row) -> tuple[float, float]:
    if not row.text("lon") and not row.text("lat"):
        return _NO_PLACE
    return row.number("lon", -180.0, 360.0), row.number("lat", -90.0, 90.0)


def _wind(row: Row) -> _Wind:
    share = row.number("share", 0.0, 100.0)
    direction = row.text("direction_deg")
    if direction.casefold() in ("", "calm", "nan", "-", "none"):
        if row.text("speed_m_s") and row.number("speed_m_s", 0.0, 60.0) > 1.0:
            raise row.refuse(
                f"it has no direction and a speed of {row.text('speed_m_s')} m/s",
                "a direction is needed where the wind blows",
                "Fill it in, or set the speed of calm to 0",
            )
        return _Wind(math.nan, share, 0.0)
    bearing = row.number("direction_deg", 0.0, 360.0) % 360.0
    speed = row.number("speed_m_s", 0.0, 60.0)
    return _Wind(bearing if speed > 0 else math.nan, share, speed)


def _compass(times: Sequence[Sequence[_Wind]]) -> int:
    """How many directions the table's compass has."""
    by_time = [{wind.direction_deg for wind in winds if not math.isnan(wind.direction_deg)} for winds in times]
    found = set().union(*by_time)
    for few in (4, 8):
        # a table for 16 directions may use some of them only: a small compass counts if one of its roses is complete
        points = {k * 360.0 / few for k in range(few)}
        if found == points and points in by_time:
            return few
    return next((n for n in COMPASSES if all(_is_whole(one * n / 360.0) for one in found)), SECTORS)


def _is_whole(value: float) -> bool:
    return abs(value - round(value)) < 1e-3


def _rose(
    winds: Sequence[_Wind], compass: int, name: str, when: tuple[str, str], label: str, notes: list[Note]
) -> Rose:
    """One season and part at one place, shares made to sum to 1."""
    total = math.fsum(wind.share for wind in winds)
    whole = 100.0 if abs(total / 100.0 - 1.0) <= SUM_REFUSED else 1.0
    off = abs(total / whole - 1.0)
    called = f"{when[0]}, {when[1]}{label}"
    if off > SUM_REFUSED:
        raise InputError(
            f"the shares of “{called}” in the wind table {name} sum to {total:.3g}",
            "shares that sum to 1 (or to 100 %), calm included, are needed",
            "Add the rows that are missing, such as calm, or correct the shares",
        )
    if off > SUM_NOTE:
        said = f"The shares of “{called}” in {name} sum to {total:.3g}; they were scaled to {whole:g}."
        notes.append(Note("warning", "wind", said))
    calm = math.fsum(wind.share for wind in winds if math.isnan(wind.direction_deg)) / total
    blowing = [wind for wind in winds if not math.isnan(wind.direction_deg) and wind.share > 0]
    if not blowing:
        raise InputError(
            f"“{called}” in the wind table {name} holds nothing but calm",
            "at least one direction with a share and a speed is needed",
            "Add the winds, or leave that season and part out",
        )
    mean = math.fsum(wind.share * wind.speed_m_s for wind in blowing) / math.fsum(wind.share for wind in blowing)
    if mean > FAST_M_S:
        said = f"The mean wind of “{called}” in {name} is {mean:.0f} m/s: check that speeds are in metres per second."
        notes.append(Note("warning", "wind", said))
    parts = [
        (sector * SECTOR_DEG, wind.share * piece / total, wind.speed_m_s)
        for wind in blowing
        for sector, piece in _sectors(wind.direction_deg, 360.0 / compass)
    ]
    direction, share, speed = (np.array(column, dtype=np.float64) for column in zip(*sorted(parts), strict=True))
    return Rose(direction, share, speed, calm, assumed=False)


def _sectors(direction_deg: float, width_deg: float) -> list[tuple[int, float]]:
    """The sectors that a direction stands for, and how much of it falls into each.

    Counted whole into the nearest sector, directions in 10° steps would give every other sector half as much again as
    its neighbours, and those of an eight-point compass would leave every second sector empty.
    """
    centre = direction_deg / SECTOR_DEG
    half = width_deg / SECTOR_DEG / 2.0
    found = []
    for sector in range(math.floor(centre - half - 0.5), math.ceil(centre + half + 0.5) + 1):
        overlap = min(centre + half, sector + 0.5) - max(centre - half, sector - 0.5)
        if overlap > 1e-6:
            found.append((sector % SECTORS, overlap / (2.0 * half)))
    return found


def _slot(known: dict[tuple[str, str], Rose], when: tuple[str, str], name: str, notes: list[Note]) -> Rose:
    """The rose of a slot, or what stands in for it."""
    season, part = when
    if when in known:
        return known[when]
    for instead in ((season, "all"), ("year", part), ("year", "all")):
        if instead in known:
            said = f"{name} has no “{season}, {part}”: “{', '.join(instead)}” was taken for it."
            notes.append(Note("assumed", "wind", said))
            return replace(known[instead], assumed=True)
    said = f"{name} has no “{season}, {part}” and nothing for the whole year: the mean of all it has was taken for it."
    notes.append(Note("assumed", "wind", said))
    return replace(_mean(list(known.values())), assumed=True)


def _mean(roses: Sequence[Rose]) -> Rose:
    """Each of several roses for an equal part of the time."""
    return Rose(
        np.concatenate([one.direction_deg for one in roses]),
        np.concatenate([one.share for one in roses]) / len(roses),
        np.concatenate([one.speed_m_s for one in roses]),
        sum(one.calm_share for one in roses) / len(roses),
        assumed=False,
    )


def _once(notes: list[Note]) -> list[Note]:
    return list(dict.fromkeys(notes))
