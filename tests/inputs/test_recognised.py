"""What files seem to be, and the brief that follows."""

import tomllib
from pathlib import Path
from typing import Any

import geopandas as gpd
import numpy as np
import pytest
import rasterio
from affine import Affine
from click.testing import CliRunner
from shapely.geometry import LineString, Point, box

from sitescreen.brief import load_brief
from sitescreen.cli.main import run
from sitescreen.deliverables.drafted import draft_text
from sitescreen.errors import InputError
from sitescreen.inputs.recognised import Found, recognise

ZONES = ("upland", "hot_arid")
PLOT = box(39.0, -4.1, 39.01, -4.09)


def raster(path: Path, values: np.ndarray, step_deg: float = 0.01) -> None:
    bands = values if values.ndim == 3 else values[None]
    count, rows, cols = bands.shape
    place = Affine(step_deg, 0, 39.0, 0, -step_deg, -4.0)
    with rasterio.open(path, "w", "GTiff", cols, rows, count, "EPSG:4326", place, bands.dtype) as out:
        out.write(bands)


def layer(path: Path, shapes: list[Any], **columns: Any) -> None:
    gpd.GeoDataFrame(columns, geometry=shapes, crs="EPSG:4326").to_file(path)


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    """One file of each sort; the coarse terrain comes first by name."""
    ground = np.arange(400.0, dtype=np.float32).reshape(20, 20)
    raster(tmp_path / "a_coarse.tif", ground, 0.03)
    raster(tmp_path / "b_fine.tif", ground)
    raster(tmp_path / "chm_2020.tif", ground)
    raster(tmp_path / "green.tif", (ground % 3).astype(np.uint8))
    raster(tmp_path / "photo.tif", np.zeros((3, 20, 20), np.uint8))
    layer(tmp_path / "water.gpkg", [PLOT, PLOT], kind=["sea", "Lake"])
    layer(tmp_path / "candidates.geojson", [PLOT], name=["Hill"], zone=["Upland"])
    layer(tmp_path / "belt.gpkg", [PLOT], belt=["hot_arid"])
    layer(tmp_path / "flood_2011.gpkg", [PLOT])
    layer(tmp_path / "lines.gpkg", [LineString([(39, -4), (39.1, -4)])], label=["A 1"])
    (tmp_path / "w.csv").write_text("season;part;direction_deg;share;speed_m_s\nyear;all;0;1;3\n")
    (tmp_path / "n.csv").write_text("station,lon,lat,elevation_m,month,T_max_c,t_min_c,rh_mean,rain_mm\n")
    (tmp_path / "s.csv").write_text("month,part,clear_share\n")
    (tmp_path / "prices.csv").write_text("plot,price\n1,2\n")
    (tmp_path / "broken.tif").write_bytes(b"II*\0 no more")
    (tmp_path / "letter.txt").write_text("Dear all")
    return tmp_path


def test_each_file_is_taken_for_what_it_is(folder: Path) -> None:
    roles = {one.file.name: one.role for one in recognise(folder, ZONES)}
    assert roles == {
        "a_coarse.tif": "terrain",
        "b_fine.tif": "terrain",
        "belt.gpkg": "zones",
        "broken.tif": "",
        "candidates.geojson": "plots",
        "chm_2020.tif": "canopy",
        "flood_2011.gpkg": "hazard",
        "green.tif": "cover",
        "lines.gpkg": "context",
        "n.csv": "normals",
        "photo.tif": "",
        "prices.csv": "",
        "s.csv": "sky",
        "w.csv": "wind",
        "water.gpkg": "shore",
    }


def test_the_draft_is_a_brief_that_can_be_read(folder: Path) -> None:
    done = CliRunner().invoke(run, ["draft", str(folder)])
    assert done.exit_code == 0, done.output
    brief = load_brief(folder / "brief.toml")
    assert [path.name for path in brief.terrain.files] == ["b_fine.tif", "a_coarse.tif"]  # the finest first
    assert brief.terrain.canopy_height == folder / "chm_2020.tif"
    assert brief.shore is not None
    assert (brief.shore.file.name, brief.shore.kind) == ("water.gpkg", "kind")
    assert (brief.plots.file.name, brief.plots.name, brief.plots.zone) == ("candidates.geojson", "name", "zone")
    assert brief.zones.polygons == folder / "belt.gpkg"
    assert [one.level for one in brief.constraint] == ["concern"]
    assert brief.context[0].name == "label"
    assert brief.cover is None  # only the planner knows what its numbers mean
    text = (folder / "brief.toml").read_text()
    assert "# 2 = { roughness_m" in text
    assert "not used: photo.tif: it has 3 bands" in text
    again = CliRunner().invoke(run, ["draft", str(folder)])
    assert again.exit_code == 2
    assert "is there already" in again.output
    assert (folder / "brief.toml").read_text() == text


def test_a_cover_map_becomes_valid_once_its_comment_signs_go(folder: Path) -> None:
    text = draft_text(recognise(folder, ZONES), "t")
    start = text.index("# [cover]")
    end = text.index("\n\n", start)
    opened = text[:start] + text[start:end].replace("# ", "") + text[end:]
    assert set(tomllib.loads(opened)["cover"]["classes"]) == {"0", "1", "2"}


def test_a_folder_without_plots_is_refused_and_says_what_it_saw(tmp_path: Path) -> None:
    raster(tmp_path / "dem.tif", np.ones((9, 9), np.float32) * np.arange(9))
    done = CliRunner().invoke(run, ["draft", str(tmp_path)])
    assert done.exit_code == 2
    assert "holds no plots that can be told from its files (dem.tif: terrain)" in done.output
    assert not (tmp_path / "brief.toml").exists()


def test_names_cannot_break_out_of_the_brief() -> None:
    nasty = Path('a"\n[output]\nfolder = "x\\\x7f.tif')
    text = draft_text([Found(nasty, "terrain", "w"), Found(Path("p.gpkg"), "plots", "w")], 'T"\n')
    assert tomllib.loads(text)["terrain"]["files"] == [str(nasty)]


def test_layers_in_one_file_and_other_folders(tmp_path: Path) -> None:
    layer(tmp_path / "all.gpkg", [Point(39, -4)])
    gpd.GeoDataFrame(geometry=[PLOT], crs="EPSG:4326").to_file(tmp_path / "all.gpkg", layer="second")
    (found,) = recognise(tmp_path, ZONES)
    assert found.role == ""
    assert "2 layers" in found.why
    with pytest.raises(InputError, match="no folder"):
        recognise(tmp_path / "gone", ZONES)
