"""Hours of sun in a year for every cell, against the exact sun of plots."""

from collections.abc import Callable

import numpy as np
import pytest
from pyproj import Transformer

from sitescreen.climate._sun_field_kernel import add_hours
from sitescreen.climate.plot_sun import PlotSkies, monthly_sun
from sitescreen.climate.seasons import seasons_without_normals
from sitescreen.climate.sun_field import SunField, hours_above
from sitescreen.climate.sun_path import DAYS_IN_MONTH, sun_paths
from sitescreen.grid import Field, Grid
from sitescreen.lattice import block_of, convergence_deg
from sitescreen.settings import load_defaults
from sitescreen.terrain.horizon import horizon_stream
from sitescreen.terrain.plot_skyline import plot_skylines

SUN = load_defaults().sun
EVERY = np.arange(36) * 10.0


def exact_h(skyline: np.ndarray, lon: np.ndarray, lat: np.ndarray, clear: np.ndarray | None = None) -> np.ndarray:
    """Hours of a year at single places, by the way of plots."""
    count = len(lon)
    suns = PlotSkies(
        np.broadcast_to(skyline, (count, 72)).astype(np.float32),
        sun_paths(lon, lat, np.full(count, 50.0), SUN),
        seasons_without_normals(lat),
        clear,
        np.ones(count),
        np.tile([0.0, 0.0, 1.0], (count, 1)),
    )
    return monthly_sun(suns, SUN).hours @ DAYS_IN_MONTH


def small_grid(lon: float, lat: float, cells: int = 8) -> tuple[object, Grid]:
    block = block_of(lon, lat, 30.0)
    x, y = Transformer.from_crs("EPSG:4326", block.crs, always_xy=True).transform(lon, lat)
    return block, Grid(block.crs, round(x / 30) * 30.0, round(y / 30) * 30.0, 30.0, cells, cells)


@pytest.mark.parametrize("lat", [0.3, -18.0])
@pytest.mark.parametrize("horizon_deg", [0.0, 7.0, 25.0])
def test_an_even_horizon_leaves_the_hours_that_plots_have(lat: float, horizon_deg: float) -> None:
    block, grid = small_grid(37.2, lat)
    sun = SunField(block, grid, EVERY, SUN)
    tangent = np.full(grid.shape, np.tan(np.radians(horizon_deg)), dtype=np.float32)
    for azimuth in EVERY:
        sun(azimuth, tangent)
    found = sun.hours(Field(np.zeros(grid.shape, dtype=np.float32), grid, "m", "")).values
    expected = exact_h(np.full(72, horizon_deg), np.array([37.2]), np.array([lat]))
    # the sun of a 0.1° cell, of sea level, and linear between the edges of 135 km
    assert found == pytest.approx(np.full(grid.shape, expected[0]), rel=4e-3)


def test_hills_leave_the_hours_that_plots_have() -> None:
    """Real horizons from 36 directions against exact ones: within 3 % at the worst plot, 0.5 % in all."""
    block, grid = small_grid(37.2, -2.0, 240)
    row, col = np.mgrid[:240, :240]
    heights = 400.0 * np.sin(row / 25.0) * np.cos(col / 31.0) + 150.0 * np.sin(col / 9.0)
    field = Field(heights.astype(np.float32), grid, "m", "")
    sun = SunField(block, grid, EVERY, SUN)
    horizon_stream(field, EVERY, [sun])
    found = sun.hours(field)
    at = np.arange(50, 190, 20)
    rows, cols = (one.ravel() for one in np.meshgrid(at, at))
    x, y = grid.x_centres_m()[cols], grid.y_centres_m()[rows]
    lon, lat = Transformer.from_crs(grid.crs, "EPSG:4326", always_xy=True).transform(x, y)
    expected = exact_h(plot_skylines(field, lon, lat, 0.0, 30_000.0).height_deg, lon, lat)
    off = found.values[rows, cols] / expected - 1.0
    assert expected.min() < 0.85 * expected.max()
    assert abs(off.mean()) < 0.005
    assert np.abs(off).max() < 0.03


def test_true_north_is_kept_3_degrees_off_the_central_meridian_at_20_degrees() -> None:
    """Grid north points 1° east of true north there: tables turned back by it are those of an unturned grid."""
    turn = convergence_deg("EPSG:32637", np.array([42.0]), np.array([20.0]))[0]
    straight = hours_above(42.0, 20.0, 0.0, np.arange(360) * 1.0, SUN)
    turned = hours_above(42.0, 20.0, turn, np.arange(360) * 1.0, SUN)
    assert turn == pytest.approx(1.03, abs=0.01)
    # the morning's sun below 20°, which stands between 60° and 130° all the year
    low = [(table[:, 0] - table[:, 273])[:180] for table in (straight, turned)]
    middle = [(one * np.arange(180)).sum() / one.sum() for one in low]
    assert middle[0] - middle[1] == pytest.approx(turn, abs=0.02)


def test_clouds_of_the_morning_count_in_the_east_only() -> None:
    clear = np.tile([0.5, 1.0], (12, 1))
    cloudy, bright = (hours_above(37.0, 0.0, 0.0, EVERY, SUN, one) for one in (clear, None))
    assert cloudy[9, 0] == pytest.approx(0.5 * bright[9, 0])
    assert cloudy[27, 0] == pytest.approx(bright[27, 0])
    total = bright[:, 0].sum()
    assert total == pytest.approx(365 * 12.08, rel=5e-3)  # 12 h, and 0.57° of refraction at either end
    assert (np.diff(bright, axis=1) <= 1e-3).all()
    assert (bright[:, -1] == 0).all()


def test_unknown_ground_has_no_hours_and_hides_nothing() -> None:
    block, grid = small_grid(37.2, 0.3, 4)
    sun = SunField(block, grid, EVERY, SUN)
    tangent = np.zeros(grid.shape, dtype=np.float32)
    tangent[1, 1] = np.nan
    heights = np.zeros(grid.shape, dtype=np.float32)
    heights[0, 0] = np.nan
    for azimuth in EVERY:
        sun(azimuth, tangent)
    found = sun.hours(Field(heights, grid, "m", "")).values
    assert np.isnan(found[0, 0])
    assert found[1, 1] == found[1, 2]


@pytest.mark.parametrize("kernel", [add_hours, add_hours.py_func])
def test_table_is_read_between_its_entries_and_rows(kernel: Callable[..., None]) -> None:
    """Tangents 0, 1/3, 1, a wall and unknown: t/(1 + t) is 0, 1/4, 1/2, about 1 and none."""
    tangent = np.array([[0.0, 1 / 3, 1.0, 1e9, np.nan, -2.0]] * 2, dtype=np.float32)
    south, north = np.array([100.0, 60.0, 0.0], np.float32), np.array([200.0, 60.0, 0.0], np.float32)
    total = np.ones((2, 6), dtype=np.float32)
    kernel(tangent, south, north, np.array([0.0, 0.5], np.float32), total, 0, 2)
    assert total[0] == pytest.approx([101, 81, 61, 1, 101, 101], abs=1e-3)
    assert total[1] == pytest.approx([151, 106, 61, 1, 151, 151], abs=1e-3)
