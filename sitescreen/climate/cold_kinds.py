"""Which kind of cold air lies on each cell, how deep, and how much colder than level ground it is."""

from typing import Any, NamedTuple

import numpy as np
from numpy.typing import NDArray

from sitescreen.climate.cold_air import ClosedPools
from sitescreen.climate.cold_flow import HEAT_CAPACITY_J_KG_K, Source, air_density_kg_m3
from sitescreen.climate.cold_layer import Air, ColdLayer
from sitescreen.grid import Field, Grid
from sitescreen.settings import ColdLayerSettings

KINDS = ("none", "closed", "leaky", "moving", "unknown")
"""Words of the codes 0 to 4."""

NONE, CLOSED, LEAKY, MOVING, UNKNOWN = range(5)

LEVEL_WITHIN_M = 0.05
"""Ground so little below its surroundings is level with them: heights are whole sixteen-thousandths there. [m]"""

FloatArray = NDArray[np.float32]
BoolArray = NDArray[np.bool_]


class ColdKinds(NamedTuple):
    """On the fine grid.

    ``kind``: codes of :data:`KINDS`, uint8. ``depth_m``: below the sill where closed, of the layer where leaky or
    moving, 0 where none, NaN where unknown. ``fill``: share of the climate's full deficit that the air reaches under an
    open sky, 0–1, as :func:`fill_share` counts it; NaN where unknown. ``fill_least``, ``fill_most``: between what it
    lies there; the same as ``fill`` elsewhere, 0 and 1 on unknown ground. ``discharge_m2_s``, ``speed_m_s``: of the
    layer, in every kind; NaN where they depend on ground beyond the known.
    """

    kind: NDArray[np.uint8]
    depth_m: Field
    fill: Field
    fill_least: Field
    fill_most: Field
    discharge_m2_s: Field
    speed_m_s: Field


class _Told(NamedTuple):
    """What one run says of each 90 m cell: its kind, its excess if that counts, and whether the surroundings decide."""

    kind: NDArray[np.uint8]
    excess_m: FloatArray
    stands: FloatArray
    unsure: BoolArray


def cold_kinds(
    layer: ColdLayer,
    closed: ClosedPools,
    elevation: Field,
    least_excess_m: float,
    settings: ColdLayerSettings,
    fill_scale_m: float,
) -> ColdKinds:
    """Kind and depth of the cold air on each cell of the fine ground.

    Parameters
    ----------
    layer : ColdLayer
        At 90 m, from the same ground or more.
    closed : ClosedPools
        On the fine grid.
    elevation : Field, shape (rows, cols)
        The fine ground, or the part of it that is asked about. [m]
    least_excess_m : float
        Least depth above that on level ground that counts as a pool; give what the terrain's error allows to see, which
        is never less than the settings' own least. [m]
    settings : ColdLayerSettings
    fill_scale_m : float
        h0 of :func:`fill_share`. [m]

    Returns
    -------
    ColdKinds

    Notes
    -----
    A closed hollow is told from the fine ground, so it stays closed where the layer is unknown. Elsewhere air that is
    deeper than on level ground, on ground below its surroundings, is leaky where it stands and moving where it does
    not; its surface is level within a 90 m cell where it stands, so that fine cells differ in depth. Shallower air
    moves where more passes than air as deep as on level ground could: on a long open slope the layer slips downhill
    too, but that is no stream. Where air does not stand the fine depth is the layer's: a level surface would invent
    metres of air on the floors of V-shaped valleys.

    Unknown is what depends on ground beyond the known: where the run whose ground goes on as it ends, and the one whose
    ground turns up there, find a pool and no pool, or pools of different depth. Where both find none, none it is, even
    if they differ in what lies there.
    """
    grid, coarse = elevation.grid, layer.level_m.grid
    level, air, other = layer.level_m.values, layer.opened, layer.walled
    least = max(least_excess_m, settings.least_excess_m)
    told, denied = (_told(one, layer, least, settings) for one in (air, other))
    differs, flow_differs = _differ(layer, told, denied, settings)
    layer_unknown = np.isnan(air.depth_m) | told.unsure | denied.unsure | differs

    def fine(values: NDArray[Any]) -> NDArray[Any]:
        return on_fine(values, coarse, grid)

    def field(values: NDArray[Any], unit: str, what: str) -> Field:
        return Field(values.astype(np.float32, copy=False), grid, unit, what)

    nan, zero = np.float32(np.nan), np.float32(0.0)
    depth, leaky = fine(air.depth_m), fine(told.kind == LEAKY)
    top = fine((layer.ground.bed_m + air.depth_m).astype(np.float32))
    depth = np.where(leaky, np.maximum(top - elevation.values, zero), depth)
    in_hollow, unknown_fine = closed.depth_m.values > 0, fine(layer_unknown)
    with np.errstate(invalid="ignore"):
        excess = np.where(fine(told.excess_m > 0), depth - fine(level), zero)
        excess = np.where((excess > least) & ~unknown_fine, excess, zero)
    leaky &= excess > 0
    unknown = np.isnan(elevation.values) | (in_hollow & closed.cut) | (~in_hollow & unknown_fine)
    kind = np.select(
        [unknown, in_hollow, leaky, fine(told.kind == MOVING)],
        [np.uint8(UNKNOWN), np.uint8(CLOSED), np.uint8(LEAKY), np.uint8(MOVING)],
        np.uint8(NONE),
    ).astype(np.uint8)
    pool_depth = np.select([unknown, in_hollow, kind == NONE], [nan, closed.depth_m.values, zero], depth)
    fill = fill_share(np.where(in_hollow, closed.depth_m.values, zero), excess, fine(told.stands), fill_scale_m)
    # what either run would give, and all or nothing where not even that is known
    either = np.stack([fill_share(zero, one.excess_m, one.stands, fill_scale_m) for one in (told, denied)])
    beyond = np.isnan(air.depth_m) | told.unsure | denied.unsure
    lowest, highest = np.where(beyond, zero, either.min(axis=0)), np.where(np.isnan(air.depth_m), 1, either.max(axis=0))
    nothing_known = np.isnan(elevation.values) | (in_hollow & closed.cut)
    moved = np.where(flow_differs, nan, zero)
    return ColdKinds(
        kind,
        field(pool_depth, "m", "depth of the night's cold air where it stands or moves"),
        field(np.where(unknown, nan, fill), "1", "share of the climate's full cold that gathers"),
        field(np.where(unknown, np.where(nothing_known, 0, fine(lowest)), fill), "1", "the least it may be"),
        field(np.where(unknown, np.where(nothing_known, 1, fine(highest)), fill), "1", "the most it may be"),
        field(fine(air.discharge_m2_s + moved), "m²/s", "cold air that passes each metre of width"),
        field(fine(air.speed_m_s + moved), "m/s", "speed of the night air"),
    )


def _told(air: Air, layer: ColdLayer, least_m: float, settings: ColdLayerSettings) -> _Told:
    """What one run would say on its own."""
    rise = layer.rise_m.values
    with np.errstate(invalid="ignore"):
        more = air.depth_m - layer.level_m.values
        stagnant, much = air.froude < settings.stagnant_froude, more > least_m
        deeper = ~(rise > -LEVEL_WITHIN_M) & much
        streams = (
            ~stagnant
            & (air.speed_m_s >= settings.moving_speed_m_s)
            & (air.discharge_m2_s > settings.moving_share * layer.level_most_m2_s.values)
        )
        stands = np.clip((1.0 - air.froude) / (1.0 - settings.stagnant_froude), 0.0, 1.0)
    kind = np.where(deeper & stagnant, np.uint8(LEAKY), np.where(deeper | streams, np.uint8(MOVING), np.uint8(NONE)))
    # near the end of the known ground nobody can say whether so much air lies in a valley or on a plain
    return _Told(kind, np.where(deeper, more, np.float32(0.0)), stands.astype(np.float32), np.isnan(rise) & much)


def _differ(layer: ColdLayer, told: _Told, denied: _Told, settings: ColdLayerSettings) -> tuple[BoolArray, BoolArray]:
    """Where what the two runs say of the cold, and of the flow, is not the same within the settings' tolerance."""
    air, other, share = layer.opened, layer.walled, settings.edge_differ_share
    with np.errstate(invalid="ignore"):
        depth = abs(told.excess_m - denied.excess_m) > np.maximum(settings.edge_differ_m, share * air.depth_m)
        least_flow = settings.edge_differ_m * settings.moving_speed_m_s
        flow = abs(air.discharge_m2_s - other.discharge_m2_s) > np.maximum(least_flow, share * air.discharge_m2_s)
    return depth | (((told.kind == NONE) != (denied.kind == NONE)) & flow), flow


def fill_share(below_sill_m: Any, excess_m: Any, stands: Any, fill_scale_m: float) -> NDArray[np.float32]:
    """Share of the climate's full deficit that cold air reaches under an open sky, 1 − e^(−d/h0), 0–1.

    Parameters
    ----------
    below_sill_m : array
        Depth below the sill of a closed hollow, 0 outside. [m]
    excess_m : array
        How much deeper the layer's air is than on level ground, 0 where that counts for nothing. [m]
    stands : array
        How far the layer's air stands: 1 below the Froude number of standing air, 0 at critical flow. Air in motion
        counts less the faster it flows, since at critical flow (a Richardson number of 1) it begins to mix with the
        warmer air above (Ellison & Turner 1959, J. Fluid Mech. 6:423–448: from 0.8; from memory).
    fill_scale_m : float
        h0. [m]

    Returns
    -------
    float32 array
        The larger of what the hollow and what the layer gives.
    """
    scale = np.float32(fill_scale_m)
    held = -np.expm1(-excess_m / scale) * np.nan_to_num(stands)
    return np.asarray(np.maximum(-np.expm1(-below_sill_m / scale), held), dtype=np.float32)


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


def deficit_k(strength_k: Any, fill: Any, sky_view: Any, cap_k: Any) -> NDArray[np.float64]:
    """How much colder than over open level ground the air is on a calm clear night, ΔT·fill·sky view, to the cap. [K]

    Parameters
    ----------
    strength_k : array
        ΔT, the deficit of a deep pool under an open sky in that climate. [K]
    fill : array
        As :func:`fill_share` gives it.
    sky_view : array
        0–1; the most important terrain parameter for small basins (Whiteman et al. 2004, J. Appl. Meteor.
        43:1224–1236).
    cap_k : array
        :func:`heat_cap_k` in a closed hollow; the source's Δθ elsewhere. [K]

    Notes
    -----
    h0 = 15 m and the form are our closure. That a night is calm is part of the question, so the calm share of the wind
    counts in how many nights are so, not here.
    """
    deficit = np.asarray(strength_k, dtype=np.float64) * np.asarray(fill, dtype=np.float64) * np.asarray(sky_view)
    return np.asarray(np.minimum(deficit, cap_k), dtype=np.float64)
