"""Candidate plots from all kinds of files: every row comes out, and what cannot be read is refused in words."""

import json
import zipfile
from pathlib import Path
from typing import Any

import geopandas as gpd
import numpy as np
import openpyxl
import pytest
from pyproj import Geod
from shapely.geometry import LineString, Point, Polygon, box, mapping

from sitescreen.errors import InputError
from sitescreen.inputs.plots import read_plots

TERRAIN = box(39.0, -5.0, 40.0, -4.0)
A, B = box(39.1, -4.2, 39.102, -4.198), box(39.5, -4.5, 39.503, -4.498)


def frame(geometries: list[Any], crs: Any = "EPSG:4326", **columns: Any) -> gpd.GeoDataFrame:
    return gpd.GeoDataFrame(columns, geometry=geometries, crs=crs)


def geojson(path: Path, *rows: tuple[Any, dict[str, Any]]) -> Path:
    features = [{"type": "Feature", "properties": own, "geometry": shape} for shape, own in rows]
    path.write_text(json.dumps({"type": "FeatureCollection", "features": features}), encoding="utf-8")
    return path


def text(path: Path, content: str, encoding: str = "utf-8") -> Path:
    path.write_bytes(content.encode(encoding))
    return path


@pytest.mark.parametrize("ending", ["gpkg", "geojson", "shp", "fgb", "kml"])
def test_formats_give_the_same_plots(tmp_path: Path, ending: str) -> None:
    file = tmp_path / f"plots.{ending}"
    frame([A, B], Name=["north", "south"]).to_file(file, driver="KML" if ending == "kml" else None)
    table = read_plots(file, outline=TERRAIN, id_column="Name").table.sort_values("plot")
    assert table["plot"].tolist() == ["north", "south"]
    assert table["name"].tolist() == ["north", "south"]
    assert table.crs.to_epsg() == 4326
    assert table["outcome"].tolist() == ["", ""]
    expected = [abs(Geod(ellps="WGS84").geometry_area_perimeter(shape)[0]) / 1e4 for shape in (A, B)]
    np.testing.assert_allclose(table["area_ha"], expected, rtol=1e-5)
    assert all(a.contains(Point(x, y)) for a, x, y in zip((A, B), table["lon"], table["lat"], strict=True))


def test_a_zipped_kml_is_read(tmp_path: Path) -> None:
    frame([A], Name=["north"]).to_file(tmp_path / "doc.kml", driver="KML")
    with zipfile.ZipFile(tmp_path / "plots.kmz", "w") as archive:
        archive.write(tmp_path / "doc.kml", "doc.kml")
    assert read_plots(tmp_path / "plots.kmz", outline=TERRAIN).table["name"].tolist() == ["north"]


def test_waypoints_and_closed_tracks_of_a_gps_receiver_are_plots(tmp_path: Path) -> None:
    file = text(
        tmp_path / "walk.gpx",
        '<gpx version="1.1" creator="t" xmlns="http://www.topografix.com/GPX/1/1">'
        '<wpt lat="-4.5" lon="39.5"><name>well</name></wpt>'
        '<trk><name>field</name><trkseg><trkpt lat="-4.2" lon="39.1"/><trkpt lat="-4.2" lon="39.102"/>'
        '<trkpt lat="-4.198" lon="39.102"/><trkpt lat="-4.2" lon="39.1"/></trkseg></trk>'
        '<trk><name>road</name><trkseg><trkpt lat="-4.2" lon="39.1"/><trkpt lat="-4.3" lon="39.102"/></trkseg></trk>'
        "</gpx>",
    )
    table = read_plots(file, outline=TERRAIN).table.set_index("name")
    assert table.loc["well", "outcome"] == ""
    assert table.loc["field", "outcome"] == ""
    assert table.loc["road", "outcome"] == "it is a line, and a line is not a plot"


def test_every_row_comes_out_in_its_order(tmp_path: Path) -> None:
    line = LineString([(39.1, -4.2), (39.2, -4.2)])
    high = [[[39.3, -4.3, 7], [39.31, -4.3, 7], [39.31, -4.29, 7], [39.3, -4.3, 7]]]
    bow = [[[39.2, -4.2], [39.202, -4.198], [39.202, -4.2], [39.2, -4.198], [39.2, -4.2]]]
    file = geojson(
        tmp_path / "p.geojson",
        (mapping(A), {"plot": "a"}),
        (None, {"plot": "none"}),
        (mapping(line), {"plot": "line"}),
        ({"type": "Polygon", "coordinates": bow}, {"plot": "bow"}),
        (mapping(A), {"plot": "twin"}),
        (mapping(box(45, 5, 45.001, 5.001)), {"plot": "far"}),
        (mapping(box(39.9995, -4.6, 40.0005, -4.599)), {"plot": "edge"}),
        (mapping(box(39.99, -4.7, 40.0005, -4.699)), {"plot": "rim"}),
        ({"type": "Polygon", "coordinates": [[[39.3, -4.2], [39.31, -4.2]]]}, {"plot": "broken"}),
        ({"type": "Polygon", "coordinates": high}, {"plot": "3d"}),
    )
    table = read_plots(file, outline=TERRAIN).table.set_index("plot")
    assert table.index.tolist() == ["a", "none", "line", "bow", "twin", "far", "edge", "rim", "broken", "3d"]
    outcome = table["outcome"]
    assert outcome[["a", "bow", "rim", "3d"]].tolist() == [""] * 4
    assert outcome["none"] == outcome["broken"] == "it has no geometry"
    assert "line" in outcome["line"]
    assert outcome["twin"] == "it covers the same ground as plot “a”, which stands earlier in the file"
    assert outcome["far"] == "it lies outside the terrain"
    assert outcome["edge"] == "50 % of it lies outside the terrain, so it could be judged only partly"
    assert table.loc["rim", "remarks"] == "5 % of it lies outside the terrain"
    assert "mended" in table.loc["bow", "remarks"]
    assert not table.loc["3d", "geometry"].has_z
    assert np.isnan(table.loc["none", "lon"])
    assert table.loc["none", "geometry"] is None


def test_hostile_words_stay_as_they_are(tmp_path: Path) -> None:
    words = ['=HYPERLINK("http://x")', "<script>alert(1)</script>", "Ünï – 村", "'; DROP TABLE plots; --", "a\nb"]
    shapes = [box(39.1 + k / 100, -4.2, 39.102 + k / 100, -4.198) for k in range(5)]
    file = tmp_path / "p.gpkg"
    frame(shapes, plot=words, name=words).to_file(file)
    table = read_plots(file, outline=TERRAIN).table
    assert table["plot"].tolist() == words
    assert table["name"].tolist() == words
    assert table["own:plot"].tolist() == words


# identifiers


def test_numbers_as_identifiers_lose_their_point_and_blanks(tmp_path: Path) -> None:
    file = tmp_path / "p.gpkg"
    frame([A, B], number=[7.0, 8.0], other=["  x ", "007"]).to_file(file)
    assert read_plots(file, id_column="number").table["plot"].tolist() == ["7", "8"]
    assert read_plots(file, id_column="other").table["plot"].tolist() == ["x", "007"]


def test_without_identifiers_rows_are_numbered(tmp_path: Path) -> None:
    file = tmp_path / "p.gpkg"
    frame([A, B], id=["same", "same"]).to_file(file)
    plots = read_plots(file)
    assert plots.table["plot"].tolist() == ["1", "2"]
    assert any(note.level == "assumed" and "numbered" in note.text for note in plots.notes)


def test_a_missing_identifier_is_named_by_its_row(tmp_path: Path) -> None:
    file = text(tmp_path / "p.csv", "id,lon,lat\nrow 2,39.5,-4.5\n,39.6,-4.5\n")
    plots = read_plots(file, id_column="id")
    assert plots.table["plot"].tolist() == ["row 2", "row 2*"]
    assert any("no identifier" in note.text for note in plots.notes)


def test_repeated_identifiers_are_refused_by_name(tmp_path: Path) -> None:
    file = text(tmp_path / "p.csv", "id,lon,lat\nK1,39.5,-4.5\nK1 ,39.6,-4.5\nK2,39.7,-4.5\n")
    with pytest.raises(InputError, match="“K1”"):
        read_plots(file, id_column="id")


def test_a_mistyped_column_names_the_nearest(tmp_path: Path) -> None:
    file = text(tmp_path / "p.csv", "parcel_no,lon,lat\nK1,39.5,-4.5\n")
    with pytest.raises(InputError, match=r"“parcel_nr”.*Did you mean “parcel_no”"):
        read_plots(file, id_column="parcel_nr")
    with pytest.raises(InputError, match=r"\[plots\] zone is “zon”"):
        read_plots(file, zone_column="zon")


def test_zones_that_nobody_asked_to_use_are_remarked_on(tmp_path: Path) -> None:
    file = text(tmp_path / "p.csv", "id,Zone,lon,lat\nK1,Hot humid coast,39.5,-4.5\nK2,,39.6,-4.5\n")
    said = [note for note in read_plots(file).notes if "climate zones" in note.text]
    assert [note.level for note in said] == ["warning"]
    assert '[plots] zone = "Zone"' in said[0].text
    asked = read_plots(file, zone_column="Zone")
    assert asked.table["zone_given"].tolist() == ["Hot humid coast", ""]
    assert not any("climate zones" in note.text for note in asked.notes)
    other = text(tmp_path / "q.csv", "id,zone,lon,lat\nK1,residential,39.5,-4.5\n")
    assert not any("climate zones" in note.text for note in read_plots(other).notes)


# where in the world


def test_a_projected_file_is_moved(tmp_path: Path) -> None:
    file = tmp_path / "p.gpkg"
    frame([A], plot=["a"]).to_crs("EPSG:32737").to_file(file)
    table = read_plots(file, outline=TERRAIN).table
    assert table.geometry[0].equals_exact(A, 1e-9)


def test_an_older_datum_is_shifted_as_published(tmp_path: Path) -> None:
    """Arc 1960 to WGS 84 by −160, −6, −302 m: mean solution, NIMA TR8350.2 (2000) appendix B (EPSG:1122), from memory.

    The expected place comes from the textbook steps: geodetic to geocentric on Clarke 1880 (RGS), three shifts,
    Bowring's iteration back on WGS 84. Other published shifts for the region differ by less than 15 m.
    """
    lon, lat, shift = 39.5, -4.5, (-160.0, -6.0, -302.0)
    a, f = 6378249.145, 1 / 293.465
    e2, phi, lam = f * (2 - f), np.radians(lat), np.radians(lon)
    n = a / np.sqrt(1 - e2 * np.sin(phi) ** 2)
    x, y, z = n * np.cos(phi) * np.cos(lam), n * np.cos(phi) * np.sin(lam), n * (1 - e2) * np.sin(phi)
    x, y, z = x + shift[0], y + shift[1], z + shift[2]
    a, f = 6378137.0, 1 / 298.257223563
    e2, p = f * (2 - f), np.hypot(x, y)
    phi = np.arctan2(z, p * (1 - e2))
    for _ in range(5):
        n = a / np.sqrt(1 - e2 * np.sin(phi) ** 2)
        phi = np.arctan2(z + e2 * n * np.sin(phi), p)
    expected = np.degrees(np.arctan2(y, x)), np.degrees(phi)

    plots = read_plots(text(tmp_path / "p.csv", f"id,lon,lat\n1,{lon},{lat}\n"), crs="EPSG:4210", outline=TERRAIN)
    there = plots.table["lon"][0], plots.table["lat"][0]
    _, _, apart = Geod(ellps="WGS84").inv(*expected, *there)
    _, _, moved = Geod(ellps="WGS84").inv(lon, lat, *there)
    assert apart < 15.0
    assert 250.0 < moved < 350.0
    assert any("Arc 1960" in note.text and "m." in note.text for note in plots.notes)


def test_no_coordinate_system_is_asked_for(tmp_path: Path) -> None:
    file = tmp_path / "p.shp"
    frame([A], plot=["a"]).to_file(file)
    file.with_suffix(".prj").unlink()
    with pytest.raises(InputError, match=r'does not say its coordinate system.*crs = "EPSG:'):
        read_plots(file)
    assert read_plots(file, crs="EPSG:4326").table["outcome"].tolist() == [""]


def test_metres_that_claim_to_be_degrees_are_refused(tmp_path: Path) -> None:
    file = geojson(tmp_path / "p.geojson", (mapping(box(500000, 9500000, 500100, 9500100)), {"plot": "a"}))
    with pytest.raises(InputError, match="look like metres"):
        read_plots(file)


def test_degrees_that_claim_to_be_metres_are_refused(tmp_path: Path) -> None:
    file = tmp_path / "p.gpkg"
    frame([A], crs="EPSG:32737", plot=["a"]).to_file(file)
    with pytest.raises(InputError, match="look like degrees"):
        read_plots(file)


@pytest.mark.parametrize("made", ["csv", "gpkg", "utm"])
def test_swapped_coordinates_are_noticed(tmp_path: Path, made: str) -> None:
    if made == "csv":
        file, crs = text(tmp_path / "p.csv", "id,lon,lat\n1,-4.5,39.5\n2,-4.6,39.6\n"), None
    elif made == "gpkg":
        file, crs = tmp_path / "p.gpkg", None
        frame([box(-4.2, 39.1, -4.198, 39.102)], plot=["a"]).to_file(file)
    else:
        file, crs = text(tmp_path / "p.csv", "id,x,y\n1,9502000,555000\n"), "EPSG:32737"
    with pytest.raises(InputError, match="swapped"):
        read_plots(file, crs=crs, outline=TERRAIN)


def test_the_file_is_believed_over_the_brief(tmp_path: Path) -> None:
    file = tmp_path / "p.gpkg"
    frame([A], plot=["a"]).to_file(file)
    plots = read_plots(file, crs="EPSG:21037")
    assert plots.table.geometry[0].equals(A)
    assert any(note.level == "warning" and "believed" in note.text for note in plots.notes)


def test_a_name_that_is_no_system_is_refused(tmp_path: Path) -> None:
    with pytest.raises(InputError, match="“EPSG:nonsense”"):
        read_plots(text(tmp_path / "p.csv", "id,x,y\n1,2,3\n"), crs="EPSG:nonsense")


# sheets


def test_a_sheet_with_semicolons_decimal_commas_and_minutes(tmp_path: Path) -> None:
    content = "Nr;Ort;Longitude;Latitude\n7;Höhe;39,5;-4,5\n8;b;39°30'00\"E;4°30'30\"S\n\n9;c;weit;4\n"
    table = read_plots(text(tmp_path / "p.csv", "\ufeff" + content), id_column="nr", outline=TERRAIN).table
    assert table["plot"].tolist() == ["7", "8", "9"]
    np.testing.assert_allclose(table["lon"], [39.5, 39.5, np.nan])
    np.testing.assert_allclose(table["lat"], [-4.5, -(4 + 30.5 / 60), np.nan])
    assert table["outcome"].tolist() == ["", "", "its longitude “weit” cannot be read"]
    assert table["own:Ort"].tolist() == ["Höhe", "b", "c"]


@pytest.mark.parametrize(("separator", "encoding"), [("\t", "utf-16"), ("|", "utf-8"), (",", "cp1252"), (";", "utf-8")])
def test_separators_and_encodings(tmp_path: Path, separator: str, encoding: str) -> None:
    content = "id,name,lon,lat\n1,Höhe,39.5,-4.5\n".replace(",", separator)
    table = read_plots(text(tmp_path / "p.csv", content, encoding), outline=TERRAIN).table
    assert (table["name"][0], table["lon"][0], table["outcome"][0]) == ("Höhe", 39.5, "")


def test_a_sheet_says_that_its_datum_is_assumed(tmp_path: Path) -> None:
    plots = read_plots(text(tmp_path / "p.csv", "id,lon,lat\n1,39.5,-4.5\n"))
    assert [note.level for note in plots.notes if "WGS 84 is assumed" in note.text] == ["assumed"]


def test_outlines_as_text(tmp_path: Path) -> None:
    content = f'id,wkt\n1,"{A.wkt}"\n2,"SRID=4326;{B.wkt}"\n3,POLYGON((x\n4,\n'
    table = read_plots(text(tmp_path / "p.csv", content), outline=TERRAIN).table
    assert table.geometry[0].equals(A)
    assert table.geometry[1].equals(B)
    assert "“POLYGON((x” cannot be read" in table["outcome"][2]
    assert table["outcome"][3] == "its geometry is empty"


def test_a_workbook_is_read_like_a_sheet(tmp_path: Path) -> None:
    book = openpyxl.Workbook()
    for row in (["plot", "lon", "lat"], [7.0, 39.5, -4.5], ["B 2", "39,6", "4°30' S"], [None, None, None]):
        book.active.append(row)
    book.save(tmp_path / "p.xlsx")
    table = read_plots(tmp_path / "p.xlsx", outline=TERRAIN).table
    assert table["plot"].tolist() == ["7", "B 2"]
    np.testing.assert_allclose(table["lon"], [39.5, 39.6])


def test_a_row_with_too_many_values_says_so(tmp_path: Path) -> None:
    file = text(tmp_path / "p.csv", "id,lon,lat\n1,39.5,-4.5\n2,39,5,-4,5\n")
    assert "5 values under 3 headings" in read_plots(file, outline=TERRAIN).table["outcome"][1]
    with pytest.raises(InputError, match="decimal comma"):
        read_plots(text(tmp_path / "q.csv", "id,lon,lat\n2,39,5,-4,5\n"))


@pytest.mark.parametrize(
    ("name", "content", "why"),
    [
        ("p.csv", "", "nothing in it"),
        ("p.csv", "id,lon,lat\n", "no rows"),
        ("p.csv", "id,a\n1,2\n", "“id”, “a”"),
        ("p.csv", "id,x,y\n1,500000,9500000\n", "“x” and “y”"),
        ("p.csv", "id,lon,longitude,lat\n1,2,3,4\n", "several columns"),
        ("p.csv", "id,wkt\n1,POINT(500000 9500000)\n", "beyond ±180"),
        ("p.gpkg", "abc", "cannot be read"),
        ("p.xlsx", "abc", "cannot be opened"),
        ("p.geojson", '{"type":"FeatureCollection","features":[]}', "no rows|no layer"),
        ("p.geojson", "{", "cannot be read"),
        ("p.kml", "<kml/>", "cannot be read"),
        ("p.gpx", "<gpx/>", "no rows"),
        ("p.shp", "", "cannot be read"),
    ],
)
def test_unusable_files_are_refused_in_words(tmp_path: Path, name: str, content: str, why: str) -> None:
    with pytest.raises(InputError, match=why):
        read_plots(text(tmp_path / name, content))


def test_odd_rows_come_out_with_their_reason(tmp_path: Path) -> None:
    content = "plot,LONGITUDE (deg),Latitude [deg]\n1,1e999,-4.5\n2,39.5,-4.5\n3,139.5,-94.5\n4,,\n5,39.5\n"
    table = read_plots(text(tmp_path / "p.csv", content), outline=TERRAIN).table
    assert table["outcome"].tolist() == [
        "its longitude “1e999” is not a number",
        "",
        "its coordinates lie outside ±180° of longitude or ±90° of latitude",
        "its longitude is empty",
        "its latitude is empty",
    ]


def test_a_missing_file_and_a_cut_one_are_refused(tmp_path: Path) -> None:
    for name in ("gone.gpkg", "gone.csv"):
        with pytest.raises(InputError, match="does not exist"):
            read_plots(tmp_path / name)
    file = tmp_path / "p.gpkg"
    frame([A] * 2000, plot=range(2000)).to_file(file)
    file.write_bytes(file.read_bytes()[: file.stat().st_size // 2])
    with pytest.raises(InputError, match=r"damaged|cannot be read"):
        read_plots(file)


def test_a_file_of_several_layers_is_asked_about(tmp_path: Path) -> None:
    file = tmp_path / "p.gpkg"
    frame([A], plot=["a"]).to_file(file, layer="fields")
    frame([B], plot=["b"]).to_file(file, layer="roads")
    with pytest.raises(InputError, match="“fields”, “roads”"):
        read_plots(file)


# what a plot's numbers may depend on


def test_a_plot_does_not_depend_on_the_others(tmp_path: Path) -> None:
    shapes = [box(39.1 + k / 50, -4.2, 39.1021 + k / 50, -4.198) for k in range(10)]
    frame(shapes, plot=list("abcdefghij")).to_file(tmp_path / "all.gpkg")
    frame(shapes[7:8], plot=["h"]).to_file(tmp_path / "one.gpkg")
    everything = read_plots(tmp_path / "all.gpkg", outline=TERRAIN).table.set_index("plot")
    alone = read_plots(tmp_path / "one.gpkg", outline=TERRAIN).table.set_index("plot")
    columns = ["lon", "lat", "area_ha", "outcome", "remarks"]
    assert everything.loc["h", columns].tolist() == alone.loc["h", columns].tolist()


def test_the_stated_point_of_a_bent_plot_lies_on_it(tmp_path: Path) -> None:
    bent = Polygon([(39.1, -4.2), (39.11, -4.2), (39.11, -4.19), (39.109, -4.19), (39.109, -4.199), (39.1, -4.199)])
    file = tmp_path / "p.gpkg"
    frame([bent, Point(39.5, -4.5)], plot=["bent", "point"]).to_file(file)
    table = read_plots(file).table
    assert bent.contains(Point(table["lon"][0], table["lat"][0]))
    assert (table["lon"][1], table["lat"][1]) == (39.5, -4.5)
    assert table["was_point"].tolist() == [False, True]


@pytest.mark.parametrize("radius", [0.0, -1.0, float("nan"), 1e6])
def test_a_radius_that_is_none_is_refused(tmp_path: Path, radius: float) -> None:
    with pytest.raises(InputError, match="point_radius_m"):
        read_plots(text(tmp_path / "p.csv", "id,lon,lat\n1,39.5,-4.5\n"), point_radius_m=radius)


@pytest.mark.parametrize(("place", "shift"), [((36.0, -2.0), "(2)"), ((35.0, -9.0), "(3)")])
def test_of_several_published_shifts_the_one_for_the_terrain_is_taken(
    tmp_path: Path, place: tuple[float, float], shift: str
) -> None:
    """Arc 1960 to WGS 84 (2) is for the country north of about 4.7° south, (3) for its southern neighbour (EPSG)."""
    file = text(tmp_path / "p.csv", f"id,lon,lat\n1,{place[0]},{place[1]}\n")
    plots = read_plots(file, crs="EPSG:4210", outline=Point(place).buffer(0.2))
    assert any(f"“Arc 1960 to WGS 84 {shift}”" in note.text for note in plots.notes)
