"""The readings that the night's cold air gives: its kind and depth, how cold, how much passes, where it spills."""

from typing import Any, NamedTuple

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from sitescreen.climate.cold_air import ClosedPools
from sitescreen.climate.cold_flow import Source, supply_m_s
from sitescreen.climate.cold_kinds import KINDS, ColdKinds, deficit_k, heat_cap_k
from sitescreen.judgement.coverage import Coverage
from sitescreen.judgement.readings import Readings
from sitescreen.notes import Note
from sitescreen.settings import ColdAirSettings, Defaults
from sitescreen.terrain.hollows import Hollows

FloatArray = NDArray[np.float64]

POOL_COLUMNS = ("sill_distance_m", "sill_bearing_deg", "pool_catchment_ha", "pool_fill_h")

ON_THE_WAY = ("cold_fill", "cold_fill_least", "cold_fill_most", "cold_cap_k")
"""Columns that only wait for the plot's climate."""

NO_GROUND = "the terrain model has no data under part of the plot"
CUT = "the hollow runs off the edge of the terrain model"
BEYOND = "how much cold air gathers depends on ground beyond the terrain model"


def with_cold(
    readings: Readings,
    coverage: Coverage,
    hollows: Hollows,
    pools: ClosedPools,
    cold: ColdKinds,
    convergence_deg: FloatArray,
    smallest_pool_m: float,
    shows_trees: bool,
    settings: Defaults,
) -> Readings:
    """The readings with those of the night's cold air added.

    Parameters
    ----------
    readings : Readings, n rows
        With ``elevation_m``.
    coverage : Coverage
        The cells under the plots.
    hollows, pools, cold : Hollows, ClosedPools, ColdKinds
        On the grid of the coverage.
    convergence_deg : float64 array, shape (n,)
        Bearing of grid north from true north at each plot. [°]
    smallest_pool_m : float
        The shallowest hollow that counts. [m]
    shows_trees : bool
        Whether the ground is a surface of tree tops and roofs.
    settings : Defaults

    Returns
    -------
    Readings
        ``cold_fill``: share of the climate's strength that the plot's air reaches, 0–1, under an open sky;
        ``cold_fill_least``, ``cold_fill_most``: between what it lies where it is unknown; ``cold_cap_k``: the most that
        the night's heat budget allows. [K] These are for :func:`with_nights`, once the plot's climate is known.
        ``still_air``: as ``cold_fill`` where the air stands, 0 where it flows. ``sill_distance_m``,
        ``sill_bearing_deg`` (from true north): from the plot's middle to where its closed hollow spills;
        ``pool_catchment_ha``, ``pool_fill_h``: what drains into that hollow, and how long its air takes to fill it. NaN
        outside closed hollows.
    """
    values, why = readings.values.copy(), readings.why_unknown.copy()
    least_share, known_share = settings.readings.pool_share_least, settings.readings.known_share_least
    source = Source(settings.cold_layer.heat_w_m2, settings.cold_layer.deficit_k)

    def reading(column: str, got: FloatArray, *reasons: tuple[NDArray[np.bool_], str]) -> None:
        values[column] = got
        missing = np.isnan(got)
        if missing.any():
            told = np.full(len(got), "", dtype=object)
            for where, reason in reversed(reasons):
                told[missing & where] = reason
            why[column] = told

    def mean(field: NDArray[Any], least_known: float = known_share) -> FloatArray:
        return coverage.mean(field, least_known)

    at_plot = cold_at(coverage, hollows, hollows.pool_id, cold, source, settings)
    kind, pool, unknown = at_plot.kind, at_plot.pool, at_plot.kind == "unknown"
    no_ground = np.isnan(values["elevation_m"].to_numpy(dtype=np.float64))
    cut = mean(pools.cut.astype(np.float32)) >= least_share
    always = np.ones(len(kind), dtype=np.bool_)
    whys = ((no_ground, NO_GROUND), (cut, CUT), (always, BEYOND))

    values["cold_pool_kind"] = kind
    reading("cold_pool_depth_m", at_plot.depth_m, *whys)
    reading("cold_fill", at_plot.fill, *whys)
    for column, bound in (("cold_fill_least", cold.fill_least), ("cold_fill_most", cold.fill_most)):
        # one that is known has no limits of its own
        values[column] = np.where(unknown, mean(bound.values, 0.0), values["cold_fill"])
    reading("still_air", np.where(kind == "moving", 0.0, values["cold_fill"].to_numpy(dtype=np.float64)), *whys)
    values["cold_cap_k"] = at_plot.cap_k
    # a clearing in a wood is such a hollow
    air, rim, hectares = settings.cold_air, hollows.pools.deepest_m, hollows.pools.cells * _cell_ha(hollows)
    trees = np.concatenate([[False], (hectares < air.tree_pool_ha) & (rim < air.tree_rim_m)])
    values["may_be_trees"] = (shows_trees & trees[pool]).astype(np.float64)
    reading("night_flow_m2_s", mean(cold.discharge_m2_s.values), (no_ground, NO_GROUND), (always, BEYOND))
    reading("night_flow_speed_m_s", mean(cold.speed_m_s.values), (no_ground, NO_GROUND), (always, BEYOND))
    values["smallest_pool_seen_m"] = np.where(no_ground, np.nan, smallest_pool_m)
    pond = coverage.largest(np.where(pools.cut, np.nan, pools.depth_m.values))
    reading("pond_depth_m", np.where(cut | no_ground, np.nan, pond), (no_ground, NO_GROUND), (cut, CUT), (always, CUT))
    for column, got in zip(POOL_COLUMNS, _of_pool(pool, coverage, hollows, convergence_deg, source), strict=True):
        values[column] = got
    return Readings(values, why)


class PlotCold(NamedTuple):
    """Cold air at plots, arrays of shape (n,): see :func:`with_cold`; ``pool``: number of the hollow, 0 for none."""

    kind: NDArray[np.object_]
    depth_m: FloatArray
    fill: FloatArray
    cap_k: FloatArray
    pool: NDArray[np.int64]


def cold_at(
    coverage: Coverage, hollows: Hollows, pool_id: NDArray[Any], cold: ColdKinds, source: Source, settings: Defaults
) -> PlotCold:
    """What of the cold air lies on plots: the one rule, in the run itself and in every draw.

    Parameters
    ----------
    coverage : Coverage
    hollows : Hollows
        That ``pool_id`` numbers.
    pool_id : int array
        On the grid of the coverage, as ``cold``.
    cold : ColdKinds
    source : Source
        That cooled the air.
    settings : Defaults
    """
    least_share = settings.readings.pool_share_least
    kind = _kind(coverage, cold.kind, least_share)
    lies, unknown = np.isin(kind, ("closed", "leaky", "moving")), kind == "unknown"

    def in_cold(field: NDArray[Any]) -> FloatArray:
        # a plot lies in it from a part of its ground on, so that part is enough for its mean
        return np.where(unknown, np.nan, np.where(lies, coverage.mean(field, least_share), 0.0))

    pool = _main_pool(coverage, np.where(cold.kind == KINDS.index("closed"), pool_id, 0), kind == "closed")
    cap = np.full(len(kind), source.deficit_k)
    if (pool > 0).any():
        cap = np.where(pool > 0, _cap_k(hollows, source, settings.cold_layer.night_h)[pool], cap)
    return PlotCold(kind, in_cold(cold.depth_m.values), in_cold(cold.fill.values), cap, pool)


def _kind(coverage: Coverage, kind: NDArray[np.uint8], least_share: float) -> NDArray[np.object_]:
    """What kind of cold air a plot lies in.

    Unknown where that much of it is, or where so much may be. Else the cold kinds together must cover enough of it;
    the one with most of it names them, a closed hollow before a leaky one before moving air where they have the same.
    """
    share = {word: coverage.mean((kind == code).astype(np.float32), 0.0) for code, word in enumerate(KINDS)}
    words = ("closed", "leaky", "moving")
    cold = np.stack([np.nan_to_num(share[word]) for word in words])
    out: NDArray[np.object_] = np.asarray(words, dtype=object)[cold.argmax(axis=0)]
    total, hidden = cold.sum(axis=0), np.nan_to_num(share["unknown"])
    out[total < least_share] = "none"
    out[(total < least_share) & (total + hidden >= least_share) | (coverage.cells == 0)] = "unknown"
    return out


def _main_pool(coverage: Coverage, pool_id: NDArray[Any], wanted: NDArray[np.bool_]) -> NDArray[np.int64]:
    """The number of the pool that covers most of each plot; 0 where there is none or it is not wanted."""
    picked = pool_id.ravel()[coverage.cell].astype(np.int64)
    use = (picked > 0) & wanted[coverage.plot]
    out = np.zeros(len(coverage.cells), dtype=np.int64)
    if use.any():
        keys, each = np.unique(coverage.plot[use] * (picked[use].max() + 1) + picked[use], return_inverse=True)
        plot, pool = np.divmod(keys, picked[use].max() + 1)
        size = np.bincount(each, weights=coverage.share[use])
        # by size, the largest last, of equal ones the first by number: what is written last stays
        order = np.lexsort((-pool, size, plot))
        out[plot[order]] = pool[order]
    return out


def _cell_ha(hollows: Hollows) -> float:
    return hollows.depth_m.grid.cell_size_m**2 / 1e4


def _cap_k(hollows: Hollows, source: Source, night_h: float) -> FloatArray:
    """The heat budget's cap of each pool, entry 0 for none. [K]"""
    pools, cell_m2 = hollows.pools, hollows.depth_m.grid.cell_size_m**2
    cap = heat_cap_k(pools.catchment_cells * cell_m2, pools.volume_m3, pools.sill_m, source, night_h)
    return np.concatenate([[np.inf], np.asarray(cap, dtype=np.float64)])


def _of_pool(
    pool: NDArray[np.int64], coverage: Coverage, hollows: Hollows, convergence_deg: FloatArray, source: Source
) -> tuple[FloatArray, FloatArray, FloatArray, FloatArray]:
    """Distance and bearing of the sill, catchment [ha], hours to fill; NaN where a plot has no pool."""
    pools, grid = hollows.pools, hollows.depth_m.grid
    nothing = np.full(len(pool), np.nan)
    if not (pool > 0).any():
        return nothing, nothing, nothing, nothing
    row, col = np.divmod(coverage.cell, grid.cols)
    with np.errstate(invalid="ignore", divide="ignore"):
        middle = [coverage.total(coverage.share * one) / coverage.cells for one in (row, col)]
    has, at = pool > 0, np.maximum(pool, 1) - 1
    north = (middle[0] - pools.sill_row[at]) * grid.cell_size_m
    east = (pools.sill_col[at] - middle[1]) * grid.cell_size_m
    catchment_m2 = pools.catchment_cells[at] * grid.cell_size_m**2
    hours = pools.volume_m3[at] / (supply_m_s(source, pools.sill_m[at]) * catchment_m2) / 3600.0
    bearing = (np.degrees(np.arctan2(east, north)) + convergence_deg) % 360.0
    told = (np.hypot(east, north), bearing, catchment_m2 / 1e4, hours)
    distance, bearing_deg, hectares, fill_h = (np.where(has, one, np.nan) for one in told)
    return distance, bearing_deg, hectares, fill_h


def with_nights(
    readings: Readings, strength_k: FloatArray, climate: pd.DataFrame | None, settings: ColdAirSettings
) -> Readings:
    """The readings with what a plot's climate makes of its cold air, for people.

    Parameters
    ----------
    readings : Readings, n rows
        With ``cold_fill``, ``cold_cap_k`` and ``sky_view``.
    strength_k : float64 array, shape (n,)
        ΔT of each plot's climate. [K]
    climate : DataFrame, n rows, optional
        As :func:`sitescreen.climate.normals.plot_climate` gives it.
    settings : ColdAirSettings

    Returns
    -------
    Readings
        ``cold_strength_k``: ΔT, as given. [K]
        ``cold_deficit_k``: how much colder than open level ground the air is on a calm clear night. [K]
        ``cold_deficit_least_k``, ``cold_deficit_most_k``: between what it lies where it is unknown.
        ``night_minimum_c``: mean minimum of the three coolest months at the plot's height, less that. [°C]
        ``clear_calm_nights``: a month in those months; an assumption where nobody gave it. The columns
        :data:`ON_THE_WAY` are gone.
    """
    values, why = readings.values.copy(), readings.why_unknown.copy()
    fill, sky, cap = (values[name].to_numpy(dtype=np.float64) for name in ("cold_fill", "sky_view", "cold_cap_k"))
    values["cold_strength_k"] = strength_k
    values["cold_deficit_k"] = deficit_k(strength_k, fill, sky, cap)
    for limit in ("least", "most"):
        of = values[f"cold_fill_{limit}"].to_numpy(dtype=np.float64)
        values[f"cold_deficit_{limit}_k"] = deficit_k(strength_k, of, sky, cap)
    for column in ("cold_deficit_k", "night_minimum_c"):
        why[column] = why.get("cold_pool_depth_m", "")
    if climate is None:
        values["night_minimum_c"] = np.nan
        why["night_minimum_c"] = "no climate normals were given"
        given = np.full(len(values), np.nan)
    else:
        values["night_minimum_c"] = climate["cool_season_min_c"].to_numpy() - values["cold_deficit_k"].to_numpy()
        given = climate["clear_calm_nights"].to_numpy(dtype=np.float64)
    values["clear_calm_nights"] = np.where(np.isnan(given), settings.assumed_clear_calm_nights, given)
    return Readings(values.drop(columns=[*ON_THE_WAY]), why.drop(columns=[*ON_THE_WAY], errors="ignore"))


def night_notes(climate: pd.DataFrame | None, settings: ColdAirSettings) -> tuple[Note, ...]:
    """What to say where nobody gave the number of clear and calm nights."""
    if climate is not None and climate["clear_calm_nights"].notna().all():
        return ()
    many = f"{settings.assumed_clear_calm_nights:g} nights a month in the cool season are taken to be clear and calm."
    return (Note("assumed", "climate", f"The normals do not say how many nights are clear and calm: {many}"),)
