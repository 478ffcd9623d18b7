"""Shelter, speed ratio and the sums over a rose."""

import numpy as np
import pytest

from sitescreen.climate.wind import energy_mean, shelter_factor, soft_cap, speed_ratio, wind_fields
from sitescreen.grid import Field, Grid
from sitescreen.inputs.wind import Rose, assumed_wind
from sitescreen.settings import load_defaults
from sitescreen.terrain.position import rise_m

WIND = load_defaults().wind


def test_speed_up_bends_towards_its_caps_and_keeps_small_values() -> None:
    bent = soft_cap(np.array([1e3, -1e3, 0.1, -0.1, 0.0], dtype=np.float32), WIND)
    assert bent == pytest.approx([1.15, -0.7, 0.1, -0.1, 0.0], abs=1e-3)


def test_shelter_closure_at_its_ends_and_middle() -> None:
    tangents = np.array([-0.2, 0.1, 0.25, 0.4, 2.0, np.nan], dtype=np.float32)
    assert shelter_factor(tangents, WIND) == pytest.approx([1.0, 1.0, 0.65, 0.3, 0.3, np.nan], nan_ok=True)


def test_hollow_is_not_slowed_twice() -> None:
    """Upwind shelter and the slow-down of a hollow are two views of one thing: the stronger counts, not the product."""
    ratio = speed_ratio(np.array([0.5, 0.9], np.float32), np.array([-0.4, -0.4], np.float32))
    assert ratio == pytest.approx([0.5, 0.6])


def test_strong_winds_decide_the_exposure() -> None:
    """Two winds: light 2 m/s for 70 % with F 1.3, strong 8 m/s for 30 % with F 0.6 → 0.66, not 1.17 (computed)."""
    assert energy_mean(np.array([0.7, 0.3]), np.array([2.0, 8.0]), np.array([1.3, 0.6])) == pytest.approx(
        0.66, abs=0.005
    )


def _fields(elevation: Field, rose: Rose):  # type: ignore[no-untyped-def]
    place = np.zeros(elevation.grid.shape, dtype=np.uint8)
    return wind_fields(elevation, rise_m(elevation, 1000.0), 0.0, [(rose, rose)], place, WIND)


def test_level_ground_is_the_measure_of_all() -> None:
    grid = Grid("EPSG:32641", 0.0, 9000.0, 90.0, 100, 100)
    wind = _fields(Field(np.full(grid.shape, 500.0), grid, "m", "level"), assumed_wind().rose("year", 63.0, -6.0))
    inside = (slice(36, 64), slice(36, 64))
    assert wind.ventilation.values[inside] == pytest.approx(1.0, abs=1e-6)
    assert wind.ridge_exposure.values[inside] == pytest.approx(1.0, abs=1e-6)
    assert wind.sheltered_fraction.values[inside] == pytest.approx(0.0, abs=1e-6)
    assert np.isnan(wind.ventilation.values[2, 2])  # the ground upwind is not known there


def test_a_wall_shelters_from_the_wind_that_comes_over_it_only() -> None:
    grid = Grid("EPSG:32641", 0.0, 9000.0, 90.0, 100, 100)
    height = np.zeros(grid.shape)
    height[:, 60:62] = 200.0  # a wall to the east of column 55
    ground = Field(height, grid, "m", "a wall")

    def from_bearing(bearing: float) -> Rose:
        return Rose(np.array([bearing]), np.array([1.0]), np.array([4.0]), 0.0, False)

    behind = (50, 55)
    assert _fields(ground, from_bearing(90.0)).sheltered_fraction.values[behind] == pytest.approx(0.7, abs=0.01)
    assert _fields(ground, from_bearing(270.0)).sheltered_fraction.values[behind] == pytest.approx(0.0, abs=1e-6)


def test_true_north_counts_not_grid_north() -> None:
    """With the grid turned by 90°, a true east wind comes from the grid's north."""
    grid = Grid("EPSG:32641", 0.0, 9000.0, 90.0, 100, 100)
    height = np.zeros(grid.shape)
    height[40:42, :] = 200.0
    ground = Field(height, grid, "m", "a wall to the grid's north")
    rose = Rose(np.array([90.0]), np.array([1.0]), np.array([4.0]), 0.0, False)
    place = np.zeros(grid.shape, dtype=np.uint8)
    wind = wind_fields(ground, rise_m(ground, 1000.0), 90.0, [(rose, rose)], place, WIND)
    assert wind.sheltered_fraction.values[47, 50] == pytest.approx(0.7, abs=0.01)
