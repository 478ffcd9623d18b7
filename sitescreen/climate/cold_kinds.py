"""Which kind of cold air lies on each cell, how deep, and how much colder than level ground it is."""

from typing import Any, NamedTuple

import numpy as np
from numpy.typing import NDArray

from sitescreen.climate.cold_air import ClosedPools
from sitescreen.climate.cold_layer import HEAT_CAPACITY_J_KG_K, ColdLayer, Source, air_density_kg_m3
from sitescreen.grid import Field, Grid
from sitescreen.settings import ColdLayerSettings

KINDS = ("none", "closed", "leaky", "moving", "unknown")
"""Words of the codes 0 to 4."""

NONE, CLOSED, LEAKY, MOVING, UNKNOWN = range(5)


class ColdKinds(NamedTuple):
    """On the fine grid.

    ``kind``: codes of :data:`KINDS`, uint8. ``depth_m``: below the sill where closed, of the layer where leaky or
    moving, 0 where none, NaN where unknown. ``excess_m``: how much deeper the layer is than on level ground, where that
    is more than the least and the ground lies below its surroundings, in closed hollows and moving air too; else 0; NaN
    where unknown. Air in motion is mixed with the air above, so there it overstates the cold. ``discharge_m2_s``,
    ``speed_m_s``: of the layer, in every kind; NaN where it is unknown.
    """

    kind: NDArray[np.uint8]
    depth_m: Field
    excess_m: Field
    discharge_m2_s: Field
    speed_m_s: Field


def cold_kinds(
    layer: ColdLayer, closed: ClosedPools, elevation: Field, least_excess_m: float, settings: ColdLayerSettings
) -> ColdKinds:
    """Kind and depth of the cold air on each cell of the fine ground.

    Parameters
    ----------
    layer : ColdLayer
        At 90 m, from the same ground.
    closed : ClosedPools
        On the fine grid.
    elevation : Field, shape (rows, cols)
        The fine ground. [m]
    least_excess_m : float
        Least depth above that on level ground that counts as a leaky pool; give what the terrain's error allows to
        see, which is never less than the settings' own least. [m]

    Returns
    -------
    ColdKinds

    Notes
    -----
    A closed hollow is told from the fine ground, so it stays closed where the layer is unknown. A leaky pool is
    stagnant, deeper than level ground, and below its surroundings; its surface is level within a 90 m cell, so that
    fine cells differ in depth. Air moves where more passes than air as deep as on level ground could: on a long open
    slope the layer slips downhill too, but that is no stream. Elsewhere the fine depth is the layer's: a level surface
    would invent metres of air on the floors of V-shaped valleys.
    """
    grid = elevation.grid
    coarse = layer.depth_m.grid
    depth, level = layer.depth_m.values, layer.level_m.values
    least = max(least_excess_m, settings.least_excess_m)
    with np.errstate(invalid="ignore"):
        stagnant = layer.froude.values < settings.stagnant_froude
        much = depth - level > least
        deeper = (layer.rise_m.values < 0) & much
        # near the end of the known ground nobody can say whether so much air lies in a valley or on a plain
        unsure = np.isnan(layer.rise_m.values) & much & stagnant
        moves = (
            ~stagnant
            & (layer.speed_m_s.values >= settings.moving_speed_m_s)
            & (layer.discharge_m2_s.values > settings.moving_share * layer.level_most_m2_s.values)
        )
    fine_depth = on_fine(depth, coarse, grid)
    fine_level = on_fine(level, coarse, grid)
    top = on_fine((layer.ground.bed_m + depth).astype(np.float32), coarse, grid)
    leaky = on_fine(deeper & stagnant, coarse, grid)
    fine_depth = np.where(leaky, np.maximum(top - elevation.values, np.float32(0.0)), fine_depth)
    with np.errstate(invalid="ignore"):
        leaky &= fine_depth - fine_level > least
        over = on_fine(deeper, coarse, grid) & (fine_depth - fine_level > least)
        in_hollow = closed.depth_m.values > 0
    layer_unknown = np.isnan(fine_depth) | on_fine(unsure, coarse, grid)
    unknown = np.isnan(elevation.values) | (in_hollow & closed.cut) | (~in_hollow & layer_unknown)
    kind = np.select(
        [unknown, in_hollow, leaky, on_fine(moves, coarse, grid)],
        [np.uint8(UNKNOWN), np.uint8(CLOSED), np.uint8(LEAKY), np.uint8(MOVING)],
        np.uint8(NONE),
    ).astype(np.uint8)
    pool_depth = np.select(
        [kind == UNKNOWN, kind == CLOSED, kind == NONE],
        [np.float32(np.nan), closed.depth_m.values, np.float32(0.0)],
        fine_depth,
    )
    excess = np.select([kind == UNKNOWN, over], [np.float32(np.nan), fine_depth - fine_level], np.float32(0.0))
    return ColdKinds(
        kind,
        Field(pool_depth.astype(np.float32), grid, "m", "depth of the night's cold air where it stands or moves"),
        Field(excess.astype(np.float32), grid, "m", "depth of cold air above that on level ground"),
        Field(on_fine(layer.discharge_m2_s.values, coarse, grid), grid, "m²/s", layer.discharge_m2_s.what),
        Field(on_fine(layer.speed_m_s.values, coarse, grid), grid, "m/s", layer.speed_m_s.what),
    )


def on_fine(values: NDArray[Any], coarse: Grid, fine: Grid) -> NDArray[Any]:
    """Values of coarse cells at each cell of a finer grid inside them."""
    per_cell = round(coarse.cell_size_m / fine.cell_size_m)
    row = round((coarse.north_m - fine.north_m) / fine.cell_size_m)
    col = round((fine.west_m - coarse.west_m) / fine.cell_size_m)
    return values[((np.arange(fine.rows) + row) // per_cell)[:, None], ((np.arange(fine.cols) + col) // per_cell)[None]]


def heat_cap_k(catchment_m2: Any, volume_m3: Any, elevation_m: Any, source: Source, night_h: float) -> Any:
    """The most that the heat drawn from a catchment's air in a night can cool its pool, Q_H·A·t/(ρ c_p V). [K]

    Held-back air of the layer needs no cap of this kind but Δθ itself: its volume was made with that deficit.
    """
    density = air_density_kg_m3(np.asarray(elevation_m, dtype=np.float64))
    heat_j = source.heat_w_m2 * np.asarray(catchment_m2, dtype=np.float64) * night_h * 3600.0
    return heat_j / (density * HEAT_CAPACITY_J_KG_K * np.maximum(np.asarray(volume_m3, dtype=np.float64), 1e-9))


def pool_deficit_k(
    depth_m: Any, strength_k: Any, sky_view: Any, calm_share: Any, cap_k: Any, fill_scale_m: float
) -> NDArray[np.float64]:
    """How much colder a pool is than open level ground, ΔT·(1 − e^(−d/h0))·sky view·calm share, at most the cap. [K]

    Parameters
    ----------
    depth_m : array
        Below the sill of a closed hollow; above the depth on level ground of a leaky pool (``excess_m``). [m]
    strength_k : array
        ΔT of the plot's climate. [K]
    sky_view, calm_share : array
        0–1.
    cap_k : array
        :func:`heat_cap_k` of a closed hollow; the source's Δθ for a leaky pool. [K]
    fill_scale_m : float
        h0. [m]
    """
    depth = np.maximum(np.asarray(depth_m, dtype=np.float64), 0.0)
    deficit = np.asarray(strength_k) * -np.expm1(-depth / fill_scale_m) * np.asarray(sky_view) * np.asarray(calm_share)
    return np.asarray(np.minimum(deficit, cap_k), dtype=np.float64)
