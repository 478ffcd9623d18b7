"""Open water: creeks, channels and ponds are passed over, on shores whose answer can be seen."""

from typing import Any

import geopandas as gpd
import numpy as np
import pytest
import shapely
from pyproj import Transformer
from shapely.geometry import LineString, Point, box

from sitescreen.inputs.shore import Shore
from sitescreen.inputs.stamps import FileStamp
from sitescreen.terrain._shore_fetch_kernel import open_water
from sitescreen.terrain.shore_distance import onshore_bearing, shore_distance
from sitescreen.terrain.shore_fetch import OpenRule, open_segments, open_shores
from sitescreen.terrain.shore_segments import Segments

UTM = "EPSG:32637"
RULE = OpenRule(fetch_m=2000.0, sector_deg=90.0, share=0.8)
EAST, NORTH = 500_000.0, 9_000.0
CORE = (EAST - 20_000.0, NORTH - 20_000.0, EAST + 20_000.0, NORTH + 20_000.0)

# the sea east of a straight coast through EAST, and a creek 180 m wide and 5 km long that runs west from it
SEA = box(EAST, NORTH - 30_000, EAST + 40_000, NORTH + 30_000)
CREEK = box(EAST - 5_000, NORTH - 90, EAST + 1, NORTH + 90)


def lonlat(geometry: Any) -> Any:
    """A shape in metres of the map, placed on the ellipsoid; edges given corners so that they stay straight."""
    back = Transformer.from_crs(UTM, "EPSG:4326", always_xy=True)
    return shapely.transform(shapely.segmentize(geometry, 500.0), lambda xy: np.column_stack(back.transform(*xy.T)))


def shore_of(waters: dict[str, Any], lines: list[Any] | None = None, widths_km: list[float] | None = None) -> Shore:
    """A shore of waters in metres; names begin with their kind. Lines are the outlines unless given."""
    kinds = [name.split()[0] for name in waters]
    wide = widths_km or [np.inf if kind == "sea" else 20.0 for kind in kinds]
    areas = gpd.GeoDataFrame(
        {"water_id": range(len(waters)), "kind": kinds, "name": list(waters), "area_km2": 1.0, "width_km": wide},
        geometry=[lonlat(water) for water in waters.values()],
        crs="EPSG:4326",
    )
    outlines = lines or [water.boundary for water in waters.values()]
    table = gpd.GeoDataFrame(
        {"water_id": range(len(outlines)), "kind": kinds}, geometry=[lonlat(line) for line in outlines], crs="EPSG:4326"
    )
    return Shore(areas, table, FileStamp("drawn", 0, "", "EPSG:4326"), ())


def middles(segments: Segments) -> Any:
    return (segments.start + segments.end) / 2.0


def at(*places: tuple[float, float]) -> tuple[Any, Any]:
    """Longitudes and latitudes of places given in metres east and north of the corner of coast and creek."""
    x, y = np.array(places, dtype=float).T
    lon, lat = Transformer.from_crs(UTM, "EPSG:4326", always_xy=True).transform(EAST + x, NORTH + y)
    return lon, lat


def opens(water: Any, kind: str = "sea", where: Any = None) -> bool:
    """Whether all of a water's shore (or its part inside a shape) is open; it must not be partly so."""
    shore = shore_of({kind: water})
    whole = open_segments(shore, kind, UTM, CORE, OpenRule(1.0, 5.0, 0.1))
    kept = open_segments(shore, kind, UTM, CORE, RULE)
    if where is not None:
        whole, kept = (
            Segments(*(part[shapely.contains_xy(where, *middles(one).T)] for part in one)) for one in (whole, kept)
        )
    assert len(whole.water_id) > 0
    assert len(kept.water_id) in (0, len(whole.water_id))
    return len(kept.water_id) > 0


def test_a_creek_is_not_the_sea() -> None:
    shore = shore_of({"sea": SEA.union(CREEK)})
    kept = middles(open_segments(shore, "sea", UTM, CORE, RULE))
    # banks look along the creek and across it; only at the mouth itself is there more
    assert kept[:, 0].min() > EAST - 100.0
    coast = kept[np.abs(kept[:, 0] - EAST) < 5.0]
    along = np.sort(coast[np.abs(coast[:, 1] - NORTH) < 15_000.0, 1])
    # the coast beside the mouth stays, without a gap wider than the mouth
    assert np.diff(along).max() < 180.0 + 2.5 * 100.0


def test_beside_the_creek_the_open_sea_is_as_far_as_it_is() -> None:
    shore = shore_of({"sea": SEA.union(CREEK)})
    lon, lat = at((-3000.0, 300.0), (-3000.0, 8000.0), (-4000.0, 0.0))
    sea = open_shores(shore, open_segments(shore, "sea", UTM, CORE, RULE), "sea", lon, lat, UTM)
    # the map's scale on the middle meridian is 0.9996; the third place lies in the creek
    assert sea.distance_m == pytest.approx(np.array([3000.0, 3000.0, 4000.0]) / 0.9996, abs=10.0)
    assert sea.bearing_deg == pytest.approx([90.0, 90.0, 90.0], abs=6.0)
    assert np.isposinf(sea.width_km).all()


def test_out_on_the_open_water_the_distance_is_nought() -> None:
    shore = shore_of({"sea": SEA.union(CREEK)})
    sea = open_shores(shore, open_segments(shore, "sea", UTM, CORE, RULE), "sea", *at((3000.0, 4000.0)), UTM)
    assert sea.distance_m.tolist() == [0.0]
    assert np.isnan(sea.bearing_deg).all()


def test_the_creek_does_not_turn_the_breeze() -> None:
    """Beside the creek, 3 km inland, the breeze comes straight off the coast (from 90°), not off the creek."""
    shore = shore_of({"sea": SEA.union(CREEK)})
    lon, lat = at((-3000.0, 300.0))
    kept = open_segments(shore, "sea", UTM, CORE, RULE)
    assert onshore_bearing(shore, lon, lat, UTM, "sea", 0.0, kept).from_deg == pytest.approx([90.0], abs=6.0)
    assert onshore_bearing(shore, lon, lat, UTM, "sea").from_deg == pytest.approx([180.0], abs=6.0)
    # nor does a lagoon so wide that half of the plot's surroundings lie in it
    shore = shore_of({"sea": SEA.union(box(EAST - 5_000, NORTH - 500, EAST + 1, NORTH + 500))})
    kept = open_segments(shore, "sea", UTM, CORE, RULE)
    assert onshore_bearing(shore, *at((-3000.0, 600.0)), UTM, "sea", 0.0, kept).from_deg == pytest.approx([90], abs=6)


def test_a_channel_needs_to_be_as_wide_as_the_fetch() -> None:
    """Across a long channel w wide, directions within acos(w/2 km) of straight across are blocked on the far bank."""

    def channel(width_m: float) -> Any:
        return box(EAST, NORTH - 15_000, EAST + width_m, NORTH + 15_000)

    middle = box(EAST - 10, NORTH - 10_000, EAST + 5_000, NORTH + 10_000)
    assert not opens(channel(1500.0), where=middle)
    assert opens(channel(2100.0), where=middle)


def test_an_islet_does_not_close_the_sea_behind_it() -> None:
    islet = Point(EAST + 1000, NORTH).buffer(150)
    coast = box(EAST - 10, NORTH - 5_000, EAST + 10, NORTH + 5_000)
    assert opens(SEA.difference(islet), where=coast)
    # a bar along the whole coast does
    assert not opens(SEA.difference(box(EAST + 1000, NORTH - 20_000, EAST + 1200, NORTH + 20_000)), where=coast)


def test_ponds_are_closed_and_round_lakes_of_three_kilometres_open() -> None:
    """From the rim of a circle D across, the far rim lies D·cos θ away: over 2 km within 36° for D > 2.47 km."""
    assert not opens(Point(EAST, NORTH).buffer(1100, quad_segs=64), "lake")
    assert opens(Point(EAST, NORTH).buffer(1500, quad_segs=64), "lake")


def test_where_a_layer_was_cut_off_the_water_goes_on() -> None:
    strip = box(EAST, NORTH - 15_000, EAST + 800, NORTH + 15_000)
    coast = LineString([(EAST, NORTH - 15_000), (EAST, NORTH + 15_000)])

    def open_km(lines: list[Any]) -> float:
        kept = open_segments(shore_of({"sea": strip}, lines), "sea", UTM, CORE, RULE)
        return float(np.hypot(*(kept.end - kept.start).T).sum()) / 1000.0

    assert open_km([coast]) == pytest.approx(30.0, abs=0.01)
    # as a shore all round, the same strip is a channel
    assert open_km([strip.boundary]) == 0.0


def test_lines_without_areas_all_count() -> None:
    lines = [SEA.union(CREEK).boundary]
    shore = shore_of({"sea": SEA}, lines)
    bare = Shore(shore.waters.iloc[:0], shore.lines.assign(water_id=-1), shore.stamp, ())
    lon, lat = at((-3000.0, 300.0))
    sea = open_shores(bare, open_segments(bare, "sea", UTM, CORE, RULE), "sea", lon, lat, UTM)
    assert sea.distance_m == pytest.approx([210.0], abs=1.0)


def test_far_shores_count_without_a_look() -> None:
    shore = shore_of({"sea": SEA.union(CREEK)})
    away = tuple(value + 400_000.0 for value in CORE)
    kept = middles(open_segments(shore, "sea", UTM, away, RULE))  # type: ignore[arg-type]
    assert kept[:, 0].min() < EAST - 4000.0


def test_a_narrow_lake_does_not_hide_the_great_one_behind_it() -> None:
    narrow, great = (
        Point(EAST + 2500, NORTH).buffer(1300),
        Point(EAST - 18_000, NORTH).buffer(12_000),
    )
    shore = shore_of({"lake narrow": narrow, "lake great": great}, widths_km=[2.6, 24.0])
    segments = open_segments(shore, "lake", UTM, CORE, RULE)
    lon, lat = at((0.0, 0.0), (0.0, 15_000.0))

    def breeze(km: Any, width_km: Any) -> Any:
        return np.where(km < width_km, width_km / 50.0 - km / 1000.0, 0.0)

    nearest = open_shores(shore, segments, "lake", lon, lat, UTM)
    best = open_shores(shore, segments, "lake", lon, lat, UTM, breeze)
    assert nearest.width_km.tolist() == [2.6, 24.0]
    assert best.width_km.tolist() == [24.0, 24.0]
    assert best.distance_m[0] == pytest.approx(6000.0 / 0.9996, abs=10.0)
    assert best.bearing_deg[0] == pytest.approx(270.0, abs=0.5)
    # with no breeze from any of them the nearest stands
    none = open_shores(shore, segments, "lake", lon, lat, UTM, lambda km, _: np.zeros(len(km)))
    assert none.width_km.tolist() == [2.6, 24.0]


def test_a_plots_shore_does_not_depend_on_the_other_plots() -> None:
    rng = np.random.default_rng(3)
    shore = shore_of({"sea": SEA.union(CREEK)})
    segments = open_segments(shore, "sea", UTM, CORE, RULE)
    lon, lat = at(*rng.uniform(-9000.0, -50.0, (40, 2)))
    together = open_shores(shore, segments, "sea", lon, lat, UTM)
    alone = [open_shores(shore, segments, "sea", lon[k : k + 1], lat[k : k + 1], UTM) for k in range(40)]
    for column, values in enumerate(together):
        np.testing.assert_array_equal(values, np.concatenate([one[column] for one in alone]))


def test_no_shore_is_no_distance() -> None:
    shore = shore_of({"sea": SEA})
    segments = open_segments(shore, "lake", UTM, CORE, RULE)
    lake = open_shores(shore, segments, "lake", *at((0.0, 0.0)), UTM)
    assert np.isnan(lake.distance_m).all()
    assert np.isnan(lake.width_km).all()


def test_the_layer_passes_over_the_creek_but_not_over_its_water() -> None:
    from sitescreen.grid import Grid

    shore = shore_of({"sea": SEA.union(CREEK)})
    grid = Grid(UTM, EAST - 4000.0, NORTH + 600.0, 100.0, 12, 10)
    km = shore_distance(shore, grid, open_shores=open_segments(shore, "sea", UTM, CORE, RULE)).values
    assert km[2, 5] == pytest.approx(3.45, abs=0.06)
    assert km[5:7, 5].tolist() == [0.0, 0.0]


def test_compiled_and_plain_kernel_agree() -> None:
    """A wall 1 km ahead of an eye on the coast, in one bucket."""
    start = np.array([[0.0, 500.0], [1000.0, 800.0]])
    end = np.array([[0.0, -500.0], [1000.0, -800.0]])
    answers = []
    for kernel in (open_water, open_water.py_func):
        for reach in (900.0, 1500.0):
            is_open = np.zeros(1, dtype=bool)
            # the sea lies to the left of a shoreline that runs south
            kernel(
                np.array([[0.0, 0.0]]),
                np.array([0]),
                np.array([[0.0, -1000.0]]),
                np.array([True]),
                np.array([False]),
                start,
                end,
                np.array([0, 1]),
                np.array([[0, 2]]),
                3000.0,
                np.array([-1500.0, -1500.0]),
                reach,
                72,
                19,
                16,
                is_open,
                0,
                1,
            )
            answers.append(bool(is_open[0]))
    assert answers == [True, False, True, False]
