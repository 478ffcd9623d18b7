"""Terrain files as they come in: cut off anywhere, with strange no-data, in feet, on another datum."""

from pathlib import Path
from typing import Any

import numpy as np
import pytest
import rasterio
from pyproj import Transformer
from rasterio.transform import Affine

from sitescreen.brief import TerrainBrief
from sitescreen.errors import InputError
from sitescreen.grid import Grid
from sitescreen.inputs.terrain import Terrain, open_terrain

WEST, NORTH = 500_010.0, -10_020.0
GRID = Grid("EPSG:32637", WEST, NORTH, 30.0, 100, 90)


def ground() -> np.ndarray:
    return np.random.default_rng(1).normal(500.0, 50.0, (100, 90)).astype("f4")


def write(path: Path, values: Any, crs: str = "EPSG:32637", transform: Affine | None = None, **more: Any) -> Path:
    profile = {"driver": "GTiff", "count": 1, "height": values.shape[0], "width": values.shape[1], **more}
    place = transform or Affine(30, 0, WEST, 0, -30, NORTH)
    with rasterio.open(path, "w", **profile, dtype=values.dtype, crs=crs, transform=place) as out:
        out.write(values, 1)
    return path


def opened(path: Path, **more: Any) -> Terrain:
    return open_terrain(TerrainBrief.model_validate({"files": [path], **more}))


def warnings_of(terrain: Terrain) -> list[str]:
    return [note.text for note in terrain.notes if note.level == "warning"]


LAYOUTS: dict[str, dict[str, Any]] = {
    "strips": {},
    "strips, deflate": {"compress": "deflate"},
    "tiles": {"tiled": True, "blockxsize": 32, "blockysize": 32},
    "tiles, lzw": {"tiled": True, "blockxsize": 32, "blockysize": 32, "compress": "lzw", "predictor": 3},
}


@pytest.mark.parametrize("layout", LAYOUTS)
def test_wherever_a_file_is_cut_off_it_is_refused_and_never_read_in_part(tmp_path: Path, layout: str) -> None:
    raw = write(tmp_path / "whole.tif", ground(), **LAYOUTS[layout]).read_bytes()
    assert np.isfinite(opened(tmp_path / "whole.tif").elevation(GRID).values).all()
    path = tmp_path / "cut.tif"
    for kept in (0, 1, 8, 60, 300, 700, *np.linspace(1500, len(raw) - 1, 12).astype(int)):
        path.write_bytes(raw[:kept])
        with pytest.raises(InputError, match=r"cut\.tif"):
            opened(path).elevation(GRID)


def test_damage_in_a_block_that_opening_does_not_look_at_is_refused_when_heights_are_read(tmp_path: Path) -> None:
    path = write(tmp_path / "t.tif", ground(), compress="deflate", tiled=True, blockxsize=16, blockysize=16)
    whole = path.read_bytes()
    told = 0
    for start in range(3000, len(whole) - 400, 1500):
        path.write_bytes(whole[:start] + b"\x55" * 300 + whole[start + 300 :])
        with pytest.raises(InputError, match=r"t\.tif is damaged"):
            opened(path).elevation(GRID)
        told += 1
    assert told > 10


@pytest.mark.parametrize("value", [-32768, -32767, -9999, -10000])
@pytest.mark.parametrize("dtype", ["int16", "float32"])
def test_what_usually_stands_for_no_height_is_none_even_undeclared(tmp_path: Path, value: int, dtype: str) -> None:
    heights = ground()
    heights[40:60, 30:55] = value
    terrain = opened(write(tmp_path / "t.tif", heights.astype(dtype)))
    read = terrain.elevation(GRID).values
    assert np.isnan(read[40:60, 30:55]).all()
    assert np.nanmin(read) > 200.0
    assert warnings_of(terrain) == [f"t.tif holds the value {value} without declaring it; it was read as “no height”."]


def test_heights_lower_than_any_land_are_told(tmp_path: Path) -> None:
    heights = ground()
    heights[40:60, 30:55] = -1234.0
    (said,) = warnings_of(opened(write(tmp_path / "t.tif", heights)))
    assert "t.tif holds heights down to -1234 m, lower than any land" in said
    assert warnings_of(opened(write(tmp_path / "s.tif", np.clip(heights, -430, None)))) == []


def test_coordinates_in_feet_warn_that_heights_may_be_too(tmp_path: Path) -> None:
    place = Affine(98.425, 0, 1_500_000, 0, -98.425, 600_000)
    path = write(tmp_path / "t.tif", ground(), "EPSG:2264", place)
    terrain = opened(path)
    assert terrain.cell_size_m == 30.0
    (said,) = warnings_of(terrain)
    assert said.startswith("t.tif says no unit for its heights, and its coordinates are in feet.")
    assert warnings_of(opened(path, vertical_unit="ft")) == []


def test_another_datum_is_moved_as_pyproj_moves_it_and_said(tmp_path: Path) -> None:
    """Arc 1960 lies some 300 m off WGS 84 in East Africa; unmoved, this ramp would be 20 m wrong or more."""
    col, row = np.meshgrid(np.arange(90.0), np.arange(100.0))
    place = Affine(30, 0, 500_010, 0, -30, 9_989_980)
    terrain = opened(write(tmp_path / "t.tif", (100 + 2 * col + 3 * row).astype("f4"), "EPSG:21037", place))
    (said,) = [note.text for note in terrain.notes if "was moved from" in note.text]
    assert "“Arc 1960 / UTM zone 37S” to WGS 84 by “Arc 1960 to WGS 84 (" in said
    grid = Grid("EPSG:32637", WEST + 900.0, NORTH - 1200.0, 30.0, 30, 30)
    to_lonlat = Transformer.from_crs(grid.crs, "EPSG:4326", always_xy=True)
    # the same published shift as the note names, by its code: EPSG 1284 is “Arc 1960 to WGS 84 (2)”
    back = Transformer.from_pipeline("EPSG:1284")
    lon, lat = to_lonlat.transform(*np.meshgrid(grid.x_centres_m(), grid.y_centres_m()))
    arc_lat, arc_lon = back.transform(lat, lon, direction="INVERSE")
    east, north = Transformer.from_crs("EPSG:4210", "EPSG:21037", always_xy=True).transform(arc_lon, arc_lat)
    wanted = 100 + 2 * ((east - 500_010) / 30 - 0.5) + 3 * ((9_989_980 - north) / 30 - 0.5)
    assert np.abs(terrain.elevation(grid).values - wanted).max() < 0.01


def test_an_hgt_file_says_all_it_needs(tmp_path: Path) -> None:
    """Its name is its place, its values lie on the lines of the degree net, and it holds metres."""
    values = np.full((1201, 1201), 300, dtype=">i2")
    values[:, 700:] = -32768
    path = tmp_path / "S02E039.hgt"
    path.write_bytes(values.tobytes())
    terrain = opened(path)
    half = 1.5 / 3600.0
    assert terrain.cell_size_m == 90.0
    assert terrain.data_outline().bounds == pytest.approx((39 - half, -2 - half, 40 + half, -1 + half), abs=1e-9)
    assert warnings_of(terrain) == []
    grid = Grid("EPSG:32637", 549_900.0, -165_600.0, 90.0, 60, 60)  # 39.45° to 39.5°
    assert (terrain.elevation(grid).values == 300.0).all()


def test_an_ascii_grid_without_a_system_is_refused_until_the_brief_names_the_right_one(tmp_path: Path) -> None:
    path = tmp_path / "t.asc"
    head = "ncols 4\nnrows 4\nxllcorner 39\nyllcorner -2\ncellsize 0.0002777778\nNODATA_value -9999\n"
    path.write_text(head + "10 10 10 10\n" * 4)
    with pytest.raises(InputError, match=r"t\.asc has no coordinate system.*\[terrain\] crs"):
        opened(path)
    with pytest.raises(InputError, match="these look like degrees"):
        opened(path, crs="EPSG:32637")
    assert opened(path, crs="EPSG:4326").cell_size_m == 30.0


def test_a_folder_or_an_empty_file_is_no_raster(tmp_path: Path) -> None:
    (tmp_path / "folder.tif").mkdir()
    (tmp_path / "empty.tif").touch()
    for name in ("folder.tif", "empty.tif"):
        with pytest.raises(InputError, match=rf"{name} cannot be opened as a raster"):
            opened(tmp_path / name)
