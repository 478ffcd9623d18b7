"""The night's cold air at plots in each draw of terrain error and night."""

import math
from collections.abc import Callable
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass
from typing import Any, NamedTuple

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from sitescreen.climate.cold_chance import Nest, WiderRun, drawn_night, nest, nest_bounds
from sitescreen.climate.cold_kinds import deficit_k
from sitescreen.grid import Bounds
from sitescreen.judgement.cold_readings import cold_at
from sitescreen.judgement.coverage import Coverage, cover
from sitescreen.settings import Defaults
from sitescreen.terrain.buildable import gradient_error
from sitescreen.terrain.coarse import COARSE_CELL_M
from sitescreen.terrain.threads import thread_count, work_alone

FloatArray = NDArray[np.float64]
BoolArray = NDArray[np.bool_]

NEAR_HOLLOW_M = 0.5
"""A hollow this deep on a plot is reason to draw. [m]"""


class ColdDraws(NamedTuple):
    """Cold air at plots in each draw, arrays of shape (plots, draws); NaN or "" where a plot was not drawn.

    ``kind``: words. ``depth_m``, ``fill``, ``cap_k``: as the readings ``cold_pool_depth_m``, ``cold_fill``,
    ``cold_cap_k``. ``nights``, shape (plots,): how many draws are a plot's own; the others repeat these in turn.
    """

    kind: NDArray[np.object_]
    depth_m: FloatArray
    fill: FloatArray
    cap_k: FloatArray
    nights: NDArray[np.int64]


@dataclass(frozen=True)
class _Job:
    """One nest with its plots. ``rows``: of those plots."""

    nest: Nest
    part: Bounds
    coverage: Coverage
    rows: NDArray[np.int64]


def cold_draws(
    wider: WiderRun,
    geometry: Any,
    near: BoolArray,
    strength_k: FloatArray,
    sky_view: FloatArray,
    error: tuple[float, float],
    seed: int,
    settings: Defaults,
    tell: Callable[[str], None],
) -> ColdDraws:
    """Let the hollows and the cold-air layer of the plots that need it run again in every draw.

    Parameters
    ----------
    wider : WiderRun
        Of the block that holds the plots.
    geometry : GeoSeries, length n
        The plots, in the block's coordinate system.
    near : bool array, shape (n,)
        Plots to draw, by :func:`near_cold`.
    strength_k, sky_view : float64 arrays, shape (n,)
        Of the plots' climate, and sky; for the question which plots the first draws leave in doubt.
    error : pair of float
        The terrain's vertical error and its range. [m]
    seed : int
    settings : Defaults
    tell : function
        Told how far the work is, in words.

    Returns
    -------
    ColdDraws

    Notes
    -----
    A plot on which the first draws all agree keeps to them. A plot's draws hang on nothing but its own nest, and the
    nest's place on no plot.
    """
    rules, draws = settings.cold_chance, settings.judgement.data_draws
    count = len(near)
    out = ColdDraws(
        kind=np.full((count, draws), "", dtype=object),
        depth_m=np.full((count, draws), np.nan),
        fill=np.full((count, draws), np.nan),
        cap_k=np.full((count, draws), np.nan),
        nights=np.zeros(count, dtype=np.int64),
    )
    jobs = _jobs(wider, geometry, near, error, settings)
    first = min(rules.draws_first, draws)
    with ThreadPoolExecutor(thread_count(), initializer=work_alone) as pool:
        _run(pool, jobs, range(first), out, seed, settings, tell, "first look")
        out.nights[near] = first
        cold = deficit_k(strength_k[:, None], out.fill[:, :first], sky_view[:, None], out.cap_k[:, :first])
        often = (cold > rules.cold_from_k).sum(axis=1)
        doubt = near & (often > 0) & (often < first)
        left = [job for job in jobs if doubt[job.rows].any()]
        _run(pool, left, range(first, draws), out, seed, settings, tell, "doubtful plots")
    out.nights[doubt] = draws
    again = np.arange(draws) % first
    for array in (out.kind, out.depth_m, out.fill, out.cap_k):
        array[near & ~doubt] = array[near & ~doubt][:, again]
    return out


def _jobs(
    wider: WiderRun, geometry: Any, near: BoolArray, error: tuple[float, float], settings: Defaults
) -> list[_Job]:
    """The nests that the wanted plots need, each with its plots."""
    middle = geometry.representative_point()
    found: dict[Bounds, list[int]] = {}
    for row in np.flatnonzero(near):
        bounds = nest_bounds(middle.x.iloc[row], middle.y.iloc[row], settings.cold_chance)
        found.setdefault(bounds, []).append(int(row))
    jobs = []
    for bounds, rows in sorted(found.items()):
        one = nest(bounds, wider, *error)
        shapes = geometry.iloc[rows]
        west, south, east, north = (float(value) / COARSE_CELL_M for value in shapes.total_bounds)
        box = (math.floor(west), math.floor(south), math.ceil(east), math.ceil(north))
        inside = one.grid.bounds
        part = tuple(
            limit(COARSE_CELL_M * edge, end) for limit, edge, end in zip((max, max, min, min), box, inside, strict=True)
        )
        grid, _ = one.grid.part(part)  # type: ignore[arg-type]
        jobs.append(_Job(one, grid.bounds, cover(shapes, grid), np.array(rows, dtype=np.int64)))
    return jobs


def _run(
    pool: ThreadPoolExecutor,
    jobs: list[_Job],
    draws: range,
    out: ColdDraws,
    seed: int,
    settings: Defaults,
    tell: Callable[[str], None],
    what: str,
) -> None:
    def single(task: tuple[_Job, int]) -> None:
        job, draw = task
        drawn = drawn_night(
            job.nest, job.part, seed, draw, settings.cold_chance, settings.cold_layer, settings.cold_air
        )
        window = job.nest.grid.part(job.part)[1]
        told = cold_at(job.coverage, drawn.hollows, drawn.hollows.pool_id[window], drawn.kinds, drawn.source, settings)
        unknown = told.kind == "unknown"
        out.kind[job.rows, draw] = np.where(unknown, "", told.kind)
        out.depth_m[job.rows, draw] = told.depth_m
        out.fill[job.rows, draw] = told.fill
        out.cap_k[job.rows, draw] = np.where(unknown, np.nan, told.cap_k)

    tasks = [(job, draw) for job in jobs for draw in draws]
    for done, _ in enumerate(pool.map(single, tasks), start=1):
        if done % 100 == 0 or done == len(tasks):
            tell(f"{what}, {done:,} of {len(tasks):,} nights")


def near_cold(
    values: pd.DataFrame, coverage: Coverage, wider: WiderRun, error: tuple[float, float], settings: Defaults
) -> BoolArray:
    """Plots whose air may count as cold in some draw: those that a draw is worth its time for. Shape (n,).

    Notes
    -----
    A plot is near where a hollow of half a metre is seen on it, or a fall so slight that the error can hide one; or
    where the layer is deeper than on level ground less some errors, and the ground is not well above its surroundings.
    """
    rules, (error_m, error_range_m) = settings.cold_chance, error
    reach_m = max(rules.near_m, rules.near_errors * error_m)
    grid, coarse = wider.elevation.grid, wider.layer.ground.grid
    row, col = np.divmod(coverage.cell, grid.cols)
    north, east = grid.north_m - (row + 0.5) * grid.cell_size_m, grid.west_m + (col + 0.5) * grid.cell_size_m
    at = coarse.rows_cols(east, north)
    hollow_m = (wider.level_m.values - wider.elevation.values).ravel()[coverage.cell]
    with np.errstate(invalid="ignore"):
        excess_m = wider.layer.opened.depth_m[at] - wider.layer.level_m.values[at]
        close = (hollow_m >= NEAR_HOLLOW_M) | ((excess_m > -reach_m) & ~(wider.layer.rise_m.values[at] > reach_m))
    found = np.bincount(coverage.plot, weights=close, minlength=len(coverage.cells)) > 0
    hidden = rules.near_errors * gradient_error(error_m, error_range_m, grid.cell_size_m)
    level = values["slope_deg"].to_numpy(dtype=np.float64) <= math.degrees(math.atan(hidden))
    return np.asarray((found | level) & (coverage.cells > 0))
