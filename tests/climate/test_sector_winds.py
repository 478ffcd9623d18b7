"""The wind at plots, sector by sector."""

from typing import Any

import numpy as np
import pytest

from sitescreen.climate import sector_winds as module
from sitescreen.climate._wind_kernel import plot_sectors
from sitescreen.climate.hill_speed_up import hill_fields
from sitescreen.climate.sector_winds import SectorWinds, sector_winds
from sitescreen.grid import Field, Grid
from sitescreen.settings import load_defaults
from sitescreen.terrain.position import rise_m

WIND = load_defaults().wind
GRID = Grid("EPSG:32641", 0.0, 9000.0, 90.0, 100, 100)


def winds(ground: Field, rows_cols: list[tuple[int, int]], convergence_deg: float = 0.0) -> SectorWinds:
    """Plots of one cell each."""
    cells = np.array([row * ground.grid.cols + col for row, col in rows_cols])
    count = len(cells)
    return sector_winds(
        tuple(map(str, range(count))),
        ground,
        rise_m(ground, 1000.0),
        hill_fields(ground, WIND),
        None,
        np.arange(count + 1),
        cells,
        np.ones(count),
        np.full(count, convergence_deg),
        0.9,
        WIND,
    )


def wall_to_the_north() -> Field:
    height = np.zeros(GRID.shape)
    height[40:42, :] = 200.0
    return Field(height, GRID, "m", "a wall to the grid's north")


@pytest.fixture(params=[plot_sectors, plot_sectors.py_func], ids=["compiled", "python"])
def either(request: pytest.FixtureRequest, monkeypatch: pytest.MonkeyPatch) -> Any:
    monkeypatch.setattr(module, "plot_sectors", request.param)
    return request.param


def test_a_wall_shelters_from_the_side_it_stands_on(either: Any) -> None:
    found = winds(wall_to_the_north(), [(46, 50)])
    assert found.shelter[0, 0] == pytest.approx(0.3)
    assert found.shelter[0, 4:13] == pytest.approx(1.0)
    assert found.speed_ratio[0, 0] <= 0.3 + 1e-6
    assert (found.speed_ratio <= found.shelter * (1.0 + np.maximum(found.speed_up, 0.0)) + 1e-9).all()


def test_sectors_are_of_each_plots_true_north() -> None:
    """Two plots at one cell, the grid turned by 3°: a block's one azimuth would put the second's sectors 3° off."""
    ground = Field(np.random.default_rng(3).normal(0.0, 60.0, GRID.shape), GRID, "m", "rough ground")
    cells, shares = np.array([5050, 5050]), np.ones(2)
    hills, rise = hill_fields(ground, WIND), rise_m(ground, 1000.0)

    def at(*convergence: float) -> np.ndarray:
        args = (np.arange(3), cells, shares, np.array(convergence), 0.9, WIND)
        return sector_winds(("a", "b"), ground, rise, hills, None, *args).speed_ratio

    both = at(0.0, 3.0)
    assert both[0].tolist() == at(0.0, 0.0)[0].tolist()
    assert both[1].tolist() == at(3.0, 3.0)[1].tolist()
    assert np.abs(both[0] - both[1]).max() > 0.001
    turned = at(22.5, 0.0)[0]
    assert turned == pytest.approx(np.roll(both[0], 1), abs=1e-9)


def test_a_plot_is_the_mean_of_its_cells() -> None:
    ground = wall_to_the_north()
    hills, rise = hill_fields(ground, WIND), rise_m(ground, 1000.0)
    cells = np.array([4650, 4750, 4650, 4750])
    shares = np.array([1.0, 1.0, 1.0, 0.25])
    args = (None, np.array([0, 1, 2, 4]), cells, shares, np.zeros(3), 0.9, WIND)
    found = sector_winds(("a", "b", "both"), ground, rise, hills, *args)
    for values in (found.speed_ratio, found.shelter, found.speed_up):
        assert values[2] == pytest.approx((values[0] + 0.25 * values[1]) / 1.25)


def test_a_plot_mostly_unknown_is_unknown_in_those_sectors_only() -> None:
    ground = wall_to_the_north()
    values = ground.values.copy()
    values[46, 80] = np.nan  # on the ray to the east, 2.7 km off
    found = winds(Field(values, GRID, "m", "a hole to the east"), [(46, 50), (46, 20)])
    assert np.isnan(found.speed_ratio[0, 4])
    assert np.isfinite(np.delete(found.speed_ratio[0], 4)).all()
    assert np.isfinite(found.speed_ratio[1, 0])
    assert np.isnan(winds(wall_to_the_north(), [(2, 50)]).speed_ratio[0, 0])  # the grid ends within the reach
