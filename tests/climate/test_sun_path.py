"""The sun's path, its light, and what a skyline leaves of it."""

from typing import Any

import numpy as np
import pytest

from sitescreen.climate.clear_sky import clear_sky, pressure_hpa
from sitescreen.climate.sun_path import (
    DAY_OF_YEAR,
    SunPath,
    assumed_utc_offset_h,
    cos_incidence,
    lit,
    on_plane,
    skyline_at,
    sun_path,
    sun_paths,
    wall_sky_view,
)
from sitescreen.errors import InputError
from sitescreen.settings import load_defaults

SUN = load_defaults().sun
FLAT = np.zeros(72)


def still(height_deg: Any, azimuth_deg: Any, beam: float = 800.0, diffuse: float = 100.0) -> SunPath:
    """A path of given positions."""
    height = np.atleast_2d(np.asarray(height_deg, dtype=np.float64))
    azimuth = np.atleast_2d(np.asarray(azimuth_deg, dtype=np.float64))
    shape = height.shape
    return SunPath(
        DAY_OF_YEAR, np.arange(shape[1]), height, azimuth, np.full(shape, beam), np.full(shape, diffuse), 1, 0
    )


def test_positions_match_the_worked_example_of_reda_and_andreas_2003() -> None:
    """NREL/TP-560-34302, table A5.1: 17 October 2003, 12:30:30, UTC−7: zenith 50.11162°, azimuth 194.34024°."""
    import pandas as pd
    from pvlib.solarposition import spa_python

    found = spa_python(
        pd.DatetimeIndex([pd.Timestamp("2003-10-17 12:30:30-07:00")]),
        39.742476,
        -105.1786,
        altitude=1830.14,
        pressure=82_000.0,
        temperature=11.0,
        delta_t=67.0,
        atmos_refract=0.5667,
    ).iloc[0]
    assert found["apparent_zenith"] == pytest.approx(50.111622, abs=1e-4)
    assert found["azimuth"] == pytest.approx(194.340241, abs=1e-4)


def test_our_refraction_is_that_of_the_worked_example() -> None:
    """The same example without refraction: zenith 50.127954°."""
    from pvlib.spa import atmospheric_refraction_correction

    bent = atmospheric_refraction_correction(820.0, 11.0, 90.0 - 50.127954, 0.5667)
    assert 50.127954 - bent == pytest.approx(50.111622, abs=1e-4)


@pytest.mark.parametrize(
    ("lat", "days", "hours"),
    [
        (0.0, 11, 12.08),  # 12 h and 0.57° of refraction at either end, on a path 23° aslant
        (20.0, 5, 13.211 + 0.08),  # 13.211 h at the solstice without refraction (geometry)
        (-20.0, 11, 13.211 + 0.08),
        (-20.0, 5, 10.789 + 0.08),
        (10.0, 11, 11.415 + 0.08),
    ],
)
def test_day_length_is_that_of_the_sphere(lat: float, days: int, hours: float) -> None:
    """Day length N = (2/15) acos(−tan φ tan δ), Cooper's δ = 23.45° sin(360°(284 + n)/365), and refraction."""
    path = sun_path(37.0, lat, 0.0, SUN.model_copy(update={"step_h": 0.05}))
    n = DAY_OF_YEAR[days]
    decl = np.radians(23.45 * np.sin(np.radians(360.0 * (284 + n) / 365.0)))
    phi, low = np.radians(lat), np.radians(-0.5667)
    angle = np.degrees(np.arccos((np.sin(low) - np.sin(phi) * np.sin(decl)) / (np.cos(phi) * np.cos(decl))))
    counted = lit(path, FLAT)[days].sum() * path.step_h
    # two steps, and 0.1° of the declination
    assert counted == pytest.approx(2.0 * angle / 15.0, abs=0.12)
    assert counted == pytest.approx(hours, abs=0.12)


def test_noon_and_solstice_at_the_equator() -> None:
    """Due north in June at 66.56°, due south in December; 08:00 at the equinox in the east at 30° (spherical geometry).

    The 16th of March and the 10th of December stand off the equinox and the solstice, hence the tolerances.
    """
    path = sun_path(0.0, 0.0, 0.0, SUN)
    june, december, march = path.elevation_deg[5], path.elevation_deg[11], path.elevation_deg[2]
    assert june.max() == pytest.approx(66.9, abs=0.15)  # declination of 11 June 23.1°
    assert np.cos(np.radians(path.azimuth_deg[5, june.argmax()])) > np.cos(np.radians(5.0))
    assert path.azimuth_deg[11, december.argmax()] == pytest.approx(180.0, abs=5.0)
    assert march.max() == pytest.approx(88.0, abs=1.5)


def test_southern_hemisphere_mirrors_the_northern() -> None:
    """A mirrored sun: at 10° S with the sun of 23° N as at 10° N with the sun of 23° S, so June mirrors December."""
    north, south = sun_path(30.0, 10.0, 0.0, SUN), sun_path(30.0, -10.0, 0.0, SUN)
    assert north.elevation_deg[5].max() == pytest.approx(south.elevation_deg[11].max(), abs=0.3)
    hours = [lit(one, FLAT)[month].sum() * SUN.step_h for one, month in ((north, 5), (south, 11))]
    assert hours[0] == pytest.approx(hours[1], abs=0.26)


def test_no_value_is_unknown_and_the_night_gives_no_light() -> None:
    path = sun_path(37.0, -1.3, 1700.0, SUN)
    assert all(np.isfinite(array).all() for array in path[1:6])
    night = path.elevation_deg <= 0
    assert night.any()
    assert not path.beam_w_m2[night].any()
    assert not path.diffuse_w_m2[night].any()
    assert (path.beam_w_m2[~night] >= 0).all()
    assert path.elevation_deg.shape == (12, 96)
    assert path.hour[:2].tolist() == [0.125, 0.375]


def test_clock_time_follows_the_stated_zone_else_the_longitude() -> None:
    stated = sun_path(37.5, 0.0, 0.0, SUN, utc_offset_h=2.0)
    assumed = sun_path(37.5, 0.0, 0.0, SUN)
    assert (stated.utc_offset_h, assumed.utc_offset_h) == (2.0, 3.0)
    # the same sun, an hour earlier by the clock, and an hour's wandering of the sun in between
    assert stated.elevation_deg[:, :-4] == pytest.approx(assumed.elevation_deg[:, 4:], abs=0.02)
    assert [assumed_utc_offset_h(lon) for lon in (0.0, 7.4, 7.6, -7.6, 44.0)] == [0, 0, 1, -1, 3]


def test_kasten_and_young_1989_and_ineichen_and_perez_2002() -> None:
    """Appl. Opt. 28:4735–4738: air masses; Sol. Energy 73:151–157 at zenith 30°, turbidity 3, 1,367 W/m²."""
    from pvlib.atmosphere import get_relative_airmass

    masses = get_relative_airmass(90.0 - np.array([90.0, 60.0, 30.0, 10.0, 5.0]), "kastenyoung1989")
    assert masses == pytest.approx([0.9997, 1.1540, 1.9943, 5.586, 10.306], rel=2e-4)
    for elevation_m, level in ((0.0, 898.7), (1500.0, 977.4)):
        # day 94: the Earth at its mean distance by Spencer; 1361 for 1367 scales the light
        beam, diffuse = clear_sky(np.array([60.0]), np.array([94]), elevation_m, 3.0)
        assert (beam * np.sin(np.radians(60.0)) + diffuse)[0] * 1367 / 1361 == pytest.approx(level, rel=2e-3)


def test_standard_atmosphere() -> None:
    """ICAO Doc 7488: 1,000 m 898.75 hPa, 2,000 m 794.95 hPa."""
    assert [pressure_hpa(height) for height in (0.0, 1000.0, 2000.0)] == pytest.approx(
        [1013.25, 898.75, 794.95], abs=0.05
    )


def test_incidence_matches_duffie_and_beckman() -> None:
    """Solar Engineering of Thermal Processes, example 1.6.1: cos θ 0.817 on 45° facing 15° west of south.

    The sun at 43° N, δ = −14°, hour angle −22.5° by the book's own equations for height and azimuth.
    """
    phi, decl, turn = np.radians(43.0), np.radians(-13.95), np.radians(-22.5)
    sine = np.sin(phi) * np.sin(decl) + np.cos(phi) * np.cos(decl) * np.cos(turn)
    east = -np.cos(decl) * np.sin(turn)
    north = np.cos(phi) * np.sin(decl) - np.sin(phi) * np.cos(decl) * np.cos(turn)
    path = still(np.degrees(np.arcsin(sine)), np.degrees(np.arctan2(east, north)) % 360.0)
    assert cos_incidence(path, 45.0, 195.0)[0, 0] == pytest.approx(0.817, abs=1e-3)
    assert cos_incidence(path, 90.0, 0.0)[0, 0] == 0.0  # behind a north wall


@pytest.mark.parametrize(
    ("date", "solar_h", "zenith", "from_south"), [("2026-02-13", 9.5, 66.5, -40.0), ("2026-07-01", 18.5, 79.6, 112.0)]
)
def test_positions_match_duffie_and_beckman_example_1_6_2(
    date: str, solar_h: float, zenith: float, from_south: float
) -> None:
    """Solar Engineering of Thermal Processes: 43° N, west positive; their declinations are 0.5° off."""
    import pandas as pd
    from pvlib.solarposition import spa_python

    def at(hour: float) -> Any:
        return spa_python(pd.DatetimeIndex([pd.Timestamp(date, tz="UTC") + pd.Timedelta(hours=hour)]), 43.0, 0.0).iloc[
            0
        ]

    found = at(solar_h - at(12.0)["equation_of_time"] / 60.0)
    assert found["zenith"] == pytest.approx(zenith, abs=0.6)
    assert found["azimuth"] - 180.0 == pytest.approx(from_south, abs=0.6)


def test_extraterrestrial_facades_at_the_equator() -> None:
    """Day sums by integration: level 24·G/π = 10.397 kWh/m² at the equinox, a west wall half; 2.411 over the year."""
    angle = np.radians(np.arange(-180.0, 180.0, 0.25) + 0.125)
    sums = []
    for decl in np.radians(23.45) * np.sin(2.0 * np.pi * (np.arange(365) + 0.5) / 365.0):
        sine, east = np.cos(decl) * np.cos(angle), -np.cos(decl) * np.sin(angle)
        height, azimuth = np.degrees(np.arcsin(sine)), np.degrees(np.arctan2(east, np.full_like(angle, np.sin(decl))))
        path = still(height, azimuth % 360.0, beam=1.361, diffuse=0.0)
        up = lit(path, FLAT)
        sums.append(
            [(on_plane(path, up, tilt, face, albedo=0.0)).sum() / 60 for tilt, face in ((0, 0), (90, 270), (90, 0))]
        )
    level, west, north = np.array(sums).T
    assert level.max() == pytest.approx(10.397, rel=1e-3)
    assert west.max() == pytest.approx(5.199, rel=1e-3)
    # a sine for the declination in place of the true orbit
    assert west.mean() / north.mean() == pytest.approx(2.411, rel=0.02)


def test_daily_extraterrestrial_sum_matches_fao_56_example_8() -> None:
    """Allen et al. 1998, FAO 56: 20° S, 3 September: 32.2 MJ/m², between two of our days."""
    from pvlib.irradiance import get_extra_radiation

    path = sun_path(0.0, -20.0, 0.0, SUN)
    sine = np.maximum(np.sin(np.radians(path.elevation_deg)), 0.0)
    extra = get_extra_radiation(DAY_OF_YEAR, 1366.7, method="spencer")  # their 0.0820 MJ/m²min
    day = (sine * extra[:, None]).sum(axis=1) * path.step_h * 3.6e-3
    assert np.interp(246, DAY_OF_YEAR, day) == pytest.approx(32.2, rel=0.01)


def test_skyline_is_linear_between_its_directions_and_joins_at_north() -> None:
    skyline = np.zeros(72)
    skyline[0], skyline[1], skyline[71] = 10.0, 20.0, -5.0
    assert skyline_at(skyline, np.array([0.0, 2.5, 357.5, 360.0, 355.0, 90.0])).tolist() == [10, 15, 5, 10, 0, 0]
    both = skyline_at(np.stack([skyline, FLAT]), np.array([[2.5, 7.5]]))
    assert both.tolist() == [[[15.0, 10.0]], [[0.0, 0.0]]]


def test_a_sun_below_the_skyline_or_the_horizon_is_not_seen() -> None:
    skyline = np.where(np.arange(72) < 36, 20.0, np.nan)  # a wall of 20° in the east, nothing known in the west
    path = still([[10.0, 30.0, 10.0, -0.5]], [[90.0, 90.0, 270.0, 270.0]])
    assert lit(path, skyline).tolist() == [[False, True, True, False]]


def test_a_wall_in_the_east_delays_the_sunrise_by_the_minutes_computed() -> None:
    """At the equator in March the sun climbs 15° an hour straight up: behind 15° it rises an hour later."""
    path = sun_path(0.0, 0.0, 0.0, SUN)
    wall = np.where((np.arange(72) >= 1) & (np.arange(72) < 36), 15.0, 0.0)
    first = [path.hour[one[2].argmax()] for one in (lit(path, FLAT), lit(path, wall))]
    # 15° by the clock, less the 0.6° by which refraction lifts the sun over a level horizon, and one step
    assert first[1] - first[0] == pytest.approx(1.0 + 0.5 / 15, abs=path.step_h)


def test_symmetric_valley_has_symmetric_hours() -> None:
    path = sun_path(0.0, 0.0, 0.0, SUN)
    valley = 25.0 * np.abs(np.sin(np.radians(np.arange(72) * 5.0)))
    seen = lit(path, valley)[2]
    noon = path.hour[path.elevation_deg[2].argmax()]
    before, after = (seen & (path.hour < noon)).sum(), (seen & (path.hour > noon)).sum()
    assert abs(int(before) - int(after)) <= 1
    assert before > 0


def test_light_on_a_plane_is_the_sum_of_its_parts() -> None:
    path = still([[30.0]], [[270.0]])
    wall = on_plane(path, np.array([[True]]), 90.0, 270.0, albedo=0.2)
    assert wall[0, 0] == pytest.approx(800 * np.cos(np.radians(30)) + 50.0 + 0.2 * 0.5 * (400.0 + 100.0))
    shaded = on_plane(path, np.array([[False]]), 90.0, 270.0, sky_view=0.4, albedo=0.2)
    assert shaded[0, 0] == pytest.approx(40.0 + 0.2 * 0.6 * 100.0)
    cloudy = on_plane(path, np.array([[True]]), 0.0, 0.0, clear_share=0.25)
    assert cloudy[0, 0] == pytest.approx(0.25 * 400.0 + 100.0)


def test_sky_that_a_wall_sees() -> None:
    assert wall_sky_view(FLAT, 0.0) == pytest.approx(0.5, abs=1e-12)
    ring = np.full((2, 72), 30.0)
    ring[1] = 90.0
    height = np.radians(30.0)
    left = 2.0 / np.pi * ((np.pi / 2 - height) / 2 - np.sin(2 * height) / 4)  # the integral over an even ring
    assert wall_sky_view(ring, 123.0) == pytest.approx([left, 0.0], abs=1e-12)
    behind = np.where(np.abs(np.arange(72) - 36) < 17, 40.0, 0.0)  # all ground in the south
    assert wall_sky_view(behind, 0.0) == pytest.approx(0.5, abs=1e-3)
    assert float(wall_sky_view(behind, 180.0)) < 0.4


def test_a_plots_sun_does_not_depend_on_the_other_plots() -> None:
    lon, lat, height = (
        np.array([36.91, 36.99, 37.01, 37.0]),
        np.array([-1.29, -1.21, -1.21, -1.2]),
        np.array([1710.0, 1790.0, 1710.0, np.nan]),
    )
    skies = sun_paths(lon, lat, height, SUN)
    assert skies.which[0] == skies.which[1] != skies.which[2]
    assert skies.which[3] == -1
    alone = sun_paths(lon[:1], lat[:1], height[:1], SUN)
    assert all(np.array_equal(a, b) for a, b in zip(alone.paths[0], skies.paths[skies.which[0]], strict=True))
    exact = sun_path(36.91, -1.29, 1710.0, SUN, utc_offset_h=alone.paths[0].utc_offset_h)
    up = exact.elevation_deg > 2.0
    assert np.abs(alone.paths[0].elevation_deg - exact.elevation_deg)[up].max() < 0.072
    high = exact.elevation_deg > 20.0
    assert np.abs(alone.paths[0].beam_w_m2[high] / exact.beam_w_m2[high] - 1.0).max() < 0.007


def test_unknown_places_are_refused() -> None:
    with pytest.raises(InputError, match="height nan m"):
        sun_path(0.0, 0.0, float("nan"), SUN)
