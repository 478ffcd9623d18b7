"""Coverage: exact shares, means and the rule for partly known ground."""

import geopandas as gpd
import numpy as np
import pytest
from shapely.geometry import Point, box

from sitescreen.grid import Grid
from sitescreen.judgement.coverage import cover

GRID = Grid("EPSG:32641", 1000.0, -1000.0, 30.0, 40, 50)


def _cover(*shapes):  # type: ignore[no-untyped-def]
    return cover(gpd.GeoSeries(shapes, crs=GRID.crs), GRID)


def test_cells_add_up_to_the_plots_area() -> None:
    coverage = _cover(Point(1700, -1600).buffer(200), box(1015, -1060, 1045, -1030))
    assert coverage.cells * 900.0 == pytest.approx([Point(1700, -1600).buffer(200).area, 900.0], rel=1e-6)


def test_mean_of_a_plane_over_a_plot_is_the_plane_at_its_middle() -> None:
    plane = 0.1 * GRID.x_centres_m()[None, :] + 0.2 * GRID.y_centres_m()[:, None]
    mean = _cover(Point(1705, -1605).buffer(150)).mean(plane, 0.9)
    assert mean[0] == pytest.approx(0.1 * 1705 - 0.2 * 1605, abs=0.02)


def test_a_plot_smaller_than_a_cell_reads_that_cell() -> None:
    values = np.arange(2000.0).reshape(40, 50)
    assert _cover(box(1032, -1058, 1040, -1050)).mean(values, 0.9)[0] == values[1, 1]


def test_a_plot_with_too_little_known_ground_has_no_mean() -> None:
    values = np.ones((40, 50))
    values[:, :2] = np.nan
    coverage = _cover(box(1030, -1090, 1090, -1030), box(1060, -1090, 1120, -1030))
    assert coverage.mean(values, 0.9) == pytest.approx([np.nan, 1.0], nan_ok=True)
    assert coverage.known_share(values) == pytest.approx([0.5, 1.0])


def test_a_plot_off_the_grid_has_no_cells() -> None:
    coverage = _cover(box(-900, 900, -800, 1000), box(1030, -1090, 1090, -1030))
    assert coverage.cells.tolist() == [0.0, 4.0]
    assert np.isnan(coverage.mean(np.ones((40, 50)), 0.9)[0])
    assert np.isnan(coverage.largest(np.ones((40, 50)))[0])


def test_readings_of_a_plot_do_not_depend_on_the_other_plots() -> None:
    rng = np.random.default_rng(5)
    values = rng.normal(size=GRID.shape)
    shapes = [Point(*xy).buffer(80) for xy in rng.uniform([1100, -2100], [2400, -1100], (30, 2))]
    together = _cover(*shapes)
    alone = _cover(shapes[17])
    assert alone.mean(values, 0.9)[0] == together.mean(values, 0.9)[17]
    assert alone.largest(values)[0] == together.largest(values)[17]
    assert alone.cells[0] == together.cells[17]


def test_largest_ignores_cells_the_plot_only_brushes() -> None:
    values = np.zeros((40, 50))
    values[1, 3] = 9.0
    brushed = box(1030, -1060, 1095, -1030)  # reaches 5 m into column 3
    assert _cover(brushed).largest(values)[0] == 0.0
    assert _cover(box(1030, -1060, 1120, -1030)).largest(values)[0] == 9.0
