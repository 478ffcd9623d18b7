"""The demo region's files are what its README and truth.toml say, seen without the program's own methods."""

import csv
import itertools
import tomllib
import warnings
from pathlib import Path

import geopandas as gpd
import numpy as np
import pytest
import rasterio
from rasterio.features import geometry_mask
from shapely.validation import make_valid
from skimage.morphology import reconstruction

from sitescreen.deliverables.columns import BY_NAME, MORE
from sitescreen.lattice import block_of

REGION = Path(__file__).parents[1] / "demo_region"
TRUTH = tomllib.loads((REGION / "truth.toml").read_text(encoding="utf-8"))

# The columns of the ranking table that a truth may speak of: all that there are.
READINGS = {*BY_NAME, *MORE}


@pytest.fixture(scope="module")
def terrain():
    with rasterio.open(REGION / "terrain.tif") as tile:
        return tile.read(1), tile.transform


@pytest.fixture(scope="module")
def shore():
    return gpd.read_file(REGION / "shore.gpkg").set_index("name")


@pytest.fixture(scope="module")
def plots():
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")  # one outline crosses itself on purpose
        return gpd.read_file(REGION / "plots.gpkg").set_index("plot")


def inside(geometry, terrain):
    """Heights of the cells whose centre lies in a geometry."""
    height, transform = terrain
    return height[geometry_mask([make_valid(geometry)], height.shape, transform, invert=True)]


def depth_below_sill(geometry, terrain, round_about_cells=120):
    """Depth of flooding in a plot, by scikit-image's reconstruction on the ground round about."""
    height, transform = terrain
    centre = geometry.centroid
    col, row = (round(v) for v in ~transform @ (centre.x, centre.y))
    part = height[
        max(row - round_about_cells, 0) : row + round_about_cells,
        max(col - round_about_cells, 0) : col + round_about_cells,
    ].astype(np.float64)
    seed = np.full_like(part, part.max())
    seed[[0, -1], :], seed[:, [0, -1]] = part[[0, -1], :], part[:, [0, -1]]
    depth = reconstruction(seed, part, method="erosion") - part
    here = depth.shape[0] // 2, depth.shape[1] // 2
    return float(np.mean(depth[here[0] - 2 : here[0] + 3, here[1] - 2 : here[1] + 3]))


def test_all_data_files_together_stay_under_6_mb():
    files = [path for path in REGION.iterdir() if path.suffix in {".tif", ".gpkg", ".csv", ".toml"}]
    assert len(files) >= 9
    assert sum(path.stat().st_size for path in files) < 6_000_000


def test_region_and_collar_lie_in_one_block_27_km_from_its_border():
    with rasterio.open(REGION / "collar.tif") as collar, rasterio.open(REGION / "terrain.tif") as tile:
        wide, fine = collar.bounds, tile.bounds
    assert wide.left < fine.left
    assert wide.bottom < fine.bottom
    assert wide.top > fine.top
    km = 27 / 110.5
    corners = itertools.product(
        (wide.left - km, wide.left, wide.right + km), (wide.bottom - km, wide.bottom, wide.top, wide.top + km)
    )
    assert {block_of(lon, lat, 30.0) for lon, lat in corners} == {block_of(62.75, -6.72, 30.0)}


def test_tile_is_one_arc_second_and_about_60_by_40_km(terrain):
    height, transform = terrain
    assert transform.a == pytest.approx(1 / 3600, rel=1e-9)
    assert height.shape[1] * transform.a * 110.56 == pytest.approx(60, abs=0.1)
    assert height.shape[0] * transform.a * 110.59 == pytest.approx(40, abs=0.1)
    assert np.isfinite(height).all()
    assert height.min() == 0.0
    assert 2600 < height.max() < 3000


def test_tile_runs_into_the_collar_without_a_step(terrain):
    """Along the outermost cells both files differ by their own errors only (σ 1.5 m each, so 2.1 m together)."""
    height, _ = terrain
    with rasterio.open(REGION / "collar.tif") as collar:
        wide = collar.read(1)
    ring = 87  # collar cells beyond the tile to the west, north and south
    under = wide[ring:-ring, ring:]
    means = height.reshape(under.shape[0], 3, under.shape[1], 3).mean(axis=(1, 3))
    for step in (means[0] - under[0], means[-1] - under[-1], means[:, 0] - under[:, 0]):
        assert abs(step.mean()) < 0.7
        assert step.std() < 3.0


def test_sea_is_0_and_the_lake_flat_at_1130_m(terrain, shore):
    sea, lake = (inside(shore.geometry[name], terrain) for name in ("Amberlith Sea", "Lake Ondurwen"))
    assert sea.size > 100_000
    # the drawn line may cut off a cell or two along the shore
    assert np.mean(sea == 0.0) > 0.999
    assert np.mean(lake == 1130.0) > 0.999


def test_lake_is_over_12_km_across_and_the_pond_under_1_km2(shore):
    metric = shore.to_crs(32641)
    assert not metric.geometry["Lake Ondurwen"].buffer(-6000).is_empty
    assert 0.05e6 < metric.geometry["Pemmarick Pond"].area < 1e6


def test_sea_and_lake_each_have_an_island_and_the_creek_is_narrow(shore):
    metric = shore.to_crs(32641)
    for name in ("Amberlith Sea", "Lake Ondurwen"):
        assert len(metric.geometry[name].interiors) == 1
    sea = metric.geometry["Amberlith Sea"]
    creek = sea.difference(sea.buffer(-120).buffer(140))  # what is narrower than 240 m
    longest = max(creek.geoms, key=lambda part: part.length)
    assert longest.length / 2 > 3000
    assert longest.area / (longest.length / 2) < 240


def test_there_are_forty_plots_with_their_own_numbers_and_names(plots):
    assert list(plots.index) == [str(number) for number in range(1, 41)]
    assert plots["name"].is_unique
    assert "zone" not in plots


def test_planted_outlines_are_as_stated(plots, terrain):
    assert plots.geometry["1"].equals(plots.geometry["10"])
    assert list(plots.index[~plots.geometry.is_valid]) == ["15"]
    assert inside(plots.geometry["11"], terrain).size < 9
    with rasterio.open(REGION / "collar.tif") as collar:
        bounds = collar.bounds
    assert plots.geometry["39"].bounds[1] < bounds.top < plots.geometry["39"].bounds[3]
    assert plots.geometry["40"].bounds[2] < bounds.left - 0.1


@pytest.mark.parametrize(
    ("plot", "least", "most"), [("28", 20, 32), ("35", 14, 23), ("18", 6, 16), ("9", 2.5, 8), ("34", 1, 8)]
)
def test_closed_hollows_are_as_deep_as_planted(plots, terrain, plot, least, most):
    assert least < depth_below_sill(plots.geometry[plot], terrain) < most


@pytest.mark.parametrize("plot", ["29", "30", "32", "37"])
def test_leaky_basin_and_good_upland_plots_lie_in_no_closed_hollow(plots, terrain, plot):
    """Noise of the terrain model may make puddles; nothing deeper than two of its standard deviations."""
    assert depth_below_sill(plots.geometry[plot], terrain) < 3.0


def test_great_basin_is_walled_but_for_one_narrow_gap(plots, terrain):
    """From the floor, every direction but a few degrees meets ground at least 60 m higher within 3.5 km."""
    height, transform = terrain
    centre = plots.geometry["29"].centroid
    col, row = ~transform @ (centre.x, centre.y)
    floor = inside(plots.geometry["29"], terrain).mean()
    reach = np.arange(5, 114)
    open_ways = 0
    for way in np.radians(np.arange(0, 360, 1)):
        ray = height[(row - reach * np.cos(way)).astype(int), (col + reach * np.sin(way)).astype(int)]
        open_ways += ray.max() < floor + 60
    assert 1 <= open_ways <= 25


def test_plots_stand_at_the_heights_of_their_zones(plots, terrain):
    ranges = {
        "hot_humid_coast": (0, 300), "hot_arid": (300, 900), "savannah": (500, 1400), "lake_basin": (1129, 1450),
        "upland": (1500, 2150), "high_upland": (2250, 2800),
    }  # fmt: skip
    seen = 0
    for zone in TRUTH["zone"]:
        low, high = ranges[zone["is"]]
        for plot in zone["plots"]:
            assert low <= inside(plots.geometry[plot], terrain).mean() <= high, (zone["is"], plot)
            seen += 1
    assert seen >= 33


def test_inland_stations_cool_by_6_5_k_per_km():
    with (REGION / "normals.csv").open(encoding="utf-8") as file:
        rows = list(csv.DictReader(file))
    assert len(rows) == 72
    mean, height = {}, {}
    for row in rows:
        mean.setdefault(row["station"], []).append((float(row["t_max_c"]) + float(row["t_min_c"])) / 2)
        height[row["station"]] = float(row["elevation_m"])
        assert float(row["t_min_c"]) < float(row["t_max_c"])
    inland = [station for station in height if station != "Tavrick airfield"]
    fall, _ = np.polyfit([height[s] / 1000 for s in inland], [np.mean(mean[s]) for s in inland], 1)
    assert fall == pytest.approx(-6.5, abs=0.15)


def test_stations_stand_at_the_height_of_the_terrain(terrain):
    height, transform = terrain
    with (REGION / "normals.csv").open(encoding="utf-8") as file:
        places = {(float(r["lon"]), float(r["lat"]), float(r["elevation_m"])) for r in csv.DictReader(file)}
    assert len(places) == 6
    for lon, lat, stated in places:
        col, row = (int(v) for v in ~transform @ (lon, lat))
        # three standard deviations of the terrain's error and one of rounding
        assert height[row, col] == pytest.approx(stated, abs=6)


def test_wind_shares_sum_to_one_for_each_place_season_and_part():
    with (REGION / "wind.csv").open(encoding="utf-8") as file:
        rows = list(csv.DictReader(file))
    sums: dict[tuple[str, ...], float] = {}
    for row in rows:
        key = row["lon"], row["lat"], row["season"], row["part"]
        sums[key] = sums.get(key, 0.0) + float(row["share"])
    assert len(sums) == 12
    assert all(total == pytest.approx(1.0, abs=1e-9) for total in sums.values())


def test_truth_speaks_of_plots_readings_and_capabilities_that_exist(plots):
    known = {"reading", "above", "below", "is", "is_not", "unknown", "more_than", "less_than", "set_aside", "says",
             "caution", "ahead_of"}  # fmt: skip
    assert set(TRUTH["told_now"]) <= set(TRUTH["capabilities"])
    assert {case["from"] for case in TRUTH["case"]} == set(TRUTH["capabilities"])
    for case in TRUTH["case"]:
        assert case["plot"] in plots.index
        assert case["expect"]
        for want in case["expect"]:
            assert set(want) <= known
            assert want.get("reading", "area_ha") in READINGS
            others = want.get("ahead_of", []) + [want[key] for key in ("more_than", "less_than") if key in want]
            assert set(others) <= set(plots.index)


def test_every_plot_is_a_case_or_in_a_zone(plots):
    told = {case["plot"] for case in TRUTH["case"]} | {plot for zone in TRUTH["zone"] for plot in zone["plots"]}
    assert told == set(plots.index)
