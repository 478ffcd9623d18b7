"""The plots with their shapes."""

from pathlib import Path
from typing import Any

import geopandas as gpd
import numpy as np
import pytest
from shapely.geometry import GeometryCollection, LineString, Point

from sitescreen.deliverables.columns import columns_of
from sitescreen.deliverables.plots_layer import write_plots


def written(screening: Any, path: Path) -> gpd.GeoDataFrame:
    write_plots(screening.table, columns_of(screening.table, screening.profiles), path)
    return gpd.read_file(path, layer="plots")


def test_same_columns_as_the_table_and_the_same_shapes(screening: Any, tmp_path: Path) -> None:
    back = written(screening, tmp_path / "plots.gpkg")
    columns = columns_of(screening.table, screening.profiles)
    assert [c for c in back.columns if c != "geometry"] == [c.name for c in columns]
    assert back.crs.to_epsg() == 4326
    assert back["plot"].tolist() == screening.table["plot"].tolist()
    assert all(a.equals(b) for a, b in zip(back.geometry, screening.table.geometry, strict=True))
    assert back["elevation_m"].to_numpy() == pytest.approx(np.round(screening.table["elevation_m"], 1))
    assert back["ventilation"].isna().sum() == 1


def test_plots_without_a_shape_keep_their_row(screening: Any, tmp_path: Path) -> None:
    table = screening.table.copy()
    table.loc[0, "geometry"] = None
    back = written(screening.with_(table=table), tmp_path / "plots.gpkg")
    assert len(back) == len(table)
    assert back.geometry[0] is None


def test_odd_shapes_are_written_too(screening: Any, tmp_path: Path) -> None:
    table = screening.table.copy()
    point = Point(38, -1.6)
    table.loc[0, "geometry"] = GeometryCollection([point.buffer(0.01), LineString([(38, -1), (39, -1)])])
    assert len(written(screening.with_(table=table), tmp_path / "plots.gpkg")) == len(table)


def test_same_bytes_for_the_same_plots(screening: Any, tmp_path: Path) -> None:
    columns = columns_of(screening.table, screening.profiles)
    for name in ("a.gpkg", "b.gpkg"):
        write_plots(screening.table, columns, tmp_path / name)
    assert (tmp_path / "a.gpkg").read_bytes() == (tmp_path / "b.gpkg").read_bytes()


def test_best_squares_are_a_layer_of_their_own(screening: Any, tmp_path: Path) -> None:
    columns = columns_of(screening.table, screening.profiles)
    patches = screening.table[["plot", "geometry"]].head(2).assign(best_patch_mark=[80.0, 70.5])
    for name in ("one.gpkg", "two.gpkg"):
        write_plots(screening.table, columns, tmp_path / name, patches)
    assert (tmp_path / "one.gpkg").read_bytes() == (tmp_path / "two.gpkg").read_bytes()
    back = gpd.read_file(tmp_path / "one.gpkg", layer="best_patches")
    assert back["best_patch_mark"].tolist() == [80.0, 70.5]
    assert len(gpd.read_file(tmp_path / "one.gpkg", layer="plots")) == len(screening.table)
