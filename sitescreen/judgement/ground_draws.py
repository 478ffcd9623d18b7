"""Slope, rise, usable share and ponding of plots in each draw of the terrain's error."""

import math
from collections.abc import Callable
from concurrent.futures import ThreadPoolExecutor
from typing import Any, NamedTuple

import numpy as np
from numpy.typing import NDArray

from sitescreen.climate.cold_air import closed_pools
from sitescreen.climate.cold_chance import WiderRun, at_30m
from sitescreen.grid import Bounds, Field, Grid
from sitescreen.judgement.coverage import Coverage, cover
from sitescreen.settings import Defaults
from sitescreen.terrain.coarse import COARSE_CELL_M, FINE_CELL_M
from sitescreen.terrain.expected_ground import ExpectedGround, expected_ground, support_m
from sitescreen.terrain.hollows import hollows
from sitescreen.terrain.position import rise_m
from sitescreen.terrain.slope import slope_deg
from sitescreen.terrain.terrain_error import error_parts
from sitescreen.terrain.threads import thread_count, work_alone

FloatArray = NDArray[np.float64]

AROUND_M = 1080.0
"""Ground drawn round a plot: what its rise looks at, in whole cells of 90 m. [m]"""


class _Window(NamedTuple):
    """Ground round one plot: most likely height, filled level of the run along the edge, outlets, the plot's cells."""

    grid: Grid
    expected: ExpectedGround
    rim_m: NDArray[np.float32]
    outlets: NDArray[np.bool_]
    coverage: Coverage


def ground_draws(
    wider: WiderRun,
    geometry: Any,
    wanted: NDArray[np.bool_],
    error: tuple[float, float],
    seed: int,
    settings: Defaults,
    tell: Callable[[str], None],
) -> dict[str, FloatArray]:
    """Read the ground of plots again in every draw.

    Parameters
    ----------
    wider : WiderRun
        Of the block that holds the plots.
    geometry : GeoSeries, length n
        The plots, in the block's coordinate system.
    wanted : bool array, shape (n,)
        Plots to draw.
    error : pair of float
        The terrain's vertical error and its range. [m]
    seed : int
    settings : Defaults
    tell : function
        Told how far the work is, in words.

    Returns
    -------
    dict of float64 array, shape (n, draws)
        ``slope_deg``, ``buildable_share`` (of the plot's cells, how many are gentle enough), ``rise_m``,
        ``pond_depth_m``; NaN where not drawn or unknown.

    Notes
    -----
    Slope and usable share are read at the terrain's own cells, rise and ponding at 30 m or more. Noise makes level
    ground look steep, and the draws take that out: there they lie below the slope that the run itself reads.
    """
    draws = settings.judgement.data_draws
    out = {
        name: np.full((len(wanted), draws), np.nan)
        for name in ("slope_deg", "buildable_share", "rise_m", "pond_depth_m")
    }
    rows = np.flatnonzero(wanted)

    def single(row: int) -> None:
        shape = geometry.iloc[[row]]
        wide = _window(wider, shape, AROUND_M, error, coarse=True)
        own = wider.elevation.grid.cell_size_m >= FINE_CELL_M
        close = wide if own else _window(wider, shape, COARSE_CELL_M, error, coarse=False)
        for draw in range(draws):
            height = _drawn(wide, error, seed, draw)
            pits = closed_pools(hollows(height, wide.outlets), 0.0, settings.cold_air)
            out["pond_depth_m"][row, draw] = wide.coverage.largest(pits.depth_m.values)[0]
            rise = rise_m(height, settings.terrain.rise_radius_m)
            known = settings.readings.known_share_least
            out["rise_m"][row, draw] = wide.coverage.mean(rise.values, known)[0]
            steep = slope_deg(height if own else _drawn(close, error, seed, draw)).values
            out["slope_deg"][row, draw] = close.coverage.mean(steep, known)[0]
            gentle = np.where(np.isnan(steep), np.nan, steep <= limit_deg)
            out["buildable_share"][row, draw] = close.coverage.mean(gentle, known)[0]

    limit_deg = math.degrees(math.atan(settings.terrain.buildable_limit_pct / 100.0))
    with ThreadPoolExecutor(thread_count(), initializer=work_alone) as pool:
        for done, _ in enumerate(pool.map(single, rows), start=1):
            tell(f"{done:,} of {len(rows):,} plots")
    return out


def _window(wider: WiderRun, shape: Any, around_m: float, error: tuple[float, float], coarse: bool) -> _Window:
    """The ground within a distance of a plot, on whole cells of 90 m as far as the block's ground reaches."""

    def whole(box: Any, more_m: float) -> Bounds:
        low = [math.floor((edge - more_m) / COARSE_CELL_M) * COARSE_CELL_M for edge in box[:2]]
        high = [math.ceil((edge + more_m) / COARSE_CELL_M) * COARSE_CELL_M for edge in box[2:]]
        return low[0], low[1], high[0], high[1]

    def cut(field: Field, bounds: Bounds) -> Field:
        return at_30m(field, bounds) if coarse else field.part(bounds)

    bounds = whole(shape.total_bounds, around_m)
    cell = max(FINE_CELL_M, wider.elevation.grid.cell_size_m) if coarse else wider.elevation.grid.cell_size_m
    ground = cut(wider.elevation, whole(bounds, support_m(error[1], cell)))
    water = Field(wider.outlets.astype(np.float32), wider.elevation.grid, "1", "water")
    wet = cut(water, ground.grid.bounds).values >= 0.5
    expected = expected_ground(ground, wet, *error)
    grid, inside = ground.grid.part(bounds)
    return _Window(
        grid,
        ExpectedGround(*(array[inside] for array in expected)),
        cut(wider.level_m, grid.bounds).values,
        wet[inside],
        cover(shape, grid),
    )


def _drawn(window: _Window, error: tuple[float, float], seed: int, draw: int) -> Field:
    height = window.expected.drawn(error_parts(window.grid, *error, seed, draw)).astype(np.float32)
    for edge in (np.s_[0], np.s_[-1], np.s_[:, 0], np.s_[:, -1]):
        height[edge] = window.rim_m[edge]
    return Field(height, window.grid, "m", "drawn height")
