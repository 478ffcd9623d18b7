"""Where on the plot."""

from collections.abc import Callable
from typing import Any

import numpy as np
import pandas as pd
import pytest
from shapely.geometry import box

from sitescreen.climate.zones import ZoneShares
from sitescreen.grid import Field, Grid
from sitescreen.judgement.coverage import cover
from sitescreen.judgement.overall import judge
from sitescreen.judgement.profiles import load_profiles
from sitescreen.judgement.within_plot import WithinPlots, patch_side_cells, plot_cells, within_plots
from sitescreen.settings import load_defaults

SETTINGS = load_defaults()
PROFILES = load_profiles()
CELL = 30.0
GRID = Grid("EPSG:32637", 500_010.0, 9_990.0, CELL, 20, 24)
Plots = Callable[..., pd.DataFrame]
Zones = Callable[..., ZoneShares]


def square(row: int, col: int, rows: int, cols: int, inset_m: float = 0.0) -> Any:
    """So many cells of the grid, as a plot."""
    west, _, _, north = GRID.bounds
    x, y = west + CELL * col, north - CELL * row
    return box(x + inset_m, y - CELL * rows + inset_m, x + CELL * cols - inset_m, y - inset_m)


def look(
    shapes: list[Any],
    readings: pd.DataFrame,
    zones: ZoneShares,
    slope: np.ndarray,
    *,
    water: np.ndarray | None = None,
    cold_share: np.ndarray | None = None,
    footprint_m2: float = 400.0,
) -> WithinPlots:
    import geopandas as gpd

    outlines = gpd.GeoSeries(shapes, crs=GRID.crs)
    middle = outlines.representative_point().to_crs("EPSG:4326")
    fields = {"slope_deg": Field(slope, GRID, "°", "slope")}
    if cold_share is not None:
        fields["cold_share"] = Field(cold_share, GRID, "1", "share of the climate's cold")
    dry = np.zeros(GRID.shape, dtype=bool) if water is None else water
    cells = plot_cells(cover(outlines, GRID), np.arange(len(shapes)), fields, dry, GRID, SETTINGS.readings)
    return within_plots(
        [cells], readings, middle.x.to_numpy(), middle.y.to_numpy(), zones, PROFILES, (), footprint_m2,
        SETTINGS.readings, SETTINGS.judgement,
    )  # fmt: skip


def plot_mark(readings: pd.DataFrame, zones: ZoneShares) -> float:
    """What the whole plot would earn on even ground of these readings."""
    return float(judge(readings, zones, PROFILES, (), SETTINGS.judgement).table.iloc[0]["overall_mark"])


def slopes(value: float = 2.0) -> np.ndarray:
    return np.full(GRID.shape, value, dtype=np.float32)


def test_the_best_square_is_where_the_ground_is_gentle(plots: Plots, in_zone: Zones) -> None:
    """West half 2°, east half 10°."""
    slope = slopes()
    slope[:, 13:] = 10.0
    readings = plots({"slope_deg": 6.0})
    zones = in_zone(readings, "upland")
    found = look([square(5, 10, 6, 6)], readings, zones, slope).table.iloc[0]
    assert found["best_patch_mark"] == pytest.approx(plot_mark(readings.assign(slope_deg=2.0), zones), abs=1e-9)
    assert found["worst_patch_mark"] == pytest.approx(plot_mark(readings.assign(slope_deg=10.0), zones), abs=1e-9)
    assert found["patch_side_m"] == 90.0
    assert "in its west" in found["where_on_plot"] or "in its north-west" in found["where_on_plot"]


def test_the_mean_of_even_ground_is_the_plots_own_mark(plots: Plots, in_zone: Zones) -> None:
    readings = plots({"slope_deg": 4.0})
    zones = in_zone(readings, "savannah")
    found = look([square(5, 10, 5, 5)], readings, zones, slopes(4.0)).table.iloc[0]
    for name in ("best_patch_mark", "mean_patch_mark", "worst_patch_mark"):
        assert found[name] == pytest.approx(plot_mark(readings, zones), abs=1e-9)
    assert "about as good as another" in found["where_on_plot"]


def test_a_plot_with_no_room_for_a_square_says_what_the_terrain_cannot_resolve(plots: Plots, in_zone: Zones) -> None:
    readings = plots({}, {})
    # 3 × 3 cells fit, but the second is a little narrower than 90 m
    shapes = [square(5, 5, 3, 3), square(5, 12, 3, 3, inset_m=4.0)]
    found = look(shapes, readings, in_zone(readings, "upland"), slopes())
    assert found.table["best_patch_mark"].notna().tolist() == [True, False]
    assert "No square of 90 m" in found.table["where_on_plot"].iloc[1]
    assert list(found.patches["plot"]) == ["a"]
    side = found.patches.to_crs(GRID.crs).geometry.iloc[0]
    assert side.area == pytest.approx(8100.0, rel=1e-6)
    assert side.symmetric_difference(shapes[0]).area < 1.0


def test_other_plots_change_nothing(plots: Plots, in_zone: Zones) -> None:
    """Neither beside it, nor at the edge of the grid where the count of cells goes on in the next row."""
    rng = np.random.default_rng(3)
    slope = rng.uniform(1, 15, GRID.shape).astype(np.float32)
    shapes = [square(8, 8, 5, 6), square(8, 14, 5, 6), square(8, 20, 5, 4), square(9, 0, 5, 4), square(16, 3, 4, 9)]
    shapes += [square(0, 3, 4, 9)]  # where the count of cells would go on after the plot before
    many = plots(*[{} for _ in shapes])
    together = look(shapes, many, in_zone(many, "upland"), slope).table
    for row, shape in enumerate(shapes):
        alone = plots({})
        one = look([shape], alone, in_zone(alone, "upland"), slope).table
        pd.testing.assert_frame_equal(together.iloc[[row]].reset_index(drop=True), one.reset_index(drop=True))


def test_squares_are_those_of_a_plain_search(plots: Plots, in_zone: Zones) -> None:
    slope = np.random.default_rng(5).uniform(1, 15, GRID.shape).astype(np.float32)
    readings = plots({})
    zones = in_zone(readings, "upland")
    found = look([square(4, 6, 7, 8)], readings, zones, slope, footprint_m2=10_000.0).table.iloc[0]
    assert found["patch_side_m"] == 120.0
    cells = np.array([
        [plot_mark(readings.assign(slope_deg=float(slope[r, c])), zones) for c in range(6, 14)] for r in range(4, 11)
    ])  # fmt: skip
    means = [cells[r : r + 4, c : c + 4].mean() for r in range(4) for c in range(5)]
    assert found["best_patch_mark"] == pytest.approx(max(means), abs=1e-9)
    assert found["worst_patch_mark"] == pytest.approx(min(means), abs=1e-9)
    assert found["mean_patch_mark"] == pytest.approx(np.mean(means), abs=1e-9)


def test_no_square_goes_round_the_edge_of_the_grid(plots: Plots, in_zone: Zones) -> None:
    """A plot as wide as the grid: 2 × 22 squares, and none of the last cells of a row with the first of the next."""
    slope = slopes(2.0)
    slope[:, [0, 1, 22, 23]] = 12.0
    readings = plots({})
    zones = in_zone(readings, "upland")
    found = look([square(4, 0, 4, 24)], readings, zones, slope).table.iloc[0]
    gentle, steep = (plot_mark(readings.assign(slope_deg=value), zones) for value in (2.0, 12.0))
    by_column = np.where(slope[0] > 2.0, steep, gentle)
    means = [by_column[col : col + 3].mean() for col in range(22)]
    assert found["mean_patch_mark"] == pytest.approx(np.mean(means), abs=1e-9)
    assert found["worst_patch_mark"] == pytest.approx(min(means), abs=1e-9)


def test_what_is_unknown_of_the_plot_stays_unknown_in_its_squares(plots: Plots, in_zone: Zones) -> None:
    readings = plots({"slope_deg": np.nan})
    zones = in_zone(readings, "upland")
    found = look([square(5, 5, 4, 4)], readings, zones, slopes(1.0)).table.iloc[0]
    assert found["best_patch_mark"] == pytest.approx(plot_mark(readings, zones), abs=1e-9)


def test_a_cell_that_nobody_measured_takes_the_plots_reading(plots: Plots, in_zone: Zones) -> None:
    readings = plots({"slope_deg": 2.0})
    slope = slopes(2.0)
    slope[6, 6] = np.nan
    found = look([square(5, 5, 4, 4)], readings, in_zone(readings, "upland"), slope).table.iloc[0]
    assert found["best_patch_mark"] == found["worst_patch_mark"]


def test_no_square_lies_on_water(plots: Plots, in_zone: Zones) -> None:
    slope, water = slopes(9.0), np.zeros(GRID.shape, dtype=bool)
    slope[5:8, 5:8] = 1.0
    water[6, 6] = True
    readings = plots({})
    found = look([square(5, 5, 4, 7)], readings, in_zone(readings, "upland"), slope, water=water)
    west = found.patches.to_crs(GRID.crs).geometry.iloc[0].bounds[0]
    assert west >= GRID.bounds[0] + 7 * CELL - 1e-3


def test_a_plot_without_a_zone_has_no_squares(plots: Plots, in_zone: Zones) -> None:
    readings = plots({"elevation_m": 6000.0})
    found = look([square(5, 5, 5, 5)], readings, in_zone(readings, ""), slopes())
    assert found.table["best_patch_mark"].isna().all()
    assert found.table["where_on_plot"].tolist() == [""]
    assert not len(found.patches)


@pytest.mark.parametrize(
    ("footprint_m2", "cell_m", "side"),
    [(400, 30, 3), (8100, 30, 3), (8101, 30, 4), (400, 10, 3), (900, 5, 6), (1, 90, 3)],
)
def test_squares_hold_the_footprint_and_nine_cells(footprint_m2: float, cell_m: float, side: int) -> None:
    assert patch_side_cells(footprint_m2, cell_m, 9.0) == side


def test_the_warm_end_of_a_plot_half_in_cold_air_is_the_best(plots: Plots, in_zone: Zones) -> None:
    """6 K in the west, none in the east: the square's mark is that of a plot without cold air."""
    readings = plots({"elevation_m": 1800.0, "cold_deficit_k": 3.0, "cold_strength_k": 6.0, "slope_deg": 2.0})
    zones = in_zone(readings, "upland")
    share = np.zeros(GRID.shape)
    share[:, :12] = 1.0
    found = look([square(4, 4, 6, 16)], readings, zones, np.full(GRID.shape, 2.0), cold_share=share)
    warm = plot_mark(readings.assign(cold_deficit_k=0.0), zones)
    assert found.table.at["a", "best_patch_mark"] == pytest.approx(warm)
    assert found.table.at["a", "worst_patch_mark"] == pytest.approx(
        plot_mark(readings.assign(cold_deficit_k=6.0), zones)
    )
    assert "east" in found.table.at["a", "where_on_plot"]
