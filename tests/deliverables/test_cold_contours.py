"""Contours of cold air: a known pool gives rings at their places, whose ticks point to the deep side."""

import json
from typing import Any

import numpy as np
import pytest
import shapely
from pyproj import Transformer

from sitescreen.climate.cold_kinds import KINDS
from sitescreen.deliverables.budget import fit_contours
from sitescreen.deliverables.cold_contours import cold_contours
from sitescreen.deliverables.sheet import WEB_MERCATOR, Sheet
from sitescreen.grid import Field, Grid

CELL, SIZE, DEEPEST_M, REACH_M = 30.0, 301, 80.0, 3000.0
CRS = "EPSG:32637"


def pool(kind: str, latitude: float = 10.0) -> tuple[Field, Field, Sheet]:
    """A cone of cold air, 80 m deep in its middle and gone 3 km from it."""
    x, y = Transformer.from_crs("EPSG:4326", CRS, always_xy=True).transform(39.7, latitude)
    grid = Grid(CRS, x - CELL * SIZE / 2, y + CELL * SIZE / 2, CELL, SIZE, SIZE)
    away = np.hypot(*np.meshgrid(np.arange(SIZE) - SIZE // 2, np.arange(SIZE) - SIZE // 2)) * CELL
    depth = np.maximum(0.0, DEEPEST_M * (1 - away / REACH_M)).astype(np.float32)
    code = np.where(depth > 0, KINDS.index(kind), 0).astype(np.float32)
    to_page = Transformer.from_crs(CRS, WEB_MERCATOR, always_xy=True)
    px, py = to_page.transform(x, y)
    half, pixel = 4000.0, 20.0
    side = round(2 * half / pixel)
    sheet = Sheet((px - half, py - half, px + half, py + half), side, side)
    return Field(depth, grid, "m", "depth"), Field(code, grid, "code", "kind"), sheet


def rings(contour: dict[str, Any]) -> list[Any]:
    """The lines of a contour, in metres of its UTM zone."""
    to_ground = Transformer.from_crs("EPSG:4326", CRS, always_xy=True)
    out = []
    for line in contour["lines"]:
        lon, lat = np.cumsum(np.reshape(line, (-1, 2)), axis=0).T / 100_000
        out.append(shapely.linestrings(np.column_stack(to_ground.transform(lon, lat))))
    return out


@pytest.mark.parametrize("latitude", [0.0, 10.0, 20.0])
@pytest.mark.parametrize("kind", ["closed", "leaky", "moving"])
def test_a_known_pool_gives_rings_at_their_places(kind: str, latitude: float) -> None:
    """80 m × (1 − r / 3 km) is 5, 15, 30 and 60 m at r = 2812, 2437, 1875 and 750 m; the deep side lies to the left."""
    depth, code, sheet = pool(kind, latitude)
    finest = cold_contours([depth], [code], sheet)[0]
    assert [(one["kind"], one["depth_m"], len(one["lines"])) for one in finest] == [
        (kind, level, 1) for level in (5.0, 15.0, 30.0, 60.0)
    ]
    middle = depth.grid.west_m + CELL * SIZE / 2, depth.grid.north_m - CELL * SIZE / 2
    for one in finest:
        (ring,) = rings(one)
        assert ring.is_closed
        assert shapely.is_ccw(ring)  # anticlockwise: its left is its inside, where the pool is deeper
        away = np.hypot(*(shapely.get_coordinates(ring) - middle).T)
        assert away == pytest.approx(REACH_M * (1 - one["depth_m"] / DEEPEST_M), abs=2 * CELL)


def test_ground_that_rises_out_of_the_cold_lies_to_the_right() -> None:
    depth, code, sheet = pool("leaky")
    lowest = np.minimum(depth.values, 100.0 - depth.values).astype(np.float32)  # 20 m in the middle, 50 m around it
    inner = [
        ring
        for one in cold_contours([Field(lowest, depth.grid, "m", "depth")], [code], sheet)[0]
        for ring in rings(one)
        if one["depth_m"] == 30.0
    ]
    assert [bool(shapely.is_ccw(ring)) for ring in sorted(inner, key=shapely.length)] == [False, True]


def test_no_line_runs_along_unknown_ground() -> None:
    depth, code, sheet = pool("closed")
    is_known = np.arange(SIZE) >= SIZE // 2
    code = Field(np.where(is_known, code.values, np.float32(KINDS.index("unknown"))), code.grid, "code", "kind")
    depth = Field(np.where(is_known, depth.values, np.float32(np.nan)), depth.grid, "m", "depth")
    edge = depth.grid.west_m + CELL * (SIZE // 2)
    for one in cold_contours([depth], [code], sheet)[0]:
        (line,) = rings(one)
        assert not line.is_closed
        assert np.ptp(shapely.get_coordinates(line)[[0, -1], 0]) < 3 * CELL  # both ends at the edge of the known
        assert line.bounds[0] > edge - 2 * CELL


def test_a_wall_of_cold_air_is_one_line() -> None:
    """Where the depth falls from 50 m to nothing, 5, 15 and 30 m lie on one another: only the lowest is drawn."""
    depth, code, sheet = pool("leaky")
    wall = np.where(depth.values > 40, 50.0, 0.0).astype(np.float32)
    drawn = cold_contours([Field(wall, depth.grid, "m", "depth")], [code], sheet)[-1]
    assert {one["depth_m"] for one in drawn} <= {5.0, 15.0, 30.0}
    assert sum(shapely.length(rings(one)).sum() for one in drawn) == pytest.approx(2 * np.pi * 1500, rel=0.1)


def test_contours_are_coarsened_and_then_go() -> None:
    depth, code, sheet = pool("closed")
    made = cold_contours([depth], [code], sheet)
    heavy = [len(json.dumps(one, separators=(",", ":"))) for one in made]
    assert heavy[0] > heavy[1] > heavy[2]
    assert fit_contours(made, heavy[0]) == (made[0], [])
    assert fit_contours(made, heavy[0] - 1) == (made[1], [])
    kept, said = fit_contours(made, 10)
    assert kept == []
    assert said == ["The lines of cold-air depth are left out, to keep this page light enough to mail."]
    assert fit_contours([], -5) == ([], [])


@pytest.mark.browser
@pytest.mark.filterwarnings("ignore::DeprecationWarning")
def test_ticks_point_to_the_deep_side_and_the_legend_says_so(read: Any, screening: Any) -> None:
    """On the screen, with y downward: a ring drawn anticlockwise as seen has its tips inside."""
    page = read(screening)
    ring = [{"x": 100 + 50 * np.cos(a), "y": 100 - 50 * np.sin(a)} for a in np.linspace(0, 2 * np.pi, 41)]
    for kind, tip in (("closed", 1), ("leaky", 1), ("moving", 1)):
        marks = page.run("return coldAir.marksOf(arguments[0], arguments[1])", kind, ring)
        assert len(marks) > 15
        away = np.hypot(*(np.array([mark[tip] for mark in marks]) - 100).T)
        assert away == pytest.approx(46.0, abs=0.5)
    page.run("page.data.cold.push({ kind: 'leaky', depth_m: 5, lines: [] })")
    page.press("[data-question=cold]")
    assert "cold air held back behind an outlet" in page.text("#legend")
    assert "toward the deeper side" in page.text("#legend")
    page.press("[data-question=wind]")
    assert "held back behind an outlet" not in page.text("#legend")
    assert page.problems() == []
