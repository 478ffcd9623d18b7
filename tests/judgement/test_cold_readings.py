"""What plots read off the night's cold air."""

import numpy as np
import pandas as pd
import pytest
from shapely.geometry import box

from sitescreen.climate.cold_air import closed_pools
from sitescreen.climate.cold_kinds import cold_kinds
from sitescreen.climate.cold_layer import cold_layer, night_ground
from sitescreen.climate.cold_strength import net_loss_w_m2, plot_strength_k, saturation_hpa, strength_k
from sitescreen.climate.zones import ZoneShares
from sitescreen.grid import Field, Grid
from sitescreen.judgement.cold_readings import night_notes, with_cold, with_nights
from sitescreen.judgement.coverage import cover
from sitescreen.judgement.readings import Readings
from sitescreen.settings import load_defaults
from sitescreen.terrain.hollows import hollows

DEFAULTS = load_defaults()
AIR = DEFAULTS.cold_air
CELLS = 120
GRID = Grid("EPSG:32641", 500_000.0, CELLS * 30.0, 30.0, CELLS, CELLS)


def read(height: np.ndarray, *plots: tuple[float, float], shows_trees: bool = False, size_m: float = 90.0) -> Readings:
    """Readings of squares at metres east and south of the grid's corner; open and walled edge alike."""
    import geopandas as gpd

    ground = Field(height, GRID, "m", "ground")
    dry = np.zeros(GRID.shape, dtype=bool)
    layer = cold_layer(night_ground(ground, dry, DEFAULTS.cold_layer), None, DEFAULTS.cold_layer)
    found = hollows(ground)
    pools = closed_pools(found, 0.3, AIR)
    kinds = cold_kinds(layer._replace(walled=layer.opened), pools, ground, 1.0, DEFAULTS.cold_layer, AIR.fill_scale_m)
    half = size_m / 2.0
    shapes = [
        box(GRID.west_m + x - half, GRID.north_m - y - half, GRID.west_m + x + half, GRID.north_m - y + half)
        for x, y in plots
    ]
    coverage = cover(gpd.GeoSeries(shapes, crs=GRID.crs), GRID)
    elevation = coverage.mean(height, 0.9)
    index = pd.Index([chr(97 + n) for n in range(len(plots))], name="plot")
    bare = Readings(pd.DataFrame({"elevation_m": elevation, "sky_view": 1.0}, index=index), pd.DataFrame(index=index))
    return with_cold(bare, coverage, found, pools, kinds, np.zeros(len(plots)), 1.0, shows_trees, DEFAULTS)


def slope_with_hollow(depth_m: float = 12.0, side_m: float = 360.0, fall: float = 0.02) -> np.ndarray:
    """Ground that falls to the south, with a square hollow in the middle."""
    y, x = np.mgrid[0:CELLS, 0:CELLS] * 30.0 + 15.0
    inside = np.maximum(abs(x - 1800.0), abs(y - 1800.0)) < side_m / 2
    return 300.0 - fall * y - depth_m * inside


def test_a_plot_in_a_hollow_reads_its_depth_sill_catchment_and_filling() -> None:
    values = read(slope_with_hollow(), (1800.0, 1800.0), (1800.0, 600.0)).values
    assert values["cold_pool_kind"].tolist() == ["closed", "none"]
    # the sill is the low, southern rim, a cell behind the edge: 195 m from the middle, at its own 2 % slope
    assert values.at["a", "sill_distance_m"] == pytest.approx(195.0, abs=180.0)
    assert 90.0 < values.at["a", "sill_bearing_deg"] < 270.0
    rim_m = 300.0 - 0.02 * 1995.0
    floor_m = 300.0 - 0.02 * 1800.0 - 12.0
    assert values.at["a", "cold_pool_depth_m"] == pytest.approx(rim_m - floor_m, abs=0.7)
    # what lies uphill of it, a strip as wide as the hollow and as long as the ground (1,980 m) at least
    assert values.at["a", "pool_catchment_ha"] >= 0.9 * 36.0 * 198.0 / 100.0
    assert 0.0 < values.at["a", "pool_fill_h"] < 1.0
    assert np.isnan(values.at["b", "sill_distance_m"])
    assert values.at["b", "cold_pool_depth_m"] == values.at["b", "cold_fill"] == 0.0


def test_the_sill_lies_where_the_ground_falls() -> None:
    """The same hollow on ground that falls to each side in turn; the sill is on the lower rim, a cell behind it."""
    for turns, bearing_deg in ((0, 180.0), (1, 90.0), (2, 0.0), (3, 270.0)):
        values = read(np.rot90(slope_with_hollow(), turns).copy(), (1800.0, 1800.0)).values
        off = abs((values.at["a", "sill_bearing_deg"] - bearing_deg + 180.0) % 360.0 - 180.0)
        assert off <= 50.0  # the rim's cells are level with one another; the first of them is taken
        assert 165.0 <= values.at["a", "sill_distance_m"] <= 300.0


def test_a_cone_on_a_dome_fills_as_its_volume_and_area_say() -> None:
    """A cone 20 m deep and 200 m wide holds 20/3 m over its own area, all its catchment: 0.59 h at 11.3 m³/(m² h)."""
    y, x = np.mgrid[0:CELLS, 0:CELLS] * 30.0 + 15.0
    away = np.hypot(x - 1800.0, y - 1800.0)
    height = np.where(away < 200.0, 280.0 + 0.1 * away, 300.0 - 0.05 * (away - 200.0))
    values = read(height, (1800.0, 1800.0)).values
    density = 1.225 * (1.0 - 2.25577e-5 * 300.0) ** 4.2559
    supply_m_h = 3600.0 * 30.0 / (density * 1005.0 * 8.0)
    assert values.at["a", "pool_fill_h"] == pytest.approx(20.0 / 3.0 / supply_m_h, rel=0.1)
    assert values.at["a", "pool_catchment_ha"] == pytest.approx(12.57, rel=0.15)


def test_pits_of_very_different_catchment_are_alike_cold() -> None:
    """Pits with the same view of the sky were about equally cold, though one had many times the other's drainage area.

    Whiteman, Haiden et al. 2004 (J. Appl. Meteor. 43:1224–1236, abstract): the sky view is what counts.
    """
    y, x = np.mgrid[0:CELLS, 0:CELLS] * 30.0 + 15.0
    height = 300.0 - 0.02 * y
    for east, south in ((900.0, 420.0), (2700.0, 3000.0)):
        height -= 18.0 * (np.hypot(x - east, y - south) < 150.0)
    found = read(height, (900.0, 420.0), (2700.0, 3000.0))
    assert found.values["cold_pool_kind"].tolist() == ["closed", "closed"]
    upper, lower = found.values["pool_catchment_ha"]
    assert lower > 4.0 * upper
    deficit = with_nights(found, np.array([6.0, 6.0]), None, AIR).values["cold_deficit_k"]
    assert deficit.min() > 2.0
    assert deficit["a"] == pytest.approx(deficit["b"], rel=0.15)


def test_half_of_a_plot_decides_its_kind() -> None:
    height = slope_with_hollow(side_m=600.0)
    # the hollow's western edge is at 1,500 m
    values = read(height, (1500.0 - 20.0, 1800.0), (1500.0 + 20.0, 1800.0)).values
    assert (values["cold_pool_kind"] == "closed").tolist() == [False, True]


def test_a_plot_off_the_ground_is_unknown_and_says_why() -> None:
    height = slope_with_hollow()
    height[:, :10] = np.nan
    found = read(height, (150.0, 1800.0), (1800.0, 1800.0))
    assert found.values["cold_pool_kind"].tolist() == ["unknown", "closed"]
    assert "no data under" in found.why_unknown.at["a", "cold_pool_depth_m"]
    assert found.values.at["a", "cold_fill_least"] == 0.0
    assert found.values.at["a", "cold_fill_most"] == 1.0


@pytest.mark.parametrize(
    ("depth_m", "side_m", "shows_trees", "expected"),
    [
        (18.0, 360.0, True, True),  # 18 m of trees round a clearing of 360 m: 13 ha
        (18.0, 360.0, False, False),  # bare ground
        (32.0, 360.0, True, False),  # deeper than trees are tall
        (18.0, 600.0, True, False),  # 36 ha
    ],
)
def test_a_clearing_may_be_trees(depth_m: float, side_m: float, shows_trees: bool, expected: bool) -> None:
    values = read(slope_with_hollow(depth_m, side_m), (1800.0, 1800.0), shows_trees=shows_trees).values
    assert values.at["a", "cold_pool_kind"] == "closed"
    assert values.at["a", "may_be_trees"] == expected


# --- the climate -----------------------------------------------------------------------------------------------------


def test_saturation_is_the_published_one() -> None:
    """WMO-No. 8 (from memory): 6.11 hPa at 0 °C, 23.37 hPa at 20 °C, 42.43 hPa at 30 °C, to its own 0.3 %."""
    assert saturation_hpa(np.array([0.0, 20.0, 30.0])) == pytest.approx([6.11, 23.37, 42.43], rel=3e-3)


def test_brunt_by_hand() -> None:
    """20 °C, 9 hPa: σT⁴ = 418.7 W/m², × (0.48 − 0.065·3) = 0.285: 119.3 W/m²."""
    assert net_loss_w_m2(np.array([20.0]), np.array([9.0])) == pytest.approx(119.3, abs=0.2)


def test_dry_air_makes_colder_pools_and_dew_limits_the_vapour() -> None:
    dry, damp = strength_k(np.array([15.0, 15.0]), np.array([22.0, 22.0]), np.array([35.0, 75.0]))
    assert dry > damp + 1.0
    # 95 % at 22 °C is more vapour than air of 15 °C can hold
    soaked = strength_k(np.array([15.0]), np.array([22.0]), np.array([95.0]))[0]
    assert soaked == pytest.approx(4.0 / 64.0 * net_loss_w_m2(np.array([15.0]), saturation_hpa(np.array([15.0])))[0])


def test_strength_comes_from_normals_before_zones() -> None:
    shares = pd.DataFrame({"upland": [1.0, 0.5, 0.0], "hot_arid": [0.0, 0.5, 0.0]})
    nothing = pd.Series([""] * 3)
    zones = ZoneShares(shares, nothing, shares.max(axis=1), nothing, nothing, nothing, nothing)
    by_zone = plot_strength_k(zones, None, AIR)
    assert by_zone[:2] == pytest.approx([6.0, 6.75])
    assert np.isnan(by_zone[2])
    climate = pd.DataFrame({"cool_season_min_c": [10.0] * 3, "cool_season_mean_c": 17.0, "cool_season_rh": 60.0})
    told = plot_strength_k(zones, climate, AIR)
    assert told == pytest.approx(np.full(3, strength_k(np.array([10.0]), np.array([17.0]), np.array([60.0]))[0]))


def nights(climate: pd.DataFrame | None, **changes: float) -> Readings:
    row = {
        "cold_fill": 0.5,
        "cold_fill_least": 0.5,
        "cold_fill_most": 0.5,
        "cold_cap_k": 8.0,
        "sky_view": 0.9,
    } | changes
    index = pd.Index(["a"], name="plot")
    return with_nights(
        Readings(pd.DataFrame([row], index=index), pd.DataFrame(index=index)), np.array([6.0]), climate, AIR
    )


def test_deficit_and_night_minimum_by_hand() -> None:
    """6 K × 0.5 × 0.9 = 2.7 K below a normal minimum of 11 °C."""
    climate = pd.DataFrame({"cool_season_min_c": [11.0], "clear_calm_nights": [14.0]})
    values = nights(climate).values
    assert values.at["a", "cold_deficit_k"] == pytest.approx(2.7)
    assert values.at["a", "night_minimum_c"] == pytest.approx(8.3)
    assert values.at["a", "clear_calm_nights"] == 14.0
    assert night_notes(climate, AIR) == ()
    assert not {"cold_fill", "cold_cap_k"} & set(values.columns)
    assert nights(climate, cold_cap_k=1.5).values.at["a", "cold_deficit_k"] == 1.5


def test_without_normals_the_minimum_is_unknown_and_the_nights_assumed() -> None:
    found = nights(None)
    assert np.isnan(found.values.at["a", "night_minimum_c"])
    assert found.why_unknown.at["a", "night_minimum_c"] == "no climate normals were given"
    assert found.values.at["a", "clear_calm_nights"] == 10.0
    assert "10 nights" in night_notes(None, AIR)[0].text


def test_an_unknown_deficit_has_limits() -> None:
    values = nights(None, cold_fill=np.nan, cold_fill_least=0.0, cold_fill_most=0.25).values
    assert np.isnan(values.at["a", "cold_deficit_k"])
    assert values.at["a", "cold_deficit_least_k"] == 0.0
    assert values.at["a", "cold_deficit_most_k"] == pytest.approx(1.35)
