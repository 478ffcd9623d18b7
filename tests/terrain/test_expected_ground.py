"""The most likely ground: little kept of noise over a plain, nearly all of broken relief, nothing counted twice."""

import numpy as np
import pytest

from sitescreen.grid import Field, Grid
from sitescreen.terrain.expected_ground import expected_ground, noise_variances, reaches_cells, support_m
from sitescreen.terrain.terrain_error import error_parts

GRID = Grid("EPSG:32637", 300_000.0, -9_000_000.0, 30.0, 360, 360)
X, Y = np.meshgrid(np.arange(360) * 30.0, np.arange(360) * 30.0)
DRY = np.zeros(GRID.shape, dtype=np.bool_)
MIDDLE = np.s_[110:250, 110:250]


def field(values: object, grid: Grid = GRID) -> Field:
    return Field(np.asarray(values, dtype=np.float32), grid, "m", "height")


def measured(truth: object, error_m: float) -> Field:
    return field(np.asarray(truth) + sum(error_parts(GRID, error_m, 90.0, 77, 0)))  # type: ignore[arg-type]


@pytest.mark.parametrize("range_m", [60.0, 90.0, 500.0])
def test_expected_variance_of_noise_is_that_of_noise(range_m: float) -> None:
    """The two differences of pure noise have the variances that the correlation says, over five draws."""
    near, wide = reaches_cells(range_m, 30.0)
    grid = Grid("EPSG:32637", 300_000.0, -9_000_000.0, 30.0, 700, 700)
    seen = []
    for draw in range(5):
        noise = sum(error_parts(grid, 1.0, range_m, 11, draw))
        close = box_mean(noise, near)
        broad = box_mean(close, wide)
        inside = np.s_[near + wide : -near - wide, near + wide : -near - wide]
        seen.append([np.var((noise - close)[inside]), np.mean((close - broad)[inside] ** 2)])
    # the long part is slightly smoother than its model, which moves up to 0.03 of the variance to the wider difference
    assert np.mean(seen, axis=0) == pytest.approx(noise_variances(range_m, 30.0), abs=0.04)


def box_mean(values: object, reach: int) -> object:
    from scipy.ndimage import uniform_filter

    return uniform_filter(np.asarray(values), 2 * reach + 1)


def test_plain_of_noise_becomes_a_plain_and_stays_one_in_the_draws() -> None:
    """Noise of 2.5 m on a 1 % slope: less than half of it is left, and drawing does not put it back."""
    plain = 1000.0 + 0.01 * X
    expected = expected_ground(measured(plain, 2.5), DRY, 2.5, 90.0)
    drawn = expected.drawn(error_parts(GRID, 2.5, 90.0, 5, 1))
    assert np.std((expected.height_m - plain)[MIDDLE]) < 1.1
    assert np.std((drawn - plain)[MIDDLE]) < 1.5


def test_broken_relief_is_kept_and_drawn_with_the_whole_error() -> None:
    """Hills 80 m high every 2 km: detail is kept to nine tenths, and draws scatter by nearly the error itself."""
    hills = 1000.0 + 40.0 * np.sin(X / 150.0) * np.sin(Y / 180.0)
    expected = expected_ground(measured(hills, 1.6), DRY, 1.6, 90.0)
    assert np.mean(expected.short_left[MIDDLE]) > 0.9
    spread = np.std((expected.drawn(error_parts(GRID, 1.6, 90.0, 5, 1)) - expected.height_m)[MIDDLE])
    assert spread == pytest.approx(1.6, rel=0.1)


def test_a_pan_is_not_smoothed_away() -> None:
    """A pan of 12 m depth and 600 m radius in a plain keeps three quarters of its depth under an error of 2.5 m."""
    pan = 1000.0 + 0.001 * X - 12.0 * np.exp(-((np.hypot(X - 5400.0, Y - 5400.0) / 600.0) ** 4))
    expected = expected_ground(measured(pan, 2.5), DRY, 2.5, 90.0)
    floor = expected.height_m[175:186, 175:186].mean()
    assert 1005.4 - floor > 9.0


def test_without_an_error_the_ground_is_as_measured() -> None:
    """Exactly, and nothing is left to draw."""
    ground = field(1000.0 + 3.0 * np.random.default_rng(1).standard_normal(GRID.shape))
    expected = expected_ground(ground, DRY, 0.0, 90.0)
    np.testing.assert_array_equal(expected.height_m, ground.values)
    np.testing.assert_array_equal(expected.drawn(error_parts(GRID, 0.0, 90.0, 5, 1)), ground.values)


def test_water_stays_level_and_gaps_stay_gaps() -> None:
    """A lake's height is known; unknown ground is not made up."""
    heights = 1000.0 + 0.02 * X
    heights[100:140, 100:140] = 990.0
    heights[200:210, 200:210] = np.nan
    lake = heights == 990.0
    expected = expected_ground(field(heights), lake, 2.0, 90.0)
    drawn = expected.drawn(error_parts(GRID, 2.0, 90.0, 5, 1))
    np.testing.assert_array_equal(drawn[lake], 990.0)
    np.testing.assert_array_equal(np.isnan(drawn), np.isnan(heights))


def test_windows_that_hold_the_support_agree_bit_for_bit() -> None:
    """What lies further away than the support changes nothing."""
    ground = measured(1000.0 + 20.0 * np.sin(X / 400.0), 2.0)
    around = round(support_m(90.0, 30.0) / 30.0)
    whole = expected_ground(ground, DRY, 2.0, 90.0)
    part = np.s_[150 - around : 160 + around, 140 - around : 165 + around]
    grid = Grid(GRID.crs, GRID.west_m + 30.0 * (140 - around), GRID.north_m - 30.0 * (150 - around), 30.0,
                10 + 2 * around, 25 + 2 * around)  # fmt: skip
    small = expected_ground(field(ground.values[part], grid), DRY[part], 2.0, 90.0)
    for one, other in zip(small, whole, strict=True):
        np.testing.assert_array_equal(one[around:-around, around:-around], other[150:160, 140:165])
