"""Readings under drawn terrain."""

from functools import cache

import numpy as np
import pandas as pd
import pytest
from numpy.typing import NDArray

from sitescreen.climate.cold_layer import ColdLayer, NightGround, cold_layer, night_ground
from sitescreen.grid import Field, Grid
from sitescreen.judgement.draws import (
    NO_DRAWS,
    DrawableBlock,
    PlotNights,
    ReadingDraws,
    drawable_block,
    draws_for,
    with_chance,
)
from sitescreen.settings import load_defaults
from sitescreen.terrain.ground import Ground, read_ground
from sitescreen.terrain.hollows import hollows


def test_what_was_not_drawn_is_as_in_the_run() -> None:
    """A plot without draws, and a reading without draws, keep the run's own value in every column."""
    draws = ReadingDraws(
        {
            "slope_deg": np.array([[1.0, 2.0, 3.0], [np.nan, np.nan, np.nan]]),
            "cold_pool_kind": np.array([[""] * 3, ["none", "leaky", "none"]], dtype=object),
        }
    )
    assert draws.count == 3
    np.testing.assert_array_equal(draws.of("slope_deg", np.array([9.0, 7.0])), [[1.0, 2.0, 3.0], [7.0, 7.0, 7.0]])
    np.testing.assert_array_equal(
        draws.of("cold_pool_kind", np.array(["closed", "closed"], dtype=object)),
        [["closed"] * 3, ["none", "leaky", "none"]],
    )
    np.testing.assert_array_equal(draws.of("rise_m", np.array([4.0, 5.0])), [[4.0] * 3, [5.0] * 3])


def test_without_draws_there_is_one_column() -> None:
    """So that what reads the draws need not ask whether there are any."""
    assert NO_DRAWS.count == 0
    np.testing.assert_array_equal(NO_DRAWS.of("slope_deg", np.array([4.0, 5.0])), [[4.0], [5.0]])


CELLS = 330
GRID = Grid("EPSG:32637", 111 * 2700.0 - 3600.0, -1111 * 2700.0 + 6300.0, 30.0, CELLS, CELLS)
MIDDLE = (GRID.west_m + 4950.0, GRID.north_m - 4950.0)
FEW = load_defaults().model_copy(
    update={
        "cold_chance": load_defaults().cold_chance.model_copy(update={"draws_first": 12}),
        "judgement": load_defaults().judgement.model_copy(update={"data_draws": 40}),
    }
)


def pan_in_a_plain() -> NDArray[np.float64]:
    """A pan 14 m deep and 800 m across, on ground that falls 0.4 %, with gentle relief."""
    y, x = np.mgrid[:CELLS, :CELLS] * 30.0 + 15.0
    away = np.hypot(x - 4950.0, y - 4950.0) / 400.0
    return np.asarray(1500.0 + 0.004 * x + 3.0 * np.sin(x / 500.0) * np.sin(y / 420.0) - 14.0 * np.exp(-(away**4)))


@cache
def measured(error_m: float) -> tuple[Ground, NightGround, ColdLayer]:
    """The block's own run over the pan."""
    field = Field(pan_in_a_plain().astype(np.float32), GRID, "m", "height")
    dry = np.zeros(GRID.shape, dtype=np.uint8)
    ground = read_ground(field, field, dry, error_m, 90.0, FEW.terrain)
    night = night_ground(field, dry > 0, FEW.cold_layer, error_m)
    return ground, night, cold_layer(night, ground.sky_view, FEW.cold_layer)


def block(error_m: float, boxes: list[tuple[float, float, float]]) -> DrawableBlock:
    """A measured block; ``boxes``: metres east and north of the middle, and side of each plot. [m]"""
    import geopandas as gpd
    from shapely import box

    plots = gpd.GeoSeries(
        [
            box(MIDDLE[0] + e - d / 2, MIDDLE[1] + n - d / 2, MIDDLE[0] + e + d / 2, MIDDLE[1] + n + d / 2)
            for e, n, d in boxes
        ],
        crs=GRID.crs,
    )
    return drawable_block(np.arange(len(boxes)), plots, *measured(error_m), None, (error_m, 90.0), FEW)


def _silent(_: str) -> None:
    """Told how far the work is."""


def draw(one: DrawableBlock, wanted: list[bool] | None = None) -> tuple[ReadingDraws, PlotNights]:
    count = len(one.rows)
    values = pd.DataFrame({"slope_deg": 1.0, "sky_view": 1.0, "cold_deficit_k": np.zeros(count)})
    asked = np.arange(count) if wanted is None else np.flatnonzero(wanted)
    return draws_for(asked, [one], values, np.full(count, 6.0), 20, FEW, _silent)


def shoreline_m() -> float:
    """How far east of the middle the pool's edge lies. [m]"""
    pool = hollows(Field(pan_in_a_plain().astype(np.float32), GRID, "m", "height")).depth_m.values
    row, col = GRID.rows_cols(np.array([MIDDLE[0]]), np.array([MIDDLE[1]]))
    return 30.0 * float(np.argmax(pool[row[0], col[0] :] == 0.0))


def test_deep_in_a_hollow_is_likely_and_on_a_slope_beside_it_is_none() -> None:
    """The pan's floor is cold in every draw, ground 2.5 km off in none; the kind and the depth say so."""
    drawn, nights = draw(block(1.5, [(0.0, 0.0, 120.0), (2500.0, 2200.0, 120.0)]))
    assert list(nights.word) == ["likely", "none"]
    assert nights.chance[0] == 1.0
    assert nights.chance[1] < 0.2
    assert set(drawn.values["cold_pool_kind"][0]) == {"closed"}
    assert nights.depth_low_m[0] > 5.0
    assert nights.depth_high_m[0] < 15.0
    assert np.ptp(drawn.values["pond_depth_m"][0]) > 0.5


def test_plot_beside_a_marginal_sill_has_two_peaks() -> None:
    """In some draws the cold air reaches half of the plot and counts, in others it counts for nothing: no middle."""
    drawn, _ = draw(block(2.5, [(shoreline_m() + 60.0, 0.0, 180.0)]))
    deficit = drawn.values["cold_deficit_k"][0]
    assert np.mean(deficit == 0.0) > 0.25
    assert np.mean(deficit > 0.3) > 0.25
    assert np.mean((deficit > 0.0) & (deficit < 0.25)) < 0.05


def test_without_a_terrain_error_nothing_is_drawn() -> None:
    """σ = 0: no spread, and the chance is 0 or 1 as the run has it."""
    drawn, nights = draw(block(0.0, [(0.0, 0.0, 120.0)]))
    assert drawn is NO_DRAWS
    assert nights.chance[0] == 0.0  # the readings handed in have no deficit
    assert nights.of[0] == 0


def test_small_errors_spread_readings_little() -> None:
    """From σ 0.01 m to 0.1 m every spread of the ground's readings grows about tenfold, and is small."""
    boxes = [(0.0, 0.0, 150.0)]
    spreads = []
    for error_m in (0.01, 0.1):
        drawn, _ = draw(block(error_m, boxes))
        spreads.append([np.std(drawn.values[name][0]) for name in ("slope_deg", "rise_m", "pond_depth_m")])
    assert max(spreads[1]) < 0.2
    assert np.array(spreads[1]) / spreads[0] == pytest.approx(np.full(3, 10.0), rel=0.6)


def test_a_plots_draws_do_not_depend_on_other_plots() -> None:
    """Alone, among others, and whoever else is wanted: the same to the bit."""
    edge = shoreline_m()
    many = [(0.0, 0.0, 120.0), (edge, 0.0, 180.0), (900.0, 300.0, 90.0)]
    together, nights = draw(block(2.5, many))
    for number, (one, wanted) in enumerate([(many[:1], None), (many, [False, True, False]), (many[2:], None)]):
        row = number if wanted else 0
        alone, of = draw(block(2.5, one), wanted)
        if wanted:
            assert list(np.isnan(of.chance)) == [not asked for asked in wanted]
        assert of.of[row] == nights.of[number]
        for name in ("cold_deficit_k", "cold_pool_depth_m", "slope_deg", "pond_depth_m", "rise_m", "buildable_share"):
            np.testing.assert_array_equal(alone.values[name][row], together.values[name][number])


def test_draws_on_which_the_first_agree_repeat_them() -> None:
    """A plot that no draw doubts has the first draws again and again; one in doubt has its own to the end."""
    drawn, nights = draw(block(2.5, [(0.0, 0.0, 120.0), (shoreline_m(), 0.0, 180.0)]))
    assert list(nights.of) == [12, 40]
    deficit = drawn.values["cold_deficit_k"]
    np.testing.assert_array_equal(deficit[0, 12:24], deficit[0, :12])
    assert len(set(deficit[1][deficit[1] > 0])) > 12


def test_what_the_run_cannot_tell_is_not_drawn() -> None:
    """Cold air that hangs on ground beyond the known, or a share that too few cells cannot give, stays unknown."""
    one = block(2.5, [(0.0, 0.0, 120.0)])
    values = pd.DataFrame(
        {"slope_deg": [1.0], "sky_view": [1.0], "cold_deficit_k": [np.nan], "buildable_share": [np.nan]}
    )
    drawn, nights = draws_for(np.array([0]), [one], values, np.full(1, 6.0), 20, FEW, _silent)
    assert np.isnan(nights.chance[0])
    assert nights.word[0] == ""
    assert np.isnan(drawn.values["cold_deficit_k"]).all()
    assert np.isnan(drawn.values["buildable_share"]).all()
    assert not np.isnan(drawn.values["slope_deg"]).any()


def test_a_clearing_that_may_be_trees_is_never_likely() -> None:
    """Without a canopy layer a small hollow in a model of tree tops is possible at best."""
    sure = np.array(["likely", "likely", "none"], dtype=object)
    none = np.zeros(3, dtype=np.int64)
    nights = PlotNights(np.array([1.0, 1.0, 0.0]), sure, none, none, np.full(3, np.nan), np.full(3, np.nan))
    told = with_chance(pd.DataFrame({"may_be_trees": [True, False, True]}), nights)
    assert list(told["cold_pool_sure"]) == ["possible", "likely", "none"]
