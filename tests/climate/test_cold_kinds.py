"""Kinds of cold air, their depth on the fine ground, and the deficit."""

import numpy as np
import pytest

from sitescreen.climate.cold_air import ClosedPools
from sitescreen.climate.cold_kinds import (
    CLOSED,
    KINDS,
    LEAKY,
    MOVING,
    NONE,
    UNKNOWN,
    ColdKinds,
    cold_kinds,
    deficit_k,
    fill_share,
    heat_cap_k,
    on_fine,
)
from sitescreen.climate.cold_layer import Air, ColdLayer, Source, cold_layer, night_ground
from sitescreen.grid import Field, Grid
from sitescreen.settings import load_defaults
from sitescreen.terrain.hollows import hollows

SETTINGS = load_defaults().cold_layer
SCALE_M = load_defaults().cold_air.fill_scale_m
GRID = Grid("EPSG:32641", 0.0, 330 * 30.0, 30.0, 330, 330)


INSIDE = (slice(144, 174), slice(159, 189))
"""Well within the basin, whole coarse cells."""


def _layer(ground: Field) -> ColdLayer:
    return cold_layer(night_ground(ground, np.zeros(ground.grid.shape, dtype=bool), SETTINGS), None, SETTINGS)


def _kinds(layer: ColdLayer, closed: ClosedPools, ground: Field, least_m: float = 1.0) -> ColdKinds:
    return cold_kinds(layer, closed, ground, least_m, SETTINGS, SCALE_M)


def _no_hollows(grid: Grid) -> ClosedPools:
    return ClosedPools(Field(np.zeros(grid.shape), grid, "m", ""), np.zeros(grid.shape, dtype=bool))


def _basin() -> np.ndarray:
    """A basin 2.1 km wide, its floor falling at 0.3 % to a gap of 90 m through its rim; beyond, ground falls at 6 %."""
    y, x = np.mgrid[164.5:-165.5:-1, -164.5:165.5:1] * 30.0
    away = np.maximum(abs(x), abs(y))
    floor = 300.0 - 0.003 * x
    height = np.where(away < 1050.0, floor, 310.0 + 0.15 * (away - 1050.0))
    height = np.where(away > 2000.0, 452.5 - 0.06 * (away - 2000.0), height)
    beyond = 300.0 - 0.003 * 1050.0 - 0.03 * (x - 1050.0) - 0.03 * np.maximum(x - 2000.0, 0.0)
    gap = (x > 1050.0) & (abs(y + 15.0) < 45.0)
    return np.where(gap | (x > 2000.0), beyond, height)


@pytest.fixture(scope="module")
def basin() -> tuple[Field, ColdLayer, ColdKinds]:
    ground = Field(_basin(), GRID, "m", "a basin behind a gap")
    layer = _layer(ground)
    return ground, layer, _kinds(layer, _no_hollows(GRID), ground)


def test_a_basin_behind_a_gap_is_leaky(basin: tuple[Field, ColdLayer, ColdKinds]) -> None:
    """No hollow in it, so flooding sees nothing; the layer stands deeper there than on level ground."""
    ground, layer, kinds = basin
    assert hollows(ground).depth_m.values[130:200, 130:200].max() < 0.01
    assert (kinds.kind[INSIDE] == LEAKY).all()
    excess = kinds.depth_m.values[INSIDE] - layer.level_m.values[50, 50]
    assert (excess > 5.0).all()
    assert kinds.fill.values[INSIDE] == pytest.approx(1.0 - np.exp(-excess / 15.0), abs=0.02)


def test_beside_the_basin_there_is_none(basin: tuple[Field, ColdLayer, ColdKinds]) -> None:
    kinds = basin[2]
    rim = (slice(98, 106), slice(110, 180))
    assert (kinds.kind[rim] == NONE).all()
    assert (kinds.fill.values[rim] == 0.0).all()
    assert (kinds.depth_m.values[rim] == 0.0).all()


def test_the_surface_of_a_leaky_pool_is_level_within_a_coarse_cell(
    basin: tuple[Field, ColdLayer, ColdKinds],
) -> None:
    ground, layer, kinds = basin
    top = (ground.values + kinds.depth_m.values)[INSIDE]
    assert np.ptp(top.reshape(10, 3, 10, 3), axis=(1, 3)).max() < 1e-3
    # and its volume is the layer's
    coarse = layer.opened.depth_m[48:58, 53:63]
    assert kinds.depth_m.values[INSIDE].mean() == pytest.approx(coarse.mean(), abs=0.05)


def test_near_the_end_of_the_ground_a_pool_is_unknown(basin: tuple[Field, ColdLayer, ColdKinds]) -> None:
    """Where the surroundings are unknown, nobody can say whether deep air is a pool or lies on a plain."""
    ground, layer, _ = basin
    nowhere = layer._replace(rise_m=Field(np.full(layer.rise_m.grid.shape, np.nan), layer.rise_m.grid, "m", ""))
    kinds = _kinds(nowhere, _no_hollows(GRID), ground)
    assert (kinds.kind[INSIDE] == UNKNOWN).all()
    assert np.isnan(kinds.fill.values[INSIDE]).all()
    # somewhere between none and what the pool would give
    assert (kinds.fill_least.values[INSIDE] == 0.0).all()
    assert kinds.fill_most.values[INSIDE] == pytest.approx(basin[2].fill.values[INSIDE], abs=0.1)
    assert (kinds.kind[98:106, 110:180] == NONE).all()


def test_closed_hollows_stay_closed_and_cut_ones_unknown(basin: tuple[Field, ColdLayer, ColdKinds]) -> None:
    ground, layer, _ = basin
    depth = np.zeros(GRID.shape)
    depth[150:154, 170:174] = 6.0
    depth[102:106, 120:124] = 4.0
    cut = np.zeros(GRID.shape, dtype=bool)
    cut[102:106, 120:124] = True
    kinds = _kinds(layer, ClosedPools(Field(depth, GRID, "m", ""), cut), ground)
    assert (kinds.kind[150:154, 170:174] == CLOSED).all()
    assert (kinds.depth_m.values[150:154, 170:174] == 6.0).all()
    # deeper in the layer than below its sill: the larger counts
    assert (kinds.fill.values[150:154, 170:174] >= basin[2].fill.values[150:154, 170:174]).all()
    assert (kinds.kind[102:106, 120:124] == UNKNOWN).all()
    assert np.isnan(kinds.depth_m.values[102:106, 120:124]).all()
    assert np.isnan(kinds.fill.values[102:106, 120:124]).all()
    assert (kinds.fill_least.values[102:106, 120:124] == 0.0).all()
    assert (kinds.fill_most.values[102:106, 120:124] == 1.0).all()


def _layer_of(depth: float, froude: float, speed: float, discharge: float, below: bool) -> ColdLayer:
    """A layer of one coarse cell repeated, with level ground at 38 m."""
    grid = Grid("EPSG:32641", 0.0, 180.0, 90.0, 2, 2)

    def field(value: float) -> Field:
        return Field(np.full(grid.shape, value), grid, "", "")

    flat = Field(np.full(grid.shape, 100.0), grid, "m", "")
    air = Air(*(np.full(grid.shape, one, dtype=np.float32) for one in (depth, discharge, froude, speed)))
    return _layer(flat)._replace(
        opened=air,
        walled=air,
        level_m=field(38.0),
        level_most_m2_s=field(66.0),
        rise_m=field(-10.0 if below else 10.0),
    )


@pytest.mark.parametrize(
    ("depth", "froude", "speed", "discharge", "below", "kind"),
    [
        (50.0, 0.1, 0.2, 5.0, True, "leaky"),
        (50.0, 0.1, 0.2, 5.0, False, "none"),  # not below its surroundings
        (38.5, 0.1, 0.2, 5.0, True, "none"),  # not deeper than on level ground
        (50.0, 0.3, 0.2, 5.0, True, "moving"),  # a pool that flows off, however slowly
        (50.0, 0.3, 0.2, 5.0, False, "none"),  # air that slips off a plain
        (50.0, 0.3, 1.5, 110.0, True, "moving"),
        (15.0, 0.4, 1.5, 110.0, False, "moving"),  # need not exceed level ground
        (15.0, 0.4, 0.9, 110.0, False, "none"),
        (15.0, 0.4, 1.5, 90.0, False, "none"),
        (np.nan, np.nan, np.nan, np.nan, True, "unknown"),
    ],
)
def test_kinds_are_told_apart(
    depth: float, froude: float, speed: float, discharge: float, below: bool, kind: str
) -> None:
    grid = Grid("EPSG:32641", 0.0, 180.0, 30.0, 6, 6)
    ground = Field(np.full(grid.shape, 100.0), grid, "m", "")
    layer = _layer_of(depth, froude, speed, discharge, below)
    kinds = _kinds(layer, _no_hollows(grid), ground)
    assert {KINDS[code] for code in np.unique(kinds.kind)} == {kind}


@pytest.mark.parametrize(("east", "south"), [(0.0005, 0.0), (0.005, 0.0), (0.03, 0.0), (0.02, 0.02)])
def test_air_of_an_open_plain_is_no_stream(east: float, south: float) -> None:
    """Whatever its slope and the way it falls: an endless plain is the reference, of no kind and without excess."""
    row, col = np.mgrid[0:210, 0:300] * 30.0
    height = 2000.0 - east * col - south * row
    grid = Grid("EPSG:32641", 0.0, 6300.0, 30.0, 210, 300)
    ground = Field(height, grid, "m", "a plain")
    layer = _layer(ground)
    kinds = _kinds(layer._replace(walled=layer.opened), _no_hollows(grid), ground)
    assert (kinds.kind == NONE).all()
    assert (kinds.fill.values == 0.0).all()


def test_moving_air_keeps_the_layers_depth() -> None:
    """A V-shaped valley's floor gets no metres of air that the layer does not have."""
    grid = Grid("EPSG:32641", 0.0, 180.0, 30.0, 6, 6)
    ground = Field(100.0 + 9.0 * abs(np.arange(6) - 2.5)[None] + np.zeros(grid.shape), grid, "m", "")
    kinds = _kinds(_layer_of(20.0, 0.5, 2.0, 120.0, True), _no_hollows(grid), ground)
    assert (kinds.kind == MOVING).all()
    assert (kinds.depth_m.values == 20.0).all()


def test_what_the_terrains_error_hides_is_no_leaky_pool() -> None:
    grid = Grid("EPSG:32641", 0.0, 180.0, 30.0, 6, 6)
    ground = Field(np.full(grid.shape, 100.0), grid, "m", "")
    layer = _layer_of(41.0, 0.1, 0.2, 5.0, True)
    assert (_kinds(layer, _no_hollows(grid), ground, 1.0).kind == LEAKY).all()
    assert (_kinds(layer, _no_hollows(grid), ground, 4.0).kind == NONE).all()


def test_coarse_values_lie_under_their_own_fine_cells() -> None:
    """A window that begins a fine cell inside a coarse one, and reaches less far than the coarse grid."""
    coarse = Grid("EPSG:32641", 900.0, 0.0, 90.0, 2, 2)
    fine = Grid("EPSG:32641", 930.0, -60.0, 30.0, 3, 4)
    spread = on_fine(np.array([[1, 2], [3, 4]]), coarse, fine)
    assert spread.tolist() == [[1, 1, 2, 2], [3, 3, 4, 4], [3, 3, 4, 4]]


@pytest.mark.parametrize(
    ("walled", "kind", "flow_known"),
    [
        ((50.0, 5.0, 0.1), "leaky", True),  # the same
        ((55.0, 6.0, 0.1), "leaky", True),  # within a fifth of the depth
        ((65.0, 5.0, 0.1), "unknown", True),  # a pool half as deep again
        ((30.0, 5.0, 0.1), "unknown", True),  # no pool
        ((50.0, 60.0, 0.4), "leaky", False),  # as deep, but flowing: the cold is known, the flow is not
    ],
)
def test_what_hangs_on_ground_beyond_is_unknown(
    walled: tuple[float, float, float], kind: str, flow_known: bool
) -> None:
    """Open: 50 m, 5 m²/s, Froude number 0.1, where level ground has 38 m."""
    grid = Grid("EPSG:32641", 0.0, 180.0, 30.0, 6, 6)
    ground = Field(np.full(grid.shape, 100.0), grid, "m", "")
    depth, discharge, froude = walled
    other = _layer_of(depth, froude, 0.2, discharge, True)
    layer = _layer_of(50.0, 0.1, 0.2, 5.0, True)._replace(walled=other.opened)
    kinds = _kinds(layer, _no_hollows(grid), ground)
    assert {KINDS[code] for code in np.unique(kinds.kind)} == {kind}
    assert np.isfinite(kinds.discharge_m2_s.values).all() == flow_known
    if kind == "unknown":
        ends = sorted(float(1.0 - np.exp(-max(one - 38.0, 0.0) / 15.0)) for one in (50.0, depth))
        assert np.unique(kinds.fill_least.values) == pytest.approx(ends[0], abs=1e-5)
        assert np.unique(kinds.fill_most.values) == pytest.approx(ends[1], abs=1e-5)


def test_where_neither_edge_makes_a_pool_there_is_none() -> None:
    """On a plain the air in the two runs differs near the edge, and is of no kind in both."""
    grid = Grid("EPSG:32641", 0.0, 180.0, 30.0, 6, 6)
    ground = Field(np.full(grid.shape, 100.0), grid, "m", "")
    layer = _layer_of(38.0, 0.3, 0.5, 60.0, False)._replace(walled=_layer_of(70.0, 0.1, 0.1, 5.0, False).opened)
    kinds = _kinds(layer, _no_hollows(grid), ground)
    assert (kinds.kind == NONE).all()
    assert (kinds.depth_m.values == 0.0).all()
    assert np.isnan(kinds.discharge_m2_s.values).all()


@pytest.mark.parametrize("window_km", [24, 48])
def test_no_cell_of_a_walled_plain_is_unknown(window_km: int) -> None:
    """A plain of 0.05 % slope, 3.3 km wide: none, and no deficit, to 1 km from where the ground ends.

    Nearer nobody knows what the ground lies below, and air that a wall there would hold back leaves it unknown.
    """
    cols = round(window_km * 1000 / 90)
    height = np.repeat(500.3 + 0.0005 * 90.0 * np.arange(cols)[None], 37, axis=0)
    ground = Field(height, Grid("EPSG:32641", 0.0, 37 * 90.0, 90.0, *height.shape), "m", "a plain")
    layer = _layer(ground)
    kinds = _kinds(layer, _no_hollows(ground.grid), ground)
    inner = (slice(11, -11), slice(11, -11))
    assert layer.walled.depth_m[inner].max() > 1.1 * layer.level_m.values.max()
    assert (kinds.kind[inner] == NONE).all()
    assert (kinds.fill.values[inner] == 0.0).all()


def test_deficit_and_its_caps() -> None:
    # ΔT·(1 − e^(−1)) of a pool one scale deep, under an open sky
    one = fill_share(np.array([15.0]), np.zeros(1), np.ones(1), 15.0)
    assert deficit_k(6.0, one, 1.0, np.inf) == pytest.approx(6.0 * 0.632121, abs=1e-5)
    assert deficit_k(6.0, one, 0.8, np.inf) == pytest.approx(0.8 * 6.0 * 0.632121, abs=1e-5)
    assert deficit_k(6.0, 1.0, 1.0, 2.0) == 2.0
    assert np.isnan(deficit_k(6.0, np.nan, 1.0, 8.0))


def test_flowing_air_counts_less_the_faster_it_flows() -> None:
    """Whole below a Froude number of 0.2, nothing at critical flow, half in the middle between."""
    shares = []
    for froude in (0.1, 0.2, 0.6, 1.0):
        grid = Grid("EPSG:32641", 0.0, 180.0, 30.0, 6, 6)
        ground = Field(np.full(grid.shape, 100.0), grid, "m", "")
        kinds = _kinds(_layer_of(53.0, froude, 0.5, 70.0, True), _no_hollows(grid), ground)
        shares.append(float(kinds.fill.values[0, 0]) / 0.632121)
    assert shares == pytest.approx([1.0, 1.0, 0.5, 0.0], abs=1e-4)


def test_heat_of_a_catchment_caps_its_pool() -> None:
    """30 W/m² over 6 h is 648 kJ/m²: with the standard 1.225 kg/m³ it cools 52.6 m of air by 10 K."""
    assert heat_cap_k(1e6, 52.634e6, 0.0, Source(30.0, 8.0), 6.0) == pytest.approx(10.0, rel=1e-4)
