"""Water that the terrain shows as exactly level, and whether a map agrees with it."""

from typing import Any

import numpy as np
import pytest

from sitescreen.grid import Field, Grid
from sitescreen.terrain._flat_water_kernel import level_patches
from sitescreen.terrain.flat_water import flat_water, together, water_disagreement

CELL_M = 90.0
CELL_KM2 = 0.0081


def field(heights: Any) -> Field:
    heights = np.asarray(heights, dtype=np.float32)
    return Field(heights, Grid("EPSG:32637", 0.0, 0.0, CELL_M, *heights.shape), "m", "height")


def hillside(rows: int = 60, cols: int = 80) -> Any:
    """Falls 1 m a cell to the east and 0.2 m to the south."""
    row, col = np.mgrid[:rows, :cols]
    return 500.0 - col - 0.2 * row


def test_two_lakes_are_found_with_level_and_area() -> None:
    heights = hillside()
    heights[10:30, 10:25] = 321.5
    heights[35:50, 40:70] = 123.25
    found = flat_water(field(heights))
    np.testing.assert_allclose(found.level_m, [321.5, 123.25])
    np.testing.assert_allclose(found.area_km2, [20 * 15 * CELL_KM2, 15 * 30 * CELL_KM2])
    expected = np.zeros((60, 80), dtype=int)
    expected[10:30, 10:25], expected[35:50, 40:70] = 1, 2
    np.testing.assert_array_equal(found.label, expected)


def test_adding_height_changes_nothing_but_the_level() -> None:
    heights = hillside()
    heights[10:30, 10:25] = 321.5
    low, high = flat_water(field(heights)), flat_water(field(heights + 1000.0))
    np.testing.assert_array_equal(low.label, high.label)
    np.testing.assert_allclose(high.level_m, low.level_m + 1000.0)


def test_a_level_patch_must_be_large() -> None:
    heights = hillside()
    heights[10:17, 10:19] = 321.5  # 63 cells of 0.0081 km² = 0.5103 km²
    assert len(flat_water(field(heights), smallest_km2=0.5).level_m) == 1
    assert len(flat_water(field(heights), smallest_km2=0.52).level_m) == 0


def test_narrow_arms_belong_to_their_lake_and_lone_level_strips_to_none() -> None:
    """An arm one cell wide is part of the lake it leads to; a terrace of two cells' width is no water anywhere."""
    heights = hillside()
    heights[10:30, 10:25] = 321.5
    heights[20, 25:60] = 321.5
    heights[21, 60] = 321.5  # touches by a corner only
    heights[40:42, :] = 77.0
    found = flat_water(field(heights))
    expected = np.zeros((60, 80), dtype=int)
    expected[10:30, 10:25] = expected[20, 25:60] = 1
    np.testing.assert_array_equal(found.label, expected)


def test_gentle_ground_is_no_water() -> None:
    """A plain that falls by less than a millimetre a cell is not level."""
    col = np.mgrid[:60, :200][1]
    assert len(flat_water(field(100.0 - 0.0005 * col)).level_m) == 0
    noise = np.random.default_rng(1).normal(0.0, 0.05, (60, 80))
    assert len(flat_water(field(100.0 + noise)).level_m) == 0


@pytest.mark.parametrize("number", [level_patches, level_patches.py_func])
def test_patches_are_numbered_from_the_north_west(number: Any) -> None:
    heights = np.arange(120, dtype=np.float32).reshape(10, 12)
    heights[6:9, 1:4] = -1.0
    heights[1:4, 6:9] = -2.0
    label = np.zeros(heights.shape, dtype=np.int32)
    assert number(heights, label) == 2
    assert label[2, 7] == 1
    assert label[7, 2] == 2
    assert (label > 0).sum() == 18


def test_pieces_of_ground_add_up() -> None:
    heights = hillside()
    heights[10:30, 10:25] = 321.5
    kind = np.zeros((60, 80), dtype=np.uint8)
    kind[10:30, 5:20] = 2
    whole_water = flat_water(field(heights))
    whole = water_disagreement(kind, whole_water, field(heights))
    halves = []
    for rows in (slice(0, 20), slice(20, 60)):
        part = field(heights[rows])
        halves.append(water_disagreement(kind[rows], whole_water.part(part.grid, (rows, slice(None))), part))
    both = together(halves)
    assert both.overlap == pytest.approx(whole.overlap) == pytest.approx(0.5)
    assert both.mapped_km2 == pytest.approx(whole.mapped_km2)
    assert both.mapped_not_flat_share == pytest.approx(whole.mapped_not_flat_share)
    assert both.lake_shore_range_m == max(one.lake_shore_range_m for one in halves)
    assert np.isnan(both.sea_high_m)


def test_water_at_the_rim_and_holes_in_the_data() -> None:
    heights = hillside()
    heights[:20, :20] = 0.0
    heights[5:8, 5:8] = np.nan
    found = flat_water(field(heights))
    assert found.label[0, 0] == 1
    assert (found.label[5:8, 5:8] == 0).all()
    assert (found.label[:20, :20] == 1).sum() == 400 - 9
    assert len(flat_water(field(np.full((30, 30), np.nan))).level_m) == 0


def test_a_map_that_agrees_says_so() -> None:
    heights = hillside()
    heights[10:30, 10:25] = 321.5
    kind = np.zeros((60, 80), dtype=np.uint8)
    kind[10:30, 10:25] = 2
    found = water_disagreement(kind, flat_water(field(heights)), field(heights))
    assert found.overlap == 1.0
    assert found.mapped_not_flat_share == 0.0
    assert found.lake_shore_range_m == 0.0
    assert np.isnan(found.sea_high_m)
    assert found.agrees
    assert found.mapped_km2 == found.flat_km2 == found.both_km2 == pytest.approx(300 * CELL_KM2)


def test_a_map_drawn_too_large_is_told_in_figures() -> None:
    """600 cells mapped, 300 of them level: overlap 1/2, and its western rim climbs the hillside."""
    heights = hillside()
    heights[10:30, 25:40] = 400.0
    kind = np.zeros((60, 80), dtype=np.uint8)
    kind[10:30, 10:40] = 2
    found = water_disagreement(kind, flat_water(field(heights)), field(heights))
    assert found.overlap == pytest.approx(0.5)
    assert found.mapped_not_flat_share == pytest.approx(0.5)
    rim = np.concatenate([heights[10, 10:40], heights[29, 10:40], heights[11:29, 10], heights[11:29, 39]])
    assert found.lake_shore_range_m == pytest.approx(np.percentile(rim, 95) - np.percentile(rim, 5), abs=0.1)
    assert not found.agrees
    assert "50%" in found.sentence
    assert "overlap 0.50" in found.sentence


def test_the_edge_of_the_window_is_no_shore() -> None:
    """A lake that runs on beyond the window: the cells at the window's edge are open water, whatever stands there."""
    heights = hillside()
    heights[10:30, :15] = 321.5
    heights[11:29, 0] = 500.0
    kind = np.zeros((60, 80), dtype=np.uint8)
    kind[10:30, :15] = 2
    found = water_disagreement(kind, flat_water(field(heights)), field(heights))
    assert found.lake_shore_range_m == 0.0


def test_a_sea_over_a_hill_is_told() -> None:
    heights = hillside()
    kind = np.zeros((60, 80), dtype=np.uint8)
    kind[:, 60:] = 1
    found = water_disagreement(kind, flat_water(field(heights)), field(heights))
    assert found.sea_high_m == pytest.approx(np.percentile(heights[:, 60:], 95), abs=0.01)
    assert not found.agrees


def test_unknown_ground_under_the_sea_is_not_compared() -> None:
    heights = hillside()
    heights[:, 60:] = np.nan
    kind = np.zeros((60, 80), dtype=np.uint8)
    kind[:, 60:] = 1
    found = water_disagreement(kind, flat_water(field(heights)), field(heights))
    assert found.mapped_km2 == 0.0
    assert np.isnan(found.overlap)
    assert found.agrees
    assert "Neither" in found.sentence
