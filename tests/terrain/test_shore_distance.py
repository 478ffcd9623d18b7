"""Distance and bearing to the shore, against walks along the ellipsoid and shores whose answer can be seen."""

from pathlib import Path
from typing import Any

import geopandas as gpd
import numpy as np
import pytest
import shapely
from pyproj import Geod, Transformer
from shapely.geometry import LineString, Point, Polygon, box

from sitescreen.grid import Grid
from sitescreen.inputs.shore import Shore, read_shore
from sitescreen.terrain.shore_distance import nearest_shore, onshore_bearing, shore_distance

FRAME = box(39.0, -5.0, 40.0, -4.0)
UTM = "EPSG:32637"
WGS84 = Geod(ellps="WGS84")


def shore_of(folder: Path, geometries: list[Any], kinds: str | list[str], frame: Any = FRAME) -> Shore:
    """A shore layer written and read again; one kind for all rows or one a row."""
    file = folder / f"shore{len(list(folder.iterdir()))}.gpkg"
    columns = {} if isinstance(kinds, str) else {"kind": kinds}
    gpd.GeoDataFrame(columns, geometry=geometries, crs="EPSG:4326").to_file(file)
    return read_shore(file, kinds if isinstance(kinds, str) else "kind", frame)


def circle(lon: float, lat: float, radius_m: float) -> Polygon:
    turn = np.arange(0.0, 360.0, 0.5)
    x, y, _ = WGS84.fwd(np.full(720, lon), np.full(720, lat), turn, np.full(720, radius_m))
    return Polygon(np.column_stack([x, y]))


def ragged(seed: int, lon: float, lat: float, size_deg: float) -> Polygon:
    """A lake with bays and capes."""
    rng = np.random.default_rng(seed)
    turn = np.linspace(0.0, 2.0 * np.pi, 241)[:-1]
    waves = sum(rng.normal() / k * np.sin(k * turn + rng.uniform(0, 6)) for k in range(2, 25))
    radius = size_deg * (1.0 + 0.25 * waves / np.abs(waves).max())
    return Polygon(np.column_stack([lon + radius * np.cos(turn), lat + radius * np.sin(turn)]))


def at(*places: tuple[float, float]) -> tuple[Any, Any]:
    lon, lat = np.array(places, dtype=float).T
    return lon, lat


def turned(a: Any, b: Any) -> Any:
    """Smallest angle between two bearings. [°]"""
    return np.abs((np.asarray(a) - np.asarray(b) + 180.0) % 360.0 - 180.0)


# distance to the nearest shore


@pytest.mark.parametrize("equator", [-4.5, 0.0, 18.0])
def test_distance_agrees_with_walks_to_every_point_of_the_shore(tmp_path: Path, equator: float) -> None:
    """Rims with a point every 10 m at most, each walked to along the ellipsoid (Karney, as pyproj has it)."""
    lake, sea = (
        ragged(1, 39.35, equator, 0.12),
        Polygon(
            [(39.7, equator - 1), (39.75, equator), (39.68, equator + 1), (40.5, equator + 1), (40.5, equator - 1)]
        ),
    )
    frame = box(39, equator - 0.5, 40, equator + 0.5)
    shore = shore_of(tmp_path, [lake, sea], ["lake", "sea"], frame)
    rng = np.random.default_rng(2)
    lon, lat = rng.uniform(39.0, 39.68, 60), rng.uniform(equator - 0.4, equator + 0.4, 60)
    dry = ~shapely.contains_xy(lake, lon, lat)
    lon, lat = lon[dry], lat[dry]
    near = nearest_shore(shore, lon, lat, UTM)
    for kind, line, distance in (
        ("lake", lake.exterior, near.lake_distance_m),
        ("sea", LineString(list(sea.exterior.coords)[:3]), near.sea_distance_m),
    ):
        points = shapely.get_coordinates(shapely.segmentize(line, 9e-5))
        for k in range(len(lon)):
            _, _, walks = WGS84.inv(
                np.full(len(points), lon[k]), np.full(len(points), lat[k]), points[:, 0], points[:, 1]
            )
            # 10 m between points lengthen a walk by less than (5 m)²/2d; the map's scale may find another cape: 0.1 %
            slack = 0.001 * walks.min() + 12.5 / max(walks.min(), 5.0)
            assert distance[k] == pytest.approx(walks.min(), abs=slack), kind
    assert set(near.kind) == {"lake", "sea"}
    np.testing.assert_array_equal(near.distance_m, np.fmin(near.sea_distance_m, near.lake_distance_m))


def test_the_stated_point_is_where_distance_and_bearing_lead(tmp_path: Path) -> None:
    lake = ragged(3, 39.35, -4.5, 0.12)
    shore = shore_of(tmp_path, [lake], "lake")
    lon, lat = at((39.1, -4.2), (39.6, -4.9), (39.8, -4.45))
    near = nearest_shore(shore, lon, lat, UTM)
    x, y, _ = WGS84.fwd(lon, lat, near.bearing_deg, near.distance_m)
    np.testing.assert_allclose([x, y], [near.lon, near.lat], atol=1e-8)
    assert (shapely.distance(lake.exterior, shapely.points(near.lon, near.lat)) < 1e-6).all()


def test_long_edges_are_straight_in_degrees(tmp_path: Path) -> None:
    """One edge of 2° along a parallel, as the file draws it; straight in metres it would bulge by 60 m at 18° north."""
    shore = shore_of(tmp_path, [box(38.5, 17.0, 40.5, 17.9)], "sea", frame=box(39, 17.5, 40, 18.5))
    near = nearest_shore(shore, *at((39.0, 18.0), (39.5, 18.0)), UTM)
    for k, lon in enumerate((39.0, 39.5)):
        _, _, metres = WGS84.inv(lon, 18.0, lon, 17.9)
        assert near.sea_distance_m[k] == pytest.approx(metres, abs=0.5)


def test_shores_beyond_the_terrain_count(tmp_path: Path) -> None:
    sea = Polygon([(41.3, -6.0), (41.0, -4.5), (41.3, -3.0), (43.0, -3.0), (43.0, -6.0)])
    shore = shore_of(tmp_path, [sea], "sea")
    near = nearest_shore(shore, *at((39.5, -4.5)), UTM)
    _, _, metres = WGS84.inv(39.5, -4.5, 41.0, -4.5)
    assert near.distance_m[0] == pytest.approx(metres, rel=1e-3)


def test_in_the_water_the_distance_is_nought(tmp_path: Path) -> None:
    shore = shore_of(tmp_path, [circle(39.5, -4.5, 9000.0), circle(39.5, -4.5, 2000.0)], ["lake", "island"])
    near = nearest_shore(shore, *at((39.5, -4.46), (39.5, -4.5), (39.9, -4.5)), UTM)
    assert near.in_water.tolist() == ["lake", "", ""]
    assert near.distance_m[0] == 0.0
    assert np.isnan(near.bearing_deg[0])
    assert near.distance_m[1] == pytest.approx(2000.0, rel=1e-3)  # on the island the lake is 2 km away all round


def test_without_a_shore_nothing_is_known(tmp_path: Path) -> None:
    shore = shore_of(tmp_path, [circle(39.5, -4.5, 5000.0)], "lake")
    near = nearest_shore(shore, np.array([39.2, np.nan]), np.array([-4.5, np.nan]), UTM)
    assert near.kind.tolist() == ["lake", ""]
    assert np.isnan(near.sea_distance_m).all()
    assert np.isnan(near.distance_m).tolist() == [False, True]
    assert near.water_id.tolist() == [0, -1]


def test_a_pond_does_not_hide_the_great_lake(tmp_path: Path) -> None:
    pond, great = circle(39.2, -4.5, 700.0), circle(39.5, -4.5, 15000.0)
    shore = shore_of(tmp_path, [pond, great], "lake")
    place = at((39.22, -4.5))
    assert nearest_shore(shore, *place, UTM).lake_width_km[0] == pytest.approx(1.4, rel=0.02)
    passed_over = nearest_shore(shore, *place, UTM, least_lake_width_km=2.0)
    assert passed_over.lake_width_km[0] == pytest.approx(30.0, rel=0.02)
    assert passed_over.lake_distance_m[0] > 15000.0


def test_a_point_does_not_depend_on_the_others(tmp_path: Path) -> None:
    shore = shore_of(tmp_path, [ragged(5, 39.4, -4.5, 0.15)], "lake")
    rng = np.random.default_rng(7)
    lon, lat = rng.uniform(39.0, 40.0, 200), rng.uniform(-5.0, -4.0, 200)
    everything, alone = nearest_shore(shore, lon, lat, UTM), nearest_shore(shore, lon[77:78], lat[77:78], UTM)
    for name in everything._fields:
        np.testing.assert_array_equal(getattr(everything, name)[77:78], getattr(alone, name))
    of_all, of_one = (onshore_bearing(shore, x, y, UTM, "lake") for x, y in ((lon, lat), (lon[77:78], lat[77:78])))
    np.testing.assert_array_equal(of_all.from_deg[77:78], of_one.from_deg)


# where the breeze comes from


def test_with_the_sea_in_the_south_the_breeze_comes_from_the_south(tmp_path: Path) -> None:
    """Straight coast along a parallel: 180° from true north, also where grid north is 0.15° off it."""
    shore = shore_of(tmp_path, [box(36.0, -6.0, 42.0, -4.5)], "sea")
    for away in (0.001, 0.01, 0.1, 0.4):
        onshore = onshore_bearing(shore, *at((37.0, -4.5 + away), (39.0, -4.5 + away), (40.9, -4.5 + away)), UTM, "sea")
        # the map's scale grows away from its middle meridian, which tilts the shortest way by 0.014° at 44 km
        np.testing.assert_allclose(onshore.from_deg, 180.0, atol=0.02)
        np.testing.assert_allclose(onshore.steadiness, 1.0, atol=1e-4)


@pytest.mark.parametrize("bearing", [0.0, 30.0, 77.0, 145.0, 200.0, 271.0, 355.0])
@pytest.mark.parametrize("away_m", [500.0, 12_000.0])
def test_a_round_lake_sends_its_breeze_from_its_bearing(tmp_path: Path, bearing: float, away_m: float) -> None:
    """Twelve places stand for the Gaussian; beside a lake of 6 km radius that is worth half a degree at most."""
    shore = shore_of(tmp_path, [circle(39.5, -4.5, 6000.0)], "lake")
    lon, lat, _ = WGS84.fwd(39.5, -4.5, bearing + 180.0, 6000.0 + away_m)
    toward, _, _ = WGS84.inv(lon, lat, 39.5, -4.5)
    onshore = onshore_bearing(shore, np.array([lon]), np.array([lat]), UTM, "lake")
    assert turned(onshore.from_deg[0], toward) < 0.5


def test_between_opposite_shores_there_is_no_bearing(tmp_path: Path) -> None:
    south, north = box(38.5, -4.60, 40.5, -4.55), box(38.5, -4.50, 40.5, -4.45)
    shore = shore_of(tmp_path, [south, north], "lake")
    middle, near_south, near_north = -4.525, -4.545, -4.505
    onshore = onshore_bearing(shore, *at((39.5, middle), (39.5, near_south), (39.5, near_north)), UTM, "lake")
    assert np.isnan(onshore.from_deg[0])
    assert onshore.steadiness[0] < 0.01
    np.testing.assert_allclose(turned(onshore.from_deg[1:], [180.0, 0.0]), 0.0, atol=0.1)


def test_in_the_middle_of_an_island_there_is_no_bearing(tmp_path: Path) -> None:
    sea, island = box(38, -6, 41, -3), circle(39.5, -4.5, 3000.0)
    shore = shore_of(tmp_path, [sea, island], ["sea", "land"])
    east = WGS84.fwd(39.5, -4.5, 90.0, 2800.0)[:2]
    onshore = onshore_bearing(shore, *at((39.5, -4.5), east), UTM, "sea")
    assert np.isnan(onshore.from_deg[0])
    assert turned(onshore.from_deg[1], 90.0) < 0.5


def test_a_narrow_creek_does_not_turn_the_breeze(tmp_path: Path) -> None:
    """A creek 60 m wide comes within 100 m of the plot on the east; the open coast lies 150 m south."""
    sea, degree = box(38.0, -6.0, 41.0, -4.5), 1 / 110_600.0
    creek = box(39.5 + 100 * degree, -4.5, 39.5 + 160 * degree, -4.5 + 400 * degree)
    shore = shore_of(tmp_path, [shapely.union(sea, creek)], "sea")
    plot = at((39.5, -4.5 + 150 * degree))
    assert turned(nearest_shore(shore, *plot, UTM).bearing_deg[0], 90.0) < 1.0
    assert turned(onshore_bearing(shore, *plot, UTM, "sea").from_deg[0], 180.0) < 45.0


def test_lines_and_polygons_agree(tmp_path: Path) -> None:
    coast = LineString([(37.5, -4.5), (41.5, -4.5)])
    lines, areas = shore_of(tmp_path, [coast], "sea"), shore_of(tmp_path, [box(37.5, -6.0, 41.5, -4.5)], "sea")
    place = at((39.5, -4.499), (39.2, -4.4), (39.7, -4.4955))
    np.testing.assert_allclose(
        nearest_shore(lines, *place, UTM).distance_m, nearest_shore(areas, *place, UTM).distance_m, rtol=1e-9
    )
    np.testing.assert_allclose(onshore_bearing(lines, *place, UTM, "sea").from_deg, 180.0, atol=0.01)


# the layer


def true_km(shore: Shore, grid: Grid, kinds: tuple[str, ...]) -> Any:
    """Brute force: shapely's distance from every cell to the whole shoreline in the grid's system."""
    there = Transformer.from_crs("EPSG:4326", grid.crs, always_xy=True)
    kept = shore.lines.geometry.values[shore.lines["kind"].isin(kinds).to_numpy()]
    lines = shapely.transform(
        shapely.segmentize(shapely.union_all(kept), 0.001), lambda xy: np.column_stack(there.transform(*xy.T))
    )
    x, y = np.meshgrid(grid.x_centres_m(), grid.y_centres_m())
    return shapely.distance(lines, shapely.points(x, y)) / 1000.0


@pytest.mark.parametrize("cell", [30.0, 90.0])
def test_the_layer_keeps_its_stated_bounds(tmp_path: Path, cell: float) -> None:
    lakes = [ragged(11, 39.25, -4.6, 0.03), ragged(12, 39.31, -4.56, 0.02), box(39.5, -4.7, 39.9, -4.5)]
    shore = shore_of(tmp_path, lakes, "lake")
    grid = Grid(UTM, 518_010.0, -495_030.0, cell, round(21_000 / cell), round(24_000 / cell))
    field = shore_distance(shore, grid)
    water = shore.water_kind(grid) > 0
    off_cells = (field.values - true_km(shore, grid, ("lake",)))[~water] * 1000.0 / cell
    assert off_cells.max() < 0.5
    assert off_cells.min() > -3.0
    assert np.abs(off_cells).mean() < 0.05
    assert (field.values[water] == 0.0).all()
    assert water.any()
    assert field.unit == "km"


def test_the_layer_near_the_shore_is_measured_cell_by_cell(tmp_path: Path) -> None:
    shore = shore_of(tmp_path, [ragged(11, 39.25, -4.6, 0.03)], "lake")
    grid = Grid(UTM, 518_010.0, -500_010.0, 30.0, 600, 700)
    true = true_km(shore, grid, ("lake",))
    near = (true < 0.15) & (shore.water_kind(grid) == 0)
    assert near.sum() > 4000
    assert np.abs(shore_distance(shore, grid).values - true)[near].max() < 0.001


def test_the_layer_counts_shores_outside_the_grid_and_picks_kinds(tmp_path: Path) -> None:
    shore = shore_of(tmp_path, [circle(39.3, -4.5, 4000.0), box(39.9, -6, 42, -3)], ["lake", "sea"])
    grid = Grid(UTM, 560_010.0, -500_010.0, 90.0, 40, 50)
    for kinds in (("sea",), ("lake",), ("sea", "lake")):
        np.testing.assert_allclose(shore_distance(shore, grid, kinds).values, true_km(shore, grid, kinds), atol=0.009)
    assert shore_distance(shore, grid, ("sea",)).values.min() > 20.0


def test_the_layer_hardly_depends_on_its_window(tmp_path: Path) -> None:
    shore = shore_of(tmp_path, [ragged(11, 39.25, -4.6, 0.03)], "lake")
    whole = Grid(UTM, 510_000.0, -520_020.0, 30.0, 500, 500)
    field = shore_distance(shore, whole)
    west, south = 510_000.0 + 77 * 30, -520_020.0 - 300 * 30
    part, _ = whole.part((west, south, west + 3000, south + 3000))
    np.testing.assert_allclose(
        shore_distance(shore, part).values, field.part(part.bounds).values, atol=0.1 * 0.03, rtol=0
    )


def test_the_layer_without_that_kind_is_unknown(tmp_path: Path) -> None:
    shore = shore_of(tmp_path, [Point(39.5, -4.5).buffer(0.1)], "lake")
    assert np.isnan(shore_distance(shore, Grid(UTM, 510_000.0, -500_000.0, 90.0, 8, 8), ("sea",)).values).all()
