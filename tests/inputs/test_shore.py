"""The shore layer: waters, shorelines without the edges of the drawing, and refusals in words."""

from pathlib import Path
from typing import Any

import geopandas as gpd
import numpy as np
import pytest
import shapely
from pyproj import Geod, Transformer
from shapely.geometry import LineString, MultiPolygon, Point, Polygon, box

from sitescreen.errors import InputError
from sitescreen.grid import Grid
from sitescreen.inputs.shore import Shore, read_shore

FRAME = box(39.0, -5.0, 40.0, -4.0)
WGS84 = Geod(ellps="WGS84")
COAST = LineString([(39.7, -5.0), (39.6, -4.6), (39.72, -4.3), (39.65, -4.0)])
SEA = Polygon([*COAST.coords, (40.0, -4.0), (40.0, -5.0)])
LAND = Polygon([*COAST.coords, (39.0, -4.0), (39.0, -5.0)])


def write(path: Path, geometries: list[Any], crs: str = "EPSG:4326", **columns: Any) -> Path:
    gpd.GeoDataFrame(columns, geometry=geometries, crs="EPSG:4326").to_crs(crs).to_file(path)
    return path


def round_lake(lon: float, lat: float, radius_m: float) -> Polygon:
    """A circle of 720 corners along the ellipsoid."""
    turn = np.arange(0.0, 360.0, 0.5)
    x, y, _ = WGS84.fwd(np.full(720, lon), np.full(720, lat), turn, np.full(720, radius_m))
    return Polygon(np.column_stack([x, y]))


def shoreline(shore: Shore, kind: str) -> Any:
    return shapely.union_all(shore.lines.geometry.values[(shore.lines["kind"] == kind).to_numpy()])


def same_line(a: Any, b: Any, within_deg: float = 2e-6) -> bool:
    return bool(shapely.hausdorff_distance(shapely.segmentize(a, 0.01), shapely.segmentize(b, 0.01)) < within_deg)


# which edges are shore


def test_a_sea_clipped_to_the_terrain_has_its_coast_alone(tmp_path: Path) -> None:
    shore = read_shore(write(tmp_path / "s.gpkg", [SEA]), "sea", FRAME)
    assert same_line(shoreline(shore, "sea"), COAST)


def test_a_sea_drawn_beyond_the_terrain_has_its_coast_alone(tmp_path: Path) -> None:
    wide = Polygon([(39.7, -5.5), *COAST.coords, (39.65, -3.5), (41.0, -3.5), (41.0, -5.5)])
    shore = read_shore(write(tmp_path / "s.gpkg", [wide]), "sea", FRAME)
    coast = LineString([(39.7, -5.5), *COAST.coords, (39.65, -3.5)])
    assert same_line(shoreline(shore, "sea"), coast)


def test_a_straight_coast_inside_the_terrain_is_a_coast(tmp_path: Path) -> None:
    """Its edge lies on the rectangle round the layer, yet the terrain goes on behind it."""
    shore = read_shore(write(tmp_path / "s.gpkg", [box(39.7, -5.0, 40.0, -4.0)]), "sea", FRAME)
    assert same_line(shoreline(shore, "sea"), LineString([(39.7, -5.0), (39.7, -4.0)]))


def test_a_square_lake_inside_the_terrain_keeps_all_its_shore(tmp_path: Path) -> None:
    square = box(39.3, -4.5, 39.6, -4.2)
    shore = read_shore(write(tmp_path / "s.gpkg", [square]), "lake", FRAME)
    assert same_line(shoreline(shore, "lake"), square.exterior)


def test_an_edge_cut_in_metres_is_known_in_metres(tmp_path: Path) -> None:
    """Upright in UTM, slanted in degrees: the rectangle is looked for in the file's own system."""
    to_utm = Transformer.from_crs("EPSG:4326", "EPSG:32737", always_xy=True)
    back = Transformer.from_crs("EPSG:32737", "EPSG:4326", always_xy=True)
    sea = box(600_000, 9_440_000, 650_000, 9_560_000).difference(Point(600_000, 9_500_000).buffer(20_000))
    terrain = box(590_000, 9_450_000, 640_000, 9_550_000).segmentize(5000.0)
    frame = shapely.transform(terrain, lambda xy: np.column_stack(back.transform(*xy.T)))
    gpd.GeoDataFrame(geometry=[sea], crs="EPSG:32737").to_file(tmp_path / "s.gpkg")
    shore = read_shore(tmp_path / "s.gpkg", "sea", frame)
    kept = shapely.transform(shoreline(shore, "sea"), lambda xy: np.column_stack(to_utm.transform(*xy.T)))
    west, south, east, north = kept.bounds
    assert (round(west), round(south), round(east), round(north)) == (600_000, 9_440_000, 620_000, 9_560_000)


def test_water_clipped_to_a_slanted_terrain_has_no_shore_along_its_edge(tmp_path: Path) -> None:
    """Longitude and latitude in the file, a terrain upright in UTM: the edge follows the terrain's own outline."""
    back = Transformer.from_crs("EPSG:32737", "EPSG:4326", always_xy=True)
    terrain = box(700_000, 9_450_000, 800_000, 9_550_000).segmentize(1000.0)
    frame = shapely.transform(terrain, lambda xy: np.column_stack(back.transform(*xy.T)))
    coast = LineString([(41.3, -6.0), (41.35, -4.6), (41.25, -3.0)])
    wet = shapely.intersection(frame, Polygon([*coast.coords, (43.0, -3.0), (43.0, -6.0)]))
    shore = read_shore(write(tmp_path / "s.gpkg", [wet]), "sea", frame)
    assert same_line(shoreline(shore, "sea"), shapely.intersection(coast, frame), within_deg=1e-3)


def test_seams_between_tiles_of_one_sea_are_no_shore(tmp_path: Path) -> None:
    halves = [SEA.intersection(box(39, -5, 40, -4.5)), SEA.intersection(box(39, -4.5, 40, -4))]
    shore = read_shore(write(tmp_path / "s.gpkg", halves), "sea", FRAME)
    assert same_line(shoreline(shore, "sea"), COAST, within_deg=1e-5)
    assert len(shore.waters) == 1


def test_the_mouth_where_sea_and_lake_meet_is_no_shore(tmp_path: Path) -> None:
    sea, lake = box(39.7, -5.0, 40.0, -4.0), box(39.5, -4.6, 39.7, -4.4)
    shore = read_shore(write(tmp_path / "s.gpkg", [sea, lake], kind=["sea", "lake"]), "kind", FRAME)
    mouth = LineString([(39.7, -4.59), (39.7, -4.41)])
    assert shoreline(shore, "sea").distance(Point(39.7, -4.5)) > 0.09
    assert not mouth.intersects(shoreline(shore, "lake"))


# land polygons


def test_land_leaves_the_sea_as_the_rest(tmp_path: Path) -> None:
    shore = read_shore(write(tmp_path / "s.gpkg", [LAND]), "land", FRAME)
    assert same_line(shoreline(shore, "sea"), COAST)
    (sea,) = shore.waters.geometry
    assert sea.contains(Point(39.9, -4.5))
    assert not sea.intersects(Point(39.3, -4.5))
    # the drawing ends at latitude -4 and -5, so beyond nothing is called sea; in the east it does not end
    assert not sea.intersects(Point(39.5, -3.9))
    assert sea.contains(Point(40.4, -4.5))


def test_land_and_its_sea_are_one_map(tmp_path: Path) -> None:
    """Land polygons and the sea they leave give the same cells and the same coast."""
    from_land = read_shore(write(tmp_path / "l.gpkg", [LAND]), "land", FRAME)
    from_sea = read_shore(write(tmp_path / "s.gpkg", [SEA]), "sea", FRAME)
    grid = Grid("EPSG:32637", 510_000.0, -450_000.0, 500.0, 190, 200)
    np.testing.assert_array_equal(from_land.water_kind(grid), from_sea.water_kind(grid))
    assert (from_land.water_kind(grid) == 1).any()
    assert same_line(shoreline(from_land, "sea"), shoreline(from_sea, "sea"))


def test_islands_holes_and_neighbouring_countries(tmp_path: Path) -> None:
    hole = box(39.2, -4.6, 39.4, -4.4)
    west, east = LAND.intersection(box(39, -5, 39.3, -4)), LAND.intersection(box(39.3, -5, 40, -4))
    islet, island = box(39.28, -4.52, 39.34, -4.48), Point(39.85, -4.5).buffer(0.05)
    pieces = [west.difference(hole), east.difference(hole), islet, island]
    shore = read_shore(write(tmp_path / "s.gpkg", pieces), "land", FRAME)
    assert shore.waters["kind"].tolist() == ["sea", "lake"]
    sea, lake = shore.waters.geometry
    assert lake.equals(hole.difference(islet))
    assert not sea.intersects(island.buffer(-0.001))
    assert same_line(shoreline(shore, "lake"), hole.exterior.union(islet.exterior), within_deg=1e-5)
    assert shoreline(shore, "sea").distance(island.exterior) < 1e-9
    assert shoreline(shore, "sea").distance(hole) > 0.1
    assert not shoreline(shore, "sea").intersects(LineString([(39.3, -4.95), (39.3, -4.65)]))


def test_a_square_island_is_an_island(tmp_path: Path) -> None:
    square = box(39.4, -4.6, 39.6, -4.4)
    shore = read_shore(write(tmp_path / "s.gpkg", [square]), "land", FRAME)
    assert same_line(shoreline(shore, "sea"), square.exterior)
    assert shore.waters.geometry[0].contains(Point(39.2, -4.5))


def test_inland_terrain_has_no_shore_at_the_edge_of_its_land(tmp_path: Path) -> None:
    shore = read_shore(write(tmp_path / "s.gpkg", [box(38, -6, 41, -3)]), "land", FRAME)
    assert len(shore.lines) == 0
    assert any("no shoreline is known" in note.text for note in shore.notes)


def test_land_elsewhere_is_refused(tmp_path: Path) -> None:
    with pytest.raises(InputError, match="nowhere on the terrain"):
        read_shore(write(tmp_path / "s.gpkg", [box(41, -5, 42, -4)]), "land", FRAME)


def test_land_called_sea_is_suspected(tmp_path: Path) -> None:
    shore = read_shore(write(tmp_path / "s.gpkg", [box(38.9, -5.1, 40.1, -3.9)]), "sea", FRAME)
    assert any(note.level == "warning" and "100%" in note.text for note in shore.notes)


# lakes


@pytest.mark.parametrize("lat", [-4.5, 25.0])
def test_a_round_lake_is_as_wide_as_it_is(tmp_path: Path, lat: float) -> None:
    file = write(tmp_path / "s.gpkg", [round_lake(39.5, lat, 8000.0)], name=["Round"])
    shore = read_shore(file, "lake", box(39.0, lat - 0.5, 40.0, lat + 0.5))
    assert shore.waters["width_km"][0] == pytest.approx(16.0, rel=0.012)  # the circle is found to 1 %
    assert shore.waters["area_km2"][0] == pytest.approx(np.pi * 64.0, rel=1e-3)
    assert shore.waters["name"][0] == "Round"


def test_an_island_in_the_middle_halves_the_width(tmp_path: Path) -> None:
    lake, island = round_lake(39.5, -4.5, 8000.0), round_lake(39.5, -4.5, 2000.0)
    file = write(tmp_path / "s.gpkg", [lake, island], kind=["lake", "island"])
    shore = read_shore(file, "kind", FRAME)
    assert shore.waters["width_km"][0] == pytest.approx(6.0, rel=0.02)
    assert len(shore.waters.geometry[0].interiors) == 1


def test_a_small_lake_is_water_without_a_breeze(tmp_path: Path) -> None:
    big, small = round_lake(39.5, -4.5, 3000.0), round_lake(39.2, -4.2, 300.0)
    shore = read_shore(write(tmp_path / "s.gpkg", [big, small]), "lake", FRAME)
    assert len(shore.waters) == 2
    assert len(shore.lines) == 1
    assert any("1 lake(s) under 1 km²" in note.text for note in shore.notes)
    plot = gpd.GeoSeries([small.centroid.buffer(0.0005)], crs="EPSG:4326")
    assert shore.share_in_water(plot)[0] == 1.0


def test_a_lake_cut_off_is_said_to_be(tmp_path: Path) -> None:
    cut = round_lake(39.0, -4.5, 20000.0).intersection(FRAME)
    shore = read_shore(write(tmp_path / "s.gpkg", [cut]), "lake", FRAME)
    assert any("may be wider" in note.text for note in shore.notes)
    west = shapely.get_coordinates(shore.lines.geometry.values)[:, 0].min()
    assert shoreline(shore, "lake").intersection(LineString([(39.0, -4.6), (39.0, -4.4)])).length == 0.0
    assert west == pytest.approx(39.0, abs=1e-5)


# kinds


def test_common_words_are_understood_and_said(tmp_path: Path) -> None:
    shapes = [SEA, round_lake(39.2, -4.2, 3000.0), round_lake(39.2, -4.7, 3000.0), box(39.4, -4.95, 39.41, -4.9)]
    file = write(tmp_path / "s.gpkg", shapes, type=["Ocean", "Reservoir", "lake", "river"])
    shore = read_shore(file, None, FRAME)
    assert shore.waters["kind"].tolist() == ["sea", "lake", "lake"]
    said = " ".join(note.text for note in shore.notes)
    assert "“Ocean” as sea" in said
    assert "“Reservoir” as lake" in said
    assert "“river”" in said


@pytest.mark.parametrize(
    ("columns", "kind", "why"),
    [
        ({"a": ["x"]}, None, 'sea, lakes or land.*kind = "land" if they are land.*--shore-kind'),
        ({"kind": ["blue"]}, "kind", "“blue”"),
        ({"kind": [None]}, "kind", "nothing"),
        ({"kinds": ["sea"]}, "kynds", "Did you mean “kinds”"),
        ({"a": ["x"]}, "river", "“river”"),
    ],
)
def test_unclear_water_is_asked_about(tmp_path: Path, columns: dict[str, Any], kind: str | None, why: str) -> None:
    with pytest.raises(InputError, match=why):
        read_shore(write(tmp_path / "s.gpkg", [SEA], **columns), kind, FRAME)


# lines


def test_lines_serve_for_distance_alone(tmp_path: Path) -> None:
    shore = read_shore(write(tmp_path / "s.gpkg", [COAST]), "sea", FRAME)
    assert shoreline(shore, "sea").equals(COAST)
    grid = Grid("EPSG:32637", 510_000.0, -450_000.0, 500.0, 100, 100)
    assert not shore.water_kind(grid).any()
    assert any(note.level == "warning" and "plots in the water" in note.text for note in shore.notes)
    assert np.isnan(shore.share_in_water(gpd.GeoSeries([box(39.9, -4.5, 39.91, -4.49)], crs="EPSG:4326"))[0])


def test_lines_called_land_are_refused(tmp_path: Path) -> None:
    with pytest.raises(InputError, match="called land"):
        read_shore(write(tmp_path / "s.gpkg", [COAST]), "land", FRAME)


# water under cells and plots


def test_cells_are_water_where_their_centres_are(tmp_path: Path) -> None:
    lake = round_lake(39.3, -4.5, 5000.0)
    shore = read_shore(write(tmp_path / "s.gpkg", [SEA, lake], kind=["sea", "lake"]), "kind", FRAME)
    grid = Grid("EPSG:32637", 520_000.0, -470_000.0, 900.0, 60, 90)
    x, y = np.meshgrid(grid.x_centres_m(), grid.y_centres_m())
    lon, lat = Transformer.from_crs(grid.crs, "EPSG:4326", always_xy=True).transform(x, y)
    expected = np.where(shapely.contains_xy(SEA, lon, lat), 1, np.where(shapely.contains_xy(lake, lon, lat), 2, 0))
    found = shore.water_kind(grid)
    assert set(np.unique(found)) == {0, 1, 2}
    # a straight edge in degrees is bent in metres by a few metres: at most a cell or two change sides
    assert (found != expected).sum() <= 2


def test_a_grid_whose_rim_lies_across_180_has_its_water(tmp_path: Path) -> None:
    """A lake of 1 km by 1 km that ends 1 km short of the meridian, under a grid that ends 1 km beyond it."""
    frame = box(179.5, -17.5, 180.0, -16.5)
    x, y = Transformer.from_crs("EPSG:4326", "EPSG:32760", always_xy=True).transform(180.0, -17.0)
    grid = Grid("EPSG:32760", round(x, -1) - 4000.0, round(y, -1) + 2000.0, 100.0, 40, 50)
    away = 1000.0 / WGS84.inv(179.0, -17.0, 180.0, -17.0)[2]
    lake = box(180.0 - 2.0 * away, -17.0, 180.0 - away, -17.0 + 1.0 / 110.66)
    shore = read_shore(write(tmp_path / "s.gpkg", [lake]), "lake", frame)
    assert (shore.water_kind(grid) == 2).sum() == pytest.approx(100, abs=12)


def test_the_share_of_a_plot_in_water(tmp_path: Path) -> None:
    lake = box(39.3, -4.5, 39.5, -4.3).difference(box(39.39, -4.41, 39.41, -4.39))
    shore = read_shore(write(tmp_path / "s.gpkg", [lake]), "lake", FRAME)
    plots = gpd.GeoSeries(
        [
            box(39.32, -4.45, 39.33, -4.44),
            box(39.2975, -4.4, 39.3075, -4.39),
            box(39.1, -4.45, 39.11, -4.44),
            box(39.398, -4.402, 39.402, -4.398),
            None,
            MultiPolygon([box(39.32, -4.45, 39.33, -4.44), box(39.1, -4.45, 39.11, -4.44)]),
        ],
        crs="EPSG:4326",
    )
    np.testing.assert_allclose(shore.share_in_water(plots), [1.0, 0.75, 0.0, 0.0, np.nan, 0.5], atol=1e-9)


# refusals


def test_no_coordinate_system_is_refused(tmp_path: Path) -> None:
    file = write(tmp_path / "s.shp", [SEA], a=["x"])
    file.with_suffix(".prj").unlink()
    with pytest.raises(InputError, match="does not say its coordinate system"):
        read_shore(file, "sea", FRAME)


def test_swapped_coordinates_are_noticed(tmp_path: Path) -> None:
    turned = shapely.transform(SEA, lambda xy: xy[:, ::-1])
    with pytest.raises(InputError, match="swapped"):
        read_shore(write(tmp_path / "s.gpkg", [turned]), "sea", FRAME)


def test_points_are_no_shore(tmp_path: Path) -> None:
    with pytest.raises(InputError, match="no polygon or line"):
        read_shore(write(tmp_path / "s.gpkg", [Point(39, -4)]), "sea", FRAME)


def test_a_far_shore_is_a_warning(tmp_path: Path) -> None:
    shore = read_shore(write(tmp_path / "s.gpkg", [round_lake(60.0, 10.0, 5000.0)]), "lake", FRAME)
    assert any(note.level == "warning" and "500 km" in note.text for note in shore.notes)


def test_a_crossing_outline_is_mended_and_said(tmp_path: Path) -> None:
    bow = Polygon([(39.2, -4.5), (39.4, -4.3), (39.4, -4.5), (39.2, -4.3)])
    shore = read_shore(write(tmp_path / "s.gpkg", [bow]), "lake", FRAME)
    assert any("mended" in note.text for note in shore.notes)
    assert shore.waters.geometry.is_valid.all()
    assert len(shore.waters) == 2


def test_a_shapefile_without_its_companions_says_what_to_copy(tmp_path: Path) -> None:
    path = write(tmp_path / "s.shp", [SEA], kind=["sea"])
    path.with_suffix(".shx").unlink()
    with pytest.raises(InputError, match=r"lacks its index s\.shx.*\.shx, \.dbf and \.prj"):
        read_shore(path, "sea", FRAME)
