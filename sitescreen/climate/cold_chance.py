"""Cold air under drawn terrain errors and drawn nights: the hollows and the layer again, on small windows, many times.

A block's own run knows where the air comes from over 27 km. A *nest* is a window of a few km inside it, at an absolute
place, whose air begins as in the block's run some hours before the end of the night, and is fed by it along its edge.
In each draw the nest gets another ground, another night, and both computations of cold air run again.
"""

import math
from dataclasses import dataclass
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from sitescreen.climate.cold_air import ClosedPools, closed_pools
from sitescreen.climate.cold_flow import Feed, Source, level_depth_m, run_night, supply_m_s
from sitescreen.climate.cold_kinds import ColdKinds, cold_kinds
from sitescreen.climate.cold_layer import ColdLayer, averaged, layer_of
from sitescreen.grid import Bounds, Field, Grid
from sitescreen.settings import ColdAirSettings, ColdChanceSettings, ColdLayerSettings
from sitescreen.terrain.coarse import (
    COARSE_CELL_M,
    FINE_CELL_M,
    block_means,
    coarse_grid,
    coarse_ground,
    on_coarse_edges,
)
from sitescreen.terrain.expected_ground import ExpectedGround, expected_ground, support_m
from sitescreen.terrain.hollows import Hollows, hollows
from sitescreen.terrain.terrain_error import error_parts, standard_normals

FloatArray = NDArray[np.float64]
BoolArray = NDArray[np.bool_]


class WiderRun(NamedTuple):
    """What a block's own run hands on to its nests; fine fields on one grid that holds them all, or on a wider one.

    ``elevation``; ``level_m``: the ground with its hollows filled; ``outlets``: water that takes any air; ``sky_view``;
    ``cover``: cold air that the ground cover makes, 1 open ground, or None; ``layer``: at 90 m, over this ground or
    more; ``wet``: its water.
    """

    elevation: Field
    level_m: Field
    outlets: BoolArray
    sky_view: Field
    cover: Field | None
    layer: ColdLayer
    wet: BoolArray


@dataclass(frozen=True)
class Nest:
    """A window in which the night is drawn again; fine arrays on ``grid``, the others at 90 m.

    ``rim_m``: the filled level of the block's run along the edge, NaN elsewhere. ``share``: of the open ground's supply
    of cold air. ``base_m``, ``base_level_m``: depth of the block's air, and of that on level ground, at the end of the
    night. ``base_bed_m``, ``base_rise_m``: the block's ground there. ``unknown``: cells that the block cannot tell.
    """

    grid: Grid
    expected: ExpectedGround
    rim_m: NDArray[np.float32]
    outlets: BoolArray
    wet: BoolArray
    share: FloatArray
    base_m: FloatArray
    base_level_m: FloatArray
    base_bed_m: FloatArray
    base_rise_m: FloatArray
    vertical_error_m: float
    error_range_m: float


class DrawnNight(NamedTuple):
    """One draw in a nest: its source, the hollows of the whole nest, the kinds of cold air on the part asked for."""

    source: Source
    hollows: Hollows
    kinds: ColdKinds


def nest_bounds(x_m: float, y_m: float, settings: ColdChanceSettings) -> Bounds:
    """West, south, east and north of the nest that serves a place: a square of the nests' own lattice, and a margin."""
    core, margin = settings.nest_core_m, settings.nest_margin_m
    west, south = math.floor(x_m / core) * core, math.floor(y_m / core) * core
    return west - margin, south - margin, west + core + margin, south + core + margin


def nest(bounds: Bounds, wider: WiderRun, vertical_error_m: float, error_range_m: float) -> Nest:
    """Cut a nest out of a block's run.

    Parameters
    ----------
    bounds : tuple
        On the 90 m lattice, as :func:`nest_bounds` gives them; what lies beyond the block's ground is left out.
    wider : WiderRun
    vertical_error_m, error_range_m : float
        Of the terrain model. [m]
    """
    around = math.ceil(support_m(error_range_m, FINE_CELL_M) / COARSE_CELL_M) * COARSE_CELL_M
    west, south, east, north = bounds
    wide = at_30m(wider.elevation, (west - around, south - around, east + around, north + around))
    water = Field(wider.outlets.astype(np.float32), wider.elevation.grid, "1", "water")
    level_water = at_30m(water, wide.grid.bounds).values >= 0.5
    expected = expected_ground(wide, level_water, vertical_error_m, error_range_m)
    grid, inside = wide.grid.part(bounds)
    coarse = coarse_grid(grid)
    layer, (_, part) = wider.layer, wider.layer.ground.grid.part(coarse.bounds)
    share = np.ones(coarse.shape)
    for field in (wider.sky_view, wider.cover):
        if field is not None:
            share *= np.nan_to_num(averaged(field.part(bounds), coarse), nan=1.0)
    rim = np.full(grid.shape, np.nan, dtype=np.float32)
    level = at_30m(wider.level_m, bounds).values
    for edge in (np.s_[0], np.s_[-1], np.s_[:, 0], np.s_[:, -1]):
        rim[edge] = level[edge]
    return Nest(
        grid=grid,
        expected=ExpectedGround(*(array[inside] for array in expected)),
        rim_m=rim,
        outlets=level_water[inside],
        wet=wider.wet[part],
        share=share,
        base_m=layer.runs[0].depth_m[part],
        base_level_m=layer.level_m.values[part].astype(np.float64),
        base_bed_m=layer.ground.bed_m[part],
        base_rise_m=layer.rise_m.values[part].astype(np.float64),
        vertical_error_m=vertical_error_m,
        error_range_m=error_range_m,
    )


def at_30m(field: Field, bounds: Bounds) -> Field:
    """The part of a field inside bounds on the 90 m lattice, finer cells averaged to 30 m."""
    part = field.part(bounds)
    if part.grid.cell_size_m >= FINE_CELL_M:
        return part
    coarse = coarse_grid(part.grid)
    values = block_means(on_coarse_edges(part, coarse), round(FINE_CELL_M / part.grid.cell_size_m))
    grid = Grid(coarse.crs, coarse.west_m, coarse.north_m, FINE_CELL_M, *values.shape)
    return Field(values.astype(np.float32), grid, part.unit, part.what)


def drawn_source(seed: int, draw: int, settings: ColdChanceSettings) -> Source:
    """One night's cooling: heat and deficit each even between their limits, together by a Gaussian copula."""
    first, second = standard_normals(seed, draw, 2)
    alike = settings.source_together
    second = alike * first + math.sqrt(1.0 - alike**2) * second
    heat, deficit = (0.5 * math.erfc(-number / math.sqrt(2.0)) for number in (first, second))
    return Source(
        settings.heat_least_w_m2 + heat * (settings.heat_most_w_m2 - settings.heat_least_w_m2),
        settings.deficit_least_k + deficit * (settings.deficit_most_k - settings.deficit_least_k),
    )


def drawn_night(
    one: Nest,
    part: Bounds,
    seed: int,
    draw: int,
    chance: ColdChanceSettings,
    flow: ColdLayerSettings,
    air: ColdAirSettings,
) -> DrawnNight:
    """The nest's ground and night in one draw, and the cold air that comes of them.

    Parameters
    ----------
    one : Nest
    part : tuple
        Bounds on the 90 m lattice, inside the nest: where the kinds are wanted.
    seed, draw : int
        The same draw is the same error of the ground and the same night in every nest.
    chance, flow, air : settings

    Returns
    -------
    DrawnNight

    Notes
    -----
    The run begins ``warm_up_h`` before the end of the night, with the depth of the block's run scaled by what the drawn
    source gives on level ground by then, and lets the air find its place on the drawn ground. Flows are computed as if
    no layer were deeper than ``depth_bound_m``, which makes the time step longer; deeper air is cold in any case. In a
    drawn ground every hollow of the stated least depth and size counts: what of it is error the draws themselves tell.
    """
    error = error_parts(one.grid, one.vertical_error_m, one.error_range_m, seed, draw)
    height = one.expected.drawn(error).astype(np.float32)
    height = np.where(np.isnan(one.rim_m), height, one.rim_m)
    drawn = Field(height, one.grid, "m", "drawn height")
    pits = hollows(drawn, one.outlets)
    pools = closed_pools(pits, 0.0, air).depth_m.part(part)

    source = drawn_source(seed, draw, chance)
    flow = flow.model_copy(update={"depth_bound_m": chance.depth_bound_m})
    ground = coarse_ground(drawn, max(flow.gorge_depth_m, 3.0 * one.vertical_error_m), flow.section_m)
    supply = supply_m_s(source, np.where(np.isnan(ground.bed_m), 0.0, ground.bed_m))
    began_h = flow.night_h - chance.warm_up_h

    ring = ~np.isnan(ground.bed_m) & ~one.wet
    ring[chance.ring_cells : -chance.ring_cells, chance.ring_cells : -chance.ring_cells] = False
    base_m = np.nan_to_num(one.base_m / one.base_level_m, nan=0.0)

    def ring_m(seconds: float) -> FloatArray:
        return base_m[ring] * level_depth_m(supply[ring], flow, began_h + seconds / 3600.0)

    feed = Feed(base_m * level_depth_m(supply, flow, began_h), ring, ring_m, chance.feed_every_s)
    run = run_night(
        ground, one.wet, supply * one.share, source.deficit_k, "open", flow, chance.warm_up_h * 3600.0, feed
    )
    run = run._replace(depth_m=np.where(np.isnan(one.base_m), np.nan, run.depth_m))
    rise = Field((one.base_rise_m + ground.bed_m - one.base_bed_m).astype(np.float32), ground.grid, "m", "rise")
    layer = layer_of(ground, (run, run), level_depth_m(supply, flow), rise, source, flow)
    nowhere = np.zeros(pools.grid.shape, dtype=np.bool_)
    kinds = cold_kinds(layer, ClosedPools(pools, nowhere), drawn.part(part), 0.0, flow, air.fill_scale_m)
    return DrawnNight(source, pits, kinds)
