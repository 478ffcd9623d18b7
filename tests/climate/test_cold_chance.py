"""Nests: a small window fed by a wider run tells what the wider run tells, and draws are the same whoever asks."""

import numpy as np
import pytest

from sitescreen.climate.cold_air import closed_pools
from sitescreen.climate.cold_chance import Nest, WiderRun, drawn_night, drawn_source, nest, nest_bounds
from sitescreen.climate.cold_kinds import NONE, ColdKinds, cold_kinds
from sitescreen.climate.cold_layer import cold_layer, night_ground
from sitescreen.grid import Field, Grid
from sitescreen.settings import ColdChanceSettings, load_defaults
from sitescreen.terrain.hollows import hollows

SETTINGS = load_defaults()
CHANCE = SETTINGS.cold_chance
FLOW, AIR = SETTINGS.cold_layer, SETTINGS.cold_air
CORE = CHANCE.nest_core_m
WEST, SOUTH = 111 * CORE, -1111 * CORE
PART = (WEST, SOUTH, WEST + CORE, SOUTH + CORE)

OUT = 3600.0
CELLS = round((CORE + 2 * OUT) / 30.0)
GRID = Grid("EPSG:32637", WEST - OUT, SOUTH + CORE + OUT, 30.0, CELLS, CELLS)


def valley() -> Field:
    """A valley 9.9 km long that falls 0.6 % and passes a narrows 150 m wide, and a pan beside it."""
    y, x = np.mgrid[:CELLS, :CELLS] * 30.0
    middle = CELLS * 15.0
    height = 1500.0 - 0.006 * y + 60.0 * np.tanh(np.abs(x - middle) / 900.0) ** 2
    wall = 45.0 * np.exp(-(((y - middle - 900.0) / 200.0) ** 2))
    height += wall * np.clip((np.abs(x - middle) - 75.0) / 60.0, 0.0, 1.0)
    height -= 25.0 * np.exp(-((np.hypot(x - middle - 800.0, y - middle + 900.0) / 260.0) ** 4))
    return Field(height.astype(np.float32), GRID, "m", "valley")


@pytest.fixture(scope="module")
def wider() -> WiderRun:
    ground = valley()
    dry = np.zeros(GRID.shape, dtype=np.bool_)
    sky = Field(np.ones(GRID.shape, dtype=np.float32), GRID, "1", "open sky")
    night = night_ground(ground, dry, FLOW)
    level = Field(ground.values + hollows(ground).depth_m.values, GRID, "m", "filled")
    return WiderRun(ground, level, dry, sky, None, cold_layer(night, sky, FLOW), night.wet)


def cut(wider: WiderRun, error_m: float) -> Nest:
    return nest(nest_bounds(WEST + 1.0, SOUTH + 1.0, CHANCE), wider, error_m, 90.0)


def stated_night() -> ColdChanceSettings:
    """Draws in which the source is always the stated one."""
    same = {
        "heat_least_w_m2": FLOW.heat_w_m2,
        "heat_most_w_m2": FLOW.heat_w_m2,
        "deficit_least_k": FLOW.deficit_k,
        "deficit_most_k": FLOW.deficit_k,
    }
    return CHANCE.model_copy(update=same)


def of_the_run(wider: WiderRun) -> ColdKinds:
    """What the wider run itself says of the part, its edge open."""
    layer = wider.layer._replace(walled=wider.layer.opened)
    pools = closed_pools(hollows(wider.elevation), 0.0, AIR)
    part = pools._replace(depth_m=pools.depth_m.part(PART), cut=np.zeros((90, 90), dtype=np.bool_))
    return cold_kinds(layer, part, wider.elevation.part(PART), 0.0, FLOW, AIR.fill_scale_m)


def test_nest_without_an_error_tells_what_the_wider_run_tells(wider: WiderRun) -> None:
    """The last hour again, in a window, from scaled depths: cold or not the same on 97 % of the ground."""
    told = drawn_night(cut(wider, 0.0), PART, 20, 0, stated_night(), FLOW, AIR).kinds
    run = of_the_run(wider)
    cold = 6.0 * run.fill.values > 1.0
    assert 0.1 < cold.mean() < 0.9
    assert np.mean(cold == (6.0 * told.fill.values > 1.0)) > 0.97
    assert np.mean((told.kind == NONE) == (run.kind == NONE)) > 0.95
    closed = run.kind == 1
    # the hollows are flooded anew, from the same ground: the same to the bit
    np.testing.assert_array_equal(told.depth_m.values[closed], run.depth_m.values[closed])
    assert closed.sum() > 100


def test_without_an_error_and_with_the_stated_night_all_draws_are_one(wider: WiderRun) -> None:
    """σ = 0: no spread at all."""
    one = cut(wider, 0.0)
    first, second = (drawn_night(one, PART, 20, draw, stated_night(), FLOW, AIR).kinds for draw in (0, 1))
    np.testing.assert_array_equal(first.fill.values, second.fill.values)
    np.testing.assert_array_equal(first.depth_m.values, second.depth_m.values)


def test_each_draw_has_its_own_hollows_and_its_own_night(wider: WiderRun) -> None:
    """With an error the sills of the pan and the depth behind the narrows differ from draw to draw."""
    one = cut(wider, 2.5)
    nights = [drawn_night(one, PART, 20, draw, CHANCE, FLOW, AIR) for draw in range(4)]
    pan = [float(np.nanmax(night.hollows.depth_m.values)) for night in nights]
    behind = [float(np.nanmax(night.kinds.depth_m.values)) for night in nights]
    assert len(set(pan)) == len(set(behind)) == 4
    assert len({night.source for night in nights}) == 4


def test_a_part_says_the_same_as_the_whole(wider: WiderRun) -> None:
    """Asked about 900 m or about the core, the night is one."""
    one = cut(wider, 2.5)
    small = (WEST + 900.0, SOUTH + 900.0, WEST + 1800.0, SOUTH + 1800.0)
    whole = drawn_night(one, PART, 20, 3, CHANCE, FLOW, AIR).kinds
    part = drawn_night(one, small, 20, 3, CHANCE, FLOW, AIR).kinds
    np.testing.assert_array_equal(part.fill.values, whole.fill.part(small).values)


def test_edge_holds_what_lies_beyond_it(wider: WiderRun) -> None:
    """A hollow that the nest's edge cuts keeps the level that the wider run gives it, instead of draining there."""
    bounds = nest_bounds(WEST + 1.0, SOUTH + 1.0, CHANCE)
    y, x = np.mgrid[:CELLS, :CELLS] * 30.0
    edge_x = bounds[2] - GRID.west_m
    height = 1500.0 + 0.002 * x - 20.0 * np.exp(-((np.hypot(x - edge_x, y - 4950.0) / 500.0) ** 4))
    ground = Field(height.astype(np.float32), GRID, "m", "pan across the edge")
    pits = hollows(ground)
    level = Field(ground.values + pits.depth_m.values, GRID, "m", "filled")
    one = nest(bounds, wider._replace(elevation=ground, level_m=level), 0.0, 90.0)
    told = drawn_night(one, PART, 20, 0, stated_night(), FLOW, AIR).hollows.depth_m.values
    inside = GRID.part(bounds)[1]
    beside = pits.depth_m.values[inside][:, -2]
    assert beside.max() > 10.0
    np.testing.assert_array_equal(told[:, -2], beside)


def test_nests_lie_on_a_lattice_of_their_own() -> None:
    """Two places of one core share a nest; a place beyond it has the next; sides are whole cells of 90 m."""
    first = nest_bounds(10.0, -10.0, CHANCE)
    assert nest_bounds(CORE - 10.0, -CORE + 10.0, CHANCE) == first
    assert nest_bounds(CORE + 10.0, -10.0, CHANCE)[0] == first[0] + CORE
    assert all(side % 90.0 == 0.0 for side in first)
    assert 6000.0 <= first[2] - first[0] <= 8100.0


def test_sources_keep_their_limits_and_go_together() -> None:
    """Even between the stated limits, more heat with more deficit (rank correlation of the copula, 6/π·asin(ρ/2))."""
    drawn = np.array([drawn_source(3, draw, CHANCE) for draw in range(3000)])
    low, high = drawn.min(axis=0), drawn.max(axis=0)
    assert low == pytest.approx([20.0, 5.0], abs=0.1)
    assert high == pytest.approx([40.0, 10.0], abs=0.1)
    assert drawn.mean(axis=0) == pytest.approx([30.0, 7.5], rel=0.02)
    # the margins are even, so their correlation is that of the ranks
    expected = 6.0 / np.pi * np.arcsin(CHANCE.source_together / 2.0)
    assert np.corrcoef(drawn.T)[0, 1] == pytest.approx(expected, abs=0.04)
