"""Narrow gaps are closed from their rims; wide ones, arms of wide ones and the edge of the data stay open."""

import numpy as np
import pytest

from sitescreen.inputs.terrain_voids import REACH_CELLS, fill_narrow


def plane(n: int = 60) -> np.ndarray:
    row, col = np.indices((n, n))
    return (100.0 + 2.0 * row - 3.0 * col).astype(np.float32)


def with_hole(rows: slice, cols: slice, n: int = 60) -> np.ndarray:
    heights = plane(n)
    heights[rows, cols] = np.nan
    return heights


@pytest.mark.parametrize(
    ("rows", "cols"),
    [
        (slice(30, 31), slice(30, 31)),
        (slice(30, 33), slice(30, 33)),
        (slice(30, 33), slice(20, 40)),  # long and three wide
        (slice(20, 40), slice(30, 32)),
    ],
)
def test_gaps_up_to_three_cells_wide_are_closed(rows: slice, cols: slice) -> None:
    """A plane is interpolated exactly."""
    heights = with_hole(rows, cols)
    found, closed = fill_narrow(heights)
    assert found == pytest.approx(plane(), abs=1e-4)
    assert (closed == np.isnan(heights)).all()


def test_a_diagonal_crack_is_closed() -> None:
    heights = plane()
    for k in range(25, 35):
        heights[k, k : k + 2] = np.nan
    assert fill_narrow(heights)[0] == pytest.approx(plane(), abs=1e-4)


@pytest.mark.parametrize("side", [4, 5, 12])
def test_wider_gaps_stay_open_as_a_whole(side: int) -> None:
    """The rim of a wide gap is not patched inwards either."""
    heights = with_hole(slice(30, 30 + side), slice(30, 30 + side))
    found, closed = fill_narrow(heights)
    assert found.tobytes() == heights.tobytes()
    assert not closed.any()


def test_a_creek_of_a_wide_void_stays_open_near_it() -> None:
    """Sea as no-data, and a river mouth two cells wide: open for 16 cells, closed as a fault of the model beyond."""
    heights = plane(80)
    heights[:, :10] = np.nan
    heights[40:42, 10:50] = np.nan
    found, closed = fill_narrow(heights)
    assert np.isnan(found[:, :10]).all()
    assert np.isnan(found[40:42, 10:26]).all()
    assert closed[40:42, 26:50].all()
    assert found[40:42, 26:50] == pytest.approx(plane(80)[40:42, 26:50], abs=1e-4)


def test_the_edge_of_the_data_is_not_carried_on() -> None:
    heights = plane()
    heights[0:2, 20:40] = np.nan
    heights[30, 57:] = np.nan
    heights[58:, 5] = np.nan
    found, closed = fill_narrow(heights)
    assert not closed.any()
    assert np.isnan(found[0:2, 20:40]).all()


def test_known_heights_are_untouched_and_the_input_too() -> None:
    heights = with_hole(slice(30, 32), slice(30, 33))
    before = heights.copy()
    found, closed = fill_narrow(heights)
    assert heights.tobytes() == before.tobytes()
    assert (found[~closed] == before[~closed]).all()


def test_nothing_to_do_and_nothing_to_go_by() -> None:
    full = plane()
    assert fill_narrow(full)[0] is full
    empty = np.full((20, 20), np.nan, dtype=np.float32)
    assert np.isnan(fill_narrow(empty)[0]).all()


def test_values_lie_between_those_of_the_rim() -> None:
    """Nothing is extrapolated, on rough ground either."""
    rng = np.random.default_rng(11)
    heights = rng.uniform(0.0, 100.0, (200, 200)).astype(np.float32)
    heights[rng.random(heights.shape) < 0.2] = np.nan
    found, closed = fill_narrow(heights)
    assert closed.sum() > 1000
    assert found[closed].min() >= 0.0
    assert found[closed].max() <= 100.0


def test_a_window_with_its_reach_gives_what_the_whole_gives() -> None:
    """So that terrain may be read in pieces."""
    rng = np.random.default_rng(5)
    heights = rng.uniform(0.0, 100.0, (150, 150)).astype(np.float32)
    # blobs and cracks of all widths
    noise = rng.standard_normal((150, 150))
    smooth = sum(np.roll(np.roll(noise, i, 0), j, 1) for i in range(4) for j in range(4))
    heights[smooth > 6.0] = np.nan
    heights[70:72, :] = np.nan
    whole, closed = fill_narrow(heights)
    assert 0 < closed.sum() < np.isnan(heights).sum()
    for row, col in [(REACH_CELLS, REACH_CELLS), (40, 75), (60, 60), (71, 30)]:
        window = (slice(row - REACH_CELLS, row + 10 + REACH_CELLS), slice(col - REACH_CELLS, col + 10 + REACH_CELLS))
        inner = (slice(REACH_CELLS, -REACH_CELLS),) * 2
        found, here = fill_narrow(heights[window])
        assert found[inner].tobytes() == whole[row : row + 10, col : col + 10].tobytes()
        assert (here[inner] == closed[row : row + 10, col : col + 10]).all()
