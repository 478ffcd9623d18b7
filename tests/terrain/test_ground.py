"""The level of mapped water and what it fills."""

import numpy as np
import pytest

from sitescreen.grid import Field, Grid
from sitescreen.settings import load_defaults
from sitescreen.terrain.ground import open_to_cold_air, read_ground, water_level_m, with_level_water
from sitescreen.terrain.sky_view import sky_view

GRID = Grid("EPSG:32641", 0.0, 300.0, 30.0, 10, 10)


def _field(values: np.ndarray) -> Field:
    return Field(values, GRID, "m", "height")


def test_each_lake_has_its_own_level_and_the_sea_has_none() -> None:
    water = np.zeros(GRID.shape, dtype=np.uint8)
    water[:3, :3] = 2
    water[6:, 6:] = 2
    water[:, 5] = 1
    height = np.full(GRID.shape, 50.0)
    height[:3, :3] = 20.0
    height[6:, 6:] = 30.0
    level = water_level_m(_field(height), water)
    assert (level[1, 1], level[8, 8], level[4, 5]) == (20.0, 30.0, 0.0)
    assert np.isnan(level[4, 0])


def test_a_hill_mapped_as_lake_does_not_lift_the_lake() -> None:
    water = np.full(GRID.shape, 2, dtype=np.uint8)
    height = np.full(GRID.shape, 20.0)
    height[:, 4:] = 80.0
    assert water_level_m(_field(height), water)[0, 0] == 20.0


def test_gaps_over_water_are_filled_and_gaps_over_land_stay() -> None:
    water = np.zeros(GRID.shape, dtype=np.uint8)
    water[:, 5:] = 1
    water[:3, :3] = 2
    height = np.full(GRID.shape, 40.0)
    height[:, 5:] = np.nan
    height[9, 9] = -3.0
    height[0, 0] = np.nan
    height[8, 1] = np.nan
    level = water_level_m(_field(height), water)
    filled = with_level_water(_field(height), water, level).values
    assert (filled[4, 7], filled[9, 9], filled[0, 0]) == (0.0, 0.0, 40.0)
    assert np.isnan(filled[8, 1])


def test_mapped_sea_over_a_hill_keeps_the_hill() -> None:
    water = np.ones(GRID.shape, dtype=np.uint8)
    height = np.full(GRID.shape, 12.0)
    level = water_level_m(_field(height), water)
    assert with_level_water(_field(height), water, level).values == pytest.approx(12.0)


def test_cold_air_spreads_over_seas_and_large_lakes_not_over_ponds() -> None:
    water = np.zeros((60, 60), dtype=np.uint8)
    water[5:8, 5:8] = 2  # 9 cells of 0.0081 km²
    water[20:40, 20:40] = 2  # 3.24 km²
    water[50:53, :2] = 2  # small, but it may run on beyond the window
    water[:, 58:] = 1
    out = open_to_cold_air(water, 90.0, 1.0)
    assert not out[6, 6]
    assert out[30, 30]
    assert out[51, 0]
    assert out[10, 59]
    assert out.sum() == 400 + 6 + 120


def test_a_strip_of_gaps_beside_mapped_water_is_shore() -> None:
    """The model's sea begins 3 cells inland of the mapped one: those gaps are closed, wider ones are not."""
    water = np.zeros(GRID.shape, dtype=np.uint8)
    water[:, 8:] = 1
    height = np.full(GRID.shape, 40.0)
    height[:, 5:] = np.nan
    height[0, 3:] = np.nan
    level = water_level_m(_field(height), water)
    filled = with_level_water(_field(height), water, level).values
    assert (filled[5, 5:] == 0.0).all()
    assert np.isnan(filled[0, 3:5]).all()
    assert filled[5, 4] == 40.0


@pytest.mark.parametrize("pond", [True, False])
def test_level_ground_or_a_pond_at_the_bottom_does_not_drain_a_hollow(pond: bool) -> None:
    """A pit 25 m deep whose floor is as level as water over 1.1 km², with a pond in it: cold air still lies there."""
    grid = Grid("EPSG:32641", 0.0, 9000.0, 90.0, 100, 100)
    x, y = np.meshgrid(grid.x_centres_m() - 4500.0, grid.y_centres_m() - 4500.0)
    height = Field(np.clip(500.0 + (np.hypot(x, y) - 600.0) * 0.05, 500.0, 525.0), grid, "m", "a pit")
    water = np.zeros(grid.shape, dtype=np.uint8)
    water[49:51, 49:51] = 2 if pond else 0
    ground = read_ground(height, height, water, 1.0, 90.0, load_defaults().terrain)
    assert ground.flat.label[50, 50] > 0
    assert ground.hollows.depth_m.values[50, 50] == pytest.approx(25.0, abs=0.01)


def test_others_ride_on_the_sky_views_sweep() -> None:
    """A consumer of the horizon is handed each of the sky view's azimuths once, over the ground with level water."""
    grid = Grid("EPSG:32641", 0.0, 900.0, 30.0, 30, 30)
    x, _ = np.meshgrid(grid.x_centres_m(), grid.y_centres_m())
    values = 0.1 * x
    values[:, 20:24] = np.nan  # a gap that is mapped as sea, at 0 m
    height = Field(values, grid, "m", "a slope")
    water = np.zeros(grid.shape, dtype=np.uint8)
    water[:, 20:24] = 1
    told: dict[float, np.ndarray] = {}
    settings = load_defaults().terrain.model_copy(update={"sky_azimuths": 8})
    ground = read_ground(
        height, height, water, 1.0, 90.0, settings, [lambda azimuth, tangent: told.update({azimuth: tangent.copy()})]
    )
    assert list(told) == [45.0 * k for k in range(8)]
    assert np.isfinite(told[90.0][:, 20:24]).all()
    np.testing.assert_array_equal(ground.sky_view.values, sky_view(ground.elevation, 8).values)
