"""Ground cover: classes by nearest cell, or by polygon."""

from pathlib import Path
from typing import Any

import geopandas as gpd
import numpy as np
import pytest
import rasterio
from affine import Affine
from shapely.geometry import Point, Polygon, box

from sitescreen.brief import CoverBrief
from sitescreen.errors import InputError
from sitescreen.grid import Grid
from sitescreen.inputs.cover import Cover, read_cover

AIR = {"roughness_m": 0.5, "canopy_m": 4.0, "cold_air_factor": 0.9}
WEST, NORTH = 500_010.0, 9_000.0
GRID = Grid("EPSG:32637", WEST, NORTH, 30.0, 40, 50)


def raster(path: Path, values: np.ndarray, crs: str | None = "EPSG:32637", **more: Any) -> Path:
    rows, cols = values.shape
    profile = {"crs": crs, "transform": Affine(30.0, 0, WEST, 0, -30.0, NORTH), "dtype": values.dtype.name, **more}
    with rasterio.open(path, "w", "GTiff", cols, rows, 1, **profile) as out:
        out.write(values, 1)
    return path


def cover(path: Path, *classes: str, column: str | None = None) -> Cover:
    content: dict[str, Any] = {"file": path, "classes": dict.fromkeys(classes, AIR)}
    if column:
        content["column"] = column
    return read_cover(CoverBrief.model_validate(content))


def classes() -> np.ndarray:
    """Each row of 4 cells another of 10, 20, 30, and 0 as no-data."""
    return np.repeat(np.array([10, 20, 30, 0, 10, 20, 30, 0, 10, 20], np.uint8), 4)[:, None] * np.ones(
        (1, 50), np.uint8
    )


def test_cells_of_the_same_grid_keep_their_classes(tmp_path: Path) -> None:
    found = cover(raster(tmp_path / "c.tif", classes(), nodata=0), "20", "10", "30").classes(GRID)
    assert found.dtype == np.uint8
    assert (found == np.choose(classes() // 10, [0, 2, 1, 3])).all()


def test_classes_mean_what_the_brief_says_and_gaps_what_the_caller_says(tmp_path: Path) -> None:
    opened = cover(raster(tmp_path / "c.tif", classes(), nodata=0), "20")
    for key in ("roughness_m", "canopy_m", "cold_air_factor"):
        found = opened.values(np.array([[0, 1]], np.uint8), key, -1.0)
        assert found.dtype == np.float32
        assert found.tolist() == [[-1.0, pytest.approx(AIR[key])]]


def test_a_grid_beyond_the_map_is_of_no_class(tmp_path: Path) -> None:
    opened = cover(raster(tmp_path / "c.tif", classes()), "10", "20", "30", "0")
    beyond = Grid("EPSG:32637", WEST - 300.0, NORTH + 300.0, 30.0, 20, 20)
    found = opened.classes(beyond)
    assert (found[:10] == 0).all()
    assert (found[:, :10] == 0).all()
    assert (found[10:14, 10:] == 1).all()


def test_another_coordinate_system_is_met_by_nearest_cell(tmp_path: Path) -> None:
    """In degrees: classes stay whole numbers, no mean of 10 and 30 appears."""
    values = np.where(np.indices((60, 60))[1] < 30, 10, 30).astype(np.int16)
    degrees = Affine(0.0003, 0, 39.0, 0, -0.0003, 0.081)
    with rasterio.open(
        tmp_path / "c.tif", "w", "GTiff", 60, 60, 1, crs="EPSG:4326", transform=degrees, dtype="int16"
    ) as out:
        out.write(values, 1)
    found = cover(tmp_path / "c.tif", "10", "30").classes(Grid("EPSG:32637", 500_250.0, 8_700.0, 30.0, 40, 40))
    assert set(np.unique(found)) == {1, 2}
    # 39.009° lies 1,001.9 m east of the central meridian (0.9996 · 6,378,137 m · radians): at 501,001.5
    assert (found[:, :25] == 1).all()
    assert (found[:, 26:] == 2).all()


def test_polygons_give_their_class_and_the_first_wins(tmp_path: Path) -> None:
    shapes = [box(WEST, NORTH - 1200, WEST + 750, NORTH), box(WEST + 600, NORTH - 1200, WEST + 1200, NORTH)]
    table = gpd.GeoDataFrame({"kind": ["wood", "town"]}, geometry=shapes, crs="EPSG:32637").to_crs("EPSG:4326")
    table.to_file(tmp_path / "c.gpkg")
    found = cover(tmp_path / "c.gpkg", "town", "wood", column="kind").classes(GRID)
    assert (found[:, :25] == 2).all()
    assert (found[:, 26:40] == 1).all()
    assert (found[:, 41:] == 0).all()


def test_classes_without_figures_are_told(tmp_path: Path) -> None:
    found = cover(raster(tmp_path / "c.tif", classes(), nodata=0), "10")
    assert "holds the classes 20, 30, which [cover.classes] says nothing of" in found.notes[0].text
    assert set(np.unique(found.classes(GRID))) == {0, 1}


def test_maps_that_cannot_be_used_are_refused(tmp_path: Path) -> None:
    with pytest.raises(InputError, match=r"holds the classes 0, 10, 20, 30, none of which"):
        cover(raster(tmp_path / "a.tif", classes()), "11", "12")
    with pytest.raises(InputError, match=r"has the class “wood” and b\.tif is a raster"):
        cover(raster(tmp_path / "b.tif", classes()), "wood")
    with pytest.raises(InputError, match=r"c\.tif holds numbers with fractions"):
        cover(raster(tmp_path / "c.tif", classes().astype(np.float32)), "10")
    with pytest.raises(InputError, match=r"d\.tif does not say its coordinate system"):
        cover(raster(tmp_path / "d.tif", classes(), None), "10")
    with pytest.raises(InputError, match=r"e\.tif cannot be read as a raster"):
        cover(tmp_path / "e.tif", "10")
    path = raster(tmp_path / "f.tif", classes())
    path.write_bytes(path.read_bytes()[:900])
    with pytest.raises(InputError, match=r"f\.tif"):
        cover(path, "10")


def test_a_polygon_map_without_the_column_is_refused(tmp_path: Path) -> None:
    table = gpd.GeoDataFrame({"kind": ["wood"]}, geometry=[box(39, 0, 39.1, 0.1)], crs="EPSG:4326")
    table.to_file(tmp_path / "c.gpkg")
    with pytest.raises(InputError, match="klass"):
        cover(tmp_path / "c.gpkg", "wood", column="klass")


def test_the_map_is_stamped(tmp_path: Path) -> None:
    found = cover(raster(tmp_path / "c.tif", classes()), "10", "20", "30", "0")
    assert (found.stamp.name, found.stamp.crs) == ("c.tif", "EPSG:32637")
    assert found.notes == ()


@pytest.mark.parametrize("at_once", [1, 20_000, 1 << 24])
def test_classes_that_the_map_lacks_are_told_even_if_one_lies_in_a_corner(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, at_once: int
) -> None:
    monkeypatch.setattr("sitescreen.inputs.cover.STRIP_CELLS", at_once)
    values = np.full((600, 700), 10, np.uint8)
    values[599, 699] = 30
    path = raster(tmp_path / "c.tif", values, tiled=True, blockxsize=16, blockysize=16, compress="deflate")
    (said,) = cover(path, "10", "20", "30").notes
    assert (said.level, said.text) == ("info", "c.tif does not hold the classes 20 of [cover.classes].")


@pytest.mark.parametrize("dtype", ["uint8", "int16", "uint16", "int32"])
def test_classes_of_every_whole_type_are_found(tmp_path: Path, dtype: str) -> None:
    path = raster(tmp_path / "c.tif", classes().astype(dtype), nodata=0)
    found = cover(path, "20", "30", "10")
    assert found.notes == ()
    assert (found.classes(GRID) == np.choose(classes() // 10, [0, 3, 1, 2])).all()


def test_a_map_cut_off_anywhere_is_refused(tmp_path: Path) -> None:
    values = np.random.default_rng(1).integers(1, 4, (300, 300)).astype(np.uint8)
    path = raster(tmp_path / "c.tif", values, tiled=True, blockxsize=16, blockysize=16, compress="deflate")
    whole = path.read_bytes()
    for kept in np.linspace(10, len(whole) - 1, 12).astype(int):
        path.write_bytes(whole[:kept])
        with pytest.raises(InputError, match=r"c\.tif cannot be read as a raster"):
            cover(path, "1", "2", "3")


def test_a_map_of_gaps_or_tied_to_no_place_is_refused(tmp_path: Path) -> None:
    with pytest.raises(InputError, match=r"a\.tif holds no class at all"):
        cover(raster(tmp_path / "a.tif", np.zeros((9, 9), np.uint8), nodata=0), "10")
    local = 'LOCAL_CS["site grid",UNIT["metre",1]]'
    with pytest.raises(InputError, match=r"b\.tif does not say.*“site grid” is tied to no place"):
        cover(raster(tmp_path / "b.tif", classes(), local), "10")


def test_rows_that_are_no_polygons_with_a_class_are_counted_and_whole_numbers_stay_whole(tmp_path: Path) -> None:
    """An empty cell turns a column of whole numbers into 10.0, 20.0 …; a bow-tie is its two triangles."""
    tie = Polygon([(WEST, NORTH), (WEST + 600, NORTH - 600), (WEST + 600, NORTH), (WEST, NORTH - 600)])
    shapes = [tie, box(WEST + 900, NORTH - 1200, WEST + 1500, NORTH), Point(WEST, NORTH), box(0, 0, 1, 1)]
    values = [10, 20, 10, None]
    gpd.GeoDataFrame({"class": values}, geometry=shapes, crs="EPSG:32637").to_file(tmp_path / "c.gpkg")
    found = cover(tmp_path / "c.gpkg", "10", "20")
    (said,) = found.notes
    assert said.text == "c.gpkg: 2 of 4 rows are no polygons with a class. They were left out."
    laid = found.classes(GRID)
    assert (laid[:, 30:] == 2).all()
    # a bow-tie of 20 × 20 cells: its two triangles, left and right, are half of the square
    assert abs(int((laid[:20, :20] == 1).sum()) - 200) <= 20
    assert (laid[10, 1], laid[10, 18], laid[1, 10], laid[18, 10]) == (1, 1, 0, 0)
