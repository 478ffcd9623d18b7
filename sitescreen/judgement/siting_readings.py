"""The readings of siting for all plots of a run, block by block, and the hints of the first of them."""

from collections.abc import Sequence
from dataclasses import dataclass
from typing import NamedTuple

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from sitescreen.climate.plot_sun import PlotSkies
from sitescreen.climate.roses import roses_at
from sitescreen.climate.sector_winds import SectorWinds
from sitescreen.inputs.wind import SLOTS, WindTable
from sitescreen.judgement.long_axis import SitingGround, long_axis
from sitescreen.judgement.readings import Readings
from sitescreen.judgement.siting import PlotSiting, plot_sitings
from sitescreen.settings import SitingSettings

FloatArray = NDArray[np.float64]

COLUMNS = ("long_axis_deg", "wind_incidence_deg")

NO_GROUND = "the terrain model has no data under part of the plot"
NO_ZONE = "it is in no firm zone, so nobody can say what its houses need"
NO_TABLE = "no wind table was given, so the sun alone decided"
NO_WIND = "the wind there is unknown, so the sun alone decided"
ALL_SIDES = "the wind there comes from all sides alike"


class BlockSuns(NamedTuple):
    """What a block hands to siting: its plots' ids, in the order of their suns, and their winds."""

    plots: tuple[str, ...]
    suns: PlotSkies
    winds: SectorWinds


@dataclass(frozen=True)
class Sites:
    """All that the siting of a run's plots goes by, beside their readings.

    Parameters
    ----------
    blocks : sequence of BlockSuns
    lonlat : DataFrame, indexed by plot
        ``lon``, ``lat`` of all plots. [°]
    wind : WindTable
    shares : DataFrame, indexed by plot
        The share of each zone in each plot; all 0 where it has none.
    albedo : float
        Share of light that the ground throws back.
    settings : SitingSettings
    """

    blocks: Sequence[BlockSuns]
    lonlat: pd.DataFrame
    wind: WindTable
    shares: pd.DataFrame
    albedo: float
    settings: SitingSettings


def siting_ground(block: BlockSuns, values: pd.DataFrame, sites: Sites) -> SitingGround:
    """What the long axes of a block's plots go by.

    Parameters
    ----------
    block : BlockSuns, n plots
    values : DataFrame, indexed by plot
        Readings of all plots: ``onshore_from_deg``, ``breeze_reach``.
    sites : Sites
    """
    here = list(block.plots)
    lon, lat = (sites.lonlat.loc[here, name].to_numpy(dtype=np.float64) for name in ("lon", "lat"))
    ratio = block.winds.of(block.plots).speed_ratio
    flow: dict[str, FloatArray] = {}
    for slot in () if sites.wind.assumed else SLOTS:
        over_level = roses_at(sites.wind, slot, lon, lat, ratio.shape[1]).flow
        # a sector without wind brings none, whatever the ground upwind
        flow[slot] = np.where(over_level > 0.0, over_level * ratio, 0.0)
    onshore, reach = (
        values.loc[here, name].to_numpy(dtype=np.float64) for name in ("onshore_from_deg", "breeze_reach")
    )
    return SitingGround(block.suns, onshore, reach, flow, sites.wind.assumed)


def with_siting(readings: Readings, sites: Sites) -> Readings:
    """The readings of all plots with ``long_axis_deg`` and ``wind_incidence_deg`` added.

    Parameters
    ----------
    readings : Readings, indexed by plot
    sites : Sites
    """
    values, why = readings.values.copy(), readings.why_unknown.copy()
    in_zone = sites.shares.loc[values.index].to_numpy(dtype=np.float64).sum(axis=1) > 0.0
    axis, incidence = (pd.Series(np.nan, index=values.index) for _ in COLUMNS)
    no_wind = pd.Series(NO_TABLE if sites.wind.assumed else NO_WIND, index=values.index, dtype=object)
    for block in sites.blocks:
        here = list(block.plots)
        ground = siting_ground(block, values, sites)
        found = long_axis(ground, sites.shares.loc[here], sites.albedo, sites.settings)
        axis[here], incidence[here] = found.bearing_deg, found.wind_incidence_deg
        no_wind[[plot for plot, alike in zip(here, found.from_all_sides, strict=True) if alike]] = ALL_SIDES
    for column, measured in zip(COLUMNS, (axis, incidence), strict=True):
        values[column] = measured
        missing = measured.isna().to_numpy()
        if missing.any():
            because = np.where(in_zone, NO_GROUND, NO_ZONE)
            if column == "wind_incidence_deg":
                because = np.where(axis.notna(), no_wind, because)
            why[column] = np.where(missing, because, "")
    return Readings(values, why)


def first_sitings(first: Sequence[str], values: pd.DataFrame, sites: Sites) -> dict[str, PlotSiting]:
    """The siting hints of some plots, in their order; without those whose axis is unknown.

    Parameters
    ----------
    first : sequence of str
        Plot ids.
    values : DataFrame, indexed by plot
        Readings of all plots.
    sites : Sites
    """
    wanted = set(first)
    found: dict[str, PlotSiting] = {}
    for block in sites.blocks:
        rows = np.flatnonzero([plot in wanted for plot in block.plots])
        if len(rows):
            here = list(block.plots)
            ground, shares = siting_ground(block, values, sites), sites.shares.loc[here]
            found |= plot_sitings(ground, shares, values.loc[here], rows, sites.albedo, sites.settings)
    return {plot: found[plot] for plot in first if plot in found}
