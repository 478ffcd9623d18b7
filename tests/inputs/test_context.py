"""Landmarks are read, named and placed; they change no reading."""

from pathlib import Path
from typing import Any

import geopandas as gpd
import numpy as np
import pytest
from shapely.geometry import LineString, Point, box

from sitescreen.brief import ContextLayer
from sitescreen.errors import InputError
from sitescreen.inputs.context import read_context

OUTLINE = box(38.0, -2.0, 40.0, 0.0)


def layer(folder: Path, shapes: list[Any], crs: str = "EPSG:4326", **columns: Any) -> Path:
    path = folder / "roads.gpkg"
    gpd.GeoDataFrame(columns, geometry=shapes, crs=crs).to_file(path, driver="GPKG", engine="pyogrio")
    return path


def test_names_come_from_the_column_that_holds_them(tmp_path: Path) -> None:
    shapes = [LineString([(39, -1), (39.1, -1)]), Point(39, -1.2), None]
    file = layer(tmp_path, shapes, Name=["Old road", None, "nowhere"], ref=["A", "B", "C"])
    (found,) = read_context([ContextLayer(file=file)], OUTLINE)
    assert (found.name, found.labels) == ("roads", ("Old road", ""))
    (found,) = read_context([ContextLayer(file=file, name="ways", label="ref")], OUTLINE)
    assert (found.name, found.labels) == ("ways", ("A", "B"))
    assert found.notes == ()


def test_it_lies_where_its_coordinate_system_puts_it(tmp_path: Path) -> None:
    """500 km east and 9,889 km north in zone 37 south is 39° E and 1.0041° S, by PROJ's own transformation."""
    file = layer(tmp_path, [Point(500_000, 9_889_009)], crs="EPSG:32737")
    (found,) = read_context([ContextLayer(file=file)], OUTLINE)
    np.testing.assert_allclose([found.shapes[0].x, found.shapes[0].y], [39.0, -1.00417], atol=2e-5)


def test_a_layer_beside_the_terrain_is_said(tmp_path: Path) -> None:
    file = layer(tmp_path, [Point(10, 50)])
    (found,) = read_context([ContextLayer(file=file)], OUTLINE)
    assert [note.text for note in found.notes] == [
        "The layer of landmarks roads.gpkg lies beside the terrain: nothing of it is drawn."
    ]


def test_a_column_that_is_not_there_and_a_missing_file_are_refused(tmp_path: Path) -> None:
    file = layer(tmp_path, [Point(39, -1)], name=["a"])
    with pytest.raises(InputError, match=r"\[\[context\]\] label is “nam”.*“name”"):
        read_context([ContextLayer(file=file, label="nam")], OUTLINE)
    with pytest.raises(InputError, match="does not exist"):
        read_context([ContextLayer(file=tmp_path / "gone.gpkg")], OUTLINE)
