"""No two criteria of a zone's profile tell the same: their marks over random cells of the zone on the demo region.

The real pipeline on one-cell plots of that zone, so that every reading is as a plot would have it.
"""

from itertools import combinations
from pathlib import Path
from typing import Any

import geopandas as gpd
import numpy as np
import pandas as pd
import pytest
from pyproj import Transformer

from sitescreen.brief import Brief, load_brief
from sitescreen.climate.breeze import lake_reach
from sitescreen.climate.normals import plot_climate
from sitescreen.climate.zones import memberships
from sitescreen.inputs import read_inputs
from sitescreen.lattice import block_of
from sitescreen.screening import Screening, screen
from sitescreen.settings import load_defaults
from sitescreen.terrain.shore_distance import nearest_shore
from sitescreen.terrain.shore_fetch import OpenRule, open_segments, open_shores

REGION = Path(__file__).parent.parent / "demo_region"
CELLS, DRAWN = 2000, 60_000
MOST_ALIKE = 0.8
"""Two criteria above this would count one thing twice: the plan's limit."""

ZONES = ("hot_humid_coast", "hot_arid", "savannah", "lake_basin", "upland", "high_upland")


def cells_of_zones() -> dict[str, Any]:
    """Up to 2,000 random cells of each zone: (lon, lat), on land, 13 km of terrain or more round the finest tile."""
    inputs, settings = read_inputs(load_brief(REGION / "brief.toml")), load_defaults()
    lon, lat = inputs.plots.table["lon"].to_numpy(), inputs.plots.table["lat"].to_numpy()
    block = block_of(float(np.median(lon)), float(np.median(lat)), inputs.terrain.cell_size_m)
    heights = inputs.terrain.elevation(block.window(0.0, inputs.terrain.data_bounds(block.crs)))
    random = np.random.default_rng(11)
    row, col = (random.integers(0, count, DRAWN) for count in heights.grid.shape)
    x, y = heights.grid.x_centres_m()[col], heights.grid.y_centres_m()[row]
    lon, lat = Transformer.from_crs(block.crs, "EPSG:4326", always_xy=True).transform(x, y)
    elevation = heights.values[row, col].astype(np.float64)
    assert inputs.shore is not None
    assert inputs.normals is not None
    breeze = settings.breeze
    rule = OpenRule(breeze.open_fetch_m, breeze.open_sector_deg, breeze.open_share)
    lakes = open_segments(inputs.shore, "lake", block.crs, block.core_bounds, rule, breeze.lake_width_none_km)
    near = nearest_shore(inputs.shore, lon, lat, block.crs, breeze.lake_width_none_km)
    lake = open_shores(
        inputs.shore, lakes, "lake", lon, lat, block.crs, lambda km, width_km: lake_reach(km, width_km, breeze)
    )
    land = np.isfinite(elevation) & (near.distance_m > 60.0)
    lon, lat, elevation = lon[land], lat[land], elevation[land]
    fits = memberships(
        pd.Series(elevation),
        pd.Series(near.sea_distance_m[land] / 1000.0),
        pd.Series(lake.distance_m[land] / 1000.0),
        pd.Series(lake.width_km[land]),
        plot_climate(inputs.normals, lon, lat, elevation, settings.zones),
        settings.zones,
    )
    best = fits[list(ZONES)].to_numpy(dtype=np.float64)
    leads = np.where(best.max(axis=1) >= settings.zones.least_membership, best.argmax(axis=1), -1)
    return {zone: np.column_stack([lon, lat])[leads == k][:CELLS] for k, zone in enumerate(ZONES)}


@pytest.fixture(scope="module")
def screened(tmp_path_factory: pytest.TempPathFactory) -> Screening:
    """The demo's brief with those cells for plots."""
    folder = tmp_path_factory.mktemp("cells")
    picked = cells_of_zones()
    points = np.concatenate(list(picked.values()))
    names = [f"{zone}-{k}" for zone, some in picked.items() for k in range(len(some))]
    plots = gpd.GeoDataFrame({"plot": names}, geometry=gpd.points_from_xy(*points.T), crs="EPSG:4326")
    plots.to_file(folder / "cells.gpkg")
    brief = load_brief(REGION / "brief.toml")
    cells = brief.plots.model_copy(update={"file": folder / "cells.gpkg", "name": None})
    return screen(Brief.model_copy(brief, update={"plots": cells}))


@pytest.mark.parametrize("zone", ZONES)
def test_no_two_criteria_tell_the_same(screened: Screening, zone: str) -> None:
    one = screened.judged.by_zone[zone]
    marks = one.marks[[str(plot).startswith(f"{zone}-") for plot in one.marks.index]]
    assert len(marks) > 0.9 * CELLS, "the demo region lacks ground of that zone"
    readings = screened.judged.facts.loc[marks.index]
    columns = {f"mark_{one.name}": one.column for one in screened.profiles[zone].criteria}
    alike = {}
    for a, b in combinations(marks.columns, 2):
        for what, table in (("marks", marks[[a, b]]), ("readings", readings[[columns[a], columns[b]]])):
            both = table.astype(np.float64).dropna()
            if len(both) > 0.5 * CELLS and both.std().min() > 0.0:
                alike[what, a, b] = float(np.corrcoef(both.to_numpy().T)[0, 1])
    too_much = {pair: round(r, 2) for pair, r in alike.items() if abs(r) > MOST_ALIKE}
    assert alike
    assert not too_much
