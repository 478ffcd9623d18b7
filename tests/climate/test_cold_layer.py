"""The night's cold air as a layer in motion: level ground, basins, gaps, the ledger of air, edges."""

import math

import numpy as np
import pytest

from sitescreen.climate import cold_flow as module
from sitescreen.climate._cold_flow_kernel import night as kernel
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
    time_step_s,
)
from sitescreen.climate.cold_layer import ColdLayer, cold_layer, night_ground
from sitescreen.errors import GridError
from sitescreen.grid import Field, Grid
from sitescreen.settings import load_defaults
from sitescreen.terrain import threads
from sitescreen.terrain.coarse import CoarseGround, coarse_ground

SETTINGS = load_defaults().cold_layer
SOURCE = Source(SETTINGS.heat_w_m2, SETTINGS.deficit_k)
GRAVITY = reduced_gravity_m_s2(SOURCE.deficit_k, SETTINGS)


def _field(values: np.ndarray, cell_m: float = 90.0) -> Field:
    rows, cols = values.shape
    return Field(values, Grid("EPSG:32641", 0.0, rows * cell_m, cell_m, rows, cols), "m", "ground")


def _coarse(values: np.ndarray, cell_m: float = 90.0) -> CoarseGround:
    return coarse_ground(_field(values, cell_m), SETTINGS.gorge_depth_m, SETTINGS.section_m)


def _layer(values: np.ndarray) -> ColdLayer:
    """The layer over ground without water."""
    return cold_layer(night_ground(_field(values), _dry(values), SETTINGS), None, SETTINGS)


def _dry(values: np.ndarray) -> np.ndarray:
    return np.zeros(values.shape, dtype=bool)


def _hills(rows: int = 40, cols: int = 50) -> np.ndarray:
    y, x = np.mgrid[0:rows, 0:cols]
    return 300.0 + 90.0 * np.sin(x / 5.0) * np.cos(y / 7.0) + 2.0 * x


def _run(values: np.ndarray, edge: Edge = "open", hours: float = 1.0) -> Night:
    ground = _coarse(values)
    supply = supply_m_s(SOURCE, np.nan_to_num(ground.bed_m))
    return run_night(ground, _dry(values), supply, SOURCE.deficit_k, edge, SETTINGS, 3600.0 * hours)


@pytest.mark.parametrize(
    ("heat_w_m2", "deficit_k", "elevation_m", "m3_m2_h"),
    # q = 3600·Q_H/(ρ c_p ΔT), worked by hand at the standard atmosphere's density (1.225; 1.058 kg/m³ at 1,500 m)
    [(30.0, 9.0, 0.0, 9.75), (40.0, 10.0, 0.0, 11.70), (30.0, 8.0, 1500.0, 12.70)],
)
def test_supply_follows_from_the_heat(heat_w_m2: float, deficit_k: float, elevation_m: float, m3_m2_h: float) -> None:
    made = 3600.0 * supply_m_s(Source(heat_w_m2, deficit_k), np.array([elevation_m]))[0]
    assert made == pytest.approx(m3_m2_h, abs=0.006)


@pytest.mark.parametrize("window_km", [24, 48, 84])
@pytest.mark.parametrize("turned", [False, True])
def test_level_ground_is_the_reference(window_km: int, turned: bool) -> None:
    """A plain of 0.05 % slope, three cells wide (nothing crosses it): depth h_s(1 − e^(−q·t/h_s)), whatever the window.

    The depth itself is compared, not the clipped deficit. The walled edge piles air up and starves; it must not reach
    the middle.
    """
    cells = round(window_km * 1000 / 90)
    height = np.repeat(0.0005 * 90.0 * np.arange(cells)[None], 3, axis=0)
    height = height.T.copy() if turned else height
    layer = _layer(height)
    q = 3600.0 * 30.0 / (1.225 * 1005.0 * 8.0)
    level = 50.0 * (1.0 - math.exp(-q * 6.0 / 50.0))
    opened, walled = (run.depth_m.T if turned else run.depth_m for run in layer.runs)
    assert opened == pytest.approx(level, abs=0.1)  # the plain's own 42 m of rise thin the air a little
    assert walled[1, cells // 2] == pytest.approx(level, abs=1.0)


def test_level_depth_is_the_models_own() -> None:
    """The closed form and the model must not drift apart: flat, no slope, open."""
    height = np.full((4, 4), 1500.0)
    depth = _run(height, hours=SETTINGS.night_h).depth_m
    assert depth == pytest.approx(level_depth_m(supply_m_s(SOURCE, height), SETTINGS), abs=0.01)


def test_no_pool_on_a_mesa() -> None:
    y, x = np.mgrid[-40:41, -40:41] * 90.0
    height = 300.0 * (np.maximum(abs(x), abs(y)) < 1500.0) + 0.0
    layer = _layer(height)
    top = height == 300.0
    assert (layer.runs[0].depth_m[top] < layer.level_m.values[top].min()).all()
    assert (layer.rise_m.values[38:43, 38:43] > 100.0).all()


@pytest.mark.parametrize("first", [45, 46])
@pytest.mark.parametrize("gap_m", [30, 90, 300])
def test_head_behind_a_gap_is_the_published_weirs(gap_m: int, first: int) -> None:
    """Broad-crested weir, Q = (2/3)^1.5·B·√g'·H^1.5 (e.g. Chow 1959, Open-Channel Hydraulics; from memory).

    A flat basin at 30 m cells behind a wall of 270 m, supplied at a steady rate; beyond the gap the ground falls away.
    """
    cells, gap = 99, gap_m // 30
    height = np.full((cells, cells), 150.0)
    height[12:87, 12:57] = 0.0
    fall = np.maximum(np.arange(cells) - 60, 0) * 30.0 * 0.05
    height[first : first + gap, 57:66] = -fall[57:66]
    height[:, 66:] = -fall[66:]
    ground = _coarse(height, 30.0)
    basin = np.zeros(ground.grid.shape, dtype=bool)
    basin[4:29, 4:19] = True
    head = 20.0
    flow = 0.544 * gap_m * math.sqrt(GRAVITY) * head**1.5
    area = basin.sum() * 90.0**2
    sea = np.zeros_like(basin)
    sea[:, -2:] = True
    endless = SETTINGS.model_copy(update={"fill_m": 1e9})
    supply = np.where(basin, flow / area, 0.0)
    run = run_night(ground, sea, supply, SOURCE.deficit_k, "walled", endless, 4.0 * area * head / flow)
    assert run.depth_m[16, 6] == pytest.approx(head, rel=0.10)
    assert run.balance.error < 1e-6


def _askew_gap(angle_deg: float, gap_m: float, shift_m: float) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Ground at 30 m of a basin behind a wall of 270 m with a gap, turned; and how far each 90 m cell lies along it.

    Heights are means over each cell, as terrain models have them, from 10 m.
    """
    n, turn = 396, math.radians(angle_deg)
    row, col = (np.mgrid[0:n, 0:n] + 0.5 - n / 2) * 10.0
    along, across = col * math.cos(turn) - row * math.sin(turn), -col * math.sin(turn) - row * math.cos(turn) + shift_m
    height = np.full((n, n), 150.0)
    height[(along > -1300.0) & (along < -135.0) & (abs(across) < 1000.0)] = 0.0
    fall = -0.05 * np.maximum(along + 135.0, 0.0)
    open_ground = (along >= 135.0) | ((along >= -135.0) & (abs(across) < gap_m / 2))
    height[open_ground] = fall[open_ground]
    return (
        height.reshape(n // 3, 3, n // 3, 3).mean(axis=(1, 3)),
        along.reshape(n // 9, 9, n // 9, 9).mean(axis=(1, 3)),
        across.reshape(n // 9, 9, n // 9, 9).mean(axis=(1, 3)),
    )


@pytest.mark.parametrize("shift_m", [0.0, 30.0])
@pytest.mark.parametrize("angle_deg", [22.5, 45.0])
@pytest.mark.parametrize("gap_m", [90, 180, 300])
def test_head_behind_a_gap_that_runs_askew(gap_m: int, angle_deg: float, shift_m: float) -> None:
    """Within 15 % of the weir's for 180 and 300 m (straight gaps: 10 %).

    Askew the model passes up to √2 of the weir's most, since it holds each of two directions to it, and loses head to
    drag on a longer way. A gap of 90 m is three cells of a 30 m model, which cannot tell it from one a cell narrower or
    wider: its head lies between the heads of those, but for 5 % of drag.
    """
    height, along, across = _askew_gap(angle_deg, gap_m, shift_m)
    ground = _coarse(height, 30.0)
    basin = (along > -1250.0) & (along < -195.0) & (abs(across) < 950.0)
    head, area = 20.0, basin.sum() * 90.0**2
    flow = 0.544 * gap_m * math.sqrt(GRAVITY) * head**1.5
    endless = SETTINGS.model_copy(update={"fill_m": 1e9})
    supply = np.where(basin, flow / area, 0.0)
    run = run_night(ground, along > 900.0, supply, SOURCE.deficit_k, "walled", endless, 5.0 * area * head / flow)
    depth = run.depth_m[(along > -900.0) & (along < -500.0) & (abs(across) < 400.0)].mean()
    if gap_m > 90:
        assert depth == pytest.approx(head, rel=0.15)
    else:
        assert (
            head * (gap_m / (gap_m + 30.0)) ** (2.0 / 3.0)
            < depth
            < 1.05 * head * (gap_m / (gap_m - 30.0)) ** (2.0 / 3.0)
        )


def test_a_closed_bowl_fills_level() -> None:
    y, x = np.mgrid[-15:16, -15:16] * 90.0
    height = 100.0 + np.hypot(x, y) * 0.1
    run = _run(height, "walled", hours=6.0)
    top = height + run.depth_m
    wet = run.depth_m > 20.0
    assert wet.sum() > 100
    assert np.ptp(top[wet]) < 1.0
    assert run.balance.stored_m3 == pytest.approx(run.balance.supplied_m3, rel=1e-9)


@pytest.mark.parametrize("edge", ["open", "walled"])
def test_no_air_is_lost(edge: Edge) -> None:
    height = _hills()
    height[10:14, 20:30] = np.nan
    height[30:, :4] = np.nan
    ground = _coarse(height)
    sea = _dry(height)
    sea[:12, 40:] = True
    supply = supply_m_s(SOURCE, np.nan_to_num(ground.bed_m)) * 3.0
    run = run_night(ground, sea, supply, SOURCE.deficit_k, edge, SETTINGS)
    assert run.balance.error < 1e-6
    assert run.balance.supplied_m3 > 0
    assert run.balance.sunk_m3 > 0
    assert (run.balance.came_in_m3 != 0.0) == (edge == "open")
    # the ledger's store is the map's
    known = ~np.isnan(height)
    assert np.nansum(run.depth_m) * 90.0**2 == pytest.approx(run.balance.stored_m3, rel=1e-12)
    assert (np.isnan(run.depth_m) == ~known).all()
    assert (run.depth_m[known] >= 0.0).all()
    assert (run.depth_m[sea] == 0.0).all()


def test_a_tower_of_air_gives_no_more_than_it_holds() -> None:
    """180 m on one cell want to leave it over four sides in one step; what comes from unknown ground comes whole."""
    rows, cols = 5, 8
    bed = np.repeat(-2.0 * np.arange(cols)[None], rows, axis=0)
    bed[:, 3:] = -6.0
    depth, x, y = np.zeros((rows, cols)), np.zeros((rows, cols + 1)), np.zeros((rows + 1, cols))
    depth[2, 5], depth[2, 1] = 180.0, 10.0
    sill_x, sill_y = np.full(x.shape, np.inf), np.full(y.shape, np.inf)
    sill_x[:, 1:-1], sill_y[1:-1] = np.maximum(bed[:, 1:], bed[:, :-1]), np.maximum(bed[1:], bed[:-1])
    supply = np.zeros((rows, cols))
    supply[2, 0], sill_x[2, 1] = -2.0, np.inf
    edges = (np.array([0, 0, 0, 1, 1, 1]), np.array([1]), np.array([0]))
    came_in = kernel(depth, x, y, bed, sill_x, sill_y, np.ones(x.shape), np.ones(y.shape), supply, *edges, 1, 8.5,
                     90.0, GRAVITY, 0.02, 200.0, CRITICAL, 50.0, 1, np.zeros(cols), np.zeros(cols))  # fmt: skip
    assert depth[2, 5] == pytest.approx(0.0, abs=1e-12)
    assert depth[[1, 3, 2, 2], [5, 5, 4, 6]] == pytest.approx(45.0)
    assert came_in == x[2, 1] == x[2, 2] > 0.0
    assert depth.sum() == pytest.approx(190.0 + came_in, rel=1e-14)


def test_steady_flow_on_a_slope_is_drag_against_weight() -> None:
    """q² = g'·h³·s/C once neither depth nor flow changes: 24 h on 0.03 %, where the flow stays below critical."""
    height = np.repeat(-0.0003 * 90.0 * np.arange(12)[None], 3, axis=0)
    run = _run(height, hours=24.0)
    depth = run.depth_m[1, 6]
    assert depth > 0.95 * SETTINGS.fill_m
    steady = math.sqrt(GRAVITY * depth**3 * 0.0003 / SETTINGS.friction)
    assert run.east_m2_s[1, 6] == pytest.approx(steady, rel=0.02)


def test_speed_is_the_bulk_balance_of_a_drainage_layer() -> None:
    """Worked by hand: Δθ 5 K, θ 288 K, 10 m deep, sin α 0.1, C 0.02: 2.918 m/s; 3 K: 2.260 m/s."""
    for deficit_k, speed in ((5.0, 2.918), (3.0, 2.260)):
        gravity = 9.80665 * deficit_k / 288.0
        found = flow_speed_m_s(np.array([10.0 * speed]), np.array([0.1]), gravity, 0.02)
        assert found[0] == pytest.approx(speed, abs=0.002)


def test_threads_and_the_cache_change_nothing(monkeypatch: pytest.MonkeyPatch) -> None:
    height = _hills()
    results = []
    for processors, cache_bytes in ((1, 1_500_000), (2, 1_500_000), (2, 1)):
        monkeypatch.setattr(threads, "thread_count", lambda processors=processors: processors)
        monkeypatch.setattr(module, "CACHE_BYTES", cache_bytes)
        layer = _layer(height)
        results.append([part for run in layer.runs for part in run[:3]] + [*layer.opened, *layer.walled])
    for other in results[1:]:
        assert all(np.array_equal(a, b, equal_nan=True) for a, b in zip(results[0], other, strict=True))


def test_the_kernel_says_the_same_uncompiled() -> None:
    outcome = []
    for run in (kernel, kernel.py_func):
        rows, cols = 4, 5
        bed = 10.0 * np.random.default_rng(2).random((rows, cols))
        sill_x, sill_y = np.full((rows, cols + 1), np.inf), np.full((rows + 1, cols), np.inf)
        sill_x[:, 1:-1], sill_y[1:-1] = np.maximum(bed[:, 1:], bed[:, :-1]), np.maximum(bed[1:], bed[:-1])
        supply = np.full((rows, cols), 0.03)
        supply[0, 0], supply[3, 4] = -1.0, -2.0
        depth, x, y = np.zeros((rows, cols)), np.zeros((rows, cols + 1)), np.zeros((rows + 1, cols))
        supplied, sunk = np.zeros(cols), np.zeros(cols)
        edges = (np.array([0, 0, 1, 1, 2]), np.array([4, 0]), np.array([1, 3]))
        came_in = run(depth, x, y, bed, sill_x, sill_y, np.ones(x.shape), np.ones(y.shape), supply, *edges, 50, 8.5,
                      90.0, GRAVITY, 0.02, 200.0, CRITICAL, 50.0, 3, supplied, sunk)  # fmt: skip
        outcome.append((depth, x, y, supplied, sunk, came_in))
    for compiled, plain in zip(*outcome, strict=True):
        assert plain == pytest.approx(compiled, rel=1e-12, abs=1e-15)
    assert outcome[0][0].max() > 0.5


def test_turned_ground_gives_turned_air() -> None:
    height = _hills()
    run, turned = _run(height), _run(np.rot90(height).copy())
    assert np.rot90(run.depth_m) == pytest.approx(turned.depth_m, abs=1e-6)
    # a quarter turn counter-clockwise makes east of it north
    assert np.rot90(run.east_m2_s) == pytest.approx(turned.north_m2_s, abs=1e-6)


def test_flow_runs_downhill() -> None:
    rows, cols = np.mgrid[0:10, 0:30]
    run = _run(2000.0 - 5.0 * cols + 0.0 * rows)
    assert (run.east_m2_s > 0.0).all()
    assert run.north_m2_s == pytest.approx(0.0, abs=1e-9)


def test_the_time_step_is_the_bounds_own() -> None:
    """Neither a canyon in the window nor its size may change the step, or far ground would change a plot's reading."""
    flat, canyon = np.zeros((6, 40)), np.zeros((6, 40))
    canyon[:, 35:37] = -600.0
    assert _run(flat).step_s == _run(canyon).step_s == _run(flat[:, :20]).step_s
    assert time_step_s(GRAVITY, 90.0, SETTINGS) == pytest.approx(0.7 * 90.0 / math.sqrt(GRAVITY * 200.0))
    assert _run(flat).step_s <= time_step_s(GRAVITY, 90.0, SETTINGS)


def test_a_wall_of_unknown_ground_is_a_wall() -> None:
    height = _hills(12, 20)
    walled, unknown = height.copy(), height.copy()
    walled[:, 9], unknown[:, 9] = 5000.0, np.nan
    beside = np.ones(height.shape, dtype=bool)
    beside[:, 9] = False
    one, other = _run(walled, "walled"), _run(unknown, "walled")
    # up to what slides off the wall's own top
    assert one.depth_m[:, :9].max() > 1.0
    assert np.isnan(other.depth_m[:, 9]).all()
    assert not np.isnan(other.depth_m[beside]).any()
    only_left = _run(height[:, :9].copy(), "walled")
    assert np.array_equal(other.depth_m[:, :9], only_left.depth_m)


def test_the_two_edges_differ_at_the_foot_of_a_cut_slope() -> None:
    """There walled air piles up and open air runs off; at the head of the slope both agree."""
    height = np.repeat(500.0 - 2.7 * abs(np.arange(201) - 100.0)[None], 3, axis=0)
    layer = _layer(height)
    assert (layer.walled.depth_m[:, 0] > 2.0 * layer.opened.depth_m[:, 0]).all()
    assert layer.walled.depth_m[:, 80:121] == pytest.approx(layer.opened.depth_m[:, 80:121], abs=0.5)


def test_the_surroundings_shrink_toward_the_end_of_the_ground() -> None:
    """To a third, and never to a part of a disc: on a plane the rise is 0 wherever it is known."""
    row, col = np.mgrid[0:120, 0:120] * 90.0
    rise = _layer(1000.0 + 0.01 * row + 0.004 * col).rise_m.values
    known = np.isfinite(rise)
    # the disc's outermost cell is 11 cells away, at a radius of 1 km
    assert known[11:-11, 11:-11].all()
    assert not known[:11].any()
    assert abs(rise[known]).max() < 0.01
    hill = _layer(np.hypot(row - 5400.0, col - 5400.0) * -0.1 + 900.0).rise_m.values
    # a cone's mean within R lies 2/3 of R's fall below its top (by geometry)
    assert hill[60, 60] == pytest.approx(0.1 * 3000.0 * 2.0 / 3.0, rel=0.03)


def test_sky_and_water_reach_the_coarse_cells() -> None:
    height = np.zeros((30, 30))
    sea = np.zeros(height.shape, dtype=bool)
    sea[:, :9] = True
    half = Field(np.full(height.shape, 0.5), _field(height, 30.0).grid, "1", "sky view")
    ground = night_ground(_field(height, 30.0), sea, SETTINGS)
    layer, whole = cold_layer(ground, half, SETTINGS), cold_layer(ground, None, SETTINGS)
    assert layer.runs[1].balance.supplied_m3 < 0.7 * whole.runs[1].balance.supplied_m3
    part = cold_layer(ground, half.part((450.0, 0.0, 900.0, 900.0)), SETTINGS)
    assert layer.runs[1].balance.supplied_m3 < part.runs[1].balance.supplied_m3 < whole.runs[1].balance.supplied_m3
    assert (layer.runs[1].depth_m[:, :3] == 0.0).all()
    assert (layer.runs[1].depth_m[:, 3:] > 0.0).all()
    # what grows on the ground counts as the sky does, and both together
    covered = cold_layer(ground, None, SETTINGS, cover=half)
    assert covered.runs[1].balance == layer.runs[1].balance
    both = cold_layer(ground, half, SETTINGS, cover=half)
    assert both.runs[1].balance.supplied_m3 < 0.7 * layer.runs[1].balance.supplied_m3


def test_what_does_not_fit_is_refused() -> None:
    height = np.zeros((6, 6))
    with pytest.raises(GridError, match=r"\(6, 5\)"):
        run_night(_coarse(height), _dry(height)[:, :5], height, 8.0, "open", SETTINGS)
    with pytest.raises(GridError, match="supply"):
        run_night(_coarse(height), _dry(height), np.full((6, 6), np.nan), 8.0, "open", SETTINGS)
    with pytest.raises(GridError, match="different grids"):
        cold_layer(night_ground(_field(height), _dry(height), SETTINGS), _field(height, 30.0), SETTINGS)
    with pytest.raises(GridError, match=r"\(6, 5\)"):
        night_ground(_field(height), _dry(height)[:, :5], SETTINGS)
