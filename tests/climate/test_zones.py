"""Climate zones of plots: published bands, the gates between zones, and what is said where a figure is missing."""

from typing import Any

import numpy as np
import pandas as pd
import pytest
from hypothesis import given
from hypothesis import strategies as st

from sitescreen.climate.zones import check_zone, memberships, zone_shares
from sitescreen.errors import BriefError
from sitescreen.settings import load_defaults

ZONES = load_defaults().zones
NAMES = ["hot_humid_coast", "hot_arid", "savannah", "lake_basin", "upland", "high_upland"]
FAR = 500.0


def climate(t_mean_c: float, t_range_k: float, rh_mean: float, hottest_month_max_c: float) -> pd.DataFrame:
    return pd.DataFrame(
        {
            "t_mean_c": [t_mean_c],
            "t_range_k": [t_range_k],
            "rh_mean": [rh_mean],
            "hottest_month_max_c": [hottest_month_max_c],
        }
    )


def fits(
    elevation_m: float,
    *,
    sea_km: float = FAR,
    lake_km: float = FAR,
    lake_width_km: float = 60.0,
    normals: pd.DataFrame | None = None,
) -> pd.Series:
    """Memberships of one plot."""
    one = [np.array([value]) for value in (elevation_m, sea_km, lake_km, lake_width_km)]
    return memberships(one[0], one[1], one[2], one[3], normals, ZONES).iloc[0]


def firm(row: pd.Series) -> list[str]:
    """Zones that fit to 0.8 or more."""
    return [name for name in NAMES if row[name] >= 0.8]


def sombroek_c(height_m: float) -> float:
    """Sombroek, Braun & van der Pouw 1982, Kenya Soil Survey E1: T = 30.2 − 6.5·z (z in km; from memory)."""
    return 30.2 - 6.5 * height_m / 1000.0


def test_zones_come_in_one_order() -> None:
    assert list(ZONES.with_normals) == list(ZONES.without_normals) == NAMES


# --- published bands -------------------------------------------------------------------------------------------------


def test_warm_humid_of_koenigsberger_1974_is_the_coast() -> None:
    """Mean maximum 27–32, minimum 21–27 °C, humidity 55–100, about 75 % (Koenigsberger et al. 1974, from memory)."""
    assert firm(fits(10.0, sea_km=2.0, normals=climate((29.5 + 24.0) / 2, 29.5 - 24.0, 75.0, 32.0))) == [
        "hot_humid_coast"
    ]


def test_tropical_upland_of_koenigsberger_1974_is_upland() -> None:
    """Mean maximum 24–30 °C by day, minimum 10–13 °C by night, humidity 45–99 %, above 900–1,200 m."""
    assert firm(fits(1700.0, normals=climate((27.0 + 11.5) / 2, 27.0 - 11.5, 72.0, 30.0))) == ["upland"]


def test_hot_dry_of_koenigsberger_1974_is_hot_arid() -> None:
    """Hot-season maximum 43–49 °C, humidity 10–55 % (Koenigsberger et al. 1974, from memory)."""
    assert firm(fits(400.0, normals=climate(30.0, 15.0, 32.0, 46.0))) == ["hot_arid"]


def test_the_published_sheet_of_a_great_lake_is_lake_basin() -> None:
    """Kisumu, 1146 m (published Mahoney sheet): mean maximum 30.9, minimum 15.7 °C; a great lake beside it.

    Humidity is group 2 in January (30–50 %) and group 3 else (50–70 %): the middles of the groups average 58 %. The
    lake's width, 68 km, is an assumption; any width over 25 km gives the same.
    """
    sheet = climate((30.9 + 15.7) / 2, 15.1, (40.0 + 11 * 60.0) / 12, 32.8)
    beside = fits(1146.0, lake_km=5.0, lake_width_km=68.0, normals=sheet)
    assert firm(beside) == ["lake_basin"]
    assert firm(fits(1146.0, normals=sheet)) == ["savannah"], "the same air far from any lake"
    assert firm(fits(1146.0, lake_km=5.0, lake_width_km=68.0)) == ["lake_basin"], "and without normals"


@pytest.mark.parametrize(
    ("from_m", "to_m", "from_c", "to_c", "zone"),
    [
        (900, 1200, 22, 24, "savannah"),
        (1500, 1850, 18, 20, "upland"),
        (1850, 2150, 16, 18, "upland"),
        (2450, 2750, 12, 14, "high_upland"),
        (2750, 3050, 10, 12, "high_upland"),
    ],
)
def test_temperature_zones_of_sombroek_1982(from_m: int, to_m: int, from_c: int, to_c: int, zone: str) -> None:
    """The middle of each published band of height and temperature, with normals and without (bands from memory)."""
    height = (from_m + to_m) / 2
    assert firm(fits(height, normals=climate((from_c + to_c) / 2, 12.0, 62.0, 30.0))) == [zone]
    assert zone in firm(fits(height))


def test_height_and_temperature_draw_the_same_lines() -> None:
    """Where a limit is set by height without normals and by temperature with them, Sombroek's equation joins the two.

    The temperatures in the settings are rounded to 0.1 °C, hence the tolerance.
    """
    compared = 0
    for name in ("hot_arid", "savannah", "lake_basin", "upland", "high_upland"):
        warm = dict(ZONES.with_normals[name].t_mean_c or ())
        for height_m, fit in ZONES.without_normals[name].elevation_m or ():
            nearest = min(warm, key=lambda t_c: abs(t_c - sombroek_c(height_m)))
            if abs(nearest - sombroek_c(height_m)) < 0.5:
                assert nearest == pytest.approx(sombroek_c(height_m), abs=0.05)
                assert warm[nearest] == fit
                compared += 1
    assert compared == 14


# --- gates -----------------------------------------------------------------------------------------------------------


def test_a_high_cool_lake_is_upland_not_lake_basin() -> None:
    beside = fits(1880.0, lake_km=3.0, lake_width_km=40.0, normals=climate(18.0, 14.0, 68.0, 28.0))
    assert firm(beside) == ["upland"]
    assert beside["lake_basin"] == 0.0
    assert fits(1880.0, lake_km=3.0, lake_width_km=40.0)["lake_basin"] == 0.0, "nor without normals"


@pytest.mark.parametrize(("width_km", "fit"), [(2.0, 0.0), (13.5, 0.5), (25.0, 1.0)])
def test_small_lakes_make_no_basin(width_km: float, fit: float) -> None:
    beside = fits(1146.0, lake_km=1.0, lake_width_km=width_km)
    assert beside["lake_basin"] == pytest.approx(fit)
    assert beside["savannah"] == pytest.approx(1.0 - fit), "what is not lake basin is savannah"


def test_a_lakes_basin_ends_at_the_lakes_width() -> None:
    assert fits(1146.0, lake_km=20.0, lake_width_km=28.0)["lake_basin"] == 1.0
    assert fits(1146.0, lake_km=40.0, lake_width_km=28.0)["lake_basin"] == 0.0


def test_a_dry_hot_lake_shore_stays_hot_arid() -> None:
    assert firm(fits(365.0, lake_km=2.0, lake_width_km=35.0, normals=climate(29.5, 11.0, 46.0, 36.0))) == ["hot_arid"]


def test_memberships_pass_over_softly() -> None:
    halfway = fits(1400.0)
    assert halfway["savannah"] == pytest.approx(0.5)
    assert halfway["upland"] == pytest.approx(0.5)
    assert fits(10.0, sea_km=40.0)["hot_humid_coast"] == pytest.approx(0.5)


def test_a_cool_lowland_and_a_wet_lowland_are_outside_the_six_zones() -> None:
    cool = fits(10.0, sea_km=3.0, normals=climate(14.0, 8.0, 75.0, 20.0))
    wet = fits(300.0, normals=climate(25.0, 8.5, 86.0, 31.0))
    assert max(cool[NAMES]) == 0.0
    assert max(wet[NAMES]) == 0.0


# --- missing figures -------------------------------------------------------------------------------------------------


def test_dry_zones_cannot_be_told_apart_without_normals() -> None:
    inland = fits(500.0)
    assert firm(inland) == ["hot_arid", "savannah"]
    assert inland["undecided"]
    assert "humidity" in inland["missing"]
    told = fits(500.0, normals=climate(27.0, 13.0, 46.0, 36.0))
    assert not told["undecided"]
    assert told["missing"] == ""


def test_without_a_shoreline_the_water_zones_stay_possible() -> None:
    lake_or_not = fits(1146.0, sea_km=np.nan, lake_km=np.nan)
    assert firm(lake_or_not) == ["savannah", "lake_basin"]
    assert lake_or_not["undecided"]
    assert "shoreline" in lake_or_not["missing"]
    assert "humidity" not in lake_or_not["missing"]


def test_a_shoreline_without_lakes_says_that_no_lake_is_near() -> None:
    inland = fits(1146.0, sea_km=300.0, lake_km=np.nan, lake_width_km=np.nan)
    assert firm(inland) == ["savannah"]
    assert not inland["undecided"]


def test_unknown_height_gives_no_zone() -> None:
    unknown = fits(np.nan)
    assert unknown[NAMES].isna().all()
    assert "height" in unknown["missing"]


def test_rows_without_normals_do_without() -> None:
    some = pd.concat([climate(27.0, 13.0, 46.0, 36.0), climate(np.nan, np.nan, np.nan, np.nan)], ignore_index=True)
    both = memberships(np.array([500.0, 500.0]), np.full(2, FAR), np.full(2, FAR), np.full(2, 60.0), some, ZONES)
    assert list(both["undecided"]) == [False, True]


# --- shares ----------------------------------------------------------------------------------------------------------


def table(*rows: pd.Series) -> pd.DataFrame:
    frame = pd.DataFrame(list(rows)).reset_index(drop=True)
    return frame.astype(dict.fromkeys(NAMES, float) | {"undecided": bool})


def test_shares_sum_to_one_and_name_the_largest() -> None:
    shares = zone_shares(table(fits(1380.0), fits(2500.0)), None, ZONES)
    assert shares.shares.sum(axis=1).tolist() == pytest.approx([1.0, 1.0])
    assert shares.zone.tolist() == ["savannah", "high_upland"]
    assert shares.zone_share[0] == pytest.approx((1475 - 1380) / 150)


def test_below_three_tenths_everywhere_is_outside() -> None:
    edge = zone_shares(table(fits(3535.0), fits(3525.0), fits(np.nan)), None, ZONES)
    assert edge.outside.tolist() == [True, False, False]
    assert edge.zone.tolist() == ["", "high_upland", ""]
    assert edge.shares.sum(axis=1).tolist() == pytest.approx([0.0, 1.0, 0.0])


def test_a_stated_zone_takes_the_whole_share() -> None:
    shares = zone_shares(table(fits(500.0), fits(3900.0), fits(500.0)), ["Hot-arid", "upland", ""], ZONES)
    assert shares.zone.tolist()[:2] == ["hot_arid", "upland"]
    assert shares.shares.to_numpy()[:2].max(axis=1).tolist() == [1.0, 1.0]
    assert shares.given.tolist() == [True, True, False]
    assert shares.provisional.tolist() == [False, False, True]
    assert shares.outside.tolist() == [False, False, False]


def test_a_misspelt_zone_is_refused_with_the_nearest_name() -> None:
    with pytest.raises(BriefError, match=r"plot 1 states the zone 'savanah'.*'savannah' was meant"):
        zone_shares(table(fits(500.0), fits(500.0)), ["", "savanah"], ZONES)
    with pytest.raises(BriefError, match="add a profile"):
        check_zone("tundra", NAMES, "the brief")


def test_a_profile_of_ones_own_can_be_stated() -> None:
    shares = zone_shares(table(fits(500.0)), ["my_island"], ZONES, known=[*NAMES, "my_island"])
    assert shares.zone[0] == "my_island"


@given(
    elevation_m=st.floats(-50, 5000),
    sea_km=st.one_of(st.floats(0, 1000), st.just(float("nan"))),
    lake_km=st.one_of(st.floats(0, 1000), st.just(float("nan"))),
    width_km=st.floats(0.5, 300),
    air=st.one_of(st.none(), st.tuples(st.floats(0, 35), st.floats(2, 25), st.floats(5, 100), st.floats(5, 50))),
)
def test_memberships_lie_between_0_and_1_and_shares_sum_to_1_or_0(
    elevation_m: float, sea_km: float, lake_km: float, width_km: float, air: Any
) -> None:
    normals = None if air is None else climate(*air)
    row = fits(elevation_m, sea_km=sea_km, lake_km=lake_km, lake_width_km=width_km, normals=normals)
    values = row[NAMES].to_numpy(dtype=float)
    assert ((values >= 0) & (values <= 1)).all()
    shares = zone_shares(table(row), None, ZONES)
    assert shares.shares.to_numpy().sum() == pytest.approx(0.0 if shares.outside[0] else 1.0)
    assert (shares.zone[0] == "") == shares.outside[0]


def test_a_plots_zone_depends_on_no_other_plot() -> None:
    rng = np.random.default_rng(2)
    height, sea, lake, width = (
        rng.uniform(0, 3000, 40),
        rng.uniform(0, 80, 40),
        rng.uniform(0, 80, 40),
        np.full(40, 30.0),
    )
    together = memberships(height, sea, lake, width, None, ZONES)
    for k in range(40):
        alone = memberships(height[[k]], sea[[k]], lake[[k]], width[[k]], None, ZONES)
        assert alone.iloc[0].to_dict() == together.iloc[k].to_dict()
