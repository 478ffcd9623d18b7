"""Shadows of rows and eaves, held to worked figures of plain geometry."""

import numpy as np
import pytest

from sitescreen.climate.row_spacing import farthest_reach, shadow_reach


@pytest.mark.parametrize(
    ("elevation_deg", "hsa_deg", "vsa_deg"),
    [(45, 0, 45.00), (45, 60, 63.43), (30, 45, 39.23), (60, 30, 63.43), (20, 10, 20.28)],
)
def test_vertical_shadow_angle(elevation_deg: float, hsa_deg: float, vsa_deg: float) -> None:
    """Tan VSA = tan h / cos HSA, the definition in textbooks on sunshades; worked by hand."""
    reach = shadow_reach(elevation_deg, 120.0 + hsa_deg, 120.0)
    assert np.degrees(np.arctan(1.0 / reach)) == pytest.approx(vsa_deg, abs=0.005)


@pytest.mark.parametrize(
    ("elevation_deg", "hsa_deg", "gap"),
    [(66.56, 0, 0.434), (40.45, 58.49, 0.613), (45, 0, 1.000), (30, 0, 1.732), (30, 45, 1.225)],
)
def test_gap_between_rows_for_the_sun(elevation_deg: float, hsa_deg: float, gap: float) -> None:
    """d/H = cos HSA / tan h; the first two are noon and 9 h solar time of the solstice at the equator, north wall."""
    assert shadow_reach(elevation_deg, hsa_deg, 0.0) == pytest.approx(gap, abs=5e-4)


def test_eave_over_a_metre_and_a_half_of_wall() -> None:
    """1.5 m of wall and a vertical shadow angle of 60° need an eave of 0.866 m."""
    assert 1.5 * shadow_reach(60.0, 180.0, 180.0) == pytest.approx(0.866, abs=5e-4)


def test_sun_behind_the_wall_or_down_throws_no_shadow_on_it() -> None:
    assert shadow_reach(30.0, 180.0, 0.0) == 0.0
    assert shadow_reach(30.0, 90.0, 0.0) == 0.0
    assert shadow_reach(-5.0, 0.0, 0.0) == 0.0


def test_ground_that_falls_towards_the_sun_brings_rows_closer() -> None:
    """Sun at 45°, ground falling 1 in 4 towards it: 1 / (1 + 1/4) = 0.8; rising towards it: 1 / (1 − 1/4) = 1.333."""
    quarter = np.degrees(np.arctan(0.25))
    assert shadow_reach(45.0, 0.0, 0.0, quarter, 0.0) == pytest.approx(0.8)
    assert shadow_reach(45.0, 0.0, 0.0, quarter, 180.0) == pytest.approx(4 / 3)
    assert shadow_reach(45.0, 0.0, 0.0, quarter, 90.0) == pytest.approx(1.0)


def test_ground_as_steep_as_the_sun_has_no_gap_that_is_enough() -> None:
    assert np.isinf(shadow_reach(20.0, 0.0, 0.0, 21.0, 180.0))


def test_shadow_on_a_slope_agrees_with_a_ray_followed_to_the_row() -> None:
    """From the foot of the wall towards the sun until the ray is 1 m above the ground: that is where the row may be."""
    elevation, azimuth, face, slope, aspect = 35.0, 70.0, 30.0, 12.0, 200.0
    along = np.arange(0.0, 20.0, 1e-5)
    ray = along * np.tan(np.radians(elevation))
    ground = -along * np.tan(np.radians(slope)) * np.cos(np.radians(azimuth - aspect))
    first = along[np.argmax(ray - ground >= 1.0)]
    expected = first * np.cos(np.radians(azimuth - face))
    assert shadow_reach(elevation, azimuth, face, slope, aspect) == pytest.approx(expected, abs=1e-4)


def test_farthest_of_the_chosen_moments_only() -> None:
    """Of 30, 45 and 60° square on, the wall that looks at the last two needs 1 m, the one that faces away nothing."""
    elevation, azimuth = np.array([30.0, 45.0, 60.0]), np.zeros(3)
    chosen = np.array([[False, True, True], [True, True, True], [True, True, True], [False, False, False]])
    found = farthest_reach(elevation, azimuth, chosen, np.array([0.0, 0.0, 180.0, 0.0]))
    assert found == pytest.approx([1.0, np.sqrt(3.0), 0.0, 0.0])


def test_level_ground_needs_no_aspect() -> None:
    found = farthest_reach(
        np.array([45.0]), np.zeros(1), np.ones((1, 1), dtype=bool), np.zeros(1), np.zeros(1), np.array([np.nan])
    )
    assert found == pytest.approx([1.0])
