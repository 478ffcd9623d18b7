"""The way of the breeze: ridges, gaps and slopes whose answer can be seen, and the whole breeze over even ground."""

import math
from typing import Any

import numpy as np
import pytest
from pyproj import Transformer
from scipy import ndimage

from sitescreen.climate._breeze_path_kernel import walk
from sitescreen.climate.breeze import PlotBreeze, lake_reach, plot_breeze, sea_reach
from sitescreen.climate.breeze_path import Way, screen_share, ways
from sitescreen.grid import Field, Grid
from sitescreen.settings import load_defaults
from sitescreen.terrain.horizon import horizon_profile
from sitescreen.terrain.shore_fetch import OpenShore

BREEZE = load_defaults().breeze
FROM_GROUND = BREEZE.model_copy(update={"path_eye_m": 0.0})
CELL = 20.0
UTM = "EPSG:32637"
NOTHING = np.array([np.nan])


def field(values: Any, cell_m: float = CELL, west_m: float = 0.0, north_m: float = 0.0) -> Field:
    values = np.asarray(values, dtype=np.float32)
    return Field(values, Grid(UTM, west_m, north_m, cell_m, *values.shape), "m", "ground")


def line(*heights: float) -> Field:
    """Ground in three equal rows of cells; the first cell's centre is the plot, the shore lies to the east."""
    return field(np.tile(np.array(heights), (3, 1)))


def look(ground: Field, to_cells: float, settings: Any = BREEZE) -> Way:
    """The way from the middle of the first column to the east."""
    x, y = np.array([0.5 * ground.grid.cell_size_m]), np.array([-1.5 * ground.grid.cell_size_m])
    return ways(ground, x, y, x + to_cells * ground.grid.cell_size_m, y, settings)


def ridge(height_m: float, at_cell: int, cells: int = 60, plot_m: float = 0.0) -> Field:
    heights = np.full(cells, plot_m)
    heights[at_cell] += height_m
    return line(*heights)


def test_a_wall_30_m_high_at_200_m_stands_at_8_53_degrees() -> None:
    """Upwind angle by its definition (Winstral & Marks 2002, Hydrol. Process. 16:3585–3603): atan(30/200)."""
    way = look(ridge(30.0, 10), 50, FROM_GROUND)
    assert way.skyline_deg == pytest.approx([8.5308], abs=1e-4)
    assert (way.crest_distance_m, way.crest_above_plot_m) == (pytest.approx([200.0]), pytest.approx([30.0]))


def test_the_angle_is_taken_from_ten_metres_up() -> None:
    way = look(ridge(64.0, 15, plot_m=20.0), 50)
    assert way.skyline_deg == pytest.approx([math.degrees(math.atan(54.0 / 300.0))])
    assert way.crest_above_plot_m == pytest.approx([64.0])
    assert (way.plot_m, way.highest_m, way.lowest_m) == ([20.0], [84.0], [20.0])


def test_open_water_is_the_lowest_skyline() -> None:
    way = look(line(*np.linspace(50.0, 0.0, 60)), 59)
    assert way.skyline_deg.tolist() == [0.0]
    assert np.isnan(way.crest_distance_m).all()
    assert way.shore_m == pytest.approx([0.0])


def test_ground_behind_the_shore_is_not_on_the_way() -> None:
    assert look(ridge(300.0, 50), 40).skyline_deg.tolist() == [0.0]


@pytest.mark.parametrize("turn_deg", [0.0, 33.0, 90.0, 135.0, 180.0, 251.0, 315.0])
def test_every_direction_sees_the_same_ring(turn_deg: float) -> None:
    """A ring of hills 1 km away, 60 m high, round a plot: the bilinear ground errs by its curve within a cell."""
    side = 151
    x = (np.arange(side) + 0.5) * CELL
    away = np.hypot(x[None, :] - x[75], x[:, None] - x[75])
    ground = field(60.0 * np.exp(-(((away - 1000.0) / 150.0) ** 2)))
    here = np.array([x[75]])
    azimuth = np.radians(turn_deg)
    way = ways(ground, here, -here, here + 1400.0 * np.sin(azimuth), -here + 1400.0 * np.cos(azimuth), FROM_GROUND)
    # the tangent from the ground is largest a little this side of the crest
    radius = np.linspace(1.0, 1400.0, 100_000)
    best = np.max(60.0 * np.exp(-(((radius - 1000.0) / 150.0) ** 2)) / radius)
    assert way.skyline_deg == pytest.approx(np.degrees(np.arctan(best)), abs=0.03)


@pytest.mark.parametrize(("east", "north"), [(1, 0), (1, 1), (0, 1), (-1, 1), (-1, 0), (-1, -1), (0, -1), (1, -1)])
def test_only_the_hill_on_the_way_is_seen(east: int, north: int) -> None:
    side = 101
    x = (np.arange(side) + 0.5) * CELL
    hill = 60.0 * np.exp(-((x[None, :] - x[50 + 20 * east]) ** 2 + (x[:, None] - x[50 - 20 * north]) ** 2) / 80.0**2)
    here = np.array([x[50]])
    seen = [
        float(ways(field(hill), here, -here, here + 800.0 * e, -here + 800.0 * n, BREEZE).skyline_deg[0])
        for e, n in ((east, north), (-east, -north), (north, -east), (-north, east))
    ]
    assert seen[0] > 3.0
    assert seen[1:] == [0.0, 0.0, 0.0]


def test_unknown_ground_on_the_way_is_not_open_ground() -> None:
    heights = np.zeros(60)
    heights[20] = np.nan
    way = look(line(*heights), 50)
    assert not way.known[0]
    assert np.isnan(screen_share(way, np.zeros(1), 750.0, BREEZE)).all()
    # past the end of the terrain model, and from a plot without ground
    assert not look(line(*np.zeros(30)), 50).known[0]
    assert not look(line(np.nan, *np.zeros(59)), 50).known[0]
    assert not look(line(np.nan, *np.zeros(59)), 0.0).known[0]


def test_the_first_gap_cells_of_the_water_are_no_unknown_ground() -> None:
    heights = np.zeros(60)
    heights[49:] = np.nan
    assert look(line(*heights), 50).known[0]
    heights[46:] = np.nan
    assert not look(line(*heights), 50).known[0]


def test_unknown_ground_hides_nothing_behind_a_range_that_stops_all() -> None:
    heights = np.zeros(60)
    heights[10], heights[20] = 800.0, np.nan
    assert screen_share(look(line(*heights), 50), np.zeros(1), 750.0, BREEZE) == pytest.approx([1.0])


def test_ground_beyond_the_limit_is_not_looked_at() -> None:
    near = BREEZE.model_copy(update={"path_most_m": 1000.0})
    heights = np.zeros(120)
    heights[60] = 500.0
    heights[61:] = np.nan
    way = look(line(*heights), 110, near)
    assert way.known[0]
    assert way.skyline_deg.tolist() == [0.0]
    assert np.isnan(way.shore_m).all()


def share(ground: Field, level_m: float = 0.0, depth_m: float = 750.0) -> float:
    return float(screen_share(look(ground, 50), np.array([level_m]), depth_m, BREEZE)[0])


def test_level_ground_screens_nothing_and_a_range_above_the_breeze_everything() -> None:
    assert share(line(*np.full(60, 7.0))) == 0.0
    assert share(ridge(750.0, 40)) == 1.0
    assert share(ridge(500.0, 40), depth_m=500.0) == 1.0
    # a lake's breeze is as deep over its own level
    assert 0.0 < share(ridge(450.0, 40, plot_m=1130.0), level_m=1130.0, depth_m=500.0) < 1.0


def test_a_plot_above_the_breeze_gets_none_and_an_open_slope_all() -> None:
    assert share(line(*np.linspace(800.0, 0.0, 60))) == 1.0
    assert share(line(*np.linspace(600.0, 0.0, 60))) == 0.0


def test_the_two_closures_by_hand() -> None:
    """54 m over the eye at 300 m: tan 0.18, (0.18 − 0.03)/0.20 = 0.75, 0.75²·(3 − 1.5) = 0.84375; 64 of 750 m deep."""
    lee = 0.7 * 0.84375
    assert share(ridge(64.0, 15)) == pytest.approx(1.0 - (1.0 - 64.0 / 750.0) * (1.0 - lee))


def test_a_higher_crest_never_screens_less() -> None:
    shares = [share(ridge(height, 20)) for height in np.arange(0.0, 900.0, 25.0)]
    assert (np.diff(shares) >= 0.0).all()
    assert shares[0] == 0.0
    assert shares[-1] == 1.0


def test_the_skyline_is_that_of_the_exact_profile() -> None:
    """Against the horizon's own rays, which are read where they cross the cells' lines instead of once a cell."""
    rng = np.random.default_rng(8)
    middle = 130.5 * CELL
    off = (np.arange(260) + 0.5) * CELL - middle
    # hills that end before the ways do, whose last samples lie up to a cell apart
    ends = np.clip((1900.0 - np.hypot(off[None, :], off[:, None])) / 300.0, 0.0, 1.0)
    ground = field(ndimage.gaussian_filter(rng.normal(0.0, 1.0, (260, 260)), 8.0) * 2500.0 * ends)
    azimuths = rng.uniform(0.0, 360.0, 40)
    x, y = np.full(40, middle), np.full(40, -middle)
    to_x, to_y = x + 2000.0 * np.sin(np.radians(azimuths)), y + 2000.0 * np.cos(np.radians(azimuths))
    exact = horizon_profile(ground, x[:1], y[:1], azimuths, 10.0, earth_curvature=False, reach_m=2000.0).angle_deg[0]
    way = ways(ground, x, y, to_x, to_y, BREEZE)
    assert (exact > 0.0).sum() > 10
    # a sample lies within 10 m of the crest; hills this round (0.005 a metre) fall 0.25 m there, 0.1° at 150 m
    assert way.skyline_deg == pytest.approx(np.maximum(exact, 0.0), abs=0.1)


def test_compiled_and_plain_walk_agree() -> None:
    rng = np.random.default_rng(1)
    ground = rng.uniform(0.0, 100.0, (12, 12)).astype(np.float32)
    ground[3, 4] = np.nan
    answers = []
    for kernel in (walk, walk.py_func):
        out = np.empty((8, 6))
        row, col = np.linspace(1.2, 9.0, 6), np.linspace(2.0, 8.5, 6)
        steps = np.radians(np.arange(6) * 60.0)
        length = np.array([50.0, 40.0, 0.0, 90.0, np.nan, 30.0])
        kernel(ground, CELL, row, col, -np.cos(steps), np.sin(steps), length, length < 60.0, 10.0, out, 0, 6)
        answers.append(out)
    np.testing.assert_allclose(answers[0], answers[1], rtol=1e-12)
    assert np.isnan(answers[0][:, 4]).all()


# the whole breeze

EAST, NORTH = 500_000.0, 9_000.0


def places(x_m: Any, y_m: Any) -> tuple[Any, Any]:
    lon, lat = Transformer.from_crs(UTM, "EPSG:4326", always_xy=True).transform(x_m, y_m)
    return np.atleast_1d(lon), np.atleast_1d(lat)


def shore_at(x_m: Any, km: Any, width_km: float) -> OpenShore:
    lon, lat = places(x_m, np.full(np.shape(x_m), NORTH))
    distance = np.asarray(km) * 1000.0
    return OpenShore(distance, np.full(len(lon), 90.0), lon, lat, np.full(len(lon), width_km))


def no_shore(count: int) -> OpenShore:
    return OpenShore(*(np.full(count, np.nan) for _ in range(5)))


def ground_to_the_west(rise: Any, cell_m: float = 100.0) -> Field:
    """Ground 400 cells deep west of a coast through EAST, its height a function of the distance from it."""
    x = (np.arange(-400, 400) + 0.5) * cell_m
    return field(np.tile(rise(-x), (21, 1)), cell_m, EAST - 400 * cell_m, NORTH + 10.5 * cell_m)


def by_distance(km: Any, rise: Any, sea: OpenShore | None = None, lake: OpenShore | None = None) -> PlotBreeze:
    """The breeze of plots at distances west of a coast."""
    km = np.asarray(km, dtype=np.float64)
    lon, lat = places(EAST - 1000.0 * km, np.full(len(km), NORTH))
    sea = sea or shore_at(np.full(len(km), EAST), km, np.inf)
    return plot_breeze(ground_to_the_west(rise), lon, lat, sea, lake or no_shore(len(km)), BREEZE)


def test_breeze_falls_strictly_on_an_even_plain_and_lasts_to_30_km() -> None:
    km = np.linspace(0.1, 30.0, 200)
    found = by_distance(km, lambda away: np.maximum(0.002 * away, 0.0))
    assert (np.diff(found.reach) < 0.0).all()
    assert found.reach[-1] > 0.1
    assert found.reach == pytest.approx(sea_reach(km, BREEZE))
    assert set(found.kind) == {"sea"}


def test_a_ridge_takes_breeze_from_the_plots_behind_it_only() -> None:
    km = np.array([1.0, 1.9, 2.5, 3.0, 6.0])
    found = by_distance(km, lambda away: 120.0 * np.exp(-(((away - 2200.0) / 150.0) ** 2)))
    lost = 1.0 - found.reach / sea_reach(km, BREEZE)
    assert lost[:2] == pytest.approx([0.0, 0.0], abs=1e-3)
    assert lost[2] > lost[3] > lost[4] > 0.1
    assert found.screen == pytest.approx(lost)
    assert found.way.crest_distance_m[3] == pytest.approx(800.0, abs=101.0)


def test_plots_are_measured_alike_alone_and_among_others() -> None:
    rng = np.random.default_rng(5)
    km = rng.uniform(0.1, 25.0, 50)

    def hills(away: Any) -> Any:
        return 40.0 + 40.0 * np.sin(away / 700.0)

    together = by_distance(km, hills)
    alone = [by_distance(km[k : k + 1], hills) for k in range(50)]
    for column in ("reach", "screen"):
        np.testing.assert_array_equal(
            getattr(together, column), np.concatenate([getattr(one, column) for one in alone])
        )
    for column, values in enumerate(together.way):
        np.testing.assert_array_equal(values, np.concatenate([one.way[column] for one in alone]))


def test_the_stronger_of_sea_and_lake_behind_the_ground() -> None:
    """The lake lies 6 km to the west of the plots, 20 km wide; the ridge stands towards the sea."""
    km = np.array([8.0, 8.0])
    lake = shore_at(np.full(2, EAST - 14_000.0), np.full(2, 6.0), 20.0)
    open_ground = by_distance(km, lambda away: np.maximum(0.001 * away, 0.0), lake=lake)
    assert open_ground.kind.tolist() == ["sea", "sea"]
    screened = by_distance(km, lambda away: np.where(np.abs(away - 7000.0) < 200.0, 700.0, 0.0), lake=lake)
    assert screened.kind.tolist() == ["lake", "lake"]
    assert screened.reach == pytest.approx(lake_reach(np.full(2, 6.0), np.full(2, 20.0), BREEZE))
    assert screened.distance_m.tolist() == [6000.0, 6000.0]


def test_a_breeze_that_may_be_stronger_leaves_the_answer_unknown() -> None:
    km = np.array([8.0])
    weak = shore_at(np.array([EAST - 9000.0]), np.array([1.0]), 3.0)
    found = by_distance(km, lambda away: np.where(np.abs(away - 5000.0) < 200.0, np.nan, 0.0), lake=weak)
    assert found.kind.tolist() == ["sea"]
    assert np.isnan(found.reach).all()
    # of a lake of unknown width too
    unknown = weak._replace(width_km=NOTHING)
    found = by_distance(km, lambda away: 0.0 * away, lake=unknown)
    assert found.kind.tolist() == ["lake"]
    assert np.isnan(found.reach).all()


def test_no_shore_and_the_water_itself() -> None:
    none = by_distance([5.0], lambda away: 0.0 * away, sea=no_shore(1))
    assert none.kind.tolist() == [""]
    assert np.isnan([none.reach[0], none.screen[0], none.way.skyline_deg[0], none.distance_m[0]]).all()
    afloat = by_distance([0.0], lambda away: 0.0 * away)
    assert afloat.reach.tolist() == [1.0]
