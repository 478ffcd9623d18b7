"""No two criteria of a profile say nearly the same: random places of the demo region, zone by zone."""

from itertools import combinations
from pathlib import Path
from typing import Any

import geopandas as gpd
import numpy as np
import pytest
import rasterio

from sitescreen.brief import PlotsBrief, load_brief
from sitescreen.judgement.derived import with_derived
from sitescreen.judgement.profiles import load_profiles
from sitescreen.screening import screen

REGION = Path(__file__).parents[1] / "demo_region"
PROFILES = load_profiles()
PLACES = 2000
LEAST_PLACES = 100
MOST = 0.8
"""Two criteria that follow one another more closely count one thing twice (our limit)."""


@pytest.fixture(scope="module")
def table(tmp_path_factory: pytest.TempPathFactory) -> Any:
    brief = load_brief(REGION / "brief.toml")
    with rasterio.open(brief.terrain.files[0]) as terrain:
        west, south, east, north = terrain.bounds
    rng = np.random.default_rng(11)
    lon, lat = rng.uniform(west + 0.05, east - 0.05, PLACES), rng.uniform(south + 0.05, north - 0.05, PLACES)
    path = tmp_path_factory.mktemp("places") / "places.gpkg"
    names = [str(number) for number in range(PLACES)]
    gpd.GeoDataFrame({"plot": names}, geometry=gpd.points_from_xy(lon, lat), crs=4326).to_file(path)
    plots = PlotsBrief.model_validate({"file": str(path), "id": "plot"})
    # nothing but the ground: no context, no constraint and no criterion of the planner's
    alone = brief.model_copy(update={"plots": plots, "constraint": [], "criterion": [], "context": []})
    found = screen(alone).table
    return with_derived(found[found["outcome"] == ""])


@pytest.mark.parametrize("zone", list(PROFILES))
def test_no_two_criteria_correlate_above_eight_tenths(table: Any, zone: str) -> None:
    here = table[(table["zone"] == zone) & (table["share_in_water"].fillna(0.0) == 0.0)]
    assert len(here) >= LEAST_PLACES
    readings = list(dict.fromkeys(one.reading for one in PROFILES[zone].criteria))
    varied = [name for name in readings if here[name].std() > 0]
    between = here[varied].astype(float).corr()
    close = {(a, b): round(between.loc[a, b], 2) for a, b in combinations(varied, 2) if abs(between.loc[a, b]) > MOST}
    assert not close
    assert len(varied) >= 3


def test_the_cool_seasons_gain_follows_the_slope_and_is_not_weighed(table: Any) -> None:
    """The reason why the gain on the ground is shown and not judged."""
    high = table[table["zone"] == "high_upland"]
    assert high["cool_gain_kwh_m2"].corr(high["slope_deg"]) < -MOST
    assert all(one.reading != "cool_gain_kwh_m2" for profile in PROFILES.values() for one in profile.criteria)
