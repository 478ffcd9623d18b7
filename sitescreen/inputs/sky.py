"""The table of clear sky: what share of the time no cloud stands before the sun, by month and part of the day."""

from dataclasses import dataclass
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from sitescreen.brief import Brief
from sitescreen.errors import InputError
from sitescreen.inputs.climate_tables import read_rows
from sitescreen.inputs.stamps import FileStamp, stamp
from sitescreen.notes import Note

PARTS = ("morning", "afternoon", "night", "all")
DAY_PARTS = ("morning", "afternoon")
"""Before and after the sun stands highest. What the table says of nights is checked, and not used."""


@dataclass(frozen=True)
class SunChoices:
    """What a brief says of clocks and seasons; None where it says nothing.

    ``utc_offset_h``: the clock's lead over universal time [h]. ``cool_months``, ``hot_months``: 1–12.
    """

    utc_offset_h: float | None = None
    cool_months: tuple[int, ...] | None = None
    hot_months: tuple[int, ...] | None = None


def sun_choices(brief: Brief) -> SunChoices:
    """Clock and seasons as the brief states them."""
    climate = brief.climate
    cool = tuple(climate.cool_months) if climate and climate.cool_months else None
    hot = tuple(climate.hot_months) if climate and climate.hot_months else None
    return SunChoices(brief.sky.utc_offset_h if brief.sky else None, cool, hot)


@dataclass(frozen=True)
class ClearSky:
    """How clear the sky is by day.

    Parameters
    ----------
    share : float64 array, shape (12, 2)
        Share of the daylight without cloud before the sun, 0–1, by month; mornings, then afternoons.
    stamp : FileStamp
    notes : tuple of Note
    """

    share: NDArray[np.float64]
    stamp: FileStamp
    notes: tuple[Note, ...]


def read_sky(path: Path) -> ClearSky:
    """Read a table of clear sky.

    Parameters
    ----------
    path : Path
        CSV with the columns month (1–12), part (morning, afternoon, night, all) and clear_share, 0–1 or, throughout, in
        per cent. A month needs "all", or both morning and afternoon; where it has "all" and one of them, "all" stands
        for the other.

    Raises
    ------
    InputError
        If a value is no number or out of range, a month and part stand twice, or a month's day is not covered.
    """
    rows = read_rows(path, ("month", "part", "clear_share"), (), "table of clear sky")
    found: dict[tuple[int, str], float] = {}
    for row in rows:
        month = row.number("month", 1, 12)
        if month != int(month):
            raise row.refuse(
                f"month is “{row.text('month')}”", "a whole number from 1 to 12 is needed", "Correct that cell"
            )
        when = int(month), row.word("part", PARTS)
        if when in found:
            raise row.refuse(f"month {when[0]} has “{when[1]}” twice", "each once is needed", "Remove one of the two")
        found[when] = row.number("clear_share", 0.0, 100.0)
    is_per_cent = max(found.values()) > 1.0
    if is_per_cent and max(found.values()) < 2.0:
        raise InputError(
            f"clear_share in {path.name} reaches {max(found.values()):g}",
            "shares from 0 to 1, or per cent throughout, are needed",
            "Correct that value",
        )
    share = np.full((12, 2), np.nan)
    for month in range(1, 13):
        for column, part in enumerate(DAY_PARTS):
            share[month - 1, column] = found.get((month, part), found.get((month, "all"), np.nan))
    if np.isnan(share).any():
        month, column = (int(one) for one in np.argwhere(np.isnan(share))[0])
        raise InputError(
            f"month {month + 1} in {path.name} has neither “{DAY_PARTS[column]}” nor “all”",
            "twelve months, each with its morning and afternoon or with all of the day, are needed",
            "Add the row",
        )
    notes: tuple[Note, ...] = (Note("info", "sky", f"{path.name}: clear sky by month and part of the day."),)
    if is_per_cent:
        share /= 100.0
        notes += (Note("info", "sky", f"clear_share in {path.name} was taken to be in per cent."),)
    share.flags.writeable = False
    return ClearSky(share, stamp(path), notes)
