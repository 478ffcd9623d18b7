"""Skylines of plots, from true north."""

import numpy as np
import pytest
from pyproj import Geod, Transformer

from sitescreen.grid import Field, Grid
from sitescreen.lattice import convergence_deg
from sitescreen.terrain.plot_skyline import AZIMUTHS_DEG, plot_skylines


def test_bearings_are_true_3_degrees_off_the_central_meridian_at_20_degrees() -> None:
    """There grid north points 1.03° off true north: a post that stands on a geodesic's bearing is seen on it."""
    crs = "EPSG:32637"  # central meridian 39°
    lon, lat = np.array([42.0]), np.array([20.0])
    assert convergence_deg(crs, lon, lat)[0] == pytest.approx(1.03, abs=0.01)
    x, y = Transformer.from_crs("EPSG:4326", crs, always_xy=True).transform(lon[0], lat[0])
    cell, half = 10.0, 400
    west, north = round(x / cell) * cell - half * cell, round(y / cell) * cell + half * cell
    grid = Grid(crs, west, north, cell, 2 * half, 2 * half)
    to_lonlat = Transformer.from_crs(crs, "EPSG:4326", always_xy=True)
    east, south = np.meshgrid(grid.x_centres_m(), grid.y_centres_m())
    there_lon, there_lat = to_lonlat.transform(east, south)
    bearing, _, distance = Geod(ellps="WGS84").inv(
        np.full_like(east, 42.0), np.full_like(east, 20.0), there_lon, there_lat
    )
    off = np.abs((bearing - 90.0 + 180.0) % 360.0 - 180.0)
    # a wall 2 km away within 0.5° of the true east, 100 m high: a bearing 1° off would miss it
    heights = np.where((off < 0.5) & (distance > 2000.0) & (distance < 3000.0), 100.0, 0.0)
    field = Field(heights.astype(np.float32), grid, "m", "")
    found = plot_skylines(field, lon, lat, 2.0, 30_000.0).height_deg[0]
    assert AZIMUTHS_DEG[18] == 90.0
    assert found[18] == pytest.approx(np.degrees(np.arctan(98.0 / 2000.0)), abs=0.05)
    assert np.delete(found, 18).max() <= 0.0


def test_a_plots_skyline_does_not_depend_on_the_other_plots() -> None:
    rng = np.random.default_rng(5)
    grid = Grid("EPSG:32637", 480_000.0, 2_220_000.0, 90.0, 300, 300)
    field = Field(rng.normal(100.0, 30.0, grid.shape).astype(np.float32), grid, "m", "")
    to_lonlat = Transformer.from_crs("EPSG:32637", "EPSG:4326", always_xy=True)
    lon, lat = to_lonlat.transform(np.array([485_000.0, 500_000.0]), np.array([2_215_000.0, 2_200_000.0]))
    together, alone = plot_skylines(field, lon, lat, 2.0, 5000.0), plot_skylines(field, lon[1:], lat[1:], 2.0, 5000.0)
    assert np.array_equal(together.height_deg[1:], alone.height_deg)
    assert np.array_equal(together.seen_m[1:], alone.seen_m)


def test_the_models_error_next_to_a_plot_makes_no_skyline_to_speak_of() -> None:
    """Level ground with 2.5 m of error over 90 m: the eye at 2 m plus one error sees a false skyline of under 0.3°."""
    from scipy import ndimage

    noise = ndimage.gaussian_filter(np.random.default_rng(1).standard_normal((300, 300)), 1.5)
    grid = Grid("EPSG:32637", 500_000.0, 9_000.0, 30.0, 300, 300)
    field = Field((noise * 2.5 / noise.std()).astype(np.float32), grid, "m", "")
    x, y = np.random.default_rng(2).uniform(2000.0, 7000.0, (2, 60))
    lon, lat = Transformer.from_crs("EPSG:32637", "EPSG:4326", always_xy=True).transform(500_000.0 + x, 9_000.0 - y)
    false = [np.maximum(plot_skylines(field, lon, lat, eye, 30_000.0).height_deg, 0.0).mean() for eye in (0.0, 4.5)]
    assert false[1] < 0.3 < 1.0 < false[0]
