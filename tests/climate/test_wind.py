"""Shelter, speed ratio and the sums over a rose."""

from collections.abc import Callable

import numpy as np
import pytest

from sitescreen.climate._wind_kernel import add_sector, capped, shelter
from sitescreen.climate.wind import sector_weights, wind_fields
from sitescreen.grid import Field, Grid
from sitescreen.inputs.wind import Rose, assumed_wind
from sitescreen.settings import load_defaults
from sitescreen.terrain.position import rise_m

WIND = load_defaults().wind


@pytest.mark.parametrize("bent", [capped, capped.py_func])
def test_speed_up_bends_towards_its_caps_and_keeps_small_values(bent: Callable[..., float]) -> None:
    values = [bent(speed_up, WIND.speed_up_least, WIND.speed_up_most) for speed_up in (1e3, -1e3, 0.1, -0.1, 0.0)]
    assert values == pytest.approx([1.15, -0.7, 0.1, -0.1, 0.0], abs=1e-3)


@pytest.mark.parametrize("left", [shelter, shelter.py_func])
def test_shelter_closure_at_its_ends_and_middle(left: Callable[..., float]) -> None:
    tangents = (-0.2, 0.1, 0.25, 0.4, 2.0, np.nan)
    values = [left(t, WIND.shelter_from_tangent, WIND.shelter_span_tangent, WIND.shelter_most) for t in tangents]
    assert values == pytest.approx([1.0, 1.0, 0.65, 0.3, 0.3, np.nan], nan_ok=True)


@pytest.mark.parametrize("add", [add_sector, add_sector.py_func])
def test_hollow_is_not_slowed_twice(add: Callable[..., None]) -> None:
    """Upwind shelter and the slow-down of a hollow are two views of one thing: the stronger counts, not the product."""
    tangent = np.array([[0.25, 0.1]], np.float32)  # W = 0.65 and 1
    flow = np.full((1, 2), -0.2, np.float32)
    nothing = np.zeros((1, 2), np.float32)
    air, energy, kept_off = (np.zeros((1, 2), np.float32) for _ in range(3))
    closure = (0.10, 0.30, 0.70, -0.7, 1.15)
    place = np.zeros((1, 2), np.uint8)
    add(tangent, flow, nothing, nothing, 1.0, 0.0, closure, np.ones((1, 3)), place, air, energy, kept_off, 0, 1)
    slowed = 1.0 - 0.7 * np.tanh(0.2 / 0.7)
    assert air[0].tolist() == pytest.approx([0.65, slowed])
    assert energy[0].tolist() == pytest.approx([0.65**3, slowed**3])
    assert kept_off[0].tolist() == pytest.approx([0.35, 0.0], abs=1e-7)


@pytest.mark.parametrize("add", [add_sector, add_sector.py_func])
def test_unknown_ground_does_not_spread_from_a_sector_without_wind(add: Callable[..., None]) -> None:
    tangent = np.full((1, 2), np.nan, np.float32)
    nothing = np.zeros((1, 2), np.float32)
    sums = [np.zeros((1, 2), np.float32) for _ in range(3)]
    place = np.array([[0, 1]], np.uint8)
    weights = np.array([[0.0, 0.0, 0.0], [0.5, 0.0, 0.0]])
    add(tangent, nothing, nothing, nothing, 1.0, 0.0, (0.1, 0.3, 0.7, -0.7, 1.15), weights, place, *sums, 0, 1)
    assert sums[0][0].tolist() == pytest.approx([0.0, np.nan], nan_ok=True)
    assert sums[1][0].tolist() == sums[2][0].tolist() == [0.0, 0.0]


def test_strong_winds_decide_the_exposure() -> None:
    """Two winds: light 2 m/s for 70 % with F 1.3, strong 8 m/s for 30 % with F 0.6 → 0.66, not 1.17 (computed)."""
    rose = Rose(np.array([0.0, 90.0]), np.array([0.7, 0.3]), np.array([2.0, 8.0]), 0.0, False)
    _, energy, time = sector_weights(rose, rose)
    ratio = np.zeros(16)
    ratio[[0, 4]] = 1.3, 0.6
    assert np.cbrt(energy @ ratio**3) == pytest.approx(0.66, abs=0.005)
    assert time.sum() == pytest.approx(1.0)


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
    assert wind.sheltered_fraction.values[46, 50] == pytest.approx(0.7, abs=0.01)
