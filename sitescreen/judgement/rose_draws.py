"""The wind's readings under redrawn roses: what a rose's own uncertainty does to them."""

from collections.abc import Collection, Mapping

import numpy as np
from numpy.typing import NDArray

from sitescreen.climate.roses import rose_sums, roses_at
from sitescreen.climate.sector_winds import SectorWinds
from sitescreen.inputs.wind import WindTable
from sitescreen.judgement.certainty import WIND, Varied
from sitescreen.judgement.uniform import uniform
from sitescreen.judgement.wind_readings import wind_readings
from sitescreen.judgement.wind_slots import SLOT_OF, wind_column
from sitescreen.settings import WindSettings

FloatArray = NDArray[np.float64]


def sector_factors(time: FloatArray, days: float, seed: int, slot: str, draws: int) -> FloatArray:
    """By what each sector's wind is to be multiplied in each draw.

    Parameters
    ----------
    time : float64 array, shape (sectors,)
        Share of the time of each sector.
    days : float
        How many independent days the rose stands for; its shares are then Dirichlet-distributed with these counts.
    seed : int
    slot : str
        Each slot is drawn for itself, the same for all plots and all places.
    draws : int

    Returns
    -------
    float64 array, shape (draws, sectors)
        Mean 1, and variance 1/(days × share); 1 where a sector has no wind.

    Notes
    -----
    Gamma numbers of shape days × share, over that shape, are Dirichlet shares up to their sum, and all readings of the
    wind divide by sums. The speeds within a sector stay, so flow and power move with the time.
    """
    from scipy.special import gammaincinv

    shape = days * time / time.sum()
    factors = np.ones((draws, len(time)))
    for sector in np.flatnonzero(shape > 0.0):
        numbers = uniform(seed, f"rose/{slot}/{sector}", draws)
        factors[:, sector] = gammaincinv(shape[sector], numbers) / shape[sector]
    return factors


def rose_draws(
    winds: SectorWinds,
    table: WindTable,
    lon_deg: FloatArray,
    lat_deg: FloatArray,
    columns: Collection[str],
    slots: Collection[tuple[str, str]],
    seed: int,
    draws: int,
    settings: WindSettings,
) -> Mapping[str, FloatArray]:
    """The wind's readings of all plots in each draw of the roses.

    Parameters
    ----------
    winds : SectorWinds, n plots
    table : WindTable
    lon_deg, lat_deg : float64 arrays, shape (n,)
    columns : collection of str
        Which readings are wanted; others are not computed.
    slots : collection of (reading, slot)
        Further slots that profiles ask for.
    seed, draws : int
    settings : WindSettings
        ``rose_days``, and one day a sector where the rose is assumed: then all roses are alike (Dirichlet 1, …, 1).

    Returns
    -------
    mapping of column to float64 array, shape (n, draws)
    """
    wanted = [one for one in (*SLOT_OF.items(), *sorted(slots)) if wind_column(*one) in columns]
    out = {wind_column(*one): np.empty((len(winds.plots), draws)) for one in wanted}
    for slot in dict.fromkeys(slot for _, slot in wanted):
        factors = np.stack([_factors(table, slot, place, seed, draws, settings) for place in range(len(table.places))])
        for draw in range(draws):
            sums = roses_at(table, slot, lon_deg, lat_deg, settings.sectors, factors[:, draw])
            drawn = wind_readings(winds, sums, settings)
            for reading, of_slot in wanted:
                if of_slot == slot:
                    out[wind_column(reading, slot)][:, draw] = getattr(drawn, reading)
    return out


def _factors(table: WindTable, slot: str, place: int, seed: int, draws: int, settings: WindSettings) -> FloatArray:
    rose = table.roses[slot, place]
    if rose.assumed:
        return sector_factors(np.ones(settings.sectors), float(settings.sectors), seed, slot, draws)
    return sector_factors(rose_sums(rose, settings.sectors).time, settings.rose_days, seed, slot, draws)


def rose_varied(table: WindTable, settings: WindSettings) -> Varied:
    """What the draws vary, in words."""
    if table.assumed:
        return Varied(WIND, "the wind's rose, any of which is as likely since none was given")
    return Varied(WIND, f"the wind's rose, taken to be as sure as one from {settings.rose_days:g} independent days")
