"""Shelter, speed ratio and the sums over a rose, cell by cell."""

from collections.abc import Callable

import numpy as np
import pytest

from sitescreen.climate._wind_kernel import (
    FLOW,
    POWER,
    TIME,
    add_sector,
    capped,
    divide_blended,
    shelter,
    upwind_tangent_at,
)
from sitescreen.climate.hill_speed_up import hill_fields
from sitescreen.climate.wind import Wanted, wind_fields
from sitescreen.grid import Field, Grid
from sitescreen.inputs.wind import Rose, WindTable, assumed_wind
from sitescreen.settings import load_defaults
from sitescreen.terrain.horizon import upwind_tangent
from sitescreen.terrain.position import rise_m

WIND = load_defaults().wind
NO_COVER = np.zeros((0, 0), np.float32)
NO_BLEND = np.zeros((0, 3))
KINDS = np.array([FLOW, POWER, TIME])


@pytest.mark.parametrize("bent", [capped, capped.py_func])
def test_speed_up_bends_towards_its_caps_and_keeps_small_values(bent: Callable[..., float]) -> None:
    values = [bent(speed_up, WIND.speed_up_least, WIND.speed_up_most) for speed_up in (1e3, -1e3, 0.1, -0.1, 0.0)]
    assert values == pytest.approx([1.15, -0.7, 0.1, -0.1, 0.0], abs=1e-3)


@pytest.mark.parametrize("left", [shelter, shelter.py_func])
def test_shelter_closure_at_its_ends_and_middle(left: Callable[..., float]) -> None:
    tangents = (-0.2, 0.1, 0.25, 0.4, 2.0, np.nan)
    values = [left(t, WIND.shelter_from_tangent, WIND.shelter_span_tangent, WIND.shelter_most) for t in tangents]
    assert values == pytest.approx([1.0, 1.0, 0.65, 0.3, 0.3, np.nan], nan_ok=True)


CLOSURE = (0.10, 0.30, 0.70, -0.7, 1.15)


@pytest.mark.parametrize("add", [add_sector, add_sector.py_func])
def test_hollow_is_not_slowed_twice(add: Callable[..., None]) -> None:
    """Upwind shelter and the slow-down of a hollow are two views of one thing: the stronger counts, not the product."""
    tangent = np.array([[0.25, 0.1]], np.float32)  # W = 0.65 and 1
    flow = np.full((1, 2), -0.2, np.float32)
    nothing = np.zeros((1, 2), np.float32)
    sums = np.zeros((3, 1, 2), np.float32)
    hills, cover, place = (flow, nothing, nothing), (NO_COVER, NO_COVER), np.zeros((1, 2), np.uint8)
    add(tangent, *hills, *cover, 1.0, 0.0, CLOSURE, KINDS, np.ones((1, 3)), place, NO_BLEND, sums, 0, 1)
    slowed = 1.0 - 0.7 * np.tanh(0.2 / 0.7)
    assert sums[0, 0].tolist() == pytest.approx([0.65, slowed])
    assert sums[1, 0].tolist() == pytest.approx([0.65**3, slowed**3])
    assert sums[2, 0].tolist() == pytest.approx([0.35, 0.0], abs=1e-7)


@pytest.mark.parametrize("add", [add_sector, add_sector.py_func])
def test_unknown_ground_does_not_spread_from_a_sector_without_wind(add: Callable[..., None]) -> None:
    tangent = np.full((1, 2), np.nan, np.float32)
    nothing = np.zeros((1, 2), np.float32)
    sums = np.zeros((3, 1, 2), np.float32)
    place = np.array([[0, 1]], np.uint8)
    weights = np.array([[0.0, 0.0, 0.0], [0.5, 0.0, 0.0]])
    cover = (NO_COVER, NO_COVER)
    add(tangent, nothing, nothing, nothing, *cover, 1.0, 0.0, CLOSURE, KINDS, weights, place, NO_BLEND, sums, 0, 1)
    assert sums[0, 0].tolist() == pytest.approx([0.0, np.nan], nan_ok=True)
    assert sums[1, 0].tolist() == sums[2, 0].tolist() == [0.0, 0.0]


@pytest.mark.parametrize(
    ("add", "divide"), [(add_sector, divide_blended), (add_sector.py_func, divide_blended.py_func)]
)
def test_places_count_by_the_inverse_square_of_their_distance(
    add: Callable[..., None], divide: Callable[..., None]
) -> None:
    """Two places 3 cells apart, one of winds with F 1.5, one of winds with F 1: at 1 and 2 cells they count 4 : 1."""
    up = np.full((1, 4), 1.15 * np.arctanh(0.5 / 1.15), np.float32)  # bends to 0.5
    nothing, sums = np.zeros((1, 4), np.float32), np.zeros((1, 1, 4), np.float32)
    level = np.zeros((1, 4), np.float32)
    place, blend = np.zeros((1, 4), np.uint8), np.array([[0.0, 0.0, 0.01], [0.0, 3.0, 0.01]])
    cover, kinds = (NO_COVER, NO_COVER), np.array([FLOW])
    for flow, weights in ((up, [[2.0], [0.0]]), (nothing, [[0.0], [2.0]])):
        weights = np.array(weights)
        add(level, flow, nothing, nothing, *cover, 1.0, 0.0, CLOSURE, kinds, weights, place, blend, sums, 0, 1)
    divide(blend, np.array([[2.0], [2.0]]), sums, 0, 1)
    assert sums[0, 0, 1:3].tolist() == pytest.approx([1.0 + 0.5 * 0.8, 1.0 + 0.5 * 0.2], abs=1e-6)
    assert sums[0, 0, [0, 3]].tolist() == pytest.approx([1.5, 1.0], abs=1e-3)


@pytest.mark.parametrize("at", [upwind_tangent_at, upwind_tangent_at.py_func])
@pytest.mark.parametrize("azimuth", [0.0, 22.5, 45.0, 67.5, 90.0, 135.0, 180.0, 211.7, 270.0, 315.0, 337.5])
def test_plots_look_upwind_as_fields_do(at: Callable[..., float], azimuth: float) -> None:
    """The same samples of the same ray; fields add in float32."""
    random = np.random.default_rng(4)
    grid = Grid("EPSG:32641", 0.0, 900.0, 30.0, 30, 30)
    ground = Field(100.0 * random.random(grid.shape), grid, "m", "noise")
    field = upwind_tangent(ground, azimuth, 300.0, 10.0).values
    east, north = np.sin(np.radians(azimuth)), np.cos(np.radians(azimuth))
    found = np.array(
        [[at(ground.values, row, col, east, north, 30.0, 300.0, 10.0) for col in range(30)] for row in range(30)]
    )
    assert np.isfinite(field).any()
    assert np.isnan(field).any()
    assert found == pytest.approx(field, abs=1e-5, nan_ok=True)


NAMES = ("ventilation", "ridge_exposure", "sheltered_fraction")


def table_of(*roses: Rose, places: tuple[tuple[float, float], ...] = ((np.nan, np.nan),)) -> WindTable:
    """The same rose all year, at one or several places."""
    slots = ("hot_afternoon", "hot_night", "cool_night", "year", "rain")
    all_of = {(slot, number): rose for slot in slots for number, rose in enumerate(roses)}
    return WindTable(places, all_of, False, None, ())


def _fields(elevation: Field, rose: Rose, convergence_deg: float = 0.0) -> dict[str, Field]:
    hills = hill_fields(elevation, WIND)
    wanted = [Wanted(name, name, "year") for name in NAMES]
    return wind_fields(elevation, rise_m(elevation, 1000.0), hills, None, convergence_deg, table_of(rose), wanted, WIND)


def test_level_ground_is_the_measure_of_all() -> None:
    grid = Grid("EPSG:32641", 0.0, 9000.0, 90.0, 100, 100)
    wind = _fields(Field(np.full(grid.shape, 500.0), grid, "m", "level"), assumed_wind().rose("year", 63.0, -6.0))
    inside = (slice(36, 64), slice(36, 64))
    assert wind["ventilation"].values[inside] == pytest.approx(1.0, abs=1e-6)
    assert wind["ridge_exposure"].values[inside] == pytest.approx(1.0, abs=1e-6)
    assert wind["sheltered_fraction"].values[inside] == pytest.approx(0.0, abs=1e-6)
    assert np.isnan(wind["ventilation"].values[2, 2])  # the ground upwind is not known there


def from_bearing(bearing: float) -> Rose:
    return Rose(np.array([bearing]), np.array([1.0]), np.array([4.0]), 0.0, False)


def test_a_wall_shelters_from_the_wind_that_comes_over_it_only() -> None:
    grid = Grid("EPSG:32641", 0.0, 9000.0, 90.0, 100, 100)
    height = np.zeros(grid.shape)
    height[:, 60:62] = 200.0  # a wall to the east of column 55
    ground = Field(height, grid, "m", "a wall")
    behind = (50, 55)
    assert _fields(ground, from_bearing(90.0))["sheltered_fraction"].values[behind] == pytest.approx(0.7, abs=0.01)
    assert _fields(ground, from_bearing(270.0))["sheltered_fraction"].values[behind] == pytest.approx(0.0, abs=1e-6)


def test_true_north_counts_not_grid_north() -> None:
    """With the grid turned by 90°, a true east wind comes from the grid's north."""
    grid = Grid("EPSG:32641", 0.0, 9000.0, 90.0, 100, 100)
    height = np.zeros(grid.shape)
    height[40:42, :] = 200.0
    ground = Field(height, grid, "m", "a wall to the grid's north")
    wind = _fields(ground, from_bearing(90.0), convergence_deg=90.0)
    assert wind["sheltered_fraction"].values[46, 50] == pytest.approx(0.7, abs=0.01)
