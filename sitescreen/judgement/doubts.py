"""What the data leave open, put together for all plots: one set of draws, and each input's low and high end."""

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from sitescreen.climate.sector_winds import SectorWinds
from sitescreen.inputs.wind import WindTable
from sitescreen.judgement.certainty import Varied, take_part
from sitescreen.judgement.draws import ReadingDraws
from sitescreen.judgement.overall import Judged
from sitescreen.judgement.profiles import ZoneProfile, wind_slots
from sitescreen.judgement.rose_draws import rose_draws, rose_varied
from sitescreen.judgement.swings import Swing, breeze_swings, night_swings, rose_swings, terrain_swings
from sitescreen.judgement.wind_slots import SLOT_OF, wind_column
from sitescreen.settings import Defaults

FloatArray = NDArray[np.float64]


@dataclass(frozen=True)
class AllWinds:
    """The wind at all plots, in the order of their table: sectors, the table of winds, and where the plots lie [°]."""

    winds: SectorWinds
    table: WindTable
    lon_deg: FloatArray
    lat_deg: FloatArray


def data_draws(
    ground: ReadingDraws,
    varied: tuple[Varied, ...],
    air: AllWinds,
    judged: Judged,
    profiles: Mapping[str, ZoneProfile],
    seed: int,
    shortlist: int,
    settings: Defaults,
) -> tuple[ReadingDraws, tuple[Varied, ...]]:
    """One set of draws for all plots: those of the ground and the night, and the rose beside them.

    Parameters
    ----------
    ground : ReadingDraws
        Of all plots; with its number of draws the rose is drawn too, or with the settings' where it has none.
    varied : tuple of Varied
        What the ground's draws vary.
    air : AllWinds
    judged : Judged
        The rose is drawn for plots that take part in the trials.
    profiles : mapping of zone to ZoneProfile
    seed, shortlist : int
    settings : Defaults

    Returns
    -------
    draws : ReadingDraws
    varied : tuple of Varied
        What they vary.
    """
    rows = take_part(judged, shortlist, settings.judgement)
    count = ground.count or settings.judgement.data_draws
    if not len(rows) or not count:
        return ground, varied
    roses = rose_draws(
        air.winds.of(tuple(air.winds.plots[row] for row in rows)),
        air.table,
        air.lon_deg[rows],
        air.lat_deg[rows],
        {criterion.column for profile in profiles.values() for criterion in profile.criteria},
        wind_slots(profiles),
        seed,
        count,
        settings.wind,
    )
    if not roses:
        return ground, varied
    drawn = {name: np.full((len(judged.table), count), np.nan) for name in roses}
    for name, values in roses.items():
        drawn[name][rows] = values
    return ReadingDraws({**ground.values, **drawn}), (*varied, rose_varied(air.table, settings.wind))


def all_swings(
    readings: pd.DataFrame,
    draws: ReadingDraws,
    air: AllWinds,
    profiles: Mapping[str, ZoneProfile],
    settings: Defaults,
) -> list[Swing]:
    """Night, breeze, rose and terrain, each at its low and at its high end."""
    wanted = {criterion.column for profile in profiles.values() for criterion in profile.criteria}
    of_wind = {wind_column(*one): one for one in (*SLOT_OF.items(), *sorted(wind_slots(profiles)))}
    wind = [one for column, one in of_wind.items() if column in wanted]
    return [
        *night_swings(readings, settings.swings),
        *breeze_swings(readings, settings.breeze, settings.swings),
        *rose_swings(air.winds, air.table, air.lon_deg, air.lat_deg, wind, settings.wind),
        *terrain_swings(draws, [name for name in draws.values if name not in of_wind], settings.swings),
    ]
