"""Station normals moved to plots."""

from types import SimpleNamespace
from typing import Any

import numpy as np
import pandas as pd
import pytest

from sitescreen.climate.normals import climate_notes, plot_climate, station_climate
from sitescreen.settings import load_defaults

ZONES = load_defaults().zones


def normals(*stations: dict[str, Any]) -> Any:
    """Twelve equal months for each station, unless a value is a list of twelve."""
    rows = []
    for station in stations:
        for month in range(12):
            values = {key: value[month] if isinstance(value, list) else value for key, value in station.items()}
            rows.append({"month": month + 1, **values})
    return SimpleNamespace(stations=pd.DataFrame(rows))


def station(name: str = "A", **values: Any) -> dict[str, Any]:
    usual = {
        "lon": 40.0,
        "lat": 0.0,
        "elevation_m": 0.0,
        "t_max_c": 20.0,
        "t_min_c": 10.0,
        "rh_mean": 60.0,
        "rain_mm": 50.0,
    }
    return {"station": name, **usual, **values}


def at(place: Any, lon: float, lat: float, elevation_m: float) -> pd.Series:
    return plot_climate(place, np.array([lon]), np.array([lat]), np.array([elevation_m]), ZONES).iloc[0]


def test_the_year_of_a_station_matches_a_published_sheet() -> None:
    """Monthly maxima and minima of a published Mahoney sheet (Kisumu, 1146 m; UN 1971 method): AMT 23.75, AMR 18.1.

    AMT is (highest mean maximum + lowest mean minimum)/2, AMR their difference; the printed ranges are checked too.
    """
    highest = [30.8, 32.5, 32.8, 31.5, 28.7, 29.6, 29.4, 31.6, 31.4, 31.5, 30.4, 30.5]
    lowest = [14.7, 14.8, 16.9, 16.9, 17.1, 15.1, 15.3, 15.0, 16.0, 15.7, 16.2, 15.2]
    printed_ranges = [16.1, 17.7, 15.9, 14.6, 11.6, 14.5, 14.1, 16.6, 15.4, 15.8, 14.2, 15.3]
    year = station_climate(normals(station(t_max_c=highest, t_min_c=lowest))).iloc[0]
    assert (year.hottest_month_max_c + year.coolest_month_min_c) / 2 == pytest.approx(23.75)
    assert year.hottest_month_max_c - year.coolest_month_min_c == pytest.approx(18.1)
    assert year.t_range_k == pytest.approx(np.mean(printed_ranges))


def test_temperature_falls_as_in_the_standard_atmosphere() -> None:
    """ICAO standard atmosphere: 15 °C at sea level, 2.00 °C at 2,000 m, 8.50 °C at 1,000 m (below the tropopause)."""
    sea_level = normals(station(t_max_c=20.0, t_min_c=10.0))
    assert at(sea_level, 40.0, 0.0, 2000.0).t_mean_c == pytest.approx(2.00)
    assert at(sea_level, 40.0, 0.0, 1000.0).t_mean_c == pytest.approx(8.50)
    assert at(sea_level, 40.0, 0.0, 1000.0).hottest_month_max_c == pytest.approx(13.50)
    assert at(sea_level, 40.0, 0.0, 1000.0).t_range_k == pytest.approx(10.0)


def test_a_plot_below_the_station_is_warmer() -> None:
    high = normals(station(elevation_m=1500.0, t_max_c=25.0, t_min_c=13.0))
    assert at(high, 40.0, 0.0, 1300.0).t_mean_c == pytest.approx(19.0 + 1.3)
    assert at(high, 40.0, 0.0, 1300.0).station_rise_m == pytest.approx(-200.0)


def test_the_nearest_station_serves_and_its_distance_is_geodesic() -> None:
    """A degree of longitude on the equator is 111.3195 km on WGS 84."""
    two = normals(station("west", lon=39.0), station("east", lon=41.5, rh_mean=80.0))
    climate = at(two, 40.0, 0.0, 0.0)
    assert climate.station == "west"
    assert climate.station_distance_km == pytest.approx(111.3195, abs=1e-3)
    assert at(two, 40.5, 0.0, 0.0).rh_mean == 80.0


def test_a_station_on_the_plots_level_serves_before_a_nearer_one_far_below() -> None:
    """1,500 m of height count as 75 km here, so the station 30 km away on the same level is the better one."""
    two = normals(station("shore", lon=40.0), station("plateau", lon=40.27, elevation_m=1500.0, rh_mean=45.0))
    assert at(two, 40.0, 0.0, 1500.0).station == "plateau"
    assert at(two, 40.0, 0.0, 0.0).station == "shore"


def test_a_plots_climate_depends_on_no_other_plot() -> None:
    two = normals(station("west", lon=39.0), station("east", lon=41.5, elevation_m=800.0))
    rng = np.random.default_rng(1)
    lon, lat, height = rng.uniform(38, 42, 50), rng.uniform(-1, 1, 50), rng.uniform(0, 2000, 50)
    together = plot_climate(two, lon, lat, height, ZONES)
    alone = pd.concat([plot_climate(two, lon[[k]], lat[[k]], height[[k]], ZONES) for k in range(50)], ignore_index=True)
    pd.testing.assert_frame_equal(together, alone, check_exact=True)


def test_the_cool_season_is_the_three_coolest_months() -> None:
    cool = [10.0 if month in (5, 6, 7) else 20.0 for month in range(12)]
    nights = [12.0 if month in (5, 6, 7) else 2.0 for month in range(12)]
    year = station_climate(normals(station(t_min_c=cool, t_max_c=30.0, clear_calm_nights=nights))).iloc[0]
    assert year.clear_calm_nights == 12.0


def test_unknown_height_gives_unknown_temperature() -> None:
    climate = at(normals(station()), 40.0, 0.0, np.nan)
    assert np.isnan(climate.t_mean_c)
    assert climate.station == "A"


def test_a_far_or_much_lower_station_is_said() -> None:
    climate = plot_climate(normals(station()), np.array([42.0]), np.array([0.0]), np.array([2000.0]), ZONES)
    far, high = climate_notes(climate, ZONES)
    assert "223 km away" in far.text
    assert "up to 2000 m" in high.text
    near = plot_climate(normals(station()), np.array([40.1]), np.array([0.0]), np.array([200.0]), ZONES)
    assert climate_notes(near, ZONES) == ()
