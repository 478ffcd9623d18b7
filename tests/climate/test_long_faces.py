"""Sun on the two long faces, by the bearing of the axis."""

from collections.abc import Callable

import numpy as np
import pytest

from sitescreen.climate._long_faces_kernel import long_faces
from sitescreen.climate.long_faces import beam_sums, face_load
from sitescreen.climate.sun_path import SunPath

ClearYear = Callable[..., SunPath]

SOLAR_CONSTANT_W_M2 = 1361.0


def _year_at(latitude_deg: float, steps: int = 480) -> tuple[np.ndarray, np.ndarray]:
    """Extraterrestrial beam's horizontal part and the sun's azimuth, by plain spherical geometry, over a year."""
    day = np.arange(0.5, 365.0, 5.0)
    # the sun's longitude at an even pace: the declination then has the year's mean of a circular orbit
    declination = np.arcsin(np.sin(np.radians(23.4393)) * np.sin(2 * np.pi * day / 365.0))[:, None]
    hour = (np.arange(steps) + 0.5) / steps * 2 * np.pi - np.pi
    latitude = np.radians(latitude_deg)
    east = -np.cos(declination) * np.sin(hour)
    north = np.cos(latitude) * np.sin(declination) - np.sin(latitude) * np.cos(declination) * np.cos(hour)
    up = np.sin(latitude) * np.sin(declination) + np.cos(latitude) * np.cos(declination) * np.cos(hour)
    across = np.where(up > 0, SOLAR_CONSTANT_W_M2 * np.hypot(east, north), 0.0)
    return across.ravel()[None, :], np.degrees(np.arctan2(east, north)).ravel() % 360.0


def _faces(across: np.ndarray, azimuth_deg: np.ndarray) -> np.ndarray:
    return beam_sums(across, np.full(azimuth_deg.shape, 30.0), azimuth_deg).faces


def test_sums_every_moment_on_the_face_it_reaches() -> None:
    """Against the plain sum over the two faces, each lit only from its front."""
    random = np.random.default_rng(6)
    across, azimuth = random.random((4, 60)), random.random(60) * 360.0
    bearings = np.arange(180)
    plain = sum(
        (across[:, :, None] * np.clip(np.cos(np.radians(azimuth[:, None] - bearings - turn)), 0.0, None)).sum(axis=1)
        for turn in (90.0, -90.0)
    )
    assert _faces(across, azimuth) == pytest.approx(plain, abs=1e-12)


def test_the_kernel_is_the_same_compiled_and_not() -> None:
    random = np.random.default_rng(8)
    across, azimuth = random.random((3, 40)), random.random(40) * 180.0
    across[random.random(across.shape) < 0.3] = 0.0
    bearing = np.radians(np.arange(180))
    arguments = (
        across, random.random(40), azimuth.astype(np.int64), np.sin(np.radians(azimuth)), np.cos(np.radians(azimuth)),
        np.sin(bearing), np.cos(bearing),
    )  # fmt: skip
    found = []
    for kernel in (long_faces, long_faces.py_func):
        faces, level = np.full((3, 180), np.nan), np.full(3, np.nan)
        kernel(*arguments, faces, level, 0, 3)
        found.append((faces, level))
    assert found[0][0] == pytest.approx(found[1][0], abs=1e-12)
    assert found[0][1] == pytest.approx(found[1][1])
    assert found[0][1] == pytest.approx((across * arguments[1]).sum(axis=1))


def test_one_plot_alone_is_the_same_to_the_last_bit() -> None:
    random = np.random.default_rng(7)
    across, azimuth = random.random((9, 288)), random.random(288) * 360.0
    together = _faces(across, azimuth)
    assert np.array_equal(_faces(across[5:6], azimuth)[0], together[5])


def test_equator_year_ratio_of_east_west_to_north_south_faces() -> None:
    """Above the air: E and W walls 4.986, N and S 2.068 kWh/m² a day, ratio 2.411.

    Closed form, with 1361 W/m² and a circular orbit.
    """
    across, azimuth = _year_at(0.0)
    mean = _faces(across, azimuth)[0] / across.size * 24.0 / 2.0 / 1000.0
    assert mean[90] == pytest.approx(2.068, abs=0.01)
    assert mean[0] == pytest.approx(4.986, abs=0.01)
    assert mean[0] / mean[90] == pytest.approx(2.411, abs=0.01)
    assert mean.argmin() == 90


def test_a_day_with_the_sun_in_the_east_west_plane() -> None:
    """Equator at the equinox: E and W walls get half of what level ground gets, N and S walls nothing.

    24·1361/π/2 = 5.199 kWh/m² a day.
    """
    hour = (np.arange(960) + 0.5) / 960 * 2 * np.pi - np.pi
    up = np.cos(hour)
    across = np.where(up > 0, SOLAR_CONSTANT_W_M2 * np.abs(np.sin(hour)), 0.0)[None, :]
    found = _faces(across, np.where(hour < 0, 90.0, 270.0))[0] / hour.size * 24.0 / 1000.0
    assert found[0] / 2.0 == pytest.approx(5.199, abs=0.001)
    assert found[90] == pytest.approx(0.0, abs=1e-9)


def test_southern_hemisphere_mirrors_the_northern() -> None:
    """The same year seen upside down: bearings b become 180° − b; over the whole year the two curves are one."""
    across, azimuth = _year_at(25.0)
    north = _faces(across, azimuth)[0]
    mirrored = _faces(across, (180.0 - azimuth) % 360.0)[0]
    assert mirrored == pytest.approx(north[(180 - np.arange(180)) % 180], rel=1e-9)
    south = _faces(*_year_at(-25.0))[0]
    # the sampled days are not quite their own mirror about the equinoxes
    assert south == pytest.approx(north, rel=2e-3)


@pytest.mark.parametrize("latitude_deg", [0.0, 4.0, 10.0])
def test_walls_under_a_clear_sky_by_the_way_they_face(clear_year: ClearYear, latitude_deg: float) -> None:
    """The year's mean day on both long faces, kWh/m² a day, facing 0 (N and S), 15 … 90° (E and W).

    ASHRAE clear sky 2013 (Handbook of Fundamentals, ch. 14) with τb 0.4, τd 2.4, isotropic sky, albedo 0.2, worked out
    independently of this code for the equator; at 4° it is the same to 0.01, at 10° it begins at 2.33 and ends at 3.52.
    """
    table = np.array([2.32, 2.38, 2.62, 2.97, 3.28, 3.48, 3.55])
    every = np.ones((1, 12))
    # two paths half a month apart stand for the year's every day
    paths = [clear_year(latitude_deg, shift) for shift in (0.0, 365.25 / 24)]
    loads = [face_load(path, np.zeros((1, 72)), np.ones(1), every, np.ones((12, 288)), 0.2) for path in paths]
    mean = sum(one.beam_kwh_m2[0] + one.sky_kwh_m2[0] for one in loads) / 2
    facing = [*mean[90 + np.arange(0, 90, 15)].tolist(), mean[0]]
    if latitude_deg < 10:
        assert facing == pytest.approx(table, abs=0.03)
    else:
        assert [facing[0], facing[-1]] == pytest.approx([2.33, 3.52], abs=0.03)
    # turning the long face 15° off north costs 3 %, 30° 13 %, 45° 28 %
    if latitude_deg == 0:
        assert np.array(facing[1:4]) / facing[0] == pytest.approx([1.03, 1.13, 1.28], abs=0.01)


def test_light_of_sky_and_ground_on_a_wall_in_the_open(clear_year: ClearYear) -> None:
    """Half the sky's light, and the ground's fifth of what falls on it over the other half; no beam at all."""
    path = clear_year(0.0)
    load = face_load(path, np.zeros((1, 72)), np.ones(1), np.ones((1, 12)), np.zeros((12, 288)), 0.2)
    months = np.array([31, 28, 31, 30, 31, 30, 31, 31, 30, 31, 30, 31]) / 365
    sky = (path.diffuse_w_m2.sum(axis=1) / 12_000 * months).sum()
    assert load.sky_kwh_m2 == pytest.approx(0.5 * sky + 0.2 * 0.5 * sky)
    assert load.beam_kwh_m2 == pytest.approx(0.0)


def test_a_wall_of_rock_to_the_east_takes_the_mornings_only(clear_year: ClearYear) -> None:
    """With the eastern half of the skyline at 89°, what is left equals what counts of the afternoons alone."""
    path = clear_year(0.0)
    skyline = np.zeros((1, 72))
    skyline[0, 1:36] = 89.9
    level, always, every = np.zeros((1, 72)), np.ones((12, 288)), (np.ones(1), np.ones((1, 12)))
    shaded = face_load(path, skyline, *every, always, 0.2)
    afternoons = face_load(path, level, *every, (np.sin(np.radians(path.azimuth_deg)) < 0) * 1.0, 0.2)
    assert shaded.beam_kwh_m2 == pytest.approx(afternoons.beam_kwh_m2, rel=0.02)
    whole = face_load(path, level, *every, always, 0.2)
    assert shaded.beam_kwh_m2[0, 0] == pytest.approx(0.5 * whole.beam_kwh_m2[0, 0], rel=0.02)


def test_months_count_as_they_are_told_to(clear_year: ClearYear) -> None:
    path = clear_year(-10.0)
    open_sky = np.zeros((1, 72)), np.ones(1)
    rest = np.ones((12, 288)), 0.2
    summer, winter = np.zeros((1, 12)), np.ones((1, 12))
    summer[0, [11, 0, 1]], winter[0, [11, 0, 1]] = 1.0, 0.0
    parts = [face_load(path, *open_sky, months, *rest).beam_kwh_m2 for months in (summer, winter)]
    assert sum(parts) == pytest.approx(face_load(path, *open_sky, np.ones((1, 12)), *rest).beam_kwh_m2)
    assert parts[0][0, 0] < parts[1][0, 0]
