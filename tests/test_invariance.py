"""A plot's readings depend on the ground near it only.

The same plot, alone and among 40, from one tile and from four, on one thread and on two, at the borders of blocks and
UTM zones and at the equator, must give the same bits. The terrain is invented here, so that each border runs through
the middle of a tile; every run covers the same ground, because where the data end is part of the answer.
"""

from collections.abc import Callable, Iterator, Sequence
from pathlib import Path
from typing import Any, NamedTuple

import geopandas as gpd
import numba
import numpy as np
import pandas as pd
import pytest
import rasterio
from affine import Affine
from pyproj import Transformer
from shapely.geometry import Polygon, box

from sitescreen.brief import load_brief
from sitescreen.lattice import BLOCK_CELLS, blocks_of
from sitescreen.screening import screen

# What only a comparison with other plots can say. Everything else in the table must not know of them.
AMONG_OTHERS = {"rank", "rank_in_zone", "rank_low", "rank_high", "chance_first", "chance_top_quarter"}
AMONG_OTHERS |= {"chance_shortlist", "chance_first_in_zone", "chance_first_any_weights", "chance_beats_next", "group"}
AMONG_OTHERS |= {"rank_low_weights", "rank_high_weights", "rank_low_data", "rank_high_data"}
MUST_BE_KNOWN = ["elevation_m", "slope_deg", "rise_m", "ventilation", "ridge_exposure", "sheltered_fraction"]
MUST_BE_KNOWN += ["sun_year_h", "sun_cool_morning_h", "west_load_kwh_m2", "cool_gain_kwh_m2", "sun_first_cool_h"]
MUST_BE_KNOWN += ["sky_view", "shore_distance_km", "breeze_reach", "cold_deficit_most_k", "overall_mark"]
MUST_BE_KNOWN += ["long_axis_deg"]


class Site(NamedTuple):
    """Where the middle of an invented tile lies, and how many blocks and zones its plots must fall into."""

    lon: float
    lat: float
    blocks: int
    zones: int
    arc_seconds: float = 3.0
    side_deg: float = 0.2


def at_block_corner() -> tuple[float, float]:
    """Where four blocks of 90 m cells meet in UTM zone 37, south of the equator."""
    side = BLOCK_CELLS * 90.0
    lon, lat = Transformer.from_crs("EPSG:32637", "EPSG:4326", always_xy=True).transform(side, -side)
    return float(lon), float(lat)


SITES = {
    "inside a block": Site(39.7, 3.3, blocks=1, zones=1),
    "inside a block, 30 m": Site(39.7, 3.3, blocks=1, zones=1, arc_seconds=1.0, side_deg=0.15),
    "block corner": Site(*at_block_corner(), blocks=4, zones=1),
    "UTM zone border": Site(42.0, -2.2, blocks=2, zones=2),
    "equator": Site(37.4, 0.0, blocks=2, zones=1),
    "zone border on the equator": Site(36.0, 0.0, blocks=4, zones=2),
}
BORDER = [name for name in SITES if not name.startswith("inside")]


def heights_m(lon: np.ndarray, lat: np.ndarray, site: Site) -> np.ndarray:
    """Rolling ground of some 300 m relief with closed hollows, and a sea at 0 along the southern edge."""
    x, y = (lon - site.lon) * 111.0, (lat - site.lat) * 111.0  # roughly kilometres
    ground = 120.0 + 14.0 * y + 60.0 * np.sin(1.9 * x + 0.3) * np.cos(1.3 * y) + 25.0 * np.sin(5.1 * x - 3.7 * y)
    ground -= 80.0 * np.exp(-((x - 1.0) ** 2 + (y - 1.2) ** 2) / 0.3)
    return np.where(y < -site.side_deg * 111.0 / 2 + 1.5, 0.0, np.maximum(ground, 1.0)).astype(np.float32)


class Country(NamedTuple):
    """The files of one site."""

    folder: Path
    whole: list[Path]
    four: list[Path]
    plots: gpd.GeoDataFrame


def write_raster(path: Path, values: np.ndarray, transform: Affine) -> Path:
    rows, cols = values.shape
    with rasterio.open(
        path, "w", "GTiff", cols, rows, 1, "EPSG:4326", transform, dtype="float32", nodata=-9999.0, tiled=True
    ) as out:
        out.write(values, 1)
    return path


def write_terrain(site: Site, folder: Path) -> tuple[list[Path], list[Path]]:
    """The same ground in one file, and in four unequal ones that share a row and a column of cells as real tiles do."""
    step = site.arc_seconds / 3600.0
    n = round(site.side_deg / step)
    transform = Affine(step, 0.0, site.lon - n * step / 2, 0.0, -step, site.lat + n * step / 2)
    lon = transform.c + (np.arange(n) + 0.5) * step
    lat = transform.f - (np.arange(n) + 0.5) * step
    values = heights_m(lon[None, :], lat[:, None], site)
    whole = [write_raster(folder / "whole.tif", values, transform)]
    row, col = int(0.43 * n), int(0.52 * n)
    four = [
        write_raster(folder / f"part_{k}.tif", values[r0:r1, c0:c1], transform @ Affine.translation(c0, r0))
        for k, (r0, r1, c0, c1) in enumerate(
            [(0, row + 1, 0, col + 1), (0, row + 1, col, n), (row, n, 0, col + 1), (row, n, col, n)]
        )
    ]
    return whole, four


def write_shore(site: Site, folder: Path) -> None:
    """The sea along the south and a lake of some 4 km² in the north-east, both far larger than a cell."""
    half = site.side_deg / 2
    south = site.lat - half
    sea = box(site.lon - half, south - 0.1, site.lon + half, south + 1.5 / 111.0)
    angle = np.linspace(0.0, 2 * np.pi, 60, endpoint=False)
    lake = Polygon(np.column_stack([site.lon + 0.06 + 0.01 * np.cos(angle), site.lat + 0.06 + 0.01 * np.sin(angle)]))
    shore = gpd.GeoDataFrame({"kind": ["sea", "lake"], "name": ["", ""]}, geometry=[sea, lake], crs="EPSG:4326")
    shore.to_file(folder / "shore.gpkg")


def forty_plots(site: Site) -> gpd.GeoDataFrame:
    """Eight by five squares of 350 m round the middle; the middle ones straddle the border."""
    half = 0.00158
    centres = [(site.lon + (i - 3.9) * 0.007, site.lat + (j - 2.1) * 0.008) for j in range(5) for i in range(8)]
    squares = [box(x - half, y - half, x + half, y + half) for x, y in centres]
    return gpd.GeoDataFrame({"plot": [f"P{k:02d}" for k in range(40)]}, geometry=squares, crs="EPSG:4326")


def write_tables(site: Site, folder: Path) -> None:
    """Wind at two places, so that cells must choose between them, and one station of normals."""
    wind = ["season,part,direction_deg,share,speed_m_s,lon,lat"]
    for lon, speed in ((site.lon - 0.3, 3.0), (site.lon + 0.31, 5.0)):
        wind += [
            f"year,all,{k * 22.5},{0.04 + 0.05 * (k in (5, 6, 7))},{speed + 0.1 * k},{lon},{site.lat}"
            for k in range(16)
        ]
        wind += [f"year,all,,0.21,0,{lon},{site.lat}"]
    (folder / "wind.csv").write_text("\n".join(wind) + "\n", encoding="utf-8")
    normals = ["station,lon,lat,elevation_m,month,t_max_c,t_min_c,rh_mean,rain_mm"]
    normals += [
        f"one,{site.lon + 0.1},{site.lat},80,{m},{30 + m % 3},{22 + m % 2},{74 + m},{40 + 9 * m}" for m in range(1, 13)
    ]
    (folder / "normals.csv").write_text("\n".join(normals) + "\n", encoding="utf-8")


@pytest.fixture(scope="module")
def country(tmp_path_factory: pytest.TempPathFactory) -> Callable[[str], Country]:
    """Gives the files of a site, written once."""
    made: dict[str, Country] = {}

    def of(name: str) -> Country:
        if name not in made:
            site, folder = SITES[name], tmp_path_factory.mktemp("country")
            whole, four = write_terrain(site, folder)
            write_shore(site, folder)
            write_tables(site, folder)
            made[name] = Country(folder, whole, four, forty_plots(site))
        return made[name]

    return of


def table(country: Country, plots: gpd.GeoDataFrame, tiles: Sequence[Path]) -> pd.DataFrame:
    """One whole screening; its table by plot."""
    plots.to_file(country.folder / "plots.gpkg")
    files = ", ".join(f'"{tile.name}"' for tile in tiles)
    brief = country.folder / "brief.toml"
    brief.write_text(
        f'[terrain]\nfiles = [{files}]\n[shore]\nfile = "shore.gpkg"\nkind = "kind"\n'
        '[plots]\nfile = "plots.gpkg"\nid = "plot"\n[wind]\nfile = "wind.csv"\n[climate]\nstations = "normals.csv"\n',
        encoding="utf-8",
    )
    return screen(load_brief(brief)).table.set_index("plot")


@pytest.fixture(scope="module")
def together(country: Callable[[str], Country]) -> Callable[[str], pd.DataFrame]:
    """Gives the table of all 40 plots of a site from one tile, computed once."""
    made: dict[str, pd.DataFrame] = {}

    def of(name: str) -> pd.DataFrame:
        if name not in made:
            made[name] = table(country(name), country(name).plots, country(name).whole)
        return made[name]

    return of


def assert_same_bits(found: pd.DataFrame, expected: pd.DataFrame) -> None:
    """Every column that does not speak of other plots, without any tolerance."""
    assert list(found.columns) == list(expected.columns)
    expected = expected.loc[found.index]
    for column in found.columns:
        if column in AMONG_OTHERS or column == "geometry":
            continue
        a: Any = found[column].to_numpy()
        b: Any = expected[column].to_numpy()
        if a.dtype.kind == "f" or b.dtype.kind == "f":
            a, b = a.astype(np.float64), b.astype(np.float64)
            differ = ~((a == b) & (np.signbit(a) == np.signbit(b)) | (np.isnan(a) & np.isnan(b)))
        else:
            differ = np.array([str(x) != str(y) for x, y in zip(a, b, strict=True)])
        assert not differ.any(), f"{column}: {a[differ][:3]} against {b[differ][:3]} at {list(found.index[differ][:3])}"


def alone(plots: gpd.GeoDataFrame) -> Iterator[gpd.GeoDataFrame]:
    """The plot that straddles the middle and its neighbours across the border, one at a time."""
    for plot in ("P19", "P20", "P12"):
        yield plots[plots["plot"] == plot]


@pytest.mark.parametrize("name", SITES)
def test_the_border_runs_through_the_plots_and_all_is_known(name: str, together: Callable[[str], pd.DataFrame]) -> None:
    """Without this the other tests could pass on empty columns, or beside the border."""
    site, whole = SITES[name], together(name)
    cell_m = 30.0 * site.arc_seconds
    blocks = blocks_of(whole["lon"].to_numpy(), whole["lat"].to_numpy(), cell_m)
    assert len(set(blocks)) == site.blocks
    assert len({block.zone for block in blocks}) == site.zones
    assert whole.loc[:, MUST_BE_KNOWN].notna().all().all()
    # on so small a tile some cold air hangs on ground beyond it; most must be known, of more than one kind
    assert (whole["cold_pool_kind"] != "unknown").mean() > 0.6
    assert {"none", "closed"} <= set(whole["cold_pool_kind"])
    assert (whole["cold_pool_depth_m"] > 0).any()
    assert whole["elevation_m"].nunique() == len(whole) == 40


@pytest.mark.parametrize("name", SITES)
def test_one_plot_alone_reads_as_among_forty(
    name: str, country: Callable[[str], Country], together: Callable[[str], pd.DataFrame]
) -> None:
    for plot in alone(country(name).plots):
        assert_same_bits(table(country(name), plot, country(name).whole), together(name))


@pytest.mark.parametrize("name", SITES)
def test_four_tiles_read_as_one(
    name: str, country: Callable[[str], Country], together: Callable[[str], pd.DataFrame]
) -> None:
    """Also in another order: where tiles overlap they agree."""
    files = country(name)
    assert_same_bits(table(files, files.plots, files.four), together(name))
    assert_same_bits(table(files, files.plots, files.four[::-1]), together(name))


def test_one_plot_alone_from_four_tiles(
    country: Callable[[str], Country], together: Callable[[str], pd.DataFrame]
) -> None:
    files = country("zone border on the equator")
    for plot in alone(files.plots):
        assert_same_bits(table(files, plot, files.four), together("zone border on the equator"))


def test_the_order_of_the_plots_does_not_matter(
    country: Callable[[str], Country], together: Callable[[str], pd.DataFrame]
) -> None:
    """Not even for the ranks."""
    files = country("zone border on the equator")
    found = table(files, files.plots.iloc[::-1], files.whole)
    expected = together("zone border on the equator")
    assert_same_bits(found, expected)
    assert found["rank"].to_dict() == expected["rank"].to_dict()


def test_the_number_of_threads_does_not_matter(
    country: Callable[[str], Country], together: Callable[[str], pd.DataFrame]
) -> None:
    """Numba's loops on one thread and on all of them."""
    files, threads = country("block corner"), numba.get_num_threads()
    expected = together("block corner")
    numba.set_num_threads(1)
    try:
        found = table(files, files.plots, files.whole)
    finally:
        numba.set_num_threads(threads)
    assert_same_bits(found, expected)
