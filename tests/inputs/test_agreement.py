"""Inputs that are each in order and do not fit one another."""

from pathlib import Path
from typing import Any

import geopandas as gpd
import numpy as np
import pytest
import rasterio
from affine import Affine
from shapely import union_all
from shapely.geometry import Point, box

from sitescreen.brief import Brief, checked_brief
from sitescreen.errors import InputError
from sitescreen.inputs import Inputs, read_inputs
from sitescreen.inputs.agreement import refuse_both_sides_of_180

WEST, NORTH, STEP, N = 39.0, -4.0, 3.0 / 3600.0, 240
EAST, SOUTH = WEST + N * STEP, NORTH - N * STEP  # 39.0–39.2° E, 4.2–4.0° S
EAST_HALF = box(39.1, SOUTH, EAST, NORTH)


def heights() -> np.ndarray:
    """Hills of 60 to 373 m in the west, sea at 0 m in the east."""
    ground = np.linspace(373.0, 60.0, N // 2)
    return np.tile(np.concatenate([ground, np.zeros(N // 2)]), (N, 1)).astype(np.float32)


def brief(folder: Path, plots: list[Any], values: np.ndarray | None = None, **sections: Any) -> Brief:
    with rasterio.open(
        folder / "t.tif", "w", "GTiff", N, N, 1, "EPSG:4326", Affine(STEP, 0, WEST, 0, -STEP, NORTH), "float32", -9999.0
    ) as out:
        out.write(heights() if values is None else values, 1)
    gpd.GeoDataFrame({"plot": [f"P{k + 1}" for k in range(len(plots))]}, geometry=plots, crs="EPSG:4326").to_file(
        folder / "p.gpkg"
    )
    return checked_brief({"terrain": {"files": ["t.tif"]}, "plots": {"file": "p.gpkg"}, **sections}, folder, "the call")


def with_shore(folder: Path, shape: Any, kind: str, values: np.ndarray | None = None) -> Inputs:
    gpd.GeoDataFrame(geometry=[shape], crs="EPSG:4326").to_file(folder / "s.gpkg")
    return read_inputs(brief(folder, [Point(39.05, -4.1)], values, shore={"file": "s.gpkg", "kind": kind}))


# plots and terrain


@pytest.mark.parametrize(
    ("at", "said"),
    [
        ((39.1, 4.1), r"4\.20° S to 4\.00° S, the plots lie at .*4\.10° N.*latitude's sign changed 2 of 2"),
        ((-39.1, -4.1), r"39\.00° E to 39\.20° E.*39\.1\d?° W.*longitude's sign changed 2 of 2"),
        ((-39.1, 4.1), "signs of both changed 2 of 2"),
        ((12.0, 4.1), "Check the coordinates of the plots"),
    ],
)
def test_plots_beside_the_terrain_are_refused(tmp_path: Path, at: tuple[float, float], said: str) -> None:
    with pytest.raises(InputError, match=rf"no plot of p\.gpkg lies on the terrain.*{said}"):
        read_inputs(brief(tmp_path, [Point(*at), Point(at[0], at[1] + 0.01)]))


def test_plots_without_ground_are_refused_for_what_they_lack(tmp_path: Path) -> None:
    with pytest.raises(InputError, match=r"for 2 of 2 that is because it has no geometry"):
        read_inputs(brief(tmp_path, [None, Point()]))


def test_one_plot_on_the_terrain_is_enough(tmp_path: Path) -> None:
    table = read_inputs(brief(tmp_path, [Point(39.1, 4.1), Point(39.1, -4.1)])).plots.table
    assert table["outcome"].tolist() == ["it lies outside the terrain", ""]


def test_plots_near_the_edge_are_named(tmp_path: Path) -> None:
    """2.8 km and 3.2 km from the western edge (a degree here is 110.7 km), and the middle, 11 km from all edges."""
    at = [Point(WEST + km / 111.04, -4.1) for km in (2.8, 3.2, 11.0)]
    notes = read_inputs(brief(tmp_path, at)).notes
    (note,) = [note for note in notes if "terrain's edge" in note.text]
    assert note.level == "warning"
    assert note.text.startswith("1 plot lies within 3 km of the terrain's edge (P1)")
    far = read_inputs(brief(tmp_path, at[1:])).notes
    assert not any("terrain's edge" in note.text for note in far)


# sea and land


def test_land_called_sea_is_refused(tmp_path: Path) -> None:
    land = box(WEST, SOUTH, 39.1, NORTH)
    with pytest.raises(InputError, match=r's\.gpkg looks like land, not sea: .* 3[67]\d m .*kind = "land"'):
        with_shore(tmp_path, land, "sea")
    assert with_shore(tmp_path, land, "land").shore is not None


def test_sea_called_land_is_refused(tmp_path: Path) -> None:
    with pytest.raises(InputError, match=r's\.gpkg looks like water, not land: .*kind = "sea" or "lake"'):
        with_shore(tmp_path, EAST_HALF, "land")
    assert with_shore(tmp_path, EAST_HALF, "sea").shore is not None


@pytest.mark.parametrize(
    ("sea_m", "said"),
    [(0.0, ""), (-9999.0, ""), (64.0, "stands at 64 m"), (-28.0, "stands at -28 m")],
    ids=["level", "no data", "ellipsoid below", "ellipsoid above"],
)
def test_a_sea_passes_and_its_height_is_said_where_it_is_not_0(tmp_path: Path, sea_m: float, said: str) -> None:
    """A crude map whose sea takes in 10 % of high coast passes too; no data says nothing of the sea."""
    values = heights()
    values[:, N // 2 :] = sea_m
    notes = with_shore(tmp_path, box(39.09, SOUTH, EAST, NORTH), "sea", values).notes
    found = [note.text for note in notes if "The mapped sea stands at" in note.text]
    assert len(found) == bool(said)
    assert all(said in text for text in found)


def test_a_lake_may_lie_high(tmp_path: Path) -> None:
    assert with_shore(tmp_path, Point(39.05, -4.1).buffer(0.02), "lake").shore is not None


# terrain and the 180° meridian


def test_terrain_across_180_is_refused_and_on_one_side_of_it_is_not() -> None:
    east_of_it = box(-180.0, -17.0, -179.8, -16.8)
    with pytest.raises(InputError, match=r"both sides of the 180° meridian.*screen each side by itself"):
        refuse_both_sides_of_180(union_all([box(179.8, -17.0, 180.0, -16.8), east_of_it]))
    refuse_both_sides_of_180(east_of_it)
    refuse_both_sides_of_180(union_all([box(120.0, -9.0, 121.0, -8.0), box(-78.0, -1.0, -77.0, 0.0)]))
