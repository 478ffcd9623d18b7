"""Closed hollows: the toy ground, scikit-image cell for cell, what flooding must always keep, cut pools."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from hypothesis.extra.numpy import arrays

from sitescreen.errors import GridError
from sitescreen.grid import Field, Grid
from sitescreen.terrain import _hollows_kernel as kernel
from sitescreen.terrain.drainage import filled
from sitescreen.terrain.hollows import hollows

# a 2-pit and a 3-pit with a saddle at 6 between them, a sill at 8 to the south-east
TOY = np.array(
    [
        [9, 9, 9, 9, 9, 9, 9],
        [9, 5, 5, 5, 9, 4, 9],
        [9, 5, 2, 5, 6, 3, 9],
        [9, 5, 5, 5, 9, 4, 9],
        [9, 9, 9, 9, 9, 8, 9],
        [9, 9, 9, 9, 9, 7, 9],
    ],
    dtype=np.float32,
)
small_ground = arrays(
    np.float32, st.tuples(st.integers(3, 9), st.integers(3, 9)), elements=st.integers(0, 6).map(float)
)


def field(values: object, cell_size_m: float = 1.0) -> Field:
    array = np.asarray(values, dtype=np.float32)
    return Field(array, Grid("EPSG:32637", 0.0, 0.0, cell_size_m, *array.shape), "m", "test ground")


def by_relaxation(values: np.ndarray, outlets: np.ndarray) -> np.ndarray:
    """The filled surface by lowering an endless flood until nothing moves: slow, and nothing like the kernel."""
    padded = np.pad(values.astype(np.float64), 1, constant_values=np.nan)
    unknown = np.isnan(padded)
    beside = np.zeros_like(unknown)
    for dy in (-1, 0, 1):
        for dx in (-1, 0, 1):
            beside |= np.roll(unknown, (dy, dx), axis=(0, 1))
    fixed = (beside | np.pad(outlets, 1)) & ~unknown
    level = np.where(fixed, padded, np.inf)
    while True:
        lowest = np.min([np.roll(level, (dy, dx), axis=(0, 1)) for dy in (-1, 0, 1) for dx in (-1, 0, 1)], axis=0)
        new = np.where(fixed, padded, np.maximum(padded, lowest))
        new[unknown] = np.inf
        if (new == level).all():
            return np.where(unknown, np.nan, level)[1:-1, 1:-1]
        level = new


def test_toy_ground_fills_to_its_sill() -> None:
    """Both pits and the saddle stand at 8: volume 45, depth 6 at the 2-pit, one pool of 13 cells, spilling south."""
    got = hollows(field(TOY))
    pools = got.pools
    assert pools.sill_m.tolist() == [8.0]
    assert pools.deepest_m.tolist() == [6.0]
    assert pools.cells.tolist() == [13]
    assert pools.volume_m3.tolist() == [45.0]
    assert (pools.sill_row[0], pools.sill_col[0]) == (4, 5)
    assert got.depth_m.values.sum() == 45.0
    assert got.depth_m.values.max() == got.depth_m.values[2, 2] == 6.0
    assert ((got.pool_id == 1) == (got.depth_m.values > 0)).all()
    # the sill at 8 is the pool's neighbour; its water leaves at 7, one metre lower, over the rim
    assert pools.exit_drop_m.tolist() == [1.0]


@pytest.mark.parametrize(
    ("outlet", "sills", "volumes"),
    [
        # the 3-pit is a lake: the 2-pit spills to it over the saddle at 6, leaf volume 12 below it
        ((2, 5), [6.0], [12.0]),
        # the 2-pit is a lake: leaf volume 7 below the saddle
        ((2, 2), [6.0], [7.0]),
    ],
)
def test_leaf_pools_of_the_toy_ground(outlet: tuple[int, int], sills: list[float], volumes: list[float]) -> None:
    """With an outlet in the other pit each leaf fills to the saddle alone, and is certain: it ends in an outlet."""
    lake = np.zeros(TOY.shape, dtype=bool)
    lake[outlet] = True
    pools = hollows(field(TOY), lake).pools
    filled_there = pools.volume_m3 > 0
    assert pools.sill_m[filled_there].tolist() == sills
    # the outlet's own cell is full: cells round it drain into it, so only the other pit is under water
    assert pools.volume_m3.sum() == pytest.approx(sum(volumes))
    assert not pools.cut.any()
    assert np.isinf(pools.exit_drop_m).all()


def test_lower_sill_of_the_toy_ground() -> None:
    """The 8-sill cut to 7: level 7, volume 45 − 13 = 32."""
    ground = TOY.copy()
    ground[4, 5] = 7
    pools = hollows(field(ground)).pools
    assert pools.sill_m.tolist() == [7.0]
    assert pools.volume_m3.tolist() == [32.0]


def test_volume_is_in_cubic_metres() -> None:
    """A cell of 30 m counts 900 m²."""
    assert hollows(field(TOY, cell_size_m=30.0)).pools.volume_m3.tolist() == [45.0 * 900.0]


@pytest.mark.parametrize("seed", range(6))
def test_filled_surface_is_scikit_images(seed: int) -> None:
    """Morphological reconstruction by erosion (Vincent 1993) is the same surface: equal in every cell."""
    from scipy.ndimage import gaussian_filter
    from skimage.morphology import reconstruction

    noise = np.random.default_rng(seed).standard_normal((70, 80))
    values = (gaussian_filter(noise, seed % 3) * 50).astype(np.float32)
    if seed % 2:
        values = np.round(values)  # whole metres make plateaus and ties
    seeds = np.full_like(values, values.max())
    for rim in (np.s_[0, :], np.s_[-1, :], np.s_[:, 0], np.s_[:, -1]):
        seeds[rim] = values[rim]
    theirs = reconstruction(seeds, values, method="erosion", footprint=np.ones((3, 3)))
    np.testing.assert_array_equal(filled(field(values))[0], theirs)


@settings(max_examples=60, deadline=None)
@given(small_ground, st.integers(0, 2**32 - 1))
def test_flood_is_the_lowest_draining_surface(values: np.ndarray, seed: int) -> None:
    """With outlets and holes anywhere: equal to a relaxation by brute force, never under the ground, itself full."""
    random = np.random.default_rng(seed)
    values = values.copy()
    values[random.random(values.shape) < 0.05] = np.nan
    outlets = random.random(values.shape) < 0.05
    level, _ = filled(field(values), outlets)
    np.testing.assert_array_equal(level, by_relaxation(values, outlets))
    known = ~np.isnan(values)
    assert (level[known] >= values[known]).all()
    np.testing.assert_array_equal(filled(field(level), outlets)[0], level)


@settings(max_examples=40, deadline=None)
@given(small_ground, st.integers(0, 7))
def test_flood_does_not_know_the_order(values: np.ndarray, turn: int) -> None:
    """Turn and mirror the map: depths, pool sizes, volumes and sills come along."""

    def turned(array: np.ndarray) -> np.ndarray:
        array = np.rot90(array, turn % 4)
        return np.ascontiguousarray(array[:, ::-1] if turn > 3 else array)

    plain, other = hollows(field(values)), hollows(field(turned(values)))
    np.testing.assert_array_equal(other.depth_m.values, turned(plain.depth_m.values))
    for name in ("sill_m", "deepest_m", "cells", "volume_m3"):
        np.testing.assert_array_equal(np.sort(getattr(other.pools, name)), np.sort(getattr(plain.pools, name)))


@settings(max_examples=60, deadline=None)
@given(small_ground)
def test_pools_are_consistent(values: np.ndarray) -> None:
    """Sills lie beside their pool at its level and outside it; a pool has one level; catchments hold their pools."""
    got = hollows(field(values))
    level = values + got.depth_m.values
    for pool in range(1, len(got.pools.sill_m) + 1):
        inside = got.pool_id == pool
        sill = got.pools.sill_m[pool - 1]
        assert (level[inside] == sill).all()
        row, col = got.pools.sill_row[pool - 1], got.pools.sill_col[pool - 1]
        assert values[row, col] == sill
        assert not inside[row, col]
        assert inside[max(row - 1, 0) : row + 2, max(col - 1, 0) : col + 2].any()
        assert got.pools.catchment_cells[pool - 1] >= got.pools.cells[pool - 1] == inside.sum()
    assert got.pools.catchment_cells.sum() <= values.size
    assert got.pool_id.max(initial=0) == len(got.pools.sill_m)
    assert ((got.pool_id > 0) == (got.depth_m.values > 0)).all()


def test_catchments_split_the_ground() -> None:
    """Two bowls side by side and a ridge between: each catches its own side, the rim keeps its own cells."""
    profile = np.array([9, 7, 4, 7, 8, 6, 3, 6, 9], dtype=np.float32)
    ground = np.vstack([np.full((1, 9), 9), np.tile(profile, (3, 1)), np.full((1, 9), 9)])
    pools = hollows(field(ground)).pools
    # the ridge of 8s is the sill between the bowls; both stand at 8, then drain on to the rim at 9: one pool
    assert pools.sill_m.tolist() == [9.0]
    assert pools.catchment_cells.tolist() == [21]
    ground[0, 2] = 5  # a notch drains the western bowl to 5
    pools = hollows(field(ground)).pools
    assert pools.sill_m.tolist() == [8.0, 5.0] or pools.sill_m.tolist() == [5.0, 8.0]
    west, east = np.argsort(pools.sill_m)
    assert pools.cells[west] == 3
    assert pools.cells[east] == 9
    # the east keeps its nine cells; the ridge's three fall away to the west, whose steeper side they face
    assert pools.catchment_cells[east] == 9
    assert pools.catchment_cells[west] == 12


def test_a_pool_at_the_rim_is_cut_and_one_with_a_fall_behind_it_is_not() -> None:
    """The sill is the rim itself: beyond it higher ground might stand. Behind a sill 3 m of fall make it safe."""
    ground = np.full((7, 9), 50.0, dtype=np.float32)
    ground[3, 1:3] = 40.0
    ground[3, 0] = 44.0  # the pit spills west straight off the data
    ground[3, 5] = 40.0
    ground[3, 6] = 45.0  # the other spills east and falls on to the rim, 3 m lower
    ground[3, 7] = 43.0
    ground[3, 8] = 42.0
    pools = hollows(field(ground)).pools
    assert pools.sill_m.tolist() == [44.0, 45.0]
    assert pools.exit_drop_m.tolist() == [0.0, 3.0]
    assert pools.cut.tolist() == [True, False]


def test_a_pool_that_spills_into_a_cut_one_shares_its_way_out() -> None:
    """An upper pool's overflow ends where the lower one's does: it is cut only if its own sill is as low."""
    ground = np.full((5, 10), 50.0, dtype=np.float32)
    ground[2, 0:9] = [44, 40, 44.5, 40, 48, 30, 49, 50, 50]
    pools = hollows(field(ground)).pools
    assert pools.sill_m.tolist() == [44.0, 44.5, 48.0]
    assert pools.exit_drop_m.tolist() == [0.0, 0.5, 4.0]
    assert pools.cut.tolist() == [True, True, False]


def test_unknown_ground_lets_water_out_and_unknown_sea_is_an_outlet() -> None:
    """A hole in the data drains the pit beside it, which is then cut; the same hole mapped as sea is a true outlet."""
    ground = np.full((7, 7), 9.0, dtype=np.float32)
    ground[3, 2] = 1.0
    ground[3, 3] = 4.0
    ground[3, 4] = np.nan
    got = hollows(field(ground))
    assert np.isnan(got.depth_m.values[3, 4])
    assert got.pools.sill_m.tolist() == [4.0]
    assert got.pools.cut.tolist() == [True]
    sea = np.isnan(ground)
    assert hollows(field(ground), sea).pools.cut.tolist() == [False]


def test_ground_without_hollows_has_no_pools() -> None:
    """A plane: nothing under water, empty tables, nothing cut."""
    got = hollows(field(np.arange(30.0).reshape(5, 6)))
    assert len(got.pools.sill_m) == 0
    assert (got.depth_m.values == 0).all()


def test_all_unknown_and_single_cells() -> None:
    """Nothing known: nothing found. One row of ground: all rim."""
    assert np.isnan(hollows(field(np.full((4, 4), np.nan))).depth_m.values).all()
    assert (hollows(field([[3.0, 1.0, 3.0]])).depth_m.values == 0).all()


def test_refuses_outlets_of_another_grid() -> None:
    """Both shapes are named."""
    with pytest.raises(GridError, match=r"\(2, 2\) were given for ground of \(6, 7\)"):
        hollows(field(TOY), np.zeros((2, 2), dtype=bool))


def test_fill_agrees_with_its_python_form() -> None:
    """Compiled and interpreted give the same bits, kinds, levels and labels alike."""
    values = np.round(np.random.default_rng(8).normal(0, 9, (14, 13))).astype(np.float32)
    values[5, 5] = np.nan
    outlets = np.zeros(values.shape, dtype=bool)
    outlets[9, 4] = True
    results = []
    for form in (lambda f: f, lambda f: f.py_func):
        kind = np.empty(values.shape, dtype=np.uint8)
        level = np.empty(values.shape, dtype=np.float32)
        pool = np.empty(values.shape, dtype=np.int32)
        form(kernel.cell_kinds)(values, outlets, kind, 0, 14)
        state = np.empty(values.shape, dtype=np.uint8)
        form(kernel.drained_levels)(values, kind, level, 0, 14)
        form(kernel.sweep_levels)(values, level)
        form(kernel.open_cells)(values, kind, level, state, 0, 14)
        form(kernel.flood_open_cells)(values, level, state, np.count_nonzero(state))
        pools = form(kernel.label_pools)(values, level, pool)
        figures = [np.zeros(pools + 1) for _ in range(2)] + [np.zeros(pools + 1, dtype=np.int64), np.zeros(pools + 1)]
        form(kernel.pool_figures)(values, level, pool, *figures)
        results.append([kind, level, pool, *figures])
    for compiled, plain in zip(*results, strict=True):
        np.testing.assert_array_equal(compiled, plain)
