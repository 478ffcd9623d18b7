"""Flow directions, catchments, channels: total in = total out, known ways, levels that drain."""

import numpy as np
from hypothesis import given, settings
from hypothesis import strategies as st
from hypothesis.extra.numpy import arrays

from sitescreen.grid import Field, Grid
from sitescreen.terrain import _drainage_kernel as kernel
from sitescreen.terrain.drainage import (
    LEAVES,
    UNKNOWN,
    catchment_cells,
    channels,
    drainage,
    filled,
    height_above_channel_m,
)
from sitescreen.terrain.hollows import hollows

small_ground = arrays(
    np.float32, st.tuples(st.integers(3, 9), st.integers(3, 9)), elements=st.integers(0, 6).map(float)
)


def field(values: object, cell_size_m: float = 30.0) -> Field:
    array = np.asarray(values, dtype=np.float32)
    return Field(array, Grid("EPSG:32637", 0.0, 0.0, cell_size_m, *array.shape), "m", "test ground")


def valley() -> np.ndarray:
    """A V-shaped valley that falls southward: 7 columns, the channel in the middle one."""
    x = np.abs(np.arange(7) - 3)
    y = np.arange(9)[:, None]
    return (x * 10.0 + (8 - y) * 1.0).astype(np.float32)


def test_valley_gathers_its_sides() -> None:
    """Every inner cell runs straight to the middle, where each row adds its five cells; then all runs south."""
    drained = drainage(field(valley()))
    cells = catchment_cells(drained)
    assert (drained.direction[1:-1, 1:3] == 5).all()  # east: 10 m a cell; south-east only 11 m in 1.41
    assert (drained.direction[1:-1, 4:6] == 3).all()
    assert (drained.direction[1:-1, 3] == 7).all()
    assert (drained.direction[0] == LEAVES).all()
    assert cells[1:8, 3].tolist() == [5, 10, 15, 20, 25, 30, 35]
    assert cells[drained.direction == LEAVES].sum() == 63


@settings(max_examples=60, deadline=None)
@given(small_ground, st.integers(0, 2**32 - 1))
def test_total_in_is_total_out(values: np.ndarray, seed: int) -> None:
    """Every known cell's water leaves somewhere, whatever the plateaus, hollows, holes and outlets."""
    random = np.random.default_rng(seed)
    values = values.copy()
    values[random.random(values.shape) < 0.08] = np.nan
    outlets = random.random(values.shape) < 0.08
    drained = drainage(field(values), outlets)
    cells = catchment_cells(drained)
    known = ~np.isnan(values)
    assert cells[drained.direction == LEAVES].sum() == known.sum()
    assert (cells[~known] == 0).all()
    assert ((drained.direction == UNKNOWN) == ~known).all()
    # no way leads uphill on the filled surface
    for row, col in np.argwhere((drained.direction != LEAVES) & known):
        code = int(drained.direction[row, col])
        assert drained.level_m[row + code // 3 - 1, col + code % 3 - 1] <= drained.level_m[row, col]


@settings(max_examples=40, deadline=None)
@given(small_ground)
def test_catchments_of_pools_add_up(values: np.ndarray) -> None:
    """Cells that rest in a pool, and cells that reach the rim without one, are all cells: by walking each way."""
    f = field(values)
    drained, found = drainage(f), hollows(f)
    counts = np.zeros(len(found.pools.sill_m) + 1, dtype=int)
    for row, col in np.ndindex(values.shape):
        r, c = row, col
        while found.pool_id[r, c] == 0 and drained.direction[r, c] != LEAVES:
            code = int(drained.direction[r, c])
            r, c = r + code // 3 - 1, c + code % 3 - 1
        counts[found.pool_id[r, c]] += 1
    np.testing.assert_array_equal(found.pools.catchment_cells, counts[1:])


def test_height_above_channel_follows_the_way_down() -> None:
    """0 in the channel, and the fall along the way elsewhere; unknown where the way meets none."""
    f = field(valley())
    drained = drainage(f)
    channel = np.zeros(f.grid.shape, dtype=bool)
    channel[:, 3] = True
    height = height_above_channel_m(f, drained, channel).values
    assert (height[:, 3] == 0).all()
    assert height[2, 1:6].tolist() == [20.0, 10.0, 0.0, 10.0, 20.0]
    assert np.isnan(height[0, 0])


def test_channels_need_their_catchment() -> None:
    """0.009 km² is ten cells of 30 m."""
    f = field(valley())
    cells = catchment_cells(drainage(f))
    assert (channels(f, cells, 0.009) == (cells >= 10)).all()
    assert channels(f, cells, 0.009).any()


def test_kernels_agree_with_their_python_forms() -> None:
    """Compiled and interpreted give the same ways and counts, plateaus and a hole included."""
    values = np.round(np.random.default_rng(9).normal(0, 2, (12, 13))).astype(np.float32)
    values[6, 6] = np.nan
    level, kind = filled(Field(values, Grid("EPSG:32637", 0.0, 0.0, 30.0, 12, 13), "m", "test ground"))
    results = []
    for form in (lambda f: f, lambda f: f.py_func):
        direction = np.empty(values.shape, dtype=np.uint8)
        cells = np.empty(values.shape, dtype=np.int32)
        height = np.empty(values.shape, dtype=np.float32)
        form(kernel.steepest_ways)(level, kind, direction, 0, 12)
        order = form(kernel.flat_ways)(level, direction)
        inflows = np.empty(values.shape, dtype=np.uint8)
        form(kernel.count_inflows)(direction, inflows, 0, 12)
        counted = inflows.copy()
        form(kernel.accumulate)(direction, inflows, cells)
        form(kernel.heights_above_channel)(values, direction, cells > 8, height)
        results.append((direction, order, counted, cells, height))
    for compiled, plain in zip(*results, strict=True):
        np.testing.assert_array_equal(compiled, plain)
    assert len(results[0][1]) > 0
