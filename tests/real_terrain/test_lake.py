"""The main job on the tropical 90 m tile with its lake, end to end.

The terrain holds the lake exactly flat at 185 m over 58,670 cells (some 499 km²); the global shoreline maps the same
lake some 4.5 times as large. Both are honest, and the program must live with that and say so.
"""

import re
import subprocess
import sys
from collections.abc import Callable
from pathlib import Path
from typing import Any

import geopandas as gpd
import numpy as np
import pandas as pd
import pytest
import rasterio
from affine import Affine
from numpy.typing import NDArray
from rasterio.warp import Resampling, reproject
from rasterio.windows import Window
from scipy import ndimage
from scipy.stats import spearmanr
from shapely.geometry import box

from sitescreen.brief import load_brief
from sitescreen.inputs.terrain import open_terrain
from sitescreen.lattice import Block
from sitescreen.screening import Screening, screen
from sitescreen.terrain.flat_water import FlatWater, flat_water

pytestmark = pytest.mark.real_terrain

# By the file's own cells, apart from the program:
IN_THE_LAKE = ["03"]  # all of the plot at 185 m, inside the mapped lake
DRY_BUT_MAPPED = ["04", "08"]  # all of the plot inside the mapped lake, none of it flat
PARTLY_MAPPED = ["21"]  # three tenths inside the mapped lake, none of it flat


def test_every_plot_has_an_outcome(lake_screening: Screening) -> None:
    """24 in, 24 out: a rank or a stated reason."""
    table = lake_screening.table.set_index("plot")
    assert sorted(table.index) == [f"{k:02d}" for k in range(1, 25)]
    ranked = table["rank"].notna()
    assert (table.loc[~ranked, "set_aside"].str.len() > 0).all()
    assert sorted(table.loc[ranked, "rank"]) == list(range(1, int(ranked.sum()) + 1))


@pytest.fixture(scope="module")
def found(lake_screening: Screening) -> FlatWater:
    """Level water on the program's own grid, from the heights as the file holds them."""
    terrain = open_terrain(lake_screening.brief.terrain)
    return flat_water(terrain.read(lake_screening.fields["elevation_m"].grid).stored)


@pytest.fixture(scope="module")
def own_lake(lake_screening: Screening, lake_place: Any) -> NDArray[np.bool_]:
    """The lake by the file's own cells, apart from the program: 58,670 cells at 185 m that touch, on the same grid."""
    with rasterio.open(lake_place.terrain) as source:
        touching, _ = ndimage.label(source.read(1) == 185)
        sizes = np.bincount(touching.ravel())
        largest = int(np.argmax(sizes[1:])) + 1
        assert sizes[largest] == 58_670
        grid = lake_screening.fields["elevation_m"].grid
        lake, _ = reproject(
            (touching == largest).astype(np.uint8),
            np.zeros(grid.shape, dtype=np.uint8),
            src_transform=source.transform,
            src_crs=source.crs,
            dst_transform=grid.transform,
            dst_crs=grid.crs,
            resampling=Resampling.nearest,
        )
    return np.asarray(lake > 0)


def test_the_lake_is_found_in_the_terrain(found: FlatWater, own_lake: NDArray[np.bool_]) -> None:
    """The largest level water lies at 185 m, inside the file's own lake and nowhere else."""
    largest = int(np.argmax(found.area_km2))
    assert found.level_m[largest] == pytest.approx(185.0, abs=0.01)
    inside = own_lake[found.label == largest + 1]
    assert inside.mean() > 0.99  # the rest: next to the shore, within 0.5 m of its level
    assert inside.sum() > 0.8 * own_lake.sum()


def test_the_lake_is_found_to_its_rim(found: FlatWater) -> None:
    """58,670 cells of 92.2 × 92.2 m are 499 km²; one twentieth is some half cell along its shore."""
    assert found.area_km2.max() == pytest.approx(499.0, rel=0.05)


def test_a_plot_in_the_lake_is_set_aside(lake_screening: Screening) -> None:
    table = lake_screening.table.set_index("plot")
    for plot in IN_THE_LAKE:
        assert "water" in table.loc[plot, "set_aside"]
        assert pd.isna(table.loc[plot, "rank"])


def test_dry_ground_under_a_mapped_lake_is_a_concern(lake_screening: Screening) -> None:
    """Shoreline and terrain disagree: the plot keeps its rank and carries the warning."""
    table = lake_screening.table.set_index("plot")
    for plot in DRY_BUT_MAPPED:
        assert table.loc[plot, "set_aside"] == ""
        assert pd.notna(table.loc[plot, "rank"])
        assert re.search("water|lake|shore", table.loc[plot, "cautions"])


def test_the_disagreement_is_reported_in_figures(lake_screening: Screening, lake_place: Any) -> None:
    """In the record and in sentences; the mapped area is held to the polygons'."""
    said = [note.text for note in lake_screening.notes if note.where == "shore" and note.level == "warning"]
    (lake,) = lake_place.shore.loc[lake_place.shore["kind"] == "lake", "geometry"]
    with rasterio.open(lake_place.terrain) as source:
        tile = box(*source.bounds)
    (sentence,) = said
    whole = lake_screening.record["water_disagreement"]
    for figure in (f"{whole['mapped_km2']:.1f}", f"{whole['flat_km2']:.1f}", f"{whole['overlap']:.2f}"):
        assert figure in sentence
    for block in lake_screening.record["blocks"]:
        figures = block["water_disagreement"]
        here = gpd.GeoSeries([lake.intersection(tile)], crs="EPSG:4326").to_crs(block["crs"]).iloc[0]
        core = Block(block["zone"], block["east"], block["north"], block["cell_size_m"]).core_bounds
        assert figures["mapped_km2"] == pytest.approx(here.intersection(box(*core)).area / 1e6, rel=0.005)


def test_the_two_waters_share_a_fifth_of_their_ground(lake_screening: Screening) -> None:
    """By the file's own cells: 58,670 level ones, 270,273 in the mapped lake, intersection over union 0.2157."""
    said = [note.text for note in lake_screening.notes if note.where == "shore" and note.level == "warning"]
    overlaps = [float(figure) for text in said for figure in re.findall(r"overlap (0\.\d+)", text)]
    assert overlaps == [pytest.approx(0.2157, abs=0.01)]


def test_distances_agree_with_geodesics(
    lake_screening: Screening,
    lake_place: Any,
    by_geodesics: Callable[..., pd.DataFrame],
    nearest_km: Callable[..., pd.Series],
) -> None:
    table = lake_screening.table.set_index("plot").drop(index=[*IN_THE_LAKE, *DRY_BUT_MAPPED, *PARTLY_MAPPED])
    walked = by_geodesics(lake_place.shore, "lake", table)
    assert len(table) == 20
    assert set(table["shore_kind"]) == {"lake"}
    assert walked["km"].max() > 20
    # half the spacing of the walked points, and a line that is straight in metres bends by metres in degrees
    assert np.abs(nearest_km(lake_place.brief, "lake", table) - walked["km"]).max() < 0.015
    # the reading asks for open water, so its shore may be a farther one; but a shore of this water it must be
    assert (table["shore_distance_km"] > walked["km"] - 0.015).all()
    assert walked["off_m"].max() < 20.0


def test_four_tiles_give_the_same_ranks_and_readings(
    lake_screening: Screening, lake_place: Any, tmp_path: Path
) -> None:
    """A second run, from the tile cut into four: nothing in the table moves, not by one bit."""
    with rasterio.open(lake_place.terrain) as source:
        parts = [Window(0, 0, 500, 700), Window(500, 0, 701, 700), Window(0, 700, 500, 501), Window(500, 700, 701, 501)]
        for k, part in enumerate(parts):
            profile = source.profile | {"width": part.width, "height": part.height}
            profile["transform"] = source.transform @ Affine.translation(part.col_off, part.row_off)
            with rasterio.open(tmp_path / f"{k}.tif", "w", **profile) as out:
                out.write(source.read(1, window=part), 1)
    tiles = ", ".join(f'"{tmp_path / f"{k}.tif"}"' for k in range(4))
    whole = lake_place.brief.read_text(encoding="utf-8")
    brief = lake_place.brief.with_name("four.toml")
    brief.write_text(whole.replace(f'"{lake_place.terrain}"', tiles), encoding="utf-8")
    again = screen(load_brief(brief)).table
    pd.testing.assert_frame_equal(
        pd.DataFrame(again.drop(columns="geometry")),
        pd.DataFrame(lake_screening.table.drop(columns="geometry")),
        check_exact=True,
    )


def test_ranks_stand_when_the_ground_trembles(lake_screening: Screening, lake_place: Any, tmp_path: Path) -> None:
    """Noise of 0.2 m on the land, a fiftieth of the terrain's own error: ranks hold but for near ties."""
    with rasterio.open(lake_place.terrain) as source:
        heights, profile = source.read(1), source.profile
    noise = np.random.default_rng(20).normal(0.0, 0.2, heights.shape).astype(np.float32)
    shaken = np.where(heights == 185, heights, heights + noise).astype(np.float32)
    terrain = tmp_path / "shaken.tif"
    with rasterio.open(terrain, "w", **(profile | {"dtype": "float32"})) as out:
        out.write(shaken, 1)
    brief = lake_place.brief.with_name("shaken.toml")
    text = lake_place.brief.read_text(encoding="utf-8").replace(str(lake_place.terrain), str(terrain))
    brief.write_text(text, encoding="utf-8")
    before = lake_screening.table.set_index("plot")
    after = screen(load_brief(brief)).table.set_index("plot").loc[before.index]
    assert (before["set_aside"] == after["set_aside"]).all()
    ranked = before["rank"].notna()
    assert (before["overall_mark"] - after["overall_mark"])[ranked].abs().max() < 1.0
    assert spearmanr(before.loc[ranked, "rank"], after.loc[ranked, "rank"]).statistic > 0.98


def test_the_command_writes_the_same_table_twice(lake_place: Any) -> None:
    """``sitescreen rank`` in processes of their own: whole results, and the same bytes of the table."""
    command = Path(sys.executable).with_name("sitescreen")
    tables = []
    for folder in ("first", "second"):
        out = lake_place.brief.parent / folder
        done = subprocess.run(
            [command, "rank", str(lake_place.brief), "--out", str(out)], capture_output=True, text=True, check=False
        )
        assert done.returncode == 0, done.stderr
        for result in ("map.html", "plots.gpkg", "record.json"):
            assert (out / result).stat().st_size > 1000
        tables.append((out / "ranking.csv").read_bytes())
    assert tables[0] == tables[1]
    assert len(tables[0].splitlines()) == 25
