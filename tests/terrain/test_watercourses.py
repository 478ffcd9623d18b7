"""Beds of a straight V valley, whose catchments and heights follow by hand."""

import numpy as np
import pytest

from sitescreen.grid import Field, Grid
from sitescreen.judgement.coverage import cover
from sitescreen.judgement.readings import Readings
from sitescreen.judgement.watercourse_readings import NO_BED, with_watercourses
from sitescreen.terrain.watercourses import Watercourses, watercourses

ROWS, COLS, CELL = 101, 61, 30.0
AXIS = 30
SIDE, DOWN = 1.5, 0.3
"""The valley's sides rise by this each cell, and its bed falls by this each cell southwards. [m]"""


def valley() -> Field:
    away = np.abs(np.arange(COLS) - AXIS)
    ground = 200.0 + SIDE * away[None, :] - DOWN * np.arange(ROWS)[:, None]
    return Field(ground.astype(np.float32), Grid("EPSG:32637", 500_000.0, 9_600_000.0, CELL, ROWS, COLS), "m", "ground")


def dry() -> np.ndarray:
    return np.zeros((ROWS, COLS), dtype=np.uint8)


def found(water: np.ndarray | None = None, least_km2: float = 1.0, near_m: float = 0.0) -> Watercourses:
    return watercourses(valley(), dry() if water is None else water, least_km2, near_m)


def test_the_bed_drains_what_lies_above_it() -> None:
    """Sides fall straight west and east into the bed, so a row adds 59 cells; the rim's two columns leave by it."""
    drained = found().catchment_km2.values[:, AXIS]
    rows = np.arange(ROWS)
    expected = 59.0 * rows * (CELL / 1000.0) ** 2  # the first row, on the rim, leaves by it too
    bed = expected >= 1.1
    bed[-1] = False  # the last row is rim
    assert drained[bed] == pytest.approx(expected[bed], rel=0.03)
    assert (drained[expected < 0.9] == 0.0).all()


def test_no_bed_off_the_axis_but_within_the_stated_distance() -> None:
    row = 80
    assert (found().catchment_km2.values[row] > 0).sum() == 1
    near = np.flatnonzero(found(near_m=90.0).catchment_km2.values[row] > 0)
    assert near.tolist() == list(range(AXIS - 3, AXIS + 4))


def test_the_height_above_the_bed_is_that_of_the_side() -> None:
    height = found().height_m.values
    assert height[80, AXIS] == 0.0
    assert height[80, AXIS + 10] == pytest.approx(10 * SIDE, abs=0.01)
    assert np.isnan(height[5, AXIS - 5]) is np.False_  # its water meets the bed farther down
    assert height[5, AXIS - 5] > 5 * SIDE


def test_the_sea_takes_all_and_a_lake_passes_it_on() -> None:
    water = dry()
    water[40:50, AXIS - 4 : AXIS + 5] = 2
    through_lake = found(water).catchment_km2.values[60, AXIS]
    assert through_lake == pytest.approx(found().catchment_km2.values[60, AXIS], rel=0.01)
    assert (found(water).catchment_km2.values[40:50, AXIS] == 0.0).all(), "a lake is no bed"
    water[40:50] = 1
    assert found(water, 0.1).catchment_km2.values[60, AXIS] == pytest.approx(
        found(None, 0.1).catchment_km2.values[60, AXIS] - found(None, 0.1).catchment_km2.values[49, AXIS], rel=0.05
    )


def test_the_readings_of_plots_on_the_bed_and_away_from_it() -> None:
    import geopandas as gpd
    import pandas as pd
    from shapely import box

    ground = valley()
    x, y = ground.grid.x_centres_m()[AXIS], ground.grid.y_centres_m()[80]
    plots = gpd.GeoSeries(
        [box(x - 45, y - 45, x + 45, y + 45), box(x + 555, y - 45, x + 645, y + 45)], crs="EPSG:32637"
    )
    blank = Readings(pd.DataFrame(index=["on", "off"]), pd.DataFrame(index=["on", "off"]))
    read = with_watercourses(blank, cover(plots, ground.grid), found(), 0.9)
    assert read.values["watercourse_km2"].tolist() == [pytest.approx(59 * 81 * 0.0009, rel=0.03), 0.0]
    assert read.values["floor_height_m"]["on"] == pytest.approx(2 / 3 * SIDE, abs=0.1)
    assert read.values["floor_height_m"]["off"] == pytest.approx(20 * SIDE, abs=0.2)
    nowhere = with_watercourses(blank, cover(plots, ground.grid), found(least_km2=50.0), 0.9)
    assert nowhere.values["floor_height_m"].isna().all()
    assert nowhere.why_unknown["floor_height_m"].tolist() == [NO_BED, NO_BED]
