"""The onset index against Biggs and Graves' limit, and the notes that it makes."""

import math
from dataclasses import replace

import numpy as np
import pandas as pd
import pytest

from sitescreen.climate.breeze_onset import AIR_J_G_K, onset_index, onset_notes, strongest_wind_m_s
from sitescreen.inputs.normals import Normals
from sitescreen.inputs.stamps import FileStamp
from sitescreen.inputs.wind import SLOTS, Rose, WindTable, assumed_wind


@pytest.mark.parametrize(("warmer_k", "wind_m_s"), [(2, 2.45), (5, 3.88), (8, 4.91), (10, 5.49)])
def test_the_wind_at_the_limit(warmer_k: float, wind_m_s: float) -> None:
    """√(3·1.003·ΔT), from V²/(c_p ΔT) < 3 of Biggs & Graves 1962, J. Appl. Meteorol. 1:474–480 (from memory)."""
    assert strongest_wind_m_s(20.0 + warmer_k, 20.0) == pytest.approx(wind_m_s, abs=0.006)
    assert onset_index(wind_m_s, 20.0 + warmer_k, 20.0) == pytest.approx(3.0, abs=0.02)


def test_the_unit_trap_heat_per_gram_and_not_per_kilogram() -> None:
    """10 m/s against 5 K: 19.9, no breeze. With c_p in J/(kg K) it would be 0.02, and gales would breed breezes."""
    assert onset_index(10.0, 30.0, 25.0) == pytest.approx(100.0 / (1.003 * 5.0))
    assert onset_index(10.0, 30.0, 25.0) > 3.0
    assert 0.9 < AIR_J_G_K < 1.1


def test_land_no_warmer_than_the_water_has_no_breeze() -> None:
    assert onset_index(1.0, 25.0, 25.0) == math.inf
    assert strongest_wind_m_s(24.0, 25.0) == 0.0


def normals(water_c: float, land_c: float = 31.0) -> Normals:
    """One station whose three hottest months are February to April; the water is 9 K colder in all others."""
    hot = np.isin(np.arange(1, 13), (2, 3, 4))
    table = pd.DataFrame(
        {
            "station": "Pier",
            "lon": 39.0,
            "lat": -4.0,
            "month": np.arange(1, 13),
            "t_max_c": np.where(hot, land_c, land_c - 4.0),
            "water_c": np.where(hot, water_c, water_c - 9.0),
        }
    )
    return Normals(table, FileStamp("n.csv", 1, "0", ""), ())


def wind(speed: float) -> WindTable:
    rose = Rose(np.array([90.0]), np.array([0.5]), np.array([speed]), 0.5, False)
    return WindTable(((math.nan, math.nan),), {(slot, 0): rose for slot in SLOTS}, False, None, ())


def test_the_note_goes_by_the_hot_season_and_the_windy_time() -> None:
    """ΔT = 31 − 26 = 5 K: 3 m/s give 1.8 and a breeze, 5 m/s 5.0 and none."""
    (light,), (strong,) = onset_notes(normals(26.0), wind(3.0)), onset_notes(normals(26.0), wind(5.0))
    assert "index 1.8" in light.text
    assert "so a day breeze sets in" in light.text
    assert "winds of up to 3.9 m/s" in light.text
    assert "index 5.0" in strong.text
    assert "stops a day breeze" in strong.text


def test_without_a_water_temperature_nothing_is_said() -> None:
    bare = normals(26.0)
    assert onset_notes(replace(bare, stations=bare.stations.drop(columns="water_c")), wind(3.0)) == ()
    gap = bare.stations.assign(water_c=bare.stations["water_c"].where(bare.stations["month"] != 3))
    assert onset_notes(replace(bare, stations=gap), wind(3.0)) == ()


def test_warm_water_and_an_assumed_wind_are_said() -> None:
    (warm,) = onset_notes(normals(32.0), wind(3.0))
    assert (warm.level, "no day breeze sets in" in warm.text) == ("warning", True)
    (assumed,) = onset_notes(normals(26.0), assumed_wind())
    assert "nobody gave the wind" in assumed.text
    assert "index" not in assumed.text
