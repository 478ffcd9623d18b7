"""The shortlist for the phone, read back by GDAL."""

import xml.etree.ElementTree as ET
from pathlib import Path
from typing import Any

import geopandas as gpd
import numpy as np
import pytest

from sitescreen.deliverables.phone_files import GPX, KML, write_phone_files


@pytest.fixture
def written(screening: Any, tmp_path: Path) -> Path:
    """A folder with both files."""
    write_phone_files(screening, tmp_path)
    return tmp_path


def test_the_shortlist_is_there_with_rank_name_place_and_reasons(screening: Any, written: Path) -> None:
    """Where the plots are and what is said of them, as GDAL reads both files."""
    first = screening.table.iloc[:3]
    points = gpd.read_file(written / GPX, layer="waypoints")
    called = [
        f"{n} {row['name']} (plot {row['plot']})"
        for n, (_, row) in zip(("1st", "2nd", "3rd"), first.iterrows(), strict=True)
    ]
    assert points["name"].tolist() == called
    np.testing.assert_allclose(points.geometry.x, first["lon"], atol=1e-6)
    np.testing.assert_allclose(points.geometry.y, first["lat"], atol=1e-6)
    assert "+ Sea breeze: 0.82 of it gets here." in points["desc"][0]
    assert "− Little air moves: 0.71 times open ground." in points["desc"][0]
    assert "local codes and licensed practice decide" in points["desc"][0]
    shapes = gpd.read_file(written / KML)
    assert shapes["Name"].tolist() == called
    for shape, expected in zip(shapes.geometry, first.geometry, strict=True):
        outline = next(part for part in shape.geoms if part.geom_type == "LineString")
        np.testing.assert_allclose(np.asarray(outline.coords)[:, :2], np.asarray(expected.exterior.coords), atol=1e-6)


def test_hostile_text_stays_text(invent: Any, tmp_path: Path) -> None:
    """Control signs that XML cannot hold are replaced; a KML viewer gets no tag and no slot to fill."""
    made = invent(names=("<b>&\x00$[x]\u202e", "]]><script>", "c"))
    names = made.table["name"].tolist()
    for why in made.reasons.values():
        why.for_[:] = names
    write_phone_files(made, tmp_path)
    names_read = [one.text for one in ET.parse(tmp_path / GPX).iter("{http://www.topografix.com/GPX/1/1}name")][1:]
    assert {name.split(" ", 1)[1].rsplit(" (", 1)[0] for name in names_read} == {
        "<b>&\ufffd$[x]\ufffd",
        "]]><script>",
        "c",
    }
    for one in ET.parse(tmp_path / KML).iter("{http://www.opengis.net/kml/2.2}description"):
        said = one.text.replace("<br>", "")
        assert "<" not in said
        assert "$[" not in said
        assert "&lt;script&gt;" in said


def test_same_screening_gives_the_same_bytes(screening: Any, written: Path, tmp_path: Path) -> None:
    before = [(written / name).read_bytes() for name in (GPX, KML)]
    write_phone_files(screening, tmp_path)
    assert [(tmp_path / name).read_bytes() for name in (GPX, KML)] == before


def test_no_ranked_plot_gives_files_without_one(screening: Any, tmp_path: Path) -> None:
    table = screening.table.copy()
    table["rank"] = table["rank"].mask(table["rank"].notna())
    write_phone_files(screening.with_(table=table), tmp_path)
    assert "<wpt" not in (tmp_path / GPX).read_text(encoding="utf-8")
    assert "<Placemark" not in (tmp_path / KML).read_text(encoding="utf-8")
