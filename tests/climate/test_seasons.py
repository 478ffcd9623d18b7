"""Cool and hot seasons."""

from pathlib import Path

import numpy as np
import pandas as pd
import pytest

from sitescreen.climate.seasons import (
    ASSUMED,
    FROM_BRIEF,
    FROM_NORMALS,
    PARTLY,
    comfort_c,
    extraterrestrial_mj_m2,
    is_weak,
    seasons_from_normals,
    seasons_without_normals,
)
from sitescreen.inputs.normals import read_normals


def test_adaptive_comfort_matches_ashrae_55() -> None:
    """0.31·t + 17.8 (secondary sources): 20 → 24.0, 25 → 25.55, 28 → 26.48, 33.5 → 28.185 °C; no further beyond."""
    found = comfort_c(np.array([20.0, 25.0, 28.0, 33.5, 40.0, 5.0]))
    assert found == pytest.approx([24.0, 25.55, 26.48, 28.185, 28.185, 20.9])


@pytest.mark.parametrize(
    ("lat", "day", "sum_mj"),
    [(-20.0, 246, 32.2), (13.73, 105, 38.06)],  # FAO 56: example 8; Bangkok in April (from memory)
)
def test_extraterrestrial_sum_matches_fao_56(lat: float, day: int, sum_mj: float) -> None:
    assert extraterrestrial_mj_m2(np.array([lat]), np.array([day]))[0] == pytest.approx(sum_mj, abs=0.05)


def normals(folder: Path, coolest_c: float) -> Path:
    """A station at 1,000 m whose July is coolest and January hottest, 6 K apart; daily range 10 K."""
    lines = ["station,lon,lat,elevation_m,month,t_max_c,t_min_c,rh_mean,rain_mm"]
    for month in range(1, 13):
        mean = coolest_c + 3.0 * (1.0 + np.cos((month - 1) * np.pi / 6))
        lines.append(f"a,37,0,1000,{month},{mean + 5:.2f},{mean - 5:.2f},60,50")
    path = folder / "normals.csv"
    path.write_text("\n".join(lines), encoding="utf-8")
    return path


def at_rises(*rise_m: float) -> pd.DataFrame:
    return pd.DataFrame({"station": ["a"] * len(rise_m), "station_rise_m": rise_m})


def test_seasons_follow_the_plots_height(tmp_path: Path) -> None:
    """A mean under 20.7 °C is too cool (t < 0.31·t + 14.3): July at the station, all the year 1,000 m higher."""
    found = seasons_from_normals(read_normals(normals(tmp_path, 20.0)), at_rises(0.0, 1000.0, -1000.0), 6.5)
    assert found.source == FROM_NORMALS
    # 20.0 in July, 20.4 in June and August, 21.5 in May and September
    assert np.flatnonzero(found.cool[0]).tolist() == [5, 6, 7]
    assert found.cool[1].all()
    assert np.flatnonzero(found.cool[2]).tolist() == [5, 6, 7]  # no month too cool: the three coolest stand for it
    assert found.is_too_cool.tolist() == [True, True, False]
    # too hot: a maximum over 0.31·t + 21.3, so a mean over 23.6 where the maximum is 5 K above it
    assert np.flatnonzero(found.hot[0]).tolist() == [0, 1, 2, 10, 11]
    assert found.hot[2].all()
    assert np.flatnonzero(found.hot[1]).tolist() == [0, 1, 11]
    assert found.is_too_hot.tolist() == [True, False, True]


def test_seasons_of_a_brief_serve_and_the_other_is_assumed() -> None:
    lat = np.array([-1.0, 12.0])
    stated = seasons_without_normals(lat, [7, 8], [2])
    assert stated.source == FROM_BRIEF
    assert np.flatnonzero(stated.cool[1]).tolist() == [6, 7]
    partly = seasons_without_normals(lat, [7, 8])
    assert partly.source == PARTLY
    assert np.flatnonzero(partly.cool[0]).tolist() == [6, 7]
    assert partly.hot[0].sum() == 3


def test_assumed_seasons_mirror_between_the_hemispheres() -> None:
    found = seasons_without_normals(np.array([20.0, -20.0, 0.0]))
    assert found.source == ASSUMED
    assert np.flatnonzero(found.cool[0]).tolist() == [0, 10, 11]
    assert np.flatnonzero(found.cool[1]).tolist() == [4, 5, 6]
    assert np.flatnonzero(found.hot[0]).tolist() == [4, 5, 6]
    assert np.flatnonzero(found.cool[2]).tolist() == [4, 5, 6]  # the Earth is farthest from the sun in July
    assert is_weak(np.array([0.0, 5.0, 20.0, -20.0])).tolist() == [True, True, False, False]


def test_a_plots_seasons_do_not_depend_on_the_other_plots() -> None:
    lat = np.array([-1.2, 3.0, 14.0])
    together, alone = seasons_without_normals(lat), seasons_without_normals(lat[1:2])
    assert (together.cool[1] == alone.cool[0]).all()
