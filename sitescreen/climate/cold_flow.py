"""One calm clear night of cold air in motion over known ground: the supply, the flow, and the ledger of the air."""

import math
from collections.abc import Callable
from typing import Literal, NamedTuple

import numpy as np
from numpy.typing import NDArray

from sitescreen.climate._cold_flow_kernel import night
from sitescreen.errors import GridError
from sitescreen.settings import ColdLayerSettings
from sitescreen.terrain.coarse import CoarseGround

GRAVITY_M_S2 = 9.80665
"""Standard gravity (3rd CGPM, 1901). [m/s²]"""

HEAT_CAPACITY_J_KG_K = 1005.0
"""Of dry air at constant pressure. [J/(kg K)]"""

CRITICAL = (2.0 / 3.0) ** 1.5
"""0.544: the most that passes over a sill is this × √g' × head^1.5 for each metre of width (broad-crested weir)."""

CACHE_BYTES = 1_500_000
"""Rows kept at work in the processor's cache. Speed only, never results. [bytes]"""

FloatArray = NDArray[np.float64]
Edge = Literal["open", "walled"]


class Source(NamedTuple):
    """What cools the air: drawn together in simulations, since a smaller deficit makes more air.

    ``heat_w_m2``: sensible heat taken from the air. [W/m²] ``deficit_k``: by how much the layer is colder than the air
    above. [K]
    """

    heat_w_m2: float
    deficit_k: float


class Balance(NamedTuple):
    """Where the air of one run went, all in m³: ``supplied`` + ``came_in`` over open edges = ``stored`` + ``sunk``."""

    supplied_m3: float
    came_in_m3: float
    stored_m3: float
    sunk_m3: float

    @property
    def error(self) -> float:
        """What is missing, as a share of what was supplied and came or went over the edges."""
        missing = self.supplied_m3 + self.came_in_m3 - self.stored_m3 - self.sunk_m3
        return abs(missing) / max(self.supplied_m3 + abs(self.came_in_m3), 1e-9)


class Night(NamedTuple):
    """One run, arrays of shape (rows, cols) at 90 m, NaN where the ground is unknown, 0 in water.

    ``depth_m`` at the end of the night; ``east_m2_s``, ``north_m2_s``: flux per metre of width, toward the grid's east
    and north, mean of a cell's two sides. ``step_s``, ``steps``: the time step and how many there were.
    """

    depth_m: FloatArray
    east_m2_s: FloatArray
    north_m2_s: FloatArray
    balance: Balance
    step_s: float
    steps: int


class Feed(NamedTuple):
    """What a run over wider ground says of the air in a window of it, arrays of the window's shape.

    ``start_m``: depth to begin with. [m] ``ring``: cells of land along the window's edge, whose depth is set to
    ``ring_m(seconds since the start)``, one value each in reading order, every ``every_s`` seconds.
    """

    start_m: FloatArray
    ring: NDArray[np.bool_]
    ring_m: Callable[[float], FloatArray]
    every_s: float


def air_density_kg_m3(elevation_m: FloatArray) -> FloatArray:
    """Density of the standard atmosphere (ICAO Doc 7488) at a height. [kg/m³]"""
    return np.asarray(1.225 * np.maximum(1.0 - 2.25577e-5 * elevation_m, 0.1) ** 4.2559, dtype=np.float64)


def supply_m_s(source: Source, elevation_m: FloatArray) -> FloatArray:
    """Depth of air that cools in a second over open level ground, Q_H / (ρ c_p Δθ). [m/s]"""
    return source.heat_w_m2 / (air_density_kg_m3(elevation_m) * HEAT_CAPACITY_J_KG_K * source.deficit_k)


def level_depth_m(supply: FloatArray, settings: ColdLayerSettings, hours: float | None = None) -> FloatArray:
    """Depth on endless level ground at the end of the night, or after so many hours, h_s·(1 − e^(−q·t/h_s)). [m]"""
    hours = settings.night_h if hours is None else hours
    return settings.fill_m * -np.expm1(-supply * hours * 3600.0 / settings.fill_m)


def reduced_gravity_m_s2(deficit_k: float, settings: ColdLayerSettings) -> float:
    """Gravity that drives the layer, g' = g·Δθ/θ. [m/s²]"""
    return GRAVITY_M_S2 * deficit_k / settings.temperature_k


def flow_speed_m_s(discharge_m2_s: FloatArray, fall: FloatArray, gravity: float, friction: float) -> FloatArray:
    """Speed at which drag balances the weight of air that falls with a slope's sine, (g'·q·sin α/C)^⅓. [m/s]

    With q = u·h it is the bulk balance of a drainage layer, u² = g'·h·sin α/C (as in Manins & Sawford 1979, J. Atmos.
    Sci. 36:619–630; from memory). The flow's own speed is held down by the limit of critical flow.
    """
    return np.asarray(np.cbrt(gravity * discharge_m2_s * fall / friction), dtype=np.float64)


def time_step_s(gravity: float, cell_m: float, settings: ColdLayerSettings) -> float:
    """The longest step for waves on a layer as deep as the stated bound; never from the ground of the day. [s]"""
    return settings.step_share * cell_m / math.sqrt(gravity * settings.depth_bound_m)


def run_night(
    ground: CoarseGround,
    water: NDArray[np.bool_],
    supply: FloatArray,
    deficit_k: float,
    edge: Edge,
    settings: ColdLayerSettings,
    seconds: float | None = None,
    feed: Feed | None = None,
) -> Night:
    """One night over one ground, on one processor (it releases the interpreter, so several may run side by side).

    Parameters
    ----------
    ground : CoarseGround
    water : bool array, shape (rows, cols)
        Sea and lakes: whatever reaches them is gone.
    supply : array, shape (rows, cols)
        Air that cools, by :func:`supply_m_s` times sky view and cover. [m/s]
    deficit_k : float
        Δθ. [K]
    edge : "open" or "walled"
        Beyond the known ground depth and flow go on as they are at its edge; or nothing passes.
    seconds : float, optional
        Length of the run; the night of the settings without it. [s]
    feed : Feed, optional
        What a run over wider ground says of the air here; this run then begins with it instead of with none.

    Returns
    -------
    Night

    Raises
    ------
    GridError
        If an array is not on the ground's grid.

    Notes
    -----
    Depth-averaged flow without advection (after Bates, Horritt & Fewtrell 2010, J. Hydrol. 387:33–45, their eq. 11)
    with reduced gravity, quadratic drag, flux never above critical, and outflow of a cell cut to what it holds. The
    cooling of each cell falls linearly with depth to none at ``fill_m``. All in float64.
    """
    grid = ground.grid
    if water.shape != grid.shape or supply.shape != grid.shape:
        raise GridError(
            f"water of {water.shape} and supply of {supply.shape} were given for ground of {grid.shape}",
            "one value a cell is needed",
            "Build them on the coarse grid of the ground",
        )
    known = ~np.isnan(ground.bed_m)
    gravity = reduced_gravity_m_s2(deficit_k, settings)
    length = settings.night_h * 3600.0 if seconds is None else seconds
    steps = math.ceil(length / time_step_s(gravity, grid.cell_size_m, settings) - 1e-9)
    step = length / steps
    land = known & ~water
    depth = np.zeros(grid.shape) if feed is None else np.where(land, feed.start_m, 0.0)
    flux_x, flux_y = np.zeros((grid.rows, grid.cols + 1)), np.zeros((grid.rows + 1, grid.cols))
    supply_m = np.where(water & known, -1.0, np.where(known, supply * step, -2.0))
    if np.isnan(supply_m).any():
        raise GridError(
            "the supply of cold air is unknown over known ground",
            "a supply for each known cell is needed",
            "Fill gaps of the sky view with 1 first",
        )
    supplied, sunk = np.zeros(grid.cols), np.zeros(grid.cols)
    at_once = max(1, min(8, (CACHE_BYTES // (72 * grid.cols) - 3) // 2))
    arguments = (
        np.where(known, ground.bed_m, 0.0),
        ground.sill_x_m,
        ground.sill_y_m,
        ground.width_x,
        ground.width_y,
        supply_m,
        *_open_edges(land if edge == "open" else np.zeros_like(known), known),
    )
    came_in, done = float(np.sum(depth)), 0
    while done < steps:
        count = steps - done
        if feed is not None:
            count = min(count, max(1, round(feed.every_s / step)))
            told = feed.ring_m(done * step)
            came_in += float(np.sum(told) - np.sum(depth[feed.ring]))
            depth[feed.ring] = told
        came_in += night(
            depth,
            flux_x,
            flux_y,
            *arguments,
            count,
            step,
            grid.cell_size_m,
            gravity,
            settings.friction,
            settings.depth_bound_m,
            CRITICAL,
            settings.fill_m,
            at_once,
            supplied,
            sunk,
        )
        done += count
    area = grid.cell_size_m**2
    balance = Balance(*(float(np.sum(one)) * area for one in (supplied, came_in, depth, sunk)))
    per_second = grid.cell_size_m / step
    x, y = flux_x * per_second, flux_y * per_second
    unknown = np.where(known, 0.0, np.nan)
    return Night(
        depth + unknown,
        0.5 * (x[:, :-1] + x[:, 1:]) + unknown,
        -0.5 * (y[:-1] + y[1:]) + unknown,
        balance,
        step,
        steps,
    )


def _open_edges(
    inside: NDArray[np.bool_], known: NDArray[np.bool_]
) -> tuple[NDArray[np.int64], NDArray[np.int64], NDArray[np.int64]]:
    """Sides of known land that look on unknown ground or out of the grid: where each row's begin, column, side."""
    wide = np.pad(known, 1)
    beyond = (wide[1:-1, :-2], wide[1:-1, 2:], wide[:-2, 1:-1], wide[2:, 1:-1])
    found = [np.nonzero(inside & ~there) for there in beyond]
    row = np.concatenate([rows for rows, _ in found])
    col = np.concatenate([cols for _, cols in found])
    side = np.repeat(np.arange(4), [len(rows) for rows, _ in found])
    order = np.lexsort((col, side, row))
    first = np.searchsorted(row[order], np.arange(known.shape[0] + 1))
    return first.astype(np.int64), col[order].astype(np.int64), side[order].astype(np.int64)
