"""The level of mapped water and what it fills."""

import numpy as np
import pytest

from sitescreen.grid import Field, Grid
from sitescreen.terrain.ground import water_level_m, with_level_water

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
