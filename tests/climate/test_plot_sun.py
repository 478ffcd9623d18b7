"""The sun over plots, month by month."""

from collections.abc import Callable
from typing import Any

import numpy as np
import pytest

from sitescreen.climate._sun_month_kernel import month_sums, positive_share
from sitescreen.climate.plot_sun import PlotSkies, mean_plane, monthly_sun, morning_share, plot_skies
from sitescreen.climate.seasons import seasons_without_normals
from sitescreen.climate.sun_path import lit, on_plane, sun_path, sun_paths
from sitescreen.settings import load_defaults

SUN = load_defaults().sun
FLAT = np.zeros(72)
UP = np.array([0.0, 0.0, 1.0])


def skies(skyline: Any, lat: float = 0.05, normal: Any = UP, clear: Any = None, elevation_m: float = 50.0) -> PlotSkies:
    """Plots at one place under given skylines."""
    lines = np.atleast_2d(np.asarray(skyline, dtype=np.float32))
    count = len(lines)
    one = np.ones(count)
    return PlotSkies(
        lines,
        sun_paths(0.05 * one, lat * one, elevation_m * one, SUN),
        seasons_without_normals(lat * one),
        clear,
        one,
        np.tile(normal, (count, 1)),
    )


def test_open_ground_has_the_sun_of_the_path() -> None:
    """The sums of the steps: hours, light on level ground and on a west wall as on_plane has them."""
    found = monthly_sun(skies(FLAT), SUN)
    path = sun_path(0.05, 0.05, 50.0, SUN)
    up, afternoon = lit(path, FLAT), 1.0 - morning_share(path)
    assert found.hours[0] == pytest.approx(up.sum(axis=1) * 0.25, abs=0.25)
    assert found.ground_kwh_m2[0] == pytest.approx(on_plane(path, up, 0, 0, 1.0).sum(axis=1) / 4000, rel=2e-3)
    wall = (on_plane(path, up, 90, 270, 0.5) * afternoon).sum(axis=1) / 4000
    assert found.west_wall_kwh_m2[0] == pytest.approx(wall, rel=5e-3)
    assert found.open_morning_hours[0].tolist() == found.morning_hours[0].tolist()
    # half the day lies before noon
    assert found.morning_hours[0] / found.hours[0] == pytest.approx(0.5, abs=0.002)


@pytest.mark.parametrize("wall_deg", [5.0, 15.0, 30.0])
def test_a_wall_in_the_east_delays_the_first_sun_by_the_minutes_computed(wall_deg: float) -> None:
    """In March at the equator the sun climbs 15° an hour straight up from the east, cos δ of it: δ = −2.4°."""
    wall = np.where((np.arange(72) >= 1) & (np.arange(72) < 36), wall_deg, 0.0)
    found = monthly_sun(skies([FLAT, wall]), SUN)
    delay = found.first_h[1, 2] - found.first_h[0, 2]
    # refraction lifts the level sunrise by 0.57°, and the sun behind the wall by a little (Bennett 1982)
    lift = 0.57 - {5.0: 0.16, 15.0: 0.06, 30.0: 0.03}[wall_deg]
    assert delay == pytest.approx((wall_deg + lift) / 15.0 / np.cos(np.radians(2.4)), abs=0.04)
    assert found.morning_hours[0, 2] - found.morning_hours[1, 2] == pytest.approx(delay, abs=0.05)
    assert found.last_h[1, 2] == found.last_h[0, 2]


def test_wall_in_the_west_cuts_the_load_of_a_west_wall_and_leaves_the_morning() -> None:
    wall = np.where(np.arange(72) > 36, 20.0, 0.0)
    found = monthly_sun(skies([FLAT, wall]), SUN)
    assert (found.west_wall_kwh_m2[1] < 0.9 * found.west_wall_kwh_m2[0]).all()
    assert (found.morning_hours[1] == found.morning_hours[0]).all()
    assert (found.open_morning_hours[1] == found.morning_hours[0]).all()


def test_symmetric_valley_has_symmetric_hours() -> None:
    valley = 25.0 * np.abs(np.sin(np.radians(np.arange(72) * 5.0)))
    found = monthly_sun(skies(valley), SUN)
    assert found.morning_hours[0] == pytest.approx(found.hours[0] / 2, abs=0.02)
    noon = 0.5 * (found.first_h + found.last_h)
    free = monthly_sun(skies(FLAT), SUN)
    open_noon = 0.5 * (free.first_h + free.last_h)
    assert noon[0] == pytest.approx(open_noon[0], abs=0.02)


def test_the_southern_hemisphere_mirrors_the_northern() -> None:
    """December of 15° S is June of 15° N, but for the Earth's distance and the days' not quite mirrored suns."""
    hill = np.where(np.abs(np.arange(72) - 36) <= 12, 30.0, 0.0)  # in the south; mirrored it lies in the north
    north, south = monthly_sun(skies(hill, 15.0), SUN), monthly_sun(skies(np.roll(hill[::-1], 37), -15.0), SUN)
    assert np.abs(np.roll(hill[::-1], 37)[:13] - 30.0).max() == 0.0
    assert south.hours[0, [5, 11, 2]] == pytest.approx(north.hours[0, [11, 5, 8]], abs=0.15)


def test_clouds_take_from_hours_and_beam_by_part_of_the_day() -> None:
    clear = np.tile([0.25, 1.0], (12, 1))
    cloudy, bright = (monthly_sun(skies(FLAT, clear=one), SUN) for one in (clear, None))
    assert cloudy.morning_hours == pytest.approx(0.25 * bright.morning_hours)
    # clear afternoons, but for the step in which noon falls
    assert cloudy.west_wall_kwh_m2 == pytest.approx(bright.west_wall_kwh_m2, rel=2e-3)
    assert (cloudy.first_h == bright.first_h).all()


def test_ground_that_falls_towards_the_sun_gains_more() -> None:
    tilt = np.radians(20.0)
    north = skies(FLAT, -30.0, [0.0, np.sin(tilt), np.cos(tilt)])
    south = skies(FLAT, -30.0, [0.0, -np.sin(tilt), np.cos(tilt)])
    june = [monthly_sun(one, SUN).ground_kwh_m2[0, 5] for one in (north, south)]
    path = sun_path(0.05, -29.95, 50.0, SUN)
    expected = on_plane(path, lit(path, FLAT), 20.0, 0.0, 1.0)[5].sum() / 4000
    assert june[0] == pytest.approx(expected, rel=0.01)
    assert june[0] > 1.6 * june[1]


def test_mean_plane_turns_with_the_meridians_convergence() -> None:
    """Ground that falls to grid east where grid north points 10° east of true north falls to the true bearing 100°."""
    normal = mean_plane(np.array([-0.2]), np.array([0.0]), np.array([10.0]))[0]
    assert np.degrees(np.arctan2(normal[0], normal[1])) == pytest.approx(100.0)
    assert normal[2] == pytest.approx(np.cos(np.arctan(0.2)))


def test_unknown_height_leaves_a_plots_sun_unknown_and_its_neighbours_alone() -> None:
    one = np.ones(2)
    seasons = seasons_without_normals(one)
    lines = np.zeros((2, 72), dtype=np.float32)
    suns = plot_skies(lines, one, one, np.array([np.nan, 50.0]), seasons, None, one, np.tile(UP, (2, 1)), SUN, None)
    found = monthly_sun(suns, SUN)
    assert all(np.isnan(values[0]).all() and np.isfinite(values[1]).all() for values in found)


def test_unknown_slope_leaves_only_the_gain_unknown() -> None:
    found = monthly_sun(skies(FLAT, normal=[np.nan] * 3), SUN)
    assert np.isnan(found.ground_kwh_m2).all()
    assert np.isfinite(found.hours).all()


def test_a_plots_sun_does_not_depend_on_the_other_plots() -> None:
    lines = np.abs(np.random.default_rng(3).normal(5.0, 4.0, (7, 72)))
    together, alone = monthly_sun(skies(lines), SUN), monthly_sun(skies(lines[4]), SUN)
    assert all(np.array_equal(a[4], b[0]) for a, b in zip(together, alone, strict=True))


def test_a_plot_in_a_pit_has_no_sun() -> None:
    found = monthly_sun(skies(np.full(72, 89.9)), SUN)
    assert (found.hours == 0).all()
    assert np.isnan(found.first_h).all()


@pytest.mark.parametrize("share", [positive_share, positive_share.py_func])
def test_part_of_a_line_above_nothing(share: Callable[..., float]) -> None:
    lines = [(1.0, 3.0), (-1.0, -2.0), (1.0, -1.0), (-1.0, 3.0), (0.0, 2.0), (0.0, 0.0)]
    assert [share(*line) for line in lines] == [1.0, 0.0, 0.5, 0.75, 1.0, 0.0]


@pytest.mark.parametrize("kernel", [month_sums, month_sums.py_func])
def test_sums_of_one_short_day(kernel: Callable[..., None]) -> None:
    """Clearances −1, 1, 3, −1 an hour apart: sun from halfway between 1 and 2 to three quarters past 3."""
    clearance = np.array([[[-1.0, 1.0, 3.0, -1.0]]])
    weights = np.ones((1, 4, 1))
    towards = np.tile(UP, (1, 4, 1))
    sums, edges = np.empty((1, 1, 2)), np.empty((1, 1, 2))
    hour = np.arange(1.0, 5.0)
    kernel(clearance, weights, towards, np.full((1, 4), 2.0), UP[None], hour, 1.0, sums, edges, 0, 1)
    assert edges[0, 0].tolist() == [1.5, 3.75]
    assert sums[0, 0].tolist() == pytest.approx([2.25, 4.5])
