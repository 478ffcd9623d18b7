"""The ground of a plot, against pyproj's geodesics."""

import numpy as np
import pytest
import shapely
from pyproj import Geod
from shapely.geometry import GeometryCollection, LineString, MultiPoint, MultiPolygon, Point, Polygon, box

from sitescreen.inputs.plot_geometry import Ground, areas_m2, discs, earlier_twin, plot_ground, widths_km

WGS84 = Geod(ellps="WGS84")


def ground(*geometries: object, closed_lines: bool = False) -> Ground:
    array = np.empty(len(geometries), dtype=object)
    array[:] = geometries
    return plot_ground(array, 50.0, closed_lines)


@pytest.mark.parametrize("lat", [-37.0, -4.2, 0.0, 12.5])
@pytest.mark.parametrize("size_deg", [0.0005, 0.0088, 0.1])
def test_area_agrees_with_the_geodesic_polygon(lat: float, size_deg: float) -> None:
    """Karney's polygon area as pyproj has it. 5e-5 is the bound that areas_m2 states."""
    triangle = Polygon([(39.0, lat), (39.0 + size_deg, lat + 0.3 * size_deg), (39.0 + 0.2 * size_deg, lat + size_deg)])
    expected = abs(WGS84.geometry_area_perimeter(triangle)[0])
    assert areas_m2(np.array([triangle], dtype=object))[0] == pytest.approx(expected, rel=5e-5)


def test_area_leaves_out_holes_and_adds_parts() -> None:
    whole, hole, apart = box(39, -4, 39.01, -3.99), box(39.004, -3.996, 39.006, -3.994), box(39.02, -4, 39.03, -3.99)
    ringed = MultiPolygon([shapely.difference(whole, hole), apart])
    a, b, c, d = areas_m2(np.array([ringed, whole, hole, apart], dtype=object))
    assert a == pytest.approx(b - c + d, rel=1e-6)


def test_no_geometry_has_no_area() -> None:
    assert np.isnan(areas_m2(np.array([None], dtype=object))[0])


@pytest.mark.parametrize("lat", [-60.0, 0.0, 30.0])
def test_corners_of_a_disc_lie_at_its_radius(lat: float) -> None:
    disc = discs(np.array([36.0]), np.array([lat]), 50.0)[0]
    corners = shapely.get_coordinates(disc)
    assert len(corners) == 65
    _, _, away = WGS84.inv(np.full(65, 36.0), np.full(65, lat), corners[:, 0], corners[:, 1])
    np.testing.assert_allclose(away, 50.0, atol=1e-4)
    # area of the regular polygon of 64 corners
    assert areas_m2(np.array([disc]))[0] == pytest.approx(32 * 50.0**2 * np.sin(2 * np.pi / 64), rel=1e-5)


def test_width_is_the_longer_side() -> None:
    wide = box(39.0, -4.0, 39.05, -3.99)
    _, _, metres = WGS84.inv(39.0, -3.995, 39.05, -3.995)
    assert widths_km(np.array([wide], dtype=object))[0] == pytest.approx(metres / 1000.0, rel=1e-6)
    tall = box(39.0, -4.0, 39.01, -3.95)
    _, _, metres = WGS84.inv(39.0, -4.0, 39.0, -3.95)
    assert widths_km(np.array([tall], dtype=object))[0] == pytest.approx(metres / 1000.0, rel=1e-6)


def test_a_crossing_outline_is_mended_and_keeps_both_lobes() -> None:
    bow = Polygon([(39, -4), (39.01, -3.99), (39.01, -4), (39, -3.99)])
    found = ground(bow)
    assert found.geometry[0].is_valid
    half = areas_m2(np.array([Polygon([(39, -4), (39.005, -3.995), (39, -3.99)])], dtype=object))[0]
    assert areas_m2(found.geometry)[0] == pytest.approx(2 * half, rel=1e-3)
    assert found.outcome[0] == ""
    assert any("mended" in said for said in found.remarks[0])
    assert any("2 parts" in said for said in found.remarks[0])


def test_parts_far_apart_are_said_with_their_distance() -> None:
    """A gap of 0.02° along the parallel of 4° south is 2.22 km; one of 0.002° is not worth a word."""
    first, near, far = box(39, -4, 39.01, -3.99), box(39.012, -4, 39.02, -3.99), box(39.04, -4, 39.05, -3.99)
    assert ground(MultiPolygon([first, near])).remarks[0] == ["it is in 2 parts, read together"]
    (said,) = ground(MultiPolygon([first, near, far])).remarks[0]
    assert said == "it is in 3 parts, read together, 2.2 km apart: the shore is measured from one of them"


def test_nested_collections_give_their_polygons() -> None:
    square = box(39, -4, 39.01, -3.99)
    found = ground(GeometryCollection([GeometryCollection([square, Point(39, -4)]), LineString([(1, 1), (2, 2)])]))
    assert found.geometry[0].equals(square)
    assert "left out" in found.remarks[0][0]


@pytest.mark.parametrize(
    ("shape", "why"),
    [
        (None, "no geometry"),
        (Polygon(), "no geometry"),
        (GeometryCollection(), "no geometry"),
        (LineString([(39, -4), (39.01, -4)]), "a line is not a plot"),
        (Polygon([(39, -4), (39.01, -4), (39.005, -4)]), "no ground"),
        (box(39, -4, 39.000001, -3.999999), "under 1 m²"),
        (box(179.9, -4, -179.9, -3.9), "180° meridian"),
        (MultiPolygon([box(179.9, -4, 180, -3.99), box(-180, -4, -179.9, -3.99)]), "180° meridian"),
        (box(39, -4, 39.2, -3.99), "22.2 km wide"),
        (Point(39, 91), "±90°"),
        (box(400, 4, 400.001, 4.001), "±180°"),
        (Polygon([(39, -4), (np.inf, -4), (39, -3)]), "not all numbers"),
    ],
)
def test_what_is_no_plot_says_why(shape: object, why: str) -> None:
    found = ground(shape, box(39, -4, 39.01, -3.99))
    assert why in found.outcome[0]
    assert found.outcome[1] == ""


def test_third_coordinate_free_points_and_multipoints_become_discs() -> None:
    found = ground(Point(39, -4), MultiPoint([(39, -4), (39.01, -4)]), MultiPoint([(39.5, -4)]))
    assert found.was_point.tolist() == [True, True, True]
    one, two, single = areas_m2(found.geometry)
    assert two == pytest.approx(2 * one, rel=1e-6)
    assert single == pytest.approx(one, rel=1e-6)
    np.testing.assert_array_equal(found.centre, [[39, -4], [np.nan, np.nan], [39.5, -4]])


def test_closed_tracks_are_outlines_only_where_asked() -> None:
    track = LineString([(39, -4), (39.01, -4), (39.01, -3.99), (39, -3.99), (39.00001, -3.99999)])
    assert "line" in ground(track).outcome[0]
    found = ground(track, closed_lines=True)
    assert found.outcome[0] == ""
    assert found.geometry[0].geom_type == "Polygon"
    open_track = LineString([(39, -4), (39.01, -4), (39.01, -3.99)])
    assert "line" in ground(open_track, closed_lines=True).outcome[0]


def test_twins_are_found_however_their_outline_is_written() -> None:
    corners = np.array([(39.0, -4.0), (39.01, -4.0), (39.01, -3.99), (39.0, -3.99)])
    first = Polygon(corners)
    turned = Polygon(np.roll(corners[::-1], 2, axis=0))
    # 4.9e-8° and 5.1e-8° round to different multiples of 1e-7°
    shifted = Polygon(corners + 2e-9 + np.array([4.9e-8, 0.0]))
    other = Polygon(corners + 1e-6)
    shapes = np.array([first, None, turned, shifted, other, turned], dtype=object)
    assert earlier_twin(shapes).tolist() == [-1, -1, 0, 0, -1, 0]


def test_many_copies_of_one_plot_are_no_burden() -> None:
    shapes = np.array([box(39, -4, 39.01, -3.99)] * 20_000, dtype=object)
    assert (earlier_twin(shapes)[1:] == 0).all()
