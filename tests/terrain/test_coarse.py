"""Ground at 90 m: means on slopes, thalwegs kept in gorges, true widths."""

import numpy as np
import pytest

from sitescreen.errors import GridError
from sitescreen.grid import Field, Grid
from sitescreen.terrain.coarse import coarse_grid, coarse_ground

GORGE_M, SECTION_M = 6.0, 40.0


def _field(values: np.ndarray, cell_m: float = 30.0, west: float = 900.0, north: float = 1800.0) -> Field:
    rows, cols = values.shape
    return Field(values, Grid("EPSG:32641", west, north, cell_m, rows, cols), "m", "ground")


def _wall_with_gap(gap_cells: int, first: int, cells: int = 18) -> np.ndarray:
    """Level ground at 0 with a wall 100 m high over the middle six columns, and a gap through it."""
    height = np.zeros((cells, cells))
    height[:, 6:12] = 100.0
    height[first : first + gap_cells, 6:12] = 0.0
    return height


@pytest.mark.parametrize(("east", "north"), [(0.0, 0.0), (0.3, 0.0), (-0.2, 0.5), (0.05, -0.6)])
def test_an_even_slope_is_averaged_and_wide_open(east: float, north: float) -> None:
    rows, cols = np.mgrid[0:12, 0:15]
    ground = coarse_ground(_field(500.0 + 30.0 * (east * cols - north * rows)), GORGE_M, SECTION_M)
    centre = 500.0 + 30.0 * (east * (3 * np.arange(5) + 1)[None] - north * (3 * np.arange(4) + 1)[:, None])
    assert ground.bed_m == pytest.approx(centre, abs=1e-4)
    assert (ground.width_x == 1.0).all()
    assert (ground.width_y == 1.0).all()
    # the sill between two cells of a slope is the upper one's bed
    assert ground.sill_x_m[:, 1:-1] == pytest.approx(np.maximum(centre[:, 1:], centre[:, :-1]), abs=1e-4)


@pytest.mark.parametrize("gap_cells", [1, 3, 10])
@pytest.mark.parametrize("first", [3, 4, 5])
def test_a_gap_keeps_its_floor_and_its_width(gap_cells: int, first: int) -> None:
    """Wherever the gap lies against the coarse cells: 30, 90 or 300 m of section, all at the floor's height."""
    ground = coarse_ground(_field(_wall_with_gap(gap_cells, first)), GORGE_M, SECTION_M)
    for side in (2, 3, 4):
        open_ = ground.sill_x_m[:, side] < 1.0
        assert 90.0 * ground.width_x[open_, side].sum() == pytest.approx(30.0 * gap_cells)
        assert (ground.sill_x_m[~open_, side] > 60.0).all()


def test_a_gap_turned_by_a_quarter_is_the_same_gap() -> None:
    height = _wall_with_gap(1, 4)
    one, other = (coarse_ground(_field(z), GORGE_M, SECTION_M) for z in (height, height.T.copy()))
    assert (one.bed_m == other.bed_m.T).all()
    assert (one.sill_x_m == other.sill_y_m.T).all()
    assert (one.width_x == other.width_y.T).all()


@pytest.mark.parametrize("mirrored", [False, True])
def test_a_gorge_askew_stays_open(mirrored: bool) -> None:
    """One fine cell wide, corner to corner: a way along sides of coarse cells must lead through at the floor."""
    height = np.full((18, 18), 100.0)
    height[np.arange(18), np.arange(18)] = 0.0
    ground = coarse_ground(_field(height[:, ::-1].copy() if mirrored else height), GORGE_M, SECTION_M)
    bed = ground.bed_m[:, ::-1] if mirrored else ground.bed_m
    sill_x = ground.sill_x_m[:, ::-1] if mirrored else ground.sill_x_m
    for k in range(5):
        by_east = max(sill_x[k, k + 1], ground.sill_y_m[k + 1, 4 - k if mirrored else k + 1])
        by_south = max(ground.sill_y_m[k + 1, 5 - k if mirrored else k], sill_x[k + 1, k + 1])
        assert min(by_east, by_south) == 0.0
        assert bed[k, k] == 0.0


def test_noise_opens_no_gorge() -> None:
    noise = np.random.default_rng(1).normal(0.0, 1.5, (90, 90))
    ground = coarse_ground(_field(noise), GORGE_M, SECTION_M)
    assert (ground.width_x == 1.0).mean() > 0.999
    assert abs(ground.bed_m.mean()) < 0.3


def test_unknown_ground() -> None:
    height = np.zeros((9, 9))
    height[3:6, 3:6] = np.nan  # a whole coarse cell
    height[0:3, 0] = np.nan  # a third of another
    ground = coarse_ground(_field(height), GORGE_M, SECTION_M)
    assert np.isnan(ground.bed_m).sum() == 1
    assert np.isnan(ground.bed_m[1, 1])
    assert np.isinf(ground.sill_x_m[1, 1:3]).all()
    assert np.isinf(ground.sill_y_m[1:3, 1]).all()
    assert np.isinf(ground.sill_x_m[:, [0, -1]]).all()


def test_the_lattice_is_absolute() -> None:
    """A window that begins within a coarse cell is widened to whole ones."""
    grid = Grid("EPSG:32641", 930.0, -60.0, 30.0, 10, 10)
    assert coarse_grid(grid) == Grid("EPSG:32641", 900.0, 0.0, 90.0, 4, 4)
    ground = coarse_ground(Field(np.ones(grid.shape), grid, "m", ""), GORGE_M, SECTION_M)
    assert ground.bed_m.shape == (4, 4)
    assert np.isnan(ground.bed_m[0]).all()  # one of three rows known
    assert (ground.bed_m[1:] == 1.0).all()


@pytest.mark.parametrize("cell_m", [5.0, 10.0, 90.0])
def test_other_steps_of_the_ladder(cell_m: float) -> None:
    cells = round(720.0 / cell_m)
    rows, cols = np.mgrid[0:cells, 0:cells]
    ground = coarse_ground(_field(0.1 * cell_m * (cols - rows), cell_m), GORGE_M, SECTION_M)
    assert ground.grid.shape == (8, 8)
    assert np.diff(ground.bed_m, axis=1) == pytest.approx(9.0, abs=1e-3)


def test_a_cell_size_off_the_lattice_is_refused() -> None:
    with pytest.raises(GridError, match="25 m"):
        coarse_ground(_field(np.zeros((6, 6)), 25.0), GORGE_M, SECTION_M)
