"""Distances to a planner's own layers."""

from pathlib import Path
from typing import Any

import geopandas as gpd
import numpy as np
import pytest
import shapely
from pyproj import Geod, Transformer
from shapely.geometry import LineString, Point, Polygon, box

from sitescreen.errors import InputError
from sitescreen.inputs.own_layers import OwnLayer, read_own_layer

UTM = "EPSG:32637"
EAST, NORTH = 500_000.0, 300_000.0  # on the central meridian, where the scale is 0.9996


def layer_of(folder: Path, shapes: list[Any], crs: str = UTM, name: str = "layer.gpkg") -> OwnLayer:
    gpd.GeoDataFrame(geometry=shapes, crs=crs).to_file(folder / name)
    return read_own_layer(folder / name, "constraint")


def plots(*corners: tuple[float, float], side_m: float = 100.0) -> tuple[list[Any], np.ndarray]:
    """Squares north-east of metric corners, in longitude and latitude, with a longitude inside each."""
    squares = [box(x, y, x + side_m, y + side_m) for x, y in corners]
    lonlat = gpd.GeoSeries(squares, crs=UTM).to_crs("EPSG:4326")
    return list(lonlat), lonlat.representative_point().x.to_numpy()


def test_distance_is_along_the_ground_from_the_plots_edge(tmp_path: Path) -> None:
    """500 m on the map are 500/0.9996 m on the ground at the central meridian."""
    road = layer_of(tmp_path, [LineString([(EAST + 600, NORTH - 9000), (EAST + 600, NORTH + 9000)])])
    outlines, lon = plots((EAST, NORTH), (EAST + 550, NORTH), (EAST + 700, NORTH))
    assert road.distance_m(outlines, lon) == pytest.approx([500 / 0.9996, 0.0, 100 / 0.9996], abs=0.02)


def test_distance_to_a_point_is_the_geodesic(tmp_path: Path) -> None:
    """A well 20 km away by a bearing of 63°, by the inverse of what placed it."""
    lon, lat, _ = Geod(ellps="WGS84").fwd(39.5, 2.0, 63.0, 20_000.0)
    well = layer_of(tmp_path, [Point(lon, lat)], "EPSG:4326")
    plot = Point(39.5, 2.0).buffer(1e-7)
    assert well.distance_m([plot], np.array([39.5])) == pytest.approx([20_000.0], abs=0.1)


def test_straight_edges_stay_straight_on_the_layers_own_map(tmp_path: Path) -> None:
    """A road of 100 km drawn with two corners in the next zone, against the same road with a corner every 50 m."""
    there = Transformer.from_crs("EPSG:4326", "EPSG:32636", always_xy=True)
    x, y = there.transform(39.0, 2.7)
    road = LineString([(x + 3000, y - 50_000), (x + 3000, y + 50_000)])
    outlines, lon = [Point(39.0, 2.7).buffer(0.001)], np.array([39.0])
    coarse = layer_of(tmp_path, [road], "EPSG:32636", "coarse.gpkg").distance_m(outlines, lon)
    fine = layer_of(tmp_path, [shapely.segmentize(road, 50.0)], "EPSG:32636", "fine.gpkg").distance_m(outlines, lon)
    assert coarse == pytest.approx(fine, abs=0.1)
    two_corners = shapely.transform(
        np.array([road]), lambda xy: np.column_stack(there.transform(xy[:, 0], xy[:, 1], direction="INVERSE"))
    )
    torn = OwnLayer(two_corners, None, ())  # type: ignore[arg-type]
    assert abs(torn.distance_m(outlines, lon)[0] - fine[0]) > 5.0, "the corners alone would be off"


def test_a_plots_distance_depends_on_no_other_plot(tmp_path: Path) -> None:
    rivers = [LineString([(EAST + dx, NORTH), (EAST + dx + 500, NORTH + 4000)]) for dx in (900, -2000, 5000)]
    river = layer_of(tmp_path, rivers)
    outlines, lon = plots((EAST, NORTH), (EAST + 3000, NORTH + 500), (EAST - 700, NORTH + 2000))
    outlines, lon = [*outlines, Point(36.0, 2.7).buffer(0.001)], np.append(lon, 35.99)  # and one in the next zone
    together = river.distance_m(outlines, lon)
    alone = [river.distance_m([one], np.array([at]))[0] for one, at in zip(outlines, lon, strict=True)]
    assert together.tolist() == alone
    assert len(set(alone)) == 4


def test_inside_means_sharing_ground(tmp_path: Path) -> None:
    zone = layer_of(tmp_path, [box(EAST, NORTH, EAST + 1000, NORTH + 1000), Point(EAST - 450, NORTH + 50)])
    outlines, lon = plots((EAST + 300, NORTH + 300), (EAST - 50, NORTH), (EAST - 100, NORTH), (EAST - 500, NORTH))
    assert zone.is_inside(outlines, lon).tolist() == [1.0, 1.0, 0.0, 1.0], "the third only shares a boundary"
    assert zone.distance_m(outlines, lon) == pytest.approx([0.0, 0.0, 0.0, 0.0], abs=1e-3)


def test_no_plot_no_distance(tmp_path: Path) -> None:
    road = layer_of(tmp_path, [Point(EAST, NORTH)])
    assert np.isnan(road.distance_m([None, Polygon()], np.array([np.nan, np.nan]))).all()
    assert np.isnan(road.is_inside([None], np.array([np.nan]))).all()


def test_a_crossed_outline_is_mended(tmp_path: Path) -> None:
    bow = Polygon([(EAST, NORTH), (EAST + 1000, NORTH + 1000), (EAST + 1000, NORTH), (EAST, NORTH + 1000)])
    outlines, lon = plots((EAST + 10, NORTH + 450), (EAST + 450, NORTH + 20))
    assert layer_of(tmp_path, [bow]).is_inside(outlines, lon).tolist() == [1.0, 0.0]


def test_layers_that_cannot_be_placed_are_refused(tmp_path: Path) -> None:
    with pytest.raises(InputError, match="does not exist"):
        read_own_layer(tmp_path / "none.gpkg", "constraint")
    with pytest.warns(UserWarning, match="'crs' was not provided"):
        gpd.GeoDataFrame(geometry=[Point(1, 1)]).to_file(tmp_path / "nowhere.gpkg")
    with pytest.raises(InputError, match="does not say its coordinate system"):
        read_own_layer(tmp_path / "nowhere.gpkg", "constraint")
    with pytest.raises(InputError, match="look like degrees"):
        layer_of(tmp_path, [Point(39.0, 2.0)], UTM, "degrees.gpkg")
    with pytest.raises(InputError, match="holds no geometry"):
        layer_of(tmp_path, [Polygon()], UTM, "empty.gpkg")
