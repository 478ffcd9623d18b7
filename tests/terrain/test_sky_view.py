"""Sky view: the closed forms of basin, slope, valley and wall, and what must always hold."""

import math
from collections.abc import Callable

import numpy as np
import pytest

from sitescreen.errors import GridError
from sitescreen.grid import Field, Grid
from sitescreen.terrain import _sky_view_kernel as kernel
from sitescreen.terrain.sky_view import sky_view

# of a terrain model of finite cells, after the tolerance stated with the closed forms
GROUND_TOLERANCE = 0.01


def field(values: object, cell_size_m: float = 30.0) -> Field:
    array = np.asarray(values, dtype=np.float32)
    return Field(array, Grid("EPSG:32637", 0.0, 0.0, cell_size_m, *array.shape), "m", "test ground")


def ground(formula: Callable[..., object], cells: int) -> Field:
    """Ground z(x, y), x east and y north, both 0 in the middle."""
    across = (np.arange(cells) - cells // 2) * 30.0
    x, y = np.meshgrid(across, -across)
    return field(formula(x, y))


def integral(tangent: float, azimuths: int, slope_deg: float = 0.0) -> float:
    """The kernel alone on one cell with the same horizon all round, on a slope that falls north."""
    one = np.ones((1, 1), dtype=np.float32)
    total = np.zeros((1, 1), dtype=np.float32)
    east, north = 0 * one, -one * np.float32(math.tan(math.radians(slope_deg)))
    for k in range(azimuths):
        azimuth = 2 * math.pi * k / azimuths
        sin, cos = np.float32(math.sin(azimuth)), np.float32(math.cos(azimuth))
        kernel.add_direction(one * np.float32(tangent), east, north, sin, cos, total, 0, 1)
    kernel.finish(total, east, north, azimuths, 0, 1)
    return float(total[0, 0])


@pytest.mark.parametrize(
    ("horizon_deg", "expected"),
    [
        (0, 1.0),
        (10, 0.969846),
        (20, 0.883022),
        (30, 0.75),
        (45, 0.5),
        (60, 0.25),
        (80, math.cos(math.radians(80)) ** 2),
    ],
)
def test_basin_is_cos_squared(horizon_deg: float, expected: float) -> None:
    """The same horizon γ all round level ground: cos² γ (Dozier & Frew 1990, eq. 7b with S = 0)."""
    assert integral(math.tan(math.radians(horizon_deg)), 72) == pytest.approx(expected, abs=1e-5)


@pytest.mark.parametrize(("slope_deg", "expected"), [(10, 0.992404), (20, 0.969846), (30, 0.933013), (45, 0.853553)])
def test_open_slope_is_half_of_one_plus_cos(slope_deg: float, expected: float) -> None:
    """(1 + cos S)/2, and not cos S, which is what the integral gives without the slope's own horizon."""
    assert integral(-10.0, 72, slope_deg) == pytest.approx(expected, abs=1e-3)


@pytest.mark.parametrize("slope_deg", [10, 20, 30, 45])
def test_open_slope_as_terrain(slope_deg: float) -> None:
    """A wide plane as ground: the same closed form."""
    f = ground(lambda _, y: math.tan(math.radians(slope_deg)) * y, 41)
    expected = (1 + math.cos(math.radians(slope_deg))) / 2
    assert sky_view(f, 72).values[20, 20] == pytest.approx(expected, abs=1e-3)


def test_level_ground_sees_everything() -> None:
    """1 to the last bit but one, never above."""
    got = sky_view(field(np.full((12, 9), 55.0))).values
    assert got[1:-1, 1:-1] == pytest.approx(1.0, abs=1e-6)
    assert np.nanmax(got) <= 1.0
    assert np.isnan(got[0]).all()


@pytest.mark.parametrize("wall_deg", [20, 30])
def test_valley_floor_is_cos_of_its_walls(wall_deg: float) -> None:
    """Floor of a long V-shaped valley, its walls at the given angle: cos a."""
    f = ground(lambda x, _: np.abs(x) * math.tan(math.radians(wall_deg)), 201)
    got = sky_view(f, 72).values[100, 100]
    # the valley is cut 3 km away, where its end opens a slit of the sky
    assert got == pytest.approx(math.cos(math.radians(wall_deg)), abs=GROUND_TOLERANCE)


@pytest.mark.parametrize("wall_deg", [30, 45])
def test_foot_of_a_wall_is_half_of_one_plus_cos(wall_deg: float) -> None:
    """Level ground before a long ridge that stands at angle a: (1 + cos a)/2."""
    f = ground(lambda _, y: np.where(y >= 300.0, 300.0 * math.tan(math.radians(wall_deg)), 0.0), 401)
    expected = (1 + math.cos(math.radians(wall_deg))) / 2
    assert sky_view(f, 72).values[200, 200] == pytest.approx(expected, abs=GROUND_TOLERANCE)


def test_pit_of_30_degrees_as_terrain() -> None:
    """A round basin with level floor whose rim stands at 30°: 0.75."""
    f = ground(lambda x, y: 300.0 * math.tan(math.radians(30)) * (np.hypot(x, y) >= 300.0), 41)
    assert sky_view(f, 72).values[20, 20] == pytest.approx(0.75, abs=0.02)


def test_holes_are_unknown_and_hide_nothing() -> None:
    """Unknown where the slope is; elsewhere on a plain everything is seen."""
    values = np.zeros((20, 20), dtype=np.float32)
    values[8, 9] = np.nan
    got = sky_view(field(values)).values
    assert np.isnan(got[7:10, 8:11]).all()
    assert np.isnan(got).sum() == 9 + 76
    assert got[np.isfinite(got)] == pytest.approx(1.0, abs=1e-6)


def test_more_azimuths_change_little() -> None:
    """36 directions are enough: within 0.01 of 144 on steep rounded hills, mean slope 35° (the default's stated error).

    Away from the edge of the ground, where a few cells are all there is to see.
    """
    from scipy.ndimage import gaussian_filter

    noise = gaussian_filter(np.random.default_rng(3).standard_normal((60, 60)), 4)
    f = field(noise / noise.std() * 100)
    off = sky_view(f, 36).values - sky_view(f, 144).values
    assert np.abs(off[5:-5, 5:-5]).max() < 0.01


def test_kernels_agree_with_their_python_forms() -> None:
    """Compiled and interpreted: equal to float32's steps, open and unknown directions included."""
    random = np.random.default_rng(4)
    tangent, east, north = random.normal(0, 0.5, (3, 4, 5)).astype(np.float32)
    tangent[1, 2] = np.nan
    outs = []
    for form in (lambda f: f, lambda f: f.py_func):
        total = np.full((4, 5), 3, dtype=np.float32)
        form(kernel.add_direction)(tangent, east, north, np.float32(0.6), np.float32(0.8), total, 0, 4)
        form(kernel.finish)(total, east, north, 4, 0, 4)
        outs.append(total)
    np.testing.assert_allclose(outs[0], outs[1], rtol=1e-5)
    assert np.isfinite(outs[0]).all()


def test_refuses_fewer_than_four_directions() -> None:
    """The number is named."""
    with pytest.raises(GridError, match="from 3 directions"):
        sky_view(field(np.zeros((5, 5))), 3)
