"""The night's cold air as a layer in motion: how deep it lies and how much of it passes, at 90 m.

Air over the ground cools on a calm clear night, runs down slopes, stands in basins and squeezes through gaps. The layer
finds what no flooding of hollows sees: cold air held back behind narrows that have an outlet at floor level.

It runs on any window of the lattice: :func:`night_ground` averages the window's ground and water to 90 m,
:func:`cold_layer` lets the air of a night flow over it, :func:`sitescreen.climate.cold_kinds.cold_kinds` says what lies
on each fine cell. A simulation calls all three again with its own heights and its own :class:`Source`.
"""

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from sitescreen.climate.cold_flow import (
    CRITICAL,
    Edge,
    Night,
    Source,
    flow_speed_m_s,
    level_depth_m,
    reduced_gravity_m_s2,
    run_night,
    supply_m_s,
)
from sitescreen.errors import GridError
from sitescreen.grid import Field, Grid
from sitescreen.settings import ColdLayerSettings
from sitescreen.terrain.coarse import CoarseGround, block_means, coarse_ground, on_coarse_edges
from sitescreen.terrain.position import disc_mean
from sitescreen.terrain.threads import in_bands

FloatArray = NDArray[np.float64]


class NightGround(NamedTuple):
    """Ground for a night at 90 m. ``wet``, bool, shape (rows, cols): cells of water. ``fine``: the grid averaged."""

    ground: CoarseGround
    wet: NDArray[np.bool_]
    fine: Grid


class Air(NamedTuple):
    """What one run says of each 90 m cell, float32 arrays of shape (rows, cols), NaN where the ground is unknown.

    ``depth_m``; ``discharge_m2_s``: what passes each metre of width; ``froude``: flux over depth over wave speed;
    ``speed_m_s``: of the moving air, (g'·q·sin α/C)^⅓.
    """

    depth_m: NDArray[np.float32]
    discharge_m2_s: NDArray[np.float32]
    froude: NDArray[np.float32]
    speed_m_s: NDArray[np.float32]


class ColdLayer(NamedTuple):
    """The layer over a block at 90 m; NaN where unknown.

    ``level_m``: depth that the same night gives on endless level ground; ``level_most_m2_s``: the most that air of that
    depth can pass; ``rise_m``: height over the mean within 3 km, or as far as the known ground reaches all round, and
    at least a third of that; ``opened``, ``walled``: the night if the ground beyond the known one goes on as it ends,
    and if it turns back up there; ``deficit_k``: by how much the air of the layer is colder than that above; ``runs``:
    the two runs themselves.
    """

    ground: CoarseGround
    level_m: Field
    level_most_m2_s: Field
    rise_m: Field
    opened: Air
    walled: Air
    deficit_k: float
    runs: tuple[Night, Night]


def night_ground(
    elevation: Field, water: NDArray[np.bool_], settings: ColdLayerSettings, vertical_error_m: float = 0.0
) -> NightGround:
    """Average a window's ground and water to 90 m, with narrow ways through kept open.

    Parameters
    ----------
    elevation : Field, shape (rows, cols)
        Height on the lattice, cells of 5, 10, 30 or 90 m; water at its level. [m] NaN where unknown. Give 27 km of
        ground round the plots where there are data.
    water : bool array, shape (rows, cols)
        Sea and lakes: what reaches them is gone. See :func:`sitescreen.terrain.ground.open_to_cold_air`.
    settings : ColdLayerSettings
    vertical_error_m : float
        One standard deviation of the terrain's height; gorges count from three times that. [m]

    Raises
    ------
    GridError
        If the arrays are not on one grid of the lattice.
    """
    if water.shape != elevation.grid.shape:
        raise GridError(
            f"water of {water.shape} and ground of {elevation.grid.shape} on different grids were given",
            "one grid is needed",
            "Compute them from the same elevation field",
        )
    ground = coarse_ground(elevation, max(settings.gorge_depth_m, 3.0 * vertical_error_m), settings.section_m)
    wet_share = averaged(Field(water.astype(np.float32), elevation.grid, "1", "share of water"), ground.grid)
    return NightGround(ground, np.nan_to_num(wet_share, nan=0.0) >= 0.5, elevation.grid)


def cold_layer(
    night: NightGround,
    sky_view: Field | None,
    settings: ColdLayerSettings,
    source: Source | None = None,
    cover: Field | None = None,
) -> ColdLayer:
    """The layer at the end of a calm clear night over a block.

    Parameters
    ----------
    night : NightGround
    sky_view, cover : Field, optional
        Share of the open sky, 0–1, and how much cold air the ground cover makes, 1 for open ground; on the fine grid
        of the ground or a part of it. Where unknown or out of reach, 1.
    settings : ColdLayerSettings
    source : Source, optional
        The settings' own without it.

    Returns
    -------
    ColdLayer
        Where its two runs disagree is for :func:`sitescreen.climate.cold_kinds.cold_kinds` to say.

    Raises
    ------
    GridError
        If sky view or cover do not lie in the ground's grid.
    """
    ground, grid = night.ground, night.ground.grid
    source = source or Source(settings.heat_w_m2, settings.deficit_k)
    share = np.ones(grid.shape)
    for field in (sky_view, cover):
        if field is not None:
            if not _lies_in(field.grid, night.fine):
                raise GridError(
                    "ground, and sky view or cover, on different grids were given",
                    "one grid is needed, or a part of it",
                    "Compute them from the same elevation field",
                )
            share *= np.nan_to_num(averaged(field, grid), nan=1.0)
    open_supply = supply_m_s(source, np.where(np.isnan(ground.bed_m), 0.0, ground.bed_m))
    edges: tuple[Edge, Edge] = ("open", "walled")
    runs: dict[Edge, Night] = {}

    def run(first: int, stop: int) -> None:
        for edge in edges[first:stop]:
            runs[edge] = run_night(ground, night.wet, open_supply * share, source.deficit_k, edge, settings)

    in_bands(run, len(edges))
    level = level_depth_m(open_supply, settings)
    return layer_of(ground, (runs["open"], runs["walled"]), level, rise_m(ground, settings), source, settings)


def averaged(field: Field, grid: Grid) -> FloatArray:
    """Mean of a fine field in each cell of a coarse grid that covers it, NaN where less than half is known."""
    return block_means(on_coarse_edges(field, grid), round(grid.cell_size_m / field.grid.cell_size_m))


def _lies_in(part: Grid, whole: Grid) -> bool:
    """True for a window of the same cells."""
    west, south, east, north = part.bounds
    return (part.crs, part.cell_size_m) == (whole.crs, whole.cell_size_m) and (
        whole.bounds[0] <= west and whole.bounds[1] <= south and east <= whole.bounds[2] and north <= whole.bounds[3]
    )


def layer_of(
    ground: CoarseGround,
    runs: tuple[Night, Night],
    level: FloatArray,
    rise: Field,
    source: Source,
    settings: ColdLayerSettings,
) -> ColdLayer:
    """What two runs say of the layer; twice the same run where wider ground feeds its edge.

    Parameters
    ----------
    ground : CoarseGround
    runs : pair of Night
        With an open and a walled edge.
    level : array, shape (rows, cols)
        :func:`level_depth_m` of the source over open ground. [m]
    rise : Field
        :func:`rise_m`.
    source : Source
    settings : ColdLayerSettings
    """
    grid = ground.grid
    gravity = reduced_gravity_m_s2(source.deficit_k, settings)
    unknown = np.where(np.isnan(ground.bed_m), np.nan, 0.0)

    def field(values: FloatArray, unit: str, what: str) -> Field:
        return Field((values + unknown).astype(np.float32), grid, unit, what)

    air = _air(runs[0], ground, gravity, settings)
    most = CRITICAL * np.sqrt(gravity * level**3)
    return ColdLayer(
        ground=ground,
        level_m=field(level, "m", "depth of the night's cold air on level ground"),
        level_most_m2_s=field(most, "m²/s", "the most that level ground's air can pass"),
        rise_m=rise,
        opened=air,
        walled=air if runs[1] is runs[0] else _air(runs[1], ground, gravity, settings),
        deficit_k=source.deficit_k,
        runs=runs,
    )


def _air(run: Night, ground: CoarseGround, gravity: float, settings: ColdLayerSettings) -> Air:
    discharge = np.hypot(run.east_m2_s, run.north_m2_s)
    with np.errstate(invalid="ignore", divide="ignore"):
        froude = np.where(run.depth_m > 0.01, discharge / (run.depth_m * np.sqrt(gravity * run.depth_m)), 0.0)
    fall = _fall_along(ground.bed_m + run.depth_m, run.east_m2_s, run.north_m2_s, discharge, ground.grid)
    speed = flow_speed_m_s(discharge, fall, gravity, settings.friction)
    froude[np.isnan(run.depth_m)] = np.nan
    return Air(*(values.astype(np.float32) for values in (run.depth_m, discharge, froude, speed)))


def rise_m(ground: CoarseGround, settings: ColdLayerSettings) -> Field:
    """Height over the mean of the surroundings, smaller ones where the known ground ends nearer."""
    bed = Field(ground.bed_m.astype(np.float32), ground.grid, "m", "height at 90 m")
    mean = disc_mean(bed, settings.surroundings_m).values
    for share in (2.0 / 3.0, 1.0 / 3.0):
        mean = np.where(np.isnan(mean), disc_mean(bed, share * settings.surroundings_m).values, mean)
    return Field(bed.values - mean, ground.grid, "m", "height over the wider surroundings")


def _fall_along(top: FloatArray, east: FloatArray, north: FloatArray, discharge: FloatArray, grid: Grid) -> FloatArray:
    """Sine of the fall of the layer's surface in the direction of flow, 0 where it rises. [1]"""
    rows, cols = np.pad(top, ((1, 1), (0, 0)), mode="edge"), np.pad(top, ((0, 0), (1, 1)), mode="edge")
    up_north = (rows[:-2] - rows[2:]) / (2.0 * grid.cell_size_m)
    up_east = (cols[:, 2:] - cols[:, :-2]) / (2.0 * grid.cell_size_m)
    with np.errstate(invalid="ignore", divide="ignore"):
        fall = -np.where(discharge > 0, (up_east * east + up_north * north) / discharge, 0.0)
    fall = np.maximum(np.nan_to_num(fall, nan=0.0), 0.0)
    return np.asarray(fall / np.hypot(1.0, fall), dtype=np.float64)
