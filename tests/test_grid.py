"""Grid and Field."""

import numpy as np
import pytest

from sitescreen.errors import GridError
from sitescreen.grid import Field, Grid

GRID = Grid("EPSG:32637", west_m=300.0, north_m=-60.0, cell_size_m=30.0, rows=4, cols=5)


def test_bounds_are_the_outer_edges() -> None:
    """West, south, east, north of the cells' outer edges, also below the equator."""
    assert GRID.bounds == (300.0, -180.0, 450.0, -60.0)


def test_transform_maps_columns_and_rows_to_the_same_ground() -> None:
    """The affine transform and the centres agree: row 0 is the northernmost."""
    assert GRID.transform @ (0.5, 0.5) == (GRID.x_centres_m()[0], GRID.y_centres_m()[0])
    assert GRID.transform @ (4.5, 3.5) == (GRID.x_centres_m()[-1], GRID.y_centres_m()[-1])
    assert np.all(np.diff(GRID.y_centres_m()) == -30.0)


def test_every_cell_centre_falls_in_its_own_cell() -> None:
    x_m, y_m = np.meshgrid(GRID.x_centres_m(), GRID.y_centres_m())
    rows, cols = GRID.rows_cols(x_m.ravel(), y_m.ravel())
    assert np.array_equal(rows.reshape(GRID.shape), np.indices(GRID.shape)[0])
    assert np.array_equal(cols.reshape(GRID.shape), np.indices(GRID.shape)[1])


def test_points_outside_keep_their_index() -> None:
    """A point west and north of the grid has negative indices: no wrapping to the other side."""
    rows, cols = GRID.rows_cols(np.array([299.0, 451.0]), np.array([-59.0, -181.0]))
    assert rows.tolist() == [-1, 4]
    assert cols.tolist() == [-1, 5]


def test_part_keeps_the_cells_where_they_lie() -> None:
    field = Field(np.arange(20.0).reshape(4, 5), GRID, "m", "numbers")
    part = field.part((330.0, -150.0, 390.0, -90.0))
    assert part.grid.bounds == (330.0, -150.0, 390.0, -90.0)
    assert part.values.tolist() == [[6.0, 7.0], [11.0, 12.0]]


def test_part_is_clipped_by_the_grid() -> None:
    grid, window = GRID.part((0.0, -1000.0, 360.0, 1000.0))
    assert grid.bounds == (300.0, -180.0, 360.0, -60.0)
    assert window == (slice(0, 4), slice(0, 2))


@pytest.mark.parametrize("bounds", [(600.0, -180.0, 900.0, -60.0), (300.0, 0.0, 450.0, 90.0)])
def test_part_outside_is_refused(bounds: tuple[float, float, float, float]) -> None:
    with pytest.raises(GridError):
        GRID.part(bounds)


@pytest.mark.parametrize(("rows", "cols", "size"), [(0, 5, 30.0), (5, 0, 30.0), (5, 5, 0.0), (5, 5, float("nan"))])
def test_a_grid_without_cells_is_refused(rows: int, cols: int, size: float) -> None:
    with pytest.raises(GridError, match=r"0|nan"):
        Grid("EPSG:32637", 0.0, 0.0, size, rows, cols)


def test_field_is_read_only_and_leaves_the_array_writable() -> None:
    """Nobody can change a field by accident, and whoever made the array may go on with it."""
    values = np.zeros((4, 5), dtype=np.float32)
    field = Field(values, GRID, "m", "zeros")
    with pytest.raises(ValueError, match="read-only"):
        field.values[0, 0] = 1.0
    values[0, 0] = 1.0


def test_field_of_another_shape_is_refused() -> None:
    with pytest.raises(GridError, match=r"\(5, 4\)"):
        Field(np.zeros((5, 4)), GRID, "m", "turned")


def test_field_keeps_nan() -> None:
    values = np.full((4, 5), np.nan)
    values[1, 1] = 7.0
    assert np.isnan(Field(values, GRID, "m", "hole").values).sum() == 19
