"""The section from a plot to its shore, and the breeze as a layer."""

from typing import Any

import numpy as np
import pytest

from sitescreen.climate import breeze_section as module
from sitescreen.climate._breeze_path_kernel import profile
from sitescreen.climate.breeze_field import coarse_grid
from sitescreen.climate.breeze_path import ways
from sitescreen.climate.breeze_section import Section, sections
from sitescreen.grid import Field, Grid
from sitescreen.settings import load_defaults

BREEZE = load_defaults().breeze
CELL = 20.0


def ground(crest_cell: int = 331, crest_m: float = 64.0, cells: int = 400) -> Field:
    """Level ground at 5 m with one narrow crest across the way east."""
    heights = np.full((3, cells), 5.0)
    heights[:, crest_cell] += crest_m
    return Field(heights, Grid("EPSG:32637", 0.0, 0.0, CELL, 3, cells), "m", "ground")


def draw(field: Field, to_m: float, most_m: float = 12_000.0, most_points: int = 120) -> Section | None:
    """From the middle of the first column to the east; to_m NaN is no shore."""
    x, y = np.array([10.0]), np.array([-30.0])
    way = ways(field, x, y, x + to_m, y, BREEZE)
    return sections(field, x, y, x + to_m, y, way, np.array([to_m]), np.array([90.0]), most_m, most_points)[0]


@pytest.fixture(params=[profile, profile.py_func], ids=["compiled", "python"])
def either(request: pytest.FixtureRequest, monkeypatch: pytest.MonkeyPatch) -> Any:
    monkeypatch.setattr(module, "profile", request.param)
    return request.param


def test_a_section_keeps_its_ends_and_its_crest(either: Any) -> None:
    whole, drawn = draw(ground(), 7955.0, most_points=1000), draw(ground(), 7955.0)
    assert whole is not None
    assert drawn is not None
    assert (len(whole.distance_m), len(drawn.distance_m)) == (399, 120)
    assert whole.distance_m[:3].tolist() == [0.0, 20.0, 40.0]
    assert drawn.distance_m[[0, -1]].tolist() == [0.0, 7955.0]
    assert (np.diff(drawn.distance_m) > 0.0).all()
    assert drawn.ground_m.max() == pytest.approx(69.0)
    assert drawn.distance_m[np.argmax(drawn.ground_m)] == 331 * 20.0
    assert (drawn.crest_distance_m, drawn.crest_m) == (331 * 20.0, pytest.approx(69.0))
    assert (drawn.shore_distance_m, drawn.bearing_deg) == (7955.0, 90.0)


def test_a_far_shore_ends_the_section_where_it_is_not_looked_any_more(either: Any) -> None:
    cut = draw(ground(), 7955.0, most_m=3000.0)
    assert cut is not None
    assert cut.distance_m[-1] == 3000.0
    assert cut.shore_distance_m == 7955.0


def test_level_ground_has_no_crest_and_no_shore_no_section(either: Any) -> None:
    level, wet = draw(ground(crest_m=0.0), 500.0), draw(ground(), 0.0)
    assert level is not None
    assert wet is not None
    assert np.isnan(level.crest_m)
    assert level.ground_m.tolist() == [5.0] * 26
    assert wet.distance_m.tolist() == [0.0]
    assert draw(ground(), np.nan) is None


def test_a_gap_stays_a_gap(either: Any) -> None:
    values = ground().values.copy()
    values[:, 3] = np.nan
    drawn = draw(Field(values, ground().grid, "m", "with a gap"), 200.0)
    assert drawn is not None
    assert np.isnan(drawn.ground_m[3])
    assert np.isfinite(drawn.ground_m[4:]).all()


@pytest.mark.parametrize(("cell_m", "coarse_m"), [(5.0, 300.0), (10.0, 300.0), (30.0, 300.0), (90.0, 270.0)])
def test_the_layers_cells_lie_on_absolute_multiples_and_fit_the_blocks(cell_m: float, coarse_m: float) -> None:
    side = 4500 * cell_m
    grid = Grid("EPSG:32637", side - 17 * cell_m, side + 10 * cell_m, cell_m, 60, 90)
    found = coarse_grid(grid, (side, 0.0, 2 * side, side))
    assert found.cell_size_m == coarse_m
    assert found.west_m == side
    assert found.north_m == side
    assert side % coarse_m == 0.0
    assert found.bounds[1] <= grid.bounds[1] < found.bounds[1] + coarse_m
